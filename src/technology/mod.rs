//! Kinds of storage: the catalogue of published ranges, their circuits, their Ragone curves, and verdicts on a need.
//!
//! [`screen`] is the stage's door: catalogue and need in, a [`Screening`] out; [`plane`] draws the same need.
//!
//! The rule of a verdict: a kind *carries* a criterion if its typical value meets it with the margin, *strains* if only
//! the good end of its range does, and *fails* if not even that does; the worst criterion is the kind's verdict. The good
//! end is never a corner of the published box. Energy and power at a duration are those of the best of seven designs
//! between the energy-rich and the power-rich end ([`Design`]); the good end of the rated duration is the logarithmic
//! middle between typical and high. Only installed mass and volume are weighed by the box, max(E / (e x depth), P / p) x
//! packing, because that is how a reader checks them by hand.
//!
//! What is our judgement and has no source (and so never counts as confirmed): that stores whose power part is bought
//! apart may run 15 times longer than rated, all siting facts, packing factors, and standing loads.

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
mod standing;

pub use catalogue::{
    Catalogue, CircuitData, Indoors, Market, MassBasis, Model, Quantity, Range, Siting, Technology,
};
pub use curve::{Circuit, Lumped, Meeting};
pub use family::{Design, PLACES, Per};
pub use hazards::{caution, hazard_words};
pub use need::{Criterion, Judged, Need, Pair, Screened, Screening};
pub use plane::{Point, plane, points};
pub use screen::screen;
pub use standing::Standing;
