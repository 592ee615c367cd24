//! Smoothing: an output whose ramp stays within a limit, and the storage power that makes it.
//!
//! Three ways to find the output. **Causal**: it follows the power as fast as it may, knowing nothing of what comes. **Least power**:
//! the middle of the two envelopes of that slope, above and below (McShane's and Whitney's extension of a function of limited slope,
//! from memory), each found by one pass forwards and one backwards; no output of that ramp deviates less at its greatest deviation.
//! **Least energy**: see [`super::polygon`].
//!
//! Across a gap the output may move by the ramp times the time that has passed.

use super::polygon;
use super::series::Known;
use crate::case::SmoothingMethod;
use crate::losses::Losses;

/// How an output is found.
#[derive(Debug, Clone, Copy)]
pub(super) struct Smooth {
    pub(super) method: SmoothingMethod,
    /// Steepest ramp, kW from one interval to the next.
    pub(super) ramp_kw: f64,
    /// Hours in which the output gives back what the store has gathered (causal).
    pub(super) feedback_h: Option<f64>,
    /// Whether the output may not fall below zero.
    pub(super) never_below_zero: bool,
    /// Whether the store must end where it began (least energy).
    pub(super) closes: bool,
}

/// The output (kW) for a power (kW, NaN in gaps) in steps of `step_h` hours; NaN in gaps.
pub(super) fn output(power: &Known, terms: &Smooth, losses: &Losses, step_h: f64) -> Vec<f64> {
    match terms.method {
        SmoothingMethod::Causal => causal(power, terms, losses, step_h),
        SmoothingMethod::LeastPower => least_power(power, terms.ramp_kw),
        SmoothingMethod::LeastEnergy => polygon::least_energy(power, terms, step_h),
    }
}

fn causal(power: &Known, terms: &Smooth, losses: &Losses, step_h: f64) -> Vec<f64> {
    let leak = losses.leak(step_h);
    let mut before: Option<f64> = None;
    let mut passed = 1.0;
    // What the store has gathered since the start, kWh inside.
    let mut gathered = 0.0;
    let mut output = Vec::with_capacity(power.len());
    for i in 0..power.len() {
        let Some(now) = power.get(i) else {
            passed += 1.0;
            gathered *= leak.keep;
            output.push(f64::NAN);
            continue;
        };
        let aim = match terms.feedback_h {
            Some(hours) => now + gathered / hours,
            None => now,
        };
        let reach = terms.ramp_kw * passed;
        let mut next = before.map_or(now, |before| aim.min(before + reach).max(before - reach));
        if terms.never_below_zero && terms.feedback_h.is_some() {
            next = next.max(0.0);
        }
        gathered = leak.keep * gathered + leak.gain * losses.inflow_kwh(next - now, step_h);
        output.push(next);
        before = Some(next);
        passed = 1.0;
    }
    output
}

fn least_power(power: &Known, ramp_kw: f64) -> Vec<f64> {
    let steps = power.len();
    let (mut above, mut below) = (vec![f64::NEG_INFINITY; steps], vec![f64::INFINITY; steps]);
    let (mut high, mut low) = (f64::NEG_INFINITY, f64::INFINITY);
    for i in 0..steps {
        (high, low) = (high - ramp_kw, low + ramp_kw);
        if let Some(now) = power.get(i) {
            (high, low) = (high.max(now), low.min(now));
        }
        (above[i], below[i]) = (high, low);
    }
    (high, low) = (f64::NEG_INFINITY, f64::INFINITY);
    for i in (0..steps).rev() {
        (high, low) = (high - ramp_kw, low + ramp_kw);
        if let Some(now) = power.get(i) {
            (high, low) = (high.max(now), low.min(now));
        }
        (above[i], below[i]) = (above[i].max(high), below[i].min(low));
    }
    (0..steps).map(|i| power.get(i).map_or(f64::NAN, |_| f64::midpoint(above[i], below[i]))).collect()
}
