//! What each column stands for, and how the columns of a site add up to supply, demand and net power.

use super::dialect::Dialect;
use super::number::{self, Cell};
use super::stamp::{self, DAY};
use super::timing::Timing;
use super::words::{self, Guess, Stated, Unit};
use super::{ColumnReading, Finding, FindingKind, Role};
use crate::case::{DateOrder, RecordCase};
use crate::fault::{Fault, Result, quote};

/// A sum that columns add up to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Target {
    Supply = 0,
    Demand = 1,
    /// Net power as the files give it, positive = surplus.
    Net = 2,
}

/// A column as read so far.
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

/// Settles what headers left open, over all files of the site, and says what each column is added to.
pub(super) fn plan(files: &mut [(String, Vec<Column>)], findings: &mut Vec<Finding>) -> Result<()> {
    settle_open(files, findings);
    let count =
        |role: Role| files.iter().flat_map(|file| &file.1).filter(|column| column.role == role).count();
    let [supply, demand, import, export] =
        [Role::Supply, Role::Demand, Role::Import, Role::Export].map(count);
    let generated = supply + count(Role::Generation);
    let nets = count(Role::NetImport) + count(Role::NetExport);
    let grid = import + export + nets > 0;
    let mut doubt = None;
    for column in files.iter_mut().flat_map(|file| &mut file.1) {
        use Target::{Demand, Net, Supply};
        // Import and export stand for net power only where no net column does.
        let (drawn, fed) = match column.role {
            Role::Import if nets == 0 => (1.0, 0.0),
            Role::Export if nets == 0 => (0.0, 1.0),
            Role::NetImport => (1.0, 0.0),
            Role::NetExport => (0.0, 1.0),
            _ => (0.0, 0.0),
        };
        let out = fed - drawn;
        column.into = match column.role {
            Role::Supply | Role::Generation if demand == 0 && grid => {
                if column.role == Role::Supply && !column.stated {
                    column.role = Role::Generation;
                    column
                        .why
                        .push_str("; beside the meter's import and export it is generation on the site");
                }
                vec![(Supply, 1.0), (Demand, 1.0)]
            }
            Role::Supply | Role::Generation => vec![(Supply, 1.0)],
            Role::Demand if generated == 0 && (nets > 0 || (import > 0 && export > 0)) => {
                vec![(Demand, 1.0), (Supply, 1.0)]
            }
            Role::Demand => vec![(Demand, 1.0)],
            _ if out == 0.0 => Vec::new(),
            _ if generated > 0 && demand > 0 => Vec::new(),
            _ if generated > 0 => vec![(Demand, 0.0 - out)],
            _ if demand > 0 && (nets > 0 || (import > 0 && export > 0)) => vec![(Supply, out)],
            _ if demand > 0 => Vec::new(),
            _ if nets == 0 && export == 0 => vec![(Demand, 1.0)],
            _ => vec![(Net, out)],
        };
        if is_power(column.role) && column.into.is_empty() {
            column.why.push_str("; not needed beside the other columns");
        }
        if is_extra(column.role) && (column.numeric || column.stated) {
            column.extra = true;
        }
    }
    if generated > 0 && demand == 0 && nets == 0 && (import > 0) != (export > 0) {
        doubt = Some(if export == 0 {
            "There is generation and import but no export: demand is taken as generation plus import, which holds only if nothing is exported."
        } else {
            "There is generation and export but no import: demand is taken as generation minus export, which holds only if nothing is imported."
        });
    }
    if let Some(text) = doubt {
        findings.push(note(FindingKind::SignDoubt, 1, "", "taken as zero", text.to_owned(), true));
    }
    if generated == 0 && demand == 0 && (nets > 0 || (import > 0 && export > 0)) {
        findings.push(note(
            FindingKind::Netted,
            1,
            "",
            "net power taken as recorded",
            "The files hold what was drawn from and fed to the grid: supply and demand were netted before they were recorded, so that use on the site does not show.".to_owned(),
            false,
        ));
    }
    units(files, findings);
    ignored(files, findings);
    if files.iter().all(|file| file.1.iter().all(|column| column.into.is_empty() && !column.extra)) {
        return Err(nothing(files));
    }
    Ok(())
}

/// Roles of columns whose headers say nothing, from what else is there and from their values.
fn settle_open(files: &mut [(String, Vec<Column>)], findings: &mut Vec<Finding>) {
    let known = |files: &[(String, Vec<Column>)], roles: &[Role]| {
        files.iter().flat_map(|file| &file.1).any(|column| roles.contains(&column.role))
    };
    let supply = known(files, &[Role::Supply, Role::Generation]);
    let demand = known(files, &[Role::Demand]);
    let grid = known(files, &[Role::Import, Role::Export, Role::NetImport, Role::NetExport]);
    for (file, columns) in files.iter_mut() {
        for column in columns.iter_mut().filter(|column| column.open) {
            let Guess::Net(word) = column.guess else { continue };
            if (supply && demand) || grid {
                column.take(
                    Role::Ignore,
                    format!("its header says {}; not needed beside the other columns", quote(word)),
                );
            } else {
                net(file, column, word, findings);
            }
        }
    }
    let grid = known(files, &[Role::Import, Role::Export, Role::NetImport, Role::NetExport]);
    if demand || grid {
        return;
    }
    let open: Vec<(usize, usize)> = files
        .iter()
        .enumerate()
        .flat_map(|(f, file)| {
            file.1
                .iter()
                .enumerate()
                .filter(|(_, column)| column.open && !column.extra)
                .map(move |(c, _)| (f, c))
        })
        .collect();
    // Columns in kW or kWh come before columns without a unit.
    let powers: Vec<(usize, usize)> =
        open.iter().copied().filter(|(f, c)| files[*f].1[*c].unit.is_some()).collect();
    let open = if powers.is_empty() { open } else { powers };
    let Some(&(first_file, first)) = open.first() else { return };
    let same = key(&files[first_file].1[first].header);
    if open.iter().all(|(f, c)| key(&files[*f].1[*c].header) == same) {
        for (f, c) in open {
            let (file, columns) = &mut files[f];
            let column = &mut columns[c];
            if column.look.negative > 0 && column.look.positive > 0 && !supply {
                net(file, column, "", findings);
            } else {
                let why = if supply {
                    "the only other column of numbers beside supply"
                } else {
                    "the only column of numbers"
                };
                column.take(Role::Demand, why.to_owned());
                let text = format!("Column {} is taken as demand: it is {why}.", quote(&column.header));
                findings.push(note(FindingKind::SignDoubt, 1, file, "taken as demand", text, true));
            }
        }
        return;
    }
    // Of two columns the one that is often zero is supply, as the sun does not shine at night.
    let zeros = |(f, c): (usize, usize)| {
        let look = &files[f].1[c].look;
        look.zeros as f64 / look.numbers.max(1) as f64
    };
    let idle = open.iter().copied().find(|at| !supply && zeros(*at) > 0.2);
    let busy = open.iter().copied().find(|at| Some(*at) != idle && zeros(*at) < 0.1);
    let (idle, busy) = if busy.is_some() { (idle, busy) } else { (None, Some(open[0])) };
    for (at, role, why) in [
        (idle, Role::Supply, "it is zero for much of the time"),
        (busy, Role::Demand, "no header says what is what"),
    ] {
        let Some((f, c)) = at else { continue };
        let (file, columns) = &mut files[f];
        columns[c].take(role, why.to_owned());
        let name = if role == Role::Supply { "supply" } else { "demand" };
        let text = format!("Column {} is taken as {name} by a guess: {why}.", quote(&columns[c].header));
        findings.push(note(FindingKind::SignDoubt, 1, file, "role guessed", text, true));
    }
}

/// The sign of a net column whose header does not say which way is positive.
fn net(file: &str, column: &mut Column, word: &str, findings: &mut Vec<Finding>) {
    let said = if word.is_empty() {
        "it has both signs".to_owned()
    } else {
        format!("its header says {}", quote(word))
    };
    if column.look.negative == 0 && column.look.positive > 0 && word != "net" {
        column.take(Role::Import, format!("{said} and no value is negative"));
        return;
    }
    let (role, sign, because) = if column.look.night_sum > 0.0 {
        (
            Role::NetImport,
            "drawn from the grid",
            "it is positive in the hours after midnight, when sites draw",
        )
    } else if column.look.night_sum < 0.0 {
        (Role::NetExport, "surplus", "it is negative in the hours after midnight, when sites draw")
    } else {
        (Role::NetExport, "surplus", "nothing says otherwise")
    };
    column.take(role, format!("{said}; positive is taken as {sign}, since {because}"));
    let text = format!("In column {} positive is taken as {sign}: {because}.", quote(&column.header));
    findings.push(note(FindingKind::SignDoubt, 1, file, "sign guessed", text, true));
}

fn units(files: &mut [(String, Vec<Column>)], findings: &mut Vec<Finding>) {
    for (file, columns) in files {
        let mut guessed = Vec::new();
        for column in columns.iter_mut().filter(|column| !column.into.is_empty()) {
            match column.unit {
                Some(unit) => {
                    let how =
                        if column.stated_unit { "as stated" } else { "as the header or units row says" };
                    column.why.push_str(&format!("; {} {how}", unit.label()));
                }
                None => {
                    column.unit = Some(Unit::Kw);
                    column.why.push_str("; no unit is stated, kW is a guess");
                    guessed.push(quote(&column.header));
                }
            }
        }
        if !guessed.is_empty() {
            let text = format!("No unit is stated for {}: kW (average power) is taken.", list(&guessed));
            findings.push(note(FindingKind::UnitDoubt, 1, file, "kW taken", text, true));
        }
    }
}

fn ignored(files: &[(String, Vec<Column>)], findings: &mut Vec<Finding>) {
    for (file, columns) in files {
        let unused: Vec<String> = columns
            .iter()
            .filter(|column| {
                !column.extra
                    && column.into.is_empty()
                    && column.look.filled > 0
                    && !column.stated
                    && (column.role == Role::Ignore || is_power(column.role))
            })
            .map(|column| quote(&column.header))
            .collect();
        if unused.is_empty() {
            continue;
        }
        let registers = columns
            .iter()
            .any(|column| column.role == Role::Ignore && column.look.register && !column.stated);
        let text = format!(
            "{} not used: {}.{}",
            if unused.len() == 1 {
                "One column is".to_owned()
            } else {
                format!("{} columns are", unused.len())
            },
            list(&unused),
            if registers {
                " A column that only ever rises is a running meter reading; state its role if it is not."
            } else {
                ""
            }
        );
        findings.push(note(FindingKind::Ignored, unused.len() as u64, file, "left out", text, false));
    }
}

fn list(names: &[String]) -> String {
    const MOST: usize = 8;
    let mut text = names.iter().take(MOST).cloned().collect::<Vec<_>>().join(", ");
    if names.len() > MOST {
        text.push_str(&format!(" and {} more", names.len() - MOST));
    }
    text
}

fn note(
    kind: FindingKind,
    count: u64,
    file: &str,
    remedy: &str,
    text: String,
    changes_figures: bool,
) -> Finding {
    Finding {
        kind,
        count,
        first_row: None,
        file: file.to_owned(),
        remedy: remedy.to_owned(),
        text,
        changes_figures,
    }
}

#[cold]
fn nothing(files: &[(String, Vec<Column>)]) -> Fault {
    let (file, columns) =
        files.first().map_or(("", &[][..]), |(file, columns)| (file.as_str(), &columns[..]));
    let headers: Vec<String> = columns.iter().map(|column| quote(&column.header)).collect();
    let register = columns.iter().any(|column| column.look.register);
    Fault::new(
        format!("no column holds numbers that could be power or energy; the columns are {}", list(&headers)),
        file,
        if register {
            "A column that only ever rises is a running meter reading: export the energy or power of each interval, or state the column's role."
        } else {
            "State the role of the column that holds supply, demand or net power, or choose another file."
        },
    )
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
