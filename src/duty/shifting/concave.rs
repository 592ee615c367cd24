//! The plan where every step is concave: pieces sorted by slope.
//!
//! The value of the level at a step's start, V, comes from that at its end by shifting: the pieces get one of slope "buy" as long as
//! the step can charge, and one of slope "sell" as long as it can discharge; the left end moves left by the former; lengths grow by
//! the self-discharge; both ends are cut back to empty and full. Before that, two levels of the end's value tell what to do: where
//! charging stops paying, and where discharging does.
//!
//! All pieces that will ever be inserted are known beforehand, so their places in the order are too: a piece is a place in a tree
//! of lengths, and a step costs a few walks through it.

use super::tree::Lengths;
use super::{Slopes, Span, Terms};

/// Lengths are kept without the growth by self-discharge; beyond this factor it is worked into them.
const LARGEST_SCALE: f64 = 1e100;

/// With less than this left of the stored energy after a step, nothing can be shifted.
const NOTHING_KEPT: f64 = 1e-12;

/// Levels after each step, or none if the aim cannot be reached from the start.
pub(super) fn plan(span: &Span<'_>, store: &Terms, start: f64, aim: Option<f64>) -> Option<Vec<f64>> {
    let steps = span.len();
    if store.leak.keep < NOTHING_KEPT {
        let reached = aim.is_none_or(|aim| aim <= 0.0);
        return reached.then(|| vec![0.0; steps]);
    }
    let order = Order::of(span, store);
    let mut pieces = Lengths::new(2 * steps + 1);
    let (mut left, mut scale) = (0.0, 1.0);
    match aim {
        Some(aim) => left = aim,
        None => pieces.set(order.place_of(2 * steps), store.energy),
    }
    let mut stops = vec![(f64::NAN, f64::NAN); steps];
    for k in (0..steps).rev() {
        if span.price(k).is_some() {
            let (buy, sell) = (order.place_of(2 * k), order.place_of(2 * k + 1));
            // Pieces of equal slope: charging stops before them, discharging after them.
            let to_charge = left + scale * pieces.before(order.first_equal(buy));
            let to_keep = left + scale * pieces.before(order.past_equal(sell));
            stops[k] = (to_charge, to_keep);
            pieces.set(buy, store.most_in / scale);
            pieces.set(sell, store.most_out / scale);
            left -= store.most_in;
        }
        left /= store.leak.keep;
        scale /= store.leak.keep;
        if scale > LARGEST_SCALE {
            pieces.scale(scale);
            scale = 1.0;
        }
        while left < 0.0 {
            let Some(place) = pieces.first() else { break };
            let length = scale * pieces.at(place);
            if length <= -left {
                pieces.set(place, 0.0);
                left += length;
            } else {
                pieces.set(place, (length + left) / scale);
                left = 0.0;
            }
        }
        let mut over = left + scale * pieces.total() - store.energy;
        while over > 0.0 {
            let Some(place) = pieces.last() else { break };
            let length = scale * pieces.at(place);
            if length <= over {
                pieces.set(place, 0.0);
            } else {
                pieces.set(place, (length - over) / scale);
            }
            over -= length;
        }
    }
    // Levels outside what is left of the pieces cannot reach the aim; a rounding of the capacity is let pass.
    let slack = 1e-9 * store.energy.max(1e-9);
    if start < left - slack || start > left + scale * pieces.total() + slack {
        return None;
    }
    let mut level = start;
    Some(
        stops
            .iter()
            .map(|(to_charge, to_keep)| {
                let kept = store.leak.keep * level;
                level = if kept < *to_charge {
                    to_charge.min(kept + store.most_in)
                } else if kept > *to_keep {
                    to_keep.max(kept - store.most_out)
                } else {
                    kept
                }
                .clamp(0.0, store.energy);
                level
            })
            .collect(),
    )
}

/// The order of all pieces by falling slope, as each will be when a later step meets it: self-discharge makes slopes fall by the
/// same factor in every step backwards, so they are compared as they would be at the end of the record.
struct Order {
    /// Place of piece 2k (buying in step k), 2k + 1 (selling) and the last (what is left at the end, worth nothing).
    places: Vec<u32>,
    /// Keys in the order of the places.
    keys: Vec<(f64, f64)>,
}

impl Order {
    fn of(span: &Span<'_>, store: &Terms) -> Self {
        let steps = span.len();
        let mut pieces: Vec<((f64, f64), u32)> = Vec::with_capacity(2 * steps + 1);
        for k in 0..steps {
            let slopes = span.price(k).map_or(Slopes { buy: 0.0, sell: 0.0 }, |price| store.slopes(price));
            // The growth forwards of a slope met k steps later, as a logarithm: it may exceed what a double holds.
            let growth = (store.decay > 0.0).then_some(store.decay * k as f64);
            pieces.push((key(slopes.buy, growth), 2 * k as u32));
            pieces.push((key(slopes.sell, growth), 2 * k as u32 + 1));
        }
        pieces.push(((0.0, 0.0), 2 * steps as u32));
        // Falling slopes; equal ones by their number, so that the order is one.
        pieces.sort_unstable_by(|a, b| {
            b.0.0.total_cmp(&a.0.0).then(b.0.1.total_cmp(&a.0.1)).then(a.1.cmp(&b.1))
        });
        let mut places = vec![0; pieces.len()];
        for (place, (_, piece)) in pieces.iter().enumerate() {
            places[*piece as usize] = place as u32;
        }
        Self { places, keys: pieces.into_iter().map(|(key, _)| key).collect() }
    }

    fn place_of(&self, piece: usize) -> usize {
        self.places[piece] as usize
    }

    /// The first place of the same slope.
    fn first_equal(&self, place: usize) -> usize {
        let key = self.keys[place];
        self.keys.partition_point(|other| above(*other, key))
    }

    /// The place after the last of the same slope.
    fn past_equal(&self, place: usize) -> usize {
        let key = self.keys[place];
        self.keys.partition_point(|other| !above(key, *other))
    }
}

/// Whether a slope is greater than another, by their keys.
fn above(one: (f64, f64), other: (f64, f64)) -> bool {
    one.0 > other.0 || (one.0 == other.0 && one.1 > other.1)
}

/// A slope (times exp(-growth)) as a key that keeps the order: its sign, then its size, growing with the slope.
fn key(slope: f64, growth: Option<f64>) -> (f64, f64) {
    if slope == 0.0 {
        return (0.0, 0.0);
    }
    let Some(growth) = growth else { return (slope.signum(), slope) };
    let size = libm::log(slope.abs()) - growth;
    (slope.signum(), size * slope.signum())
}
