//! Every number of the result by its path, for the folds "All figures".

use serde_json::Value;

use super::Listed;
use crate::units::people;

/// Every number of a result, in the order of its fields; words and yes or no are left to the sentences and tables.
pub(super) fn numbers(result: &Value) -> Vec<Listed> {
    let mut rows = Vec::new();
    for part in ["record", "duty", "requirement", "plane", "simulations"] {
        if let Some(value) = result.get(part) {
            walk(part, value, &mut rows);
        }
    }
    rows
}

fn walk(path: &str, value: &Value, rows: &mut Vec<Listed>) {
    match value {
        Value::Number(number) => rows.push(Listed {
            path: path.to_owned(),
            value: number.to_string(),
            shown: number.as_f64().map(|value| people::significant(value, 6)).unwrap_or_default(),
            unit: unit(path).to_owned(),
        }),
        Value::Array(list) => {
            for (i, value) in list.iter().enumerate() {
                walk(&format!("{path}.{i}"), value, rows);
            }
        }
        Value::Object(fields) => {
            for (name, value) in fields {
                walk(&format!("{path}.{name}"), value, rows);
            }
        }
        _ => {}
    }
}

/// The unit that a field's name ends in.
fn unit(path: &str) -> &'static str {
    const ENDS: [(&str, &str); 16] = [
        ("_kw_per_s", "kW/s"),
        ("_wh_per_kg", "Wh/kg"),
        ("_wh_per_l", "Wh/l"),
        ("_w_per_kg", "W/kg"),
        ("_w_per_l", "W/l"),
        ("_per_h", "1/h"),
        ("_kwh", "kWh"),
        ("_kw", "kW"),
        ("_kg", "kg"),
        ("_s", "s"),
        ("_l", "l"),
        ("_share", "of 1"),
        ("_efficiency", "of 1"),
        ("self_consumption", "of 1"),
        ("self_sufficiency", "of 1"),
        ("_c", "\u{b0}C"),
    ];
    // Fields of a group (losses, a mass at its typical and good end) carry the unit in the group's name.
    let parent = path.rsplit_once('.').map_or("", |(parent, _)| parent);
    [path, parent]
        .iter()
        .find_map(|name| ENDS.iter().find(|(end, _)| name.ends_with(end)))
        .map_or("", |(_, unit)| unit)
}
