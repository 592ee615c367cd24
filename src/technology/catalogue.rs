//! The catalogue: published ranges of 27 kinds of storage, the circuit of each, and what each asks of a site.
//!
//! Three tables are compiled in. Every range keeps its unit, basis, year, source and confidence, so that a verdict can
//! say which number decided and whether anyone has read it. How the tables came about, where sources disagree and what
//! the numbers must not be used for is written in the notes beside them; the short of it: screening only.

use std::borrow::Cow;

use serde::{Deserialize, Serialize};

use super::rows::{CircuitRow, RangeRow, SitingRow, table};
use crate::case::RangeEdit;
use crate::fault::{Fault, Result, quote};

/// Kinds of storage that the catalogue must hold.
const KINDS: usize = 27;

/// A numeric quantity of the catalogue.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Quantity {
    /// Rated energy per mass, Wh/kg, on the kind's own mass basis.
    SpecificEnergy,
    /// Power per mass, W/kg.
    SpecificPower,
    /// Rated energy per volume, Wh/l.
    EnergyDensity,
    /// Power per volume, W/l.
    PowerDensity,
    /// Round-trip efficiency, per cent.
    RoundTripEfficiency,
    /// Loss of rated energy in the first day or hour from full, per cent per day or per hour.
    SelfDischarge,
    /// Time to full power, s.
    ResponseTime,
    /// Discharge time at rated power, s.
    DischargeDuration,
    /// Full cycles to end of life.
    CycleLife,
    /// Years to end of life.
    CalendarLife,
    /// Usable share of the rated energy, per cent.
    DepthOfDischarge,
    /// Capital cost of power, USD/kW.
    PowerCost,
    /// Capital cost of energy, USD/kWh.
    EnergyCost,
    /// Yearly operation and maintenance, per cent of capital cost.
    FixedOm,
    /// Carbon of manufacture, kg CO2e per kWh of rated energy.
    EmbodiedCarbon,
    /// Temperature of the storage element, degrees Celsius.
    OperatingTemperature,
    /// Air temperature at the enclosure, degrees Celsius.
    AmbientTemperature,
    /// Technology readiness level, 1 to 9.
    Trl,
}

impl Quantity {
    /// All numeric quantities, in the order in which a [`Technology`] keeps its ranges.
    pub const ALL: [Self; 18] = [
        Self::SpecificEnergy,
        Self::SpecificPower,
        Self::EnergyDensity,
        Self::PowerDensity,
        Self::RoundTripEfficiency,
        Self::SelfDischarge,
        Self::ResponseTime,
        Self::DischargeDuration,
        Self::CycleLife,
        Self::CalendarLife,
        Self::DepthOfDischarge,
        Self::PowerCost,
        Self::EnergyCost,
        Self::FixedOm,
        Self::EmbodiedCarbon,
        Self::OperatingTemperature,
        Self::AmbientTemperature,
        Self::Trl,
    ];

    /// The quantity's word in the tables.
    pub fn word(self) -> &'static str {
        self.terms().0
    }

    /// The units in which the tables may give it.
    pub fn units(self) -> &'static [&'static str] {
        self.terms().1
    }

    fn terms(self) -> (&'static str, &'static [&'static str]) {
        match self {
            Self::SpecificEnergy => ("specific_energy", &["Wh/kg"]),
            Self::SpecificPower => ("specific_power", &["W/kg"]),
            Self::EnergyDensity => ("energy_density", &["Wh/L"]),
            Self::PowerDensity => ("power_density", &["W/L"]),
            Self::RoundTripEfficiency => ("round_trip_efficiency", &["%"]),
            Self::SelfDischarge => ("self_discharge", &["%/day", "%/h"]),
            Self::ResponseTime => ("response_time", &["s"]),
            Self::DischargeDuration => ("discharge_duration", &["s"]),
            Self::CycleLife => ("cycle_life", &["cycles"]),
            Self::CalendarLife => ("calendar_life", &["years"]),
            Self::DepthOfDischarge => ("depth_of_discharge", &["%"]),
            Self::PowerCost => ("power_cost", &["USD/kW"]),
            Self::EnergyCost => ("energy_cost", &["USD/kWh"]),
            Self::FixedOm => ("fixed_om", &["% of capex per year"]),
            Self::EmbodiedCarbon => ("embodied_carbon", &["kg CO2e/kWh"]),
            Self::OperatingTemperature => ("operating_temperature", &["degC"]),
            Self::AmbientTemperature => ("ambient_temperature", &["degC"]),
            Self::Trl => ("trl", &["level"]),
        }
    }
}

/// A published range, in the unit it was published in.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Range {
    /// Least credible value met.
    pub low: f64,
    /// A design value.
    pub typical: f64,
    /// Greatest credible value met.
    pub high: f64,
    /// Unit of the three.
    pub unit: String,
    /// What the value is per, and under which conditions.
    pub basis: String,
    /// Year of the source.
    pub year: u16,
    /// Source.
    pub source: String,
    /// Page or remark.
    pub source_detail: String,
    /// Whether every number was read in a page that is named; otherwise it is from memory.
    pub verified: bool,
}

/// Which lumped model stands for a kind.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Model {
    /// Energy in a potential (capacitor-like): series resistance, parallel leak.
    Potential,
    /// Energy in a motion or current (inductor-like), the dual: parallel conversion loss, series drag.
    Kinetic,
    /// Fixed efficiencies; the energy decays exponentially.
    Fixed,
}

/// Numbers of a kind's circuit, for a unit that delivers 1 kWh at its outer terminals at the reference power.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CircuitData {
    /// Model.
    pub model: Model,
    /// Reference power, kW per kWh.
    pub ref_power_kw: f64,
    /// Time of discharge at the reference power, s.
    pub ref_duration_s: f64,
    /// Energy inside the element between full and empty, kWh.
    pub internal_store_kwh: f64,
    /// State at empty over state at full (voltage, speed or current); 0 for fixed efficiencies.
    pub state_min_frac: f64,
    /// Conversion loss at the full state and reference power, share of that power; 0 for fixed efficiencies.
    pub conv_loss_frac: f64,
    /// Time constant of the state's (fixed efficiencies: of the energy's) decay, s; none = no leak.
    pub leak_time_constant_s: Option<f64>,
    /// Fixed part of the charge efficiency.
    pub eta_charge: f64,
    /// Fixed part of the discharge efficiency.
    pub eta_discharge: f64,
    /// Load drawn while energised, share of the reference power; not part of the round trip.
    pub standing_load_frac: f64,
    /// Whether the published self-discharge *is* the standing load (heaters of hot batteries): never count both.
    pub self_discharge_is_standing: bool,
    /// Remark.
    pub notes: String,
}

/// Whether a kind can stand in a building.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Indoors {
    /// As it is.
    Yes,
    /// With measures (fire separation, ventilation, containment).
    WithMeasures,
    /// Not.
    No,
}

/// How a kind is bought.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Market {
    /// Bought today for a single site.
    Site,
    /// Built by and for utilities.
    Utility,
    /// Demonstration plants exist.
    Demonstration,
    /// Experiments only.
    Experimental,
}

/// What a kind's mass figure is of.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum MassBasis {
    /// A whole device with its machine or winding.
    Device,
    /// Cells.
    Cell,
    /// Electrolyte.
    Electrolyte,
    /// Vessel with its content.
    Vessel,
    /// Working fluid only.
    Fluid,
    /// Lifted mass only.
    LiftedMass,
    /// Heat store media only.
    Media,
}

/// What a kind asks of a site. All of it is engineering judgement from memory.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Siting {
    /// Least plausible plant, kW.
    pub least_plant_kw: f64,
    /// Greatest plausible plant, kW.
    pub greatest_plant_kw: f64,
    /// Indoors.
    pub indoors: Indoors,
    /// What the site must have; empty = nothing special.
    pub needs: String,
    /// Market.
    pub market: Market,
    /// Whether it is shown at first.
    pub default_on: bool,
    /// What the mass figure is of.
    pub mass_basis: MassBasis,
    /// Factor from that mass (and volume) to an installed, packaged one; none = the figure is no plant mass at all.
    pub packing: Option<f64>,
    /// Whether the store with its usual converter takes over a load without a break.
    pub no_break: bool,
    /// Remark.
    pub note: String,
}

/// A kind of storage.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Technology {
    /// Identifier.
    pub id: String,
    /// Name for people.
    pub name: String,
    /// Principal hazards, as published text.
    pub hazards: String,
    /// Constraints on the place, as published text.
    pub constraints: String,
    /// Circuit.
    pub circuit: CircuitData,
    /// Siting facts.
    pub siting: Siting,
    ranges: Vec<Range>,
}

impl Technology {
    /// The published range of a quantity.
    pub fn range(&self, quantity: Quantity) -> &Range {
        // Built with one range per quantity, in the enum's order.
        &self.ranges[quantity as usize]
    }
}

/// All kinds of storage, in the order of the tables.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Catalogue {
    /// The kinds.
    pub technologies: Vec<Technology>,
}

impl Catalogue {
    /// The catalogue that is compiled in. Build it once and hand it around.
    ///
    /// # Errors
    /// If a table does not read or fails a check; that would be a defect of this program.
    ///
    /// ```
    /// use millpond::technology::{Catalogue, Quantity};
    /// let catalogue = Catalogue::published()?;
    /// assert_eq!(catalogue.technologies.len(), 27);
    /// let lfp = catalogue.find("li_ion_lfp").unwrap();
    /// assert_eq!(lfp.range(Quantity::SpecificEnergy).typical, 150.0);
    /// assert!(catalogue.find("perpetual_motion").is_none());
    /// # Ok::<(), millpond::fault::Fault>(())
    /// ```
    pub fn published() -> Result<Self> {
        Self::read(
            include_str!("catalogue/technologies.csv"),
            include_str!("catalogue/technology_circuits.csv"),
            include_str!("catalogue/technology_siting.csv"),
        )
    }

    /// The kind with an identifier.
    pub fn find(&self, id: &str) -> Option<&Technology> {
        self.technologies.iter().find(|technology| technology.id == id)
    }

    /// The catalogue with a person's own numbers in place of published ones; the original as it stands where there are none.
    ///
    /// # Errors
    /// If an edit names a kind that the catalogue does not hold.
    pub fn edited(&self, edits: &[RangeEdit]) -> Result<Cow<'_, Self>> {
        if edits.is_empty() {
            return Ok(Cow::Borrowed(self));
        }
        let mut catalogue = self.clone();
        for (i, edit) in edits.iter().enumerate() {
            let found = catalogue.technologies.iter_mut().find(|kind| kind.id == edit.technology);
            let Some(kind) = found else {
                let ids: Vec<&str> = self.technologies.iter().map(|kind| kind.id.as_str()).collect();
                return Err(Fault::new(
                    format!("the catalogue holds no kind {}", quote(&edit.technology)),
                    format!("case, at catalogue[{i}].technology"),
                    format!("Give one of: {}.", ids.join(", ")),
                ));
            };
            let range = &mut kind.ranges[edit.quantity as usize];
            (range.low, range.typical, range.high) = (edit.low, edit.typical, edit.high);
            range.verified = !edit.source.is_empty();
            range.source.clone_from(&edit.source);
            "given in the case".clone_into(&mut range.source_detail);
        }
        Ok(Cow::Owned(catalogue))
    }

    fn read(ranges: &str, circuits: &str, siting: &str) -> Result<Self> {
        let ranges: Vec<RangeRow> = table(ranges, "technologies.csv")?;
        let circuits: Vec<CircuitRow> = table(circuits, "technology_circuits.csv")?;
        let siting: Vec<SitingRow> = table(siting, "technology_siting.csv")?;
        if circuits.len() != KINDS
            || siting.len() != KINDS
            || ranges.len() != KINDS * (Quantity::ALL.len() + 3)
        {
            return Err(defect(
                format!(
                    "{} ranges, {} circuits and {} sitings do not make {KINDS} kinds",
                    ranges.len(),
                    circuits.len(),
                    siting.len()
                ),
                "the catalogue",
            ));
        }
        let technologies = circuits
            .into_iter()
            .map(|circuit| {
                let id = circuit.technology.clone();
                let place = siting.iter().find(|row| row.technology == id);
                let place = place
                    .ok_or_else(|| defect(format!("{id} has no siting row"), "technology_siting.csv"))?;
                technology(&ranges, circuit, place)
            })
            .collect::<Result<_>>()?;
        Ok(Self { technologies })
    }
}

fn technology(rows: &[RangeRow], circuit: CircuitRow, place: &SitingRow) -> Result<Technology> {
    let id = circuit.technology.clone();
    let row = |word: &str| {
        let mut found = rows.iter().filter(|row| row.technology == id && row.quantity == word);
        match (found.next(), found.next()) {
            (Some(row), None) => Ok(row),
            _ => Err(defect(format!("{id} does not have exactly one {word}"), "technologies.csv")),
        }
    };
    let ranges = Quantity::ALL
        .iter()
        .map(|quantity| range(row(quantity.word())?, *quantity))
        .collect::<Result<Vec<_>>>()?;
    Ok(Technology {
        name: row("display_name")?.typical.clone(),
        hazards: row("principal_hazards")?.typical.clone(),
        constraints: row("siting_constraints")?.typical.clone(),
        circuit: circuit.checked()?,
        siting: place.checked()?,
        ranges,
        id,
    })
}

fn range(row: &RangeRow, quantity: Quantity) -> Result<Range> {
    let place = || format!("technologies.csv, {}, {}", row.technology, row.quantity);
    let typical: f64 =
        row.typical.parse().map_err(|_error| defect(format!("{} is no number", row.typical), &place()))?;
    let (Some(low), Some(high)) = (row.low, row.high) else {
        return Err(defect("an end of the range is missing".to_owned(), &place()));
    };
    if !(low.is_finite() && high.is_finite() && low <= typical && typical <= high) {
        return Err(defect(format!("{low} to {high} does not hold its typical value {typical}"), &place()));
    }
    if !quantity.units().contains(&row.unit.as_str()) {
        return Err(defect(format!("the unit {} is not known", row.unit), &place()));
    }
    let verified = match row.confidence.as_str() {
        "verified" => true,
        "from memory" => false,
        other => return Err(defect(format!("the confidence {other} is not known"), &place())),
    };
    Ok(Range {
        low,
        typical,
        high,
        unit: row.unit.clone(),
        basis: row.basis.clone(),
        year: row.year,
        source: row.source.clone(),
        source_detail: row.source_detail.clone(),
        verified,
    })
}

/// A fault of the compiled-in tables.
pub(super) fn defect(what: String, place: &str) -> Fault {
    Fault::new(what, place, "Report this as a defect of the program.")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_published_tables_pass_their_checks() {
        let catalogue = Catalogue::published().unwrap();
        assert_eq!(catalogue.technologies.len(), KINDS);
        let on = catalogue.technologies.iter().filter(|kind| kind.siting.default_on).count();
        assert_eq!(on, 8, "eight kinds are on at first");
        let verified: usize = catalogue
            .technologies
            .iter()
            .flat_map(|kind| Quantity::ALL.map(|quantity| kind.range(quantity).verified))
            .filter(|verified| *verified)
            .count();
        assert_eq!(verified, 35, "as the notes count them");
    }

    #[test]
    fn ranges_keep_their_provenance() {
        let catalogue = Catalogue::published().unwrap();
        let lfp = catalogue.find("li_ion_lfp").unwrap();
        let energy = lfp.range(Quantity::SpecificEnergy);
        assert_eq!((energy.low, energy.typical, energy.high), (90.0, 150.0, 205.0));
        assert!(energy.verified && energy.unit == "Wh/kg" && !energy.source.is_empty());
        assert_eq!(lfp.siting.packing, Some(2.0));
        let hydro = catalogue.find("pumped_hydro").unwrap();
        assert_eq!(hydro.siting.packing, None);
        assert_eq!(hydro.circuit.model, Model::Fixed);
        assert_eq!(catalogue.find("flywheel_steel").unwrap().range(Quantity::SelfDischarge).unit, "%/h");
    }

    #[test]
    fn numbers_of_ones_own_take_the_place_of_published_ones() {
        let catalogue = Catalogue::published().unwrap();
        let edit = |technology: &str, source: &str| RangeEdit {
            technology: technology.to_owned(),
            quantity: Quantity::CycleLife,
            low: 10.0,
            typical: 20.0,
            high: 30.0,
            source: source.to_owned(),
        };
        let edited = catalogue.edited(&[edit("li_ion_lfp", "supplier's sheet")]).unwrap();
        let range = edited.find("li_ion_lfp").unwrap().range(Quantity::CycleLife);
        assert_eq!((range.low, range.typical, range.high, range.verified), (10.0, 20.0, 30.0, true));
        let unsourced = catalogue.edited(&[edit("li_ion_lfp", "")]).unwrap();
        assert!(!unsourced.find("li_ion_lfp").unwrap().range(Quantity::CycleLife).verified);
        let fault = catalogue.edited(&[edit("perpetual_motion", "")]).unwrap_err();
        assert_eq!(fault.place, "case, at catalogue[0].technology");
        assert!(fault.remedy.contains("li_ion_lfp"));
    }

    #[test]
    fn a_broken_table_names_the_place() {
        let ranges =
            include_str!("catalogue/technologies.csv").replacen("0.25,2.0,0.8,Wh/kg", "2.5,2.0,0.8,Wh/kg", 1);
        let fault = Catalogue::read(
            &ranges,
            include_str!("catalogue/technology_circuits.csv"),
            include_str!("catalogue/technology_siting.csv"),
        )
        .unwrap_err();
        assert_eq!(fault.place, "technologies.csv, pumped_hydro, specific_energy");
    }
}
