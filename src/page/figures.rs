//! Key figures beside a sentence or picture, and the fold that lists every figure of the result by its path.

use leptos::prelude::*;
use serde_json::Value;

use millpond::result::SiteResult;
use millpond::sheet::{Figure, Sheet, Station};
use millpond::units::people;

use super::desk::Desk;

/// The `group`-th group of a station's key figures.
pub(crate) fn figures(desk: Desk, of: fn(&Sheet) -> &Station, group: usize) -> impl IntoView {
    let figures =
        Memo::new(move |_| desk.of(|sheet| of(sheet).figures.get(group).cloned().unwrap_or_default()));
    move || {
        let figures = figures.get();
        (!figures.is_empty())
            .then(|| view! { <dl class="figures">{figures.into_iter().map(figure).collect_view()}</dl> })
    }
}

fn figure(figure: Figure) -> impl IntoView {
    // A figure that does not exist for this record has no number to be read.
    let value = figure.value.filter(|_| !figure.path.is_empty()).map(|value| value.to_string());
    let path = value.is_some().then_some(figure.path);
    view! {
        <div>
            <dt>{figure.label}</dt>
            <dd>
                <span class="val" data-figure=path data-value=value>{figure.number}</span>" "
                <span class="unit">{figure.unit}</span>
                {(!figure.context.is_empty()).then(|| view! { <small>{figure.context}</small> })}
            </dd>
        </div>
    }
}

/// A fold with every number of parts of the result: name, value, unit.
pub(crate) fn all_figures(desk: Desk, parts: &'static [&'static str]) -> impl IntoView {
    // The rows stand in the document whether the fold is open or not, so that every figure can be found and read.
    let rows = Memo::new(move |_| desk.of(|sheet| rows(&sheet.result, parts)));
    view! {
        <details class="fold">
            <summary>"All figures"<span class="count">{move || rows.with(|rows| format!("{} numbers", rows.len()))}</span></summary>
            <div class="scroll"><table>
                <thead><tr><th>"Name"</th><th class="n">"Value"</th><th>"Unit"</th></tr></thead>
                <tbody>{move || rows.get().into_iter().map(row).collect_view()}</tbody>
            </table></div>
        </details>
    }
}

#[derive(Debug, Clone, PartialEq)]
struct Row {
    path: String,
    value: String,
    shown: String,
}

fn row(row: Row) -> impl IntoView {
    let unit = unit(&row.path);
    let name = row.path.clone();
    view! {
        <tr><th scope="row">{name}</th><td class="n" data-figure=row.path data-value=row.value>{row.shown}</td><td>{unit}</td></tr>
    }
}

fn rows(result: &SiteResult, parts: &[&str]) -> Vec<Row> {
    let mut rows = Vec::new();
    if let Ok(Value::Object(result)) = serde_json::to_value(result) {
        for part in parts {
            if let Some(value) = result.get(*part) {
                walk(part, value, &mut rows);
            }
        }
    }
    rows
}

/// Every scalar below a value, by its path; words and yes or no are left to the sentences and tables.
fn walk(path: &str, value: &Value, rows: &mut Vec<Row>) {
    match value {
        Value::Number(number) => rows.push(Row {
            path: path.to_owned(),
            value: number.to_string(),
            shown: number.as_f64().map(|value| people::significant(value, 6)).unwrap_or_default(),
        }),
        Value::Array(list) => {
            for (i, value) in list.iter().enumerate() {
                walk(&format!("{path}.{i}"), value, rows);
            }
        }
        Value::Object(fields) => {
            for (name, value) in fields {
                walk(&format!("{path}.{name}"), value, rows);
            }
        }
        _ => {}
    }
}

/// The unit that a field's name ends in.
fn unit(path: &str) -> &'static str {
    const ENDS: [(&str, &str); 16] = [
        ("_kw_per_s", "kW/s"),
        ("_wh_per_kg", "Wh/kg"),
        ("_wh_per_l", "Wh/l"),
        ("_w_per_kg", "W/kg"),
        ("_w_per_l", "W/l"),
        ("_per_h", "1/h"),
        ("_kwh", "kWh"),
        ("_kw", "kW"),
        ("_kg", "kg"),
        ("_s", "s"),
        ("_l", "l"),
        ("_share", "of 1"),
        ("_efficiency", "of 1"),
        ("self_consumption", "of 1"),
        ("self_sufficiency", "of 1"),
        ("_c", "\u{b0}C"),
    ];
    // Fields of a group (losses, a mass at its typical and good end) carry the unit in the group's name.
    let parent = path.rsplit_once('.').map_or("", |(parent, _)| parent);
    [path, parent]
        .iter()
        .find_map(|name| ENDS.iter().find(|(end, _)| name.ends_with(end)))
        .map_or("", |(_, unit)| unit)
}
