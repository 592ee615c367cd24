//! How the columns of a site add up to supply, demand and net power.

use super::super::unit::Unit;
use super::super::words::{self, Guess};
use super::super::{Finding, FindingKind, Role, site_name};
use super::{Column, Target, is_extra, is_power, key};
use crate::fault::{Fault, Result, quote};

/// Settles what headers left open, over all files of the site, and says what each column is added to.
pub(in crate::record) fn plan(
    files: &mut [(String, Vec<Column>)],
    findings: &mut Vec<Finding>,
) -> Result<()> {
    by_file_name(files);
    settle_open(files, findings);
    beside_intervals(files);
    let count =
        |role: Role| files.iter().flat_map(|file| &file.1).filter(|column| column.role == role).count();
    let [supply, demand, import, export] =
        [Role::Supply, Role::Demand, Role::Import, Role::Export].map(count);
    let generated = supply + count(Role::Generation);
    let nets = count(Role::NetImport) + count(Role::NetExport);
    let grid = import + export + nets > 0;
    let both = import > 0 && export > 0;
    let mut doubt = None;
    for column in files.iter_mut().flat_map(|file| &mut file.1) {
        use Target::{Demand, Net, Supply};
        // Import and export stand for net power only where no net column does. What a store that is there already takes
        // and gives is taken out again: the record is the site without it.
        let (drawn, fed) = match column.role {
            Role::Import if nets == 0 => (1.0, 0.0),
            Role::Export if nets == 0 => (0.0, 1.0),
            Role::NetImport => (1.0, 0.0),
            Role::NetExport => (0.0, 1.0),
            Role::StoreCharge if grid && column.counts() => (0.0, 1.0),
            Role::StoreDischarge if grid && column.counts() => (1.0, 0.0),
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
            Role::Demand if generated == 0 && (nets > 0 || both) => {
                vec![(Demand, 1.0), (Supply, 1.0)]
            }
            Role::Demand => vec![(Demand, 1.0)],
            _ if out == 0.0 => Vec::new(),
            _ if generated > 0 && demand > 0 => Vec::new(),
            _ if generated > 0 => vec![(Demand, 0.0 - out)],
            _ if demand > 0 && (nets > 0 || both) => vec![(Supply, out)],
            _ if demand > 0 => Vec::new(),
            _ if nets == 0 && export == 0 => vec![(Demand, 0.0 - out)],
            _ => vec![(Net, out)],
        };
        if both && nets == 0 && !column.into.is_empty() {
            match column.role {
                Role::Import => column.into.push((Target::Drawn, 1.0)),
                Role::Export => column.into.push((Target::Fed, 1.0)),
                _ => {}
            }
        }
        if matches!(column.role, Role::StoreCharge | Role::StoreDischarge) && !column.into.is_empty() {
            column
                .why
                .push_str("; taken out of the site's power, which is given as it would be without the store");
        }
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
    if generated == 0 && demand == 0 && (nets > 0 || both) {
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

/// Roles of columns whose headers say nothing, from the name of their file.
fn by_file_name(files: &mut [(String, Vec<Column>)]) {
    let guess = |file: &str| match words::guess(&site_name(file)) {
        Guess::Role(role, word) => Some((role, word)),
        _ => None,
    };
    let named = |role: Role| files.iter().any(|(file, _)| guess(file).is_some_and(|guess| guess.0 == role));
    // "export.csv" alone is a file that somebody exported.
    let meters = named(Role::Import) && named(Role::Export);
    for (file, columns) in files.iter_mut() {
        let Some((role, word)) = guess(file) else { continue };
        let usable = match role {
            Role::Supply | Role::Demand | Role::Generation => true,
            Role::Import | Role::Export => meters,
            _ => false,
        };
        if !usable || columns.iter().any(|column| is_power(column.role)) {
            continue;
        }
        let open = |column: &Column| column.open && column.guess == Guess::Unknown && column.look.filled > 0;
        let powers = columns.iter().filter(|column| open(column) && column.unit.is_some()).count();
        let many = columns.iter().filter(|column| open(column)).count();
        for column in columns.iter_mut().filter(|column| open(column)) {
            let one_sign = column.look.negative == 0 || column.look.positive == 0;
            if one_sign && (column.unit.is_some() || (powers == 0 && many == 1)) {
                column.take(role, format!("its file's name says {}", quote(word)));
            }
        }
    }
}

/// Leaves out running readings where the same file holds the energy of the intervals beside them.
fn beside_intervals(files: &mut [(String, Vec<Column>)]) {
    let class = |role: Role| match role {
        Role::Import | Role::Demand | Role::NetImport => 1,
        Role::Export | Role::NetExport => 2,
        Role::Supply | Role::Generation => 3,
        _ => 0,
    };
    let intervals: Vec<(String, u8)> = files
        .iter()
        .flat_map(|(file, columns)| columns.iter().map(move |column| (file, column)))
        .filter(|(_, column)| !column.register && class(column.role) > 0)
        .map(|(file, column)| (file.clone(), class(column.role)))
        .collect();
    for (file, columns) in files.iter_mut() {
        for column in columns.iter_mut().filter(|column| column.register && !column.stated) {
            let class = class(column.role);
            if class > 0 && intervals.iter().any(|(other, known)| other == file && *known == class) {
                column.role = Role::Ignore;
                column.why.push_str("; a running reading beside the values of the intervals");
            }
        }
    }
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
    // Channels of one table, and the phases of one connection, are taken together.
    let apart: Vec<(usize, usize)> = open.iter().copied().filter(|(f, c)| !files[*f].1[*c].phase).collect();
    let channels = files.len() > 1 && files.iter().all(|file| file.0 == files[0].0);
    if apart.is_empty() || channels {
        let mut names = Vec::new();
        for (f, c) in open {
            let column = &mut files[f].1[c];
            let often_zero = column.look.zeros * 5 > column.look.numbers;
            let role = if often_zero && channels && !supply { Role::Supply } else { Role::Demand };
            column
                .take(role, "no header says what is what; channels of one quantity are added up".to_owned());
            names.push(format!(
                "{} ({})",
                quote(&column.header),
                if role == Role::Supply { "supply" } else { "demand" }
            ));
        }
        let text =
            format!("The headers do not say what these columns are; they are added up: {}.", list(&names));
        findings.push(note(FindingKind::SignDoubt, names.len() as u64, "", "role guessed", text, true));
        return;
    }
    // Of two columns the one that is often zero is supply, as the sun does not shine at night.
    let zeros = |(f, c): (usize, usize)| {
        let look = &files[f].1[c].look;
        look.zeros as f64 / look.numbers.max(1) as f64
    };
    let mut idle: Vec<_> = open.iter().copied().filter(|at| !supply && zeros(*at) > 0.2).collect();
    let mut busy: Vec<_> = open.iter().copied().filter(|at| !idle.contains(at) && zeros(*at) < 0.1).collect();
    if busy.is_empty() {
        (idle, busy) = (Vec::new(), vec![open[0]]);
    }
    // Without units nothing says that further columns are of the same kind.
    if !open.iter().all(|(f, c)| files[*f].1[*c].unit.is_some()) {
        idle.truncate(1);
        busy.truncate(1);
    }
    for (list, role, why) in [
        (idle, Role::Supply, "it is zero for much of the time"),
        (busy, Role::Demand, "no header says what is what"),
    ] {
        let added = if list.len() > 1 { ", added to the others of its kind" } else { "" };
        for (f, c) in list {
            let (file, columns) = &mut files[f];
            columns[c].take(role, why.to_owned());
            let name = if role == Role::Supply { "supply" } else { "demand" };
            let text =
                format!("Column {} is taken as {name} by a guess: {why}{added}.", quote(&columns[c].header));
            findings.push(note(FindingKind::SignDoubt, 1, file, "role guessed", text, true));
        }
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
            if let Some(unit) = column.unit {
                let how = if column.stated_unit { "as stated" } else { "as the header or units row says" };
                column.why = format!("{}; {} {how}", column.why, unit.label());
            } else if let Some((unit, which)) = column.hint {
                column.unit = Some(unit);
                column.why = format!("{}; {}, as {which}", column.why, unit.label());
            } else {
                column.unit = Some(Unit::Kw);
                guessed.push(quote(&column.header));
            }
            if column.register {
                let energy = column.unit.map_or(Unit::Kwh, Unit::energy);
                column.unit = Some(energy);
                column.why.push_str(
                    "; its values only ever rise: a running reading, of which differences are taken",
                );
            }
        }
        if guessed.is_empty() {
            continue;
        }
        let registers = columns.iter().all(|column| column.into.is_empty() || column.register);
        let unit = if registers { "kWh" } else { "kW" };
        for column in columns.iter_mut().filter(|column| guessed.contains(&quote(&column.header))) {
            column.why = format!("{}; no unit is stated, {unit} is a guess", column.why);
        }
        let text = format!(
            "No unit is stated for {}: {} is taken.{}",
            list(&guessed),
            if registers { "kWh" } else { "kW (average power)" },
            if registers {
                ""
            } else {
                " If the values are kWh per interval, every energy is too small or too large by the number of intervals in an hour."
            }
        );
        findings.push(note(FindingKind::UnitDoubt, 1, file, &format!("{unit} taken"), text, true));
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
                    && !column.quiet
                    && (column.role == Role::Ignore || is_power(column.role))
            })
            .map(|column| quote(&column.header))
            .collect();
        if unused.is_empty() {
            continue;
        }
        let text = format!(
            "{} not used: {}.",
            if unused.len() == 1 {
                "One column is".to_owned()
            } else {
                format!("{} columns are", unused.len())
            },
            list(&unused)
        );
        let found = note(FindingKind::Ignored, unused.len() as u64, file, "left out", text, false);
        // The channels of a table share its other columns.
        if !findings.contains(&found) {
            findings.push(found);
        }
    }
}

pub(super) fn list(names: &[String]) -> String {
    const MOST: usize = 8;
    let text = names.iter().take(MOST).cloned().collect::<Vec<_>>().join(", ");
    if names.len() > MOST { format!("{text} and {} more", names.len() - MOST) } else { text }
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
    Fault::new(
        format!("no column holds numbers that could be power or energy; the columns are {}", list(&headers)),
        file,
        "State the role of the column that holds supply, demand or net power, or choose another file.",
    )
}
