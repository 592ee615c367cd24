//! The first pass over a file: what all its stamps say of their order, step and span.

use std::collections::BTreeMap;

use csv::ByteRecord;

use super::number::Marks;
use super::stamp::DAY;
use super::timing::{Moment, Timing};
use super::zone::Resolver;
use crate::case::DateOrder;

/// Most instants kept to find where on the clock the steps lie.
const SAMPLE: usize = 4096;

/// Most different distances between stamps that are counted.
const DISTANCES: usize = 4096;

/// A leap between rows that no gap of a meter explains, and how many are kept.
const LEAP: i64 = 180 * DAY;
const MOST_LEAPS: usize = 64;

/// Length of the blocks in which rows are counted over time.
pub(super) const BLOCK: i64 = 30 * DAY;

/// Rows in a block of time.
#[derive(Debug, Clone, Copy)]
pub(super) struct Block {
    pub(super) rows: u64,
    pub(super) first_row: u64,
    pub(super) least: i64,
    pub(super) most: i64,
}

/// What the stamps say when read in one order.
#[derive(Debug, Clone)]
pub(super) struct Stats {
    /// Rows with a stamp.
    pub(super) rows: u64,
    /// Distances between consecutive stamps (microseconds, either way) and how often each comes.
    pub(super) distances: BTreeMap<i64, u64>,
    /// The longest run of rows that keep a distance.
    pub(super) runs: BTreeMap<i64, u64>,
    /// Instants before and after each of the first leaps of more than half a year.
    pub(super) leaps: Vec<(i64, i64)>,
    /// First and last instant in the order of the rows.
    pub(super) ends: Option<(i64, i64)>,
    /// Rows per block of time.
    pub(super) blocks: BTreeMap<i64, Block>,
    /// The first instants.
    pub(super) sample: Vec<i64>,
    before: Option<i64>,
    current: Option<(i64, Block)>,
    run: (i64, u64),
}

#[derive(Debug, Clone)]
struct Candidate {
    order: DateOrder,
    resolver: Resolver,
    stats: Stats,
    /// Rows that other orders can read and this one cannot, and the first of them.
    refuted: u64,
    refuted_by: Option<u64>,
}

/// The first pass over one file.
#[derive(Debug)]
pub(super) struct Scan {
    timing: Timing,
    marks: Marks,
    /// One candidate while every stamp is clear, then one for each order possible.
    candidates: Vec<Candidate>,
    open: Vec<DateOrder>,
    offset_s: Option<i32>,
    halves: bool,
    /// Rows whose stamp is written as 24:00.
    day_ends: u64,
    /// Rows whose stamp states no year.
    yearless: u64,
    mark: u8,
    record: ByteRecord,
    /// Rows of values so far.
    nth: i64,
}

/// What the first pass found.
#[derive(Debug)]
pub(super) struct Scanned {
    pub(super) order: DateOrder,
    /// The order in words, and why it was taken.
    pub(super) words: &'static str,
    pub(super) why: String,
    /// Whether the order is a guess.
    pub(super) doubt: bool,
    /// The offset that the first stamp with one states.
    pub(super) offset_s: Option<i32>,
    /// Rows whose stamp is written as 24:00, the end of its day.
    pub(super) day_ends: u64,
    /// Whether the stamps state no year.
    pub(super) yearless: bool,
    pub(super) stats: Stats,
}

impl Scan {
    pub(super) fn new(timing: Timing, marks: Marks, resolver: Resolver, stated: Option<DateOrder>) -> Self {
        let order = stated.unwrap_or(DateOrder::DayFirst);
        let open = match stated {
            None if timing.dated() => vec![DateOrder::MonthFirst, DateOrder::YearFirst],
            _ => Vec::new(),
        };
        let candidate = Candidate { order, resolver, stats: Stats::new(), refuted: 0, refuted_by: None };
        Self {
            timing,
            marks,
            candidates: vec![candidate],
            open,
            offset_s: None,
            halves: false,
            day_ends: 0,
            yearless: 0,
            mark: 0,
            record: ByteRecord::new(),
            nth: 0,
        }
    }

    /// The buffer for the next row.
    pub(super) fn buffer(&mut self) -> &mut ByteRecord {
        &mut self.record
    }

    /// Takes the row in the buffer.
    pub(super) fn row(&mut self, row: u64) {
        let nth = self.nth;
        self.nth += 1;
        let Self { timing, marks, candidates, open, record, .. } = self;
        if candidates.len() == 1 {
            let first = timing.read(record, candidates[0].order, *marks, nth);
            if let Some(moment) = first
                && (moment.clear || open.is_empty())
            {
                self.note(moment);
                self.candidates[0].push(row, moment);
                return;
            }
            if first.is_none() && open.iter().all(|order| timing.read(record, *order, *marks, nth).is_none())
            {
                return;
            }
            // The first stamp that could be read in several orders: from here each is followed.
            for order in open.drain(..) {
                candidates.push(Candidate { order, ..candidates[0].clone() });
            }
        }
        let mut moments = [None; 3];
        for (candidate, moment) in candidates.iter().zip(&mut moments) {
            if !candidate.hopeless() {
                *moment = timing.read(record, candidate.order, *marks, nth);
            }
        }
        let Some(any) = moments.iter().flatten().next().copied() else { return };
        for (candidate, moment) in candidates.iter_mut().zip(moments) {
            if let Some(moment) = moment {
                candidate.push(row, moment);
            } else {
                candidate.refuted += 1;
                candidate.refuted_by.get_or_insert(row);
            }
        }
        self.note(any);
    }

    fn note(&mut self, moment: Moment) {
        if self.offset_s.is_none() {
            self.offset_s = moment.offset_s;
        }
        self.halves |= moment.halves;
        self.day_ends += u64::from(moment.day_end);
        self.yearless += u64::from(moment.yearless);
        self.mark = moment.mark;
    }

    /// Decides at the end of the file.
    pub(super) fn finish(mut self, stated: bool) -> Scanned {
        for candidate in &mut self.candidates {
            candidate.stats.settle();
        }
        let single = self.candidates.len() == 1;
        // Sorting is stable, so that equals keep their order: day first, month first, year first.
        let favourite =
            if self.mark == b'/' && self.halves { DateOrder::MonthFirst } else { DateOrder::DayFirst };
        self.candidates.sort_by_key(|candidate| {
            (candidate.refuted, candidate.stats.irregular(), candidate.order != favourite)
        });
        let mut candidates = self.candidates.into_iter();
        let Some(best) = candidates.next() else {
            return Scanned {
                order: favourite,
                words: words(favourite),
                why: String::new(),
                doubt: false,
                offset_s: None,
                day_ends: 0,
                yearless: false,
                stats: Stats::new(),
            };
        };
        let next = candidates.next();
        let (why, doubt) = match (&next, self.timing) {
            (_, Timing::Unix { .. }) => ("the numbers count from 1970 in UTC".to_owned(), false),
            (_, Timing::Serial(_)) => ("the numbers are days as spreadsheets count them".to_owned(), false),
            (_, Timing::Rows(_)) => ("rows follow each other at the step stated".to_owned(), false),
            (_, Timing::Counter { .. }) => ("the column counts from the record's start".to_owned(), false),
            _ if stated => ("as stated".to_owned(), false),
            (None, _) => {
                ("every stamp shows its year in four digits first, or its month by name".to_owned(), false)
            }
            (Some(next), _) if next.refuted > best.refuted => {
                let row = next.refuted_by.unwrap_or(0);
                (format!("row {row} makes a date only if read so"), false)
            }
            (Some(next), _) if next.stats.irregular() > best.stats.irregular() => {
                ("only if read so do the stamps keep a regular step".to_owned(), false)
            }
            _ if best.order == DateOrder::MonthFirst => (
                "the dates would read either way; with slashes and AM or PM the month is taken to come first"
                    .to_owned(),
                true,
            ),
            _ => ("the dates would read either way; the day is taken to come first".to_owned(), true),
        };
        let order = best.order;
        let words = match self.timing {
            Timing::Unix { .. } => "count since 1970",
            Timing::Serial(_) => "spreadsheet days",
            Timing::Rows(_) => "none, rows counted",
            Timing::Counter { .. } => "count from the start",
            _ if single && !stated => "year first",
            _ => words(order),
        };
        Scanned {
            order,
            words,
            why,
            doubt,
            offset_s: self.offset_s,
            day_ends: self.day_ends,
            yearless: self.yearless > 0 && self.yearless * 2 > best.stats.rows,
            stats: best.stats,
        }
    }
}

/// An order in words.
pub(super) fn words(order: DateOrder) -> &'static str {
    match order {
        DateOrder::YearFirst => "year first",
        DateOrder::DayFirst => "day first",
        DateOrder::MonthFirst => "month first",
    }
}

impl Candidate {
    /// Whether so many rows speak against the order that it need not be followed: it could not win any more unless
    /// nearly all later rows spoke for it.
    fn hopeless(&self) -> bool {
        self.refuted > 1000 && self.refuted * 4 > self.stats.rows
    }

    fn push(&mut self, row: u64, moment: Moment) {
        if let Some(instant) = self.resolver.moment(&moment) {
            self.stats.push(row, instant);
        }
    }
}

impl Stats {
    fn new() -> Self {
        Self {
            rows: 0,
            distances: BTreeMap::new(),
            runs: BTreeMap::new(),
            leaps: Vec::new(),
            ends: None,
            blocks: BTreeMap::new(),
            sample: Vec::new(),
            before: None,
            current: None,
            run: (0, 0),
        }
    }

    fn push(&mut self, row: u64, instant: i64) {
        self.rows += 1;
        if self.sample.len() < SAMPLE {
            self.sample.push(instant);
        }
        // Files may run from the newest row to the oldest, so distances count both ways.
        if let Some(before) = self.before
            && instant != before
        {
            let distance = (instant - before).abs();
            if distance == self.run.0 {
                self.run.1 += 1;
            } else {
                self.settle_run();
                self.run = (distance, 1);
            }
            if distance > LEAP && self.leaps.len() < MOST_LEAPS {
                self.leaps.push((before, instant));
            }
        }
        self.ends = Some((self.ends.map_or(instant, |ends| ends.0), instant));
        self.before = Some(instant);
        let key = instant.div_euclid(BLOCK);
        match &mut self.current {
            Some((block_key, block)) if *block_key == key => {
                block.rows += 1;
                block.least = block.least.min(instant);
                block.most = block.most.max(instant);
            }
            _ => {
                self.settle_block();
                self.current = Some((key, Block { rows: 1, first_row: row, least: instant, most: instant }));
            }
        }
    }

    fn settle_run(&mut self) {
        let (distance, count) = self.run;
        if count > 0 && (self.distances.len() < DISTANCES || self.distances.contains_key(&distance)) {
            *self.distances.entry(distance).or_insert(0) += count;
            let longest = self.runs.entry(distance).or_insert(0);
            *longest = (*longest).max(count);
        }
    }

    fn settle_block(&mut self) {
        if let Some((key, block)) = self.current.take() {
            let into = self.blocks.entry(key).or_insert(Block { rows: 0, ..block });
            into.rows += block.rows;
            into.least = into.least.min(block.least);
            into.most = into.most.max(block.most);
        }
    }

    fn settle(&mut self) {
        self.settle_run();
        self.run = (0, 0);
        self.settle_block();
    }

    /// Rows that do not stand one usual distance after the row before.
    fn irregular(&self) -> u64 {
        self.rows.saturating_sub(self.distances.values().copied().max().unwrap_or(0))
    }
}
