//! What the values of columns say: readings that only rise, sums of other columns, phases.

use super::super::dialect::Dialect;
use super::super::number::{self, Cell};
use super::super::stamp::{self, DAY};
use super::super::timing::Timing;
use super::super::words;
use super::key;
use crate::case::DateOrder;

/// Rows on which columns are compared with each other.
const COMPARED: usize = 200;

/// Most columns that are compared with each other.
const MOST_COLUMNS: usize = 64;

/// What the head's values look like.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Values {
    pub(super) filled: usize,
    pub(super) numbers: usize,
    pub(super) zeros: usize,
    pub(super) negative: usize,
    pub(super) positive: usize,
    pub(super) night_sum: f64,
    /// A running meter reading.
    pub(super) register: bool,
}

pub(super) fn values(dialect: &Dialect, timing: Timing, column: usize) -> Values {
    let mut found = Values::default();
    let mut before: Option<f64> = None;
    let (mut falls, mut rises, mut sets, mut first, mut most_rise) = (0, 0, 0, 0.0, 0.0_f64);
    let mut counts = true;
    for (_, record) in &dialect.rows {
        let cell = record.get(column).unwrap_or(b"");
        match number::parse(cell, dialect.marks) {
            Cell::Empty => continue,
            Cell::Text => {}
            Cell::Number(value) => {
                found.numbers += 1;
                found.zeros += usize::from(value == 0.0);
                found.negative += usize::from(value < 0.0);
                found.positive += usize::from(value > 0.0);
                if let Some(before) = before {
                    // A column that runs from the newest row to the oldest falls all the way.
                    falls += usize::from(value < before);
                    rises += usize::from(value > before);
                    // Set back to zero at the end of its day, or turned over.
                    sets += usize::from(value < before && value <= 0.1 * before);
                    counts &= (value - before).abs() == 1.0;
                    most_rise = most_rise.max((value - before).abs());
                } else {
                    first = value;
                }
                before = Some(value);
                if night(record, timing, dialect) {
                    found.night_sum += value;
                }
            }
        }
        found.filled += 1;
    }
    let last = before.unwrap_or(0.0);
    let (few, many) = if falls < rises { (falls, rises) } else { (rises, falls) };
    let said = words::says_register(&dialect.headers[column]);
    // A reading that is said to be one may begin again every day.
    let few = if said && few == falls { falls - sets } else { few };
    // A reading turns over or is reset now and then; other quantities go down as often as up.
    let runs = found.negative == 0 && many > 0 && few * 100 <= many + 99 && !(counts && found.numbers > 2);
    let rise = if few == 0 { most_rise } else { 0.0 };
    // A meter that nothing ran through stands still.
    let still = said && found.numbers >= 3 && rises + falls == 0 && first > 0.0;
    found.register = still
        || runs
            && (found.numbers >= 24 && few == 0 && first.max(last) > 10.0 * rise
                || found.numbers >= 96 && many * 4 >= found.numbers
                || said && found.numbers >= 3 && (few <= 1 || few * 20 <= many));
    found
}

/// Whether a row's stamp lies in the four hours after midnight.
fn night(record: &csv::ByteRecord, timing: Timing, dialect: &Dialect) -> bool {
    let time = match timing {
        Timing::Stamp(column) => record
            .get(column)
            .and_then(|cell| {
                stamp::stamp(cell, DateOrder::DayFirst).or_else(|| stamp::stamp(cell, DateOrder::MonthFirst))
            })
            .map(|read| read.civil_us.rem_euclid(DAY)),
        Timing::DateClock(_, clock) => record.get(clock).and_then(stamp::time_of_day).map(|time| time.0),
        Timing::Parts(_) => timing
            .read(record, DateOrder::YearFirst, dialect.marks, 0)
            .map(|moment| moment.us.rem_euclid(DAY)),
        _ => None,
    };
    time.is_some_and(|time| time < 4 * 3600 * stamp::SECOND)
}

/// A column that says what others say already.
pub(super) struct Again {
    /// The columns that are not counted.
    pub(super) parts: Vec<usize>,
    /// The column that is.
    pub(super) whole: usize,
}

/// Finds columns that repeat another, or that add up to another, among columns of one kind (`kind` gives it; none = not
/// looked at).
///
/// One of three phases (`phase`) is never the sum of the others.
pub(super) fn again(
    dialect: &Dialect,
    kind: &dyn Fn(usize) -> Option<u8>,
    phase: &dyn Fn(usize) -> bool,
    energy: &dyn Fn(usize) -> bool,
) -> Vec<Again> {
    let columns: Vec<usize> =
        (0..dialect.headers.len()).filter(|column| kind(*column).is_some()).take(MOST_COLUMNS).collect();
    let mut found = Vec::new();
    for group in 0..4 {
        let mut members: Vec<usize> =
            columns.iter().copied().filter(|column| kind(*column) == Some(group)).collect();
        if members.len() < 2 {
            continue;
        }
        let rows: Vec<Vec<f64>> = dialect
            .rows
            .iter()
            .filter_map(|(_, record)| {
                members
                    .iter()
                    .map(|column| match number::parse(record.get(*column)?, dialect.marks) {
                        Cell::Number(value) => Some(value),
                        _ => None,
                    })
                    .collect::<Option<Vec<f64>>>()
            })
            .filter(|row| row.iter().any(|value| *value != 0.0))
            .take(COMPARED)
            .collect();
        if rows.len() < 10 {
            continue;
        }
        for later in 1..members.len() {
            let same = (0..later).find(|first| {
                members[*first] != usize::MAX
                    && key(&dialect.headers[members[*first]]) == key(&dialect.headers[members[later]])
                    && energy(members[*first]) == energy(members[later])
                    && rows.iter().all(|row| row[*first] == row[later])
            });
            if let Some(first) = same {
                found.push(Again { parts: vec![members[later]], whole: members[first] });
                members[later] = usize::MAX;
            }
        }
        // Power and energy of the same thing, one beside the other.
        for first in 0..members.len() {
            for second in first + 1..members.len() {
                if members[first] == usize::MAX || members[second] == usize::MAX {
                    continue;
                }
                let (one, two) = (energy(members[first]), energy(members[second]));
                if one == two {
                    continue;
                }
                let sum = |at: usize| rows.iter().map(|row| row[at]).sum::<f64>();
                let ratio = sum(first) / sum(second);
                let even = ratio.is_finite()
                    && rows.iter().all(|row| {
                        (row[first] - ratio * row[second]).abs()
                            <= 0.01 * row[first].abs() + 1e-3 * ratio.abs()
                    });
                if even {
                    let (kept, left) = if one { (second, first) } else { (first, second) };
                    found.push(Again { parts: vec![members[left]], whole: members[kept] });
                    members[left] = usize::MAX;
                }
            }
        }
        let live: Vec<usize> = (0..members.len()).filter(|at| members[*at] != usize::MAX).collect();
        if live.len() < 3 {
            continue;
        }
        let alike = live.iter().all(|at| energy(members[*at]) == energy(members[live[0]]));
        let whole =
            live.iter().copied().filter(|_| alike).filter(|whole| !phase(members[*whole])).find(|whole| {
                let adds = rows
                    .iter()
                    .filter(|row| {
                        let parts: f64 = live.iter().filter(|at| *at != whole).map(|at| row[*at]).sum();
                        (row[*whole] - parts).abs() <= 0.005 * row[*whole].abs().max(parts.abs())
                    })
                    .count();
                adds * 20 >= rows.len() * 19
                    && live.iter().filter(|at| *at != whole).all(|at| rows.iter().any(|row| row[*at] != 0.0))
            });
        if let Some(whole) = whole {
            found.push(Again {
                parts: live.iter().filter(|at| **at != whole).map(|at| members[*at]).collect(),
                whole: members[whole],
            });
        }
    }
    found
}

/// Columns that hold the three phases of one quantity.
pub(super) fn phases(headers: &[String]) -> Vec<[usize; 3]> {
    const NAMES: [[&str; 3]; 5] = [
        ["l1", "l2", "l3"],
        ["a", "b", "c"],
        ["r", "s", "t"],
        ["ph1", "ph2", "ph3"],
        ["phase1", "phase2", "phase3"],
    ];
    let split = |header: &str| -> Vec<String> {
        let low = header.to_lowercase().replace("phase ", "phase").replace("phase_", "phase");
        low.split(|c: char| !c.is_alphanumeric()).filter(|word| !word.is_empty()).map(str::to_owned).collect()
    };
    let words: Vec<Vec<String>> = headers.iter().map(|header| split(header)).collect();
    // The header with its phase taken out, if it names phase `which` of a set.
    let without = |column: usize, set: &[&str; 3], which: usize| {
        let at = words[column].iter().position(|word| word == set[which])?;
        let rest: Vec<&String> =
            words[column].iter().enumerate().filter(|(i, _)| *i != at).map(|(_, word)| word).collect();
        Some((at, rest))
    };
    let mut found = Vec::new();
    for set in &NAMES {
        for first in 0..headers.len() {
            let Some(rest) = without(first, set, 0) else { continue };
            let other = |which: usize| {
                (0..headers.len()).find(|column| without(*column, set, which).as_ref() == Some(&rest))
            };
            if let (Some(second), Some(third)) = (other(1), other(2))
                && !found.iter().any(|known: &[usize; 3]| known.contains(&first))
            {
                found.push([first, second, third]);
            }
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn phases_are_three_headers_that_differ_by_the_phase() {
        let of =
            |headers: &[&str]| phases(&headers.iter().map(|header| (*header).to_owned()).collect::<Vec<_>>());
        assert_eq!(of(&["time", "L1 (kW)", "L2 (kW)", "L3 (kW)"]), [[1, 2, 3]]);
        assert_eq!(of(&["kW_A", "kW_B", "kW_C"]), [[0, 1, 2]]);
        assert_eq!(of(&["Load phase 1", "Load Phase 2", "load phase_3"]), [[0, 1, 2]]);
        assert_eq!(of(&["P L1", "V L1", "P L2", "V L2", "P L3", "V L3"]), [[0, 2, 4], [1, 3, 5]]);
        assert_eq!(of(&["Load A", "Load B", "Load total"]), [] as [[usize; 3]; 0]);
    }
}
