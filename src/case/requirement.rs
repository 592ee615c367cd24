//! Terms of the requirement.

use serde::{Deserialize, Serialize};

/// Terms of the requirement.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct RequirementCase {
    /// Charge efficiency, connection point to store.
    pub charge_efficiency: f64,
    /// Discharge efficiency, store to connection point.
    pub discharge_efficiency: f64,
    /// Self-discharge of the stored energy, per hour.
    pub self_discharge_per_h: f64,
    /// Standing load of the store, kW.
    pub standing_kw: f64,
    /// Whether the record is repeated (cyclic) or passed once.
    pub balance: Balance,
    /// Unserved shares of the coverage table.
    pub unserved_shares: Vec<f64>,
    /// Powers of the coverage table, kW, the same both ways.
    pub powers_kw: Vec<f64>,
    /// Edges of the time-scale bands, s.
    pub band_edges_s: Vec<f64>,
    /// Share of the deficit to be served, 0 to 1; none = nine tenths at an islanded site, the knee at a connected one.
    pub served_share: Option<f64>,
    /// Power both ways with which it is served, kW; none = chosen from the record.
    pub served_power_kw: Option<f64>,
    /// Usable depth of discharge, share of nameplate.
    pub depth: f64,
    /// Capacity left at end of life, share of nameplate.
    pub end_of_life: f64,
    /// Margin on nameplate energy, share (0.1 = 10 %).
    pub margin: f64,
}

impl Default for RequirementCase {
    fn default() -> Self {
        Self {
            charge_efficiency: 1.0,
            discharge_efficiency: 1.0,
            self_discharge_per_h: 0.0,
            standing_kw: 0.0,
            balance: Balance::Cyclic,
            unserved_shares: vec![0.01, 0.05],
            powers_kw: Vec::new(),
            band_edges_s: vec![3600.0, 86_400.0, 604_800.0],
            served_share: None,
            served_power_kw: None,
            depth: 0.9,
            end_of_life: 0.8,
            margin: 0.0,
        }
    }
}

/// Whether a store must end as full as it began.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Balance {
    /// It must: the record is repeated.
    #[default]
    Cyclic,
    /// It need not.
    Free,
}
