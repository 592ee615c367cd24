//! Small numerics shared by the stages.

/// A compensated sum: the error stays near one rounding however many terms are added.
///
/// Neumaier's variant of Kahan's method (Neumaier 1974, Zeitschrift für Angewandte Mathematik und Mechanik 54:39-51, from
/// memory).
#[derive(Debug, Clone, Copy, Default)]
pub struct Sum {
    sum: f64,
    carry: f64,
}

impl Sum {
    /// Adds a term.
    pub fn add(&mut self, term: f64) {
        let next = self.sum + term;
        self.carry +=
            if self.sum.abs() >= term.abs() { (self.sum - next) + term } else { (term - next) + self.sum };
        self.sum = next;
    }

    /// The sum so far.
    pub fn value(self) -> f64 {
        self.sum + self.carry
    }
}

/// The exact step of stored energy under self-discharge: x' = keep x + gain w, for a constant inflow w over the step.
///
/// The solution of dx/dt = -s x + w/step; `keep` = exp(-s step), `gain` = (1 - keep)/(s step), 1 without self-discharge.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Leak {
    /// Share of the stored energy left after a step.
    pub keep: f64,
    /// Share of the step's inflow left after it.
    pub gain: f64,
    /// Share of the stored energy lost in a step, 1 - keep without cancellation.
    pub lost: f64,
    /// Share of the step's inflow lost in it, 1 - gain without cancellation for small rates.
    pub inflow_lost: f64,
}

impl Leak {
    /// From the rate (1/h) and the step (h).
    pub fn new(rate_per_h: f64, step_h: f64) -> Self {
        let z = rate_per_h * step_h;
        if z == 0.0 {
            return Self { keep: 1.0, gain: 1.0, lost: 0.0, inflow_lost: 0.0 };
        }
        let lost = -libm::expm1(-z);
        let gain = lost / z;
        // 1 - (1 - e^-z)/z cancels for small z: the series is exact to rounding below 1e-3.
        let inflow_lost = if z < 1e-3 {
            z * (1.0 / 2.0 - z * (1.0 / 6.0 - z * (1.0 / 24.0 - z / 120.0)))
        } else {
            1.0 - gain
        };
        Self { keep: libm::exp(-z), gain, lost, inflow_lost }
    }
}

/// Sorts a short list of numbers, rising in IEEE 754's total order.
pub fn sort_rising(values: &mut [f64]) {
    let before = values.to_vec();
    for (value, from) in values.iter_mut().zip(rising(&before)) {
        *value = before[from];
    }
}

/// Sorts a long list of numbers, falling in the total order.
#[inline(never)]
pub fn sort_falling(values: &mut [f64]) {
    values.sort_unstable_by(|a, b| b.total_cmp(a));
}

/// Sorts a long list of numbers, rising in the total order.
pub fn sort_rising_long(values: &mut [f64]) {
    sort_falling(values);
    values.reverse();
}

/// The indices of keys such that the keys rise in the total order; equal ones keep their order.
///
/// The lists that the page sorts by a number all go through this: each sort of another type would be compiled anew, several kB
/// for the page to load.
#[inline(never)]
pub fn rising(keys: &[f64]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..keys.len()).collect();
    order.sort_by(|a, b| keys[*a].total_cmp(&keys[*b]));
    order
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn orders_are_those_of_a_stable_sort(mut keys in prop::collection::vec(prop_oneof![
            prop::num::f64::ANY, Just(0.0), Just(-0.0), Just(1.0),
        ], 0..70)) {
            let mut order: Vec<usize> = (0..keys.len()).collect();
            order.sort_by(|&a, &b| keys[a].total_cmp(&keys[b]));
            prop_assert_eq!(rising(&keys), order);
            let bits = |values: &[f64]| values.iter().map(|v| v.to_bits()).collect::<Vec<_>>();
            let mut falling = keys.clone();
            falling.sort_by(|a, b| b.total_cmp(a));
            sort_falling(&mut keys);
            prop_assert_eq!(bits(&keys), bits(&falling));
            falling.reverse();
            sort_rising(&mut keys);
            prop_assert_eq!(bits(&keys), bits(&falling));
        }
    }

    #[test]
    fn small_terms_survive_beside_a_large_one() {
        let mut sum = Sum::default();
        for term in [1e16, 1.0, 1.0, -1e16] {
            sum.add(term);
        }
        assert_eq!(sum.value(), 2.0);
    }

    #[test]
    fn both_forms_of_the_lost_inflow_meet() {
        for z in [0.9e-3_f64, 1.1e-3] {
            let leak = Leak::new(z, 1.0);
            assert!((leak.inflow_lost - (1.0 - leak.gain)).abs() < 1e-12);
            assert!((leak.keep + leak.lost - 1.0).abs() < 1e-15);
        }
    }
}
