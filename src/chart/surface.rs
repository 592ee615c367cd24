//! What a picture is drawn on: plotters' backends, behind calls that no longer know which.

use plotters_backend::text_anchor::{Pos, VPos};
use plotters_backend::{
    BackendColor, BackendCoord, BackendStyle, BackendTextStyle, DrawingBackend, DrawingErrorKind, FontFamily,
    FontStyle,
};

use super::pen::{FAMILY, FINE, Text, coord, fine};

/// A backend, with what plotters leaves open about text: its size and where it stands.
pub trait Backend: DrawingBackend {
    /// By what the backend divides the size of a font.
    const SHRINKS: f64;
    /// The upright anchor to ask for.
    const STANDS: VPos;
    /// Height of that anchor above the baseline, em.
    const RISE: f64;
    /// Whether texts drawn at the opacity of the halo are outlined afterwards; otherwise the pen draws them eight times.
    const OUTLINES: bool;
}

impl Backend for plotters::backend::SVGBackend<'_> {
    // It writes fonts 1.24 times smaller than asked, and the top anchor as a shift of 0.76 em.
    const SHRINKS: f64 = 1.24;
    const STANDS: VPos = VPos::Top;
    const RISE: f64 = 0.76;
    const OUTLINES: bool = true;
}

#[cfg(feature = "page")]
impl Backend for plotters_canvas::CanvasBackend {
    // The middle of the em box of this face lies 0.219 em above the baseline (ascent 1024, descent 400, scaled to 1000).
    const SHRINKS: f64 = 1.0;
    const STANDS: VPos = VPos::Center;
    const RISE: f64 = 0.219;
    const OUTLINES: bool = false;
}

/// What a picture is drawn on: a [`Backend`] behind calls that no longer know which, so that the pictures are in the program once
/// and not once for each backend. A failure comes back in words.
pub trait Surface {
    /// Readies the backend.
    fn ready(&mut self) -> Drawn;
    /// Shows what was drawn.
    fn show(&mut self) -> Drawn;
    /// A line through points, its width in the backend's steps.
    fn path(&mut self, points: &[BackendCoord], colour: BackendColor, width: u32) -> Drawn;
    /// A filled polygon.
    fn polygon(&mut self, points: &[BackendCoord], colour: BackendColor) -> Drawn;
    /// A filled rectangle between two corners.
    fn rectangle(&mut self, corners: (BackendCoord, BackendCoord), colour: BackendColor) -> Drawn;
    /// A filled circle.
    fn circle(&mut self, centre: BackendCoord, radius: u32, colour: BackendColor) -> Drawn;
    /// A text with its baseline at a point (px).
    fn letters(&mut self, at: (f64, f64), text: &str, look: &Letters) -> Drawn;
    /// See [`Backend::OUTLINES`].
    fn outlines(&self) -> bool;
}

/// Whether something was drawn; if not, why.
pub type Drawn = Result<(), String>;

/// A backend as a [`Surface`].
#[derive(Debug)]
pub struct Over<B>(pub B);

/// A line's style in the backend's own steps.
struct Stroke(BackendColor, u32);

impl BackendStyle for Stroke {
    fn color(&self) -> BackendColor {
        self.0
    }

    fn stroke_width(&self) -> u32 {
        self.1
    }
}

fn worded<E: std::error::Error + Send + Sync>(drawn: Result<(), DrawingErrorKind<E>>) -> Drawn {
    drawn.map_err(|error| error.to_string())
}

impl<B: Backend> Surface for Over<B> {
    fn ready(&mut self) -> Drawn {
        worded(self.0.ensure_prepared())
    }

    fn show(&mut self) -> Drawn {
        worded(self.0.present())
    }

    fn path(&mut self, points: &[BackendCoord], colour: BackendColor, width: u32) -> Drawn {
        worded(self.0.draw_path(points.iter().copied(), &Stroke(colour, width)))
    }

    fn polygon(&mut self, points: &[BackendCoord], colour: BackendColor) -> Drawn {
        worded(self.0.fill_polygon(points.iter().copied(), &colour))
    }

    fn rectangle(&mut self, corners: (BackendCoord, BackendCoord), colour: BackendColor) -> Drawn {
        worded(self.0.draw_rect(corners.0, corners.1, &colour, true))
    }

    fn circle(&mut self, centre: BackendCoord, radius: u32, colour: BackendColor) -> Drawn {
        worded(self.0.draw_circle(centre, radius, &colour, true))
    }

    fn letters(&mut self, (x, y): (f64, f64), text: &str, look: &Letters) -> Drawn {
        let style = Type { text: look.text, shrinks: B::SHRINKS, stands: B::STANDS, colour: look.colour };
        worded(self.0.draw_text(text, &style, coord((x, y - B::RISE * look.text.size))))
    }

    fn outlines(&self) -> bool {
        B::OUTLINES
    }
}

/// How a text is drawn on a [`Surface`].
#[derive(Clone, Copy)]
#[allow(missing_debug_implementations, reason = "plotters' colours and anchors have none")]
pub struct Letters {
    pub(super) text: Text,
    pub(super) colour: BackendColor,
}

/// A text as the backend takes it.
struct Type {
    text: Text,
    shrinks: f64,
    stands: VPos,
    colour: BackendColor,
}

impl BackendTextStyle for Type {
    type FontError = std::fmt::Error;

    fn color(&self) -> BackendColor {
        self.colour
    }

    fn size(&self) -> f64 {
        self.text.size * FINE * self.shrinks
    }

    fn style(&self) -> FontStyle {
        if self.text.bold { FontStyle::Bold } else { FontStyle::Normal }
    }

    fn anchor(&self) -> Pos {
        Pos::new(self.text.anchor, self.stands)
    }

    fn family(&self) -> FontFamily<'_> {
        FontFamily::Name(FAMILY)
    }

    fn layout_box(&self, text: &str) -> Result<((i32, i32), (i32, i32)), Self::FontError> {
        Ok(((0, 0), (fine(self.text.width(text)), fine(self.text.size))))
    }

    fn draw<E, F: FnMut(i32, i32, BackendColor) -> Result<(), E>>(
        &self,
        _: &str,
        _: BackendCoord,
        _: F,
    ) -> Result<Result<(), E>, Self::FontError> {
        // Only backends that set pixels themselves ask for this; no font is carried for them.
        Ok(Ok(()))
    }
}
