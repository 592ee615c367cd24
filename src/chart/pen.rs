//! The pen: lines, areas, hatches, texts and marks in px, over any plotters backend.
//!
//! Plotters' backends take whole coordinates and widths, so the pen draws at [`FINE`] steps per px and the surface is
//! scaled once: an SVG by its view box, a canvas by its transform. Text is placed by fixed metrics; a backend's own
//! measure of text is never asked.

use plotters_backend::text_anchor::HPos;
use plotters_backend::{BackendColor, BackendCoord};

use super::label::{Patch, Placer};
use super::metrics;
use super::palette::{Palette, Rgb};
use super::shape::{self, Lie, Point};
use super::surface::{Drawn, Letters, Surface};
use crate::fault::{Fault, Result};

/// Steps of a surface's coordinates per px. The context of a canvas must be scaled by `devicePixelRatio / FINE`.
pub const FINE: f64 = 20.0;

/// Size of ticks and axis titles, px.
pub(super) const TICK: f64 = 13.0;
/// Size of labels in pictures, px.
pub(super) const LABEL: f64 = 14.0;
/// Typefaces, the one that the metrics are of first.
pub(super) const FAMILY: &str =
    "'Source Sans 3', 'Segoe UI', 'Noto Sans', 'Liberation Sans', Arial, sans-serif";
/// Opacity that marks a text to be outlined in its own colour, on surfaces that can (see [`super::surface::Backend::OUTLINES`]).
pub(super) const OUTLINED: f64 = 0.999;

/// A line's colour, opacity and width (px).
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Ink {
    pub(super) colour: Rgb,
    pub(super) alpha: f64,
    pub(super) width: f64,
}

impl Ink {
    pub(super) fn new(colour: Rgb, width: f64) -> Self {
        Self { colour, alpha: 1.0, width }
    }

    pub(super) fn faint(self, alpha: f64) -> Self {
        Self { alpha, ..self }
    }
}

/// How a text looks and where it stands to its point.
#[derive(Clone, Copy)]
pub(super) struct Text {
    pub(super) size: f64,
    pub(super) bold: bool,
    colour: Rgb,
    pub(super) anchor: HPos,
    halo: bool,
}

impl Text {
    pub(super) fn tick(palette: &Palette) -> Self {
        Self { size: TICK, bold: false, colour: palette.muted, anchor: HPos::Left, halo: false }
    }

    pub(super) fn label(colour: Rgb) -> Self {
        Self { size: LABEL, bold: false, colour, anchor: HPos::Left, halo: true }
    }

    pub(super) fn bold(self) -> Self {
        Self { bold: true, ..self }
    }

    pub(super) fn bold_if(self, bold: bool) -> Self {
        Self { bold, ..self }
    }

    pub(super) fn middle(self) -> Self {
        Self { anchor: HPos::Center, ..self }
    }

    pub(super) fn end(self) -> Self {
        Self { anchor: HPos::Right, ..self }
    }

    /// Width of a text, px.
    pub(super) fn width(&self, text: &str) -> f64 {
        metrics::width(text, self.size, self.bold)
    }

    /// The patch that a text takes with its baseline at a point: from the height of capitals to the descenders.
    pub(super) fn patch(&self, (x, y): Point, text: &str) -> Patch {
        let width = self.width(text);
        let x0 = match self.anchor {
            HPos::Left => x,
            HPos::Center => x - width / 2.0,
            HPos::Right => x - width,
        };
        Patch { x0, y0: y - 0.72 * self.size, x1: x0 + width, y1: y + 0.22 * self.size }
    }
}

/// The pen over a surface. It keeps the first failure and reports it when lifted.
pub(super) struct Pen<'p> {
    surface: &'p mut dyn Surface,
    pub(super) palette: &'p Palette,
    pub(super) width: f64,
    failed: Option<String>,
}

impl<'p> Pen<'p> {
    /// Takes a surface of a size in px and lays the paper.
    pub(super) fn new(surface: &'p mut dyn Surface, size: (u32, u32), palette: &'p Palette) -> Self {
        let (width, height) = (f64::from(size.0), f64::from(size.1));
        let mut pen = Self { surface, palette, width, failed: None };
        let prepared = pen.surface.ready();
        pen.note(prepared);
        pen.rect((0.0, 0.0, width, height), palette.paper, 1.0);
        pen
    }

    /// Ends the picture.
    pub(super) fn lift(mut self) -> Result<()> {
        let presented = self.surface.show();
        self.note(presented);
        match self.failed {
            None => Ok(()),
            Some(why) => Err(Fault::new(
                format!("a picture could not be drawn: {why}"),
                "picture",
                "Reload the page; the table behind the picture holds the same numbers.",
            )),
        }
    }

    fn note(&mut self, drawn: Drawn) {
        if let (Err(error), None) = (drawn, &self.failed) {
            self.failed = Some(error);
        }
    }

    /// A line through points; a point that is no number lifts the pen, and a point alone is a dot.
    pub(super) fn line(&mut self, points: &[Point], ink: Ink) {
        for run in shape::runs(points) {
            if let [alone] = run {
                self.dot(*alone, ink.width.max(1.5), ink.colour, ink.alpha);
            } else {
                let points: Vec<BackendCoord> = run.iter().map(|&p| coord(p)).collect();
                let width = fine(ink.width).max(1).unsigned_abs();
                let drawn = self.surface.path(&points, backend_colour(ink.colour, ink.alpha), width);
                self.note(drawn);
            }
        }
    }

    /// A level line, on the middle of its row of px so that it is crisp.
    pub(super) fn level(&mut self, x0: f64, x1: f64, y: f64, ink: Ink) {
        let y = crisp(y);
        self.line(&[(x0, y), (x1, y)], ink);
    }

    /// An upright line, on the middle of its column of px.
    pub(super) fn upright(&mut self, x: f64, y0: f64, y1: f64, ink: Ink) {
        let x = crisp(x);
        self.line(&[(x, y0), (x, y1)], ink);
    }

    /// A line cut into dashes (drawn, left out, ...), px.
    pub(super) fn dashed(&mut self, points: &[Point], ink: Ink, pattern: &[f64]) {
        // Cut to the page first, so that a line to far outside is not dashed all the way.
        let page = (-20.0, -20.0, self.width + 20.0, 1e4);
        for run in shape::runs(points) {
            for visible in shape::clip_line(run, page) {
                for (part, _) in shape::dashes(&visible, pattern) {
                    self.line(&part, ink);
                }
            }
        }
    }

    /// A filled area.
    pub(super) fn fill(&mut self, area: &[Point], colour: Rgb, alpha: f64) {
        if area.len() < 3 || area.iter().any(|p| !(p.0.is_finite() && p.1.is_finite())) {
            return;
        }
        let points: Vec<BackendCoord> = area.iter().map(|&p| coord(p)).collect();
        let drawn = self.surface.polygon(&points, backend_colour(colour, alpha));
        self.note(drawn);
    }

    /// A filled rectangle (left, top, right, bottom).
    pub(super) fn rect(&mut self, (x0, y0, x1, y1): (f64, f64, f64, f64), colour: Rgb, alpha: f64) {
        if (x0 + y0 + x1 + y1).is_finite() && x1 > x0 && y1 > y0 {
            let drawn =
                self.surface.rectangle((coord((x0, y0)), coord((x1, y1))), backend_colour(colour, alpha));
            self.note(drawn);
        }
    }

    /// Hatches areas with clipped lines in page coordinates.
    pub(super) fn hatch(&mut self, areas: &[Vec<Point>], lie: Lie, step: f64, ink: Ink) {
        for line in shape::hatch(areas, lie, step) {
            self.line(&line, ink);
        }
    }

    /// Fill and water lining of a surplus.
    pub(super) fn water(&mut self, areas: &[Vec<Point>]) {
        for area in areas {
            self.fill(area, self.palette.surplus_fill, 1.0);
        }
        self.lining(areas, 0.45);
    }

    /// Water lining alone.
    pub(super) fn lining(&mut self, areas: &[Vec<Point>], alpha: f64) {
        self.hatch(areas, Lie::Level, 5.0, Ink::new(self.palette.surplus, 0.7).faint(alpha));
    }

    /// Fill and ground hatch of a deficit.
    pub(super) fn ground(&mut self, areas: &[Vec<Point>]) {
        for area in areas {
            self.fill(area, self.palette.deficit_fill, 1.0);
        }
        self.hatch(areas, Lie::Rising, 6.0, Ink::new(self.palette.deficit, 0.8).faint(0.8));
    }

    /// A filled circle.
    pub(super) fn dot(&mut self, centre: Point, radius: f64, colour: Rgb, alpha: f64) {
        if (centre.0 + centre.1).is_finite() {
            let drawn = self.surface.circle(
                coord(centre),
                fine(radius).unsigned_abs(),
                backend_colour(colour, alpha),
            );
            self.note(drawn);
        }
    }

    /// A text with its baseline at a point.
    pub(super) fn text(&mut self, at: Point, text: &str, look: Text) {
        if text.is_empty() || !(at.0 + at.1).is_finite() {
            return;
        }
        // The face has no narrow no-break space; nothing breaks in a picture.
        let text = text.replace('\u{202f}', "\u{2009}");
        if look.halo {
            let paper = Text { colour: self.palette.paper, ..look };
            if self.surface.outlines() {
                self.write(at, &text, paper, OUTLINED);
            } else {
                for (dx, dy) in [
                    (2.0, 0.0),
                    (-2.0, 0.0),
                    (0.0, 2.0),
                    (0.0, -2.0),
                    (1.4, 1.4),
                    (-1.4, 1.4),
                    (1.4, -1.4),
                    (-1.4, -1.4),
                ] {
                    self.write((at.0 + dx, at.1 + dy), &text, paper, 1.0);
                }
            }
        }
        self.write(at, &text, look, 1.0);
    }

    /// A text at the first of some places where it covers nothing and no line crosses it, or else the first free one;
    /// nowhere if there is none.
    pub(super) fn text_at(&mut self, placer: &mut Placer, places: &[(Point, &str)], look: Text) {
        let patches: Vec<Patch> = places.iter().map(|(at, text)| look.patch(*at, text)).collect();
        if let Some((at, text)) = placer.first_clear(&patches).and_then(|i| places.get(i)) {
            self.text(*at, text, look);
        }
    }

    fn write(&mut self, at: Point, text: &str, look: Text, alpha: f64) {
        let letters = Letters { text: look, colour: backend_colour(look.colour, alpha) };
        let drawn = self.surface.letters(at, text, &letters);
        self.note(drawn);
    }

    /// Ink of an axis.
    pub(super) fn axis_ink(&self) -> Ink {
        Ink::new(self.palette.ink, self.palette.pens.thin)
    }

    /// Ink of a grid line.
    pub(super) fn grid_ink(&self) -> Ink {
        Ink::new(self.palette.grid, self.palette.pens.thin)
    }

    /// Ink of a hairline.
    pub(super) fn hair_ink(&self) -> Ink {
        Ink::new(self.palette.rule_strong, self.palette.pens.hair)
    }

    /// Ink of a dimension.
    pub(super) fn dimension_ink(&self) -> Ink {
        Ink::new(self.palette.ink, 1.1 * self.palette.pens.thin)
    }

    /// A dotted line from one point to another.
    pub(super) fn dotted(&mut self, a: Point, b: Point) {
        self.dashed(&[a, b], Ink::new(self.palette.ink, 0.9), &[1.0, 3.0]);
    }

    /// The oblique tick of a dimension line, `2 r` px high.
    pub(super) fn tick(&mut self, (x, y): Point, r: f64) {
        self.line(&[(x - r, y + r), (x + r, y - r)], self.dimension_ink());
    }

    /// A level dimension; an end that runs past the frame has no tick.
    pub(super) fn across(&mut self, (x0, open0): (f64, bool), (x1, open1): (f64, bool), y: f64) {
        let y = crisp(y);
        let reach = |open: bool| if open { 0.0 } else { 3.0 };
        self.line(&[(x0 - reach(open0), y), (x1 + reach(open1), y)], self.dimension_ink());
        for (x, open) in [(x0, open0), (x1, open1)] {
            if !open {
                self.tick((x, y), 4.0);
            }
        }
    }

    /// An upright dimension.
    pub(super) fn upwards(&mut self, x: f64, y0: f64, y1: f64) {
        let x = crisp(x);
        self.line(&[(x, y0 - 3.0), (x, y1 + 3.0)], self.dimension_ink());
        self.tick((x, y0), 4.0);
        self.tick((x, y1), 4.0);
    }

    /// A leader from a label to the thing named, ending in a dot on it.
    pub(super) fn leader(&mut self, from: Point, to: Point) {
        self.line(&[from, to], self.hair_ink());
        self.dot(to, 1.6, self.palette.ink, 1.0);
    }

    /// Says that there is nothing to draw, in the middle of a frame.
    pub(super) fn nothing(&mut self, (x0, y0, x1, y1): (f64, f64, f64, f64)) {
        let at = (f64::midpoint(x0, x1), f64::midpoint(y0, y1) + 5.0);
        self.text(at, "no data here", Text::label(self.palette.muted).middle());
    }
}

/// The middle of the row or column of px that holds a position.
pub(super) fn crisp(at: f64) -> f64 {
    libm::floor(at) + 0.5
}

pub(super) fn fine(px: f64) -> i32 {
    // Far outside every picture, and still far from the ends of the type.
    libm::round(px.clamp(-1e5, 1e5) * FINE) as i32
}

/// The size that a picture is laid out for: at least one in which its parts have room.
pub(super) fn roomy((width, height): (u32, u32)) -> (u32, u32) {
    (width.max(240), height.max(160))
}

pub(super) fn coord((x, y): Point) -> BackendCoord {
    (fine(x), fine(y))
}

fn backend_colour(Rgb(r, g, b): Rgb, alpha: f64) -> BackendColor {
    BackendColor { alpha, rgb: (r, g, b) }
}
