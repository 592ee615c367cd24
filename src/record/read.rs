//! The stage's door: sources to a record in two passes, in slices.

use jiff::tz::TimeZone;

use super::decode::{self, Container, Decoded};
use super::dialect::{self, Dialect};
use super::fill::{Bits, FilePlan, Fill, Table, Use};
use super::grid::{self, Grid, Stamped};
use super::roles::{self, Column, Target};
use super::rows::Rows;
use super::scan::{Scan, Scanned};
use super::settle::{Settle, Settled, Shape};
use super::timing::{self, Timing};
use super::zone::Resolver;
use super::{FileReading, Finding, FindingKind, Reading, Record, Role, Series, Source, Zone};
use crate::case::{RecordCase, Stamp, Values};
use crate::fault::{Fault, Result, quote};
use crate::job::{Job, Progress};

/// Reads the files of one site into a record.
///
/// `site` names the site. All `sources` are read together on one clock; `terms` says what of the reading a person chose,
/// the rest is guessed and said in [`Record::reading`]. Columns `named` by a duty (by header or `file/header`) are kept as
/// extras whatever else they stand for.
///
/// The work is done in slices by [`Job::advance`]; [`Reader::into_sources`] gives the sources back, so that a site can be
/// read again with other terms.
///
/// # Errors
/// If there is no source, or a term cannot be followed. Faults of the files come from the slices.
///
/// ```
/// use millpond::{case::RecordCase, job::finish, record::{Memory, read}};
/// let text = "time;PV [kW];Last [kW]\n31.01.2026 00:00;0,0;4,5\n31.01.2026 00:15;0,0;4,25\n";
/// let record = finish(read("farm", vec![Box::new(Memory::new("farm.csv", text))], &RecordCase::default(), &[])?)?;
/// assert_eq!(record.clock.step_s(), 900.0);
/// assert_eq!(record.net_kw(1), Some(-4.25));
/// let fault = finish(read("farm", vec![Box::new(Memory::new("farm.csv", "nothing"))], &RecordCase::default(), &[])?);
/// assert!(fault.unwrap_err().place.contains("farm.csv"));
/// # Ok::<(), millpond::fault::Fault>(())
/// ```
pub fn read(
    site: &str,
    sources: Vec<Box<dyn Source>>,
    terms: &RecordCase,
    named: &[String],
) -> Result<Reader> {
    if sources.is_empty() {
        return Err(Fault::new("there is no file to read", site, "Choose the site's meter file."));
    }
    if terms.reading == Values::Samples {
        return Err(Fault::new(
            "the case says that values are samples; this version reads averages of intervals",
            "case, at record.reading",
            "Set record.reading to intervals, or average the samples over intervals first.",
        ));
    }
    let zone = match &terms.zone {
        None => None,
        Some(name) => Some(TimeZone::get(name).map_err(|_unknown| {
            Fault::new(
                format!("the zone {} is not known", quote(name)),
                "case, at record.zone",
                "Give a name of the IANA list, such as Europe/Berlin or America/New_York.",
            )
        })?),
    };
    Ok(Reader {
        site: site.to_owned(),
        total: sources.iter().map(|source| source.len()).sum::<u64>().max(1),
        sources: sources.into_iter().map(Some).collect(),
        terms: terms.clone(),
        named: named.to_vec(),
        zone,
        files: Vec::new(),
        plans: Vec::new(),
        grid: None,
        table: Table::default(),
        shape: Shape::default(),
        findings: Vec::new(),
        stage: Stage::Look,
        at: 0,
        passed: 0,
    })
}

/// A record being read; see [`read`].
pub struct Reader {
    site: String,
    sources: Vec<Option<Box<dyn Source>>>,
    terms: RecordCase,
    named: Vec<String>,
    zone: Option<TimeZone>,
    files: Vec<File>,
    plans: Vec<Option<FilePlan>>,
    grid: Option<Grid>,
    table: Table,
    shape: Shape,
    findings: Vec<Finding>,
    stage: Stage,
    /// The file that the stage is at.
    at: usize,
    total: u64,
    /// Bytes of the files that this pass is done with.
    passed: u64,
}

impl std::fmt::Debug for Reader {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Reader")
            .field("site", &self.site)
            .field("progress", &self.progress())
            .finish_non_exhaustive()
    }
}

/// What is known of a file.
struct File {
    name: String,
    container: Container,
    dialect: Dialect,
    timing: Timing,
    columns: Vec<Column>,
    scanned: Option<Scanned>,
}

#[allow(clippy::large_enum_variant, reason = "there is one stage at a time")]
enum Stage {
    Look,
    Scan(Rows<Decoded>, Scan),
    Plan,
    Fill(Option<(Rows<Decoded>, Fill)>),
    Settle(Settle),
    Done,
}

impl Reader {
    /// The sources again, for another reading. One that was lost to a fault of the system is left out.
    pub fn into_sources(mut self) -> Vec<Box<dyn Source>> {
        let at = self.at;
        match std::mem::replace(&mut self.stage, Stage::Done) {
            Stage::Scan(rows, _) | Stage::Fill(Some((rows, _))) => self.give_back(at, rows),
            _ => {}
        }
        self.sources.into_iter().flatten().collect()
    }

    fn give_back(&mut self, at: usize, rows: Rows<Decoded>) {
        if let Some(slot) = self.sources.get_mut(at) {
            *slot = Some(rows.into_text().into_source());
        }
    }

    fn open(&mut self, at: usize) -> Result<Rows<Decoded>> {
        let source = self.sources.get_mut(at).and_then(Option::take);
        match (source, self.files.get(at)) {
            (Some(source), Some(file)) => {
                Ok(Rows::new(Decoded::open(source, &file.container), file.dialect.separator))
            }
            _ => Err(Fault::new("a file is no longer there", self.site.clone(), "Choose the files again.")),
        }
    }

    /// Looks at the head of the file at hand: container, dialect, stamps, columns.
    fn look(&mut self) -> Result<()> {
        let Some(source) = self.sources.get_mut(self.at).and_then(Option::take) else { return Ok(()) };
        let name = source.name().to_owned();
        let (source, looked) = decode::look(source);
        self.sources[self.at] = Some(source);
        let (container, head) = looked?;
        let dialect = dialect::decide(&name, &head, &self.terms)?;
        let stated =
            |column: usize| roles::stated(&self.terms.roles, &name, &dialect.headers[column]).copied();
        let timing = timing::choose(&name, &dialect, &stated)?;
        let columns = roles::columns(&name, &dialect, timing, &self.terms, &self.named)?;
        self.files.push(File { name, container, dialect, timing, columns, scanned: None });
        Ok(())
    }

    fn start_scan(&mut self) -> Result<()> {
        let rows = self.open(self.at)?;
        let file = &self.files[self.at];
        let scan = Scan::new(file.timing, file.dialect.marks, self.zone.clone(), self.terms.date_order);
        self.stage = Stage::Scan(rows, scan);
        Ok(())
    }

    /// Decides the clock and what each column is added to; asks for the memory.
    fn plan(&mut self) -> Result<()> {
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
        self.shape.targets.iter().map(Vec::len).sum::<usize>() + self.shape.extras.len()
    }

    /// The zone of the record's clock.
    fn clock_zone(&self) -> Result<Zone> {
        let counted = |file: &File| matches!(file.timing, Timing::Counter { .. });
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
            let header = quote(&file.dialect.headers[file.timing.column()]);
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
                            self.shape.targets[*target as usize].push(count);
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
                    let known = self.shape.extras.iter().find(|(header, _, _)| roles::key(header) == wanted);
                    let series = known.map(|known| known.2).unwrap_or_else(|| {
                        let role = if column.role == Role::Ignore { Role::Asked } else { column.role };
                        self.shape.extras.push((column.header.clone(), role, count));
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
            let zone = if matches!(file.timing, Timing::Counter { .. }) { None } else { self.zone.clone() };
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
                resolver: Resolver::new(zone),
            }));
        }
        lanes.len()
    }

    fn start_fill(&mut self) -> Result<()> {
        let rows = self.open(self.at)?;
        self.stage = Stage::Fill(
            self.plans.get_mut(self.at).and_then(Option::take).map(|plan| (rows, Fill::new(plan))),
        );
        Ok(())
    }

    fn start_settle(&mut self) {
        let Some(grid) = &self.grid else { return };
        let counted = self.files.iter().any(|file| matches!(file.timing, Timing::Counter { .. }));
        self.stage = Stage::Settle(Settle::new(
            std::mem::take(&mut self.table),
            std::mem::take(&mut self.shape),
            grid.clock.clone(),
            self.terms.remedies.gap,
            counted,
        ));
    }

    fn record(&mut self, settle: Settle) -> Result<Record> {
        let names: Vec<String> = self.files.iter().map(|file| file.name.clone()).collect();
        let Settled { targets: [supply_kw, demand_kw, net_kw], extras, filled } =
            settle.finish(&names, &mut self.findings)?;
        let Some(grid) = self.grid.take() else {
            return Err(Fault::new("the record has no clock", self.site.clone(), "Report this as a defect."));
        };
        let reading = Reading {
            files: self.files.iter().map(File::reading).collect(),
            clock_note: self.clock_note(&grid),
        };
        let mut findings = std::mem::take(&mut self.findings);
        let one = names.len() == 1;
        for finding in &mut findings {
            if one {
                finding.file.clear();
            }
        }
        findings.sort_by_key(|finding| finding.first_row.unwrap_or(0));
        Ok(Record {
            site: self.site.clone(),
            clock: grid.clock,
            supply_kw,
            demand_kw,
            net_kw,
            extras,
            findings,
            reading,
            filled,
        })
    }

    fn clock_note(&self, grid: &Grid) -> String {
        let mark = match self.terms.stamp {
            Stamp::Start => "The stamp marks the interval's start",
            Stamp::End => "The stamp marks the interval's end",
        };
        let step = grid::people_duration(grid.clock.step_s());
        let zone = match (&grid.clock.zone, &self.terms.zone) {
            (Zone::Named(_), Some(name)) => format!("stamps are read in the zone {name}"),
            (Zone::Named(_), None) => "stamps are read in the zone stated".to_owned(),
            (Zone::Fixed(_), _) => "stamps state their offset from UTC".to_owned(),
            (Zone::Unstated, _) => {
                "no zone is stated, so that stamps are taken as they stand, without summer time".to_owned()
            }
        };
        let hours = self.files.iter().any(|file| matches!(file.timing, Timing::DateHour { first: 1, .. }));
        let hours = if hours { "; hours are counted from 1, so that hour 1 begins at 00:00" } else { "" };
        format!("{mark}; the step is {step}; {zone}{hours}.")
    }
}

impl File {
    /// How the file was read, for the page.
    fn reading(&self) -> FileReading {
        let dialect = &self.dialect;
        FileReading {
            name: self.name.clone(),
            container: self.container.words.clone(),
            separator: char::from(dialect.separator),
            decimal: char::from(dialect.marks.decimal),
            thousands: dialect.thousands,
            header_row: dialect.header_row,
            unit_row: dialect.unit_row,
            first_row: dialect.first_row,
            stamps: self.scanned.as_ref().map(|scanned| scanned.words.to_owned()).unwrap_or_default(),
            stamps_why: self.scanned.as_ref().map(|scanned| scanned.why.clone()).unwrap_or_default(),
            columns: self.columns.iter().map(Column::reading).collect(),
            sample: dialect
                .rows
                .iter()
                .take(5)
                .map(|(row, record)| (*row, record.iter().map(decode::text).collect()))
                .collect(),
        }
    }
}

impl Job for Reader {
    type Output = Record;

    fn advance(&mut self, budget: usize) -> Result<Option<Record>> {
        let mut left = budget.max(1);
        while left > 0 {
            let at = self.at;
            match &mut self.stage {
                Stage::Look => {
                    self.look()?;
                    left = left.saturating_sub(10_000);
                    self.at += 1;
                    if self.at == self.sources.len() {
                        self.at = 0;
                        self.start_scan()?;
                    }
                }
                Stage::Scan(rows, scan) => {
                    let first = self.files[at].dialect.first_row;
                    let mut ended = false;
                    while left > 0 {
                        let row = rows
                            .next(scan.buffer())
                            .map_err(|error| decode::row_fault(&error, &self.files[at].name))?;
                        let Some(row) = row else {
                            ended = true;
                            break;
                        };
                        rows.text_mut().row_done();
                        if row >= first {
                            scan.row(row);
                        }
                        left -= 1;
                    }
                    if ended && let Stage::Scan(rows, scan) = std::mem::replace(&mut self.stage, Stage::Plan)
                    {
                        self.give_back(at, rows);
                        self.files[at].scanned = Some(scan.finish(self.terms.date_order.is_some()));
                        self.passed += self.sources[at].as_ref().map_or(0, |source| source.len());
                        self.at += 1;
                        if self.at < self.sources.len() {
                            self.start_scan()?;
                        }
                    }
                }
                Stage::Plan => {
                    self.plan()?;
                    self.at = 0;
                    self.start_fill()?;
                }
                Stage::Fill(Some((rows, fill))) => {
                    let Some(grid) = &self.grid else { return Ok(None) };
                    let mut ended = false;
                    while left > 0 {
                        let row = rows
                            .next(fill.buffer())
                            .map_err(|error| decode::row_fault(&error, &self.files[at].name))?;
                        let Some(row) = row else {
                            ended = true;
                            break;
                        };
                        rows.text_mut().row_done();
                        fill.row(row, grid, &mut self.table)?;
                        left -= 1;
                    }
                    if ended
                        && let Stage::Fill(Some((rows, fill))) =
                            std::mem::replace(&mut self.stage, Stage::Fill(None))
                    {
                        fill.finish(&grid.clock, &mut self.findings);
                        self.give_back(at, rows);
                        self.passed += self.sources[at].as_ref().map_or(0, |source| source.len());
                        self.at += 1;
                        if self.at < self.sources.len() { self.start_fill()? } else { self.start_settle() }
                    }
                }
                Stage::Settle(settle) => {
                    if settle.advance(left)?
                        && let Stage::Settle(settle) = std::mem::replace(&mut self.stage, Stage::Done)
                    {
                        return self.record(settle).map(Some);
                    }
                    left = 0;
                }
                Stage::Fill(None) | Stage::Done => {
                    return Err(Fault::new(
                        "the record was read already",
                        self.site.clone(),
                        "Report this as a defect.",
                    ));
                }
            }
        }
        Ok(None)
    }

    fn progress(&self) -> Progress {
        // The two passes over the bytes, then the sums.
        let two = 2.0 * self.total as f64;
        let share = |offset: u64| ((self.passed + offset) as f64 / two).min(1.0) * 0.9;
        match &self.stage {
            Stage::Look => Progress { what: "looking at the files", done: 0.0 },
            Stage::Scan(rows, _) => Progress { what: "reading stamps", done: share(rows.text().offset()) },
            Stage::Plan => Progress { what: "finding the clock", done: share(0) },
            Stage::Fill(Some((rows, _))) => {
                Progress { what: "reading rows", done: share(rows.text().offset()) }
            }
            Stage::Fill(None) => Progress { what: "reading rows", done: share(0) },
            Stage::Settle(settle) => Progress { what: "adding up", done: 0.9 + 0.1 * settle.done() },
            Stage::Done => Progress { what: "done", done: 1.0 },
        }
    }
}
