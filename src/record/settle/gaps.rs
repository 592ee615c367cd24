//! Gaps: what is said of them, and the remedies.

use super::super::grid::people_duration;
use super::super::stamp::{DAY, SECOND};
use super::super::{Finding, FindingKind, Series, Zone};
use super::Settle;
use crate::case::GapRemedy;
use crate::fault::Result;

impl Settle {
    pub(super) fn gaps(&self, files: &[String], findings: &mut Vec<Finding>) {
        let Some(first) = self.first_gap else { return };
        let place = self.table.holes.get(&first).or_else(|| {
            // The row after which the gap begins.
            first.checked_sub(1).and_then(|before| self.table.leaps.get(&before))
        });
        let long: Vec<String> = self
            .longest
            .iter()
            .map(|(len, start)| {
                format!("{} from {}", people_duration(*len as f64 * self.clock.step_s()), self.stamp(*start))
            })
            .collect();
        let cells = self.missing_count - self.rowless;
        let cause = match (self.rowless, cells) {
            (_, 0) => "there is no row for them".to_owned(),
            (0, _) => "a cell of their row is empty or unreadable".to_owned(),
            (rows, cells) => format!("{rows} have no row, {cells} an empty or unreadable cell"),
        };
        let text = format!(
            "{} of {} intervals ({}) are missing: {cause}. {} {}.",
            self.missing_count,
            self.clock.intervals,
            crate::units::people::percent(self.missing_count as f64 / self.clock.intervals.max(1) as f64),
            match self.runs {
                1 => "The gap is".to_owned(),
                2 | 3 => format!("The {} gaps are", self.runs),
                runs => format!("The longest of {runs} gaps are"),
            },
            long.join(", "),
        );
        findings.push(Finding {
            kind: FindingKind::Gap,
            count: self.missing_count,
            first_row: place.map(|(_, row)| *row),
            file: place.and_then(|(file, _)| files.get(*file)).cloned().unwrap_or_default(),
            remedy: words(self.remedy).to_owned(),
            text,
            changes_figures: true,
        });
    }

    /// Traces of summer time in stamps without a zone.
    pub(super) fn clock_change(&self, findings: &mut Vec<Finding>) {
        if self.clock.zone != Zone::Unstated || self.counted || self.clock.step_us > 3600 * SECOND {
            return;
        }
        let hour = 3600 * SECOND / self.clock.step_us;
        let autumn = self
            .table
            .doubled
            .iter()
            .find(|(_, rows)| i64::try_from(**rows) == Ok(hour))
            .map(|(day, _)| *day);
        let mut traces = Vec::new();
        if let Some(spring) = self.spring {
            traces.push(format!("an hour is missing at {}", self.stamp(spring)));
        }
        if let Some(day) = autumn {
            let i = ((day * DAY - self.clock.start_us) / self.clock.step_us).max(0) as usize;
            let stamp = self.stamp(i);
            traces.push(format!("an hour comes twice on {}", stamp.get(..10).unwrap_or("a day in autumn")));
        }
        if traces.is_empty() {
            return;
        }
        findings.push(Finding {
            kind: FindingKind::ClockChange,
            count: traces.len() as u64,
            first_row: None,
            file: String::new(),
            remedy: "stamps taken as they stand".to_owned(),
            text: format!(
                "The stamps seem to follow summer time: {}. State the zone (such as Europe/Berlin), and each row falls in its place.",
                traces.join(" and ")
            ),
            changes_figures: true,
        });
    }

    /// A stamp for messages: without seconds, and without an offset that nobody stated.
    fn stamp(&self, i: usize) -> String {
        let stamp = self.clock.stamp(i);
        let long = self.clock.step_us % (60 * SECOND) != 0;
        let end = if long { 19 } else { 16 };
        stamp.get(..end).unwrap_or(&stamp).replace('T', " ")
    }
}

/// A remedy in words.
pub(super) fn words(remedy: GapRemedy) -> &'static str {
    match remedy {
        GapRemedy::LeaveOut => "left out",
        GapRemedy::Hold => "the last value is held",
        GapRemedy::Line => "a straight line joins the neighbours",
        GapRemedy::Zero => "zero is taken",
        GapRemedy::NeighbourDays => "the mean of the same time on the neighbouring days is taken",
    }
}

/// Fills the missing values of a series where the remedy knows how.
pub(super) fn fill(series: &mut Series, remedy: GapRemedy, step_us: i64) -> Result<()> {
    let len = series.len();
    match remedy {
        GapRemedy::LeaveOut => {}
        GapRemedy::Zero => {
            for i in 0..len {
                if series.get(i).is_none() {
                    series.set(i, 0.0)?;
                }
            }
        }
        GapRemedy::Hold => {
            let mut last = None;
            for i in 0..len {
                match (series.get(i), last) {
                    (Some(value), _) => last = Some(value),
                    (None, Some(last)) => series.set(i, last)?,
                    (None, None) => {}
                }
            }
        }
        GapRemedy::Line => {
            let mut last: Option<(usize, f64)> = None;
            for i in 0..len {
                let Some(value) = series.get(i) else { continue };
                if let Some((from, start)) = last {
                    let steps = (i - from) as f64;
                    for k in from + 1..i {
                        series.set(k, start + (value - start) * ((k - from) as f64 / steps))?;
                    }
                }
                last = Some((i, value));
            }
        }
        GapRemedy::NeighbourDays => {
            if DAY % step_us != 0 {
                return Ok(());
            }
            let day = (DAY / step_us) as usize;
            let mut found = Vec::new();
            for i in (0..len).filter(|i| series.get(*i).is_none()) {
                let before = i.checked_sub(day).and_then(|at| series.get(at));
                let after = series.get(i + day);
                let value = match (before, after) {
                    (Some(before), Some(after)) => Some(before + (after - before) / 2.0),
                    (one, other) => one.or(other),
                };
                found.extend(value.map(|value| (i, value)));
            }
            for (i, value) in found {
                series.set(i, value)?;
            }
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn filled(values: &[Option<f64>], remedy: GapRemedy, step_us: i64) -> Vec<Option<f64>> {
        let mut series = Series::from_values(values).unwrap();
        fill(&mut series, remedy, step_us).unwrap();
        series.iter().collect()
    }

    #[test]
    fn remedies_fill_what_they_can() {
        let values = [None, Some(1.0), None, None, Some(4.0), None];
        let hour = 3600 * SECOND;
        assert_eq!(filled(&values, GapRemedy::LeaveOut, hour), values);
        assert_eq!(
            filled(&values, GapRemedy::Hold, hour),
            [None, Some(1.0), Some(1.0), Some(1.0), Some(4.0), Some(4.0)]
        );
        assert_eq!(
            filled(&values, GapRemedy::Line, hour),
            [None, Some(1.0), Some(2.0), Some(3.0), Some(4.0), None]
        );
        assert_eq!(
            filled(&values, GapRemedy::Zero, hour),
            [Some(0.0), Some(1.0), Some(0.0), Some(0.0), Some(4.0), Some(0.0)]
        );
        let half_days = [Some(1.0), Some(2.0), None, Some(4.0), Some(5.0), None];
        let expected = [Some(1.0), Some(2.0), Some(3.0), Some(4.0), Some(5.0), Some(4.0)];
        assert_eq!(filled(&half_days, GapRemedy::NeighbourDays, DAY / 2), expected);
    }
}
