//! A case file into a case: nothing is taken unless everything reads, and an error names the path of its field.

use std::collections::BTreeMap;
use std::fmt;
use std::marker::PhantomData;

use serde::Deserialize;
use serde::de::{DeserializeOwned, Deserializer, Error, MapAccess, Visitor};
use serde_json::{Map, Value};

use super::{Case, DutyCase, Store, VERSION};
use crate::fault::{Fault, Result, quote};

/// Longest case file without its record, in bytes.
const LONGEST: usize = 4 << 20;

/// Longest case file with its record, in bytes.
const LONGEST_WITH_RECORD: usize = 1 << 28;

/// Reads the text of a case file; see [`Case::from_json`].
pub(super) fn case(text: &str) -> Result<Case> {
    let text = text.trim_start_matches('\u{feff}');
    if text.len() > LONGEST_WITH_RECORD {
        return Err(too_long(text.len(), LONGEST_WITH_RECORD));
    }
    version(text)?;
    let mut reader = serde_json::Deserializer::from_str(text);
    let case: Case = serde_path_to_error::deserialize(&mut reader).map_err(|error| {
        let path = error.path().to_string();
        let path = if path == "." { String::new() } else { culprit(text, &path).unwrap_or(path) };
        Fault::new(
            format!("the case does not read: {}", shown(&error.into_inner().to_string())),
            place(&path),
            "Correct or remove that field; `millpond --case-fields` lists all fields with their units.",
        )
    })?;
    reader.end().map_err(|error| {
        Fault::new(
            format!("text follows the case: {error}"),
            "case file",
            "Remove what follows the closing brace.",
        )
    })?;
    let carried: usize = case.files.iter().map(|file| file.gzip_base64.len()).sum();
    if text.len() - carried > LONGEST {
        return Err(too_long(text.len() - carried, LONGEST));
    }
    case.check()?;
    Ok(case)
}

fn place(path: &str) -> String {
    if path.is_empty() { "case file".to_owned() } else { format!("case file, at {}", shown(path)) }
}

/// Text from the file as far as it belongs in a message: no control characters, no novels.
fn shown(text: &str) -> String {
    const MOST: usize = 400;
    let short = text.chars().take(MOST).map(|c| if c.is_control() { '\u{fffd}' } else { c });
    short.chain(text.chars().nth(MOST).map(|_| '…')).collect()
}

#[cold]
fn too_long(bytes: usize, most: usize) -> Fault {
    Fault::new(
        format!("the case file is {bytes} bytes long, more than {most}"),
        "case file",
        "Choose a case file that this program wrote.",
    )
}

/// Refuses a version from the future before the fields are looked at, so that the remedy is the right one.
fn version(text: &str) -> Result<()> {
    #[derive(Deserialize)]
    #[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
    struct Head {
        millpond_case: Option<Value>,
    }
    let head: Head = serde_json::from_str(text).map_err(|error| {
        Fault::new(
            format!("this is not a case file: {}", shown(&error.to_string())),
            format!("case file, row {}, column {}", error.line(), error.column()),
            "Choose a case file (JSON) that this program wrote.",
        )
    })?;
    match head.millpond_case.as_ref().map(Value::as_u64) {
        Some(Some(version)) if version == u64::from(VERSION) => Ok(()),
        Some(Some(version)) if version > u64::from(VERSION) => Err(Fault::new(
            format!("the case is of version {version}; this program reads up to version {VERSION}"),
            "case file, at millpond_case",
            "Open it with a newer Millpond.",
        )),
        _ => Err(Fault::new(
            "the case does not state its version",
            "case file, at millpond_case",
            format!("Add \"millpond_case\": {VERSION}."),
        )),
    }
}

/// The path of the field at fault inside a value that is told apart by its `kind`: there the reader sees only the whole. It
/// is the field without which the complaint is another one, or none.
fn culprit(text: &str, path: &str) -> Option<String> {
    let case: Value = serde_json::from_str(text).ok()?;
    if path == "duty" {
        return field_at_fault::<DutyCase>(case.get("duty")?).map(|field| format!("duty.{field}"));
    }
    let place: usize = path.strip_prefix("stores[")?.strip_suffix(']')?.parse().ok()?;
    let field = field_at_fault::<Store>(case.get("stores")?.get(place)?)?;
    Some(format!("stores[{place}].{field}"))
}

fn field_at_fault<T: DeserializeOwned>(value: &Value) -> Option<String> {
    let complaint = |fields: Map<String, Value>| {
        serde_json::from_value::<T>(Value::Object(fields)).err().map(|error| error.to_string())
    };
    let fields = value.as_object()?;
    let whole = complaint(fields.clone())?;
    fields
        .keys()
        .find(|field| {
            let mut others = fields.clone();
            others.remove(*field);
            *field != "kind" && complaint(others).as_ref() != Some(&whole)
        })
        .cloned()
}

/// A map of which every key comes once; JSON itself would let the last one win in silence.
pub(super) fn each_once<'a, D, V>(deserializer: D) -> std::result::Result<BTreeMap<String, V>, D::Error>
where
    D: Deserializer<'a>,
    V: Deserialize<'a>,
{
    struct Once<V>(PhantomData<V>);
    impl<'a, V: Deserialize<'a>> Visitor<'a> for Once<V> {
        type Value = BTreeMap<String, V>;

        fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
            f.write_str("a map")
        }

        fn visit_map<A: MapAccess<'a>>(self, mut entries: A) -> std::result::Result<Self::Value, A::Error> {
            let mut map = BTreeMap::new();
            while let Some((key, value)) = entries.next_entry::<String, V>()? {
                if map.contains_key(&key) {
                    return Err(A::Error::custom(format!("duplicate field {}", quote(&key))));
                }
                map.insert(key, value);
            }
            Ok(map)
        }
    }
    deserializer.deserialize_map(Once(PhantomData))
}
