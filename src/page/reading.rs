//! How the files were read: the first rows with a choice of role and unit over each column, and further corrections.

use leptos::prelude::*;

use millpond::record::{ColumnReading, FileReading, Role};
use millpond::units::asked::Asked;

use super::desk::{Desk, read_afresh};
use super::field::{Empty, Field, choice, input, named};
use super::fold::fold;

/// Rows shown of each file.
const ROWS: usize = 3;

/// Roles as the case and as a person names them, in the order of a list.
const ROLES: [(Role, &str, &str); 20] = [
    (Role::Time, "time", "time"),
    (Role::Date, "date", "date alone"),
    (Role::Clock, "clock", "time of day alone"),
    (Role::Supply, "supply", "supply"),
    (Role::Demand, "demand", "demand"),
    (Role::NetImport, "net_import", "net, import positive"),
    (Role::NetExport, "net_export", "net, export positive"),
    (Role::Import, "import", "import"),
    (Role::Export, "export", "export"),
    (Role::Generation, "generation", "generation"),
    (Role::StoreCharge, "store_charge", "charging of a store"),
    (Role::StoreDischarge, "store_discharge", "discharging of a store"),
    (Role::Asked, "asked", "asked of a store"),
    (Role::Critical, "critical", "critical demand"),
    (Role::Schedule, "schedule", "schedule"),
    (Role::Price, "price", "price"),
    (Role::Frequency, "frequency", "frequency"),
    (Role::Reactive, "reactive", "reactive power"),
    (Role::Quality, "quality", "quality"),
    (Role::Ignore, "ignore", "not used"),
];

const UNITS: [&str; 6] = ["W", "kW", "MW", "Wh", "kWh", "MWh"];

/// What the reading's table is made of; roles and units are followed by each choice on its own, so that a choice keeps
/// its focus while the record is read again.
#[derive(Debug, Clone, PartialEq)]
struct Shape {
    name: String,
    headers: Vec<String>,
    rows: Vec<(u64, Vec<String>)>,
}

/// "As read", the note under it, and the fold with further corrections.
pub(crate) fn as_read(desk: Desk) -> impl IntoView {
    let shapes =
        Memo::new(move |_| desk.of(|sheet| sheet.reading.files.iter().map(shape).collect::<Vec<_>>()));
    let notes = Memo::new(move |_| {
        desk.of(|sheet| {
            sheet
                .reading
                .files
                .iter()
                .map(|file| note(file, sheet.reading.files.len() > 1))
                .collect::<Vec<_>>()
        })
    });
    let clock = Memo::new(move |_| desk.of(|sheet| sheet.reading.clock_note.clone()));
    view! {
        <h3>"As read"</h3>
        {move || {
            let shapes = shapes.get();
            let many = shapes.len() > 1;
            shapes.into_iter().enumerate().map(|(i, shape)| table(desk, i, &shape, many)).collect_view()
        }}
        <p class="note">{move || notes.get().into_iter().map(noted).collect_view()}{move || clock.get()}</p>
        {fold("Correct the reading", String::new, false, move || corrections(desk))}
    }
}

fn shape(file: &FileReading) -> Shape {
    Shape {
        name: file.name.clone(),
        headers: file.columns.iter().map(|column| column.header.clone()).collect(),
        rows: file.sample.iter().take(ROWS).cloned().collect(),
    }
}

/// Name where there are several files, separator, decimal mark, and the rest in words.
type Note = (String, String, char, String);

fn note(file: &FileReading, many: bool) -> Note {
    let separator = match file.separator {
        '\t' => "tab".to_owned(),
        other => other.to_string(),
    };
    let name = if many { format!("{}: ", file.name) } else { String::new() };
    let container = if file.container.is_empty() { String::new() } else { format!(" {}.", file.container) };
    (name, separator, file.decimal, format!(", stamps {}.{container}", file.stamps))
}

fn noted((name, separator, decimal, rest): Note) -> impl IntoView {
    view! { {name}"Separator "<b>{separator}</b>" decimal mark "<b>{decimal.to_string()}</b>{rest}<br /> }
}

/// One file's first rows, once for wide screens and once, a row per column, for a phone.
fn table(desk: Desk, file: usize, shape: &Shape, many: bool) -> impl IntoView + use<> {
    let numeric =
        |at: usize| shape.rows.iter().any(|(_, cells)| cells.get(at).is_some_and(|cell| is_number(cell)));
    let class = |at: usize| if numeric(at) { "n" } else { "" };
    let heads = shape
        .headers
        .iter()
        .enumerate()
        .map(|(j, header)| view! { <th class=class(j)>{header.clone()}</th> });
    let roles =
        (0..shape.headers.len()).map(|j| view! { <td class=class(j)>{column_choices(desk, file, j)}</td> });
    let rows = shape.rows.iter().map(|(number, cells)| {
        let cells = (0..shape.headers.len())
            .map(|j| view! { <td class=class(j)>{cells.get(j).cloned().unwrap_or_default()}</td> })
            .collect_view();
        view! { <tr><td class="rw">{number.to_string()}</td>{cells}</tr> }
    });
    let first = shape.rows.first().cloned().unwrap_or_default();
    let tall = shape.headers.iter().enumerate().map(|(j, header)| {
        view! {
            <tr>
                <th scope="row">{header.clone()}</th>
                <td class="n">{first.1.get(j).cloned().unwrap_or_default()}</td>
                <td>{column_choices(desk, file, j)}</td>
            </tr>
        }
    });
    view! {
        {many.then(|| view! { <p class="long"><b>{shape.name.clone()}</b></p> })}
        <div class="scroll" tabindex="0" role="region" aria-label="First rows as read"><table class="asread">
            <thead>
                <tr><th class="rw">"row"</th>{heads.collect_view()}</tr>
                <tr class="roles"><td></td>{roles.collect_view()}</tr>
            </thead>
            <tbody>{rows.collect_view()}</tbody>
        </table></div>
        <table class="asread-n">
            <thead><tr><th>"Column"</th><th class="n">{format!("Row {}", first.0)}</th><th>"Role"</th></tr></thead>
            <tbody>{tall.collect_view()}</tbody>
        </table>
    }
}

fn is_number(cell: &str) -> bool {
    cell.chars().any(|c| c.is_ascii_digit())
        && cell.chars().all(|c| c.is_ascii_digit() || " .,'-+\u{2212}\u{a0}\u{202f}eE".contains(c))
}

/// Choices of role and, where the role is a power, of unit.
fn column_choices(desk: Desk, file: usize, at: usize) -> impl IntoView {
    let column = Memo::new(move |_| desk.of(|sheet| sheet.reading.files.get(file)?.columns.get(at).cloned()));
    let header = column
        .with_untracked(|column| column.as_ref().map(|column| column.header.clone()).unwrap_or_default());
    let role = move || column.with(|column| column.as_ref().map_or(Role::Ignore, |column| column.role));
    let unit = move || {
        let unit =
            column.with(|column| column.as_ref().map(|column| column.unit.clone()).unwrap_or_default());
        UNITS.into_iter().find(|known| *known == unit).unwrap_or("")
    };
    let has_unit = Memo::new(move |_| !unit().is_empty() || is_power(role()));
    let why = move || column.with(|column| column.as_ref().map(|column: &ColumnReading| column.why.clone()));
    let (of_role, of_unit) = (header.clone(), header.clone());
    let unit_name = format!("Unit of {header}");
    view! {
        <span class="choices" title=why>
            {choice(format!("Role of {header}"), ROLES.map(|(role, _, words)| (role, words.to_owned())).to_vec(), role, move |role| {
                let word = ROLES.iter().find(|(known, ..)| *known == role).map(|(_, word, _)| *word);
                desk.edit(|case| case.put(&["record", "roles", &of_role], word));
            })}
            {move || has_unit.get().then(|| {
                let header = of_unit.clone();
                let mut units: Vec<(&'static str, String)> = UNITS.iter().map(|unit| (*unit, (*unit).to_owned())).collect();
                if unit().is_empty() {
                    units.insert(0, ("", "unit?".to_owned()));
                }
                choice(unit_name.clone(), units, unit, move |unit| {
                    desk.edit(|case| case.put(&["record", "units", &header], unit));
                })
            })}
        </span>
    }
}

const fn is_power(role: Role) -> bool {
    use Role::{
        Asked, Critical, Demand, Export, Generation, Import, NetExport, NetImport, Schedule, StoreCharge,
        StoreDischarge, Supply,
    };
    matches!(
        role,
        Supply
            | Demand
            | NetImport
            | NetExport
            | Import
            | Export
            | Generation
            | StoreCharge
            | StoreDischarge
            | Critical
            | Schedule
            | Asked
    )
}

const SEPARATORS: [(&str, &str); 5] =
    [("", "as guessed"), (",", "comma"), (";", "semicolon"), ("\t", "tab"), ("|", "bar")];
const DECIMALS: [(&str, &str); 3] = [("", "as guessed"), (".", "point"), (",", "comma")];
const ORDERS: [(&str, &str); 4] = [
    ("", "as guessed"),
    ("year_first", "year first"),
    ("day_first", "day first"),
    ("month_first", "month first"),
];
const STAMPS: [(&str, &str); 3] =
    [("", "as guessed, the start or the end"), ("start", "the start"), ("end", "the end")];
const READINGS: [(&str, &str); 2] =
    [("intervals", "averages of their intervals"), ("samples", "instantaneous samples")];

/// Further corrections of the reading.
fn corrections(desk: Desk) -> impl IntoView {
    let step = Field {
        asked: Asked::Seconds,
        name: "Step",
        size: 9,
        path: &["record", "step_s"],
        empty: Empty::Nothing,
    };
    let zone = move |event| {
        let name = event_target_value(&event).trim().to_owned();
        // The zone is looked up while reading; a name that is not known comes back as a fault that says so.
        desk.edit(|case| case.put(&["record", "zone"], name.as_str()));
    };
    view! {
        <ol class="terms">
            <li>"Cells are separated by "
                {named(desk, "Separator", &["record", "separator"], &SEPARATORS)}
                ", the decimal mark is "
                {named(desk, "Decimal mark", &["record", "decimal"], &DECIMALS)}
                "."
            </li>
            <li>"Dates are written "
                {named(desk, "Order of dates", &["record", "date_order"], &ORDERS)}
                "; a stamp marks "
                {named(desk, "Stamp marks", &["record", "stamp"], &STAMPS)}
                " of its interval."
            </li>
            <li>"Values are "
                {named(desk, "Values are", &["record", "reading"], &READINGS)}
                "; an interval lasts "
                {input(desk, step, || "as found".to_owned())}"."
            </li>
            <li>"The clock is that of "
                <input type="text" size="18" aria-label="Zone" autocomplete="off" placeholder="no zone"
                    prop:value=move || desk.case.with(|case| case.word(&["record", "zone"]).to_owned())
                    on:change=zone />
                " (a name such as Europe/Oslo)."
            </li>
            <li>
                <button class="quiet" on:click=move |_| desk.edit(read_afresh)>"Read as guessed again"</button>
            </li>
        </ol>
    }
}
