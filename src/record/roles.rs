//! What each column stands for, and how the columns of a site add up to supply, demand and net power.

use super::dialect::Dialect;
use super::timing::Timing;
use super::unit::{Stated, Unit};
use super::words::{self, Guess};
use super::{ColumnReading, Role};
use crate::case::RecordCase;
use crate::fault::{Fault, Result, quote};

mod sums;
mod values;

use sums::list;
pub(super) use sums::plan;
use values::Values;

/// A sum that columns add up to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Target {
    Supply = 0,
    Demand = 1,
    /// Net power as the files give it, positive = surplus.
    Net = 2,
    /// What was drawn from the grid and what was fed to it, each on its own: told in a finding, not part of the record.
    Drawn = 3,
    Fed = 4,
}

/// Number of sums.
pub(super) const TARGETS: usize = 5;

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
    /// The unit that the file's name or the lines above the table mention, and which of them does.
    hint: Option<(Unit, &'static str)>,
    open: bool,
    numeric: bool,
    /// Kept as an extra column.
    pub(super) extra: bool,
    /// What the column is added to, with its sign.
    pub(super) into: Vec<(Target, f64)>,
    look: Values,
    /// A running meter reading: the energy of an interval is the difference of two.
    pub(super) register: bool,
    /// One of three phases.
    pub(super) phase: bool,
    /// A column about which nothing needs to be said: it names the channel, or holds the unit.
    quiet: bool,
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
    let phases = values::phases(&dialect.headers);
    let hint = [
        (super::site_name(file), "the file's name says"),
        (dialect.preamble.clone(), "the lines above the table say"),
    ]
    .into_iter()
    .find_map(|(text, which)| match super::unit::unit_of(&text) {
        Stated::Power(unit) => Some((unit, which)),
        _ => None,
    });
    for (i, header) in dialect.headers.iter().enumerate() {
        let look = values::values(dialect, timing, i);
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
            hint,
            open: false,
            numeric,
            extra: named
                .iter()
                .any(|name| key(name) == key(header) || key(name) == key(&format!("{file}/{header}"))),
            into: Vec::new(),
            look,
            register: false,
            phase: phases.iter().any(|set| set.contains(&i)),
            quiet: false,
        };
        match &unit {
            Stated::Power(unit) => column.unit = Some(*unit),
            Stated::Other(other) => column.other.clone_from(other),
            Stated::Nothing => {}
        }
        column.role(timing.role(i), wanted, &unit);
        if dialect.names.contains(&i) {
            column.quiet = true;
            column.open = false;
            column.role = wanted.unwrap_or(Role::Ignore);
            "its cells name the channel".clone_into(&mut column.why);
        }
        columns.push(column);
    }
    repeated(dialect, &mut columns);
    Ok(columns)
}

impl Column {
    fn role(&mut self, time: Option<Role>, wanted: Option<Role>, unit: &Stated) {
        // A person who states a unit of power knows that the column is no reading.
        self.register = self.look.register
            && !(self.stated_unit && self.unit.is_some_and(|unit| !unit.is_energy()))
            && !matches!(unit, Stated::Other(_));
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
                if let Some(role) = of_unit(&self.other) {
                    self.role = role;
                    self.why = format!("its unit is {}", quote(&self.other));
                    return;
                }
                (Role::Ignore, format!("its header says {}, but its unit is no power or energy", quote(word)))
            }
            Guess::Role(role, word) => (role, format!("its header says {}", quote(word))),
            Guess::Net(_) | Guess::Unknown if of_unit(&self.other).is_some() => {
                let role = of_unit(&self.other).unwrap_or(Role::Ignore);
                (role, format!("its unit is {}", quote(&self.other)))
            }
            _ if matches!(unit, Stated::Other(_)) => {
                (Role::Ignore, "its unit is no power or energy".to_owned())
            }
            _ if self.look.filled == 0 => (Role::Ignore, "it is empty".to_owned()),
            Guess::Net(_) | Guess::Unknown => {
                self.open = true;
                (Role::Ignore, "its header says nothing that is known".to_owned())
            }
        };
        self.role = role;
        self.why = why;
    }

    /// Whether its numbers are power or energy.
    fn counts(&self) -> bool {
        self.numeric && self.unit.is_some()
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

/// The role that a unit other than power or energy stands for.
fn of_unit(unit: &str) -> Option<Role> {
    let low = unit.to_lowercase();
    Some(match low.as_str() {
        "kvar" | "kvarh" | "var" | "varh" | "mvar" | "mvarh" => Role::Reactive,
        "hz" => Role::Frequency,
        _ if super::unit::money(&low) => Role::Price,
        _ => return None,
    })
}

/// Leaves out columns that repeat another, and the parts of a column that is their sum.
fn repeated(dialect: &Dialect, columns: &mut [Column]) {
    let kind = |at: usize| {
        let column = &columns[at];
        let counts = column.numeric && !column.stated && (column.open || is_power(column.role));
        // Roles by their kind, since a total may be headed by another word than its parts.
        let class = match column.role {
            Role::Import | Role::Demand | Role::Ignore => 0,
            Role::Export => 1,
            Role::Supply | Role::Generation => 2,
            _ => 3,
        };
        counts.then_some(class)
    };
    for again in values::again(dialect, &kind, &|at| columns[at].phase, &|at| {
        columns[at].unit.is_some_and(Unit::is_energy)
    }) {
        let whole = quote(&columns[again.whole].header);
        for part in again.parts {
            let column = &mut columns[part];
            column.role = Role::Ignore;
            column.open = false;
            column.why = format!("{whole} holds it already");
        }
    }
}

/// Refuses roles and units stated for columns that no file has.
pub(super) fn check_stated(files: &[(String, Vec<Column>)], terms: &RecordCase) -> Result<()> {
    for (field, names) in [
        ("record.roles", terms.roles.keys().collect::<Vec<_>>()),
        ("record.units", terms.units.keys().collect()),
        ("record.scale", terms.scale.keys().collect()),
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
