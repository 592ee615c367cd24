//! Between the passes: clock, zone, what each column is added to, and the memory for it.

use super::super::fill::Bits;
use super::super::grid::{self, Stamped};
use super::super::roles::{self, Column};
use super::super::timing::Timing;
use super::super::{Finding, FindingKind, Series, Zone};
use super::{File, Reader};
use crate::fault::{Fault, Result, quote};

mod labels;
mod lanes;
mod typical;

/// What is done about both decimal marks in one file.
const MIXED: &str = "both read as decimal";

impl Reader {
    /// Decides the clock and what each column is added to; asks for the memory.
    pub(super) fn plan(&mut self) -> Result<()> {
        let mut columns: Vec<(String, Vec<Column>)> = self
            .files
            .iter_mut()
            .map(|file| (file.name.clone(), std::mem::take(&mut file.columns)))
            .collect();
        roles::check_stated(&columns, &self.terms)?;
        let planned = roles::plan(&mut columns, &mut self.findings);
        for (file, (_, columns)) in self.files.iter_mut().zip(columns) {
            file.columns = columns;
        }
        planned?;
        let zone = self.clock_zone()?;
        self.stamp_findings();
        self.label_stamps();
        let whole = self.typical_years();
        let stamped: Vec<Stamped> = self
            .files
            .iter()
            .filter_map(|file| {
                Some(Stamped {
                    name: &file.name,
                    stats: &file.scanned.as_ref()?.stats,
                    late: file.late,
                    anchors: !file.typical,
                })
            })
            .collect();
        let rows = stamped.iter().map(|file| file.stats.rows).sum();
        let grid = grid::find(&stamped, &self.terms, zone, whole, &mut self.findings)?;
        let lanes = self.lanes(&grid);
        grid.estimate(self.sums.series, rows)?;
        let intervals = grid.clock.intervals;
        for _ in 0..self.sums.series {
            self.table.series.push(Series::missing(intervals)?);
        }
        self.table.seen = vec![Bits::new(intervals); lanes];
        self.grid = Some(grid);
        Ok(())
    }

    /// The zone of the record's clock.
    fn clock_zone(&self) -> Result<Zone> {
        let counted = |file: &File| file.timing.counted();
        if self.files.iter().any(counted) {
            if let Some(other) = self.files.iter().find(|file| !counted(file)) {
                return Err(Fault::new(
                    "one file counts time from its start while another has dates",
                    other.name.clone(),
                    "Choose files whose stamps are of one kind.",
                ));
            }
            return Ok(Zone::Unstated);
        }
        if let Some(zone) = &self.zone {
            return Ok(Zone::Named(zone.clone()));
        }
        let offset = |file: &File| file.scanned.as_ref().and_then(|scanned| scanned.offset_s);
        match self.files.iter().find_map(offset) {
            None => Ok(Zone::Unstated),
            Some(seconds) => {
                match self.files.iter().find(|file| offset(file).is_none() && !file.yearless()) {
                    None => Ok(Zone::Fixed(seconds)),
                    Some(file) => Err(Fault::new(
                        "one file states its offset from UTC and another does not",
                        file.name.clone(),
                        "State the zone of the stamps (record.zone).",
                    )),
                }
            }
        }
    }

    fn stamp_findings(&mut self) {
        for file in &self.files {
            let Some(scanned) = &file.scanned else { continue };
            if file.dialect.marks.mixed && !self.findings.iter().any(|found| found.remedy == MIXED) {
                self.findings.push(Finding {
                    kind: FindingKind::Text,
                    count: 1,
                    first_row: Some(file.dialect.first_row),
                    file: file.name.clone(),
                    remedy: MIXED.to_owned(),
                    text: "Some cells have a decimal point and others a decimal comma: a lone mark is taken as decimal in either.".to_owned(),
                    changes_figures: true,
                });
            }
            let column = file.timing.column().and_then(|column| file.dialect.headers.get(column));
            let header = quote(column.map_or("", String::as_str));
            let (text, remedy, changes) = match file.timing {
                Timing::Counter { unit_us, unit_known, .. } => {
                    let unit = match unit_us / 1_000_000 {
                        1 => "seconds",
                        60 => "minutes",
                        86_400 => "days",
                        _ => "hours",
                    };
                    let guess = if unit_known { "" } else { " (the unit is a guess)" };
                    (
                        format!(
                            "Column {header} counts {unit}{guess} and no date is stated: the record's clock starts from 1970-01-01 00:00."
                        ),
                        "clock started at 1970-01-01",
                        !unit_known,
                    )
                }
                Timing::Rows(step_us) => (
                    format!(
                        "The table has no stamps: its rows are taken {} apart, as stated, from 1970-01-01 00:00 on.",
                        grid::people_duration(step_us as f64 / 1e6)
                    ),
                    "clock started at 1970-01-01",
                    false,
                ),
                Timing::Serial(_) => (
                    format!(
                        "Column {header} holds days as spreadsheets count them from 1899-12-30; they are read as local stamps."
                    ),
                    "read as dates",
                    false,
                ),
                _ if scanned.doubt => {
                    (format!("The order of day and month is a guess: {}.", scanned.why), scanned.words, true)
                }
                _ => continue,
            };
            self.findings.push(Finding {
                kind: FindingKind::StampDoubt,
                count: 1,
                first_row: None,
                file: file.name.clone(),
                remedy: remedy.to_owned(),
                text,
                changes_figures: changes,
            });
        }
    }
}
