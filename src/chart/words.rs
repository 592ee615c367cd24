//! Numbers and units as the pictures write them.

/// The unit in which energies up to `most` kWh read well on an axis, and kWh in one of it.
pub(super) fn energy_unit(most: f64) -> (f64, &'static str) {
    unit(most, &[(1.0, "kWh"), (1e3, "MWh"), (1e6, "GWh"), (1e9, "TWh")], (1e-3, "Wh"))
}

/// The unit in which powers up to `most` kW read well on an axis, and kW in one of it.
pub(super) fn power_unit(most: f64) -> (f64, &'static str) {
    unit(most, &[(1.0, "kW"), (1e3, "MW"), (1e6, "GW"), (1e9, "TW")], (1e-3, "W"))
}

/// Two ends divided by a unit's size.
pub(super) fn in_unit((low, high): (f64, f64), size: f64) -> (f64, f64) {
    (low / size, high / size)
}

/// The greatest magnitude of two ends.
pub(super) fn most((low, high): (f64, f64)) -> f64 {
    low.abs().max(high.abs())
}

fn unit(most: f64, rising: &[(f64, &'static str)], least: (f64, &'static str)) -> (f64, &'static str) {
    let fits = |size: f64| most.abs() >= size * if size == 1.0 { 0.3 } else { 1.5 };
    rising.iter().rev().find(|(size, _)| fits(*size)).copied().unwrap_or(if most == 0.0 {
        rising[0]
    } else {
        least
    })
}

/// Least and greatest number of some series; none without a number.
#[inline(never)]
pub(super) fn extent(columns: &[&[f64]]) -> Option<(f64, f64)> {
    let mut found: Option<(f64, f64)> = None;
    for v in columns.iter().copied().flatten().copied().filter(|v| v.is_finite()) {
        found = Some(found.map_or((v, v), |(a, b)| (a.min(v), b.max(v))));
    }
    found
}

/// Value of a piecewise linear curve; none outside it or where it has no numbers.
pub(super) fn at(x: &[f64], y: &[f64], value: f64) -> Option<f64> {
    let n = x.len().min(y.len());
    if n == 0 || value.is_nan() || value < x[0] || value > x[n - 1] {
        return None;
    }
    let after = x[..n].partition_point(|&v| v < value).min(n - 1);
    if after == 0 || x[after] == value {
        return y[after].is_finite().then_some(y[after]);
    }
    let (x0, x1, y0, y1) = (x[after - 1], x[after], y[after - 1], y[after]);
    let found = y0 + (value - x0) / (x1 - x0) * (y1 - y0);
    found.is_finite().then_some(found)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn axes_take_the_unit_that_reads_well() {
        for (most, expected) in
            [(14_000.0, "MWh"), (900.0, "kWh"), (1400.0, "kWh"), (0.2, "Wh"), (0.0, "kWh"), (3e6, "GWh")]
        {
            assert_eq!(energy_unit(most).1, expected, "{most}");
        }
    }

    #[test]
    fn curves_are_read_between_their_points() {
        assert_eq!(at(&[0.0, 2.0], &[0.0, 4.0], 1.0), Some(2.0));
        assert_eq!(at(&[0.0, 2.0], &[0.0, f64::NAN], 1.0), None);
        assert_eq!(at(&[], &[], 1.0), None);
        assert_eq!(extent(&[&[f64::NAN, 2.0, -1.0]]), Some((-1.0, 2.0)));
    }
}
