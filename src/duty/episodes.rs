//! Integrals of net power, and its episodes: maximal runs of surplus, or of deficit.

use super::Duty;
use crate::case::Connection;
use crate::numeric::Sum;
use crate::result::{DutyResult, RecordResult};

/// A maximal run of one strict sign of net power. A zero or a gap ends a run and starts none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Episode {
    /// First interval.
    pub start: usize,
    /// Number of intervals.
    pub steps: usize,
    /// Energy, kWh; negative for a deficit.
    pub energy_kwh: f64,
    /// Greatest power in the run, kW; negative for a deficit.
    pub peak_kw: f64,
}

/// A result with no energy in it, to be filled.
pub(super) fn nothing() -> DutyResult {
    DutyResult {
        kind: String::new(),
        connection: Connection::Connected,
        surplus_kwh: None,
        deficit_kwh: None,
        direct_use_kwh: None,
        self_consumption: None,
        self_sufficiency: None,
        surplus_episodes: 0,
        deficit_episodes: 0,
        largest_surplus_kwh: None,
        largest_deficit_kwh: None,
        longest_deficit_s: None,
        peak_charge_kw: None,
        peak_discharge_kw: None,
        steepest_ramp_kw_per_s: None,
        infeasible: None,
        import_limit_kw: None,
        export_limit_kw: None,
        net_discharge_kwh: None,
        output_kw: None,
        worst_start: None,
        reserve_p95_kwh: None,
        delivered_kwh: None,
        absorbed_kwh: None,
        value: None,
    }
}

/// Totals of nothing, to be filled.
pub(super) fn no_totals() -> RecordResult {
    RecordResult {
        intervals: 0,
        step_s: 0.0,
        start: String::new(),
        end: String::new(),
        missing_intervals: 0,
        supply_kwh: None,
        demand_kwh: None,
        filled_share: 0.0,
        findings: Vec::new(),
    }
}

/// One pass over net power: episodes, and everything that is summed.
pub(super) fn integrate(duty: &Duty) -> (Vec<Episode>, DutyResult) {
    let record = &duty.record;
    let step_h = record.step_h();
    let step_s = record.clock.step_s();
    let mut episodes: Vec<Episode> = Vec::new();
    let mut open: Option<(Episode, Sum)> = None;
    let mut close = |open: &mut Option<(Episode, Sum)>| {
        if let Some((mut episode, power)) = open.take() {
            episode.energy_kwh = power.value() * step_h;
            episodes.push(episode);
        }
    };
    let (mut surplus, mut deficit, mut direct) = (Sum::default(), Sum::default(), Sum::default());
    let mut before: Option<f64> = None;
    let mut steepest: Option<f64> = None;
    let mut peaks = (0.0, 0.0);
    let mut result = nothing();
    for i in 0..duty.intervals() {
        let net = duty.net_kw(i);
        if let (Some(net), Some(before)) = (net, before) {
            let ramp = (net - before).abs() / step_s;
            steepest = Some(steepest.map_or(ramp, |steepest: f64| steepest.max(ramp)));
        }
        before = net;
        let net = net.unwrap_or(0.0);
        if net == 0.0 {
            close(&mut open);
        } else {
            if open.as_ref().is_some_and(|(episode, _)| (episode.peak_kw > 0.0) != (net > 0.0)) {
                close(&mut open);
            }
            let (episode, power) = open.get_or_insert_with(|| {
                (Episode { start: i, steps: 0, energy_kwh: 0.0, peak_kw: net }, Sum::default())
            });
            episode.steps += 1;
            power.add(net);
            if net.abs() > episode.peak_kw.abs() {
                episode.peak_kw = net;
            }
            if net > 0.0 {
                surplus.add(net);
            } else {
                deficit.add(-net);
            }
            peaks = (f64::max(peaks.0, net), f64::max(peaks.1, -net));
        }
        if record.net_kw(i).is_some()
            && let (Some(supply), Some(demand)) = (&record.supply_kw, &record.demand_kw)
            && let (Some(supply), Some(demand)) = (supply.get(i), demand.get(i))
        {
            direct.add(supply.min(demand));
        }
    }
    close(&mut open);
    // Between two samples of opposite signs there is surplus and deficit in one interval, beyond its average.
    if duty.given.is_none() {
        for (_, power) in &record.hidden_kw {
            surplus.add(*power);
            deficit.add(*power);
            direct.add(0.0 - *power);
        }
    }
    let share = |part: Option<f64>, whole: Option<f64>| match (part, whole) {
        (Some(part), Some(whole)) if whole > 0.0 => Some(part / whole),
        _ => None,
    };
    let both = record.supply_kw.is_some() && record.demand_kw.is_some();
    let direct = both.then(|| direct.value() * step_h);
    let side = |sign: f64| episodes.iter().filter(move |episode| episode.energy_kwh * sign > 0.0);
    let largest = |sign: f64| {
        side(sign)
            .map(|episode| episode.energy_kwh * sign)
            .fold(None, |most: Option<f64>, energy| Some(most.map_or(energy, |most| most.max(energy))))
    };
    if duty.has_net() {
        result.surplus_kwh = Some(surplus.value() * step_h);
        result.deficit_kwh = Some(deficit.value() * step_h);
        result.peak_charge_kw = Some(peaks.0);
        result.peak_discharge_kw = Some(peaks.1);
    }
    result.direct_use_kwh = direct;
    result.self_consumption = share(direct, duty.totals.supply_kwh);
    result.self_sufficiency = share(direct, duty.totals.demand_kwh);
    result.surplus_episodes = side(1.0).count();
    result.deficit_episodes = side(-1.0).count();
    result.largest_surplus_kwh = largest(1.0);
    result.largest_deficit_kwh = largest(-1.0);
    result.longest_deficit_s =
        side(-1.0).map(|episode| episode.steps).max().map(|steps| steps as f64 * step_s);
    result.steepest_ramp_kw_per_s = steepest;
    (episodes, result)
}
