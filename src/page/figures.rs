//! Key figures beside a sentence or picture, and the fold that lists every figure of the result by its path.

use leptos::prelude::*;

use millpond::sheet::{Figure, Listed, Sheet, Station};

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
    let rows = Memo::new(move |_| desk.of(|sheet| rows(&sheet.listed, parts)));
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

fn row(row: Listed) -> impl IntoView {
    let name = row.path.clone();
    view! {
        <tr><th scope="row">{name}</th><td class="n" data-figure=row.path data-value=row.value>{row.shown}</td><td>{row.unit}</td></tr>
    }
}

/// The numbers of parts of the result.
fn rows(listed: &[Listed], parts: &[&str]) -> Vec<Listed> {
    let within = |path: &str| parts.iter().any(|part| path.split('.').next() == Some(part));
    listed.iter().filter(|row| within(&row.path)).cloned().collect()
}
