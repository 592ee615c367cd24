//! The Ragone plane.
use super::data::Plane;
use super::frame::Hits;
use super::palette::Palette;
use super::pen::{Pen, Surface};
use crate::fault::Result;
/// Height.
pub fn height(width: u32) -> u32 { if width < 560 { 500 } else { 660 } }
/// Sentence.
pub fn sentence(_: &Plane) -> String { String::new() }
/// Draws.
pub fn plane<S: Surface>(surface: S, size: (u32, u32), palette: &Palette, _data: &Plane) -> Result<Hits> {
    let pen = Pen::new(surface, size, palette);
    pen.lift()?;
    Ok(Hits::default())
}
