//! Stores to be simulated.

use serde::{Deserialize, Serialize};

/// A store to be simulated.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum Store {
    /// A store of fixed efficiencies.
    Fixed(FixedStore),
}

/// A store of fixed efficiencies; powers at the terminals, energy inside.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct FixedStore {
    /// Name for tables.
    pub name: String,
    /// Greatest charge power, kW; none = no limit.
    pub charge_kw: Option<f64>,
    /// Greatest discharge power, kW; none = no limit.
    pub discharge_kw: Option<f64>,
    /// Usable energy inside, kWh.
    pub energy_kwh: f64,
    /// Charge efficiency.
    pub charge_efficiency: f64,
    /// Discharge efficiency.
    pub discharge_efficiency: f64,
    /// Self-discharge of the stored energy, per hour.
    pub self_discharge_per_h: f64,
    /// Standing load, kW.
    pub standing_kw: f64,
    /// Level at the start.
    pub start: Start,
}

impl Default for FixedStore {
    fn default() -> Self {
        Self {
            name: String::new(),
            charge_kw: None,
            discharge_kw: None,
            energy_kwh: 0.0,
            charge_efficiency: 1.0,
            discharge_efficiency: 1.0,
            self_discharge_per_h: 0.0,
            standing_kw: 0.0,
            start: Start::Full,
        }
    }
}

/// Level of a store at the start.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Start {
    /// Full.
    #[default]
    Full,
    /// Empty.
    Empty,
    /// Half full.
    Half,
    /// The level at which the record, repeated from full, settles.
    Cyclic,
}
