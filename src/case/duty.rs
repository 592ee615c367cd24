//! What storage is asked to do.

use serde::{Deserialize, Serialize};

/// What storage is asked to do.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(tag = "kind", rename_all = "snake_case", deny_unknown_fields)]
pub enum DutyCase {
    /// What fits the record: `limits` for a record of demand alone, `balance` otherwise.
    Guess {},
    /// Serve deficits from surplus.
    Balance {},
    /// Hold import and export limits at the connection point.
    Limits {
        /// Greatest import, kW; none = no limit. Where neither limit is given, eight tenths of the greatest import is taken.
        #[serde(default)]
        import_limit_kw: Option<f64>,
        /// Greatest export, kW; none = no limit.
        #[serde(default)]
        export_limit_kw: Option<f64>,
        /// Whether the store may be charged from the grid below the import limit.
        #[serde(default = "yes")]
        recharge_from_grid: bool,
        /// Whether the store may discharge into the grid below the export limit.
        #[serde(default)]
        discharge_to_grid: bool,
    },
    /// Carry the power of a column.
    Given {
        /// Header of the column.
        column: String,
        /// Which sign charges the store.
        #[serde(default)]
        positive: Positive,
    },
}

fn yes() -> bool {
    true
}

impl Default for DutyCase {
    fn default() -> Self {
        Self::Guess {}
    }
}

/// What a positive value of a given duty means.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Positive {
    /// Charging.
    #[default]
    Charge,
    /// Discharging.
    Discharge,
}
