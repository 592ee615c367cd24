//! Kinds of storage: the catalogue of published ranges, their circuits, their Ragone curves, and verdicts on a need.
//!
//! [`screen`] is the stage's door.

mod catalogue;
mod curve;
mod family;
mod hazards;
mod judge;
mod need;
mod pace;
mod plane;
mod rows;
mod screen;
mod site;
mod size;

pub use catalogue::{
    Catalogue, CircuitData, Indoors, Market, MassBasis, Model, Quantity, Range, Siting, Technology,
};
pub use curve::{Circuit, Meeting};
pub use family::{Design, PLACES, Per};
pub use hazards::{caution, hazard_words};
pub use need::{Criterion, Judged, Need, Pair, Screened, Screening};
pub use plane::{Point, plane, points};
pub use screen::screen;
