//! Between the passes: clock, zone, what each column is added to, and the memory for it.

use super::super::fill::{Bits, FilePlan, Use};
use super::super::grid::{self, Grid, Stamped};
use super::super::roles::{self, Column, Target};
use super::super::timing::Timing;
use super::super::{Finding, FindingKind, Role, Series, Zone};
use super::{File, Reader};
use crate::fault::{Fault, Result, quote};

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
        let stamped: Vec<Stamped> = self
            .files
            .iter()
            .filter_map(|file| Some(Stamped { name: &file.name, stats: &file.scanned.as_ref()?.stats }))
            .collect();
        let rows = stamped.iter().map(|file| file.stats.rows).sum();
        let grid = grid::find(&stamped, &self.terms, zone, &mut self.findings)?;
        let lanes = self.lanes(&grid);
        grid.estimate(self.series_count(), rows)?;
        let intervals = grid.clock.intervals;
        for _ in 0..self.series_count() {
            self.table.series.push(Series::missing(intervals)?);
        }
        self.table.seen = vec![Bits::new(intervals); lanes];
        self.grid = Some(grid);
        Ok(())
    }

    fn series_count(&self) -> usize {
        self.sums.targets.iter().map(Vec::len).sum::<usize>() + self.sums.extras.len()
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
            Some(seconds) => match self.files.iter().find(|file| offset(file).is_none()) {
                None => Ok(Zone::Fixed(seconds)),
                Some(file) => Err(Fault::new(
                    "one file states its offset from UTC and another does not",
                    file.name.clone(),
                    "State the zone of the stamps (record.zone).",
                )),
            },
        }
    }

    fn stamp_findings(&mut self) {
        for file in &self.files {
            let Some(scanned) = &file.scanned else { continue };
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

    /// Sorts files into lanes: files with the same sums that follow each other in time share one, files that overlap are
    /// added up. Returns the number of lanes.
    fn lanes(&mut self, grid: &Grid) -> usize {
        struct Lane {
            targets: Vec<Target>,
            series: Vec<usize>,
            spans: Vec<(i64, i64)>,
        }
        let mut lanes: Vec<Lane> = Vec::new();
        let mut count = 0;
        for (index, file) in self.files.iter().enumerate() {
            let mut targets: Vec<Target> =
                file.columns.iter().flat_map(|column| &column.into).map(|into| into.0).collect();
            targets.sort_unstable();
            targets.dedup();
            let span = file.scanned.as_ref().and_then(|scanned| grid.span(&scanned.stats)).unwrap_or((0, 0));
            let free = |lane: &Lane| {
                lane.spans.iter().all(|other| {
                    let shared = span.1.min(other.1) - span.0.max(other.0);
                    shared * 10 <= (span.1 - span.0).min(other.1 - other.0) && span.0 != other.0
                })
            };
            let lane =
                lanes.iter().position(|lane| lane.targets == targets && free(lane)).unwrap_or_else(|| {
                    let series = targets
                        .iter()
                        .map(|target| {
                            self.sums.targets[*target as usize].push(count);
                            count += 1;
                            count - 1
                        })
                        .collect();
                    lanes.push(Lane { targets: targets.clone(), series, spans: Vec::new() });
                    lanes.len() - 1
                });
            lanes[lane].spans.push(span);
            let mut slots = lanes[lane].series.clone();
            let mut uses = Vec::new();
            for (cell, column) in file.columns.iter().enumerate() {
                let mut into: Vec<(usize, f64)> = column
                    .into
                    .iter()
                    .filter_map(|(target, sign)| {
                        Some((targets.iter().position(|other| other == target)?, *sign))
                    })
                    .collect();
                if column.extra {
                    let wanted = roles::key(&column.header);
                    let known = self
                        .sums
                        .extras
                        .iter()
                        .find(|(header, _, _)| roles::key(header) == wanted)
                        .map(|known| known.2);
                    let series = known.unwrap_or_else(|| {
                        let role = if column.role == Role::Ignore { Role::Asked } else { column.role };
                        self.sums.extras.push((column.header.clone(), role, count));
                        count += 1;
                        count - 1
                    });
                    into.push((slots.len(), 1.0));
                    slots.push(series);
                }
                if !into.is_empty() {
                    let watched = matches!(
                        column.role,
                        Role::Supply | Role::Demand | Role::Generation | Role::Import | Role::Export
                    );
                    uses.push(Use::new(cell, column.header.clone(), column.unit, into, watched));
                }
            }
            self.plans.push(Some(FilePlan {
                index,
                name: file.name.clone(),
                timing: file.timing,
                order: file
                    .scanned
                    .as_ref()
                    .map_or(crate::case::DateOrder::DayFirst, |scanned| scanned.order),
                marks: file.dialect.marks,
                first_row: file.dialect.first_row,
                headers: file.dialect.headers.clone(),
                uses,
                slots,
                lane,
                repeat: self.terms.remedies.repeat,
                resolver: file.resolver(self.zone.as_ref()),
            }));
        }
        lanes.len()
    }
}
