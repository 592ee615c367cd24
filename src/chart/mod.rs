//! Pictures: one function each, over any plotters backend, so that the canvas on screen, the SVG in a document and the
//! picture in a test are the same drawing.
//!
//! A picture is drawn at 1:1 px for the width it is given and redrawn for another, never scaled. Its surface takes
//! [`FINE`] steps per px, so a canvas context is scaled by `devicePixelRatio / FINE` and given round line joins before it
//! is handed over. Bold stands for weight 600: the page declares its face for weights 200 to 600. Each module of a picture
//! gives its height for a width and a sentence that says in words what it shows.

pub mod coverage;
pub mod cumulative;
mod data;
#[cfg(test)]
mod edges;
pub mod frame;
mod label;
pub mod metrics;
pub mod net;
pub mod palette;
mod pen;
pub mod plane;
mod plane_labels;
#[cfg(test)]
mod samples;
mod scheme;
mod shape;
mod surface;
mod svg;
pub mod ticks;
pub mod week;
mod words;
pub mod year;
mod year_curve;

pub use coverage::coverage;
pub use cumulative::cumulative;
pub use data::*;
pub use frame::{Axis, Frame, Hits, Spot, nearest};
pub use net::net_power;
pub use palette::{DARK, HIGH, HIGH_DARK, LIGHT, PRINT, Palette, Pens, Rgb};
pub use pen::FINE;
pub use plane::plane;
pub use scheme::{Scheme, tokens};
pub use surface::{Backend, Drawn, Letters, Over, Surface};
pub use svg::svg;
pub use week::week;
pub use year::year_sheet;

/// Width in px under which a picture is drawn for a phone.
pub const NARROW: u32 = 560;
