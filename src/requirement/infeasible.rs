//! Why no store can carry a duty, where that shows, and what would be possible.

use super::capacity::{self, Inflow, least_of};
use crate::duty::{Duty, Kind, Limits, Tube};
use crate::losses::Losses;
use crate::result::Infeasible;
use crate::units::people::{energy, percent, power};

/// Where the record repeated shows it.
const REPEATED: &str = "the whole record, repeated";

/// Halvings of a bracket of limits: to a thousandth of a thousandth of it, for a sentence.
const HALVINGS: usize = 30;

/// Why no store can carry the duty.
pub(super) fn why(duty: &Duty, losses: &Losses) -> Infeasible {
    if let Some(known) = &duty.infeasible {
        return known.clone();
    }
    let repeated = |why: String| Infeasible { why, at: REPEATED.to_owned() };
    if let Some(i) = capacity::empty_at(duty, losses) {
        return Infeasible {
            why: "No power of a store holds the limits in this interval: they contradict each other, or the reactive power alone exceeds \
                  the limit of apparent power. Raise one of them."
                .to_owned(),
            at: duty.record.clock.stamp(i),
        };
    }
    match duty.kind {
        Kind::Limits(limits) => repeated(of_limits(duty, losses, &limits)),
        Kind::Balance | Kind::Given => repeated(of_balance(duty, losses)),
        _ => repeated(
            "Over the record the output asked takes more from the store than it brings back, so that its level cannot be held when the record is \
             repeated. Ask for a lower output, or let the level at the end be free."
                .to_owned(),
        ),
    }
}

fn of_limits(duty: &Duty, losses: &Losses, limits: &Limits) -> String {
    let mean = mean_import_kw(duty, losses);
    if !limits.recharge {
        return "The store must give more than the surplus brings back over the record: allow recharging from the grid, or raise the \
                import limit."
            .to_owned();
    }
    match limits.import_kw {
        Some(limit) if !duty.timed_limits() => {
            let possible = least_possible_kw(duty, losses, limits).map_or(String::new(), |possible| {
                format!(" With these losses the record allows {} or more.", power(possible))
            });
            if limit <= mean {
                format!(
                    "The import limit of {} lies below the mean import of {}: what is shaved off could never be brought back.{possible}",
                    power(limit),
                    power(mean)
                )
            } else {
                format!(
                    "Below the import limit of {} too little is left to bring back, with losses, what is shaved off above it.{possible}",
                    power(limit)
                )
            }
        }
        Some(_) => format!(
            "The limits leave too little room to bring back what is shaved off: the mean import is {}. Raise one of them.",
            power(mean)
        ),
        None => {
            "The store must take more than it may give back over the record: allow discharging to the grid, or raise the export limit."
                .to_owned()
        }
    }
}

fn mean_import_kw(duty: &Duty, losses: &Losses) -> f64 {
    let (mut sum, mut count) = (crate::numeric::Sum::default(), 0_usize);
    for net in (0..duty.intervals()).filter_map(|i| duty.net_kw(i)) {
        sum.add(losses.standing_kw - net);
        count += 1;
    }
    sum.value() / count.max(1) as f64
}

/// The least import limit that some store can hold with the other terms.
fn least_possible_kw(duty: &Duty, losses: &Losses, limits: &Limits) -> Option<f64> {
    let step_h = duty.record.step_h();
    let holds = |import_kw: f64| {
        let limits = Limits { import_kw: Some(import_kw), ..*limits };
        least_of(duty.intervals(), losses.leak(step_h), duty.is_cyclic(), |i| {
            let tube = duty.net_kw(i).map(|net| Tube::limits(net - losses.standing_kw, &limits));
            Inflow::of(tube, losses, step_h)
        })
        .is_some()
    };
    let (mut fails, mut carries) = (0.0, duty.result.peak_deficit() + losses.standing_kw);
    if !holds(carries) {
        return None;
    }
    for _ in 0..HALVINGS {
        let middle = f64::midpoint(fails, carries);
        if holds(middle) {
            carries = middle;
        } else {
            fails = middle;
        }
    }
    Some(carries)
}

fn of_balance(duty: &Duty, losses: &Losses) -> String {
    let (surplus, deficit) = (duty.result.surplus(), duty.result.deficit());
    let yielded = surplus * losses.charge * losses.discharge;
    if surplus == 0.0 {
        "There is no surplus from which a store could be charged.".to_owned()
    } else if yielded < deficit {
        format!(
            "The surplus of {} yields {} after losses, {} of the deficit of {}: no store can serve the rest.",
            energy(surplus),
            energy(yielded),
            percent(yielded / deficit),
            energy(deficit)
        )
    } else {
        "Self-discharge and standing load leave too little of the surplus to serve the deficit.".to_owned()
    }
}
