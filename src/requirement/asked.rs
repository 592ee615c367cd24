//! The asked point: the power and energy that the sheet is about.

use super::capacity::{Inflow, least_of};
use super::coverage::Curve;
use super::{Losses, Ranges, forced_powers};
use crate::case::{Balance, Case, Connection, FixedStore, RequirementCase, Start};
use crate::duty::{Duty, Kind};
use crate::numeric::sort_falling;
use crate::result::{AskedPoint, SimulationResult};
use crate::simulation;

/// Efficiency each way that stands in for one that nobody entered, so that no headline is a lossless bound. Between the fixed parts of
/// common converters and batteries; an assumption, shown as one.
const ASSUMED_EFFICIENCY: f64 = 0.95;

/// Share of the deficit at an islanded site that is asked for unless the person says otherwise.
const USUAL_SHARE: f64 = 0.9;

/// Share of the deficit energy that may lie above the power chosen for a connected site.
const ABOVE_POWER: f64 = 0.01;

/// The losses used for the asked point and the pictures.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Working {
    /// The losses.
    pub losses: Losses,
    /// Whether the efficiencies are assumed, since the case states none.
    pub assumed: bool,
}

impl Working {
    /// The case's losses, or the assumed ones where it states a lossless store.
    pub fn of(terms: &RequirementCase) -> Self {
        let stated = Losses::of(terms);
        let assumed = stated.charge == 1.0 && stated.discharge == 1.0;
        let losses = if assumed {
            Losses { charge: ASSUMED_EFFICIENCY, discharge: ASSUMED_EFFICIENCY, ..stated }
        } else {
            stated
        };
        Self { losses, assumed }
    }
}

/// The asked point and the store that stands for it.
#[derive(Debug, Clone)]
pub struct Asked {
    /// Power and the three capacities.
    pub point: AskedPoint,
    /// Why this power and share, in words.
    pub why: String,
    /// A store of exactly that size.
    pub store: FixedStore,
    /// Its run on the duty.
    pub run: SimulationResult,
}

/// The asked point of a duty; none where no store reaches it, or nothing is asked.
pub(super) fn point(duty: &Duty, case: &Case, working: &Working) -> Option<Asked> {
    let losses = &working.losses;
    let (power_kw, share, usable_kwh, why) = match duty.kind {
        Kind::Limits(_) => limits(duty, case, losses)?,
        Kind::Balance | Kind::Given => balance(duty, case, losses)?,
    };
    if power_kw <= 0.0 || usable_kwh <= 0.0 {
        return None;
    }
    let terms = &case.requirement;
    let store = FixedStore {
        name: "asked".to_owned(),
        charge_kw: Some(power_kw),
        discharge_kw: Some(power_kw),
        energy_kwh: usable_kwh,
        charge_efficiency: losses.charge,
        discharge_efficiency: losses.discharge,
        self_discharge_per_h: losses.self_discharge_per_h,
        standing_kw: losses.standing_kw,
        start: if terms.balance == Balance::Cyclic { Start::Cyclic } else { Start::Full },
        ..FixedStore::default()
    };
    let run = simulation::run(duty, &store, |_| {});
    let point = AskedPoint {
        served_share: share,
        power_kw,
        delivered_kwh: usable_kwh * losses.discharge,
        usable_kwh,
        nameplate_kwh: usable_kwh / (terms.depth * terms.end_of_life) * (1.0 + terms.margin),
    };
    Some(Asked { point, why, store, run })
}

/// The limits are held; the power is what they force, and the energy what it takes with that power both ways.
fn limits(duty: &Duty, case: &Case, losses: &Losses) -> Option<(f64, f64, f64, String)> {
    let (charge, discharge) = forced_powers(duty, losses.standing_kw);
    let forced = charge.max(discharge);
    let power = case.requirement.served_power_kw.unwrap_or(forced).max(forced);
    let step_h = duty.record.step_h();
    let usable =
        least_of(duty.intervals(), losses.leak(step_h), case.requirement.balance == Balance::Cyclic, |i| {
            let tube = duty.tube(i, losses.standing_kw).map(|tube| tube.rated(Some(power), Some(power)));
            Inflow::of(tube, losses, step_h)
        })?;
    Some((power, 1.0, usable, "holds the limits".to_owned()))
}

fn balance(duty: &Duty, case: &Case, losses: &Losses) -> Option<(f64, f64, f64, String)> {
    let terms = &case.requirement;
    let deficit = duty.result.deficit_kwh;
    if deficit <= 0.0 {
        return None;
    }
    let connected = duty.connection == Connection::Connected;
    let power = terms.served_power_kw.unwrap_or_else(|| {
        if connected { power_above(duty, losses) } else { greatest_deficit(duty, losses) }
    });
    let curve = Curve::of(duty, losses, Some(power));
    if let Some(share) = terms.served_share {
        let usable = curve.capacity_kwh(1.0 - share)?;
        return Some((power, share, usable, "the share asked for".to_owned()));
    }
    if !connected && let Some(usable) = curve.capacity_kwh(1.0 - USUAL_SHARE) {
        return Some((power, USUAL_SHARE, usable, "nine tenths of the deficit, to be changed".to_owned()));
    }
    let usable = knee(curve.ranges());
    let share = 1.0 - curve.unserved_kwh(usable) / curve.deficit_kwh();
    Some((
        power,
        share,
        usable,
        "the knee: beyond it a further kWh is used less often than on average".to_owned(),
    ))
}

fn greatest_deficit(duty: &Duty, losses: &Losses) -> f64 {
    (0..duty.intervals())
        .filter_map(|i| duty.net_kw(i))
        .fold(0.0, |most: f64, net| most.max(losses.standing_kw - net))
}

/// The power above which a hundredth of the deficit energy lies, kW.
fn power_above(duty: &Duty, losses: &Losses) -> f64 {
    let mut deficits: Vec<f64> = (0..duty.intervals())
        .filter_map(|i| duty.net_kw(i))
        .map(|net| losses.standing_kw - net)
        .filter(|deficit| *deficit > 0.0)
        .collect();
    sort_falling(&mut deficits);
    let allowed = ABOVE_POWER * deficits.iter().sum::<f64>();
    // The energy above level p falls linearly between two neighbouring powers.
    let mut sum = 0.0;
    for (k, power) in deficits.iter().enumerate() {
        sum += power;
        let below = deficits.get(k + 1).copied().unwrap_or(0.0);
        let count = (k + 1) as f64;
        if sum - count * below >= allowed {
            return (sum - allowed) / count;
        }
    }
    0.0
}

/// The knee of the curve of unserved energy against capacity: the corner farthest below the chord from nothing to the last gain.
/// There the next kWh of capacity begins to serve less than the average over the whole curve.
pub(crate) fn knee(ranges: &Ranges) -> f64 {
    let greatest = ranges.greatest_kwh();
    let (first, last) = (ranges.unserved_kwh(0.0), ranges.unserved_kwh(greatest));
    let below =
        |capacity: f64| first + (last - first) * (capacity / greatest) - ranges.unserved_kwh(capacity);
    if greatest <= 0.0 {
        return 0.0;
    }
    let mut best = (0.0, 0.0);
    for corner in ranges.corners(usize::MAX) {
        let gain = below(corner);
        if gain > best.1 {
            best = (corner, gain);
        }
    }
    best.0
}
