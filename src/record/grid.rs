//! The regular clock behind the stamps of all files: step, phase, first and last interval.

use std::collections::BTreeMap;

use super::scan::{BLOCK, Block, Stats};
use super::stamp::{DAY, SECOND};
use super::{Clock, Finding, FindingKind, Zone};
use crate::case::{RecordCase, Stamp};
use crate::fault::{Fault, Result};
use crate::units::people;

/// Most intervals of a record.
const MOST_INTERVALS: i64 = 200_000_000;

/// Most bytes that the series of a record may take.
const MOST_BYTES: i64 = 1_500_000_000;

/// The clock and what lies on it.
#[derive(Debug, Clone)]
pub(super) struct Grid {
    pub(super) clock: Clock,
    /// How far a stamp may lie off the step and still count, in microseconds.
    pub(super) tolerance_us: i64,
    /// Where the stamps leap furthest: file, row, distance in microseconds.
    leap: Option<(String, u64, i64)>,
    /// What is subtracted from a stamp to get its interval's start, in microseconds.
    pub(super) shift_us: i64,
}

/// One file as the first pass left it.
pub(super) struct Stamped<'a> {
    pub(super) name: &'a str,
    pub(super) stats: &'a Stats,
}

/// Finds the clock.
pub(super) fn find(
    files: &[Stamped],
    terms: &RecordCase,
    zone: Zone,
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
    let step_us = step(files, terms, findings)?;
    let (least, most, leap) = span(files, step_us)?;
    let phase = phase(files, step_us, least, most);
    // The smallest clock tick not before the first stamp; stamps off the step are left out later.
    let tolerance_us = step_us / 20;
    let steps_from = |instant: i64| (instant - phase).div_euclid(step_us);
    let first = steps_from(least - tolerance_us + step_us - 1);
    let last = steps_from(most + tolerance_us).max(first);
    let start_us = phase + first * step_us;
    let intervals = last - first + 1;
    let shift_us = if terms.stamp == Some(Stamp::End) { step_us } else { 0 };
    let clock = Clock {
        start_us: start_us - shift_us,
        step_us,
        intervals: usize::try_from(intervals).unwrap_or(usize::MAX),
        zone,
    };
    Ok(Grid { clock, tolerance_us, leap, shift_us })
}

impl Grid {
    /// First and last instant of a file's stamps that lie on the clock.
    pub(super) fn span(&self, stats: &Stats) -> Option<(i64, i64)> {
        let start = self.clock.start_us.saturating_add(self.shift_us - self.clock.step_us);
        let end = self.clock.at_us(self.clock.intervals).saturating_add(self.shift_us);
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

fn step(files: &[Stamped], terms: &RecordCase, findings: &mut Vec<Finding>) -> Result<i64> {
    if let Some(step_s) = terms.step_s {
        let step = (step_s * 1e6).round();
        if (1.0..=3.2e13).contains(&step) {
            return Ok(step as i64);
        }
        return Err(Fault::new(
            format!("the step stated is {step_s} s"),
            "case, at record.step_s",
            "State a step of more than 0 s.",
        ));
    }
    let mut steps: Vec<(&str, i64)> = Vec::new();
    for file in files {
        if let Some(found) = usual(&file.stats.distances) {
            let share = |count: u64| count as f64 / found.total as f64;
            if share(found.count) < 0.25 && found.total >= 4 {
                return Err(Fault::new(
                    format!(
                        "the stamps keep no regular step: the most frequent distance, {}, makes up {} of all",
                        people_duration(found.step_us as f64 / 1e6),
                        people::percent(share(found.count))
                    ),
                    file.name,
                    "Export readings at a regular step, or state the step.",
                ));
            }
            if found.step_us > 8 * DAY {
                return Err(Fault::new(
                    format!(
                        "the rows lie {} apart: nothing can be said of storage from them",
                        people_duration(found.step_us as f64 / 1e6)
                    ),
                    file.name,
                    "Choose a file with a reading at least every day, better every hour or quarter of an hour.",
                ));
            }
            if let Some((second, count)) = found.second
                && share(count) >= 0.1
                && count >= 10
                && second < 100 * found.step_us
            {
                findings.push(Finding {
                    kind: FindingKind::MixedSteps,
                    count,
                    first_row: None,
                    file: file.name.to_owned(),
                    remedy: format!("step of {} taken", people_duration(found.step_us as f64 / 1e6)),
                    text: format!(
                        "The file holds two steps: {} between {} of the rows and {} between {}; the first is taken as the record's step.",
                        people_duration(found.step_us as f64 / 1e6),
                        people::percent(share(found.count)),
                        people_duration(second as f64 / 1e6),
                        people::percent(share(count)),
                    ),
                    changes_figures: true,
                });
            }
            steps.push((file.name, found.step_us));
        }
    }
    match steps[..] {
        [] => Err(Fault::new(
            "only one stamp reads, so that the step between readings is not known",
            files.first().map_or("", |file| file.name),
            "Choose a file with at least two rows of readings, or state the step.",
        )),
        [(_, step), ref rest @ ..] if rest.iter().all(|(_, other)| *other == step) => Ok(step),
        _ => {
            let list: Vec<String> = steps
                .iter()
                .take(8)
                .map(|(name, step)| format!("{name}: {}", people_duration(*step as f64 / 1e6)))
                .collect();
            let other = steps.iter().find(|(_, step)| *step != steps[0].1).map_or("", |(name, _)| name);
            Err(Fault::new(
                format!("the files have different steps ({})", list.join(", ")),
                other,
                "Export the files with the same step; this version does not align them.",
            ))
        }
    }
}

struct Usual {
    step_us: i64,
    count: u64,
    total: u64,
    second: Option<(i64, u64)>,
}

/// The usual distance between stamps, distances within a twentieth of it counted together.
fn usual(distances: &BTreeMap<i64, u64>) -> Option<Usual> {
    let total: u64 = distances.values().sum();
    // Of equal counts the shorter distance counts, since gaps make long ones.
    let (&mode, &exact) = distances.iter().rev().max_by_key(|(_, count)| **count)?;
    let near = |distance: &i64| (distance - mode).abs() <= mode / 20;
    let count: u64 = distances.iter().filter(|(distance, _)| near(distance)).map(|(_, count)| count).sum();
    let second = distances.iter().filter(|(distance, _)| !near(distance)).max_by_key(|(_, count)| **count);
    let step_us = if exact * 10 >= count * 6 { mode } else { round_step(mode).unwrap_or(mode) };
    Some(Usual { step_us, count, total, second: second.map(|(distance, count)| (*distance, *count)) })
}

/// The round step that a jittering logger means, if one lies within a twentieth.
fn round_step(step_us: i64) -> Option<i64> {
    [
        1, 2, 5, 10, 15, 20, 30, 60, 120, 180, 240, 300, 360, 600, 720, 900, 1200, 1800, 3600, 7200, 10_800,
        21_600, 43_200, 86_400,
    ]
    .into_iter()
    .map(|seconds| seconds * SECOND)
    .filter(|step| (step - step_us).abs() * 20 <= *step)
    .min_by_key(|step| (step - step_us).abs())
}

/// First and last instant, leaving out the few stamps that lie more than a year away from all others.
#[allow(clippy::type_complexity, reason = "a triple used once")]
fn span(files: &[Stamped], step_us: i64) -> Result<(i64, i64, Option<(String, u64, i64)>)> {
    let mut all: Vec<(i64, Block, &str)> = Vec::new();
    for file in files {
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

/// Where within the step the stamps lie.
fn phase(files: &[Stamped], step_us: i64, least: i64, most: i64) -> i64 {
    let mut counts: BTreeMap<i64, u64> = BTreeMap::new();
    let mut total = 0;
    for file in files {
        for instant in file.stats.sample.iter().filter(|instant| (least..=most).contains(*instant)) {
            *counts.entry(instant.rem_euclid(step_us)).or_insert(0) += 1;
            total += 1;
        }
    }
    let Some((&mode, &count)) = counts.iter().rev().max_by_key(|(_, count)| **count) else { return 0 };
    let near_zero = mode.min(step_us - mode) <= step_us / 20;
    if near_zero && count * 10 < total * 6 { 0 } else { mode }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_usual_distance_is_the_step() {
        let of = |list: &[(i64, u64)]| usual(&list.iter().map(|(s, n)| (s * SECOND, *n)).collect()).unwrap();
        assert_eq!(of(&[(900, 10), (1800, 2)]).step_us, 900 * SECOND);
        assert_eq!(of(&[(900, 2), (1800, 2)]).step_us, 900 * SECOND);
        let jitter = of(&[(898, 10), (899, 11), (901, 12), (902, 9)]);
        assert_eq!((jitter.step_us, jitter.count), (900 * SECOND, 42));
        assert_eq!(of(&[(900, 80), (3600, 20)]).second, Some((3600 * SECOND, 20)));
    }
}
