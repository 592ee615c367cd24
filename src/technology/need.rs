//! What a duty asks of a store, and the screening that answers it: the values that travel.

use serde::{Deserialize, Serialize};

use super::catalogue::Market;
use crate::chart::Verdict;

/// What is asked of a store. A value that is none was not asked and is not judged.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Need {
    /// Discharge power at the connection point, kW.
    pub discharge_kw: f64,
    /// Charge power at the connection point, kW.
    pub charge_kw: f64,
    /// Energy delivered at the connection point, kWh.
    pub energy_kwh: f64,
    /// Least round-trip efficiency, share.
    pub round_trip_efficiency: Option<f64>,
    /// Steepest ramp, kW/s.
    pub ramp_kw_per_s: Option<f64>,
    /// Mean hold of the stored energy, s.
    pub mean_hold_s: Option<f64>,
    /// Equivalent full cycles a year.
    pub cycles_per_year: Option<f64>,
    /// Service life, years.
    pub service_life_years: Option<f64>,
    /// Longest time to full power, s.
    pub response_s: Option<f64>,
    /// Longest break when the store takes over, s.
    pub transfer_s: Option<f64>,
    /// Greatest installed mass, kg.
    pub mass_budget_kg: Option<f64>,
    /// Greatest installed volume, l.
    pub volume_budget_l: Option<f64>,
    /// Lowest and highest air temperature at the store, degrees Celsius.
    pub ambient_c: Option<(f64, f64)>,
    /// Whether the store stands indoors.
    pub indoors: Option<bool>,
    /// Margin with which the typical value must meet a criterion, share (0.1 = 10 %). It is applied to what would be
    /// needed (mass, power, cycles) and, for efficiencies, to the losses.
    pub margin: f64,
}

impl Need {
    /// The power that is asked for: discharge, or charge where nothing is discharged, kW; 0 if nothing is.
    pub fn power_kw(&self) -> f64 {
        let discharge = sound(self.discharge_kw);
        if discharge > 0.0 { discharge } else { sound(self.charge_kw) }
    }

    /// The energy asked for, kWh; 0 if none is.
    pub fn energy_kwh(&self) -> f64 {
        sound(self.energy_kwh)
    }

    /// Energy over power, s; none unless both are asked.
    pub fn duration_s(&self) -> Option<f64> {
        let seconds = self.energy_kwh() / self.power_kw() * 3600.0;
        (seconds > 0.0 && seconds.is_finite()).then_some(seconds)
    }

    /// The margin, from 0 up.
    pub fn margin(&self) -> f64 {
        sound(self.margin)
    }
}

/// A finite number above zero, or zero.
fn sound(value: f64) -> f64 {
    if value > 0.0 && value.is_finite() { value } else { 0.0 }
}

/// A quantity on which kinds are judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Criterion {
    /// Discharge power.
    DischargePower,
    /// Charge power.
    ChargePower,
    /// Energy delivered over the duration.
    Energy,
    /// Duration.
    Duration,
    /// Ramp.
    Ramp,
    /// Time to full power.
    Response,
    /// Break at take-over.
    Transfer,
    /// Round-trip efficiency at the duration.
    RoundTripEfficiency,
    /// Losses while energy is held.
    SelfDischarge,
    /// Cycle life.
    Cycles,
    /// Calendar life.
    ServiceLife,
    /// Installed mass.
    Mass,
    /// Installed volume.
    Volume,
    /// Air temperature.
    Ambient,
    /// Size of plants that are built.
    PlantSize,
    /// The place.
    Siting,
    /// The market.
    Market,
}

/// A figure at the typical value and at the good end of the range.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Pair {
    /// At typical values.
    pub typical: f64,
    /// At the good end.
    pub good: f64,
}

/// A criterion judged.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Judged {
    /// What was judged.
    pub quantity: Criterion,
    /// The verdict.
    pub verdict: Verdict,
    /// The number that decided, with its unit, in a sentence.
    pub reason: String,
    /// Whether the deciding number was read in a source; otherwise it is from memory.
    pub confirmed: bool,
    /// What would turn a verdict that is not "carries", in a sentence; empty otherwise.
    pub turn: String,
    /// Asked over offered at typical values and at the good end (1 = just met); none where no number was weighed.
    pub load: Option<Pair>,
}

/// A kind screened.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Screened {
    /// Identifier in the catalogue.
    pub technology: String,
    /// Name for people.
    pub name: String,
    /// The worst verdict of its criteria.
    pub verdict: Verdict,
    /// Whether all numbers that decided were read in a source.
    pub confirmed: bool,
    /// Installed mass needed, kg; none where the published figure is not a plant's mass.
    pub mass_kg: Option<Pair>,
    /// Installed volume needed, l; none likewise.
    pub volume_l: Option<Pair>,
    /// The criteria, in a fixed order.
    pub criteria: Vec<Judged>,
    /// The number that decided and what would turn it, in a line.
    pub deciding: String,
    /// Caution in plain words.
    pub hazards: String,
    /// What the place must have.
    pub siting: String,
    /// Market.
    pub market: Market,
    /// Whether it is shown at first.
    pub default_on: bool,
}

/// A screening: every kind of the catalogue judged on a need.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Screening {
    /// Energy over power of the need, s; none if nothing is asked.
    pub duration_s: Option<f64>,
    /// The kinds, in the catalogue's order.
    pub technologies: Vec<Screened>,
}

impl Screening {
    /// The kind with an identifier.
    pub fn find(&self, id: &str) -> Option<&Screened> {
        self.technologies.iter().find(|screened| screened.technology == id)
    }
}
