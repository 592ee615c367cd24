//! The Duty station in words.

use super::{count, deficit_word, figure, kinds, surplus_word};
use crate::assess::Assessment;
use crate::case::{Case, Connection};
use crate::chart::ticks;
use crate::duty::{Episode, Kind};
use crate::sheet::{Figure, Method, Station};
use crate::units::people::{self, capital};

pub(super) fn station(done: &Assessment, case: &Case) -> Station {
    let duty = &done.duty;
    let result = &duty.result;
    let (short, over) = (deficit_word(duty.connection), surplus_word(duty.connection));
    let mut first = Vec::new();
    let episodes = |number: usize| count(number, "episode", "episodes");
    if result.surplus() > 0.0 || (result.surplus_kwh.is_some() && duty.totals.supply_kwh.is_some()) {
        first.push(figure(
            "duty.surplus_kwh",
            result.surplus(),
            &capital(over),
            people::energy(result.surplus()),
            episodes(result.surplus_episodes),
        ));
    }
    if let Some(deficit) = result.deficit_kwh {
        first.push(figure(
            "duty.deficit_kwh",
            deficit,
            &capital(short),
            people::energy(deficit),
            episodes(result.deficit_episodes),
        ));
    }
    first.extend(kinds::figures(duty));
    Station {
        sentence: sentence(done),
        rail: match duty.kind {
            Kind::Limits(_) if duty.timed_limits() => "limits by the hour".to_owned(),
            Kind::Limits(limits) => limits
                .import_kw
                .map_or("export limit".to_owned(), |limit| format!("import at most {}", people::power(limit))),
            _ => kinds::rail(duty).unwrap_or_else(|| format!("{} {short}", people::energy(result.deficit()))),
        },
        warning: if !duty.kind.balances() && done.requirement.infeasible.is_some() {
            "no store can do it".to_owned()
        } else if done.requirement.infeasible.is_some() && duty.connection == Connection::Islanded {
            "no store can serve it all".to_owned()
        } else {
            String::new()
        },
        figures: vec![first, beside_the_picture(done)],
        method: std::iter::once(Method {
            summary: "supply minus demand, interval by interval".to_owned(),
            text: "Net power is supply minus demand, or the net column with its sign. Surplus is the sum of its positive part times the \
                   interval, deficit of its negative part. An episode is an unbroken run of one sign; an interval of zero or a gap ends it."
                .to_owned(),
            formula: "S = Σ max(n, 0) Δt    D = Σ max(−n, 0) Δt    S − D = Σ n Δt".to_owned(),
            source: "elementary".to_owned(),
            limits: "Surplus and deficit inside one interval cancel, so both are lower bounds.".to_owned(),
        })
        .chain(kinds::method(duty))
        .collect(),
        notes: notes(done, case),
    }
}

fn sentence(done: &Assessment) -> String {
    let duty = &done.duty;
    let result = &duty.result;
    let (short, over) = (deficit_word(duty.connection), surplus_word(duty.connection));
    if let Some(asked) = kinds::asked(duty) {
        return asked;
    }
    if let Kind::Limits(limits) = duty.kind {
        let peak = people::power(result.peak_deficit());
        if duty.timed_limits() {
            let beyond = beyond(done, |i, net| {
                duty.limits_at(i, &limits).import_kw.map_or(0.0, |limit| (-net - limit.max(0.0)).max(0.0))
            });
            return format!(
                "Imports reach {peak}. Holding them to the limits of each hour asks the store for {} in all, in {}.",
                people::energy(beyond.0),
                count(beyond.1, "stretch", "stretches")
            );
        }
        return match (limits.import_kw, limits.export_kw) {
            (Some(import), export) => {
                let beyond = beyond(done, |_, net| (-net - import).max(0.0));
                let also =
                    export.map_or(String::new(), |limit| format!(", exports to {}", people::power(limit)));
                format!(
                    "Imports reach {peak}. Holding them to {}{also} asks the store for {} in all, in {}.",
                    people::power(import),
                    people::energy(beyond.0),
                    count(beyond.1, "stretch", "stretches")
                )
            }
            (None, Some(export)) => {
                let beyond = beyond(done, |_, net| (net - export).max(0.0));
                format!(
                    "Exports reach {}. Holding them to {} asks the store to take {} in all.",
                    people::power(result.peak_surplus()),
                    people::power(export),
                    people::energy(beyond.0)
                )
            }
            (None, None) => format!("Imports reach {peak}; no limit is asked."),
        };
    }
    if result.deficit() == 0.0 {
        return format!("Supply never falls short; {} is left over.", people::energy(result.surplus()));
    }
    let hours = side(done, -1.0).map(|episode| episode.steps).sum::<usize>() as f64 * duty.record.step_h();
    let longest = side(done, -1.0).max_by_key(|episode| episode.steps);
    let longest = longest.map_or(String::new(), |episode| {
        format!(
            " The longest {} lasts {}, from {}.",
            if duty.connection == Connection::Islanded { "shortage" } else { "stretch of import" },
            people::duration(episode.steps as f64 * duty.record.clock.step_s()),
            moment(done, episode.start)
        )
    });
    match duty.connection {
        Connection::Islanded => format!(
            "Supply falls short for {} hours of the record and leaves {} to storage.{longest}",
            people::significant(hours, 4),
            people::energy(result.deficit())
        ),
        Connection::Connected if result.surplus() > 0.0 => format!(
            "The site draws {} from the grid, in {} hours, and feeds {} back: a store could carry some of the {over} into the {short}.{longest}",
            people::energy(result.deficit()),
            people::significant(hours, 4),
            people::energy(result.surplus())
        ),
        Connection::Connected => {
            format!(
                "The site draws {} from the grid and feeds nothing back.",
                people::energy(result.deficit())
            )
        }
    }
}

/// Energy beyond a limit, kWh, and the number of stretches in which it lies.
fn beyond(done: &Assessment, excess: impl Fn(usize, f64) -> f64) -> (f64, usize) {
    let duty = &done.duty;
    let (mut sum, mut stretches, mut inside) = (crate::numeric::Sum::default(), 0, false);
    for i in 0..duty.intervals() {
        let power = duty.net_kw(i).map_or(0.0, |net| excess(i, net));
        if power > 0.0 && !inside {
            stretches += 1;
        }
        inside = power > 0.0;
        sum.add(power);
    }
    (sum.value() * duty.record.step_h(), stretches)
}

fn side(done: &Assessment, sign: f64) -> impl Iterator<Item = &Episode> {
    done.duty.episodes.iter().filter(move |episode| episode.energy_kwh * sign > 0.0)
}

fn moment(done: &Assessment, i: usize) -> String {
    let clock = &done.duty.record.clock;
    ticks::moment(clock.at_us(i) as f64 + f64::from(clock.offset_s(i)) * 1e6)
}

fn beside_the_picture(done: &Assessment) -> Vec<Figure> {
    let duty = &done.duty;
    let result = &duty.result;
    let mut figures = Vec::new();
    if let Some(share) = result.self_sufficiency {
        figures.push(figure(
            "duty.self_sufficiency",
            share,
            "Used directly",
            people::percent(share),
            "of demand, without a store",
        ));
    }
    if let Some(share) = result.self_consumption {
        figures.push(figure(
            "duty.self_consumption",
            share,
            "Self-consumption",
            people::percent(share),
            "of supply, without a store",
        ));
    }
    let largest =
        |sign: f64| side(done, sign).max_by(|a, b| a.energy_kwh.abs().total_cmp(&b.energy_kwh.abs()));
    let from = |episode: Option<&Episode>| {
        episode.map_or(String::new(), |episode| {
            format!(
                "{} from {}",
                people::duration(episode.steps as f64 * duty.record.clock.step_s()),
                moment(done, episode.start)
            )
        })
    };
    for (path, value, sign, word) in [
        ("duty.largest_deficit_kwh", result.largest_deficit_kwh, -1.0, deficit_word(duty.connection)),
        ("duty.largest_surplus_kwh", result.largest_surplus_kwh, 1.0, surplus_word(duty.connection)),
    ] {
        if let Some(value) = value {
            figures.push(figure(
                path,
                value,
                &format!("Largest {word}"),
                people::energy(value),
                from(largest(sign)),
            ));
        }
    }
    if let Some(peak) = result.peak_discharge_kw {
        figures.push(figure(
            "duty.peak_discharge_kw",
            peak,
            &format!("Greatest {}", deficit_word(duty.connection)),
            people::power(peak),
            "mean of an interval, a lower bound",
        ));
    }
    figures
}

fn notes(done: &Assessment, case: &Case) -> Vec<String> {
    let duty = &done.duty;
    let mut notes = Vec::new();
    if duty.connection_guessed && duty.has_net() {
        let result = &duty.result;
        let round_trip = case.requirement.charge_efficiency * case.requirement.discharge_efficiency;
        notes.push(match duty.connection {
            Connection::Islanded => format!(
                "Guessed islanded: the surplus after losses covers the deficit {} times.",
                people::significant(round_trip * result.surplus() / result.deficit(), 2)
            ),
            Connection::Connected if result.surplus() == 0.0 => {
                "Guessed connected: there is no surplus, so a grid must serve the site.".to_owned()
            }
            Connection::Connected if result.deficit() == 0.0 => {
                "Guessed connected: nothing is ever short.".to_owned()
            }
            Connection::Connected => format!(
                "Guessed connected: the surplus after losses covers {} of the deficit, so a grid must serve the rest.",
                people::percent(round_trip * result.surplus() / result.deficit())
            ),
        });
    }
    if let Some(infeasible) = &done.requirement.infeasible
        && (duty.connection == Connection::Islanded || !duty.kind.balances())
    {
        notes.push(infeasible.why.clone());
    }
    notes
}
