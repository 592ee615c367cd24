//! Millpond: does energy storage belong on this site, what would it have to do, which kinds could do it, and does the
//! answer hold?
//!
//! The way through the crate is seven stages, in the order that data flows. Each takes a plain value and returns one, or
//! the one error type, [`fault::Fault`]. None of them knows a page, a clock, a disk or a random source.
//!
//! ```text
//! Source --record::read--> Record --duty::ask--> Duty --requirement::derive--> Requirement
//!        --technology::screen--> Screening --simulation::run--> Simulation
//!        --outlook::project--> Outlook --statement::write--> Statement
//! ```

pub mod assess;
pub mod case;
pub mod chart;
pub mod duty;
pub mod fault;
pub mod job;
pub mod losses;
pub mod numeric;
pub mod record;
pub mod requirement;
pub mod result;
pub mod sheet;
pub mod simulation;
pub mod statement;
pub mod technology;
#[cfg(all(feature = "terminal", not(target_arch = "wasm32")))]
pub mod terminal;
pub mod units;
