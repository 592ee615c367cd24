//! The Plane station in words.

use super::{SCREENING_NOTE, count, figure};
use crate::assess::Assessment;
use crate::case::Case;
use crate::chart::Verdict;
use crate::result::SiteResult;
use crate::sheet::{Figure, Method, Station, View};
use crate::technology::Screened;
use crate::units::people;

pub(super) fn station(done: &Assessment, result: &SiteResult, case: &Case, view: &View) -> Station {
    let shown: Vec<&Screened> = result
        .screening
        .iter()
        .filter(|kind| view.all_kinds || kind.default_on || view.picks.contains(&kind.technology))
        .collect();
    let of = |verdict: Verdict| shown.iter().filter(|kind| kind.verdict == verdict).count();
    let (carry, strain, fail) = (of(Verdict::Carries), of(Verdict::Strains), of(Verdict::Fails));
    let names: Vec<&str> =
        shown.iter().filter(|kind| kind.verdict == Verdict::Carries).map(|kind| kind.name.as_str()).collect();
    let sentence = if shown.is_empty() {
        "Nothing is asked of a store, so no kind is judged.".to_owned()
    } else {
        let kinds = count(shown.len(), "kind", "kinds");
        let which = match names.as_slice() {
            [one] => format!(" {one} carries it."),
            [one, two] => format!(" {one} and {two} carry it."),
            [one, .., last] if names.len() <= 4 => {
                let middle = names[1..names.len() - 1].join(", ");
                format!(" {one}, {middle} and {last} carry it.")
            }
            _ => String::new(),
        };
        let verb = |number: usize, one: &str, many: &str| {
            format!("{number} {}", if number == 1 { one } else { many })
        };
        format!(
            "Of {kinds}, {} this duty, {} and {}.{which}",
            verb(carry, "carries", "carry"),
            verb(strain, "strains", "strain"),
            verb(fail, "fails", "fail")
        )
    };
    let mut first: Vec<Figure> = Vec::new();
    let lightest = shown
        .iter()
        .filter(|kind| kind.verdict == Verdict::Carries)
        .filter_map(|kind| kind.mass_kg.map(|mass| (mass.typical, kind.name.as_str())))
        .min_by(|a, b| a.0.total_cmp(&b.0));
    if let Some((mass, name)) = lightest {
        let shown = people::mass(mass);
        first.push(Figure {
            path: String::new(),
            value: Some(mass),
            label: "Lightest that carries".to_owned(),
            number: shown.number,
            unit: shown.unit.to_owned(),
            context: format!("{name}, installed, typical values"),
        });
    }
    if let Some(duration) = done.screening.duration_s {
        first.push(figure(
            "plane.duration_s",
            duration,
            "Duration",
            people::duration(duration),
            "energy over power, the requirement\u{2019}s line",
        ));
    }
    if let Some(budget) = case.site.mass_budget_kg {
        first.push(Figure {
            path: String::new(),
            value: Some(budget),
            label: "Mass budget, asked".to_owned(),
            number: people::mass(budget).number,
            unit: people::mass(budget).unit.to_owned(),
            context: "installed".to_owned(),
        });
    }
    Station {
        sentence,
        rail: if shown.is_empty() { "nothing asked".to_owned() } else { format!("{carry} of {} carry", shown.len()) },
        warning: String::new(),
        figures: vec![first],
        method: vec![Method {
            summary: "curves from circuits, verdicts at the requirement\u{2019}s duration".to_owned(),
            text: "Each kind is a circuit behind a converter: a capacitance or an inductance with series and parallel losses, or fixed \
                   efficiencies. Its curve is the energy delivered at constant power. A kind carries a criterion if its typical value meets it \
                   with the margin, strains if only the good end of its published range does, and fails if even that does not."
                .to_owned(),
            formula: "mass = max(E / (e × depth), P / p) × packing".to_owned(),
            source: "Ragone 1968, SAE 680453; Christen and Carlen 2000, J. Power Sources 91:210\u{2013}216; the ranges\u{2019} sources stand in the catalogue"
                .to_owned(),
            limits: "Most ranges were recalled from the literature and not re-read: \u{201c}unconfirmed\u{201d} says so. Constant power over the whole \
                     energy is the severe reading of a duty. Masses of working fluids are never plant masses."
                .to_owned(),
        }],
        notes: vec![SCREENING_NOTE.to_owned()],
    }
}
