//! Placing labels: none may overlap another or leave its frame; the least important, which comes last, yields.

use super::shape::Point;
use crate::numeric::rising;

/// A rectangle taken by a text or a mark, px.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Patch {
    pub(super) x0: f64,
    pub(super) y0: f64,
    pub(super) x1: f64,
    pub(super) y1: f64,
}

impl Patch {
    pub(super) fn around((x, y): Point, r: f64) -> Self {
        Self { x0: x - r, y0: y - r, x1: x + r, y1: y + r }
    }

    pub(super) fn grown(self, by: f64) -> Self {
        Self { x0: self.x0 - by, y0: self.y0 - by, x1: self.x1 + by, y1: self.y1 + by }
    }

    pub(super) fn joined(self, other: Self) -> Self {
        Self {
            x0: self.x0.min(other.x0),
            y0: self.y0.min(other.y0),
            x1: self.x1.max(other.x1),
            y1: self.y1.max(other.y1),
        }
    }

    pub(super) fn overlaps(&self, other: &Self) -> bool {
        self.x0 < other.x1 && other.x0 < self.x1 && self.y0 < other.y1 && other.y0 < self.y1
    }

    pub(super) fn within(&self, other: &Self) -> bool {
        self.x0 >= other.x0 && self.x1 <= other.x1 && self.y0 >= other.y0 && self.y1 <= other.y1
    }

    pub(super) fn area(&self) -> (f64, f64, f64, f64) {
        (self.x0, self.y0, self.x1, self.y1)
    }
}

/// What is taken of a frame.
#[derive(Debug, Clone)]
pub(super) struct Placer {
    frame: Patch,
    taken: Vec<Patch>,
    /// Segments that labels keep clear of.
    lines: Vec<(Point, Point)>,
}

impl Placer {
    pub(super) fn new(frame: Patch) -> Self {
        Self { frame, taken: Vec::new(), lines: Vec::new() }
    }

    /// Whether a patch lies in the frame and overlaps nothing taken.
    pub(super) fn free(&self, patch: &Patch) -> bool {
        patch.within(&self.frame) && self.taken.iter().all(|t| !t.overlaps(patch))
    }

    /// Whether it is free and crossed by no line either.
    pub(super) fn clear(&self, patch: &Patch) -> bool {
        self.free(patch) && self.lines.iter().all(|(a, b)| super::shape::clip(*a, *b, patch.area()).is_none())
    }

    /// Whether a segment runs over something taken.
    pub(super) fn crossed(&self, a: Point, b: Point) -> bool {
        self.taken.iter().any(|t| super::shape::clip(a, b, t.area()).is_some())
    }

    pub(super) fn take(&mut self, patch: Patch) {
        self.taken.push(patch);
    }

    /// A line that labels keep clear of.
    pub(super) fn avoid(&mut self, line: &[Point]) {
        self.lines.extend(
            line.windows(2).map(|w| (w[0], w[1])).filter(|(a, b)| (a.0 + a.1 + b.0 + b.1).is_finite()),
        );
    }

    /// Takes the first free patch, with 2 px around it.
    pub(super) fn first_free(&mut self, patches: &[Patch]) -> Option<usize> {
        let index = patches.iter().position(|p| self.free(p))?;
        self.take(patches[index].grown(2.0));
        Some(index)
    }

    /// Takes the first patch that is free and crossed by no line, or else the first free one.
    pub(super) fn first_clear(&mut self, patches: &[Patch]) -> Option<usize> {
        let Some(index) = patches.iter().position(|p| self.clear(p)) else {
            return self.first_free(patches);
        };
        self.take(patches[index].grown(2.0));
        Some(index)
    }
}

/// Positions moved apart to at least `gap`, in their order, kept within the two ends as far as they fit.
pub(super) fn spread(wanted: &[f64], gap: f64, (low, high): (f64, f64)) -> Vec<f64> {
    let order = rising(wanted);
    let mut placed = wanted.to_vec();
    let mut least = low;
    for &i in &order {
        placed[i] = placed[i].max(least);
        least = placed[i] + gap;
    }
    let mut most = high;
    for &i in order.iter().rev() {
        placed[i] = placed[i].min(most);
        most = placed[i] - gap;
    }
    placed
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn labels_move_apart_and_stay_inside() {
        assert_eq!(spread(&[10.0, 11.0, 12.0], 10.0, (0.0, 25.0)), vec![5.0, 15.0, 25.0]);
    }

    #[test]
    fn the_least_important_yields() {
        let mut placer = Placer::new(Patch { x0: 0.0, y0: 0.0, x1: 20.0, y1: 10.0 });
        let patch = Patch { x0: 1.0, y0: 1.0, x1: 19.0, y1: 9.0 };
        assert_eq!(placer.first_free(&[patch]), Some(0));
        assert_eq!(placer.first_free(&[patch]), None);
    }

    #[test]
    fn a_line_is_avoided_where_there_is_room() {
        let mut placer = Placer::new(Patch { x0: 0.0, y0: 0.0, x1: 100.0, y1: 100.0 });
        placer.avoid(&[(0.0, 5.0), (100.0, 5.0)]);
        let on = Patch { x0: 10.0, y0: 0.0, x1: 30.0, y1: 10.0 };
        let off = Patch { x0: 10.0, y0: 20.0, x1: 30.0, y1: 30.0 };
        assert_eq!(placer.first_clear(&[on, off]), Some(1));
    }

    proptest! {
        #[test]
        fn spread_labels_never_overlap(wanted in prop::collection::vec(0.0..300.0_f64, 0..10)) {
            let mut placed = spread(&wanted, 17.0, (0.0, 300.0));
            placed.sort_by(f64::total_cmp);
            for pair in placed.windows(2) {
                prop_assert!(pair[1] - pair[0] > 17.0 - 1e-9);
            }
        }
    }
}
