//! The whole way from a record to a result, in the order of the stages, so that page and terminal take the same one.

use std::rc::Rc;

use crate::case::{Case, Store};
use crate::duty::{self, Duty, Kind};
use crate::fault::{Fault, Result};
use crate::job::finish;
use crate::record::Record;
use crate::requirement::{self, Requirement};
use crate::result::{self, PlaneResult, SimulationResult, SiteResult, Sizing};
use crate::simulation;
use crate::technology::{self, Catalogue, Need, Screening};

/// Everything that follows from a record and a case.
#[derive(Debug, Clone)]
pub struct Assessment {
    /// What storage is asked.
    pub duty: Duty,
    /// What a store must meet.
    pub requirement: Requirement,
    /// What the technologies are judged on; none where nothing is asked of a store.
    pub need: Option<Need>,
    /// The verdicts.
    pub screening: Screening,
    /// The case's stores, run on the duty.
    pub simulations: Vec<SimulationResult>,
    /// The catalogue sized for the asked point, if the case asks for it.
    pub sizings: Vec<Sizing>,
}

/// Takes a record through all stages.
///
/// # Errors
/// If the record lacks what the duty needs, or the case edits a kind of storage that is not there.
pub fn assess(record: &Rc<Record>, case: &Case, catalogue: &Catalogue) -> Result<Assessment> {
    let catalogue = catalogue.edited(&case.catalogue)?;
    let duty = duty::ask(record, case)?;
    let requirement = requirement::derive(&duty, case);
    let (need, screening) = screen(&duty, &requirement, case, &catalogue);
    let simulations = case.stores.iter().enumerate().map(|(i, store)| simulate(&duty, store, i)).collect();
    let sizings = if case.sizings {
        finish(simulation::Sizes::new(&duty, requirement.asked.as_ref(), case, &catalogue))?
    } else {
        Vec::new()
    };
    Ok(Assessment { duty, requirement, need, screening, simulations, sizings })
}

/// Judges a catalogue, edited as the case has it, on a requirement.
pub fn screen(
    duty: &Duty,
    requirement: &Requirement,
    case: &Case,
    catalogue: &Catalogue,
) -> (Option<Need>, Screening) {
    let need = requirement.asked.as_ref().map(|asked| {
        let criterion = |quantity: &str| {
            requirement.result.criteria.iter().find(|line| line.quantity == quantity).map(|line| line.value)
        };
        let site = &case.site;
        let topped_up = matches!(duty.kind, Kind::Limits(limits) if limits.recharge);
        Need {
            discharge_kw: asked.point.power_kw,
            charge_kw: asked.point.power_kw,
            energy_kwh: asked.point.delivered_kwh,
            round_trip_efficiency: criterion("round_trip_efficiency"),
            ramp_kw_per_s: duty.result.steepest_ramp_kw_per_s,
            // A store that may be topped up from the grid need not keep its charge.
            mean_hold_s: asked.run.mean_hold_s.filter(|_| !topped_up),
            cycles_per_year: criterion("cycles"),
            service_life_years: site.service_life_years,
            response_s: site.response_s,
            transfer_s: site.transfer_s,
            mass_budget_kg: site.mass_budget_kg,
            volume_budget_l: site.volume_budget_l,
            ambient_c: match (site.ambient_least_c, site.ambient_greatest_c) {
                (None, None) => None,
                (least, greatest) => {
                    Some((least.or(greatest).unwrap_or_default(), greatest.or(least).unwrap_or_default()))
                }
            },
            indoors: site.indoors,
            margin: case.requirement.margin,
        }
    });
    let screening = need.as_ref().map(|need| technology::screen(catalogue, need)).unwrap_or_default();
    (need, screening)
}

/// Runs one of the case's stores; a store without a name is called by its place in the list.
pub fn simulate(duty: &Duty, store: &Store, place: usize) -> SimulationResult {
    let mut result = simulation::run_circuit(duty, store, |_| {});
    if result.store.is_empty() {
        result.store = format!("store {}", place + 1);
    }
    result
}

impl Assessment {
    /// The result object.
    pub fn result(&self) -> SiteResult {
        let mut duty = self.duty.result.clone();
        duty.infeasible.clone_from(&self.requirement.infeasible);
        SiteResult {
            record: Some(self.duty.totals.clone()),
            duty: Some(duty),
            requirement: Some(self.requirement.result.clone()),
            plane: Some(PlaneResult {
                duration_s: self.screening.duration_s,
                points: self.need.as_ref().map(technology::points).unwrap_or_default(),
            }),
            screening: self.screening.technologies.clone(),
            simulations: self.simulations.clone(),
            sizings: self.sizings.clone(),
            ..blank(&self.duty.record.site)
        }
    }
}

/// The result of a site whose work was stopped by a fault.
pub fn failed(site: &str, fault: Fault) -> SiteResult {
    SiteResult { error: Some(fault), ..blank(site) }
}

fn blank(site: &str) -> SiteResult {
    SiteResult {
        millpond_result: result::VERSION,
        version: env!("CARGO_PKG_VERSION").to_owned(),
        zones_version: result::zones().to_owned(),
        site: site.to_owned(),
        error: None,
        record: None,
        duty: None,
        requirement: None,
        plane: None,
        screening: Vec::new(),
        simulations: Vec::new(),
        sizings: Vec::new(),
    }
}
