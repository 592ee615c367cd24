//! Ranges of the case's numbers, each stated once.

mod duty;
mod store;

use super::carried::LARGEST;
use super::{Case, PriceCase, RangeEdit, VERSION};
use crate::fault::{Fault, Result, quote};
use crate::units::people::percent;

/// Powers and energies beyond this (kW, kWh, kg, l) are slips of the pen: a thousand times the largest plants.
pub(super) const MOST: f64 = 1e12;

/// Longest lists.
const MOST_ENTRIES: usize = 200;

/// Longest names and longest free texts, in letters.
const LONGEST_NAME: usize = 300;
const LONGEST_TEXT: usize = 20_000;

/// Ranges of numbers at fixed paths: path, least, greatest, unit (none for shares).
const RANGES: [(&str, f64, f64, &str); 19] = [
    ("record.step_s", 1e-3, 31_536_000.0, "s"),
    ("duty.import_limit_kw", 0.0, MOST, "kW"),
    ("duty.export_limit_kw", 0.0, MOST, "kW"),
    ("requirement.charge_efficiency", 1e-3, 1.0, ""),
    ("requirement.discharge_efficiency", 1e-3, 1.0, ""),
    ("requirement.self_discharge_per_h", 0.0, 1e3, "1/h"),
    ("requirement.standing_kw", 0.0, MOST, "kW"),
    ("requirement.served_share", 0.0, 1.0, ""),
    ("requirement.served_power_kw", 0.0, MOST, "kW"),
    ("requirement.depth", 1e-2, 1.0, ""),
    ("requirement.end_of_life", 1e-2, 1.0, ""),
    ("requirement.margin", 0.0, 10.0, ""),
    ("site.mass_budget_kg", 1e-6, MOST, "kg"),
    ("site.volume_budget_l", 1e-6, MOST, "l"),
    ("site.service_life_years", 0.01, 1000.0, "years"),
    ("site.response_s", 0.0, 1e9, "s"),
    ("site.transfer_s", 0.0, 1e9, "s"),
    ("site.ambient_least_c", -273.15, 200.0, "degrees Celsius"),
    ("site.ambient_greatest_c", -273.15, 200.0, "degrees Celsius"),
];

/// Checks a number for the range of the field at a path.
///
/// # Errors
/// If it is out of that range.
pub fn number_at(path: &str, value: f64) -> Result<()> {
    match RANGES.iter().find(|(known, ..)| *known == path) {
        Some((_, least, greatest, unit)) => number(path, value, *least, *greatest, unit),
        None => Ok(()),
    }
}

pub(super) fn optional_at(path: &str, value: Option<f64>) -> Result<()> {
    value.map_or(Ok(()), |value| number_at(path, value))
}

pub(super) fn ranges(case: &Case) -> Result<()> {
    number("millpond_case", f64::from(case.millpond_case), f64::from(VERSION), f64::from(VERSION), "")?;
    word("name", &case.name)?;
    text("notes", &case.notes)?;
    text("site.notes", &case.site.notes)?;
    let record = &case.record;
    optional_at("record.step_s", record.step_s)?;
    count("record.roles", record.roles.len())?;
    count("record.units", record.units.len())?;
    count("record.scale", record.scale.len())?;
    for (header, factor) in &record.scale {
        number(&format!("record.scale.{}", quote(header)), *factor, -1e9, 1e9, "")?;
    }
    for (header, unit) in &record.units {
        word(&format!("record.units.{}", quote(header)), unit)?;
    }
    for (field, headers) in [
        ("record.roles", record.roles.keys().collect::<Vec<_>>()),
        ("record.units", record.units.keys().collect()),
        ("record.scale", record.scale.keys().collect()),
    ] {
        headers.into_iter().try_for_each(|header| word(field, header))?;
    }
    word("record.zone", record.zone.as_deref().unwrap_or_default())?;
    for (field, mark, allowed) in
        [("record.separator", record.separator, ",;\t|"), ("record.decimal", record.decimal, ".,")]
    {
        if let Some(mark) = mark
            && !allowed.contains(mark)
        {
            return Err(Fault::new(
                format!("{field} is {mark:?}"),
                format!("case, at {field}"),
                format!("Give one of {allowed:?}."),
            ));
        }
    }
    duty::terms(&case.duty)?;
    let requirement = &case.requirement;
    number_at("requirement.charge_efficiency", requirement.charge_efficiency)?;
    number_at("requirement.discharge_efficiency", requirement.discharge_efficiency)?;
    number_at("requirement.self_discharge_per_h", requirement.self_discharge_per_h)?;
    number_at("requirement.standing_kw", requirement.standing_kw)?;
    optional_at("requirement.served_share", requirement.served_share)?;
    optional_at("requirement.served_power_kw", requirement.served_power_kw)?;
    number_at("requirement.depth", requirement.depth)?;
    number_at("requirement.end_of_life", requirement.end_of_life)?;
    number_at("requirement.margin", requirement.margin)?;
    list("requirement.unserved_shares", &requirement.unserved_shares, 0.0, 1.0, "")?;
    list("requirement.powers_kw", &requirement.powers_kw, 0.0, MOST, "kW")?;
    list("requirement.band_edges_s", &requirement.band_edges_s, 1e-3, 1e10, "s")?;
    if requirement.band_edges_s.windows(2).any(|pair| pair[0] >= pair[1]) {
        return Err(Fault::new(
            "requirement.band_edges_s do not rise",
            "case, at requirement.band_edges_s",
            "List the edges from short to long, each once.",
        ));
    }
    let site = &case.site;
    optional_at("site.mass_budget_kg", site.mass_budget_kg)?;
    optional_at("site.volume_budget_l", site.volume_budget_l)?;
    optional_at("site.service_life_years", site.service_life_years)?;
    optional_at("site.response_s", site.response_s)?;
    optional_at("site.transfer_s", site.transfer_s)?;
    optional_at("site.ambient_least_c", site.ambient_least_c)?;
    optional_at("site.ambient_greatest_c", site.ambient_greatest_c)?;
    if let (Some(least), Some(greatest)) = (site.ambient_least_c, site.ambient_greatest_c)
        && least > greatest
    {
        return Err(Fault::new(
            format!("the lowest air temperature, {least}, is above the highest, {greatest}"),
            "case, at site.ambient_least_c",
            "Exchange the two.",
        ));
    }
    count("stores", case.stores.len())?;
    case.stores.iter().enumerate().try_for_each(|(i, one)| store::check(one, &format!("stores[{i}]")))?;
    edits(&case.catalogue)?;
    prices(&case.prices)?;
    count("files", case.files.len())?;
    let all: f64 = case.files.iter().map(|file| file.bytes as f64).sum();
    number("files (bytes of all together)", all, 0.0, LARGEST as f64, "bytes")?;
    for (i, file) in case.files.iter().enumerate() {
        word(&format!("files[{i}].name"), &file.name)?;
        number(&format!("files[{i}].bytes"), file.bytes as f64, 0.0, LARGEST as f64, "bytes")?;
    }
    Ok(())
}

fn edits(edits: &[RangeEdit]) -> Result<()> {
    count("catalogue", edits.len())?;
    for (i, edit) in edits.iter().enumerate() {
        let at = |field: &str| format!("catalogue[{i}].{field}");
        word(&at("technology"), &edit.technology)?;
        word(&at("source"), &edit.source)?;
        for (field, value) in [("low", edit.low), ("typical", edit.typical), ("high", edit.high)] {
            number(&at(field), value, -MOST, MOST, "in the catalogue's unit")?;
        }
        if edit.low > edit.typical || edit.typical > edit.high {
            return Err(Fault::new(
                format!("{} to {} does not hold the typical value {}", edit.low, edit.high, edit.typical),
                format!("case, at {}", at("typical")),
                "Give low, typical and high in rising order.",
            ));
        }
        if let Some(earlier) = edits[..i]
            .iter()
            .position(|other| (&other.technology, other.quantity) == (&edit.technology, edit.quantity))
        {
            return Err(Fault::new(
                format!("the {} of {} is edited twice", edit.quantity.word(), quote(&edit.technology)),
                format!("case, at catalogue[{i}], first at catalogue[{earlier}]"),
                "Keep one of the two.",
            ));
        }
    }
    Ok(())
}

fn prices(prices: &PriceCase) -> Result<()> {
    word("prices.currency", &prices.currency)?;
    optional("prices.charging_per_kwh", prices.charging_per_kwh, -MOST, MOST, "per kWh")?;
    optional("prices.discount_rate", prices.discount_rate, 0.0, 1.0, "")?;
    count("prices.stores", prices.stores.len())?;
    for (i, price) in prices.stores.iter().enumerate() {
        let at = |field: &str| format!("prices.stores[{i}].{field}");
        word(&at("technology"), &price.technology)?;
        number(&at("per_kw"), price.per_kw, 0.0, MOST, "per kW")?;
        number(&at("per_kwh"), price.per_kwh, 0.0, MOST, "per kWh")?;
        number(&at("fixed"), price.fixed, 0.0, MOST, "in the currency")?;
        number(&at("yearly_share"), price.yearly_share, 0.0, 1.0, "")?;
    }
    Ok(())
}

/// A name: one line, short.
fn word(field: &str, value: &str) -> Result<()> {
    written(field, value, LONGEST_NAME, char::is_control)
}

/// Free text: lines are allowed.
fn text(field: &str, value: &str) -> Result<()> {
    written(field, value, LONGEST_TEXT, |c| c.is_control() && !matches!(c, '\n' | '\t' | '\r'))
}

fn written(field: &str, value: &str, most: usize, forbidden: fn(char) -> bool) -> Result<()> {
    let letters = value.chars().count();
    let (what, remedy) = if letters > most {
        (format!("{field} has {letters} letters"), format!("Keep at most {most}."))
    } else if let Some(c) = value.chars().find(|c| forbidden(*c)) {
        (
            format!("{field} holds a control character, U+{:04X}: {}", u32::from(c), quote(value)),
            "Write it without.".to_owned(),
        )
    } else {
        return Ok(());
    };
    Err(Fault::new(what, format!("case, at {field}"), remedy))
}

pub(super) fn number(field: &str, value: f64, least: f64, greatest: f64, unit: &str) -> Result<()> {
    if value.is_finite() && (least..=greatest).contains(&value) {
        return Ok(());
    }
    // Numbers without a unit are shares, which the page takes as per cent.
    let unit = if unit.is_empty() {
        format!(" ({} to {})", percent(least), percent(greatest))
    } else {
        format!(" {unit}")
    };
    Err(Fault::new(
        if value.abs() < 1e15 { format!("{field} is {value}") } else { format!("{field} is {value:e}") },
        format!("case, at {field}"),
        format!("Give a number from {least} to {greatest}{unit}."),
    ))
}

pub(super) fn optional(field: &str, value: Option<f64>, least: f64, greatest: f64, unit: &str) -> Result<()> {
    value.map_or(Ok(()), |value| number(field, value, least, greatest, unit))
}

fn list(field: &str, values: &[f64], least: f64, greatest: f64, unit: &str) -> Result<()> {
    count(field, values.len())?;
    values
        .iter()
        .enumerate()
        .try_for_each(|(i, value)| number(&format!("{field}[{i}]"), *value, least, greatest, unit))
}

pub(super) fn count(field: &str, entries: usize) -> Result<()> {
    if entries <= MOST_ENTRIES {
        return Ok(());
    }
    Err(Fault::new(
        format!("{field} has {entries} entries"),
        format!("case, at {field}"),
        format!("Keep at most {MOST_ENTRIES}."),
    ))
}
