//! The standing load of a kind at a size.

use super::catalogue::{MassBasis, Model, Technology};

/// Standing load of a store, kW.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Standing {
    /// Whatever its energy.
    pub fixed_kw: f64,
    /// For each kWh of rated energy.
    pub per_kwh_kw: f64,
}

impl Technology {
    /// Whether the standing load goes with the power that is bought (pumps and machines: fixed circuits, flow batteries) and not with
    /// the energy (cooling, heating).
    pub fn stands_with_power(&self) -> bool {
        self.circuit.model == Model::Fixed || self.siting.mass_basis == MassBasis::Electrolyte
    }

    /// Standing load of a store of this power (kW) and of a design with this reference power (kW per rated kWh).
    pub fn standing(&self, power_kw: f64, ref_power_kw: f64) -> Standing {
        let share = self.circuit.standing_load_frac;
        if self.stands_with_power() {
            Standing { fixed_kw: share * power_kw, per_kwh_kw: 0.0 }
        } else {
            Standing { fixed_kw: 0.0, per_kwh_kw: share * ref_power_kw }
        }
    }
}
