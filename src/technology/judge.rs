//! The rule of a verdict, and what the judges of all criteria share.

use super::catalogue::{Model, Quantity, Technology};
use super::curve::{Circuit, Meeting};
use super::family::{Design, Per};
use super::need::{Criterion, Judged, Need, Pair};
use crate::chart::Verdict;

/// Loads past this are written as this, so that a result is always a number.
const GREATEST_LOAD: f64 = 1e12;

/// A kind and a need, with what every judge asks of the pair.
#[derive(Debug)]
pub(super) struct Bench<'a> {
    pub(super) technology: &'a Technology,
    pub(super) need: &'a Need,
    /// Power asked, kW, above 0.
    pub(super) power_kw: f64,
    /// Energy asked, kWh, above 0.
    pub(super) energy_kwh: f64,
    /// Energy over power, hours.
    pub(super) hours: f64,
    /// The typical circuit, by mass.
    pub(super) typical: Circuit,
}

impl<'a> Bench<'a> {
    /// None if the need asks nothing.
    pub(super) fn new(technology: &'a Technology, need: &'a Need) -> Option<Self> {
        let hours = need.duration_s()? / 3600.0;
        let typical = Design::at(technology, Per::Mass, 0.0).circuit;
        Some(Self {
            technology,
            need,
            power_kw: need.power_kw(),
            energy_kwh: need.energy_kwh(),
            hours,
            typical,
        })
    }

    /// Usable depth at the typical value and at the good end, shares.
    pub(super) fn depth(&self) -> Pair {
        let depth = self.technology.range(Quantity::DepthOfDischarge);
        Pair { typical: depth.typical / 100.0, good: depth.high / 100.0 }
    }

    /// Where the typical curve meets the duration.
    pub(super) fn meeting(&self) -> Meeting {
        self.typical.meets(self.hours, self.depth().typical)
    }

    /// Power at which a sensible store runs on this duty, kW per rated kWh: where its curve meets the duration, but
    /// not above its reference power, since mass and volume are weighed at that.
    pub(super) fn running_kw(&self) -> f64 {
        let reference = self.typical.ref_power_kw();
        self.meeting().power_kw().map_or(reference, |power| power.min(reference))
    }

    /// Time constant of the circuit's decay at the good end of the published self-discharge, hours; none = no leak.
    pub(super) fn good_leak_h(&self) -> Option<f64> {
        self.technology.circuit.leak_time_constant_s?;
        let published = self.technology.range(Quantity::SelfDischarge);
        let (lost, over_h) = (published.low / 100.0, per_hours(&published.unit));
        let floor = self.technology.circuit.state_min_frac;
        let tau = match self.technology.circuit.model {
            Model::Fixed => -over_h / libm::log1p(-lost),
            Model::Potential | Model::Kinetic => -2.0 * over_h / libm::log1p(-lost * (1.0 - floor * floor)),
        };
        (lost > 0.0 && tau.is_finite()).then_some(tau)
    }

    /// Round-trip efficiency on this duty without leak and standing load: of the circuit at the duration; at the good
    /// end the published best, if that is better.
    pub(super) fn round_trip(&self) -> Pair {
        let published = self.technology.range(Quantity::RoundTripEfficiency);
        let running = self.running_kw();
        let charge = self.need.charge_kw;
        // Charged no harder than it discharges unless the duty asks so, and never past the circuit's peak.
        let ratio = if charge > 0.0 && charge.is_finite() { charge / self.power_kw } else { 1.0 };
        let charging = (running * ratio).min(self.typical.peak_kw());
        let typical = self.typical.round_trip(running, charging).unwrap_or(published.typical / 100.0);
        Pair { typical, good: typical.max(published.high / 100.0) }
    }
}

impl Judged {
    /// Judges a load: asked over offered at the typical value and at the good end.
    pub(super) fn weigh(quantity: Criterion, typical: f64, good: f64, margin: f64) -> Self {
        let (typical, good) = (bounded(typical), bounded(good.min(typical)));
        // The slack keeps a value that meets its bound to the last digit on the right side of it.
        let verdict = if typical * (1.0 + margin) <= 1.0 + 1e-12 {
            Verdict::Carries
        } else if good <= 1.0 + 1e-12 {
            Verdict::Strains
        } else {
            Verdict::Fails
        };
        let load = Some(Pair { typical, good });
        Self { quantity, verdict, reason: String::new(), confirmed: false, turn: String::new(), load }
    }

    /// A verdict in which no number was weighed.
    pub(super) fn plain(quantity: Criterion, verdict: Verdict, reason: impl Into<String>) -> Self {
        Self { quantity, verdict, reason: reason.into(), confirmed: false, turn: String::new(), load: None }
    }

    /// The same with its reason.
    pub(super) fn because(mut self, reason: impl Into<String>) -> Self {
        self.reason = reason.into();
        self
    }

    /// The same with what would turn it, unless it carries.
    pub(super) fn turned_by(mut self, turn: impl Into<String>) -> Self {
        if self.verdict != Verdict::Carries {
            self.turn = turn.into();
        }
        self
    }

    /// The same with whether its number was read in a source.
    pub(super) fn confirmed(mut self, confirmed: bool) -> Self {
        self.confirmed = confirmed;
        self
    }
}

/// Hours of the period over which a self-discharge is given.
pub(super) fn per_hours(unit: &str) -> f64 {
    if unit == "%/h" { 1.0 } else { 24.0 }
}

fn bounded(load: f64) -> f64 {
    // NaN arises only from 0 / 0: nothing asked of nothing.
    if load.is_nan() { 0.0 } else { load.clamp(0.0, GREATEST_LOAD) }
}
