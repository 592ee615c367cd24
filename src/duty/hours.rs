//! Limits of hours and days, written as sentences: `Mon-Fri 07:00-19:00: 40 kW`, `export Sat,Sun: 0`, `22:00-06:00: 80 kW`.
//!
//! A sentence is a side (`import`, the default, or `export`), days, times of day, a colon and a power. Days or times that are not
//! named are all of them; times over midnight belong to the day on which they begin. An interval is inside if its start is.

use crate::fault::{Fault, Result, quote};
use crate::units::asked::Asked;
use crate::units::civil::Reading;

const DAYS: [&str; 7] = ["Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun"];
const DAY_MINUTES: i64 = 1440;

/// One sentence, read.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Hours {
    /// Whether it limits export rather than import.
    pub(crate) export: bool,
    days: [bool; 7],
    /// Minutes of the day, from (included) and to (excluded); `to` is greater, beyond a day over midnight.
    times: Vec<(i64, i64)>,
    /// The limit, kW.
    pub(crate) limit_kw: f64,
}

impl Hours {
    /// Reads the sentence at place `i` of the list.
    ///
    /// # Errors
    /// If a word is none of the above, or the power is missing or negative.
    pub(crate) fn parse(sentence: &str, i: usize) -> Result<Self> {
        let Some((when, power)) = sentence.rsplit_once(':') else {
            return Err(fault(
                sentence,
                i,
                "has no colon before its power",
                "Write it like \u{201c}Mon-Fri 07:00-19:00: 40 kW\u{201d}.",
            ));
        };
        let limit_kw = match Asked::Power.read(power) {
            Ok(Some(limit)) if limit >= 0.0 => limit,
            Ok(Some(_)) => {
                return Err(fault(sentence, i, "limits to a power below zero", "Give zero or more."));
            }
            Ok(None) => {
                return Err(fault(
                    sentence,
                    i,
                    "ends without a power",
                    "Put the limit after the colon, such as 40 kW.",
                ));
            }
            Err(remedy) => return Err(fault(sentence, i, "ends in no power", &remedy)),
        };
        let mut read = Self { export: false, days: [false; 7], times: Vec::new(), limit_kw };
        for (place, word) in when.split([' ', ',', '\t']).filter(|word| !word.is_empty()).enumerate() {
            let is = |other: &str| word.eq_ignore_ascii_case(other);
            if place == 0 && (is("import") || is("export")) {
                read.export = is("export");
            } else if word.contains(|c: char| c.is_ascii_digit()) {
                read.times.push(span(word).ok_or_else(|| {
                    fault(
                        sentence,
                        i,
                        &format!("holds the times {word}, which do not read"),
                        "Write times of day from 00:00 to 24:00 as from and to, such as 07:00-19:00.",
                    )
                })?);
            } else if !is("daily") {
                read.add_days(word).ok_or_else(|| {
                    fault(
                        sentence,
                        i,
                        &format!("holds the word {word}, which is no day"),
                        "Name days Mon, Tue, Wed, Thu, Fri, Sat, Sun, or a span of them such as Mon-Fri; none = every day.",
                    )
                })?;
            }
        }
        if read.days == [false; 7] {
            read.days = [true; 7];
        }
        if read.times.is_empty() {
            read.times.push((0, DAY_MINUTES));
        }
        Ok(read)
    }

    fn add_days(&mut self, word: &str) -> Option<()> {
        let day = |name: &str| DAYS.iter().position(|day| day.eq_ignore_ascii_case(name));
        let (first, last) = match word.split_once(['-', '\u{2013}']) {
            Some((first, last)) => (day(first)?, day(last)?),
            None => (day(word)?, day(word)?),
        };
        // A span may run over the week's end: Sat-Mon.
        for k in 0..=(last + 7 - first) % 7 {
            self.days[(first + k) % 7] = true;
        }
        Some(())
    }

    /// Whether the limit applies at a clock reading.
    pub(crate) fn holds(&self, at: Reading) -> bool {
        let (day, before) = (at.date.weekday(), (at.date.weekday() + 6) % 7);
        self.times.iter().any(|(from, to)| {
            let today = self.days[day] && (*from..*to).contains(&at.minute);
            let since_yesterday = self.days[before] && at.minute + DAY_MINUTES < *to;
            today || since_yesterday
        })
    }
}

fn fault(sentence: &str, i: usize, what: &str, remedy: &str) -> Fault {
    Fault::new(format!("{} {what}", quote(sentence)), format!("case, at duty.hours[{i}]"), remedy)
}

/// "07:00-19:00" as minutes of the day.
fn span(word: &str) -> Option<(i64, i64)> {
    let (from, to) = word.split_once(['-', '\u{2013}'])?;
    let (from, to) = (minute(from)?, minute(to)?);
    if from == DAY_MINUTES || from == to {
        return None;
    }
    Some((from, if to > from { to } else { to + DAY_MINUTES }))
}

fn minute(text: &str) -> Option<i64> {
    let (hour, minute) = text.split_once(':').unwrap_or((text, "0"));
    let digits = |text: &str| (1..=2).contains(&text.len()) && text.bytes().all(|byte| byte.is_ascii_digit());
    if !digits(hour) || !digits(minute) {
        return None;
    }
    let (hour, minute): (i64, i64) = (hour.parse().ok()?, minute.parse().ok()?);
    let of_day = hour * 60 + minute;
    (minute < 60 && of_day <= DAY_MINUTES).then_some(of_day)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::civil::Date;

    fn holds(sentence: &str, weekday: i64, time: (i64, i64)) -> bool {
        // 2026-06-01 is a Monday.
        let date = Date { days: Date::new(2026, 6, 1).days + weekday };
        Hours::parse(sentence, 0).unwrap().holds(Reading { date, minute: time.0 * 60 + time.1 })
    }

    #[test]
    fn sentences_hold_in_their_hours() {
        let office = "Mon-Fri 07:00-19:00: 40 kW";
        for (day, time, inside) in [
            (0, (7, 0), true),
            (0, (6, 59), false),
            (4, (18, 59), true),
            (4, (19, 0), false),
            (5, (12, 0), false),
        ] {
            assert_eq!(holds(office, day, time), inside, "{day} {time:?}");
        }
        assert!(holds("sat 22-6: 1", 5, (23, 0)) && holds("sat 22-6: 1", 6, (5, 59)));
        assert!(!holds("sat 22-6: 1", 5, (5, 0)) && !holds("sat 22-6: 1", 6, (22, 0)));
        assert!(holds("Sat\u{2013}Mon: 1", 0, (3, 0)) && !holds("Sat-Mon: 1", 1, (3, 0)));
        assert!(holds("06:00-08:00, 17:00-20:00: 5 kW", 3, (19, 0)));
        assert!(holds("daily 00:00-24:00: 1", 2, (23, 59)));
        let export = Hours::parse("Export Sun: 0,5 MW", 0).unwrap();
        assert!(export.export && export.limit_kw == 500.0);
    }

    #[test]
    fn what_does_not_read_is_refused_with_its_place() {
        for sentence in [
            "Mon 40 kW",
            "Mon: ",
            "Mon: 4 kWh",
            "Mo: 4",
            "7:00-25:00: 4",
            "7:00-7:00: 4",
            "7:61-8: 4",
            "Mon: -3 kW",
            "",
        ] {
            let fault = Hours::parse(sentence, 3).unwrap_err();
            assert!(fault.place.contains("hours[3]") && !fault.remedy.is_empty(), "{sentence}: {fault}");
        }
    }
}
