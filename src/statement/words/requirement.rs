//! The Requirement station in words.

use super::{deficit_word, figure, kinds};
use crate::assess::Assessment;
use crate::case::{Case, Connection};
use crate::chart::ticks;
use crate::duty::Kind;
use crate::sheet::{Figure, Method, Pictures, Station};
use crate::units::people::{self, capital};

pub(super) fn station(done: &Assessment, case: &Case, pictures: &Pictures) -> Station {
    let asked = done.requirement.asked.as_ref();
    Station {
        sentence: sentence(done, pictures),
        rail: asked.map_or("nothing asked".to_owned(), |asked| {
            format!("{}, {}", people::energy(asked.point.delivered_kwh), people::power(asked.point.power_kw))
        }),
        warning: if asked.is_none() && done.duty.result.deficit() > 0.0 {
            "out of reach".to_owned()
        } else {
            String::new()
        },
        figures: vec![headline(done), three_ways(done, case), week(done), critical(done, pictures)],
        method: methods(done),
        notes: notes(done),
    }
}

fn sentence(done: &Assessment, pictures: &Pictures) -> String {
    let duty = &done.duty;
    let short = deficit_word(duty.connection);
    if let Some(takes) = kinds::takes(done) {
        return takes;
    }
    let Some(asked) = &done.requirement.asked else {
        if duty.result.deficit() == 0.0 && !matches!(duty.kind, Kind::Limits(_)) {
            return "Nothing is ever short, so nothing is asked of a store.".to_owned();
        }
        return match (&done.requirement.infeasible, duty.kind) {
            (_, Kind::Limits(_)) if done.requirement.infeasible.is_none() => {
                "The limits are never exceeded: no store is needed to hold them.".to_owned()
            }
            (Some(infeasible), _) => infeasible.why.clone(),
            (None, _) => {
                "What is asked is out of reach with this power: allow more power, or ask for less.".to_owned()
            }
        };
    };
    let point = &asked.point;
    let (energy, power) = (people::energy(point.delivered_kwh), people::power(point.power_kw));
    let duration = people::duration(3600.0 * point.delivered_kwh / point.power_kw);
    if let Kind::Limits(limits) = duty.kind {
        let limit = limits.import_kw.map_or_else(
            || format!("exports to {}", people::power(limits.export_kw.unwrap_or_default())),
            |limit| format!("imports to {}", people::power(limit)),
        );
        let limit = if duty.timed_limits() { "the limits of each hour".to_owned() } else { limit };
        return format!("To hold {limit} takes {power} and {energy} delivered, {duration} at full power.");
    }
    let share = people::percent(point.served_share);
    if duty.connection == Connection::Connected {
        let run = &asked.run;
        let before = duty.result.self_sufficiency;
        let after = run.self_sufficiency;
        let gain = match (before, after) {
            (Some(before), Some(after)) => {
                format!(
                    " Self-sufficiency rises from {} to {}",
                    people::percent(before),
                    people::percent(after)
                )
            }
            _ => format!(" It serves {share} of the import"),
        };
        return format!(
            "{power} and {energy} delivered carry {} a record from export into import.{gain}; {} of import remain.",
            people::energy(run.served_kwh),
            people::energy(run.unserved_kwh)
        );
    }
    let whole = pictures.coverage.marks.iter().find(|mark| mark.name == "no deficit");
    let rest = whole
        .filter(|whole| whole.energy_kwh > point.delivered_kwh && point.served_share < 1.0)
        .map_or(String::new(), |whole| {
            format!(
                " The last {} would take {} more.",
                people::percent(1.0 - point.served_share),
                people::energy(whole.energy_kwh - point.delivered_kwh)
            )
        });
    format!(
        "To serve {share} of the {short} takes {energy} delivered and {power}, {duration} at full power.{rest}"
    )
}

/// Beside the sentence: what a person of this kind of site looks for first.
fn headline(done: &Assessment) -> Vec<Figure> {
    let duty = &done.duty;
    let result = &done.requirement.result;
    let mut figures = Vec::new();
    let Some(asked) = &done.requirement.asked else { return figures };
    let point = &asked.point;
    match duty.kind {
        Kind::Limits(limits) => {
            if let Some(limit) = limits.import_kw {
                figures.push(figure(
                    "duty.import_limit_kw",
                    limit,
                    "Import limit held",
                    people::power(limit),
                    "asked",
                ));
            }
            if let Some(power) = result.least_discharge_kw {
                figures.push(figure(
                    "requirement.least_discharge_kw",
                    power,
                    "Least discharge power",
                    people::power(power),
                    "greatest import beyond the limit",
                ));
            }
        }
        _ if !duty.kind.balances() => figures.extend(kinds::powers(done)),
        _ if duty.connection == Connection::Connected => {
            let run = &asked.run;
            if let Some(share) = run.self_sufficiency {
                figures.push(unlisted(
                    "Self-sufficiency",
                    share,
                    people::percent(share),
                    duty.result.self_sufficiency.map_or(String::new(), |before| {
                        format!("{} without a store", people::percent(before))
                    }),
                ));
            }
            if let Some(share) = run.self_consumption {
                figures.push(unlisted(
                    "Self-consumption",
                    share,
                    people::percent(share),
                    duty.result.self_consumption.map_or(String::new(), |before| {
                        format!("{} without a store", people::percent(before))
                    }),
                ));
            }
            figures.push(unlisted(
                "Remaining import",
                run.unserved_kwh,
                people::energy(run.unserved_kwh),
                format!("of {}", people::energy(duty.result.deficit())),
            ));
        }
        _ => figures.push(figure(
            "requirement.asked.power_kw",
            point.power_kw,
            "Power",
            people::power(point.power_kw),
            "both ways, at the connection point",
        )),
    }
    figures
}

/// A key figure of the asked store's run, which is not in the result object.
fn unlisted(label: &str, value: f64, shown: people::Scaled, context: String) -> Figure {
    Figure {
        path: String::new(),
        value: Some(value),
        label: label.to_owned(),
        number: shown.number,
        unit: shown.unit.to_owned(),
        context,
    }
}

/// The capacity three ways.
fn three_ways(done: &Assessment, case: &Case) -> Vec<Figure> {
    let Some(asked) = &done.requirement.asked else { return Vec::new() };
    let point = &asked.point;
    let efficiency = people::percent(done.requirement.working.losses.discharge);
    let assumed = if done.requirement.working.assumed { ", assumed" } else { "" };
    let margin = if case.requirement.margin > 0.0 {
        format!(", margin {}", people::percent(case.requirement.margin))
    } else {
        String::new()
    };
    vec![
        figure(
            "requirement.asked.delivered_kwh",
            point.delivered_kwh,
            "Delivered",
            people::energy(point.delivered_kwh),
            "at the connection point, full to empty",
        ),
        figure(
            "requirement.asked.usable_kwh",
            point.usable_kwh,
            "Usable inside",
            people::energy(point.usable_kwh),
            format!("over discharge efficiency {efficiency}{assumed}"),
        ),
        figure(
            "requirement.asked.nameplate_kwh",
            point.nameplate_kwh,
            "Nameplate at start of life",
            people::energy(point.nameplate_kwh),
            format!(
                "depth {}, end of life {}{margin}",
                people::percent(case.requirement.depth),
                people::percent(case.requirement.end_of_life)
            ),
        ),
    ]
}

fn week(done: &Assessment) -> Vec<Figure> {
    let Some(asked) = &done.requirement.asked else { return Vec::new() };
    let run = &asked.run;
    let mut figures = vec![unlisted(
        "Served in the record",
        run.served_kwh,
        people::energy(run.served_kwh),
        format!("by {} delivered", people::energy(asked.point.delivered_kwh)),
    )];
    if let Some(cycles) = run.equivalent_full_cycles {
        figures.push(unlisted(
            "Equivalent full cycles",
            cycles,
            people::Scaled { number: people::significant(cycles, 3), unit: "" },
            "in the record".to_owned(),
        ));
    }
    if let Some(hold) = run.mean_hold_s {
        figures.push(unlisted(
            "Mean hold",
            hold,
            people::duration(hold),
            "Little\u{2019}s law on the level".to_owned(),
        ));
    }
    figures
}

fn critical(done: &Assessment, pictures: &Pictures) -> Vec<Figure> {
    let mut figures = Vec::new();
    if let Some(critical) = &pictures.cumulative.critical {
        figures.push(Figure {
            path: String::new(),
            value: Some((critical.to_us - critical.from_us) / 1e6),
            label: "Critical period".to_owned(),
            number: people::duration((critical.to_us - critical.from_us) / 1e6).number,
            unit: people::duration((critical.to_us - critical.from_us) / 1e6).unit.to_owned(),
            context: format!("{} to {}", ticks::moment(critical.from_us), ticks::moment(critical.to_us)),
        });
    }
    if let Some(efficiency) = done.requirement.result.least_round_trip_efficiency
        && efficiency <= 1.0
    {
        figures.push(figure(
            "requirement.least_round_trip_efficiency",
            efficiency,
            "Least round trip",
            people::percent(efficiency),
            "deficit over surplus, to serve it all",
        ));
    }
    figures
}

fn methods(done: &Assessment) -> Vec<Method> {
    let coverage = if !done.duty.kind.balances() && !matches!(done.duty.kind, Kind::Limits(_)) {
        kinds::coverage_method()
    } else if matches!(done.duty.kind, Kind::Limits(_)) {
        Method {
            summary: "window sums of what the limits force".to_owned(),
            text: "For each limit the store must give at least what exceeds it and may take back at most what is left below it. The least \
                   energy is the largest sum that these bounds force over any window of the record, repeated; it is found in one pass \
                   backwards and one forwards for each of the limits drawn."
                .to_owned(),
            formula: "r(t) = max(0, r(t+1) − w(t))    energy = max r    w = η_c c Δt while charging, −d Δt / η_d while discharging".to_owned(),
            source: "Sequent peak method, Thomas and Burden 1963 (from memory), on the interval of allowed storage power".to_owned(),
            limits: "Foresight: the store is taken to refill in time. Between the points drawn the curve is joined by straight lines."
                .to_owned(),
        }
    } else {
        Method {
            summary: "falling ranges of the cumulative curve, exact for every energy".to_owned(),
            text: "The record is repeated. Closed cycles are taken out of the cumulative energy curve one by one; each leaves a falling range p. \
                   A store of energy E that takes every surplus and serves every deficit leaves unserved what the ranges exceed it by."
                .to_owned(),
            formula: "unserved(E) = η_d Σ max(0, p − E) + what lies above the power + what the record does not yield".to_owned(),
            source: "Derived for this program and checked against linear programmes; the two-sided reflection problem, Ghomrasni and \
                     Łochowski, arXiv:1311.6405"
                .to_owned(),
            limits: "Constant efficiencies and powers; with self-discharge each point is a run of its own. It does not know another year."
                .to_owned(),
        }
    };
    vec![
        coverage,
        Method {
            summary: "the asked store, interval by interval".to_owned(),
            text: "The store of the asked power and energy takes every surplus that fits and serves every deficit that it can. Its start is the \
                   level at which the repeated record settles. Shown is the week that leaves most unserved, or in which it stands lowest."
                .to_owned(),
            formula: "x(t+1) = x(t) + η_c c Δt − d Δt / η_d, between 0 and E".to_owned(),
            source: "Greedy dispatch leaves least unserved when every kWh counts the same".to_owned(),
            limits: "No prices, no forecast, no wear; the store\u{2019}s limits do not depend on its level.".to_owned(),
        },
        Method {
            summary: "sequent peak".to_owned(),
            text: "With w the energy that an interval adds to or takes from the store, and K the shortfall below full, the capacity is the largest \
                   shortfall, with the record taken twice. The critical period is where it builds up."
                .to_owned(),
            formula: "K(t) = max(0, K(t−1) − w(t))    capacity = max K".to_owned(),
            source: "Thomas and Burden 1963 (from memory); mass curve, Rippl 1883 (from memory)".to_owned(),
            limits: "Exact for intervals of constant power, with no limit of power: a limit on charging asks for more energy. It does not \
                     know another year."
                .to_owned(),
        },
    ]
}

fn notes(done: &Assessment) -> Vec<String> {
    let mut notes = Vec::new();
    if let Some(asked) = &done.requirement.asked {
        notes.push(format!("{}.", capital(&asked.why)));
    }
    if done.requirement.working.assumed {
        notes.push(format!(
            "No losses were entered: {} each way is assumed for the asked point and the pictures. The capacities under \u{201c}All figures\u{201d} \
             are lossless bounds.",
            people::percent(done.requirement.working.losses.discharge)
        ));
    }
    notes
}
