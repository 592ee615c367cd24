//! Losses of a store of fixed efficiencies, shared by the stages.

use crate::case::{FixedStore, RequirementCase};
use crate::numeric::Leak;

/// Losses of a store of fixed efficiencies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Losses {
    /// Charge efficiency, connection point to store.
    pub charge: f64,
    /// Discharge efficiency, store to connection point.
    pub discharge: f64,
    /// Self-discharge of the stored energy, per hour.
    pub self_discharge_per_h: f64,
    /// Standing load, kW.
    pub standing_kw: f64,
}

impl Losses {
    /// The losses that a case states.
    pub fn of(case: &RequirementCase) -> Self {
        Self {
            charge: case.charge_efficiency,
            discharge: case.discharge_efficiency,
            self_discharge_per_h: case.self_discharge_per_h,
            standing_kw: case.standing_kw,
        }
    }

    /// The losses of a store.
    pub fn of_store(store: &FixedStore) -> Self {
        Self {
            charge: store.charge_efficiency,
            discharge: store.discharge_efficiency,
            self_discharge_per_h: store.self_discharge_per_h,
            standing_kw: store.standing_kw,
        }
    }

    /// Energy that goes into the store (kWh) when it discharges `discharge_kw` (negative: charges) for `step_h` hours.
    pub fn inflow_kwh(&self, discharge_kw: f64, step_h: f64) -> f64 {
        if discharge_kw >= 0.0 {
            0.0 - discharge_kw * step_h / self.discharge
        } else {
            -discharge_kw * self.charge * step_h
        }
    }

    /// The step of self-discharge.
    pub fn leak(&self, step_h: f64) -> Leak {
        Leak::new(self.self_discharge_per_h, step_h)
    }
}
