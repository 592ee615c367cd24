//! Numbers of a person's own in place of published ones, and prices.

use serde::{Deserialize, Serialize};

use crate::technology::Quantity;

/// A range of the catalogue with a person's own numbers, in the unit that the catalogue gives it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct RangeEdit {
    /// Identifier of the kind of storage, such as `li_ion_lfp`.
    pub technology: String,
    /// Which of its ranges.
    pub quantity: Quantity,
    /// Least credible value.
    pub low: f64,
    /// Design value.
    pub typical: f64,
    /// Greatest credible value.
    pub high: f64,
    /// Where the numbers come from; without a source a verdict that they decide counts as unconfirmed.
    #[serde(default)]
    pub source: String,
}

/// Prices, in one currency; without them nothing is said about cost. They are kept for the outlook, which this version does
/// not have yet.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct PriceCase {
    /// Name of the currency, such as EUR.
    pub currency: String,
    /// Price of the energy that charges the store, currency per kWh.
    pub charging_per_kwh: Option<f64>,
    /// Yearly rate of discount, share (0.08 = 8 %).
    pub discount_rate: Option<f64>,
    /// Prices of kinds of storage.
    pub stores: Vec<StorePrice>,
}

/// What a kind of storage costs.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct StorePrice {
    /// Identifier of the kind of storage.
    pub technology: String,
    /// Price of power, currency per kW.
    #[serde(default)]
    pub per_kw: f64,
    /// Price of nameplate energy, currency per kWh.
    #[serde(default)]
    pub per_kwh: f64,
    /// What does not depend on size, currency.
    #[serde(default)]
    pub fixed: f64,
    /// Yearly operation and maintenance, share of the investment (0.02 = 2 %).
    #[serde(default)]
    pub yearly_share: f64,
}
