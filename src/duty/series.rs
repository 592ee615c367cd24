//! A series as the duties reckon with it: plain values, some of them missing.

/// Values by interval; a missing one is a NaN inside, which no method gives out.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Known(Vec<f64>);

impl Known {
    /// From a function of the interval.
    pub(super) fn of(steps: usize, value: impl Fn(usize) -> Option<f64>) -> Self {
        Self((0..steps).map(|i| value(i).unwrap_or(f64::NAN)).collect())
    }

    /// From values where NaN stands for a missing one.
    pub(super) fn from_values(values: Vec<f64>) -> Self {
        Self(values)
    }

    /// Number of intervals.
    pub(super) fn len(&self) -> usize {
        self.0.len()
    }

    /// The value of interval `i`; none where it is missing or beyond the end.
    pub(super) fn get(&self, i: usize) -> Option<f64> {
        self.0.get(i).copied().filter(|value| !value.is_nan())
    }

    /// The values that are there, with their intervals.
    pub(super) fn there(&self) -> impl Iterator<Item = (usize, f64)> + '_ {
        self.0.iter().copied().enumerate().filter(|(_, value)| !value.is_nan())
    }
}
