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
        /// Limits of hours and days, such as `Mon-Fri 07:00-19:00: 40 kW`; of all limits that apply the lowest holds.
        #[serde(default)]
        hours: Vec<String>,
        /// Column of import limits.
        #[serde(default)]
        import_limit_column: Option<String>,
        /// Column of export limits.
        #[serde(default)]
        export_limit_column: Option<String>,
        /// Greatest apparent power drawn, kVA: with the reactive power Q the import limit is the root of S2 - Q2.
        #[serde(default)]
        import_limit_kva: Option<f64>,
        /// Column of reactive power, kvar; none = the column of that role.
        #[serde(default)]
        reactive: Option<String>,
        /// How the month's peak is billed; none = not reckoned.
        #[serde(default)]
        billing: Option<Billing>,
    },
    /// Carry the power of a column.
    Given {
        /// Header of the column.
        column: String,
        /// Which sign charges the store.
        #[serde(default)]
        positive: Positive,
    },
    /// Hold the ramps of supply or net power down.
    Smoothing(Smoothing),
    /// Make a fixed output of supply or net power: block by block, by a schedule, or one constant.
    Firming(Firming),
    /// Carry the critical demand through an outage that may begin at any interval.
    RideThrough(RideThrough),
    /// Answer the grid's frequency.
    Frequency(Frequency),
    /// Charge when the price is low and discharge when it is high.
    Shifting(Shifting),
}

impl DutyCase {
    /// Limits with the default terms.
    pub fn limits(import_limit_kw: Option<f64>, export_limit_kw: Option<f64>) -> Self {
        Self::Limits {
            import_limit_kw,
            export_limit_kw,
            recharge_from_grid: true,
            discharge_to_grid: false,
            hours: Vec::new(),
            import_limit_column: None,
            export_limit_column: None,
            import_limit_kva: None,
            reactive: None,
            billing: None,
        }
    }

    /// Headers of the columns that the terms name: the reader keeps them.
    pub fn columns(&self) -> Vec<String> {
        let named: Vec<Option<&String>> = match self {
            Self::Guess {} | Self::Balance {} | Self::Smoothing(_) => Vec::new(),
            Self::Limits { import_limit_column, export_limit_column, reactive, .. } => {
                vec![import_limit_column.as_ref(), export_limit_column.as_ref(), reactive.as_ref()]
            }
            Self::Given { column, .. } => vec![Some(column)],
            Self::Firming(terms) => vec![terms.schedule.as_ref()],
            Self::RideThrough(terms) => vec![terms.critical.as_ref()],
            Self::Frequency(terms) => vec![Some(&terms.column)],
            Self::Shifting(terms) => vec![Some(&terms.price)],
        };
        named.into_iter().flatten().cloned().collect()
    }
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

/// How the greatest import of a month is billed.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct Billing {
    /// Price of a kW of the month's billed peak, in the person's currency.
    pub rate_per_kw: f64,
    /// Share of the highest peak of the months before below which no month is billed; none = each month by itself.
    #[serde(default)]
    pub ratchet_share: Option<f64>,
    /// How many months before count for the ratchet.
    #[serde(default = "eleven")]
    pub ratchet_months: u32,
}

fn eleven() -> u32 {
    11
}

/// The power that is smoothed or made firm.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum SeriesOf {
    /// The supply.
    #[default]
    Supply,
    /// Net power.
    Net,
}

/// How the smoothed output is found.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum SmoothingMethod {
    /// From what has been measured so far: the output follows the power as fast as it may.
    #[default]
    Causal,
    /// Knowing the record: the least power.
    LeastPower,
    /// Knowing the record: the least energy; a bound.
    LeastEnergy,
}

/// Terms of smoothing.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct Smoothing {
    /// Which power.
    pub series: SeriesOf,
    /// Steepest ramp of the output, kW a minute.
    pub ramp_kw_per_min: Option<f64>,
    /// The same as a share of the rating a minute (0.1 = 10 %), with `rating_kw`.
    pub ramp_share_per_min: Option<f64>,
    /// Rating of the plant, kW.
    pub rating_kw: Option<f64>,
    /// How the output is found.
    pub method: SmoothingMethod,
    /// With `causal`: hours in which the output gives back what the store has gathered, so that its level does not drift;
    /// none = no such return.
    pub feedback_h: Option<f64>,
    /// With `least_energy`: the day of the record that is looked at, such as 2026-06-21; none = the whole record.
    pub day: Option<String>,
}

impl Smoothing {
    /// The steepest ramp, kW a minute; none where the terms do not say.
    pub fn ramp(&self) -> Option<f64> {
        self.ramp_kw_per_min.or_else(|| Some(self.ramp_share_per_min? * self.rating_kw?))
    }
}

/// Terms of firming: one of `block_s`, `schedule`, `constant`.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct Firming {
    /// Which power.
    pub series: SeriesOf,
    /// Length of a block of constant output, s; blocks begin at the record's start.
    pub block_s: Option<f64>,
    /// Column of the output, kW.
    pub schedule: Option<String>,
    /// One output for the whole record.
    pub constant: bool,
}

/// Terms of riding through outages.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct RideThrough {
    /// Length of an outage, s; rounded up to whole intervals.
    pub outage_s: f64,
    /// Share of demand that is critical.
    #[serde(default = "whole")]
    pub critical_share: f64,
    /// Column of critical demand, in place of the share.
    #[serde(default)]
    pub critical: Option<String>,
    /// Share of supply that works during an outage.
    #[serde(default)]
    pub supply_share: f64,
    /// Whether an outage may run over the record's end into its beginning.
    #[serde(default = "yes")]
    pub wraps: bool,
}

/// Terms of answering frequency. The defaults are common practice for a 50 Hz grid, no source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct Frequency {
    /// Column of the grid's frequency, Hz.
    pub column: String,
    /// Frequency at which nothing is asked, Hz.
    #[serde(default = "fifty")]
    pub nominal_hz: f64,
    /// Deviation up to which nothing is asked, Hz.
    #[serde(default = "dead_band")]
    pub dead_band_hz: f64,
    /// Deviation at which the whole rating is asked, Hz.
    #[serde(default = "full_activation")]
    pub full_activation_hz: f64,
    /// Power at full activation, kW.
    pub rating_kw: f64,
    /// Power with which the store returns to its level inside the dead band, kW.
    #[serde(default)]
    pub recovery_kw: f64,
}

/// Terms of shifting by price. Efficiencies and self-discharge are the requirement's.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct Shifting {
    /// Column of the price, of a kWh or (by its unit) of a MWh.
    pub price: String,
    /// Charge power, kW.
    pub charge_kw: f64,
    /// Discharge power, kW.
    pub discharge_kw: f64,
    /// Usable energy inside, kWh.
    pub energy_kwh: f64,
    /// Wear of a kWh discharged at the terminals, in the price's currency.
    #[serde(default)]
    pub wear_per_kwh: f64,
    /// Stored energy at the start, kWh.
    #[serde(default)]
    pub start_kwh: f64,
    /// Stored energy at the end, kWh; none = free.
    #[serde(default)]
    pub end_kwh: Option<f64>,
    /// How far ahead prices are known.
    #[serde(default)]
    pub foresight: Foresight,
}

/// How far ahead prices are known.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Foresight {
    /// Over the whole record.
    #[default]
    Full,
    /// To the end of the day: each day is planned by itself, from the level that the day before left.
    DayAhead,
}

fn whole() -> f64 {
    1.0
}

fn fifty() -> f64 {
    50.0
}

fn dead_band() -> f64 {
    0.02
}

fn full_activation() -> f64 {
    0.2
}
