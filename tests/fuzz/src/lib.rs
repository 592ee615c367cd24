//! What must hold for any bytes that a reader is given.

use millpond::case::{RecordCase, Values};
use millpond::job::Job;
use millpond::record::{Memory, Record, Source, read};

/// Slices after which a reader of a small file is taken to hang: a slice is at least one row or interval.
const MOST_SLICES: usize = 2_000_000;

/// Reads bytes in several ways. The byte that follows a record separator (0x1e) begins another file of the site.
///
/// # Panics
/// If the reader panics or hangs, or gives a record with a value that is no finite number.
pub fn check(bytes: &[u8]) {
    let plain = RecordCase::default();
    for terms in [
        plain.clone(),
        RecordCase { step_s: Some(900.0), zone: Some("Europe/Berlin".to_owned()), ..plain.clone() },
        RecordCase { reading: Values::Samples, ..plain },
    ] {
        let sources = bytes
            .split(|byte| *byte == 0x1e)
            .enumerate()
            .map(|(i, part)| Box::new(Memory::new(format!("file{i}.csv"), part)) as Box<dyn Source>)
            .collect();
        let Ok(mut reader) = read("site", sources, &terms, &[]) else { continue };
        for slice in 0.. {
            assert!(slice < MOST_SLICES, "the reader hangs");
            match reader.advance(1000) {
                Ok(None) => {}
                Ok(Some(record)) => {
                    finite(&record);
                    break;
                }
                Err(fault) => {
                    assert!(!fault.what.is_empty() && !fault.remedy.is_empty(), "a fault says nothing");
                    break;
                }
            }
        }
    }
}

fn finite(record: &Record) {
    assert!(record.clock.intervals > 0 && record.clock.step_us > 0);
    for series in [&record.supply_kw, &record.demand_kw, &record.net_kw].into_iter().flatten() {
        assert_eq!(series.len(), record.clock.intervals);
        assert!(series.iter().flatten().all(f64::is_finite));
    }
    for extra in &record.extras {
        assert_eq!(extra.values.len(), record.clock.intervals, "{}", extra.header);
    }
    assert!(record.hidden_kw.iter().all(|(i, power)| *i < record.clock.intervals && power.is_finite()));
}
