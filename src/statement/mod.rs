//! The words of the sheet and of the document that a client receives.

pub mod words;
