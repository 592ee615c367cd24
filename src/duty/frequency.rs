//! Answering the grid's frequency: power in proportion to the deviation, and a return to the first level inside the dead band.

use super::series::Known;
use crate::case::Frequency;
use crate::losses::Losses;
use crate::numeric::Sum;

/// What an answer comes to.
#[derive(Debug, Clone)]
pub(super) struct Answer {
    /// Power at the terminals, kW, positive = charge; NaN in gaps.
    pub(super) power_kw: Vec<f64>,
    /// Delivered outside the dead band, kWh at the terminals.
    pub(super) delivered_kwh: f64,
    /// Absorbed outside the dead band, kWh at the terminals.
    pub(super) absorbed_kwh: f64,
}

/// The answer to a frequency (Hz, by interval).
///
/// Outside the dead band the power is rating x min(1, deviation / full activation), charging when the frequency is high; the dead
/// band is not taken off the deviation. Inside it the store returns towards the level with which it began, reckoned without the
/// self-discharge of that level itself, and never past it.
pub(super) fn answer(frequency: &Known, terms: &Frequency, losses: &Losses, step_h: f64) -> Answer {
    let leak = losses.leak(step_h);
    let (mut delivered, mut absorbed) = (Sum::default(), Sum::default());
    // Above (or below) the first level, kWh inside.
    let mut above = 0.0;
    let mut power_kw = Vec::with_capacity(frequency.len());
    for i in 0..frequency.len() {
        let Some(hertz) = frequency.get(i) else {
            above *= leak.keep;
            power_kw.push(f64::NAN);
            continue;
        };
        let deviation = hertz - terms.nominal_hz;
        let power = if deviation.abs() <= terms.dead_band_hz {
            let left = leak.keep * above / (leak.gain * step_h);
            if left > 0.0 {
                0.0 - (left * losses.discharge).min(terms.recovery_kw)
            } else {
                (0.0 - left / losses.charge).min(terms.recovery_kw)
            }
        } else {
            let power = terms.rating_kw * (deviation.abs() / terms.full_activation_hz).min(1.0);
            if deviation > 0.0 {
                absorbed.add(power);
                power
            } else {
                delivered.add(power);
                0.0 - power
            }
        };
        above = leak.keep * above + leak.gain * losses.inflow_kwh(0.0 - power, step_h);
        power_kw.push(power);
    }
    Answer { power_kw, delivered_kwh: delivered.value() * step_h, absorbed_kwh: absorbed.value() * step_h }
}
