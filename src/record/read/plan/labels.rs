//! Whether stamps mark the start or the end of their interval.

use super::super::super::grid::people_duration;
use super::super::super::stamp::{DAY, SECOND};
use super::super::super::timing::Timing;
use super::super::super::words;
use super::super::super::{Finding, FindingKind};
use super::super::{File, Reader};
use crate::case::Stamp;
use crate::fault::quote;

impl Reader {
    /// Decides it for each file, and lists where it is in doubt.
    pub(super) fn label_stamps(&mut self) {
        let stated = self.terms.stamp;
        for file in &mut self.files {
            let (late, why) = label(file, stated);
            file.late = late;
            file.late_why = why;
            if stated.is_some() || late {
                continue;
            }
            let Some(step_us) = runs_to_midnight(file) else { continue };
            let step = people_duration(step_us as f64 / 1e6);
            self.findings.push(Finding {
                kind: FindingKind::StampDoubt,
                count: 1,
                first_row: Some(file.dialect.first_row),
                file: file.name.clone(),
                remedy: "read as the start of the interval".to_owned(),
                text: format!(
                    "Whole days run from {step} past midnight to midnight, as they do where a stamp marks the end of its interval. The stamps are read as its start; read as its end, every interval begins {step} earlier. State which (record.stamp)."
                ),
                changes_figures: true,
            });
        }
    }
}

/// Whether the stamps of a file mark the end of their interval, and why.
fn label(file: &File, stated: Option<Stamp>) -> (bool, String) {
    // A running reading is of one moment; a row per day and an hour counted from 1 begin with the day.
    let powers = || file.columns.iter().filter(|column| !column.into.is_empty() || column.extra);
    if powers().next().is_some() && powers().all(|column| column.register) {
        return (false, "the readings are of the moment of the stamp".to_owned());
    }
    if matches!(file.timing, Timing::DateHour { first: 1, .. }) {
        return (false, "hours are counted from 1, so that hour 1 begins at 00:00".to_owned());
    }
    match stated {
        Some(Stamp::End) => return (true, "as stated".to_owned()),
        Some(Stamp::Start) => return (false, "as stated".to_owned()),
        None => {}
    }
    if let Some(days) = &file.shape.days {
        return (false, days.words.clone());
    }
    let ends = |column: &usize| words::says_end(&file.dialect.headers[*column]);
    let column = file.timing.columns().into_iter().find(ends);
    if let Some(column) = column {
        return (true, format!("the header {} says so", quote(&file.dialect.headers[column])));
    }
    let midnights = file.scanned.as_ref().map_or(0, |scanned| scanned.day_ends);
    if midnights > 0 {
        return (true, "days end with a stamp of 24:00".to_owned());
    }
    (false, "nothing says that it is the end".to_owned())
}

/// The step, if the file begins one step past midnight and ends at midnight.
fn runs_to_midnight(file: &File) -> Option<i64> {
    let scanned = file.scanned.as_ref()?;
    if file.shape.days.is_some() || file.timing.counted() {
        return None;
    }
    let (first, last) = scanned.stats.ends?;
    let (first, last) = (first.min(last), first.max(last));
    let step_us = *scanned.stats.distances.iter().max_by_key(|(_, count)| **count)?.0;
    let local = |instant: i64| (instant + i64::from(scanned.offset_s.unwrap_or(0)) * SECOND).rem_euclid(DAY);
    (step_us <= 3600 * SECOND && local(first) == step_us && local(last) == 0 && last - first >= DAY - step_us)
        .then_some(step_us)
}
