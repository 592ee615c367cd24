//! The engine against published and independently computed values (tests/reference), and properties that must hold for any
//! record.

#![allow(clippy::unwrap_used, clippy::expect_used, reason = "a test that cannot go on should say where")]

mod case;
mod circuits;
mod duties;
mod open_data;
mod properties;
mod reference;
mod sheet;
mod site;
mod sizing;
mod terminal;
