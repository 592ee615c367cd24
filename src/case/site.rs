//! Facts about the site.

use serde::{Deserialize, Serialize};

/// Facts about the site; what is null is not asked.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct SiteCase {
    /// Islanded or connected; none = guessed.
    pub connection: Option<Connection>,
    /// Greatest installed mass of the store, kg.
    pub mass_budget_kg: Option<f64>,
    /// Greatest installed volume of the store, l.
    pub volume_budget_l: Option<f64>,
    /// Service life, years.
    pub service_life_years: Option<f64>,
    /// Longest time to full power, s.
    pub response_s: Option<f64>,
    /// Longest break when the store takes over, s (0 = none).
    pub transfer_s: Option<f64>,
    /// Whether the store stands indoors.
    pub indoors: Option<bool>,
    /// Lowest air temperature at the store, degrees Celsius.
    pub ambient_least_c: Option<f64>,
    /// Highest air temperature at the store, degrees Celsius.
    pub ambient_greatest_c: Option<f64>,
    /// What the site has, in words, free text.
    pub notes: String,
}

/// How the site stands to a grid.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Connection {
    /// No grid.
    Islanded,
    /// A grid connection.
    Connected,
}
