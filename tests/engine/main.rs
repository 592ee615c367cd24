//! The engine against published and independently computed values (tests/reference), and properties that must hold for any
//! record.

mod properties;
mod reference;
mod site;
mod terminal;
