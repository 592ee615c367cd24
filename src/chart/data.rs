//! What each picture shows, as plain series: made by the engine, sent to the page, drawn by the functions of this folder.
//!
//! Series are decimated to about a picture's width before they get here; a missing value is NaN *in these series only*
//! (they are for the eye, never for a figure), and lifts the pen. Times are microseconds of *clock reading* (the instant
//! plus the record's offset), so that a picture needs no zone table to write its ticks.

use serde::{Deserialize, Serialize};

/// A series for the eye. Travels as a transferred buffer, apart from its envelope.
pub type Column = Vec<f64>;

/// The year sheet: a row per week, Monday to Sunday to the right, hourly means of net power.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct YearSheet {
    /// Clock reading of the first cell, at a Monday 00:00, microseconds.
    pub start_us: f64,
    /// Seconds per cell (3600 for a year; 900, 60... for short records, at most 168 cells... per row of `cells_per_row`).
    pub cell_s: f64,
    /// Cells in a row (7 days).
    pub cells_per_row: usize,
    /// Mean net power of each cell, kW, row by row from `start_us`; NaN where the record has nothing.
    pub net_kw: Column,
    /// The critical period (first and last clock reading, microseconds), if there is one.
    pub critical_us: Option<(f64, f64)>,
}

/// The duration curve of net power, on the year sheet's power axis.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct DurationCurve {
    /// Hours reached or exceeded.
    pub hours: Column,
    /// Net power, kW, falling.
    pub net_kw: Column,
    /// Surplus and deficit, kWh.
    pub surplus_kwh: f64,
    /// Deficit, kWh.
    pub deficit_kwh: f64,
    /// Import limit as an ink line, kW of import (drawn at minus this net power), for connected sites.
    pub import_limit_kw: Option<f64>,
    /// Word for the deficit side: "deficit", or "import" at a connected site.
    pub deficit_word: String,
}

/// Net power over a window, with the largest episodes as dimensions, and a strip of daily means below.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct NetPower {
    /// Clock reading at each sample of the window, microseconds.
    pub t_us: Column,
    /// Least net power in the sample's span, kW.
    pub least_kw: Column,
    /// Greatest net power in the sample's span, kW (equal to the least where nothing was merged).
    pub greatest_kw: Column,
    /// Largest episodes in the window.
    pub episodes: Vec<EpisodeMark>,
    /// Clock reading at the start of each cell of the strip, microseconds.
    pub strip_us: Column,
    /// Mean net power of each cell of the strip, kW.
    pub strip_kw: Column,
    /// The window within the strip, microseconds.
    pub window_us: (f64, f64),
    /// Limit lines in net power, kW (minus the import limit, plus the export limit).
    pub limits_kw: Vec<f64>,
}

/// An episode marked on a picture.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
pub struct EpisodeMark {
    /// From, clock reading, microseconds.
    pub from_us: f64,
    /// To, clock reading, microseconds.
    pub to_us: f64,
    /// Energy, kWh; negative for a deficit.
    pub energy_kwh: f64,
}

/// A share (0 to 1) or a held limit (kW) against delivered energy, for up to three powers, with marked points.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Coverage {
    /// What the upright axis holds.
    pub measure: Measure,
    /// The curves, the chosen power first.
    pub curves: Vec<CoverageCurve>,
    /// Points named on the first curve: knee, asked, no deficit.
    pub marks: Vec<CoverageMark>,
}

/// What a coverage picture measures.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Measure {
    /// Share of the deficit served.
    #[default]
    ServedShare,
    /// Share of demand met on the site.
    SelfSufficiency,
    /// Import limit that can be held, kW.
    HeldImportKw,
    /// Share of the discharge that a duty asks which is carried.
    CarriedShare,
}

/// One curve of a coverage picture.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct CoverageCurve {
    /// Power both ways, kW; none = no limit.
    pub power_kw: Option<f64>,
    /// Delivered energy, kWh, rising.
    pub energy_kwh: Column,
    /// The measure there.
    pub value: Column,
}

/// A point named on a coverage curve.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct CoverageMark {
    /// Its name: "knee", "asked", "no deficit".
    pub name: String,
    /// Delivered energy, kWh.
    pub energy_kwh: f64,
    /// The measure there.
    pub value: f64,
}

/// The cumulative energy curve with the critical period.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Cumulative {
    /// Clock reading, microseconds.
    pub t_us: Column,
    /// Net energy since the start, after losses, kWh inside the store.
    pub energy_kwh: Column,
    /// The critical period, if there is a fall.
    pub critical: Option<Critical>,
}

/// The period whose fall is the capacity.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
pub struct Critical {
    /// Its start, clock reading, microseconds.
    pub from_us: f64,
    /// Its end, clock reading, microseconds (past the picture's end where it runs over the record's end).
    pub to_us: f64,
    /// Level of the curve at its start, kWh.
    pub from_kwh: f64,
    /// Level at its end, kWh.
    pub to_kwh: f64,
    /// The fall as delivered energy, kWh: the number written at the dimension.
    pub delivered_kwh: f64,
}

/// The deciding week: what was asked of a store, what it carried, what stayed unserved, and its level.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Week {
    /// Clock reading, microseconds.
    pub t_us: Column,
    /// Power asked, kW, positive = charge.
    pub asked_kw: Column,
    /// Power carried, kW, positive = charge. What is asked and not carried is unserved (negative) or curtailed (positive).
    pub carried_kw: Column,
    /// Stored energy at the start of each sample, share of the usable capacity, 0 to 1.
    pub level: Column,
    /// The store in words ("4.7 MWh delivered, 87 kW").
    pub store: String,
    /// Word for what stays unserved: "unserved", or "remaining import" at a connected site.
    pub unserved_word: String,
}

/// The Ragone plane.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Plane {
    /// What the axes are divided by.
    pub basis: Basis,
    /// The kinds drawn.
    pub strands: Vec<Strand>,
    /// Power of the requirement, kW, and energy delivered, kWh: the ink line of constant energy over power, or, on the
    /// absolute plane, the point itself.
    pub requirement: Option<(f64, f64)>,
    /// Where the budget puts the requirement on its line: energy and power per kg or per l (absolute: kWh and kW).
    pub point: Option<(f64, f64)>,
    /// The budget in words ("80 t").
    pub budget: String,
}

/// What the plane's axes are divided by.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Basis {
    /// Wh/kg and W/kg, installed.
    #[default]
    Mass,
    /// Wh/l and W/l, installed.
    Volume,
    /// kWh and kW of plants that are built.
    Absolute,
}

/// A kind of storage on the plane: curves of deliverable energy against power.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Strand {
    /// Identifier in the catalogue.
    pub technology: String,
    /// Name for people.
    pub name: String,
    /// Whether the figures are of the working fluid or moved mass only (drawn beaded, never a plant mass).
    pub fluid_only: bool,
    /// The typical curve: (energy, power) in the units of the basis.
    pub typical: Vec<(f64, f64)>,
    /// Curves from the energy-rich to the power-rich end of the range, without the typical one.
    pub others: Vec<Vec<(f64, f64)>>,
    /// Where the typical curve meets the requirement line, with the verdict shown as a mark.
    pub meets: Option<(f64, f64)>,
    /// The verdict.
    pub verdict: Option<Verdict>,
    /// Candidate letter (0 = A) if picked.
    pub candidate: Option<u8>,
}

/// A verdict as drawn.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Verdict {
    /// The typical value meets it with the margin.
    Carries,
    /// Only the good end of its range does.
    Strains,
    /// Not even the good end does.
    Fails,
}
