//! Duty to [`Requirement`]: the criteria that a store must meet, each with how it was derived and how sure it is.
//!
//! [`derive`] is the stage's door.

pub mod capacity;
pub mod cycles;

mod asked;
mod bands;
pub(crate) mod coverage;
mod criteria;
mod infeasible;
mod ranges;

pub use crate::losses::Losses;
pub(crate) use asked::knee;
pub use asked::{Asked, Working};
pub use ranges::Ranges;

use crate::case::{Balance, Case, DutyCase};
use crate::duty::Duty;
use crate::result::{CoverageRow, Infeasible, RequirementResult};

/// What a store must meet.
#[derive(Debug, Clone)]
pub struct Requirement {
    /// The result object's part.
    pub result: RequirementResult,
    /// Why no store can carry the duty, if so.
    pub infeasible: Option<Infeasible>,
    /// The losses with which the asked point and the pictures are computed.
    pub working: Working,
    /// The asked point; none where no store reaches it.
    pub asked: Option<Asked>,
}

/// Turns a duty into a requirement by the terms of the case.
pub fn derive(duty: &Duty, case: &Case) -> Requirement {
    let terms = &case.requirement;
    let losses = Losses::of(terms);
    let cyclic = terms.balance == Balance::Cyclic;
    let full = capacity::balance(duty, &losses, false);
    let repeated = capacity::balance(duty, &losses, true);
    let (least, charge, discharge) = match duty.terms() {
        _ if duty.kind.balances() => {
            let (charge, discharge) = peaks(duty, losses.standing_kw);
            (if cyclic { repeated } else { full }, charge, discharge)
        }
        // What is shifted is the person's choice: the terms are the answer.
        DutyCase::Shifting(terms) => {
            (duty.infeasible.is_none().then_some(terms.energy_kwh), terms.charge_kw, terms.discharge_kw)
        }
        _ => {
            let (charge, discharge) = forced_powers(duty, losses.standing_kw);
            (capacity::least(duty, &losses, None), charge, discharge)
        }
    };
    let infeasible = least.is_none().then(|| infeasible::why(duty, &losses));
    let net = |value: Option<f64>| value.filter(|_| duty.has_net());
    let working = Working::of(terms);
    let asked = asked::point(duty, case, &working);
    let result = RequirementResult {
        capacity_no_deficit_full_kwh: net(full),
        capacity_no_deficit_cyclic_kwh: net(repeated),
        capacity_no_curtailment_empty_kwh: net(Some(capacity::no_curtailment(duty, &losses))),
        capacity_range_kwh: net(Some(capacity::range(duty, &losses))),
        least_round_trip_efficiency: (duty.result.surplus() > 0.0)
            .then(|| duty.result.deficit() / duty.result.surplus()),
        least_capacity_kwh: least,
        least_charge_kw: least.map(|_| charge),
        least_discharge_kw: least.map(|_| discharge),
        asked: asked.as_ref().map(|asked| asked.point),
        criteria: criteria::list(duty, case, &working, asked.as_ref()),
        coverage: if duty.has_net() { coverage(duty, case, &losses) } else { Vec::new() },
        bands: if duty.has_net() { bands::split(duty, &terms.band_edges_s) } else { Vec::new() },
    };
    Requirement { result, infeasible, working, asked }
}

/// Greatest surplus and deficit of net power less the standing load, kW.
fn peaks(duty: &Duty, standing_kw: f64) -> (f64, f64) {
    (0..duty.intervals()).filter_map(|i| duty.net_kw(i)).fold(
        (0.0, 0.0),
        |(charge, discharge): (f64, f64), net| {
            (charge.max(net - standing_kw), discharge.max(standing_kw - net))
        },
    )
}

/// Charge and discharge power that the tube forces, each on its own, kW.
fn forced_powers(duty: &Duty, standing_kw: f64) -> (f64, f64) {
    (0..duty.intervals())
        .filter_map(|i| duty.tube(i, standing_kw))
        .fold((0.0, 0.0), |(charge, discharge): (f64, f64), tube| {
            (charge.max(-tube.hi), discharge.max(tube.lo))
        })
}

/// The coverage table: for each power (no limit first) and unserved share, the least capacity.
fn coverage(duty: &Duty, case: &Case, losses: &Losses) -> Vec<CoverageRow> {
    let terms = &case.requirement;
    std::iter::once(None)
        .chain(terms.powers_kw.iter().copied().map(Some))
        .flat_map(|power_kw| {
            let curve = coverage::Curve::of(duty, losses, power_kw);
            terms
                .unserved_shares
                .iter()
                .map(|share| CoverageRow {
                    power_kw,
                    unserved_share: *share,
                    capacity_kwh: curve.capacity_kwh(*share),
                })
                .collect::<Vec<_>>()
        })
        .collect()
}
