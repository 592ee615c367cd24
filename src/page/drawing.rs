//! The pictures by name: title, note, and the chart function that draws each, over any surface.

use plotters_canvas::CanvasBackend;
use wasm_bindgen::JsCast;
use web_sys::{CanvasRenderingContext2d, HtmlCanvasElement};

use millpond::chart::{self, Basis, FINE, Hits, Measure, Over, Palette, Surface};
use millpond::fault::{Fault, Result};
use millpond::sheet::Sheet;

/// A picture of the sheet.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Which {
    /// 1.1
    Year,
    /// 2.1
    Net,
    /// 3.1
    Coverage,
    /// 3.2
    Week,
    /// 3.3
    Cumulative,
    /// 4.1
    Plane,
}

impl Which {
    /// Its number on the sheet.
    pub(crate) const fn number(self) -> &'static str {
        match self {
            Self::Year => "1.1",
            Self::Net => "2.1",
            Self::Coverage => "3.1",
            Self::Week => "3.2",
            Self::Cumulative => "3.3",
            Self::Plane => "4.1",
        }
    }

    /// Its title where no sheet says more.
    pub(crate) const fn title(self) -> &'static str {
        match self {
            Self::Year => "The year at a glance",
            Self::Net => "Net power",
            Self::Coverage => "Coverage against delivered energy",
            Self::Week => "The deciding week",
            Self::Cumulative => "Cumulative energy curve",
            Self::Plane => "Ragone plane",
        }
    }

    /// Its title for a sheet.
    pub(crate) fn title_of(self, sheet: &Sheet) -> &'static str {
        match (self, sheet.pictures.coverage.measure, sheet.pictures.plane.basis) {
            (Self::Coverage, Measure::ServedShare, _) => "Deficit served against delivered energy",
            (Self::Coverage, Measure::SelfSufficiency, _) => "Self-sufficiency against delivered energy",
            (Self::Coverage, Measure::CarriedShare, _) => "Discharge carried against delivered energy",
            (Self::Coverage, Measure::HeldImportKw, _) => "Import limit held against delivered energy",
            (Self::Plane, _, Basis::Mass) => "Ragone plane, by installed mass",
            (Self::Plane, _, Basis::Volume) => "Ragone plane, by installed volume",
            (Self::Plane, _, Basis::Absolute) => "Ragone plane, power against energy of plants",
            _ => self.title(),
        }
    }

    /// The line under its title.
    pub(crate) const fn note(self) -> &'static str {
        match self {
            Self::Year => {
                "A row is a week, hours run to the right. Hatched hours are deficits. The bracket marks the critical period."
            }
            Self::Net => "Drag the window in the strip below, or move it with Shift and an arrow key.",
            Self::Coverage => {
                "Power is the same both ways. Drag the asked tick, or type above: the rest of the sheet follows."
            }
            Self::Week => "What was asked of the store, what it carried, what it left, and its level below.",
            Self::Cumulative => "Over the critical period the curve falls furthest below where it stood.",
            Self::Plane => {
                "Dotted diagonals join equal times at full power. The requirement is the ink line; its tick is the point that the budget sets."
            }
        }
    }
}

/// Height for a width, px.
pub(crate) fn height(which: Which, sheet: &Sheet, width: u32) -> u32 {
    let pictures = &sheet.pictures;
    match which {
        Which::Year => chart::year::height(width, chart::year::rows(&pictures.year)),
        Which::Net => chart::net::height(width),
        Which::Coverage => chart::coverage::height(width),
        Which::Week => chart::week::height(width),
        Which::Cumulative => chart::cumulative::height(width),
        Which::Plane => chart::plane::height(width),
    }
}

/// What it shows, in a sentence.
pub(crate) fn sentence(which: Which, sheet: &Sheet) -> String {
    let pictures = &sheet.pictures;
    match which {
        Which::Year => chart::year::sentence(&pictures.year, &pictures.duration),
        Which::Net => chart::net::sentence(&pictures.net),
        Which::Coverage => chart::coverage::sentence(&pictures.coverage),
        Which::Week => pictures.week.as_ref().map(chart::week::sentence).unwrap_or_default(),
        Which::Cumulative => chart::cumulative::sentence(&pictures.cumulative),
        Which::Plane => chart::plane::sentence(&pictures.plane),
    }
}

/// Draws it.
pub(crate) fn draw(
    which: Which,
    sheet: &Sheet,
    surface: &mut dyn Surface,
    size: (u32, u32),
    palette: &Palette,
) -> Result<Hits> {
    let pictures = &sheet.pictures;
    match which {
        Which::Year => chart::year_sheet(surface, size, palette, &pictures.year, &pictures.duration),
        Which::Net => chart::net_power(surface, size, palette, &pictures.net),
        Which::Coverage => chart::coverage(surface, size, palette, &pictures.coverage),
        Which::Week => match &pictures.week {
            Some(week) => chart::week(surface, size, palette, week),
            None => Ok(Hits::default()),
        },
        Which::Cumulative => chart::cumulative(surface, size, palette, &pictures.cumulative),
        Which::Plane => chart::plane(surface, size, palette, &pictures.plane),
    }
}

/// Draws it on a canvas of `size` px with `dots` device dots a px, over paper if it is to stand alone.
pub(crate) fn on_canvas(
    which: Which,
    sheet: &Sheet,
    canvas: &HtmlCanvasElement,
    size: (u32, u32),
    dots: f64,
    palette: &Palette,
    ground: bool,
) -> Result<Hits> {
    let (width, height) = (f64::from(size.0), f64::from(size.1));
    // Setting its size also clears a canvas.
    canvas.set_width((width * dots) as u32);
    canvas.set_height((height * dots) as u32);
    let context = canvas
        .get_context("2d")
        .ok()
        .flatten()
        .and_then(|context| context.dyn_into::<CanvasRenderingContext2d>().ok());
    let (Some(context), Some(surface)) = (context, CanvasBackend::with_canvas_object(canvas.clone())) else {
        return Err(no_canvas());
    };
    if ground {
        context.set_fill_style_str(&palette.paper.to_string());
        context.fill_rect(0.0, 0.0, width * dots, height * dots);
    }
    if context.scale(dots / FINE, dots / FINE).is_err() {
        return Err(no_canvas());
    }
    context.set_line_join("round");
    draw(which, sheet, &mut Over(surface), size, palette)
}

/// Whether two sheets give the same picture, so that it need not be drawn again.
pub(crate) fn same(which: Which, a: &Sheet, b: &Sheet) -> bool {
    let (a, b) = (&a.pictures, &b.pictures);
    match which {
        Which::Year => a.year == b.year && a.duration == b.duration,
        Which::Net => a.net == b.net,
        Which::Coverage => a.coverage == b.coverage,
        Which::Week => a.week == b.week,
        Which::Cumulative => a.cumulative == b.cumulative,
        Which::Plane => a.plane == b.plane,
    }
}

#[cold]
fn no_canvas() -> Fault {
    Fault::new(
        "the browser has no canvas to draw on",
        "picture",
        "Open the table behind the picture instead.",
    )
}
