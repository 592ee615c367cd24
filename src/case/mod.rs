//! The case: everything a person chose, in one value that travels as JSON.
//!
//! The same case and the same version give the same results, bit for bit. Unknown fields are errors that name their path;
//! a missing field takes its default; every number is checked for its range when the case is read.

mod carried;
pub mod change;
mod check;
mod circuit;
mod duty;
mod edits;
mod read;
mod record;
mod requirement;
mod site;
mod store;

use serde::{Deserialize, Serialize};

pub use carried::CarriedFile;
pub use check::number_at;
pub use circuit::{Battery, Capacitor, Coil, Converter, CurveStore, Flywheel, Reservoir};
pub use duty::{DutyCase, Positive};
pub use edits::{PriceCase, RangeEdit, StorePrice};
pub use record::{DateOrder, GapRemedy, RecordCase, Remedies, RepeatRemedy, Stamp, Values};
pub use requirement::{Balance, RequirementCase};
pub use site::{Connection, SiteCase};
pub use store::{FixedStore, Start, Store, Terminals};

use crate::fault::{Fault, Result};

/// The version of the case format that this program writes.
pub const VERSION: u32 = 1;

/// The case of a person who has not chosen anything, as the text of its file: what the page begins with.
pub const UNTOUCHED: &str = include_str!("untouched.json");

/// Everything a person chose.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct Case {
    /// Version of the format.
    pub millpond_case: u32,
    /// Name of the case.
    #[serde(default)]
    pub name: String,
    /// Remarks, free text.
    #[serde(default)]
    pub notes: String,
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
    /// Ranges of the catalogue with numbers of the person's own.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub catalogue: Vec<RangeEdit>,
    /// Prices.
    #[serde(default)]
    pub prices: PriceCase,
    /// Seed of everything that is sampled, so that a sample can be drawn again; kept for the outlook.
    #[serde(default = "first_seed")]
    pub seed: u32,
    /// The record's files, where the case carries them.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub files: Vec<CarriedFile>,
    /// Whether every kind of the catalogue is sized for the asked point.
    #[serde(default)]
    pub sizings: bool,
}

fn first_seed() -> u32 {
    1
}

impl Default for Case {
    fn default() -> Self {
        Self {
            millpond_case: VERSION,
            name: String::new(),
            notes: String::new(),
            record: RecordCase::default(),
            duty: DutyCase::default(),
            requirement: RequirementCase::default(),
            site: SiteCase::default(),
            stores: Vec::new(),
            catalogue: Vec::new(),
            prices: PriceCase::default(),
            seed: first_seed(),
            files: Vec::new(),
            sizings: false,
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
        read::case(text)
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_untouched_case_is_the_default() {
        assert_eq!(Case::from_json(UNTOUCHED).unwrap(), Case::default());
        let written = Case::default().to_json().unwrap();
        assert_eq!(
            UNTOUCHED.trim_end(),
            written,
            "src/case/untouched.json is what `millpond --case-untouched` writes"
        );
    }
}
