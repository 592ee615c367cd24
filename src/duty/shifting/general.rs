//! The plan where some step is not concave: values of any piecewise linear shape.
//!
//! The value at a step's start is the greater of two: the best that charging makes of the value at its end, and the best that
//! discharging makes of it. Each is a line plus the running maximum, over a window as wide as the step can move the level, of
//! the end's value less that line; a running maximum of a piecewise linear function is piecewise linear again.
//!
//! Values are kept at every so-manieth step only, and reckoned again between them on the way forward.

use std::collections::VecDeque;

use super::{Slopes, Span, Terms};

/// A piecewise linear function: points by rising place, at least one.
type Curve = Vec<(f64, f64)>;

/// Points on a straight line within this share of the greatest value are left out: rounding.
const ROUNDING: f64 = 4e-16;

/// Levels after each step, or none if the aim cannot be reached from the start.
pub(super) fn plan(span: &Span<'_>, store: &Terms, start: f64, aim: Option<f64>) -> Option<Vec<f64>> {
    let steps = span.len();
    let last = match aim {
        Some(aim) => vec![(aim, 0.0)],
        None => vec![(0.0, 0.0), (store.energy, 0.0)],
    };
    let stride = libm::sqrt(steps as f64).max(1.0) as usize;
    // Values at the starts of steps 0, stride, 2 stride, ..., kept on the way back.
    let mut kept: Vec<Curve> = Vec::new();
    let mut value = last.clone();
    for k in (0..steps).rev() {
        value = before(&value, span.price(k), store)?;
        if k % stride == 0 {
            kept.push(value.clone());
        }
    }
    let slack = 1e-9 * store.energy.max(1e-9);
    if !within(&value, start, slack) {
        return None;
    }
    let mut level = start;
    let mut levels = Vec::with_capacity(steps);
    kept.pop();
    let mut first = 0;
    while first < steps {
        let end = (first + stride).min(steps);
        let mut value = kept.pop().unwrap_or_else(|| last.clone());
        // Values at the ends of this stretch's steps, last first.
        let mut ends: Vec<Curve> = Vec::with_capacity(end - first);
        for k in (first..end).rev() {
            let earlier = if k > first { before(&value, span.price(k), store)? } else { Vec::new() };
            ends.push(std::mem::replace(&mut value, earlier));
        }
        for k in first..end {
            level = best(&ends.pop()?, span.price(k), store, level);
            levels.push(level);
        }
        first = end;
    }
    Some(levels)
}

fn within(curve: &[(f64, f64)], at: f64, slack: f64) -> bool {
    curve.first().is_some_and(|first| first.0 <= at + slack)
        && curve.last().is_some_and(|last| last.0 >= at - slack)
}

/// The value at a step's start from that at its end; none if nothing is left of it.
fn before(after: &Curve, price: Option<f64>, store: &Terms) -> Option<Curve> {
    let curve = match price {
        None => after.clone(),
        Some(price) => {
            let Slopes { buy, sell } = store.slopes(price);
            if buy >= sell && is_concave(after) {
                return within_ends(&inserted(after, buy, sell, store), store);
            }
            let charged = tilted(&ahead(&tilted(after, 0.0 - buy), store.most_in), buy);
            let discharged = mirrored(&ahead(&mirrored(&tilted(after, 0.0 - sell)), store.most_out));
            greater(&charged, &tilted(&discharged, sell))
        }
    };
    within_ends(&curve, store)
}

/// From the level after self-discharge to the level before it, within empty and full.
fn within_ends(curve: &[(f64, f64)], store: &Terms) -> Option<Curve> {
    let keep = store.leak.keep;
    cut(curve, 0.0, keep * store.energy)
        .map(|curve| curve.into_iter().map(|(at, value)| (at / keep, value)).collect())
}

/// Whether slopes only fall.
fn is_concave(curve: &[(f64, f64)]) -> bool {
    let mut before = f64::INFINITY;
    curve.windows(2).all(|pair| {
        let slope = (pair[1].1 - pair[0].1) / (pair[1].0 - pair[0].0);
        let falls = slope <= before;
        before = slope;
        falls
    })
}

/// A concave step on a concave function: a piece for charging and one for discharging, each where its slope belongs.
fn inserted(after: &Curve, buy: f64, sell: f64, store: &Terms) -> Curve {
    let mut pieces = [(buy, store.most_in), (sell, store.most_out)].into_iter().peekable();
    let mut at = (after[0].0 - store.most_in, after[0].1 - buy * store.most_in);
    let mut curve = Curve::with_capacity(after.len() + 2);
    curve.push(at);
    let mut add = |slope: f64, length: f64| {
        at = (at.0 + length, at.1 + slope * length);
        push(&mut curve, at);
    };
    for pair in after.windows(2) {
        let slope = (pair[1].1 - pair[0].1) / (pair[1].0 - pair[0].0);
        while let Some((steeper, length)) = pieces.next_if(|piece| piece.0 > slope) {
            add(steeper, length);
        }
        add(slope, pair[1].0 - pair[0].0);
    }
    pieces.for_each(|(slope, length)| add(slope, length));
    straightened(curve)
}

/// The level after a step that makes the most of the value at its end.
fn best(after: &Curve, price: Option<f64>, store: &Terms, level: f64) -> f64 {
    let kept = store.leak.keep * level;
    let (lowest, highest) = (after[0].0, after[after.len() - 1].0);
    let Some(price) = price else { return kept.clamp(lowest, highest) };
    let Slopes { buy, sell } = store.slopes(price);
    let gain = |to: f64| {
        let moved = to - kept;
        value_at(after, to) - if moved > 0.0 { buy * moved } else { sell * moved }
    };
    let reach =
        ((kept - store.most_out).max(lowest).min(highest), (kept + store.most_in).min(highest).max(lowest));
    let mut most = (kept.clamp(lowest, highest), f64::NEG_INFINITY);
    most.1 = gain(most.0);
    let corners = after.iter().map(|point| point.0).filter(|at| (reach.0..=reach.1).contains(at));
    for to in [reach.0, reach.1].into_iter().chain(corners) {
        let gain = gain(to);
        if gain > most.1 {
            most = (to, gain);
        }
    }
    most.0.clamp(0.0, store.energy)
}

/// The function plus `slope` times the place.
fn tilted(curve: &[(f64, f64)], slope: f64) -> Curve {
    curve.iter().map(|(at, value)| (*at, value + slope * at)).collect()
}

/// The function with its places turned round.
fn mirrored(curve: &[(f64, f64)]) -> Curve {
    curve.iter().rev().map(|(at, value)| (0.0 - at, *value)).collect()
}

fn value_at(curve: &[(f64, f64)], at: f64) -> f64 {
    let right = curve.partition_point(|point| point.0 < at);
    match (right.checked_sub(1).and_then(|left| curve.get(left)), curve.get(right)) {
        (Some(left), Some(right)) => left.1 + (right.1 - left.1) * ((at - left.0) / (right.0 - left.0)),
        (None, Some(one)) | (Some(one), None) => one.1,
        (None, None) => f64::NEG_INFINITY,
    }
}

/// The greatest value within `width` ahead of each place, from `width` before the function's first place to its last.
fn ahead(curve: &[(f64, f64)], width: f64) -> Curve {
    if width == 0.0 {
        return curve.to_vec();
    }
    // Corners that have entered the window, and corners that have left it behind.
    let (mut entered, mut left) = (0, 0);
    let mut result = Curve::with_capacity(3 * curve.len());
    // Corners in the window whose value no later one in it reaches, so that the first is the greatest.
    let mut corners: VecDeque<usize> = VecDeque::new();
    let mut from: Option<f64> = None;
    while left < curve.len() {
        let to = match curve.get(entered) {
            Some(next) if next.0 - width <= curve[left].0 => next.0 - width,
            _ => curve[left].0,
        };
        if let Some(from) = from {
            while corners.front().is_some_and(|front| *front < left) {
                corners.pop_front();
            }
            let mut lines: [Option<(f64, f64)>; 3] = [None; 3];
            lines[0] = corners.front().map(|front| (curve[*front].1, curve[*front].1));
            if left > 0 {
                lines[1] = Some(along(curve[left - 1], curve[left], from, to));
            }
            if let Some(next) = curve.get(entered)
                && entered > 0
            {
                lines[2] = Some(along(curve[entered - 1], *next, from + width, to + width));
            }
            envelope(&lines, from, to, &mut result);
        }
        while entered < curve.len() && curve[entered].0 - width <= to {
            while corners.back().is_some_and(|back| curve[*back].1 <= curve[entered].1) {
                corners.pop_back();
            }
            corners.push_back(entered);
            entered += 1;
        }
        while left < curve.len() && curve[left].0 <= to {
            left += 1;
        }
        from = Some(to);
    }
    straightened(result)
}

/// The values of a line through two points at two places.
fn along(one: (f64, f64), other: (f64, f64), from: f64, to: f64) -> (f64, f64) {
    let slope = (other.1 - one.1) / (other.0 - one.0);
    (one.1 + slope * (from - one.0), one.1 + slope * (to - one.0))
}

/// The upper envelope of up to three lines, given by their values at both ends.
fn envelope(lines: &[Option<(f64, f64)>; 3], from: f64, to: f64, into: &mut Curve) {
    let mut first = (f64::NEG_INFINITY, f64::NEG_INFINITY);
    for line in lines.iter().flatten() {
        if line.0 > first.0 || (line.0 == first.0 && line.1 > first.1) {
            first = *line;
        }
    }
    push(into, (from, first.0));
    // From the line that is greatest at the start to the one that crosses it first, and so on.
    let mut at = 0.0;
    loop {
        let mut next: Option<(f64, (f64, f64))> = None;
        for line in lines.iter().flatten().filter(|line| line.1 > first.1) {
            let (lag, lead) = (first.0 - line.0, line.1 - first.1);
            let share = (lag / (lag + lead)).clamp(at, 1.0);
            if next.is_none_or(|next| share < next.0 || (share == next.0 && line.1 > next.1.1)) {
                next = Some((share, *line));
            }
        }
        let Some((share, line)) = next else { break };
        push(into, (from + (to - from) * share, first.0 + (first.1 - first.0) * share));
        (at, first) = (share, line);
    }
    push(into, (to, first.1));
}

/// The greater of two functions where both are there, the one where only one is; their places overlap.
fn greater(one: &[(f64, f64)], other: &[(f64, f64)]) -> Curve {
    let mut result = Curve::with_capacity(2 * (one.len() + other.len()));
    // Corners of each that have been passed.
    let (mut i, mut j) = (0, 0);
    let mut from: Option<f64> = None;
    loop {
        let to = match (one.get(i), other.get(j)) {
            (Some(a), Some(b)) => a.0.min(b.0),
            (Some(a), None) => a.0,
            (None, Some(b)) => b.0,
            (None, None) => break,
        };
        let line = |curve: &[(f64, f64)], next: usize, from: f64| {
            (next > 0 && next < curve.len()).then(|| along(curve[next - 1], curve[next], from, to))
        };
        if let Some(from) = from {
            envelope(&[line(one, i, from), line(other, j, from), None], from, to, &mut result);
        }
        while one.get(i).is_some_and(|point| point.0 <= to) {
            i += 1;
        }
        while other.get(j).is_some_and(|point| point.0 <= to) {
            j += 1;
        }
        from = Some(to);
    }
    if result.is_empty() {
        result.push((one[0].0, one[0].1.max(other[0].1)));
    }
    straightened(result)
}

/// The part between two places; none if nothing is there.
fn cut(curve: &[(f64, f64)], from: f64, to: f64) -> Option<Curve> {
    let (from, to) = (from.max(curve[0].0), to.min(curve[curve.len() - 1].0));
    if from > to {
        return None;
    }
    let mut part = vec![(from, value_at(curve, from))];
    for point in curve.iter().filter(|point| point.0 > from && point.0 < to) {
        part.push(*point);
    }
    push(&mut part, (to, value_at(curve, to)));
    Some(part)
}

/// Adds a point if it lies beyond the last.
fn push(curve: &mut Curve, point: (f64, f64)) {
    match curve.last_mut() {
        Some(last) if point.0 <= last.0 => last.1 = last.1.max(point.1),
        _ => curve.push(point),
    }
}

/// Without the points that lie on the line between their neighbours.
fn straightened(curve: Curve) -> Curve {
    let scale = curve.iter().fold(0.0, |most: f64, point| most.max(point.1.abs()));
    let mut result: Curve = Vec::with_capacity(curve.len());
    for point in curve {
        while let [.., a, b] = result[..] {
            let on_line = a.1 + (point.1 - a.1) * ((b.0 - a.0) / (point.0 - a.0));
            if (on_line - b.1).abs() > ROUNDING * scale {
                break;
            }
            result.pop();
        }
        result.push(point);
    }
    result
}
