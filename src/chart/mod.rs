//! Pictures: one function each, over any plotters backend, so that the canvas on screen, the SVG in a document and the
//! picture in a test are the same drawing.

mod data;

pub use data::*;
