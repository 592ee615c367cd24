//! The coverage picture: what each delivered energy covers, for three powers.

use super::measure;
use crate::case::FixedStore;
use crate::chart::{Coverage, CoverageCurve, CoverageMark, Measure};
use crate::duty::{Duty, Kind, Limits, Tube};
use crate::requirement::capacity::{Inflow, least_of};
use crate::requirement::coverage::Curve;
use crate::requirement::{Requirement, knee};
use crate::simulation;

/// Import limits tried for each power.
const LIMITS: usize = 24;

/// Corners kept of an exact curve, and energies run where there is self-discharge.
const CORNERS: usize = 160;
const RUNS: usize = 40;

/// Smaller stores run for a duty that fixes the power.
const SMALLER: usize = 12;

/// The picture for a requirement.
pub(in crate::sheet) fn coverage(duty: &Duty, requirement: &Requirement) -> Coverage {
    match duty.kind {
        Kind::Limits(limits) => held_limits(duty, &limits, requirement),
        Kind::Balance | Kind::Given => served(duty, requirement),
        _ => carried(requirement),
    }
}

/// For duties that say themselves what a store must do: the share of the discharge asked that a store of less energy carries.
fn carried(requirement: &Requirement) -> Coverage {
    let mut picture = Coverage { measure: Measure::CarriedShare, ..Coverage::default() };
    let Some(asked) = &requirement.asked else { return picture };
    let share = |energy_kwh: f64| {
        let store = FixedStore { energy_kwh, ..asked.store.clone() };
        // A smaller store begins as full, in proportion.
        let start = asked.start_kwh * (energy_kwh / asked.store.energy_kwh);
        let run = simulation::run_from(&asked.duty, &store, start, |_| {});
        let whole = run.served_kwh + run.unserved_kwh;
        if whole > 0.0 { run.served_kwh / whole } else { 1.0 }
    };
    let mut curve = CoverageCurve { power_kw: Some(asked.point.power_kw), ..CoverageCurve::default() };
    for k in 0..=SMALLER {
        let part = k as f64 / SMALLER as f64;
        // Denser near nothing, where the curve bends.
        curve.energy_kwh.push(asked.point.delivered_kwh * part * part);
        curve.value.push(share(asked.store.energy_kwh * part * part));
    }
    picture.marks.push(CoverageMark {
        name: "asked".to_owned(),
        energy_kwh: asked.point.delivered_kwh,
        value: curve.value.last().copied().unwrap_or_default(),
    });
    picture.curves.push(curve);
    picture
}

fn served(duty: &Duty, requirement: &Requirement) -> Coverage {
    let losses = &requirement.working.losses;
    let measure = measure(duty);
    let peak = duty.result.peak_deficit() + losses.standing_kw;
    let chosen = requirement.asked.as_ref().map_or(peak, |asked| asked.point.power_kw);
    if chosen <= 0.0 {
        return Coverage { measure, ..Coverage::default() };
    }
    let deficit = duty.result.deficit();
    let demand = duty.totals.demand_kwh.unwrap_or(deficit);
    let value = |unserved: f64| match measure {
        Measure::SelfSufficiency => 1.0 - unserved / demand,
        _ => 1.0 - unserved / deficit,
    };
    let curves: Vec<(f64, Curve<'_>)> = [1.0, 0.5, 0.25]
        .iter()
        .map(|share| (share * chosen, Curve::of(duty, losses, Some(share * chosen))))
        .collect();
    let main = &curves[0].1;
    let knee = knee(main.ranges());
    let asked = requirement.asked.as_ref();
    let whole = requirement.result_no_deficit(duty);
    // The long, flat right arm of a year's curve would squeeze the part that matters against the axis.
    let greatest = main.ranges().greatest_kwh();
    let reach = whole
        .map_or_else(|| greatest.min(5.0 * knee), |whole| whole.min(greatest.max(whole)))
        .max(asked.map_or(0.0, |asked| asked.point.usable_kwh))
        * 1.12;
    let mut picture = Coverage { measure, ..Coverage::default() };
    for (power_kw, curve) in &curves {
        let mut capacities: Vec<f64> = match curve {
            Curve::Exact(ranges) => {
                ranges.corners(CORNERS).into_iter().filter(|capacity| *capacity < reach).collect()
            }
            // Denser near nothing, where the curve bends.
            Curve::Leaking(_) => {
                (0..RUNS).map(|k| reach * (k as f64 / RUNS as f64) * (k as f64 / RUNS as f64)).collect()
            }
        };
        capacities.push(reach);
        picture.curves.push(CoverageCurve {
            power_kw: Some(*power_kw),
            energy_kwh: capacities.iter().map(|capacity| capacity * losses.discharge).collect(),
            value: capacities.iter().map(|capacity| value(curve.unserved_kwh(*capacity))).collect(),
        });
    }
    let mut mark = |name: &str, capacity: f64| {
        picture.marks.push(CoverageMark {
            name: name.to_owned(),
            energy_kwh: capacity * losses.discharge,
            value: value(main.unserved_kwh(capacity)),
        });
    };
    let at_knee = asked.is_some_and(|asked| (asked.point.usable_kwh - knee).abs() <= 1e-9 * knee);
    if knee > 0.0 && !at_knee {
        mark("knee", knee);
    }
    if let Some(asked) = asked {
        mark(if at_knee { "knee, asked" } else { "asked" }, asked.point.usable_kwh);
    }
    if let Some(whole) = whole
        && asked.is_none_or(|asked| (asked.point.usable_kwh - whole).abs() > 1e-6 * whole)
    {
        mark("no deficit", whole);
    }
    picture
}

impl Requirement {
    /// Capacity (kWh inside) that leaves no deficit with the asked power and the working losses; none if out of reach or at a
    /// connected site, where it is no aim.
    fn result_no_deficit(&self, duty: &Duty) -> Option<f64> {
        if duty.connection == crate::case::Connection::Connected {
            return None;
        }
        let power = self.asked.as_ref().map(|asked| asked.point.power_kw)?;
        Curve::of(duty, &self.working.losses, Some(power)).capacity_kwh(0.0)
    }
}

/// The import limit that can be held against delivered energy.
fn held_limits(duty: &Duty, limits: &Limits, requirement: &Requirement) -> Coverage {
    let losses = &requirement.working.losses;
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let cyclic = duty.is_cyclic();
    let mut picture = Coverage { measure: Measure::HeldImportKw, ..Coverage::default() };
    let loads: Vec<Option<f64>> =
        (0..duty.intervals()).map(|i| duty.net_kw(i).map(|net| losses.standing_kw - net)).collect();
    let peak = loads.iter().flatten().fold(0.0, |most: f64, load| most.max(*load));
    let asked = requirement.asked.as_ref();
    let Some(asked) = asked else { return picture };
    let chosen = asked.point.power_kw;
    for power in [chosen, 0.5 * chosen, (2.0 * chosen).min(peak)] {
        let least = (peak - power).max(0.0);
        let mut curve = CoverageCurve { power_kw: Some(power), ..CoverageCurve::default() };
        // From the greatest import (no store) downwards, denser near it.
        for k in 0..=LIMITS {
            let share = k as f64 / LIMITS as f64;
            let limit = peak - (peak - least) * share;
            let tubes = Limits { import_kw: Some(limit), ..*limits };
            let capacity = least_of(loads.len(), leak, cyclic, |i| {
                let limits = duty.limits_at(i, &tubes);
                let tube = loads[i].map(|load| Tube::limits(-load, &limits).rated(Some(power), Some(power)));
                Inflow::of(tube, losses, step_h)
            });
            let Some(capacity) = capacity else { break };
            curve.energy_kwh.push(capacity * losses.discharge);
            curve.value.push(limit);
        }
        picture.curves.push(curve);
    }
    // More energy than a power can use changes nothing: the limit stays where the power holds it.
    let reach = 1.1
        * picture
            .curves
            .iter()
            .filter_map(|curve| curve.energy_kwh.last())
            .fold(0.0, |most: f64, energy| most.max(*energy));
    for curve in &mut picture.curves {
        if let Some(held) = curve.value.last().copied() {
            curve.energy_kwh.push(reach);
            curve.value.push(held);
        }
    }
    // The same power twice says nothing.
    if picture.curves.len() == 3 && picture.curves[2].power_kw == picture.curves[0].power_kw {
        picture.curves.pop();
    }
    if let Some(limit) = limits.import_kw {
        picture.marks.push(CoverageMark {
            name: "asked".to_owned(),
            energy_kwh: asked.point.delivered_kwh,
            value: limit,
        });
    }
    picture
}
