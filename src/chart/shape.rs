//! Plane geometry of the pen: cutting lines into dashes, and hatching areas with clipped lines.

use crate::numeric::sort_rising;

/// A position on the picture, px, y downwards.
pub(super) type Point = (f64, f64);

/// Direction of a hatch.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Lie {
    /// Level lines: water.
    Level,
    /// At 45 degrees, rising to the right: ground.
    Rising,
}

/// Lines `step` px apart (measured along the upright), in page coordinates, clipped to the areas by the even-odd rule.
///
/// Lines lie at fixed places on the page, so that neighbouring areas join; areas that touch along a line share it.
pub(super) fn hatch(areas: &[Vec<Point>], lie: Lie, step: f64) -> Vec<[Point; 2]> {
    // In turned coordinates (along, across) every line is level. Across is y, or x + y for rising lines.
    let turn = |(x, y): Point| if lie == Lie::Level { (x, y) } else { (x, x + y) };
    let mut edges = Vec::new();
    let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
    for area in areas.iter().filter(|a| a.iter().all(|p| p.0.is_finite() && p.1.is_finite())) {
        for (i, &p) in area.iter().enumerate() {
            let (a, b) = (turn(p), turn(area[(i + 1) % area.len()]));
            if a.1 != b.1 {
                edges.push((a, b));
                low = low.min(a.1).min(b.1);
                high = high.max(a.1).max(b.1);
            }
        }
    }
    if edges.is_empty() || step <= 0.0 || high - low > 1e5 * step {
        return Vec::new();
    }
    let place = |k: f64| (k + 0.5) * step;
    let first = libm::ceil(low / step - 0.5);
    let count = (libm::floor(high / step - 0.5) - first + 1.0).max(0.0) as usize;
    let mut crossings: Vec<Vec<f64>> = vec![Vec::new(); count];
    for (a, b) in edges {
        let (a, b) = if a.1 <= b.1 { (a, b) } else { (b, a) };
        // Half-open, so that a corner on a line counts once.
        let from = (libm::ceil(a.1 / step - 0.5) - first).max(0.0) as usize;
        for (k, row) in crossings.iter_mut().enumerate().skip(from) {
            let at = place(first + k as f64);
            if at >= b.1 {
                break;
            }
            row.push(a.0 + (at - a.1) / (b.1 - a.1) * (b.0 - a.0));
        }
    }
    let mut lines = Vec::new();
    for (k, mut row) in crossings.into_iter().enumerate() {
        let at = place(first + k as f64);
        let back = |x: f64| if lie == Lie::Level { (x, at) } else { (x, at - x) };
        sort_rising(&mut row);
        let mut open: Option<(f64, f64)> = None;
        for pair in row.chunks_exact(2) {
            match open {
                Some((from, to)) if pair[0] - to < 1e-6 => open = Some((from, pair[1])),
                Some((from, to)) => {
                    lines.push([back(from), back(to)]);
                    open = Some((pair[0], pair[1]));
                }
                None => open = Some((pair[0], pair[1])),
            }
        }
        if let Some((from, to)) = open {
            lines.push([back(from), back(to)]);
        }
    }
    lines.retain(|[a, b]| (a.0 - b.0).abs() > 0.05);
    lines
}

/// The drawn parts of a line cut by a pattern of lengths (drawn, left out, drawn, ...), px, the phase carried on round
/// corners; each with the distance of its middle from the line's start.
pub(super) fn dashes(line: &[Point], pattern: &[f64]) -> Vec<(Vec<Point>, f64)> {
    if pattern.is_empty()
        || pattern.iter().sum::<f64>() < 0.1
        || pattern.iter().any(|d| d.is_nan() || *d <= 0.0)
    {
        return vec![(line.to_vec(), 0.0)];
    }
    let mut parts = Vec::new();
    let (mut slot, mut left) = (0, pattern[0]);
    let mut part: Vec<Point> = line.first().copied().into_iter().collect();
    let (mut gone, mut began) = (0.0, 0.0);
    for ends in line.windows(2) {
        let (mut a, b) = (ends[0], ends[1]);
        let mut rest = libm::hypot(b.0 - a.0, b.1 - a.1);
        while rest > left {
            let share = left / rest;
            a = (a.0 + share * (b.0 - a.0), a.1 + share * (b.1 - a.1));
            rest -= left;
            gone += left;
            if slot % 2 == 0 {
                part.push(a);
                parts.push((std::mem::take(&mut part), f64::midpoint(began, gone)));
            } else {
                part = vec![a];
                began = gone;
            }
            slot = (slot + 1) % (pattern.len() + pattern.len() % 2);
            left = pattern[slot % pattern.len()];
        }
        left -= rest;
        gone += rest;
        if slot % 2 == 0 {
            part.push(b);
        }
    }
    if slot % 2 == 0 && part.len() > 1 {
        parts.push((part, f64::midpoint(began, gone)));
    }
    parts
}

/// Runs of finite points: a missing value lifts the pen.
pub(super) fn runs(points: &[Point]) -> impl Iterator<Item = &[Point]> {
    points.split(|p| !(p.0.is_finite() && p.1.is_finite())).filter(|run| !run.is_empty())
}

/// The part of a segment inside a rectangle (left, top, right, bottom), if any (Liang and Barsky 1984).
pub(super) fn clip(a: Point, b: Point, (x0, y0, x1, y1): (f64, f64, f64, f64)) -> Option<(Point, Point)> {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let (mut from, mut to) = (0.0_f64, 1.0_f64);
    for (p, q) in [(-dx, a.0 - x0), (dx, x1 - a.0), (-dy, a.1 - y0), (dy, y1 - a.1)] {
        if p == 0.0 {
            if q < 0.0 {
                return None;
            }
        } else if p < 0.0 {
            from = from.max(q / p);
        } else {
            to = to.min(q / p);
        }
    }
    // A comparison with no number fails, so that nothing is drawn of it.
    (from <= to && (dx + dy).is_finite())
        .then_some(((a.0 + from * dx, a.1 + from * dy), (a.0 + to * dx, a.1 + to * dy)))
}

/// The parts of a line inside a rectangle.
pub(super) fn clip_line(line: &[Point], frame: (f64, f64, f64, f64)) -> Vec<Vec<Point>> {
    let mut parts: Vec<Vec<Point>> = Vec::new();
    for ends in line.windows(2) {
        let Some((a, b)) = clip(ends[0], ends[1], frame) else { continue };
        match parts.last_mut() {
            Some(part) if part.last() == Some(&a) => part.push(b),
            _ => parts.push(vec![a, b]),
        }
    }
    parts
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn square(x: f64, y: f64, side: f64) -> Vec<Point> {
        vec![(x, y), (x + side, y), (x + side, y + side), (x, y + side)]
    }

    #[test]
    fn level_hatch_fills_a_square_at_its_step() {
        let lines = hatch(&[square(0.0, 0.0, 12.0)], Lie::Level, 6.0);
        assert_eq!(lines, vec![[(0.0, 3.0), (12.0, 3.0)], [(0.0, 9.0), (12.0, 9.0)]]);
    }

    #[test]
    fn neighbours_share_their_hatch() {
        let lines = hatch(&[square(0.0, 0.0, 6.0), square(6.0, 0.0, 6.0)], Lie::Level, 6.0);
        assert_eq!(lines, vec![[(0.0, 3.0), (12.0, 3.0)]]);
    }

    #[test]
    fn rising_hatch_rises_to_the_right() {
        for [a, b] in hatch(&[square(3.0, 5.0, 40.0)], Lie::Rising, 6.0) {
            assert!(((b.0 - a.0) + (b.1 - a.1)).abs() < 1e-9 && b.0 > a.0);
        }
    }

    #[test]
    fn dashes_carry_on_round_a_corner() {
        let parts = dashes(&[(0.0, 0.0), (5.0, 0.0), (5.0, 5.0)], &[6.0, 2.0]);
        assert_eq!(parts[0].0, vec![(0.0, 0.0), (5.0, 0.0), (5.0, 1.0)]);
        assert_eq!(parts[1].0, vec![(5.0, 3.0), (5.0, 5.0)]);
    }

    #[test]
    fn missing_values_lift_the_pen() {
        let line = [(0.0, 1.0), (1.0, f64::NAN), (2.0, 1.0), (3.0, 1.0)];
        assert_eq!(runs(&line).map(<[Point]>::len).collect::<Vec<_>>(), vec![1, 2]);
    }

    #[test]
    fn a_line_outside_is_cut_away() {
        let frame = (0.0, 0.0, 10.0, 10.0);
        assert_eq!(clip((-5.0, 5.0), (15.0, 5.0), frame), Some(((0.0, 5.0), (10.0, 5.0))));
        assert_eq!(clip((-5.0, 50.0), (15.0, 50.0), frame), None);
        assert_eq!(clip((f64::NAN, 5.0), (15.0, 5.0), frame), None);
    }

    proptest! {
        #[test]
        fn hatch_stays_within_its_area(points in prop::collection::vec((0.0..100.0_f64, 0.0..100.0_f64), 0..12)) {
            for lie in [Lie::Level, Lie::Rising] {
                for [a, b] in hatch(std::slice::from_ref(&points), lie, 5.0) {
                    for p in [a, b] {
                        prop_assert!(p.0 > -1e-6 && p.0 < 100.0 + 1e-6 && p.1 > -1e-6 && p.1 < 100.0 + 1e-6);
                    }
                }
            }
        }

        #[test]
        fn dashes_are_no_longer_than_the_line(points in prop::collection::vec((0.0..100.0_f64, 0.0..100.0_f64), 2..9)) {
            let length = |l: &[Point]| l.windows(2).map(|w| libm::hypot(w[1].0 - w[0].0, w[1].1 - w[0].1)).sum::<f64>();
            let drawn: f64 = dashes(&points, &[4.0, 2.5]).iter().map(|(part, _)| length(part)).sum();
            prop_assert!(drawn <= length(&points) + 1e-6);
        }
    }
}
