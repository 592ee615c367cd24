//! The requirement's criteria, in the words of the result format.

use super::{Asked, Working};
use crate::case::{Case, Connection};
use crate::duty::{Duty, Kind};
use crate::result::{Bound, Confidence, Criterion, Origin};
use crate::units::people;

/// Seconds in a year of 365.25 days.
pub(crate) const YEAR_S: f64 = 31_557_600.0;

/// The criteria of a duty with its asked point, computed ones first, then those asked by the person.
pub(super) fn list(duty: &Duty, case: &Case, working: &Working, asked: Option<&Asked>) -> Vec<Criterion> {
    let mut list = Vec::new();
    let mut computed = |quantity: &str, value: f64, unit: &str, from: String, confidence: Confidence| {
        list.push(Criterion {
            quantity: quantity.to_owned(),
            bound: Bound::AtLeast,
            value,
            unit: unit.to_owned(),
            origin: Origin::Computed,
            from,
            confidence,
        });
    };
    if let Some(asked) = asked {
        let point = asked.point;
        let sampled = Confidence::BoundedBySampling;
        let lossy = if working.assumed { Confidence::Assumed } else { Confidence::Measured };
        let losses = if working.assumed {
            format!("; {} assumed each way, enter your own", people::percent(working.losses.discharge))
        } else {
            String::new()
        };
        let what = match duty.kind {
            Kind::Limits(_) => "holds the limits".to_owned(),
            _ if !duty.kind.balances() => "carries all that is asked".to_owned(),
            _ => format!(
                "serves {} of the {}",
                people::percent(point.served_share),
                if duty.connection == Connection::Connected { "import" } else { "deficit" }
            ),
        };
        let power_from = match duty.kind {
            Kind::Limits(_) => "greatest power beyond the limits".to_owned(),
            Kind::Shifting => "power entered".to_owned(),
            _ if !duty.kind.balances() => "greatest power asked".to_owned(),
            _ if case.requirement.served_power_kw.is_some() => "power entered".to_owned(),
            _ if duty.connection == Connection::Connected => {
                "a hundredth of the import energy lies above this power".to_owned()
            }
            _ => "greatest deficit".to_owned(),
        };
        computed("discharge_power", point.power_kw, "kW", power_from, sampled);
        computed("charge_power", point.power_kw, "kW", format!("{what} with this power both ways"), sampled);
        computed("energy", point.delivered_kwh, "kWh", format!("delivered; {what}{losses}"), lossy);
        computed(
            "duration",
            3600.0 * point.delivered_kwh / point.power_kw,
            "s",
            "energy over power".to_owned(),
            lossy,
        );
        let years = duty.record.clock.span_s() / YEAR_S;
        // An outage is run once, whatever the record's length: that says nothing about a year.
        let lasting = duty.kind != Kind::RideThrough;
        if let Some(cycles) = asked.run.equivalent_full_cycles
            && years > 0.0
            && lasting
        {
            computed(
                "cycles",
                cycles / years,
                "1/year",
                "equivalent full cycles: energy taken out over capacity".to_owned(),
                lossy,
            );
        }
        if let Some(hold) = asked.run.mean_hold_s.filter(|_| lasting) {
            computed(
                "hold",
                hold,
                "s",
                "mean stored energy and time over energy taken out (Little's law)".to_owned(),
                lossy,
            );
        }
        if duty.result.surplus() > 0.0 && duty.kind.balances() {
            computed(
                "round_trip_efficiency",
                point.served_share * duty.result.deficit() / duty.result.surplus(),
                "",
                "served energy over surplus".to_owned(),
                Confidence::Measured,
            );
        }
    }
    if let Some(ramp) = duty.result.steepest_ramp_kw_per_s {
        computed(
            "ramp",
            ramp,
            "kW/s",
            "steepest change between two intervals".to_owned(),
            Confidence::BoundedBySampling,
        );
    }
    let site = &case.site;
    let asked = [
        ("response", Bound::AtMost, site.response_s, "s", "time to full power"),
        ("transfer", Bound::AtMost, site.transfer_s, "s", "break when the store takes over"),
        ("service_life", Bound::AtLeast, site.service_life_years, "years", "service life"),
        ("mass", Bound::AtMost, site.mass_budget_kg, "kg", "installed mass"),
        ("volume", Bound::AtMost, site.volume_budget_l, "l", "installed volume"),
        ("ambient", Bound::AtLeast, site.ambient_greatest_c, "degC", "works up to this air temperature"),
        ("ambient", Bound::AtMost, site.ambient_least_c, "degC", "works down to this air temperature"),
    ];
    list.extend(asked.into_iter().filter_map(|(quantity, bound, value, unit, from)| {
        value.map(|value| Criterion {
            quantity: quantity.to_owned(),
            bound,
            value,
            unit: unit.to_owned(),
            origin: Origin::Asked,
            from: from.to_owned(),
            confidence: Confidence::Assumed,
        })
    }));
    list
}
