//! Names of the kinds on the plane: each beside its strand with a leader, where it covers least and crosses nothing.

use super::data::Strand;
use super::frame::{Frame, Spot};
use super::label::{Patch, Placer};
use super::pen::{Pen, Text};
use super::plane::name_of;
use super::shape::{self, Point};

/// A kind with the visible part of its typical curve, from the top.
pub(super) struct Named<'d> {
    pub(super) strand: &'d Strand,
    pub(super) line: Vec<Point>,
}

/// Side of a cell of the ground on which curves are counted, px.
const CELL: f64 = 5.0;
/// Cost at which a name that is not a candidate's yields: it would cover the drawing and help nobody.
const DEAREST: f64 = 420.0;

/// How much of each cell is covered by typical curves.
struct Cover {
    columns: usize,
    cells: Vec<u8>,
    origin: Point,
}

impl Cover {
    fn new(frame: &Frame, named: &[Named<'_>]) -> Self {
        const TYPICAL: u8 = 4;
        let (x0, y0, x1, y1) = frame.plot;
        let count = |a: f64, b: f64| ((b - a) / CELL).max(1.0) as usize + 1;
        let (columns, rows) = (count(x0, x1), count(y0, y1));
        let mut cover = Self { columns, cells: vec![0; columns * rows], origin: (x0, y0) };
        let px = |c: &[(f64, f64)]| c.iter().map(|&(e, p)| frame.px(e, p)).collect::<Vec<Point>>();
        let faint = named.iter().flat_map(|n| &n.strand.others).map(|c| (px(c), 1));
        for (line, weight) in faint.chain(named.iter().map(|n| (n.line.clone(), TYPICAL))) {
            for run in shape::clip_line(&line, frame.plot) {
                for (part, _) in shape::dashes(&run, &[CELL * 0.5, CELL * 0.5]) {
                    if let Some(cell) = cover.index(part[0]).and_then(|i| cover.cells.get_mut(i)) {
                        *cell = (*cell).max(weight);
                    }
                }
            }
        }
        cover
    }

    fn index(&self, (x, y): Point) -> Option<usize> {
        let (column, row) = ((x - self.origin.0) / CELL, (y - self.origin.1) / CELL);
        (column >= 0.0 && row >= 0.0 && (column as usize) < self.columns)
            .then(|| row as usize * self.columns + column as usize)
    }

    /// Covered cells under a patch.
    fn under(&self, patch: &Patch) -> u32 {
        let mut sum = 0;
        let mut y = patch.y0;
        while y <= patch.y1 + CELL {
            let mut x = patch.x0;
            while x <= patch.x1 + CELL {
                let cell = self.index((x.min(patch.x1), y.min(patch.y1))).and_then(|i| self.cells.get(i));
                sum += u32::from(cell.copied().unwrap_or(0));
                x += CELL;
            }
            y += CELL;
        }
        sum
    }

    /// Covered cells along a segment, but for its last few px, where it meets the thing named.
    fn along(&self, a: Point, b: Point) -> u32 {
        let length = libm::hypot(b.0 - a.0, b.1 - a.1);
        let steps = ((length - 7.0) / CELL).max(0.0) as usize;
        (0..steps)
            .map(|k| k as f64 * CELL / length)
            .filter_map(|s| self.index((a.0 + s * (b.0 - a.0), a.1 + s * (b.1 - a.1))))
            .filter_map(|i| self.cells.get(i))
            .map(|c| u32::from(*c))
            .sum()
    }
}

/// A place for a name: its baseline's left end, the leader's start, and the point on the strand.
#[derive(Clone, Copy)]
struct Place {
    at: Point,
    from: Point,
    to: Point,
    /// Cost of a point on the faded or lower part of the strand.
    low: f64,
}

/// Draws the names, the most important first; a kind that finds no place stays without.
pub(super) fn draw(
    pen: &mut Pen<'_>,
    frame: &Frame,
    named: &[Named<'_>],
    taken: &[Patch],
    lines: &[Vec<Point>],
) -> Vec<Spot> {
    let (x0, y0, x1, y1) = frame.plot;
    let mut placer = Placer::new(Patch { x0: x0 + 3.0, y0: y0 + 1.0, x1: x1 - 1.0, y1: y1 - 4.0 });
    for patch in taken {
        placer.take(*patch);
    }
    for line in lines {
        placer.avoid(line);
    }
    let cover = Cover::new(frame, named);
    let mut leaders: Vec<(Point, Point)> = Vec::new();
    let mut chosen = Vec::new();
    for kind in named {
        let text = name_of(kind.strand);
        let colour = kind.strand.candidate.map_or(pen.palette.ink, |c| pen.palette.candidate_text(c));
        let look = Text::label(colour).bold_if(kind.strand.candidate.is_some());
        let mut best: Option<(f64, Place, Patch)> = None;
        let limit = if kind.strand.candidate.is_some() { f64::INFINITY } else { DEAREST };
        for place in places(&kind.line, look.width(&text), (x0, x1)) {
            let length = libm::hypot(place.from.0 - place.to.0, place.from.1 - place.to.1);
            let steep = (place.from.1 - place.to.1).abs() / length.max(1.0);
            let own = 0.6 * length + 14.0 * (steep - 0.6).max(0.0) + place.low;
            if own >= best.as_ref().map_or(limit, |(least, ..)| *least) {
                continue;
            }
            let patch = look.patch(place.at, &text).grown(2.0);
            if !placer.clear(&patch)
                || leaders.iter().any(|(a, b)| shape::clip(*a, *b, patch.area()).is_some())
                || leaders.iter().any(|(a, b)| cross(*a, *b, place.from, place.to))
                || placer.crossed(place.from, place.to)
            {
                continue;
            }
            let cost = own
                + 3.5 * f64::from(cover.under(&patch))
                + 2.2 * f64::from(cover.along(place.from, place.to));
            if cost < limit && best.as_ref().is_none_or(|(least, ..)| cost < *least) {
                best = Some((cost, place, patch));
            }
        }
        if let Some((_, place, patch)) = best {
            placer.take(patch.grown(1.0));
            leaders.push((place.from, place.to));
            chosen.push((place, patch, text, look, kind.strand));
        }
    }
    // Leaders below all names, so that none is struck through.
    for (place, ..) in &chosen {
        pen.leader(place.from, place.to);
    }
    let mut spots = Vec::new();
    for (place, patch, text, look, strand) in chosen {
        pen.text(place.at, &text, look);
        spots.push(Spot { name: strand.technology.clone(), area: patch.area() });
    }
    spots
}

/// Places to try around a curve: at heights down its upper half and its lower part, above and to either side, near and
/// far. `ends` are the frame's left and right.
fn places(line: &[Point], wide: f64, ends: (f64, f64)) -> Vec<Place> {
    let (top, bottom) = (line[0].1, line[line.len() - 1].1);
    let mut places = Vec::new();
    for (share, low) in
        [(0.12, 8.0), (0.18, 2.0), (0.25, 0.0), (0.33, 0.0), (0.42, 4.0), (0.55, 14.0), (0.7, 26.0)]
    {
        let y = top + share * (bottom - top);
        let Some(to) = line.windows(2).find_map(|w| {
            let (a, b) = (w[0], w[1]);
            (a.1 <= y && y <= b.1 && b.1 > a.1).then(|| (a.0 + (y - a.1) / (b.1 - a.1) * (b.0 - a.0), y))
        }) else {
            continue;
        };
        // Above it, moved sideways where it would leave the frame.
        for up in [24.0, 40.0, 60.0, 85.0, 115.0, 150.0] {
            for part in [0.5, 0.2, 0.8] {
                let base = to.1 - up;
                let left = (to.0 - part * wide).clamp(ends.0 + 5.0, (ends.1 - 4.0 - wide).max(ends.0 + 5.0));
                let from = (to.0.clamp(left + 2.0, left + wide - 2.0), base + 5.0);
                places.push(Place { at: (left, base), from, to, low });
            }
        }
        for out in [14.0, 30.0, 55.0, 85.0, 120.0, 165.0, 220.0, 290.0] {
            for up in [0.0, 16.0, -16.0, 34.0, -34.0, 58.0, -58.0, 90.0, -90.0, 130.0, -130.0] {
                let base = to.1 - up + 4.5;
                places.push(Place { at: (to.0 + out + 5.0, base), from: (to.0 + out, base - 4.5), to, low });
                places.push(Place {
                    at: (to.0 - out - 5.0 - wide, base),
                    from: (to.0 - out, base - 4.5),
                    to,
                    low,
                });
            }
        }
    }
    places
}

/// Whether two segments cross.
fn cross(a: Point, b: Point, c: Point, d: Point) -> bool {
    let side = |p: Point, q: Point, r: Point| (q.0 - p.0) * (r.1 - p.1) - (q.1 - p.1) * (r.0 - p.0);
    side(a, b, c) * side(a, b, d) < 0.0 && side(c, d, a) * side(c, d, b) < 0.0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn segments_cross_only_where_they_do() {
        assert!(cross((0.0, 0.0), (2.0, 2.0), (0.0, 2.0), (2.0, 0.0)));
        assert!(!cross((0.0, 0.0), (1.0, 1.0), (0.0, 2.0), (0.9, 1.1)));
    }

    #[test]
    fn a_curve_without_height_has_no_place() {
        assert!(places(&[(0.0, 5.0), (9.0, 5.0)], 40.0, (0.0, 100.0)).is_empty());
    }
}
