//! The browser binary.
fn main() {}
