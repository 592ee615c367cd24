//! A change of the case in words, for the list of steps: read off the names of the fields, so that every field has its words.

use std::fmt::Write;

/// One leaf of the case that changed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Change {
    /// Names on the way to it, from the case down: fields, keys, places in lists (from 0).
    pub path: Vec<String>,
    /// Its value before, as text; empty = there was none.
    pub old: String,
    /// Its value now; empty = there is none.
    pub new: String,
}

/// What the last part of a field's name says of its unit.
const UNITS: [(&str, &str); 14] = [
    ("_kw_per_min", "kW/min"),
    ("_per_kwh", "per kWh"),
    ("_per_h", "per h"),
    ("_per_kw", "per kW"),
    ("_kwh", "kWh"),
    ("_kva", "kVA"),
    ("_kw", "kW"),
    ("_hz", "Hz"),
    ("_kg", "kg"),
    ("_years", "years"),
    ("_ohm", "ohm"),
    ("_s", "s"),
    ("_l", "l"),
    ("_c", "°C"),
];

/// A step in words: what changed first, from what to what, and how much else.
///
/// ```
/// use millpond::case::change::{Change, words};
/// let path = ["duty", "import_limit_kw"].map(str::to_owned).to_vec();
/// let change = Change { path, old: "40".into(), new: "35".into() };
/// assert_eq!(words(&[change]), "Duty: import limit 40 to 35 kW");
/// assert_eq!(words(&[]), "No change");
/// ```
pub fn words(changes: &[Change]) -> String {
    let Some((first, rest)) = changes.split_first() else { return "No change".to_owned() };
    let mut name = String::new();
    let (mut unit, mut within) = ("", "");
    for (depth, part) in first.path.iter().enumerate() {
        let mut part = part.as_str();
        if depth + 1 == first.path.len() && depth > 0 {
            for (ending, words) in UNITS {
                if let Some(stem) = part.strip_suffix(ending) {
                    (part, unit) = (stem, words);
                    break;
                }
            }
        }
        let part = match part.parse::<usize>() {
            Ok(place) => (place + 1).to_string(),
            // Keys of these maps are headers of the file, which keep their letters.
            Err(_) if matches!(within, "roles" | "units" | "scale" | "sheets") => part.to_owned(),
            Err(_) => part.replace('_', " "),
        };
        within = &first.path[depth];
        let joint = match depth {
            0 => "",
            1 => ": ",
            _ => " ",
        };
        let part = if depth == 0 { crate::units::people::capital(&part) } else { part };
        // Writing to a text cannot fail.
        let _ = write!(name, "{joint}{part}");
    }
    let mut text = match (first.old.as_str(), first.new.as_str()) {
        ("", "") => name,
        ("", new) => format!("{name} {}", value(new)),
        (old, "") => format!("{name} {} taken back", value(old)),
        (old, new) => format!("{name} {} to {}", value(old), value(new)),
    };
    if !unit.is_empty() && !first.new.is_empty() {
        text.push(' ');
        text.push_str(unit);
    }
    match rest.len() {
        0 => {}
        1 => text.push_str(", and one more"),
        more => {
            let _ = write!(text, ", and {more} more");
        }
    }
    text
}

/// A value as a person writes it; long texts are cut.
fn value(text: &str) -> String {
    const MOST: usize = 40;
    match text {
        "true" => "yes".to_owned(),
        "false" => "no".to_owned(),
        _ if text.chars().count() > MOST => text.chars().take(MOST).chain(['…']).collect(),
        _ if text.parse::<f64>().is_ok() => text.to_owned(),
        _ => text.replace('_', " "),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn change(path: &[&str], old: &str, new: &str) -> Change {
        Change {
            path: path.iter().map(|part| (*part).to_owned()).collect(),
            old: old.to_owned(),
            new: new.to_owned(),
        }
    }

    #[test]
    fn steps_read_like_sentences() {
        let said = |path: &[&str], old: &str, new: &str| words(&[change(path, old, new)]);
        assert_eq!(
            said(&["duty", "recharge_from_grid"], "true", "false"),
            "Duty: recharge from grid yes to no"
        );
        assert_eq!(said(&["site", "mass_budget_kg"], "", "5000"), "Site: mass budget 5000 kg");
        assert_eq!(said(&["site", "mass_budget_kg"], "5000", ""), "Site: mass budget 5000 taken back");
        assert_eq!(said(&["record", "roles", "PV_1 [kW]"], "", "supply"), "Record: roles PV_1 [kW] supply");
        assert_eq!(said(&["stores", "0", "energy_kwh"], "10", "20"), "Stores: 1 energy 10 to 20 kWh");
        assert_eq!(said(&["name"], "", "Farm, second try"), "Name Farm, second try");
        assert_eq!(
            said(&["record", "remedies", "gap"], "leave_out", "hold"),
            "Record: remedies gap leave out to hold"
        );
        let two =
            [change(&["duty", "kind"], "guess", "limits"), change(&["duty", "import_limit_kw"], "", "40")];
        assert_eq!(words(&two), "Duty: kind guess to limits, and one more");
    }
}
