//! Tables with one row per channel and reading: which columns name the channel, and which channels there are.

use std::collections::BTreeSet;

use csv::ByteRecord;

use super::super::Role;
use super::super::decode::text;
use super::super::dialect::{Dialect, Look, any_stamp, blank, is_comment, look};
use super::super::number;
use super::super::unit::{self, Stated};
use super::super::words::{self, Guess};
use super::{Channel, Days};
use crate::fault::{Fault, Result};

/// Most channels of a table: each is read in passes of its own.
const MOST_CHANNELS: usize = 64;

/// Rows of each channel that are looked at before all are read.
const MOST_ROWS: usize = 1000;

/// Which columns of a table name the channel.
#[derive(Debug, Clone)]
pub(in crate::record) struct Keys {
    pub(in crate::record) columns: Vec<usize>,
    /// The one column of numbers, which takes its channel's name.
    pub(super) renamed: Option<usize>,
    /// Column of the stamp or date.
    time: usize,
    /// Whether the head shows that stamps come again in another channel.
    certain: bool,
}

/// A channel's name.
pub(super) fn label(wanted: &[Vec<u8>]) -> String {
    let parts: Vec<String> = wanted.iter().map(|cell| text(cell)).filter(|cell| !cell.is_empty()).collect();
    parts.join(" / ")
}

/// What is known of a column that might name the channel.
struct Candidate {
    column: usize,
    distinct: usize,
    named: bool,
}

/// The unit that a column of units gives to all rows; nothing if there is none, or several.
pub(super) fn unit_of_rows(rows: &[(u64, ByteRecord)], headers: &[String]) -> Stated {
    for (column, header) in headers.iter().enumerate() {
        if matches!(words::guess(header), Guess::Role(Role::Quality, _)) {
            continue;
        }
        let mut found = Stated::Nothing;
        let alike = rows.iter().all(|(_, record)| {
            let unit = unit::unit_cell(&text(record.get(column).unwrap_or(b"")));
            if found == Stated::Nothing {
                found = unit.clone();
            }
            unit == found && unit != Stated::Nothing
        });
        if alike && found != Stated::Nothing {
            return found;
        }
    }
    Stated::Nothing
}

/// Finds the columns that name the channel. `times` are the columns of the stamp; none if every stamp comes once.
pub(in crate::record) fn keys(
    dialect: &Dialect,
    times: &[usize],
    days: Option<&Days>,
    stated: &dyn Fn(usize) -> Option<Role>,
) -> Option<Keys> {
    let rows: Vec<&ByteRecord> = dialect.rows.iter().map(|(_, record)| record).collect();
    let time = *times.first()?;
    let cell = |record: &ByteRecord, column: usize| number::trim(record.get(column).unwrap_or(b"")).to_vec();
    let free = |column: &usize| {
        !times.contains(column) && days.is_none_or(|days| !days.has(*column)) && stated(*column).is_none()
    };
    let mut unit = None;
    let mut values = Vec::new();
    let mut candidates = Vec::new();
    for column in (0..dialect.headers.len()).filter(free) {
        let header = &dialect.headers[column];
        let named = words::says_channel(header);
        let mut seen: BTreeSet<Vec<u8>> = BTreeSet::new();
        let (mut filled, mut other, mut whole, mut units, mut numbers) = (0, 0, 0, 0, 0);
        for record in &rows {
            let cell = cell(record, column);
            if cell.is_empty() {
                continue;
            }
            filled += 1;
            let look = look(&cell);
            numbers += usize::from(look == Look::Number);
            other += usize::from(matches!(look, Look::Other | Look::Clock));
            whole += usize::from(cell.iter().all(u8::is_ascii_digit));
            units += usize::from(unit::unit_cell(&text(&cell)) != Stated::Nothing);
            if seen.len() <= MOST_CHANNELS {
                seen.insert(cell);
            }
        }
        if filled == 0 {
            continue;
        }
        let quality = matches!(words::guess(header), Guess::Role(Role::Quality, _)) && !named;
        if units == filled && !quality {
            unit = unit.or(Some(column));
            continue;
        }
        let is_name = other * 10 >= filled * 9 || (named && whole == filled);
        if is_name && !quality && seen.len() <= MOST_CHANNELS && filled * 10 >= rows.len() * 9 {
            candidates.push(Candidate { column, distinct: seen.len(), named });
        } else if numbers * 2 > filled {
            values.push(column);
        }
    }
    if days.is_none() && values.is_empty() {
        return None;
    }
    let renamed = match values[..] {
        [value] if days.is_none() => Some(value),
        _ => None,
    };
    let unique = |columns: &[usize]| {
        let mut seen = BTreeSet::new();
        rows.iter()
            .filter(|record| {
                let key: Vec<Vec<u8>> =
                    times.iter().chain(columns).map(|column| cell(record, *column)).collect();
                seen.insert(key)
            })
            .count()
    };
    let build = |columns: Vec<usize>, certain| Some(Keys { columns, renamed, time, certain });
    let single = unique(&[]);
    if (rows.len() - single) * 5 < rows.len() {
        // Stamps come once in the head: the channels may follow each other.
        let constant: Vec<usize> = candidates
            .iter()
            .filter(|candidate| candidate.named && candidate.distinct == 1)
            .map(|candidate| candidate.column)
            .collect();
        return if constant.is_empty() || rows.len() < 20 { None } else { build(constant, false) };
    }
    candidates.sort_by_key(|candidate| (!candidate.named, candidate.distinct, candidate.column));
    let mut taken: Vec<usize> = Vec::new();
    let enough = |count: usize| count * 20 >= rows.len() * 19;
    if let Some(one) = candidates.iter().find(|one| one.distinct > 1 && enough(unique(&[one.column]))) {
        taken.push(one.column);
    } else {
        for candidate in candidates.iter().filter(|candidate| candidate.distinct > 1) {
            let with: Vec<usize> = taken.iter().copied().chain([candidate.column]).collect();
            if unique(&with) > unique(&taken) {
                taken = with;
            }
            if enough(unique(&taken)) {
                break;
            }
        }
        if !enough(unique(&taken)) {
            let with: Vec<usize> = taken.iter().copied().chain(unit).collect();
            if unit.is_none() || !enough(unique(&with)) {
                return None;
            }
            taken = with;
        }
    }
    // A name that says more than a number joins the key, where it adds no channels.
    taken.sort_unstable();
    build(taken, true)
}

/// A pass over the file that lists its channels.
pub(in crate::record) struct Survey {
    keys: Keys,
    first_row: u64,
    name: String,
    channels: Vec<(Channel, i64, i64)>,
    last: usize,
    pub(in crate::record) record: ByteRecord,
}

impl Survey {
    pub(in crate::record) fn new(name: &str, keys: Keys, first_row: u64) -> Self {
        Self {
            keys,
            first_row,
            name: name.to_owned(),
            channels: Vec::new(),
            last: 0,
            record: ByteRecord::new(),
        }
    }

    /// Takes the row in the buffer.
    pub(in crate::record) fn row(&mut self, row: u64) -> Result<()> {
        let Self { keys, record, channels, .. } = self;
        if row < self.first_row || blank(record) || is_comment(record) {
            return Ok(());
        }
        let stamp = record.get(keys.time).unwrap_or(b"");
        let Some(at) = any_stamp(stamp)
            .map(|read| read.civil_us)
            .or_else(|| (look(stamp) == Look::Number).then_some(i64::try_from(row).unwrap_or(0)))
        else {
            return Ok(());
        };
        let cell = |column: &usize| number::trim(record.get(*column).unwrap_or(b""));
        let holds = |channel: &(Channel, i64, i64)| {
            keys.columns
                .iter()
                .zip(&channel.0.wanted)
                .all(|(column, wanted)| cell(column) == wanted.as_slice())
        };
        let found = if channels.get(self.last).is_some_and(holds) {
            Some(self.last)
        } else {
            channels.iter().position(holds)
        };
        self.last = match found {
            Some(found) => found,
            None if channels.len() == MOST_CHANNELS => {
                return Err(Fault::new(
                    format!("the table holds more than {MOST_CHANNELS} channels"),
                    format!("{}, row {row}", self.name),
                    "Export the channels that matter, or state which column is none (role ignore).",
                ));
            }
            None => {
                let wanted = keys.columns.iter().map(|column| cell(column).to_vec()).collect();
                channels.push((Channel { wanted, rows: Vec::new() }, i64::MAX, i64::MIN));
                channels.len() - 1
            }
        };
        let (channel, least, most) = &mut channels[self.last];
        *least = (*least).min(at);
        *most = (*most).max(at);
        if channel.rows.len() < MOST_ROWS {
            channel.rows.push((row, record.clone()));
        }
        Ok(())
    }

    /// The channels with the columns that name them; none if the table has but one, or if they follow each other in time.
    pub(in crate::record) fn finish(self) -> Option<(Keys, Vec<Channel>)> {
        let Self { keys, channels, .. } = self;
        let overlap = channels
            .iter()
            .enumerate()
            .any(|(i, a)| channels[i + 1..].iter().any(|b| a.1.max(b.1) < a.2.min(b.2)));
        if channels.len() < 2 || !(overlap || keys.certain) {
            return None;
        }
        Some((keys, channels.into_iter().map(|channel| channel.0).collect()))
    }
}
