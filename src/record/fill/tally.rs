//! What the second pass found, told in sentences.

use super::super::grid::people_duration;
use super::super::{Finding, FindingKind};
use super::{Fill, Use};
use crate::case::RepeatRemedy;
use crate::fault::quote;
use crate::units::people;

/// How often something was seen, and where first.
#[derive(Debug, Default, Clone)]
pub(super) struct Tally {
    pub(super) count: u64,
    pub(super) first_row: u64,
    pub(super) what: String,
}

impl Tally {
    /// Counts one more, at row `row`.
    pub(super) fn add(&mut self, row: u64, what: impl FnOnce() -> String) {
        if self.count == 0 {
            self.first_row = row;
            self.what = what();
        }
        self.count += 1;
    }
}

impl Fill {
    /// Lists what was found, in words.
    pub(in crate::record) fn finish(self, findings: &mut Vec<Finding>) {
        let file = self.plan.name.clone();
        let mut say = |kind, tally: &Tally, remedy: &str, changes: bool, text: String| {
            if tally.count > 0 {
                findings.push(Finding {
                    kind,
                    count: tally.count,
                    first_row: Some(tally.first_row),
                    file: file.clone(),
                    remedy: remedy.to_owned(),
                    text,
                    changes_figures: changes,
                });
            }
        };
        let first = |tally: &Tally| format!("the first is row {}, {}", tally.first_row, quote(&tally.what));
        let rows = |count: u64, one: &str, many: &str| {
            if count == 1 { format!("One row {one}") } else { format!("{count} rows {many}") }
        };
        let tally = &self.stampless;
        say(
            FindingKind::Text,
            tally,
            "left out",
            true,
            format!("{} no stamp that reads: {}.", rows(tally.count, "holds", "hold"), first(tally)),
        );
        let foot = &self.foot;
        let text = format!(
            "At the foot of the table {}: {}.",
            rows(foot.count, "holds no stamp", "hold no stamp").to_lowercase(),
            first(foot)
        );
        say(FindingKind::Ignored, foot, "left out", false, text);
        say(
            FindingKind::Ignored,
            &self.heads,
            "left out",
            false,
            format!("{} the headers: {}.", rows(self.heads.count, "repeats", "repeat"), first(&self.heads)),
        );
        say(
            FindingKind::Ignored,
            &self.comments,
            "left out",
            false,
            format!(
                "{}: {}.",
                rows(self.comments.count, "is a comment", "are comments"),
                first(&self.comments)
            ),
        );
        say(
            FindingKind::ClockChange,
            &self.skipped,
            "left out",
            true,
            format!(
                "{} in the hour that clocks leave out in spring: {}. The zone or the stamps may be wrong.",
                rows(self.skipped.count, "lies", "lie"),
                first(&self.skipped)
            ),
        );
        say(
            FindingKind::MixedSteps,
            &self.off_step,
            "left out",
            true,
            format!(
                "{} off the regular step of {}: {}.",
                rows(self.off_step.count, "lies", "lie"),
                people_duration(self.plan.fit.step_us as f64 / 1e6),
                first(&self.off_step)
            ),
        );
        say(
            FindingKind::MixedSteps,
            &self.snapped,
            "taken as on the step",
            false,
            format!(
                "{} up to {} off the regular step of {}: {}.",
                rows(self.snapped.count, "lies", "lie"),
                people_duration(self.snapped_most as f64 / 1e6),
                people_duration(self.plan.fit.step_us as f64 / 1e6),
                first(&self.snapped)
            ),
        );
        say(
            FindingKind::Disorder,
            &self.outside,
            "left out",
            true,
            format!(
                "{} a stamp far from all others: {}.",
                rows(self.outside.count, "has", "have"),
                first(&self.outside)
            ),
        );
        let backwards = self.disorder.count * 2 > self.rows;
        let text = if backwards {
            "The rows run from the newest to the oldest.".to_owned()
        } else {
            format!(
                "{} a stamp before that of the row above: {}.",
                rows(self.disorder.count, "has", "have"),
                first(&self.disorder)
            )
        };
        say(FindingKind::Disorder, &self.disorder, "sorted in", false, text);
        say(
            FindingKind::Repeat,
            &self.repeat,
            "first kept",
            false,
            format!(
                "{} a stamp that was there before, with the same values: {}.",
                rows(self.repeat.count, "repeats", "repeat"),
                first(&self.repeat)
            ),
        );
        let (remedy, kept) = match self.plan.repeat {
            RepeatRemedy::First => ("first kept", "the first row of each counts"),
            RepeatRemedy::Last => ("last kept", "the last row of each counts"),
            RepeatRemedy::Mean => ("mean taken", "their mean counts"),
        };
        say(
            FindingKind::Conflict,
            &self.conflict,
            remedy,
            true,
            format!(
                "{} a stamp that was there before, with other values: {}; {kept}.",
                rows(self.conflict.count, "repeats", "repeat"),
                first(&self.conflict)
            ),
        );
        let count = self.rows.max(1);
        say(
            FindingKind::Quality,
            &self.marked_missing,
            "taken as missing",
            true,
            format!(
                "{} marked as missing: {}.",
                rows(self.marked_missing.count, "is", "are"),
                first(&self.marked_missing)
            ),
        );
        say(
            FindingKind::Quality,
            &self.estimated,
            "kept as read",
            false,
            format!(
                "{} marked as estimated or substituted, {} of all: {}.",
                rows(self.estimated.count, "is", "are"),
                people::percent(self.estimated.count as f64 / count as f64),
                first(&self.estimated)
            ),
        );
        say(
            FindingKind::TypicalYear,
            &self.leap_days,
            "left out",
            true,
            format!(
                "{} on 29 February, which the record's years do not have: {}.",
                rows(self.leap_days.count, "lies", "lie"),
                first(&self.leap_days)
            ),
        );
        let phases: Vec<&Use> = self.plan.uses.iter().filter(|column| column.phase).collect();
        let total: f64 = phases.iter().map(|column| column.sum.value()).sum();
        let largest = phases.iter().fold(None, |most: Option<&Use>, column| match most {
            Some(most) if most.sum.value() >= column.sum.value() => Some(most),
            _ => Some(column),
        });
        if let Some(largest) = largest
            && total > 0.0
        {
            let headers: Vec<String> = phases.iter().map(|column| quote(&column.header)).collect();
            let tally =
                Tally { count: phases.len() as u64, first_row: self.plan.first_row, what: String::new() };
            let text = format!(
                "The phases {} are added up; the largest share is {} with {} of the energy.",
                headers.join(", "),
                quote(&largest.header),
                people::percent(largest.sum.value() / total)
            );
            say(FindingKind::Phases, &tally, "added up", false, text);
        }
        for column in &self.plan.uses {
            let header = quote(&column.header);
            let cells = |tally: &Tally, what: &str, many: &str| {
                let count = if tally.count == 1 {
                    format!("one cell {what}")
                } else {
                    format!("{} cells {many}", tally.count)
                };
                format!("In column {header} {count}: {}.", first(tally))
            };
            say(
                FindingKind::Text,
                &column.text,
                "taken as missing",
                true,
                cells(&column.text, "holds no number", "hold no number"),
            );
            say(
                FindingKind::Outlier,
                &column.outlier,
                "taken as missing",
                true,
                cells(
                    &column.outlier,
                    "holds more than a million million kW",
                    "hold more than a million million kW",
                ),
            );
            say(
                FindingKind::Negative,
                &column.negative,
                "kept as read",
                false,
                cells(&column.negative, "is negative", "are negative"),
            );
        }
    }
}
