//! The sheet: everything the page shows of a site and its case, computed in one place.
//!
//! The result object, the sentences, the pictures' series and the tables' rows. The page lays them out and computes
//! nothing; the statement quotes the same words.

mod lay;
mod listed;
mod pictures;

pub use lay::Lay;

use serde::{Deserialize, Serialize};

use crate::case::Connection;
use crate::chart;
use crate::duty::Duty;
use crate::fault::{Fault, Result};
use crate::record::{Finding, Reading};
use crate::result::SiteResult;
use crate::statement::words::tables;
use crate::technology::Screened;

/// What the page asks to see; not part of the case, since results do not depend on it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct View {
    /// Window of the net power picture, clock readings in microseconds; none = around the largest deficit.
    pub window_us: Option<(f64, f64)>,
    /// What the plane's axes are divided by.
    pub basis: chart::Basis,
    /// All kinds on the plane and in the verdicts, not only those a site can buy.
    pub all_kinds: bool,
    /// Technologies picked, at most four, in the order of their letters.
    pub picks: Vec<String>,
}

/// Everything the page shows.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Sheet {
    /// The result object as JSON, byte for byte what the terminal writes.
    pub result: String,
    /// Name of the site.
    pub site: String,
    /// What stopped the work, if anything did.
    pub error: Option<Fault>,
    /// Islanded or connected.
    pub connection: Option<Connection>,
    /// The audit.
    pub findings: Vec<Finding>,
    /// The requirement's criteria in words: quantity, bound, value, unit, origin, from, how sure.
    pub criteria: Vec<Vec<String>>,
    /// Capacity in words: power, unserved share (%), least capacity (kWh inside).
    pub coverage: Vec<Vec<String>>,
    /// Time-scale bands in words: time scales, charge and discharge (kW), energy (kWh).
    pub bands: Vec<Vec<String>>,
    /// Verdicts, kind by kind.
    pub screening: Vec<Screened>,
    /// Every number of the result by its path.
    pub listed: Vec<Listed>,
    /// How the files were read.
    pub reading: Reading,
    /// Title block and rail.
    pub heads: Heads,
    /// Sentence, figures and notes of each station.
    pub record: Station,
    /// The duty's.
    pub duty: Station,
    /// The requirement's.
    pub requirement: Station,
    /// The plane's.
    pub plane: Station,
    /// The largest deficit episodes, then surplus episodes, by energy.
    pub episodes: Vec<EpisodeRow>,
    /// Terms of the duty as they are in force (limits filled in where they were guessed).
    pub terms: Terms,
    /// The pictures' series.
    pub pictures: Pictures,
}

/// Title block and rail.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Heads {
    /// Names of the files.
    pub record: String,
    /// "islanded" or "connected".
    pub connection: String,
    /// "UTC+1, 15 min".
    pub clock: String,
    /// "0.1.0, zones 2026a".
    pub version: String,
}

/// What a station says.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Station {
    /// The plain sentence that states the result.
    pub sentence: String,
    /// The one figure on the rail ("102 MWh deficit").
    pub rail: String,
    /// A warning on the rail ("3 findings change figures"), or empty.
    pub warning: String,
    /// Key figures, in groups: beside the sentence first, then one group beside each picture.
    pub figures: Vec<Vec<Figure>>,
    /// "How this was computed", one per picture or table.
    pub method: Vec<Method>,
    /// Further notes in words (guess of the connection, screening note).
    pub notes: Vec<String>,
}

/// A key figure.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Figure {
    /// Path in the result object, such as `duty.deficit_kwh`; empty where it is not in it.
    pub path: String,
    /// The unrounded number in the field's unit.
    pub value: Option<f64>,
    /// Label.
    pub label: String,
    /// Rounded and scaled, for people.
    pub number: String,
    /// Its unit.
    pub unit: String,
    /// One line of context.
    pub context: String,
}

/// How something was computed.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Method {
    /// Muted words beside the fold's name ("supply minus demand, interval by interval").
    pub summary: String,
    /// Sentences before the formula.
    pub text: String,
    /// The formula in plain text with Unicode letters; empty if none.
    pub formula: String,
    /// Source.
    pub source: String,
    /// Limits: where it stops holding.
    pub limits: String,
}

/// A number of the result, for the folds that list them all.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Listed {
    /// Path in the result object.
    pub path: String,
    /// The unrounded number as JSON writes it.
    pub value: String,
    /// Rounded to six places, grouped.
    pub shown: String,
    /// Unit; empty for counts.
    pub unit: String,
}

/// An episode in the list.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct EpisodeRow {
    /// Start, clock reading in words.
    pub began: String,
    /// End.
    pub ended: String,
    /// Start, microseconds of clock reading, to move the window there.
    pub from_us: f64,
    /// End.
    pub to_us: f64,
    /// Hours.
    pub hours: f64,
    /// Energy, kWh, negative for a deficit.
    pub energy_kwh: f64,
    /// Peak, kW, negative for a deficit.
    pub peak_kw: f64,
}

/// The duty's terms in force.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Terms {
    /// Kind of duty.
    pub kind: String,
    /// Import limit, kW.
    pub import_limit_kw: Option<f64>,
    /// Export limit, kW.
    pub export_limit_kw: Option<f64>,
    /// Power both ways of the asked point, kW.
    pub power_kw: f64,
    /// Served share of the asked point.
    pub served_share: f64,
    /// Charge efficiency in force, share.
    pub charge_efficiency: f64,
    /// Discharge efficiency in force, share.
    pub discharge_efficiency: f64,
    /// Whether the efficiencies are assumed, since none were entered.
    pub efficiency_assumed: bool,
}

/// The pictures' data.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Pictures {
    /// 1.1 The year at a glance.
    pub year: chart::YearSheet,
    /// Beside it, the duration curve.
    pub duration: chart::DurationCurve,
    /// 2.1 Net power.
    pub net: chart::NetPower,
    /// 3.1 Coverage against delivered energy.
    pub coverage: chart::Coverage,
    /// 3.2 The deciding week with the asked store.
    pub week: Option<chart::Week>,
    /// 3.3 The cumulative energy curve.
    pub cumulative: chart::Cumulative,
    /// 4.1 The plane.
    pub plane: chart::Plane,
}

impl Pictures {
    /// Every long series, in a fixed order, so that they can travel as transferred buffers apart from the envelope.
    pub fn columns_mut(&mut self) -> Vec<&mut chart::Column> {
        let mut columns = vec![
            &mut self.year.net_kw,
            &mut self.duration.hours,
            &mut self.duration.net_kw,
            &mut self.net.t_us,
            &mut self.net.least_kw,
            &mut self.net.greatest_kw,
            &mut self.net.strip_us,
            &mut self.net.strip_kw,
            &mut self.cumulative.t_us,
            &mut self.cumulative.energy_kwh,
        ];
        for curve in &mut self.coverage.curves {
            columns.push(&mut curve.energy_kwh);
            columns.push(&mut curve.value);
        }
        if let Some(week) = &mut self.week {
            columns.extend([&mut week.t_us, &mut week.asked_kw, &mut week.carried_kw, &mut week.level]);
        }
        columns
    }
}

impl Sheet {
    /// A sheet with the result's parts and nothing else yet.
    ///
    /// # Errors
    /// If the result cannot be written as JSON.
    fn of(result: &SiteResult) -> Result<Self> {
        let unwritable = |error: serde_json::Error| {
            Fault::new(format!("the result cannot be written: {error}"), "engine", "Report this as a defect.")
        };
        let requirement = result.requirement.as_ref();
        Ok(Self {
            result: serde_json::to_string(result).map_err(unwritable)?,
            site: result.site.clone(),
            error: result.error.clone(),
            connection: result.duty.as_ref().map(|duty| duty.connection),
            findings: result.record.as_ref().map(|record| record.findings.clone()).unwrap_or_default(),
            criteria: requirement.map(|part| tables::criteria(&part.criteria)).unwrap_or_default(),
            coverage: requirement.map(|part| tables::coverage(&part.coverage)).unwrap_or_default(),
            bands: requirement.map(|part| tables::bands(&part.bands)).unwrap_or_default(),
            screening: result.screening.clone(),
            listed: listed::numbers(&serde_json::to_value(result).map_err(unwritable)?),
            reading: Reading::default(),
            heads: Heads::default(),
            record: Station::default(),
            duty: Station::default(),
            requirement: Station::default(),
            plane: Station::default(),
            episodes: Vec::new(),
            terms: Terms::default(),
            pictures: Pictures::default(),
        })
    }
}

/// Most episodes of each sign in the list.
const LISTED: usize = 10;

/// The largest deficit episodes, then the largest surplus episodes, each by energy.
fn episodes(duty: &Duty) -> Vec<EpisodeRow> {
    let clock = &duty.record.clock;
    let step_h = duty.record.step_h();
    [-1.0, 1.0]
        .into_iter()
        .flat_map(|sign| {
            // They come in the order of their starts, which equal energies keep.
            let side: Vec<_> =
                duty.episodes.iter().filter(|episode| episode.energy_kwh * sign > 0.0).collect();
            pictures::largest(&side, LISTED)
        })
        .map(|episode| {
            let end = episode.start + episode.steps;
            let (from_us, to_us) =
                (pictures::reading_us(clock, episode.start), pictures::reading_us(clock, end));
            EpisodeRow {
                began: chart::ticks::moment(from_us),
                ended: chart::ticks::moment(to_us),
                from_us,
                to_us,
                hours: episode.steps as f64 * step_h,
                energy_kwh: episode.energy_kwh,
                peak_kw: episode.peak_kw,
            }
        })
        .collect()
}
