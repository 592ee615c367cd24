//! Cycle counting by ASTM E1049-85 (rainflow, three-point rule, residue as half cycles).
//!
//! The standard itself was not seen; its worked series and counts are reproduced in public test suites, from which the check is.

/// A counted range.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cycle {
    /// Difference between the two turning points.
    pub range: f64,
    /// 1 for a full cycle, 0.5 for a half.
    pub count: f64,
}

/// Counts the cycles of a series of levels. Ranges below `least` are rounding and do not count.
///
/// ```
/// use millpond::requirement::cycles::rainflow;
/// let levels = [-2.0, 1.0, -3.0, 5.0, -1.0, 3.0, -4.0, 4.0, -2.0];
/// let half: f64 = rainflow(levels, 0.0).iter().filter(|cycle| cycle.range == 8.0).map(|cycle| cycle.count).sum();
/// assert_eq!(half, 1.0);
/// ```
pub fn rainflow(levels: impl IntoIterator<Item = f64>, least: f64) -> Vec<Cycle> {
    let mut cycles = Vec::new();
    let mut count = |range: f64, count: f64| {
        if range >= least && range > 0.0 {
            cycles.push(Cycle { range, count });
        }
    };
    let mut stack: Vec<f64> = Vec::new();
    for level in turning_points(levels) {
        stack.push(level);
        while let [.., a, b, c] = stack[..] {
            let (last, before) = ((c - b).abs(), (b - a).abs());
            if last < before {
                break;
            }
            let length = stack.len();
            if length == 3 {
                // The range holds the starting point: half a cycle, and the start moves on.
                count(before, 0.5);
                stack.remove(0);
            } else {
                count(before, 1.0);
                stack.drain(length - 3..length - 1);
            }
        }
    }
    for pair in stack.windows(2) {
        count((pair[1] - pair[0]).abs(), 0.5);
    }
    cycles
}

/// The series' first and last values and all reversals between; plateaus collapse to one point.
fn turning_points(levels: impl IntoIterator<Item = f64>) -> impl Iterator<Item = f64> {
    let mut levels = levels.into_iter();
    let mut last: Option<f64> = None;
    let mut direction = 0.0;
    let mut started = false;
    let mut ended = false;
    std::iter::from_fn(move || {
        if ended {
            return None;
        }
        loop {
            let Some(level) = levels.next() else {
                ended = true;
                return last;
            };
            let Some(before) = last else {
                last = Some(level);
                continue;
            };
            let step = level - before;
            if step == 0.0 {
                continue;
            }
            last = Some(level);
            let turned = step * direction < 0.0;
            direction = step;
            if turned || !started {
                started = true;
                return Some(before);
            }
        }
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn counted_ranges_add_up_to_half_the_total_variation(levels in prop::collection::vec(-100i32..100, 0..200)) {
            let levels: Vec<f64> = levels.into_iter().map(f64::from).collect();
            let counted: f64 = rainflow(levels.iter().copied(), 0.0).iter().map(|c| c.range * c.count).sum();
            let variation: f64 = levels.windows(2).map(|pair| (pair[1] - pair[0]).abs()).sum();
            prop_assert!((counted - variation / 2.0).abs() < 1e-9);
        }
    }
}
