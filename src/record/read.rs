//! The stage's door: sources to a record in two passes, in slices.

use jiff::tz::TimeZone;

use super::decode::{self, Container, Decoded};
use super::dialect::Dialect;
use super::fill::{FilePlan, Fill, Table};
use super::grid::{self, Grid};
use super::made::Made;
use super::roles::Column;
use super::rows::Rows;
use super::scan::{Scan, Scanned};
use super::settle::{Settle, Settled, Sums};
use super::shape::{Shape, Shaped};
use super::timing::Timing;
use super::zone::Resolver;
use super::{FileReading, Finding, Reading, Record, Source, Zone};
use crate::case::{RecordCase, Values};
use crate::fault::{Fault, Result, quote};
use crate::job::{Job, Progress};

mod look;
mod plan;
mod table;

use look::Look;
use table::Surveyed;

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
        total: 1,
        sources: Vec::new(),
        look: Look::new(sources),
        terms: terms.clone(),
        named: named.to_vec(),
        zone,
        files: Vec::new(),
        plans: Vec::new(),
        grid: None,
        table: Table::default(),
        sums: Sums::default(),
        findings: Vec::new(),
        stage: Stage::Look,
        at: 0,
        passed: 0,
    })
}

/// A record being read; see [`read`].
pub struct Reader {
    site: String,
    /// What is still to be looked at.
    look: Look,
    /// The tables found.
    sources: Vec<Option<Box<dyn Source>>>,
    terms: RecordCase,
    named: Vec<String>,
    zone: Option<TimeZone>,
    files: Vec<File>,
    plans: Vec<Option<FilePlan>>,
    grid: Option<Grid>,
    table: Table,
    sums: Sums,
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
    /// The source that it is in.
    source: usize,
    container: Container,
    made: Made,
    dialect: Dialect,
    shape: Shape,
    timing: Timing,
    columns: Vec<Column>,
    scanned: Option<Scanned>,
    /// Whether stamps mark the end of their interval, and why that is taken.
    late: bool,
    late_why: String,
    /// Whether it is a typical year, and the years that it is laid on.
    typical: bool,
    years: Vec<i64>,
}

#[allow(clippy::large_enum_variant, reason = "there is one stage at a time")]
enum Stage {
    Look,
    Survey(Box<Surveyed>),
    Scan(Shaped<Decoded>, Scan),
    Plan,
    Fill(Option<(Shaped<Decoded>, Fill)>),
    Settle(Settle),
    Done,
}

impl Reader {
    /// The sources again, for another reading: of an archive, a workbook or a file of records the tables found in it. One that
    /// was lost to a fault of the system is left out.
    pub fn into_sources(mut self) -> Vec<Box<dyn Source>> {
        let at = self.at;
        match std::mem::replace(&mut self.stage, Stage::Done) {
            Stage::Survey(surveyed) => {
                let at = surveyed.source;
                self.sources[at] = Some(surveyed.rows.into_text().into_source());
            }
            Stage::Scan(rows, _) | Stage::Fill(Some((rows, _))) => self.give_back(at, rows),
            _ => {}
        }
        self.sources.into_iter().flatten().chain(self.look.into_sources()).collect()
    }

    /// Gives back the source of file `at`.
    fn give_back(&mut self, at: usize, rows: Shaped<Decoded>) {
        if let Some(slot) = self.files.get(at).and_then(|file| self.sources.get_mut(file.source)) {
            *slot = Some(rows.into_text().into_source());
        }
    }

    fn open(&mut self, at: usize) -> Result<Shaped<Decoded>> {
        let file = self.files.get(at);
        let source = file.and_then(|file| self.sources.get_mut(file.source)).and_then(Option::take);
        match (source, file) {
            (Some(source), Some(file)) => {
                let text = Decoded::open(source, &file.container);
                let rows = Rows::new(text, file.dialect.separator).numbered(file.made.runs.clone());
                Ok(Shaped::new(rows, file.shape.clone(), file.dialect.first_row))
            }
            _ => Err(Fault::new("a file is no longer there", self.site.clone(), "Choose the files again.")),
        }
    }

    /// Begins the first pass.
    fn begin(&mut self) -> Result<()> {
        self.total = (0..self.files.len()).map(|at| self.len(at)).sum::<u64>().max(1);
        self.at = 0;
        self.start_scan()
    }

    /// Length in bytes of the source of file `at`.
    fn len(&self, at: usize) -> u64 {
        let source = self.files.get(at).and_then(|file| self.sources.get(file.source)?.as_ref());
        source.map_or(0, |source| source.len())
    }

    fn start_scan(&mut self) -> Result<()> {
        let rows = self.open(self.at)?;
        let file = &self.files[self.at];
        let scan = Scan::new(
            file.timing,
            file.dialect.marks,
            file.resolver(self.zone.as_ref()),
            self.terms.date_order,
        );
        self.stage = Stage::Scan(rows, scan);
        Ok(())
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
        let counted = self.files.iter().any(|file| file.timing.counted());
        self.stage = Stage::Settle(Settle::new(
            std::mem::take(&mut self.table),
            std::mem::take(&mut self.sums),
            grid.clock.clone(),
            &self.terms,
            grid.fits.iter().map(|fit| fit.step_us).max().unwrap_or(grid.clock.step_us),
            counted,
        ));
    }

    fn record(&mut self, settle: Settle) -> Result<Record> {
        let names: Vec<String> = self.files.iter().map(|file| file.name.clone()).collect();
        let Settled { clock, targets: [supply_kw, demand_kw, net_kw], extras, filled, hidden_kw } =
            settle.finish(&names, &mut self.findings)?;
        let Some(grid) = self.grid.take() else {
            return Err(Fault::new("the record has no clock", self.site.clone(), "Report this as a defect."));
        };
        let reading = Reading {
            files: self.files.iter().map(File::reading).collect(),
            clock_note: self.clock_note(&grid),
        };
        let mut findings = std::mem::take(&mut self.findings);
        let one = self.sources.len() == 1;
        for finding in &mut findings {
            if one {
                finding.file.clear();
            }
        }
        findings.sort_by_key(|finding| finding.first_row.unwrap_or(0));
        Ok(Record {
            site: self.site.clone(),
            clock,
            supply_kw,
            demand_kw,
            net_kw,
            hidden_kw,
            extras,
            findings,
            reading,
            filled,
        })
    }

    fn clock_note(&self, grid: &Grid) -> String {
        let mut marks: Vec<String> = Vec::new();
        let samples = self.terms.reading == Values::Samples;
        for file in &self.files {
            let end = if file.late { "end" } else { "start" };
            let why = if file.late_why.is_empty() { String::new() } else { format!(" ({})", file.late_why) };
            let mark = if samples {
                "Values are samples at the moment of their stamp, joined by straight lines; the change between surplus and deficit is found on the line".to_owned()
            } else {
                format!("The stamp marks the interval's {end}{why}")
            };
            if !marks.contains(&mark) {
                marks.push(mark);
            }
        }
        let mark = marks.join("; ");
        let step = grid::people_duration(grid.clock.step_s());
        let zone = match (&grid.clock.zone, &self.terms.zone) {
            (Zone::Named(_), Some(name)) => format!("stamps are read in the zone {name}"),
            (Zone::Named(_), None) => "stamps are read in the zone stated".to_owned(),
            (Zone::Fixed(_), _) => "stamps state their offset from UTC".to_owned(),
            (Zone::Unstated, _) => {
                "no zone is stated, so that stamps are taken as they stand, without summer time".to_owned()
            }
        };
        format!("{mark}; the step is {step}; {zone}.")
    }
}

impl File {
    /// What turns the file's stamps into instants.
    fn resolver(&self, zone: Option<&TimeZone>) -> Resolver {
        if self.timing.counted() {
            return Resolver::new(None, false);
        }
        Resolver::new(zone.cloned(), self.falling())
    }

    /// Whether rows run from the newest to the oldest.
    fn falling(&self) -> bool {
        let moment = |row: Option<&(u64, csv::ByteRecord)>| {
            self.timing
                .read(&row?.1, crate::case::DateOrder::DayFirst, self.dialect.marks, 0)
                .map(|moment| moment.us)
        };
        moment(self.dialect.rows.first()) > moment(self.dialect.rows.last())
    }

    /// How the file was read, for the page.
    fn reading(&self) -> FileReading {
        let dialect = &self.dialect;
        FileReading {
            name: self.name.clone(),
            container: self.container.words.clone(),
            sheets: self.made.sheets.clone(),
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
                    let done = self.look()?;
                    left = left.saturating_sub(10_000);
                    if let Some(surveyed) = self.look.surveys.pop_front() {
                        self.open_survey(surveyed)?;
                    } else if done {
                        self.begin()?;
                    } else if self.waits() {
                        return Ok(None);
                    }
                }
                Stage::Survey(surveyed) => {
                    let mut ended = false;
                    while left > 0 {
                        let row = surveyed
                            .rows
                            .next(&mut surveyed.survey.record)
                            .map_err(|error| decode::row_fault(&error, &self.site))?;
                        let Some(row) = row else {
                            ended = true;
                            break;
                        };
                        surveyed.rows.text_mut().row_done();
                        surveyed.survey.row(row)?;
                        left -= 1;
                    }
                    if ended && let Stage::Survey(surveyed) = std::mem::replace(&mut self.stage, Stage::Look)
                    {
                        self.surveyed(*surveyed)?;
                    }
                }
                Stage::Scan(rows, scan) => {
                    let first = self.files[at].dialect.first_row;
                    let mut ended = false;
                    while left > 0 {
                        let row = rows
                            .next(scan.buffer(), Decoded::row_done)
                            .map_err(|error| decode::row_fault(&error, &self.files[at].name))?;
                        let Some(row) = row else {
                            ended = true;
                            break;
                        };
                        if row >= first {
                            scan.row(row);
                        }
                        left -= 1;
                    }
                    if ended && let Stage::Scan(rows, scan) = std::mem::replace(&mut self.stage, Stage::Plan)
                    {
                        self.hidden(at, rows.text().hidden());
                        self.give_back(at, rows);
                        self.files[at].scanned = Some(scan.finish(self.terms.date_order.is_some()));
                        self.passed += self.len(at);
                        self.at += 1;
                        if self.at < self.files.len() {
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
                    let Some(grid) = &self.grid else {
                        return Err(Fault::new(
                            "the record has no clock",
                            self.site.clone(),
                            "Report this as a defect.",
                        ));
                    };
                    let mut ended = false;
                    while left > 0 {
                        let row = rows
                            .next(fill.buffer(), Decoded::row_done)
                            .map_err(|error| decode::row_fault(&error, &self.files[at].name))?;
                        let Some(row) = row else {
                            ended = true;
                            break;
                        };
                        fill.row(row, grid, &mut self.table)?;
                        left -= 1;
                    }
                    if ended
                        && let Stage::Fill(Some((rows, mut fill))) =
                            std::mem::replace(&mut self.stage, Stage::Fill(None))
                    {
                        fill.last(grid, &mut self.table)?;
                        fill.finish(&mut self.findings);
                        self.give_back(at, rows);
                        self.passed += self.len(at);
                        self.at += 1;
                        if self.at < self.files.len() { self.start_fill()? } else { self.start_settle() }
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
            Stage::Look | Stage::Survey(_) => Progress { what: "looking at the files", done: 0.0 },
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
