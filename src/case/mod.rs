//! The case: everything a person chose, in one value that travels as JSON.
//!
//! The same case and the same version give the same results, bit for bit. Unknown fields are errors that name their path;
//! a missing field takes its default; every number is checked for its range when the case is read.

mod check;
mod duty;
mod record;
mod requirement;
mod site;
mod store;

use serde::{Deserialize, Serialize};

pub use duty::{DutyCase, Positive};
pub use record::{DateOrder, GapRemedy, RecordCase, Remedies, RepeatRemedy, Stamp, Values};
pub use requirement::{Balance, RequirementCase};
pub use site::{Connection, SiteCase};
pub use store::{FixedStore, Start, Store};

use crate::fault::{Fault, Result};

/// The version of the case format that this program writes.
pub const VERSION: u32 = 1;

/// Longest case file that is read, in bytes.
const LONGEST: usize = 4 << 20;

/// Everything a person chose.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Case {
    /// Version of the format.
    pub millpond_case: u32,
    /// How the record is read.
    #[serde(default)]
    pub record: RecordCase,
    /// What storage is asked to do.
    #[serde(default)]
    pub duty: DutyCase,
    /// Terms of the requirement.
    #[serde(default)]
    pub requirement: RequirementCase,
    /// Facts about the site.
    #[serde(default)]
    pub site: SiteCase,
    /// Stores to be simulated.
    #[serde(default)]
    pub stores: Vec<Store>,
}

impl Default for Case {
    fn default() -> Self {
        Self {
            millpond_case: VERSION,
            record: RecordCase::default(),
            duty: DutyCase::default(),
            requirement: RequirementCase::default(),
            site: SiteCase::default(),
            stores: Vec::new(),
        }
    }
}

impl Case {
    /// Reads a case from JSON and checks every number.
    ///
    /// # Errors
    /// If the text is not JSON, a field is unknown or of the wrong type, a number is out of range, or the version is
    /// newer than this program; the place is the path of the field.
    ///
    /// ```
    /// use millpond::case::Case;
    /// let case = Case::from_json(r#"{"millpond_case": 1, "site": {"mass_budget_kg": 5000}}"#)?;
    /// assert_eq!(case.site.mass_budget_kg, Some(5000.0));
    /// let fault = Case::from_json(r#"{"millpond_case": 1, "site": {"mass": 5000}}"#).unwrap_err();
    /// assert!(fault.place.contains("site"));
    /// # Ok::<(), millpond::fault::Fault>(())
    /// ```
    pub fn from_json(text: &str) -> Result<Self> {
        if text.len() > LONGEST {
            return Err(Fault::new(
                format!("the case file is {} bytes long, more than {LONGEST}", text.len()),
                "case file",
                "Choose a case file that this program wrote.",
            ));
        }
        check::version(text)?;
        let mut reader = serde_json::Deserializer::from_str(text);
        let case: Self = serde_path_to_error::deserialize(&mut reader).map_err(|error| {
            let path = error.path().to_string();
            let place = if path == "." { "case file".to_owned() } else { format!("case file, at {path}") };
            Fault::new(
                format!("the case does not read: {}", error.into_inner()),
                place,
                "Correct or remove that field; the fields are listed in DEVELOPERS.md.",
            )
        })?;
        reader.end().map_err(|error| {
            Fault::new(
                format!("text follows the case: {error}"),
                "case file",
                "Remove what follows the closing brace.",
            )
        })?;
        case.check()?;
        Ok(case)
    }

    /// The case as JSON, for people: indented.
    ///
    /// # Errors
    /// If it cannot be written.
    pub fn to_json(&self) -> Result<String> {
        serde_json::to_string_pretty(self).map_err(|error| {
            Fault::new(format!("the case cannot be written: {error}"), "case", "Report this as a defect.")
        })
    }

    /// Checks every number of the case for its range.
    ///
    /// # Errors
    /// If one is out of range, named by its path.
    pub fn check(&self) -> Result<()> {
        check::ranges(self)
    }
}
