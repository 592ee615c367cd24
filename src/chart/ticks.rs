//! Tick marks: steps of 1, 2 and 5, decades, and civil time.

use crate::units::civil::{Date, Reading};
use crate::units::people;

/// Ticks of a linear axis.
#[derive(Debug, Clone, PartialEq)]
pub struct Ticks {
    /// Distance from tick to tick: 1, 2 or 5 times a power of ten.
    pub step: f64,
    /// Values of the ticks, rising.
    pub values: Vec<f64>,
}

impl Ticks {
    /// A tick's value as text, with as many decimals as the step asks.
    pub fn text(&self, value: f64) -> String {
        people::plain(value, decimals(self.step))
    }
}

/// Decimals that a step asks for.
fn decimals(step: f64) -> i32 {
    (-(libm::floor(libm::log10(step) + 1e-9) as i32)).clamp(0, 9)
}

/// The smallest step of 1, 2 or 5 times a power of ten that cuts `span` into at most `most` parts.
pub fn step(span: f64, most: usize) -> f64 {
    let rough = span / most.max(1) as f64;
    if !(rough.is_finite() && rough > 1e-300) {
        return 1.0;
    }
    let exponent = libm::floor(libm::log10(rough)) as i32;
    for exponent in [exponent, exponent + 1] {
        for times in [1.0, 2.0, 5.0] {
            // 10^-1 is not exact, 1/10 is the nearest double: divide by the whole power.
            let size = if exponent < 0 { times / ten(-exponent) } else { times * ten(exponent) };
            if size >= rough * (1.0 - 1e-9) {
                return size;
            }
        }
    }
    rough
}

fn ten(power: i32) -> f64 {
    libm::pow(10.0, f64::from(power))
}

/// Ticks within two ends, at most about `most` steps.
pub fn linear(from: f64, to: f64, most: usize) -> Ticks {
    let step = step(to - from, most);
    if !(from.is_finite() && to.is_finite() && from <= to) {
        return Ticks { step, values: Vec::new() };
    }
    let first = libm::ceil(from / step - 1e-9);
    let count = (libm::floor(to / step + 1e-9) - first + 1.0).clamp(0.0, 1000.0) as usize;
    let scale = 1.0 / step;
    // Dividing by a whole number gives the double nearest to the tick.
    let value = |k: f64| if step < 1.0 { k / libm::round(scale) } else { k * step };
    let exact = step >= 1.0 || (scale - libm::round(scale)).abs() < 1e-9 * scale;
    Ticks {
        step,
        values: (0..count)
            .map(|k| first + k as f64)
            .map(|k| if exact { value(k) } else { k * step })
            .collect(),
    }
}

/// The two ends moved outwards to whole steps, and the ticks between them; zero is kept in when `zero` is set.
pub fn rounded((low, high): (f64, f64), zero: bool, most: usize) -> ((f64, f64), Ticks) {
    let (mut low, mut high) =
        if low.is_finite() && high.is_finite() && low <= high { (low, high) } else { (0.0, 1.0) };
    if zero {
        low = low.min(0.0);
        high = high.max(0.0);
    }
    if high - low <= 1e-9 * high.abs().max(low.abs()) {
        let pad = if high == 0.0 { 1.0 } else { high.abs() * 0.1 };
        if !(zero && low == 0.0) {
            low -= pad;
        }
        high += pad;
    }
    let step = step(high - low, most);
    let (low, high) = (libm::floor(low / step + 1e-9) * step, libm::ceil(high / step - 1e-9) * step);
    ((low, high), linear(low, high, libm::round((high - low) / step).max(1.0) as usize))
}

/// The two ends with zero kept in and a little room beyond each, and the ticks between them.
pub fn roomy((low, high): (f64, f64), room: f64, most: usize) -> ((f64, f64), Ticks) {
    let (low, high) = if low < high && low.is_finite() && high.is_finite() {
        (low.min(0.0), high.max(0.0))
    } else {
        rounded((low, high), true, most).0
    };
    let pad = room * (high - low);
    let ends = (if low < 0.0 { low - pad } else { low }, if high > 0.0 { high + pad } else { high });
    (ends, linear(ends.0, ends.1, most))
}

/// Ticks of a logarithmic axis: the decades, and the values 2 to 9 times each, within the ends.
pub fn log(from: f64, to: f64) -> (Vec<f64>, Vec<f64>) {
    if !(from > 0.0 && to > from && to.is_finite()) {
        return (Vec::new(), Vec::new());
    }
    let (first, last) = (libm::floor(libm::log10(from)) as i32, libm::ceil(libm::log10(to)) as i32);
    let (mut decades, mut between) = (Vec::new(), Vec::new());
    let inside = |v: f64| v >= from * (1.0 - 1e-9) && v <= to * (1.0 + 1e-9);
    for power in first..=last {
        for times in 1..10 {
            let value =
                if power < 0 { f64::from(times) / ten(-power) } else { f64::from(times) * ten(power) };
            if inside(value) {
                if times == 1 { decades.push(value) } else { between.push(value) }
            }
        }
    }
    (decades, between)
}

/// A tick of civil time.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TimeTick {
    /// Clock reading, microseconds since 1970-01-01 00:00 of the same clock.
    pub us: i64,
    /// A long tick.
    pub long: bool,
    /// Its label, if it has one.
    pub label: Option<String>,
}

/// Microseconds in a day.
pub const DAY_US: f64 = 86_400e6;

/// A civil date in words: "5 Feb".
pub fn day(date: Date) -> String {
    format!("{} {}", date.parts().2, month(date))
}

/// The same with its weekday: "Mon 5 Feb".
pub fn full_day(date: Date) -> String {
    format!("{} {}", weekday(date), day(date))
}

/// A clock reading in words: "Mon 5 Feb 18:30"; nothing outside the calendar.
pub fn moment(us: f64) -> String {
    Reading::new(us).map_or_else(String::new, |t| format!("{} {}", full_day(t.date), t.time()))
}

/// The short name of a date's month.
pub fn month(date: Date) -> &'static str {
    const NAMES: [&str; 12] =
        ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];
    NAMES[date.parts().1 as usize - 1]
}

/// The short name of a date's weekday.
pub fn weekday(date: Date) -> &'static str {
    ["Mon", "Tue", "Wed", "Thu", "Fri", "Sat", "Sun"][date.weekday()]
}

/// Ticks of civil time on an axis `px` wide, as the span asks: hours, days with Mondays long, Mondays with months long,
/// months with Januaries long, or years.
pub fn time(from_us: f64, to_us: f64, px: f64) -> Vec<TimeTick> {
    let (Some(from), Some(to)) = (Reading::new(from_us), Reading::new(to_us)) else { return Vec::new() };
    let (from, to) = (from.date, to.date);
    let days = (to_us - from_us) / DAY_US;
    if !(days > 0.0 && px > 0.0) {
        return Vec::new();
    }
    let per_day = px / days;
    if per_day >= 150.0 {
        return hours(from, (from_us, to_us), per_day);
    }
    let mut ticks = Vec::new();
    let mut push = |date: Date, long: bool, label: Option<String>| {
        let us = date.start_us();
        if us as f64 >= from_us && us as f64 <= to_us {
            ticks.push(TimeTick { us, long, label });
        }
    };
    if per_day >= 4.0 {
        // Days; the Mondays are named, or, where they stand wide apart, every first, second or third day.
        let close = (1..=3).find(|n| days < 16.0 && per_day * f64::from(*n) >= 62.0);
        let weeks = libm::ceil(62.0 / (7.0 * per_day)).max(1.0) as i32;
        let apart = f64::from(close.unwrap_or(7 * weeks)) * per_day;
        let (mut date, mut count, mut mondays) = (from, 0, 0);
        while date <= to {
            let monday = date.weekday() == 0;
            let named = close.map_or(monday && mondays % weeks == 0, |every| count % every == 0);
            let label = named.then(|| if apart >= 84.0 { full_day(date) } else { day(date) });
            push(date, monday || close.is_some() && named, label);
            count += 1;
            mondays += i32::from(monday);
            date = date.tomorrow();
        }
        // A span without a Monday still says where it lies.
        if ticks.iter().all(|t| t.label.is_none())
            && let Some(first) = ticks.first_mut()
            && let Some(at) = Reading::new(first.us as f64)
        {
            first.label = Some(day(at.date));
        }
        return ticks;
    }
    let per_month = per_day * 30.4;
    // A span that ends with its year lies in one.
    let many_years = Reading::new(to_us - 1.0).is_some_and(|last| last.date.parts().0 != from.parts().0);
    let by_months = per_month >= 8.0;
    let every_month = [1, 2, 3, 6, 12].into_iter().find(|n| per_month * *n as f64 >= 40.0).unwrap_or(12);
    let every_year = step(days / 365.25, (px / 50.0).max(1.0) as usize).max(1.0) as i64;
    let mut date = from.month_start();
    while date <= to {
        let (year, number, _) = date.parts();
        let january = number == 1;
        if by_months {
            let named = (number - 1) % every_month == 0;
            let label = named.then(|| {
                if january && many_years && per_month * every_month as f64 >= 62.0 {
                    format!("Jan {year}")
                } else if january && many_years {
                    year.to_string()
                } else {
                    month(date).to_owned()
                }
            });
            push(date, january || per_month >= 30.0, label);
        } else if january {
            push(date, true, (year % every_year == 0).then(|| year.to_string()));
        }
        date = date.next_month();
    }
    ticks
}

/// Ticks at round hours, midnight long with its date.
fn hours(first: Date, (from_us, to_us): (f64, f64), per_day: f64) -> Vec<TimeTick> {
    const HOUR_US: f64 = 3600e6;
    let per_hour = per_day / 24.0;
    // Down to a minute, so that a record of an hour still has a scale.
    let steps =
        [60.0, 120.0, 300.0, 600.0, 900.0, 1800.0, 3600.0, 7200.0, 10_800.0, 21_600.0, 43_200.0, 86_400.0];
    let every_s = steps.into_iter().find(|s| s / 3600.0 * per_hour >= 52.0).unwrap_or(86_400.0);
    let midnight = first.start_us();
    let every_us = every_s / 3600.0 * HOUR_US;
    let start = libm::ceil((from_us - midnight as f64) / every_us).max(0.0);
    let count = (libm::floor((to_us - midnight as f64) / every_us) - start + 1.0).clamp(0.0, 500.0) as usize;
    (0..count)
        .map(|k| {
            let us = midnight + ((start + k as f64) * every_us) as i64;
            let Some(at) = Reading::new(us as f64) else {
                return TimeTick { us, long: false, label: None };
            };
            let long = at.minute == 0;
            let label = if long {
                let wide = per_hour * every_s / 3600.0 >= 76.0;
                if wide { full_day(at.date) } else { day(at.date) }
            } else {
                at.time()
            };
            TimeTick { us, long, label: Some(label) }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const FEB_5_2024: f64 = 1_707_091_200e6; // a Monday

    fn labels(from: f64, days: f64, px: f64) -> Vec<String> {
        time(from, from + days * DAY_US, px).into_iter().filter_map(|t| t.label).collect()
    }

    #[test]
    fn steps_are_one_two_or_five() {
        for (span, most, expected) in
            [(300.0, 6, 50.0), (100.0, 4, 50.0), (0.7, 7, 0.1), (14.0, 7, 2.0), (0.0, 5, 1.0)]
        {
            assert_eq!(step(span, most), expected, "{span} in {most}");
        }
    }

    #[test]
    fn ticks_are_the_nearest_doubles() {
        assert_eq!(linear(0.0, 0.5, 5).values, vec![0.0, 0.1, 0.2, 0.3, 0.4, 0.5]);
        assert_eq!(linear(-100.0, 200.0, 6).values, vec![-100.0, -50.0, 0.0, 50.0, 100.0, 150.0, 200.0]);
    }

    #[test]
    fn an_axis_of_a_flat_line_has_room() {
        let ((low, high), ticks) = rounded((5.0, 5.0), false, 5);
        assert!(low < 5.0 && high > 5.0 && ticks.values.len() > 1);
    }

    #[test]
    fn decades_have_eight_ticks_between() {
        let (decades, between) = log(0.01, 100.0);
        assert_eq!(decades, vec![0.01, 0.1, 1.0, 10.0, 100.0]);
        assert_eq!(between.len(), 32);
        assert_eq!(log(0.0, 1.0), (vec![], vec![]));
    }

    #[test]
    fn civil_ticks_follow_the_span() {
        assert_eq!(labels(FEB_5_2024, 21.0, 700.0), ["Mon 5 Feb", "Mon 12 Feb", "Mon 19 Feb", "Mon 26 Feb"]);
        assert_eq!(labels(FEB_5_2024, 3.0, 300.0), ["Mon 5 Feb", "Tue 6 Feb", "Wed 7 Feb", "Thu 8 Feb"]);
        assert_eq!(labels(FEB_5_2024, 1.0, 300.0), ["5 Feb", "06:00", "12:00", "18:00", "6 Feb"]);
        assert_eq!(labels(FEB_5_2024, 180.0, 300.0), ["Mar", "Apr", "May", "Jun", "Jul", "Aug"]);
        assert_eq!(
            labels(FEB_5_2024, 3000.0, 300.0),
            ["2025", "2026", "2027", "2028", "2029", "2030", "2031", "2032"][..]
                .iter()
                .filter(|y| y.parse::<i32>().unwrap() % 2 == 0)
                .copied()
                .collect::<Vec<_>>()
        );
    }

    #[test]
    fn a_moment_is_written_in_words() {
        assert_eq!(moment(FEB_5_2024 + 18.5 * 3600e6), "Mon 5 Feb 18:30");
    }

    proptest! {
        #[test]
        fn ticks_lie_within_their_span(from in -1e16..1e16_f64, days in 0.001..40_000.0_f64, px in 1.0..2000.0_f64) {
            let to = from + days * DAY_US;
            let ticks = time(from, to, px);
            prop_assert!(ticks.len() < 1000);
            for tick in ticks {
                prop_assert!(tick.us as f64 >= from - 1.0 && tick.us as f64 <= to + 1.0);
            }
        }

        #[test]
        fn linear_ticks_are_few_and_inside(low in -1e9..1e9_f64, span in 1e-6..1e9_f64, most in 1usize..20) {
            let ticks = linear(low, low + span, most);
            prop_assert!(ticks.values.len() <= most + 2);
            for v in ticks.values {
                prop_assert!(v >= low - ticks.step * 1e-6 && v <= low + span + ticks.step * 1e-6);
            }
        }
    }
}
