//! What is wrong or doubtful in the record: kind, words, rows, whether figures change, and the remedy as a choice.

use leptos::prelude::*;

use millpond::record::{Finding, FindingKind};
use millpond::units::people;

use super::desk::Desk;
use super::field::named;

const GAPS: [(&str, &str); 5] = [
    ("leave_out", "left out"),
    ("hold", "last value held"),
    ("line", "joined by a line"),
    ("zero", "taken as zero"),
    ("neighbour_days", "as on neighbouring days"),
];

const REPEATS: [(&str, &str); 3] = [("first", "first kept"), ("last", "last kept"), ("mean", "mean taken")];

/// The list of findings.
pub(crate) fn list(desk: Desk) -> impl IntoView {
    let kinds = Memo::new(move |_| {
        findings(desk, |all| {
            let nth = |at: usize, kind| all[..at].iter().filter(|finding| finding.kind == kind).count();
            let row = |(at, finding): (usize, &Finding)| {
                (finding.kind, nth(at, finding.kind), finding.changes_figures)
            };
            all.iter().enumerate().map(row).collect::<Vec<_>>()
        })
    });
    let none = Memo::new(move |_| kinds.with(Vec::is_empty));
    view! {
        <h3>"Findings"</h3>
        {move || none.get().then(|| view! { <p class="empty">"Nothing wrong or doubtful was found in the record."</p> })}
        <ul class="findings" hidden=move || none.get()>
            // A row stays as long as its kind does, so that a choice keeps its focus; words and choices inside follow on their own.
            <For
                each=move || kinds.get()
                key=|(kind, nth, changes)| (*kind as u8, *nth, *changes)
                children=move |(kind, nth, changes)| row(desk, kind, nth, changes)
            />
        </ul>
    }
}

fn findings<T: Default>(desk: Desk, pick: impl FnOnce(&[Finding]) -> T) -> T {
    desk.of(|sheet| pick(&sheet.findings))
}

/// The `nth` finding of a kind.
fn row(desk: Desk, kind: FindingKind, nth: usize, changes: bool) -> impl IntoView {
    let finding = Memo::new(move |_| {
        findings(desk, |all| all.iter().filter(|finding| finding.kind == kind).nth(nth).cloned())
    });
    let text = move || finding.with(|finding| finding.as_ref().map(|finding| finding.text.clone()));
    let rows = move || finding.with(|finding| finding.as_ref().map(first_row).unwrap_or_default());
    let remedy = match kind {
        FindingKind::Gap => named(desk, "Remedy for gaps", &["record", "remedies", "gap"], &GAPS).into_any(),
        FindingKind::Repeat | FindingKind::Conflict => {
            named(desk, "Remedy for repeats", &["record", "remedies", "repeat"], &REPEATS).into_any()
        }
        _ => {
            view! { {move || finding.with(|finding| finding.as_ref().map(|finding| finding.remedy.clone()))} }
                .into_any()
        }
    };
    view! {
        <li class=if changes { "changes" } else { "remark" }>
            <span class="kind">{words(kind)}</span>
            <span class="what">{text}<span class="rows">{rows}</span></span>
            <span class="sev">{if changes { "changes figures" } else { "note" }}</span>
            <span class="rem">{remedy}</span>
        </li>
    }
}

fn first_row(finding: &Finding) -> String {
    // Most sentences name their rows themselves.
    let Some(row) = finding.first_row.filter(|row| !finding.text.contains(&row.to_string())) else {
        return String::new();
    };
    let file = if finding.file.is_empty() { String::new() } else { format!(" of {}", finding.file) };
    format!(" (first at row {}{file})", people::whole(row as f64))
}

const fn words(kind: FindingKind) -> &'static str {
    match kind {
        FindingKind::Gap => "Gap",
        FindingKind::Repeat => "Repeat",
        FindingKind::Conflict => "Conflict",
        FindingKind::Disorder => "Disorder",
        FindingKind::Text => "Text",
        FindingKind::Stuck => "Stuck",
        FindingKind::Outlier => "Outlier",
        FindingKind::Negative => "Negative",
        FindingKind::NightSupply => "Night supply",
        FindingKind::Clipped => "Clipped",
        FindingKind::Jump => "Jump",
        FindingKind::MixedSteps => "Mixed steps",
        FindingKind::ClockChange => "Clock change",
        FindingKind::UnitDoubt => "Unit",
        FindingKind::SignDoubt => "Sign",
        FindingKind::StampDoubt => "Stamp",
        FindingKind::Filled => "Filled",
        FindingKind::Ignored => "Not used",
        FindingKind::TypicalYear => "Typical year",
        FindingKind::Netted => "Netted",
        FindingKind::Quality => "Quality",
        FindingKind::Phases => "Phases",
        FindingKind::Register => "Register",
    }
}
