//! A kind of the catalogue as a store, for one rated kilowatt-hour: fast steps for sizing.
//!
//! The state y is the square of the circuit's state (voltage, current or speed over its value at full), proportional to the energy. A step
//! takes four stages of the classical Runge-Kutta method while y changes by little and no limit of the terminals is near; otherwise the
//! circuits' own error-controlled integration.

use super::circuit::Slow;
use crate::numeric::Leak;
use crate::technology::Lumped;

/// Greatest change of y in a fast step, share of y. The method's error is then below 1e-9 of it.
const FAST: f64 = 0.03;

/// Most parts into which a step is cut before the error-controlled integration takes over.
const MOST_PARTS: f64 = 16.0;

/// Least distance of the state from the matched load in a fast step.
const CLEAR: f64 = 1.1;

/// Power carried over a step, kW per rated kWh at the terminals, and the state after it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Moved {
    pub(super) carried_kw: f64,
    pub(super) after: f64,
}

/// A store of one rated kilowatt-hour, stepped on a clock.
#[derive(Debug)]
pub(super) enum Unit {
    /// Fixed efficiencies: the state is the usable energy, kWh.
    Fixed {
        /// Usable energy, kWh.
        full: f64,
        charge: f64,
        discharge: f64,
        leak: Leak,
        step_h: f64,
    },
    /// A potential or kinetic element: the state is y.
    Element {
        lumped: Lumped,
        step_h: f64,
        /// Share of y that is left after a step at rest.
        rest: f64,
        slow: Slow,
    },
}

impl Unit {
    pub(super) fn new(lumped: Lumped, step_h: f64) -> Self {
        let rate = lumped.decay_per_h;
        if lumped.fixed {
            return Self::Fixed {
                full: lumped.energy_kwh,
                charge: lumped.charge,
                discharge: lumped.discharge,
                leak: Leak::new(rate, step_h),
                step_h,
            };
        }
        Self::Element { lumped, step_h, rest: libm::exp(-rate * step_h), slow: Slow::new(&lumped) }
    }

    /// State when full.
    pub(super) fn full(&self) -> f64 {
        match self {
            Self::Fixed { full, .. } => *full,
            Self::Element { .. } => 1.0,
        }
    }

    /// A step with a power wanted at the terminals, kW, positive = charge.
    pub(super) fn step(&self, state: f64, wanted_kw: f64) -> Moved {
        match self {
            Self::Fixed { full, charge, discharge, leak, step_h } => {
                let kept = leak.keep * state;
                if wanted_kw < 0.0 {
                    let there = kept * discharge / (leak.gain * step_h);
                    let given = (-wanted_kw).min(there.max(0.0));
                    let after = kept - leak.gain * given * step_h / discharge;
                    return Moved { carried_kw: -given, after: after.max(0.0) };
                }
                let room = (full - kept) / (leak.gain * charge * step_h);
                let taken = wanted_kw.min(room.max(0.0));
                let after = kept + leak.gain * taken * charge * step_h;
                Moved { carried_kw: taken, after: after.min(*full) }
            }
            Self::Element { lumped, step_h, rest, slow } => {
                Self::element(lumped, *step_h, *rest, slow, state, wanted_kw)
            }
        }
    }

    fn element(lumped: &Lumped, step_h: f64, rest: f64, slow: &Slow, y: f64, wanted_kw: f64) -> Moved {
        let charging = wanted_kw > 0.0;
        let at_end = if charging { y >= 1.0 } else { y <= lumped.floor };
        if wanted_kw == 0.0 || at_end {
            return Moved { carried_kw: 0.0, after: y * rest };
        }
        let inner = if charging { -wanted_kw * lumped.charge } else { -wanted_kw / lumped.discharge };
        let rate = |y: f64| lumped.rate(y, inner);
        let k1 = rate(y);
        let moved = (k1 * step_h).abs();
        let clear = 4.0 * lumped.resistance * inner * CLEAR < y - moved;
        let parts = (moved / (FAST * y)).ceil();
        if parts > 1.0 && parts <= MOST_PARTS && 4.0 * lumped.resistance * inner * CLEAR < y - 2.0 * moved {
            let part_h = step_h / parts;
            let rest = libm::exp(-lumped.decay_per_h * part_h);
            let (mut carried, mut after) = (0.0, y);
            for done in 1..=parts as usize {
                let part = Self::element(lumped, part_h, rest, slow, after, wanted_kw);
                carried += part.carried_kw;
                after = part.after;
                // At its end it rests until the whole step is over.
                if part.carried_kw != wanted_kw {
                    let left = (parts - done as f64) * part_h;
                    after *= libm::exp(-lumped.decay_per_h * left);
                    break;
                }
            }
            return Moved { carried_kw: carried / parts, after };
        }
        if moved > FAST * y || !clear {
            let (after, given) = slow.advance(y, inner, step_h);
            let carried = if charging { -given / lumped.charge } else { given * lumped.discharge };
            return Moved { carried_kw: carried * wanted_kw.signum() / step_h, after };
        }
        let half = 0.5 * step_h;
        let k2 = rate(y + half * k1);
        let k3 = rate(y + half * k2);
        let k4 = rate(y + step_h * k3);
        let after = y + step_h / 6.0 * (k1 + 2.0 * (k2 + k3) + k4);
        let end = if charging { 1.0 } else { lumped.floor };
        if (charging && after <= end) || (!charging && after >= end) {
            return Moved { carried_kw: wanted_kw, after };
        }
        // It comes to its end on the way: where the cubic through both ends' values and rates does, by Newton's method.
        let (d1, d2) = (step_h * k1, step_h * rate(after));
        let (c2, c3) = (3.0 * (after - y) - 2.0 * d1 - d2, 2.0 * (y - after) + d1 + d2);
        let mut share = (end - y) / (after - y);
        for _ in 0..3 {
            let value = y + share * (d1 + share * (c2 + share * c3)) - end;
            share -= value / (d1 + share * (2.0 * c2 + 3.0 * share * c3));
        }
        let share = share.clamp(0.0, 1.0);
        let resting = (1.0 - share) * step_h * lumped.decay_per_h;
        Moved { carried_kw: share * wanted_kw, after: end * libm::exp(-resting) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::technology::{Catalogue, Design, Per};

    /// Powers of a plain linear congruence, between -1 and 1.
    fn powers(n: usize) -> impl Iterator<Item = f64> {
        let mut seed = 7_u64;
        std::iter::repeat_with(move || {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (seed >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
        })
        .take(n)
    }

    #[test]
    fn fast_steps_agree_with_the_error_controlled_integration() {
        let mut ends = 0;
        for technology in Catalogue::published().unwrap().technologies {
            let lumped = Design::at(&technology, Per::Mass, 0.0).circuit.lumped(0.9);
            if lumped.fixed {
                continue;
            }
            let step_h = 0.25;
            let unit = Unit::new(lumped, step_h);
            let slow = Slow::new(&lumped);
            let (mut y, mut exact) = (1.0, 1.0);
            let (mut carried, mut exactly, mut moved) = (0.0, 0.0, 0.0);
            // Ten hours from full to empty at the greatest power: a store of a day.
            for share in powers(400) {
                let wanted = share * 0.1_f64.min(lumped.peak_kw);
                let step = unit.step(y, wanted);
                y = step.after;
                let charging = wanted > 0.0;
                let inner = if charging { -wanted * lumped.charge } else { -wanted / lumped.discharge };
                let (after, given) = slow.advance(exact, inner, step_h);
                exact = after;
                let bus = if charging { -given / lumped.charge } else { -given * lumped.discharge };
                carried += step.carried_kw.abs() * step_h;
                exactly += bus.abs();
                moved += wanted.abs() * step_h;
                ends += usize::from((step.carried_kw - wanted).abs() > 1e-9);
                assert!((y - exact).abs() < 2e-8, "{}: {y} {exact}", technology.id);
            }
            assert!((carried - exactly).abs() < 2e-8 * moved, "{}: {carried} {exactly}", technology.id);
        }
        assert!(ends > 300, "ends are reached: {ends}");
    }

    #[test]
    fn the_closed_form_of_the_curve_is_the_integration_of_the_same_circuit() {
        // Christen and Carlen 2000, J. Power Sources 91(2):210-216, with the leak; the integration ends where the circuit rests or can give
        // no more than it is asked.
        for technology in Catalogue::published().unwrap().technologies {
            let circuit = Design::at(&technology, Per::Mass, 0.0).circuit;
            let lumped = circuit.lumped(0.8);
            if lumped.fixed {
                continue;
            }
            let slow = Slow::new(&lumped);
            for share in [0.01, 0.2, 0.5] {
                let power = share * circuit.ref_power_kw();
                let inner = power / lumped.discharge;
                let hours = lumped.delivered_kwh(power) / power;
                let (y, given) = slow.advance(1.0, inner, hours);
                assert!((y - lumped.floor).abs() < 1e-8, "{}: {y} {}", technology.id, lumped.floor);
                assert!((given / (inner * hours) - 1.0).abs() < 1e-8, "{}", technology.id);
                let (_, longer) = slow.advance(1.0, inner, 1.5 * hours);
                assert!((longer / given - 1.0).abs() < 1e-7, "{}: nothing after the end", technology.id);
            }
        }
    }
}
