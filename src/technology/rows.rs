//! The rows of the catalogue's tables as they are written, and their conversion into checked values.

use serde::Deserialize;
use serde::de::DeserializeOwned;

use super::catalogue::{CircuitData, Indoors, Market, MassBasis, Model, Siting, defect};
use crate::fault::Result;

/// A row of `technologies.csv`. Text rows carry their text in `typical`.
#[derive(Debug, Deserialize)]
pub(super) struct RangeRow {
    pub(super) technology: String,
    pub(super) quantity: String,
    pub(super) low: Option<f64>,
    pub(super) high: Option<f64>,
    pub(super) typical: String,
    pub(super) unit: String,
    pub(super) basis: String,
    pub(super) year: u16,
    pub(super) source: String,
    pub(super) source_detail: String,
    pub(super) confidence: String,
}

/// What is used of a row of `technology_circuits.csv`; its other columns follow from these.
#[derive(Debug, Deserialize)]
pub(super) struct CircuitRow {
    pub(super) technology: String,
    model_kind: Model,
    ref_power_kw: f64,
    ref_duration_s: f64,
    internal_store_kwh: f64,
    state_min_frac: Option<f64>,
    conv_loss_frac: Option<f64>,
    leak_time_constant_s: f64,
    eta_charge_fixed: f64,
    eta_discharge_fixed: f64,
    standing_load_frac: f64,
    self_discharge_from: String,
    notes: String,
}

impl CircuitRow {
    /// The numbers, checked for their ranges.
    pub(super) fn checked(self) -> Result<CircuitData> {
        let fixed = self.model_kind == Model::Fixed;
        let inside = |value: f64| value > 0.0 && value <= 1.0;
        let state_min_frac = self.state_min_frac.unwrap_or(0.0);
        let conv_loss_frac = self.conv_loss_frac.unwrap_or(0.0);
        let sound = self.ref_power_kw > 0.0
            && self.ref_duration_s > 0.0
            && self.internal_store_kwh >= 1.0
            && self.leak_time_constant_s > 0.0
            && inside(self.eta_charge_fixed)
            && inside(self.eta_discharge_fixed)
            && (0.0..1.0).contains(&self.standing_load_frac)
            && (fixed || (state_min_frac > 0.0 && state_min_frac < 1.0))
            && (fixed || (conv_loss_frac > 0.0 && conv_loss_frac < 0.25));
        if !sound {
            return Err(defect(
                "a number of the circuit is out of its range".to_owned(),
                &format!("technology_circuits.csv, {}", self.technology),
            ));
        }
        Ok(CircuitData {
            model: self.model_kind,
            ref_power_kw: self.ref_power_kw,
            ref_duration_s: self.ref_duration_s,
            internal_store_kwh: self.internal_store_kwh,
            state_min_frac,
            conv_loss_frac,
            leak_time_constant_s: Some(self.leak_time_constant_s).filter(|tau| tau.is_finite()),
            eta_charge: self.eta_charge_fixed,
            eta_discharge: self.eta_discharge_fixed,
            standing_load_frac: self.standing_load_frac,
            self_discharge_is_standing: self.self_discharge_from == "standing",
            notes: self.notes,
        })
    }
}

/// A row of `technology_siting.csv`.
#[derive(Debug, Deserialize)]
pub(super) struct SitingRow {
    pub(super) technology: String,
    least_plant_kw: f64,
    greatest_plant_kw: f64,
    indoors: String,
    needs: String,
    market: Market,
    default_on: String,
    mass_basis: String,
    packing_factor: Option<f64>,
    transfer: String,
    note: String,
}

impl SitingRow {
    /// The facts, their words checked.
    pub(super) fn checked(&self) -> Result<Siting> {
        let unknown = |word: &str| {
            defect(
                format!("the word {word} is not known"),
                &format!("technology_siting.csv, {}", self.technology),
            )
        };
        let indoors = match self.indoors.as_str() {
            "yes" => Indoors::Yes,
            "with measures" | "with containment" => Indoors::WithMeasures,
            "no" => Indoors::No,
            other => return Err(unknown(other)),
        };
        let mass_basis = match self.mass_basis.as_str() {
            "device" => MassBasis::Device,
            "cell" => MassBasis::Cell,
            "electrolyte" => MassBasis::Electrolyte,
            "vessel" => MassBasis::Vessel,
            "fluid" => MassBasis::Fluid,
            "lifted mass" => MassBasis::LiftedMass,
            "media" => MassBasis::Media,
            other => return Err(unknown(other)),
        };
        let no_break = match self.transfer.as_str() {
            "no break" => true,
            "grid" => false,
            other => return Err(unknown(other)),
        };
        let default_on = match self.default_on.as_str() {
            "yes" => true,
            "no" => false,
            other => return Err(unknown(other)),
        };
        let sizes = self.least_plant_kw > 0.0 && self.greatest_plant_kw >= self.least_plant_kw;
        if !sizes || self.packing_factor.is_some_and(|factor| !(factor >= 1.0 && factor.is_finite())) {
            return Err(unknown("of a plant size or packing factor"));
        }
        Ok(Siting {
            least_plant_kw: self.least_plant_kw,
            greatest_plant_kw: self.greatest_plant_kw,
            indoors,
            needs: if self.needs == "none" { String::new() } else { self.needs.clone() },
            market: self.market,
            default_on,
            mass_basis,
            packing: self.packing_factor,
            no_break,
            note: self.note.clone(),
        })
    }
}

/// All rows of a table.
pub(super) fn table<Row: DeserializeOwned>(text: &str, name: &str) -> Result<Vec<Row>> {
    csv::Reader::from_reader(text.as_bytes())
        .deserialize()
        .enumerate()
        .map(|(i, row)| row.map_err(|error| defect(error.to_string(), &format!("{name}, row {}", i + 2))))
        .collect()
}
