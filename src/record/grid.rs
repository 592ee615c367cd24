//! The regular clock behind the stamps of all files: step, phase, first and last interval.

use super::scan::{BLOCK, Block, Stats};
use super::stamp::{DAY, SECOND};
use super::{Clock, Finding, Zone};
use crate::case::RecordCase;
use crate::fault::{Fault, Result};
use crate::units::people;

mod steps;

/// Most intervals of a record.
const MOST_INTERVALS: i64 = 200_000_000;

/// Most bytes that the series of a record may take.
const MOST_BYTES: i64 = 1_500_000_000;

/// The clock and what lies on it.
#[derive(Debug, Clone)]
pub(super) struct Grid {
    pub(super) clock: Clock,
    /// How each file's intervals lie on the clock.
    pub(super) fits: Vec<Fit>,
    /// Where the stamps leap furthest: file, row, distance in microseconds.
    leap: Option<(String, u64, i64)>,
}

/// How the intervals of a file lie on the clock.
#[derive(Debug, Clone, Copy)]
pub(super) struct Fit {
    /// Length of the file's intervals in microseconds.
    pub(super) step_us: i64,
    /// An instant at which one of its stamps lies, or would lie.
    pub(super) origin_us: i64,
    /// Whether a stamp marks the end of its interval.
    pub(super) late: bool,
    /// Steps of the clock in an interval.
    pub(super) cells: usize,
    /// Whether intervals are no whole steps of the clock, or of unequal length: their energy is dealt out.
    pub(super) spread: bool,
    /// Longest distance of stamps that is an interval and no gap, in microseconds.
    pub(super) longest_us: i64,
}

impl Fit {
    /// Start of the interval of a stamp, and how far the stamp lies off its place.
    pub(super) fn start(&self, instant: i64) -> (i64, i64) {
        let from = instant - self.origin_us;
        let nth = (from + self.step_us / 2).div_euclid(self.step_us);
        let start = self.origin_us + nth * self.step_us;
        (if self.late { start - self.step_us } else { start }, (from - nth * self.step_us).abs())
    }
}

/// One file as the first pass left it.
pub(super) struct Stamped<'a> {
    pub(super) name: &'a str,
    pub(super) stats: &'a Stats,
    /// Whether stamps mark the end of their interval.
    pub(super) late: bool,
    /// Whether its stamps say where the record begins and ends (those of a typical year do not).
    pub(super) anchors: bool,
}

/// Finds the clock. `span` is the record's span where no file's stamps say it.
pub(super) fn find(
    files: &[Stamped],
    terms: &RecordCase,
    zone: Zone,
    whole: Option<(i64, i64)>,
    findings: &mut Vec<Finding>,
) -> Result<Grid> {
    if files.iter().all(|file| file.stats.rows == 0) {
        let name = files.first().map_or("", |file| file.name);
        return Err(Fault::new(
            "no row holds a stamp that reads",
            name,
            "State the order of day and month, or which column holds the stamps.",
        ));
    }
    let paces = steps::paces(files, terms, findings)?;
    let finest = paces.iter().map(|pace| pace.step_us).min().unwrap_or(SECOND);
    let (least, most, leap) = match whole {
        Some((least, most)) => (least, most, None),
        None => span(files, finest)?,
    };
    let (step_us, phase, fits) = steps::align(files, &paces, terms, (least, most), findings);
    let mut bounds: Option<(i64, i64)> = None;
    for (file, fit) in files.iter().zip(&fits).filter(|(file, _)| file.anchors || whole.is_some()) {
        let own = if let Some((first, last)) = whole {
            Some((first, last - fit.step_us))
        } else {
            let inside = |at: &i64| (least..=most).contains(at);
            let first = file.stats.blocks.values().map(|block| block.least).filter(inside).min();
            first.zip(file.stats.blocks.values().map(|block| block.most).filter(inside).max())
        };
        let Some((first, last)) = own else { continue };
        // The smallest place not before the first stamp; stamps off the step are left out later.
        let tolerance = if fit.spread { 0 } else { fit.step_us / 20 };
        let place = |instant: i64| (instant - fit.origin_us).div_euclid(fit.step_us);
        let shift = if fit.late { fit.step_us } else { 0 };
        let (start, end) = if fit.spread {
            (first - shift, last + fit.step_us - shift)
        } else {
            let nth = place(first - tolerance + fit.step_us - 1);
            let end = place(last + tolerance).max(nth) + 1;
            (fit.origin_us + nth * fit.step_us - shift, fit.origin_us + end * fit.step_us - shift)
        };
        bounds = Some(bounds.map_or((start, end), |known| (known.0.min(start), known.1.max(end))));
    }
    let (start, end) = bounds.unwrap_or((least, most + step_us));
    let first = (start - phase).div_euclid(step_us);
    let last = (end - phase + step_us - 1).div_euclid(step_us).max(first + 1);
    let clock = Clock {
        start_us: phase + first * step_us,
        step_us,
        intervals: usize::try_from(last - first).unwrap_or(usize::MAX),
        zone,
    };
    Ok(Grid { clock, fits, leap })
}

impl Grid {
    /// The step of the clock that holds an instant; none outside.
    pub(super) fn step_at(&self, instant: i64) -> Option<usize> {
        let at = (instant - self.clock.start_us).div_euclid(self.clock.step_us);
        usize::try_from(at).ok().filter(|i| *i < self.clock.intervals)
    }

    /// First and last instant of a file's stamps that lie on the clock.
    pub(super) fn span(&self, stats: &Stats) -> Option<(i64, i64)> {
        let longest = self.fits.iter().map(|fit| fit.step_us).max().unwrap_or(0);
        let start = self.clock.start_us.saturating_sub(self.clock.step_us);
        let end = self.clock.at_us(self.clock.intervals).saturating_add(longest);
        let inside = || stats.blocks.values().filter(move |block| block.most >= start && block.least <= end);
        let least = inside().map(|block| block.least).min()?;
        let most = inside().map(|block| block.most).max()?;
        Some((least.max(start), most.min(end)))
    }

    /// Refuses a record that would not fit, before memory is asked for.
    pub(super) fn estimate(&self, series: usize, rows: u64) -> Result<()> {
        let intervals = i64::try_from(self.clock.intervals).unwrap_or(i64::MAX);
        let bytes = intervals.saturating_mul(8).saturating_mul(i64::try_from(series).unwrap_or(i64::MAX));
        let rows = i64::try_from(rows).unwrap_or(i64::MAX);
        let hollow = intervals > 1_000_000 && intervals / 1000 > rows;
        if intervals <= MOST_INTERVALS && bytes <= MOST_BYTES && !hollow {
            return Ok(());
        }
        let span = people_duration(self.clock.span_s());
        let what = format!(
            "from the first to the last stamp there are {} intervals of {} ({span}), {}",
            people::whole(self.clock.intervals as f64),
            people_duration(self.clock.step_s()),
            if hollow {
                format!("for {} rows", people::whole(rows as f64))
            } else {
                "more than fit in memory".to_owned()
            },
        );
        let (place, remedy) = match &self.leap {
            Some((file, row, distance)) if *distance > 400 * DAY => (
                format!("{file}, row {row}"),
                format!(
                    "The stamps leap by {} there: correct or remove that row.",
                    people_duration(*distance as f64 / 1e6)
                ),
            ),
            _ => (
                self.leap.as_ref().map(|leap| leap.0.clone()).unwrap_or_default(),
                "Cut the file into shorter spans, use fewer columns, or export it with a longer step."
                    .to_owned(),
            ),
        };
        Err(Fault::new(what, place, remedy))
    }
}

/// A duration for messages.
pub(super) fn people_duration(seconds: f64) -> String {
    // A step of an hour is an hour to people, not sixty minutes.
    let hours = seconds / 3600.0;
    if hours.fract() == 0.0 && (1.0..48.0).contains(&hours) {
        return format!("{hours}\u{202f}h");
    }
    people::duration(seconds).to_string()
}

/// First and last instant, leaving out the few stamps that lie more than a year away from all others.
#[allow(clippy::type_complexity, reason = "a triple used once")]
fn span(files: &[Stamped], step_us: i64) -> Result<(i64, i64, Option<(String, u64, i64)>)> {
    let mut all: Vec<(i64, Block, &str)> = Vec::new();
    for file in files.iter().filter(|file| file.anchors) {
        all.extend(file.stats.blocks.iter().map(|(key, block)| (*key, *block, file.name)));
    }
    all.sort_by_key(|(key, block, _)| (*key, block.least));
    let rows = |part: &[(i64, Block, &str)]| part.iter().map(|(_, block, _)| block.rows).sum::<u64>();
    let total = rows(&all);
    let clusters: Vec<&[(i64, Block, &str)]> =
        all.chunk_by(|a, b| b.1.least - a.1.most <= 13 * BLOCK).collect();
    let bounds = |part: &[(i64, Block, &str)]| {
        let least = part.iter().map(|(_, block, _)| block.least).min();
        let most = part.iter().map(|(_, block, _)| block.most).max();
        least.zip(most)
    };
    let Some((mut least, mut most)) = bounds(&all) else {
        return Err(Fault::new("no row holds a stamp that reads", "", "Choose another file."));
    };
    // Clocks that were reset and slips of the pen stand alone; they must not stretch the record over centuries.
    let sparse = (most - least) / step_us > 20 * i64::try_from(total).unwrap_or(i64::MAX / 20) + 1000;
    let main = clusters.iter().max_by_key(|cluster| rows(cluster));
    let mut kept: &[(i64, Block, &str)] = &all;
    if let Some(main) = main
        && sparse
        && clusters.len() > 1
    {
        let few = total - rows(main);
        if few * 20 <= rows(main) || (few <= 3 && few < rows(main)) {
            kept = main;
            (least, most) = bounds(main).unwrap_or((least, most));
        }
    }
    let leap = kept
        .windows(2)
        .map(|pair| (pair[1].2.to_owned(), pair[1].1.first_row, pair[1].1.least - pair[0].1.most))
        .max_by_key(|leap| leap.2)
        .or_else(|| kept.first().map(|only| (only.2.to_owned(), only.1.first_row, 0)));
    Ok((least, most, leap))
}
