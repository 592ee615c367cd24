//! The case's schema, generated from its types: as JSON Schema, and as a list for people.

use std::fmt::Write;

use serde_json::Value;

use crate::case::Case;

/// The JSON Schema (draft 2020-12) of a case file.
pub(super) fn schema() -> Value {
    schemars::schema_for!(Case).to_value()
}

/// Every field with its type, default and meaning, one a paragraph.
pub(super) fn list() -> String {
    let schema = schema();
    let mut lines = String::from(
        "# Fields of a case file\n\nA case file is JSON. What is missing takes its default; what is not listed here is an error.\n",
    );
    object(&schema, &schema, "", &mut lines);
    lines
}

/// The fields of an object under a path.
fn object(root: &Value, part: &Value, path: &str, lines: &mut String) {
    let Some(fields) = part["properties"].as_object() else { return };
    for (name, field) in fields {
        if field.get("const").is_some() {
            continue;
        }
        let at = if path.is_empty() { name.clone() } else { format!("{path}.{name}") };
        let meant = resolved(root, field);
        let or_null = if variants(field).any(|variant| variant["type"] == "null") { " | null" } else { "" };
        let _ = write!(lines, "\n- `{at}`: {}{or_null}", kind(root, meant));
        match &field["default"] {
            Value::Null | Value::Object(_) => {}
            default => {
                let _ = write!(lines, ", {default} unless given");
            }
        }
        lines.push('.');
        words(field["description"].as_str().or(meant["description"].as_str()), lines);
        inside(root, meant, &at, lines);
    }
    if path.is_empty() {
        lines.push('\n');
    }
}

/// What a field holds, if it holds fields of its own.
fn inside(root: &Value, meant: &Value, at: &str, lines: &mut String) {
    object(root, meant, at, lines);
    if meant["items"].is_object() {
        inside(root, resolved(root, &meant["items"]), &format!("{at}[]"), lines);
    }
    for variant in variants(meant) {
        let variant = merged(root, variant);
        if let Some(kind) = variant["properties"]["kind"]["const"].as_str() {
            let _ = write!(lines, "\n- `{at}` of kind `\"{kind}\"`.");
            words(variant["description"].as_str(), lines);
            object(root, &variant, at, lines);
        }
    }
}

/// A variant with the fields of the type that it refers to.
fn merged(root: &Value, variant: &Value) -> Value {
    let mut whole = variant.clone();
    if let Some(fields) = resolved(root, variant)["properties"].as_object() {
        for (name, field) in fields {
            if whole["properties"].get(name).is_none() {
                whole["properties"][name] = field.clone();
            }
        }
    }
    whole
}

fn variants(part: &Value) -> impl Iterator<Item = &Value> {
    ["oneOf", "anyOf"].into_iter().filter_map(|key| part[key].as_array()).flatten()
}

/// A reference's target, or the value itself; a field that may be null is what it is otherwise.
fn resolved<'a>(root: &'a Value, part: &'a Value) -> &'a Value {
    if let Some(target) = part["$ref"].as_str() {
        return root.pointer(target.trim_start_matches('#')).unwrap_or(part);
    }
    let mut others = variants(part).filter(|variant| variant["type"] != "null");
    match (others.next(), others.next(), variants(part).any(|variant| variant["type"] == "null")) {
        (Some(only), None, true) => resolved(root, only),
        _ => part,
    }
}

/// The type in words.
fn kind(root: &Value, part: &Value) -> String {
    if let Some(words) = part["enum"].as_array() {
        return words.iter().map(ToString::to_string).collect::<Vec<_>>().join(" | ");
    }
    if let Some(word) = part.get("const") {
        return word.to_string();
    }
    let words: Vec<String> = variants(part)
        .map(|variant| match &variant["properties"]["kind"]["const"] {
            Value::Null => kind(root, resolved(root, variant)),
            word => word.to_string(),
        })
        .collect();
    if !words.is_empty() {
        return words.join(" | ");
    }
    let named = |word: &str| match word {
        "array" => {
            let item = &part["items"];
            if item.is_object() {
                format!("list of {}", kind(root, resolved(root, item)))
            } else {
                "list".to_owned()
            }
        }
        "object" if part["additionalProperties"].is_object() => {
            format!("map to {}", kind(root, resolved(root, &part["additionalProperties"])))
        }
        "object" => "object".to_owned(),
        "integer" => "whole number".to_owned(),
        "boolean" => "true | false".to_owned(),
        "string" => "text".to_owned(),
        other => other.to_owned(),
    };
    match &part["type"] {
        Value::String(word) => named(word),
        Value::Array(words) => {
            words.iter().filter_map(Value::as_str).map(named).collect::<Vec<_>>().join(" | ")
        }
        _ => "any".to_owned(),
    }
}

/// A description, on one line.
fn words(text: Option<&str>, lines: &mut String) {
    if let Some(text) = text {
        lines.push(' ');
        lines.push_str(&text.split_whitespace().collect::<Vec<_>>().join(" "));
    }
}

#[cfg(test)]
mod tests {
    #[test]
    fn the_written_list_is_the_one_of_the_types() {
        let written = include_str!("../case/fields.md");
        assert!(
            written == super::list(),
            "src/case/fields.md is not what the types say; write it with `cargo run -- --case-fields > src/case/fields.md`"
        );
    }
}
