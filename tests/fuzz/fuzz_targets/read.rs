//! Any bytes, read as one file or as several, make a record or a fault.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| millpond_fuzz::check(bytes));
