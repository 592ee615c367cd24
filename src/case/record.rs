//! How the record is read.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::record::Role;

/// How the record is read; what is not given is guessed.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct RecordCase {
    /// Whether a stamp marks the start or the end of its interval; none = the start, unless the files say otherwise.
    pub stamp: Option<Stamp>,
    /// Whether values are averages of intervals (the default) or instantaneous samples.
    pub reading: Values,
    /// IANA name of the zone of the stamps.
    pub zone: Option<String>,
    /// Length of an interval in seconds.
    pub step_s: Option<f64>,
    /// Role of each column by its header (or `file/header`).
    #[serde(deserialize_with = "super::read::each_once")]
    pub roles: BTreeMap<String, Role>,
    /// Unit of each column by its header (or `file/header`): W, kW, MW, Wh, kWh, MWh.
    #[serde(deserialize_with = "super::read::each_once")]
    pub units: BTreeMap<String, String>,
    /// Factor for the values of a column by its header (or `file/header`), such as the rating for a series per rated kW.
    #[serde(deserialize_with = "super::read::each_once")]
    pub scale: BTreeMap<String, f64>,
    /// The sheet to read of each workbook, by the workbook's file name, where the guess is wrong.
    #[serde(deserialize_with = "super::read::each_once")]
    pub sheets: BTreeMap<String, String>,
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
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
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
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
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
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
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
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct Remedies {
    /// For missing values.
    pub gap: GapRemedy,
    /// For stamps that come more than once.
    pub repeat: RepeatRemedy,
}

/// What is done about missing values.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
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
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
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
