//! Tables of the requirement as rows of text: the same on the page and in the statement.

use crate::result::{Band, Bound, Confidence, CoverageRow, Criterion, Origin};
use crate::units::people::{self, capital};

/// A row for each criterion: quantity, bound, value, unit, origin, from, how sure.
pub(crate) fn criteria(criteria: &[Criterion]) -> Vec<Vec<String>> {
    criteria
        .iter()
        .map(|line| {
            let (number, unit) = scaled(line.value, &line.unit);
            let bound = match line.bound {
                Bound::AtLeast => "at least",
                Bound::AtMost => "at most",
            };
            let origin = match line.origin {
                Origin::Computed => "computed",
                Origin::Asked => "asked",
            };
            let sure = match line.confidence {
                Confidence::Measured => "measured",
                Confidence::BoundedBySampling => "bounded by sampling",
                Confidence::Assumed => "assumed",
            };
            vec![
                quantity(&line.quantity),
                bound.to_owned(),
                number,
                unit,
                origin.to_owned(),
                line.from.clone(),
                sure.to_owned(),
            ]
        })
        .collect()
}

/// A row for each band: its time scales, charge and discharge (kW), energy (kWh).
pub(crate) fn bands(bands: &[Band]) -> Vec<Vec<String>> {
    bands
        .iter()
        .map(|band| {
            let span = match (band.faster_than_s, band.slower_than_s) {
                (Some(fast), Some(slow)) => {
                    format!("within {}, over {}", people::duration(fast), people::duration(slow))
                }
                (Some(fast), None) => format!("within {}", people::duration(fast)),
                (None, Some(slow)) => format!("over {} and more", people::duration(slow)),
                (None, None) => "all".to_owned(),
            };
            vec![
                span,
                people::significant(band.charge_kw, 3),
                people::significant(band.discharge_kw, 3),
                people::significant(band.energy_kwh, 4),
            ]
        })
        .collect()
}

/// A row for each power and unserved share: power, share (%), least capacity (kWh inside).
pub(crate) fn coverage(rows: &[CoverageRow]) -> Vec<Vec<String>> {
    rows.iter()
        .map(|row| {
            vec![
                row.power_kw.map_or_else(|| "no limit".to_owned(), |kw| people::power(kw).to_string()),
                people::percent(row.unserved_share).number,
                row.capacity_kwh
                    .map_or_else(|| "cannot be reached".to_owned(), |kwh| people::significant(kwh, 4)),
            ]
        })
        .collect()
}

/// A value in a unit of the result format, as people read it.
fn scaled(value: f64, unit: &str) -> (String, String) {
    let scaled = match unit {
        "kWh" => people::energy(value),
        "kW" => people::power(value),
        "s" => people::duration(value),
        "kg" => people::mass(value),
        "l" => people::volume(value),
        "" => people::percent(value),
        "degC" => return (people::significant(value, 3), "\u{b0}C".to_owned()),
        other => return (people::significant(value, 3), other.to_owned()),
    };
    (scaled.number, scaled.unit.to_owned())
}

/// A quantity's word of the result format, as a person reads it.
fn quantity(word: &str) -> String {
    capital(&if word == "round_trip_efficiency" {
        "round-trip efficiency".to_owned()
    } else {
        word.replace('_', " ")
    })
}
