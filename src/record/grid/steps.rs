//! The step of each file, and one step that serves them all.

use std::collections::BTreeMap;

use super::super::scan::Stats;
use super::super::stamp::{DAY, SECOND};
use super::super::{Finding, FindingKind};
use super::{Fit, Stamped, people_duration};
use crate::case::{RecordCase, Values};
use crate::fault::{Fault, Result};
use crate::units::people;

/// Finest common step, as a part of the finest step of a file: below it steps are aligned by dealing out energy.
const FINEST_PART: i64 = 60;

/// The step of a file.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pace {
    pub(super) step_us: i64,
    /// Another step that part of the file keeps, or none.
    other_us: Option<i64>,
    /// Whether the stamps keep no step.
    loose: bool,
}

/// The step of each file.
pub(super) fn paces(files: &[Stamped], terms: &RecordCase, findings: &mut Vec<Finding>) -> Result<Vec<Pace>> {
    let stated = match terms.step_s {
        None => None,
        Some(step_s) if (1.0..=3.2e13).contains(&(step_s * 1e6).round()) => {
            Some((step_s * 1e6).round() as i64)
        }
        Some(step_s) => {
            return Err(Fault::new(
                format!("the step stated is {step_s} s"),
                "case, at record.step_s",
                "State a step of more than 0 s.",
            ));
        }
    };
    let mut known: Vec<Option<Pace>> = Vec::with_capacity(files.len());
    for file in files {
        let Some(found) = usual(&file.stats.distances) else {
            known.push(None);
            continue;
        };
        known.push(Some(pace(file, &found, stated, findings)?));
    }
    let fallback = stated.or_else(|| known.iter().flatten().map(|pace| pace.step_us).min());
    let Some(fallback) = fallback else {
        return Err(Fault::new(
            "only one stamp reads, so that the step between readings is not known",
            files.first().map_or("", |file| file.name),
            "Choose a file with at least two rows of readings, or state the step.",
        ));
    };
    let plain = Pace { step_us: fallback, other_us: None, loose: false };
    Ok(known.into_iter().map(|pace| pace.unwrap_or(plain)).collect())
}

fn pace(file: &Stamped, found: &Usual, stated: Option<i64>, findings: &mut Vec<Finding>) -> Result<Pace> {
    let share = |count: u64| count as f64 / found.total as f64;
    let loose = share(found.count) < 0.25 && found.total >= 4;
    if loose && stated.is_none() {
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
    let mut other_us = None;
    if let Some((second, count)) = found.second
        && count >= 10
        && second < 100 * found.step_us
    {
        // A step holds through long runs of rows; a distance that comes now and then is a gap.
        let run = file.stats.runs.get(&second).copied().unwrap_or(0);
        if run >= 10 && run * 4 >= count {
            other_us = Some(second);
        }
        if share(count) >= 0.1 || other_us.is_some() {
            let treated = if other_us.is_some() {
                "each row counts for the time to the next"
            } else {
                "the first is taken as the record's step"
            };
            findings.push(Finding {
                kind: FindingKind::MixedSteps,
                count,
                first_row: None,
                file: file.name.to_owned(),
                remedy: if other_us.is_some() {
                    "energy kept".to_owned()
                } else {
                    format!("step of {} taken", people_duration(found.step_us as f64 / 1e6))
                },
                text: format!(
                    "The file holds two steps: {} between {} of the rows and {} between {}; {treated}.",
                    people_duration(found.step_us as f64 / 1e6),
                    people::percent(share(found.count)),
                    people_duration(second as f64 / 1e6),
                    people::percent(share(count)),
                ),
                changes_figures: true,
            });
        }
    }
    Ok(Pace { step_us: found.step_us, other_us, loose })
}

/// One step for all files, where on it stamps lie, and how each file's intervals lie on it.
pub(super) fn align(
    files: &[Stamped],
    paces: &[Pace],
    terms: &RecordCase,
    (least, most): (i64, i64),
    findings: &mut Vec<Finding>,
) -> (i64, i64, Vec<Fit>) {
    let stated = terms.step_s.map(|step_s| (step_s * 1e6).round() as i64);
    let samples = terms.reading == Values::Samples;
    let finest = paces.iter().map(|pace| pace.step_us).min().unwrap_or(SECOND);
    let same = paces.iter().all(|pace| pace.step_us == finest);
    let within = |file: &Stamped| if file.anchors { (least, most) } else { (i64::MIN, i64::MAX) };
    let phases: Vec<i64> = if same {
        // Files at one step are looked at together, unless they lie apart.
        let common =
            phase(files.iter().filter(|file| file.anchors).map(|file| (file.stats, within(file))), finest);
        files
            .iter()
            .map(|file| {
                let own = phase(std::iter::once((file.stats, within(file))), finest);
                if near(own - common, finest) { common } else { own }
            })
            .collect()
    } else {
        files
            .iter()
            .zip(paces)
            .map(|(file, pace)| phase(std::iter::once((file.stats, within(file))), pace.step_us))
            .collect()
    };
    let reference =
        (0..files.len()).filter(|at| files[*at].anchors).min_by_key(|at| paces[*at].step_us).unwrap_or(0);
    let base = phases.get(reference).copied().unwrap_or(0);
    let mut common = finest;
    for (pace, phase) in paces.iter().zip(&phases) {
        if pace.loose {
            continue;
        }
        let off = (phase - base).rem_euclid(finest);
        let off = if near(off, finest) { 0 } else { off };
        for part in [pace.step_us, pace.other_us.unwrap_or(0), off] {
            common = gcd(common, part);
        }
    }
    let fine_enough = common >= finest / FINEST_PART && (most - least) / common.max(1) <= 20_000_000;
    let step_us = stated.unwrap_or(if fine_enough { common } else { finest });
    // A step that does not divide the files' own lies on round times of day.
    let base = match (finest % step_us, DAY % step_us) {
        (0, _) => base,
        (_, 0) => 0,
        _ => least,
    };
    let fits: Vec<Fit> = paces
        .iter()
        .zip(&phases)
        .zip(files)
        .map(|((pace, phase), file)| {
            let off = (phase - base).rem_euclid(step_us);
            let snapped = near(off, step_us) || (samples && near(off, finest));
            let fits = pace.step_us % step_us == 0 && snapped && !pace.loose;
            let spread = !samples && (!fits || pace.other_us.is_some());
            // A stamp a little off the others' places is taken as on them.
            let off = if off * 2 > step_us { off - step_us } else { off };
            Fit {
                step_us: pace.step_us,
                origin_us: if snapped { phase - off } else { *phase },
                late: file.late,
                cells: if samples || spread { 1 } else { (pace.step_us / step_us).max(1) as usize },
                spread,
                longest_us: match (pace.loose, pace.other_us) {
                    (true, _) => (4 * step_us).max(3600 * SECOND),
                    (_, Some(other)) => other.max(pace.step_us) + pace.step_us / 20,
                    _ => pace.step_us + pace.step_us / 20,
                },
            }
        })
        .collect();
    if !same || step_us != finest {
        let mut list: Vec<String> = files
            .iter()
            .zip(paces)
            .map(|(file, pace)| format!("{}: {}", file.name, people_duration(pace.step_us as f64 / 1e6)))
            .collect();
        list.dedup();
        list.truncate(8);
        let how = if samples {
            "straight lines join the samples"
        } else {
            "power is taken as constant within each interval, so that every energy stays as measured"
        };
        let step = people_duration(step_us as f64 / 1e6);
        findings.push(Finding {
            kind: FindingKind::MixedSteps,
            count: files.len() as u64,
            first_row: None,
            file: String::new(),
            remedy: format!("aligned at {step}"),
            text: format!(
                "The readings come at other steps than the record ({}): the record's step is {step}, {}; {how}.",
                list.join(", "),
                if stated.is_some() { "as stated" } else { "into which all of them divide" }
            ),
            changes_figures: false,
        });
    }
    (step_us, base, fits)
}

fn gcd(mut a: i64, mut b: i64) -> i64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

/// Whether a distance is a whole number of steps to within a twentieth.
fn near(distance: i64, step_us: i64) -> bool {
    let off = distance.rem_euclid(step_us);
    off.min(step_us - off) <= step_us / 20
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

/// Where within the step the stamps lie.
fn phase<'a>(files: impl Iterator<Item = (&'a Stats, (i64, i64))>, step_us: i64) -> i64 {
    let mut counts: BTreeMap<i64, u64> = BTreeMap::new();
    let mut total = 0;
    for (stats, (least, most)) in files {
        for instant in stats.sample.iter().filter(|instant| (least..=most).contains(*instant)) {
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
