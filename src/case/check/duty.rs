//! Terms of the duties: ranges, and terms that contradict each other.

use super::{MOST, count, number, optional, optional_at};
use crate::case::{DutyCase, Firming, Frequency, RideThrough, Shifting, Smoothing, SmoothingMethod};
use crate::fault::{Fault, Result};

/// Checks a duty's terms.
pub(super) fn terms(duty: &DutyCase) -> Result<()> {
    match duty {
        DutyCase::Guess {} | DutyCase::Balance {} | DutyCase::Given { .. } => Ok(()),
        DutyCase::Limits { import_limit_kw, export_limit_kw, hours, import_limit_kva, billing, .. } => {
            optional_at("duty.import_limit_kw", *import_limit_kw)?;
            optional_at("duty.export_limit_kw", *export_limit_kw)?;
            optional("duty.import_limit_kva", *import_limit_kva, 0.0, MOST, "kVA")?;
            count("duty.hours", hours.len())?;
            for (i, sentence) in hours.iter().enumerate() {
                crate::duty::Hours::parse(sentence, i)?;
            }
            billing.as_ref().map_or(Ok(()), |billing| {
                number("duty.billing.rate_per_kw", billing.rate_per_kw, 0.0, MOST, "a kW")?;
                optional("duty.billing.ratchet_share", billing.ratchet_share, 0.0, 1.0, "")?;
                number("duty.billing.ratchet_months", f64::from(billing.ratchet_months), 1.0, 120.0, "months")
            })
        }
        DutyCase::Smoothing(terms) => smoothing(terms),
        DutyCase::Firming(terms) => firming(terms),
        DutyCase::RideThrough(terms) => ride_through(terms),
        DutyCase::Frequency(terms) => frequency(terms),
        DutyCase::Shifting(terms) => shifting(terms),
    }
}

fn smoothing(terms: &Smoothing) -> Result<()> {
    optional("duty.rating_kw", terms.rating_kw, 0.0, MOST, "kW")?;
    optional("duty.feedback_h", terms.feedback_h, 1e-3, 1e5, "h")?;
    optional("duty.ramp_kw_per_min", terms.ramp_kw_per_min, 0.0, MOST, "kW a minute")?;
    optional("duty.ramp_share_per_min", terms.ramp_share_per_min, 0.0, 1e3, "")?;
    let refuse = |what: &str, at: &str, remedy: &str| Err(Fault::new(what, format!("case, at {at}"), remedy));
    if terms.ramp_kw_per_min.is_some() && terms.ramp_share_per_min.is_some() {
        return refuse(
            "the ramp is given twice",
            "duty.ramp_share_per_min",
            "Keep ramp_kw_per_min, or ramp_share_per_min with rating_kw.",
        );
    }
    match terms.ramp() {
        None => refuse(
            "smoothing has no ramp to hold",
            "duty.ramp_kw_per_min",
            "Give ramp_kw_per_min, or ramp_share_per_min with rating_kw.",
        ),
        Some(0.0) => refuse(
            "a ramp of zero would freeze the output at its first value for the whole record",
            "duty.ramp_kw_per_min",
            "Give a ramp above zero, or ask for firming with constant: true.",
        ),
        Some(_) if terms.day.is_some() && terms.method != SmoothingMethod::LeastEnergy => refuse(
            "a day is chosen, but this method looks at the whole record",
            "duty.day",
            "Remove the day, or take the method least_energy.",
        ),
        Some(_) if terms.feedback_h.is_some() && terms.method != SmoothingMethod::Causal => refuse(
            "feedback is given, but this method knows the record and needs none",
            "duty.feedback_h",
            "Remove feedback_h, or take the method causal.",
        ),
        Some(_) => Ok(()),
    }
}

fn firming(terms: &Firming) -> Result<()> {
    optional("duty.block_s", terms.block_s, 1e-3, 1e10, "s")?;
    let ways = [terms.block_s.is_some(), terms.schedule.is_some(), terms.constant];
    if ways.iter().filter(|way| **way).count() == 1 {
        return Ok(());
    }
    Err(Fault::new(
        "firming needs one of block_s, schedule and constant: true, and only one",
        "case, at duty",
        "Keep one of the three.",
    ))
}

fn ride_through(terms: &RideThrough) -> Result<()> {
    number("duty.outage_s", terms.outage_s, 1e-3, 1e10, "s")?;
    number("duty.critical_share", terms.critical_share, 0.0, 1.0, "")?;
    number("duty.supply_share", terms.supply_share, 0.0, 1.0, "")
}

fn frequency(terms: &Frequency) -> Result<()> {
    number("duty.nominal_hz", terms.nominal_hz, 1.0, 1000.0, "Hz")?;
    number("duty.dead_band_hz", terms.dead_band_hz, 0.0, 100.0, "Hz")?;
    number("duty.full_activation_hz", terms.full_activation_hz, 1e-6, 100.0, "Hz")?;
    number("duty.rating_kw", terms.rating_kw, 0.0, MOST, "kW")?;
    number("duty.recovery_kw", terms.recovery_kw, 0.0, MOST, "kW")?;
    if terms.full_activation_hz < terms.dead_band_hz {
        return Err(Fault::new(
            format!(
                "full activation at {} Hz lies inside the dead band of {} Hz",
                terms.full_activation_hz, terms.dead_band_hz
            ),
            "case, at duty.full_activation_hz",
            "Give a full activation at or beyond the dead band; both are deviations from the nominal frequency.",
        ));
    }
    Ok(())
}

fn shifting(terms: &Shifting) -> Result<()> {
    number("duty.charge_kw", terms.charge_kw, 0.0, MOST, "kW")?;
    number("duty.discharge_kw", terms.discharge_kw, 0.0, MOST, "kW")?;
    number("duty.energy_kwh", terms.energy_kwh, 0.0, MOST, "kWh")?;
    number("duty.wear_per_kwh", terms.wear_per_kwh, 0.0, MOST, "a kWh")?;
    number("duty.start_kwh", terms.start_kwh, 0.0, terms.energy_kwh, "kWh")?;
    optional("duty.end_kwh", terms.end_kwh, 0.0, terms.energy_kwh, "kWh")
}
