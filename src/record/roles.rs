//! What each column stands for, and how the columns of a site add up to supply, demand and net power.

use super::dialect::Dialect;
use super::number::{self, Cell};
use super::stamp::{self, DAY};
use super::timing::Timing;
use super::unit::{Stated, Unit};
use super::words::{self, Guess};
use super::{ColumnReading, Role};
use crate::case::{DateOrder, RecordCase};
use crate::fault::{Fault, Result, quote};

mod sums;

use sums::list;
pub(super) use sums::plan;

/// A sum that columns add up to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Target {
    Supply = 0,
    Demand = 1,
    /// Net power as the files give it, positive = surplus.
    Net = 2,
}

/// A column as read so far.
#[allow(clippy::struct_excessive_bools, reason = "independent facts about a column")]
#[derive(Debug, Clone)]
pub(super) struct Column {
    pub(super) header: String,
    pub(super) role: Role,
    /// Power or energy; none for other quantities.
    pub(super) unit: Option<Unit>,
    other: String,
    pub(super) why: String,
    guess: Guess,
    stated: bool,
    stated_unit: bool,
    open: bool,
    numeric: bool,
    /// Kept as an extra column.
    pub(super) extra: bool,
    /// What the column is added to, with its sign.
    pub(super) into: Vec<(Target, f64)>,
    look: Values,
}

/// What the head's values look like.
#[derive(Debug, Clone, Copy, Default)]
struct Values {
    filled: usize,
    numbers: usize,
    zeros: usize,
    negative: usize,
    positive: usize,
    night_sum: f64,
    register: bool,
}

/// Two headers are the same if they differ only by case and spaces.
pub(super) fn key(header: &str) -> String {
    header.chars().filter(|c| !c.is_whitespace()).flat_map(char::to_lowercase).collect()
}

/// What the person stated for a column, by `header` or `file/header`.
pub(super) fn stated<'a, T>(
    map: &'a std::collections::BTreeMap<String, T>,
    file: &str,
    header: &str,
) -> Option<&'a T> {
    let (bare, full) = (key(header), key(&format!("{file}/{header}")));
    let find = |wanted: &str| map.iter().find(|(name, _)| key(name) == wanted).map(|(_, value)| value);
    find(&full).or_else(|| find(&bare))
}

fn is_power(role: Role) -> bool {
    use Role::{Demand, Export, Generation, Import, NetExport, NetImport, Supply};
    matches!(role, Supply | Demand | NetImport | NetExport | Import | Export | Generation)
}

fn is_extra(role: Role) -> bool {
    use Role::{Asked, Critical, Frequency, Price, Reactive, Schedule, StoreCharge, StoreDischarge};
    matches!(role, Asked | Critical | Frequency | Price | Reactive | Schedule | StoreCharge | StoreDischarge)
}

/// Reads roles and units of one file's columns from headers, units and the case.
pub(super) fn columns(
    file: &str,
    dialect: &Dialect,
    timing: Timing,
    terms: &RecordCase,
    named: &[String],
) -> Result<Vec<Column>> {
    let mut columns = Vec::with_capacity(dialect.headers.len());
    for (i, header) in dialect.headers.iter().enumerate() {
        let look = values(dialect, timing, i);
        let numeric = look.numbers * 2 > look.filled;
        let wanted = stated(&terms.roles, file, header).copied();
        let unit = match stated(&terms.units, file, header) {
            Some(unit) => Stated::Power(Unit::named(unit).ok_or_else(|| {
                Fault::new(
                    format!("the unit {} of column {} is not known", quote(unit), quote(header)),
                    "case, at record.units",
                    "Use one of W, kW, MW, GW, Wh, kWh, MWh, GWh.",
                )
            })?),
            None => dialect.units.get(i).cloned().unwrap_or(Stated::Nothing),
        };
        let guess = words::guess(header);
        let mut column = Column {
            header: header.clone(),
            role: Role::Ignore,
            unit: None,
            other: String::new(),
            why: String::new(),
            guess,
            stated: wanted.is_some(),
            stated_unit: stated(&terms.units, file, header).is_some(),
            open: false,
            numeric,
            extra: named
                .iter()
                .any(|name| key(name) == key(header) || key(name) == key(&format!("{file}/{header}"))),
            into: Vec::new(),
            look,
        };
        match &unit {
            Stated::Power(unit) => column.unit = Some(*unit),
            Stated::Other(other) => column.other.clone_from(other),
            Stated::Nothing => {}
        }
        column.role(timing.role(i), wanted, &unit);
        columns.push(column);
    }
    Ok(columns)
}

impl Column {
    fn role(&mut self, time: Option<Role>, wanted: Option<Role>, unit: &Stated) {
        if let Some(role) = time {
            self.role = role;
            self.unit = None;
            self.extra = false;
            "its cells hold the stamps".clone_into(&mut self.why);
            return;
        }
        if let Some(role) = wanted {
            self.role = role;
            "as stated".clone_into(&mut self.why);
            return;
        }
        let (role, why) = match self.guess {
            Guess::Role(Role::Quality, word) => (Role::Quality, format!("its header says {}", quote(word))),
            _ if self.look.filled > 0 && !self.numeric => {
                (Role::Ignore, "its cells are not numbers".to_owned())
            }
            Guess::Role(role, word) if is_power(role) && matches!(unit, Stated::Other(_)) => {
                (Role::Ignore, format!("its header says {}, but its unit is no power or energy", quote(word)))
            }
            Guess::Role(role, _) if is_power(role) && self.look.register => (
                Role::Ignore,
                "its values only ever rise: a running meter reading, not the energy of an interval"
                    .to_owned(),
            ),
            Guess::Role(role, word) => (role, format!("its header says {}", quote(word))),
            _ if matches!(unit, Stated::Other(_)) => {
                (Role::Ignore, "its unit is no power or energy".to_owned())
            }
            _ if self.look.filled == 0 => (Role::Ignore, "it is empty".to_owned()),
            _ if self.look.register => (
                Role::Ignore,
                "its values only ever rise: a running meter reading, not the energy of an interval"
                    .to_owned(),
            ),
            Guess::Net(_) | Guess::Unknown => {
                self.open = true;
                (Role::Ignore, "its header says nothing that is known".to_owned())
            }
        };
        self.role = role;
        self.why = why;
    }

    fn take(&mut self, role: Role, why: String) {
        self.role = role;
        self.why = why;
        self.open = false;
    }

    /// For the page.
    pub(super) fn reading(&self) -> ColumnReading {
        let unit = match self.unit {
            Some(unit) if self.extra || is_power(self.role) => unit.label().to_owned(),
            _ => self.other.clone(),
        };
        ColumnReading { header: self.header.clone(), role: self.role, unit, why: self.why.clone() }
    }
}

fn values(dialect: &Dialect, timing: Timing, column: usize) -> Values {
    let mut found = Values::default();
    let mut before: Option<f64> = None;
    let (mut falls, mut first, mut most_rise) = (0, 0.0, 0.0_f64);
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
                    falls += usize::from(value < before);
                    most_rise = most_rise.max(value - before);
                } else {
                    first = value;
                }
                before = Some(value);
                if night(record, timing) {
                    found.night_sum += value;
                }
            }
        }
        found.filled += 1;
    }
    found.register = found.numbers >= 24 && falls == 0 && most_rise > 0.0 && first > 10.0 * most_rise;
    found
}

/// Whether a row's stamp lies in the four hours after midnight.
fn night(record: &csv::ByteRecord, timing: Timing) -> bool {
    let time = match timing {
        Timing::Stamp(column) => record
            .get(column)
            .and_then(|cell| {
                stamp::stamp(cell, DateOrder::DayFirst).or_else(|| stamp::stamp(cell, DateOrder::MonthFirst))
            })
            .map(|read| read.civil_us.rem_euclid(DAY)),
        Timing::DateClock(_, clock) => record.get(clock).and_then(stamp::time_of_day).map(|time| time.0),
        _ => None,
    };
    time.is_some_and(|time| time < 4 * 3600 * stamp::SECOND)
}

/// Refuses roles and units stated for columns that no file has.
pub(super) fn check_stated(files: &[(String, Vec<Column>)], terms: &RecordCase) -> Result<()> {
    for (field, names) in [
        ("record.roles", terms.roles.keys().collect::<Vec<_>>()),
        ("record.units", terms.units.keys().collect()),
    ] {
        for name in names {
            let wanted = key(name);
            let found = files.iter().any(|(file, columns)| {
                columns.iter().any(|column| {
                    key(&column.header) == wanted || key(&format!("{file}/{}", column.header)) == wanted
                })
            });
            if !found {
                let headers: Vec<String> =
                    files.iter().flat_map(|file| &file.1).map(|column| quote(&column.header)).collect();
                return Err(Fault::new(
                    format!("no column is named {}; the columns are {}", quote(name), list(&headers)),
                    format!("case, at {field}"),
                    "Correct the name, or remove the entry.",
                ));
            }
        }
    }
    Ok(())
}
