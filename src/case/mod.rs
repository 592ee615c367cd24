//! The case: everything a person chose, in one value that travels as JSON.
//!
//! The same case and the same version give the same results, bit for bit. Unknown fields are errors that name their path;
//! a missing field takes its default; every number is checked for its range when the case is read.

mod check;

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::fault::{Fault, Result};
use crate::record::Role;

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

/// How the record is read; what is not given is guessed.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct RecordCase {
    /// Whether a stamp marks the start (the default) or the end of its interval.
    pub stamp: Stamp,
    /// Whether values are averages of intervals (the default) or instantaneous samples.
    pub reading: Values,
    /// IANA name of the zone of the stamps.
    pub zone: Option<String>,
    /// Length of an interval in seconds.
    pub step_s: Option<f64>,
    /// Role of each column by its header (or `file/header`).
    pub roles: BTreeMap<String, Role>,
    /// Unit of each column by its header (or `file/header`): W, kW, MW, Wh, kWh, MWh.
    pub units: BTreeMap<String, String>,
    /// Separator of cells, where the guess is wrong.
    pub separator: Option<char>,
    /// Decimal mark, where the guess is wrong.
    pub decimal: Option<char>,
    /// Order of the stamps, where the guess is wrong.
    pub date_order: Option<DateOrder>,
    /// What is done about gaps and repeats.
    pub remedies: Remedies,
}

/// Which end of the interval a stamp marks.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Stamp {
    /// The start.
    #[default]
    Start,
    /// The end.
    End,
}

/// What a value stands for.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Values {
    /// The average power of the interval, or the energy in it.
    #[default]
    Intervals,
    /// Instantaneous values, joined by straight lines.
    Samples,
}

/// The order of day, month and year in a stamp.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum DateOrder {
    /// 2026-03-31
    YearFirst,
    /// 31.03.2026
    DayFirst,
    /// 03/31/2026
    MonthFirst,
}

/// Remedies for gaps and repeats.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct Remedies {
    /// For missing values.
    pub gap: GapRemedy,
    /// For stamps that come more than once.
    pub repeat: RepeatRemedy,
}

/// What is done about missing values.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum GapRemedy {
    /// The interval ends an episode and contributes nothing.
    #[default]
    LeaveOut,
    /// The last value is held.
    Hold,
    /// A straight line joins the neighbours.
    Line,
    /// Zero.
    Zero,
    /// The mean of the same time on the neighbouring days.
    NeighbourDays,
}

/// What is done about stamps that come more than once.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum RepeatRemedy {
    /// The first row counts.
    #[default]
    First,
    /// The last row counts.
    Last,
    /// The mean of the rows.
    Mean,
}

/// What storage is asked to do.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
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
#[serde(rename_all = "snake_case")]
pub enum Positive {
    /// Charging.
    #[default]
    Charge,
    /// Discharging.
    Discharge,
}

/// Terms of the requirement.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
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
#[serde(rename_all = "snake_case")]
pub enum Balance {
    /// It must: the record is repeated.
    #[default]
    Cyclic,
    /// It need not.
    Free,
}

/// Facts about the site; what is null is not asked.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
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
#[serde(rename_all = "snake_case")]
pub enum Connection {
    /// No grid.
    Islanded,
    /// A grid connection.
    Connected,
}

/// A store to be simulated.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum Store {
    /// A store of fixed efficiencies.
    Fixed(FixedStore),
}

/// A store of fixed efficiencies; powers at the terminals, energy inside.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
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
