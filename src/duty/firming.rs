//! Firming: a fixed output, and the storage power that makes it.
//!
//! In a block of constant output the store ends where it began: without losses the output is the block's mean; with losses it
//! solves "sum of inflows = 0", a function that falls and is concave and piecewise linear in the output, so that Newton's method from
//! the mean comes down to the root in finitely many steps.

use super::series::Known;
use crate::losses::Losses;
use crate::numeric::{Leak, Sum};

/// Steps of Newton's method; each passes at least one kink of the function, and few are ever needed.
const MOST_STEPS: usize = 200;

/// Halvings of a bracket: more than the digits of a double.
const HALVINGS: usize = 64;

/// The output of blocks of `block` intervals from the record's start, kW; a last block cut short is closed over what it has.
pub(super) fn blocks(power: &Known, block: usize, losses: &Losses) -> Vec<f64> {
    let steps = power.len();
    let mut output = vec![f64::NAN; steps];
    let mut start = 0;
    while start < steps {
        let end = (start + block).min(steps);
        let values: Vec<f64> = (start..end).filter_map(|i| power.get(i)).collect();
        let level = closing(&values, losses);
        for (i, value) in output.iter_mut().enumerate().take(end).skip(start) {
            if power.get(i).is_some() {
                *value = level;
            }
        }
        start = end;
    }
    output
}

/// The constant output with which a store gains nothing over these powers, kW; NaN without any.
fn closing(values: &[f64], losses: &Losses) -> f64 {
    let sum = values.iter().fold(Sum::default(), |mut sum, value| {
        sum.add(*value);
        sum
    });
    let mut output = sum.value() / values.len() as f64;
    if losses.charge == 1.0 && losses.discharge == 1.0 {
        return output;
    }
    for _ in 0..MOST_STEPS {
        let (mut gain, mut slope) = (Sum::default(), Sum::default());
        for value in values {
            gain.add(losses.inflow_kwh(output - value, 1.0));
            slope.add(if output > *value { 1.0 / losses.discharge } else { losses.charge });
        }
        let next = output + gain.value() / slope.value();
        // From the right the root is never passed, but for rounding.
        if next >= output || next.is_nan() {
            break;
        }
        output = next;
    }
    output
}

/// How much every output must be lowered (kW) so that the repeated record can be sustained with self-discharge and other
/// losses: the periodic level then just touches empty. `output` and `power` as above.
pub(super) fn lowering(power: &Known, output: &[f64], losses: &Losses, step_h: f64) -> f64 {
    let leak = losses.leak(step_h);
    let sustained = |by: f64| lowest(power, output, losses, leak, step_h, by) >= 0.0;
    if sustained(0.0) {
        return 0.0;
    }
    let reach = power.there().map(|(i, value)| (output[i] - value).abs()).fold(0.0, f64::max);
    let mut most = reach.max(1e-9);
    for _ in 0..HALVINGS {
        if sustained(most) {
            break;
        }
        most *= 2.0;
    }
    let mut least = 0.0;
    for _ in 0..HALVINGS {
        let middle = f64::midpoint(least, most);
        if middle <= least || middle >= most {
            break;
        }
        if sustained(middle) {
            most = middle;
        } else {
            least = middle;
        }
    }
    most
}

/// With self-discharge: the lowest level of the periodic run. Without: the gain of a pass.
fn lowest(power: &Known, output: &[f64], losses: &Losses, leak: Leak, step_h: f64, by: f64) -> f64 {
    let inflow =
        |i: usize| power.get(i).map_or(0.0, |value| losses.inflow_kwh(output[i] - by - value, step_h));
    let (mut end, mut factor) = (0.0, 1.0);
    let mut sum = Sum::default();
    for i in 0..power.len() {
        end = leak.keep * end + leak.gain * inflow(i);
        factor *= leak.keep;
        sum.add(inflow(i));
    }
    if factor == 1.0 {
        return sum.value();
    }
    let mut level = end / (1.0 - factor);
    let mut least = level;
    for i in 0..power.len() {
        level = leak.keep * level + leak.gain * inflow(i);
        least = least.min(level);
    }
    least
}
