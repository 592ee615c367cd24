//! The duties that say themselves what a store must do, in words: smoothing, firming, outages, frequency, shifting.

use super::figure;
use crate::assess::Assessment;
use crate::case::{DutyCase, Firming, Foresight, SeriesOf, SmoothingMethod};
use crate::chart::ticks;
use crate::duty::Duty;
use crate::fault::quote;
use crate::sheet::{Figure, Method};
use crate::units::people::{self, Scaled};

/// A number in the price's currency.
fn money(value: f64) -> Scaled {
    Scaled { number: people::plain(value, 2), unit: "" }
}

fn hertz(value: f64) -> Scaled {
    Scaled { number: people::significant(value, 5), unit: "Hz" }
}

fn series(of: SeriesOf) -> &'static str {
    match of {
        SeriesOf::Supply => "supply",
        SeriesOf::Net => "net power",
    }
}

/// Energy given less energy taken over the record, in words.
fn drift(net_kwh: f64) -> String {
    if net_kwh == 0.0 {
        "over the record it gives as much as it takes".to_owned()
    } else if net_kwh > 0.0 {
        format!("over the record it gives {} more than it takes", people::energy(net_kwh))
    } else {
        format!("over the record it takes {} more than it gives", people::energy(0.0 - net_kwh))
    }
}

fn output(terms: &Firming, first_kw: f64) -> String {
    match (&terms.schedule, terms.block_s) {
        (Some(column), _) => format!("the output of column {}", quote(column)),
        (None, Some(block_s)) => format!(
            "blocks of {} with one output each, the first {}",
            people::duration(block_s),
            people::power(first_kw)
        ),
        (None, None) => format!("one output of {}", people::power(first_kw)),
    }
}

/// What is asked; none for the other kinds.
pub(super) fn asked(duty: &Duty) -> Option<String> {
    let result = &duty.result;
    if let Some(infeasible) = &duty.infeasible {
        return Some(infeasible.why.clone());
    }
    Some(match duty.terms() {
        DutyCase::Smoothing(terms) => {
            let way = match terms.method {
                SmoothingMethod::Causal if terms.feedback_h.is_some() => {
                    "an output that follows as fast as it may and gives back what the store has gathered"
                }
                SmoothingMethod::Causal => "an output that follows as fast as it may",
                SmoothingMethod::LeastPower => "the output that asks for the least power",
                SmoothingMethod::LeastEnergy => "the output that asks for the least energy",
            };
            format!(
                "The {} may change by at most {} a minute. Storage takes up the difference to {way}; {}.",
                series(terms.series),
                people::power(terms.ramp().unwrap_or_default()),
                drift(result.net_discharge_kwh.unwrap_or_default())
            )
        }
        DutyCase::Firming(terms) => format!(
            "Storage makes of the {} {}.",
            series(terms.series),
            output(terms, result.output_kw.unwrap_or_default())
        ),
        DutyCase::RideThrough(terms) => {
            let load = match &terms.critical {
                Some(column) => format!("the critical load of column {}", quote(column)),
                None => format!("{} of demand", people::percent(terms.critical_share)),
            };
            let supply = if terms.supply_share > 0.0 {
                format!(", with {} of the supply working", people::percent(terms.supply_share))
            } else {
                String::new()
            };
            format!(
                "Storage carries {load}{supply} through an outage of {} that may begin at any time. The worst begins {}; 95 of 100 starts \
                 need no more than {} inside.",
                people::duration(terms.outage_s),
                moment(duty, duty.run_intervals().0),
                people::energy(result.reserve_p95_kwh.unwrap_or_default())
            )
        }
        DutyCase::Frequency(terms) => format!(
            "Storage answers deviations beyond {} from {}, with the whole {} at {} and more: over the record it delivers {} and absorbs {}.",
            hertz(terms.dead_band_hz),
            hertz(terms.nominal_hz),
            people::power(terms.rating_kw),
            hertz(terms.full_activation_hz),
            people::energy(result.delivered_kwh.unwrap_or_default()),
            people::energy(result.absorbed_kwh.unwrap_or_default())
        ),
        DutyCase::Shifting(terms) => format!(
            "Charging at low prices and discharging at high ones is worth {} over the record in the price\u{2019}s currency, {}{}.",
            money(result.value.unwrap_or_default()),
            match terms.foresight {
                Foresight::Full => "knowing every price beforehand",
                Foresight::DayAhead => "knowing the prices of each day at its midnight",
            },
            if terms.wear_per_kwh > 0.0 { ", wear taken off" } else { "" }
        ),
        _ => return None,
    })
}

fn moment(duty: &Duty, i: usize) -> String {
    let clock = &duty.record.clock;
    ticks::moment(clock.at_us(i) as f64 + f64::from(clock.offset_s(i)) * 1e6)
}

/// The rail's few words; none for the other kinds.
pub(super) fn rail(duty: &Duty) -> Option<String> {
    Some(match duty.terms() {
        DutyCase::Smoothing(terms) => {
            format!("ramps to {} a minute", people::power(terms.ramp().unwrap_or_default()))
        }
        DutyCase::Firming(_) => "firm output".to_owned(),
        DutyCase::RideThrough(terms) => format!("outages of {}", people::duration(terms.outage_s)),
        DutyCase::Frequency(terms) => format!("frequency, {}", people::power(terms.rating_kw)),
        DutyCase::Shifting(_) => format!("worth {}", money(duty.result.value.unwrap_or_default())),
        _ => return None,
    })
}

/// The figures that the kind adds to the duty.
pub(super) fn figures(duty: &Duty) -> Vec<Figure> {
    let result = &duty.result;
    let energy = |name: &str, value: Option<f64>, label: &str, context: &str| {
        value.map(|value| figure(&format!("duty.{name}"), value, label, people::energy(value), context))
    };
    [
        energy(
            "net_discharge_kwh",
            result.net_discharge_kwh,
            "Net discharge",
            "given less taken over the record",
        ),
        result
            .output_kw
            .map(|kw| figure("duty.output_kw", kw, "Output", people::power(kw), "of the first block")),
        energy("reserve_p95_kwh", result.reserve_p95_kwh, "Reserve, 95 of 100 starts", "inside the store"),
        energy("delivered_kwh", result.delivered_kwh, "Delivered", "outside the dead band"),
        energy("absorbed_kwh", result.absorbed_kwh, "Absorbed", "outside the dead band"),
        result.value.map(|value| {
            figure("duty.value", value, "Value", money(value), "in the price\u{2019}s currency")
        }),
    ]
    .into_iter()
    .flatten()
    .collect()
}

/// What it takes; none for the other kinds.
pub(super) fn takes(done: &Assessment) -> Option<String> {
    let duty = &done.duty;
    let aim = match duty.terms() {
        DutyCase::Smoothing(_) => "hold these ramps".to_owned(),
        DutyCase::Firming(_) => "make this output firm".to_owned(),
        DutyCase::RideThrough(terms) => {
            format!("ride through an outage of {} at any time", people::duration(terms.outage_s))
        }
        DutyCase::Frequency(_) => "answer this frequency".to_owned(),
        DutyCase::Shifting(_) => "run this schedule".to_owned(),
        _ => return None,
    };
    let Some(asked) = &done.requirement.asked else {
        return Some(match &done.requirement.infeasible {
            Some(infeasible) => infeasible.why.clone(),
            None => format!("To {aim} asks nothing of a store."),
        });
    };
    let point = &asked.point;
    Some(format!(
        "To {aim} takes {} and {} delivered, {} at full power.",
        people::power(point.power_kw),
        people::energy(point.delivered_kwh),
        people::duration(3600.0 * point.delivered_kwh / point.power_kw)
    ))
}

/// The least powers, beside that sentence.
pub(super) fn powers(done: &Assessment) -> Vec<Figure> {
    let result = &done.requirement.result;
    [
        ("requirement.least_discharge_kw", result.least_discharge_kw, "Least discharge power"),
        ("requirement.least_charge_kw", result.least_charge_kw, "Least charge power"),
    ]
    .into_iter()
    .filter_map(|(path, value, label)| {
        let value = value?;
        Some(figure(path, value, label, people::power(value), "asked by the duty"))
    })
    .collect()
}

/// How the power asked was found; none for the other kinds.
pub(super) fn method(duty: &Duty) -> Option<Method> {
    let words = |summary: &str, text: &str, formula: &str, source: &str, limits: &str| {
        Some(Method {
            summary: summary.to_owned(),
            text: text.to_owned(),
            formula: formula.to_owned(),
            source: source.to_owned(),
            limits: limits.to_owned(),
        })
    };
    match duty.terms() {
        DutyCase::Smoothing(terms) => match terms.method {
            SmoothingMethod::Causal => words(
                "an output that follows as fast as its ramp allows",
                "The output goes to the power itself where the ramp lets it, otherwise as far towards it as it may. With feedback it aims higher \
                 by what the store has gathered, spread over the hours entered, and lower by what it has given. The store takes up the \
                 difference. Across a gap the output may move by the ramp times the time passed.",
                "y(t) = min(max(s(t) + x/T, y(t−1) − ρΔt), y(t−1) + ρΔt)    b = y − s",
                "Elementary; common practice for feedback, no source",
                "Knows nothing of what comes. Without feedback the store\u{2019}s level drifts: the energy then grows with the record.",
            ),
            SmoothingMethod::LeastPower => words(
                "the middle of two envelopes",
                "The upper envelope is the lowest curve of the ramp allowed that lies nowhere below the power, the lower one the highest that lies \
                 nowhere above it. Half way between them no other curve of that ramp deviates less at its greatest deviation. Each \
                 envelope takes one pass forwards and one backwards.",
                "H(t) = max(s(j) − ρ|t−j|Δt)    L(t) = min(s(j) + ρ|t−j|Δt)    y = (H + L)/2    P = ½ max(H − L)",
                "Extension of functions of limited slope, McShane and Whitney (from memory)",
                "Knows the record beforehand: a bound on the power. It says nothing about the energy, and the level drifts.",
            ),
            SmoothingMethod::LeastEnergy => words(
                "what can be reached, as polygons",
                "With a given capacity the pairs of stored energy and output that can be reached form a polygon. Each interval shears it, empty \
                 and full cut it, the ramp widens it. The capacity is halved in on: too small where a polygon comes out empty. The output is \
                 found without losses, and lowered evenly where the record is repeated so that it covers them.",
                "0 ≤ x ≤ E    x(t+1) = x(t) + (s − y)Δt    |y(t+1) − y(t)| ≤ ρΔt    least E",
                "Derived for this program and checked against linear programmes",
                "Knows the record beforehand: a bound, not a rule to operate by.",
            ),
        },
        DutyCase::Firming(terms) if terms.schedule.is_some() => words(
            "scheduled output less power",
            "The store gives what the schedule has above the power, and takes what the power has above the schedule.",
            "b = y − s",
            "elementary",
            "A schedule that asks for more energy than comes in draws the store down: look at the energy.",
        ),
        DutyCase::Firming(_) => words(
            "blocks that close",
            "In each block the output is the one with which the store ends where it began: the mean of the power, or somewhat less with losses. \
             With self-discharge, when the record is repeated, every output is lowered evenly until the level can be held.",
            "Σ w(y − s) = 0 over a block    w(b) = −bΔt/η_d (b ≥ 0), −bη_cΔt (b < 0)",
            "Derived for this program and checked by root finding and linear programmes",
            "The output is known only when the block is over: a forecast must stand in for it.",
        ),
        DutyCase::RideThrough(_) => words(
            "the reserve of every start",
            "For each interval as the start of an outage, the reserve is the least stored energy that carries the critical load, less the supply that \
             works, to the outage\u{2019}s end. Supply beyond the load may charge the store. The worst start sets the energy.",
            "R(t) = max over k ≤ L of Σ −w(t+i), i < k    E = max R    P = max q",
            "Sequent peak method in its backward form, Thomas and Burden 1963 (from memory); running maxima by blocks, van Herk 1992 (from memory)",
            "Outages are not weighed by how likely they are. The reserve is to be held full at all times.",
        ),
        DutyCase::Frequency(_) => words(
            "power in proportion to the deviation",
            "Beyond the dead band the power is the rating times the deviation over that of full activation, at most the rating: discharge when the \
             frequency is low, charge when it is high. Inside the dead band the store returns to the level it began with, by at most the \
             recovery power.",
            "p = P min(1, |Δf| / Δf_full) for |Δf| > dead band",
            "Common practice of grid operators, no source",
            "Intervals hide what happens inside them; terms of a particular market may differ.",
        ),
        DutyCase::Shifting(_) => words(
            "the schedule of greatest value, exactly",
            "Backwards through the record, the value of stored energy is kept as a piecewise linear function of the level. An interval adds to it what \
             charging and discharging at its price make possible. Forwards, each interval then moves the level to where a further kWh \
             stops paying. With negative prices no interval both charges and discharges.",
            "V(t, x) = max over c, d of π(d − c)Δt − wear·dΔt + V(t+1, a x + φ(η_c c − d/η_d)Δt)",
            "Supremal convolution, Rockafellar, Convex Analysis, 1970 (from memory); shifting with an efficient store, Cruise, Flatley, \
             Gibbens and Zachary 2019; checked against linear and integer programmes",
            "Knows the prices, and does not move them: an upper bound on what a forecast earns. Other schedules may be worth the same.",
        ),
        _ => None,
    }
}

/// How energy and coverage of these kinds were found.
pub(super) fn coverage_method() -> Method {
    Method {
        summary: "the asked power, run with less energy".to_owned(),
        text: "The power asked is fixed in every interval, so the level follows from where it starts. The least energy is the largest sum of \
               what goes in or out over any window of the record. The curve runs smaller stores on the same power, each beginning as full \
               in proportion, and shows the share of the discharge that they carry."
            .to_owned(),
        formula: "E = max(max window Σ −w, max window Σ w)    w = η_c c Δt while charging, −d Δt / η_d while discharging".to_owned(),
        source: "Window sums of the interval of allowed storage power; derived for this program and checked against linear programmes".to_owned(),
        limits: "Constant efficiencies. Between the points drawn the curve is joined by straight lines.".to_owned(),
    }
}
