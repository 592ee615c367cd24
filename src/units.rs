//! Quantities: a number never travels without its unit, and one place writes them for people.
//!
//! Inside hot arrays a bare `f64` whose name ends in its unit does; [`people`] turns such numbers into text,
//! [`asked`] reads what a person typed, and [`civil`] is the calendar of clock readings.

pub mod asked;
pub mod civil;
pub mod people;
