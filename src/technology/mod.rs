//! Kinds of storage: the catalogue of published ranges, their circuits, their Ragone curves, and verdicts on a need.
//!
//! [`screen`] is the stage's door.
