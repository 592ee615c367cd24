//! Judges of size: power, energy and duration on the circuit's curve, mass and volume by the box.

use super::catalogue::{MassBasis, Quantity, Technology};
use super::curve::Meeting;
use super::family::{Design, Per};
use super::judge::Bench;
use super::need::{Criterion, Judged, Need, Pair};
use crate::units::people::{duration, energy, mass, percent, power, significant, volume};

/// How many times longer than their rated duration cells, electrolytes, vessels and other stores with a converter of
/// their own may be run. Slow use only leaves part of the power unused; past this the power bought is mostly idle and
/// another kind is the sensible one. Our judgement, no source.
const STRETCH: f64 = 15.0;

/// Least share of the rated energy that must still reach the terminals over the duration.
const LEAST_KEPT: f64 = 0.5;

/// Mass or volume that a kind would need, installed, kg or l: max(E / (e x depth), P / p) x packing, with typical
/// values and with the good (high) ones. None where the published figure is not a plant's, or nothing is asked.
///
/// Rated energy is delivered energy, so E is what the connection point gets.
pub(super) fn needed(technology: &Technology, need: &Need, per: Per) -> Option<Pair> {
    let packing = technology.siting.packing?;
    need.duration_s()?;
    let (energy, power) = per.quantities();
    let (e, p) = (technology.range(energy), technology.range(power));
    let depth = technology.range(Quantity::DepthOfDischarge);
    let (energy_wh, power_w) = (need.energy_kwh() * 1000.0, need.power_kw() * 1000.0);
    let size = |e: f64, p: f64, depth: f64| (energy_wh / (e * depth / 100.0)).max(power_w / p) * packing;
    Some(Pair { typical: size(e.typical, p.typical, depth.typical), good: size(e.high, p.high, depth.high) })
}

/// The judges of size, in order.
pub(super) fn judge(bench: &Bench) -> Vec<Judged> {
    let mut judged = Vec::new();
    judged.extend(discharge_power(bench));
    judged.extend(charge_power(bench));
    judged.push(energy_kept(bench));
    judged.push(duration_held(bench));
    judged
}

/// Judges of the budgets.
pub(super) fn judge_budgets(bench: &Bench) -> Vec<Judged> {
    [Per::Mass, Per::Volume].into_iter().filter_map(|per| budget_held(bench, per)).collect()
}

/// Rated kWh that the tightest budget holds, divided by Wh per kg or l: the packed kg or l of the kind itself.
fn budgets(bench: &Bench) -> Vec<(Per, f64)> {
    let Some(packing) = bench.technology.siting.packing else { return Vec::new() };
    [(Per::Mass, bench.need.mass_budget_kg), (Per::Volume, bench.need.volume_budget_l)]
        .into_iter()
        .filter_map(|(per, budget)| Some((per, budget.filter(|budget| *budget > 0.0)? / packing)))
        .collect()
}

/// Greatest offer (Wh or W) per kg or l over the designs of a kind, and that of the typical design.
fn offer(bench: &Bench, per: Per, of: impl Fn(&Design, f64) -> f64) -> Pair {
    let depth = bench.depth();
    let typical = of(&Design::at(bench.technology, per, 0.0), depth.typical);
    let leak = bench.good_leak_h();
    let good = Design::all(bench.technology, per)
        .into_iter()
        .map(|design| of(&Design { circuit: design.circuit.with_leak(leak), ..design }, depth.good))
        .fold(typical, f64::max);
    Pair { typical, good }
}

fn discharge_power(bench: &Bench) -> Option<Judged> {
    let asked = bench.need.discharge_kw;
    if !(asked > 0.0 && asked.is_finite()) {
        return None;
    }
    let quantity = Criterion::DischargePower;
    let mut worst: Option<(Pair, Pair)> = None;
    for (per, room) in budgets(bench) {
        let peak = offer(bench, per, |design, _| design.energy_wh * design.circuit.peak_kw());
        let offered = Pair { typical: peak.typical * room / 1000.0, good: peak.good * room / 1000.0 };
        let load = Pair { typical: asked / offered.typical, good: asked / offered.good };
        if worst.is_none_or(|(_, worst)| load.good > worst.good) {
            worst = Some((offered, load));
        }
    }
    let (_, p) = Per::Mass.quantities();
    let judged = if let Some((offered, load)) = worst {
        Judged::weigh(quantity, load.typical, load.good, bench.need.margin())
            .because(format!(
                "At most {} from what the budget holds, {} at best; {} asked",
                power(offered.typical),
                power(offered.good),
                power(asked)
            ))
            .turned_by(format!("A budget {} times as large would do at best", significant(load.good, 2)))
    } else {
        let rated = asked / bench.running_kw();
        Judged::weigh(quantity, 0.0, 0.0, 0.0).because(format!(
            "{} from {} rated; no budget limits it",
            power(asked),
            energy(rated)
        ))
    };
    Some(judged.confirmed(bench.technology.range(p).verified))
}

fn charge_power(bench: &Bench) -> Option<Judged> {
    let asked = bench.need.charge_kw;
    if !(asked > 0.0 && asked.is_finite()) {
        return None;
    }
    // The size that the discharge sets, and what it takes at its reference power and at its peak.
    let rated_kwh = bench.power_kw / bench.running_kw();
    let takes = |kw: f64| (rated_kwh * kw).max(bench.power_kw);
    let (typical, good) = (takes(bench.typical.ref_power_kw()), takes(bench.typical.peak_kw()));
    let separate = bench.technology.circuit.model == super::Model::Fixed;
    let judged = if separate {
        // Pump, compressor or electrolyser: a machine of its own, bought for the charge power.
        Judged::weigh(Criterion::ChargePower, 0.0, 0.0, 0.0)
            .because(format!("Its charging machine is bought for the {} asked", power(asked)))
    } else {
        // A larger store always takes more, so that charging alone never rules a kind out; its mass may.
        Judged::weigh(Criterion::ChargePower, asked / typical, (asked / good).min(1.0), 0.0).because(format!(
            "The size that discharging sets takes {}, {} at best; {} asked",
            power(typical),
            power(good),
            power(asked)
        ))
    };
    let (_, p) = Per::Mass.quantities();
    Some(
        judged
            .turned_by(format!(
                "A store {} times as large takes it at its usual rate",
                significant(asked / typical, 2)
            ))
            .confirmed(!separate && bench.technology.range(p).verified),
    )
}

/// Energy at the duration: at least half of the rated energy must reach the terminals despite the leak, and what the
/// budget holds must deliver what is asked.
fn energy_kept(bench: &Bench) -> Judged {
    let quantity = Criterion::Energy;
    let verified = bench.technology.range(Quantity::SelfDischarge).verified;
    let depth = bench.depth();
    let good_circuit = bench.typical.with_leak(bench.good_leak_h());
    let kept = |circuit: &super::Circuit, depth: f64| {
        circuit.meets(bench.hours, depth).power_kw().map_or(0.0, |kw| circuit.delivered_kwh(kw))
    };
    let typical = kept(&bench.typical, depth.typical);
    let good = kept(&good_circuit, depth.good).max(typical);
    if let (Meeting::RunsDown(lasts), true) = (bench.meeting(), good < LEAST_KEPT) {
        return Judged::weigh(quantity, bench.hours / lasts, bench.hours / lasts, 0.0)
            .because(format!(
                "Runs down by itself in about {}; the duty lasts {}",
                duration(lasts * 3600.0),
                duration(bench.hours * 3600.0)
            ))
            .turned_by("A shorter duty would turn it")
            .confirmed(verified);
    }
    // At peak power from full little energy is left; a power-bound store is simply larger, so only slow losses count.
    let slow = bench.hours * 3600.0 > bench.technology.circuit.ref_duration_s;
    let mut judged = if slow {
        Judged::weigh(quantity, LEAST_KEPT / typical, LEAST_KEPT / good, 0.0)
    } else {
        Judged::weigh(quantity, 0.0, 0.0, 0.0)
    };
    judged = judged
        .because(if slow {
            format!(
                "{} of the rated energy reaches the terminals over {}",
                percent(typical),
                hours_text(bench)
            )
        } else {
            format!(
                "{} over {}; its circuit gives that or longer",
                energy(bench.energy_kwh),
                hours_text(bench)
            )
        })
        .turned_by("A shorter duty would turn it")
        .confirmed(verified);
    for (per, room) in budgets(bench) {
        let offered = offer(bench, per, |design, depth| {
            design
                .circuit
                .meets(bench.hours, depth)
                .power_kw()
                .map_or(0.0, |kw| kw * bench.hours * design.energy_wh)
        });
        let delivered = Pair { typical: offered.typical * room / 1000.0, good: offered.good * room / 1000.0 };
        let load =
            Pair { typical: bench.energy_kwh / delivered.typical, good: bench.energy_kwh / delivered.good };
        let other = Judged::weigh(quantity, load.typical, load.good, bench.need.margin());
        if other.verdict >= judged.verdict {
            judged = other
                .because(format!(
                    "The budget holds {} over {}, {} at best; {} asked",
                    energy(delivered.typical),
                    hours_text(bench),
                    energy(delivered.good),
                    energy(bench.energy_kwh)
                ))
                .turned_by(format!("A budget {} times as large would do at best", significant(load.good, 2)));
        }
    }
    judged
}

/// Duration: carries up to the typical rated duration, strains up to the (logarithmic) middle between that and the
/// published high, since the high end belongs to designs that give up power; both times [`STRETCH`] for kinds whose
/// power part is bought apart from the energy. A longer rated duration than asked is no fault: the store is larger.
fn duration_held(bench: &Bench) -> Judged {
    let published = bench.technology.range(Quantity::DischargeDuration);
    let device = bench.technology.siting.mass_basis == MassBasis::Device;
    let stretch = if device { 1.0 } else { STRETCH };
    let seconds = bench.hours * 3600.0;
    let good = (published.typical * published.high).sqrt();
    let judged = Judged::weigh(
        Criterion::Duration,
        seconds / (stretch * published.typical),
        seconds / (stretch * good),
        0.0,
    );
    let reason = if seconds <= published.typical {
        format!("Built for {}; {} asked", duration(published.typical), duration(seconds))
    } else if device {
        format!(
            "Built for {}, {} at best; {} asked",
            duration(published.typical),
            duration(good),
            duration(seconds)
        )
    } else {
        format!(
            "Built for {}; {} asked, so {} of its power is used",
            duration(published.typical),
            duration(seconds),
            percent(published.typical / seconds)
        )
    };
    judged
        .because(reason)
        .turned_by(format!("A duty of at most {} would turn it", duration(stretch * good)))
        .confirmed(published.verified && seconds <= published.typical)
}

fn budget_held(bench: &Bench, per: Per) -> Option<Judged> {
    let (quantity, allowed) = match per {
        Per::Mass => (Criterion::Mass, bench.need.mass_budget_kg?),
        Per::Volume => (Criterion::Volume, bench.need.volume_budget_l?),
    };
    let needed = needed(bench.technology, bench.need, per)?;
    let text = |value: f64| match per {
        Per::Mass => mass(value).to_string(),
        Per::Volume => volume(value).to_string(),
    };
    Some(
        Judged::weigh(
            quantity,
            needed.typical / allowed.max(0.0),
            needed.good / allowed.max(0.0),
            bench.need.margin(),
        )
        .because(format!(
            "Needs {} at typical values, {} at best; {} allowed",
            text(needed.typical),
            text(needed.good),
            text(allowed)
        ))
        .turned_by(if needed.good <= allowed {
            format!("A budget of {} would turn it", text(needed.typical * (1.0 + bench.need.margin())))
        } else if allowed > 0.0 {
            format!("Needs {} times the budget even at best", significant(needed.good / allowed, 2))
        } else {
            format!("A budget of {} would do at best", text(needed.good))
        }),
        // Packing factors are judgement, so that no installed mass is ever confirmed.
    )
}

fn hours_text(bench: &Bench) -> String {
    duration(bench.hours * 3600.0).to_string()
}
