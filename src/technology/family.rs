//! The designs of a kind: seven circuits from its energy-rich to its power-rich end.
//!
//! The published ranges are a box whose corners never occur in one product. A design's place t runs from -1 (energy-rich
//! and slow) over 0 (typical) to 1 (power-rich): its rated energy goes on a logarithmic scale from high through typical
//! to low, while its reference power goes from low through typical to the value at which its greatest power is the
//! published high (or stays, where the typical circuit's matched load already passes that). The circuit's loss at its
//! own reference power, its window and its decay are those of the typical design.

use super::catalogue::{Model, Quantity, Technology};
use super::curve::Circuit;

/// Places of the seven designs.
pub const PLACES: [f64; 7] = [-1.0, -2.0 / 3.0, -1.0 / 3.0, 0.0, 1.0 / 3.0, 2.0 / 3.0, 1.0];

/// Kinds whose machine or converter, not the matched load, limits power: the published high is their ceiling.
const MACHINE_BOUND: [&str; 2] = ["smes", "magnet_spring"];

/// What a design is measured per.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Per {
    /// Per kg.
    Mass,
    /// Per litre.
    Volume,
}

impl Per {
    /// The quantities for energy and power.
    pub fn quantities(self) -> (Quantity, Quantity) {
        match self {
            Self::Mass => (Quantity::SpecificEnergy, Quantity::SpecificPower),
            Self::Volume => (Quantity::EnergyDensity, Quantity::PowerDensity),
        }
    }
}

/// One design of a kind, on the kind's own mass or volume basis (packing and depth not yet applied).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Design {
    /// Rated energy, Wh per kg or l.
    pub energy_wh: f64,
    /// Its circuit, per rated kWh.
    pub circuit: Circuit,
}

impl Design {
    /// The design at a place from -1 to 1.
    pub fn at(technology: &Technology, per: Per, place: f64) -> Self {
        let (energy, power) = per.quantities();
        let (energy, power) = (technology.range(energy), technology.range(power));
        let data = &technology.circuit;
        let bound = MACHINE_BOUND.contains(&technology.id.as_str());
        let peak = match data.model {
            Model::Fixed => 1.0,
            Model::Potential | Model::Kinetic if bound => 1.0,
            Model::Potential | Model::Kinetic => data.eta_discharge / (4.0 * data.conv_loss_frac),
        };
        let (energy_wh, power_w) = if place < 0.0 {
            (between(energy.typical, energy.high, -place), between(power.typical, power.low, -place))
        } else {
            let fastest = (power.high / peak).max(power.typical);
            (between(energy.typical, energy.low, place), between(power.typical, fastest, place))
        };
        let most_kw = bound.then(|| power.high / energy_wh);
        Self { energy_wh, circuit: Circuit::design(data, power_w / energy_wh, most_kw) }
    }

    /// All seven, from energy-rich to power-rich.
    pub fn all(technology: &Technology, per: Per) -> Vec<Self> {
        PLACES.iter().map(|place| Self::at(technology, per, *place)).collect()
    }
}

/// The value a share of the way on a logarithmic scale, exact at both ends.
fn between(from: f64, to: f64, share: f64) -> f64 {
    if share <= 0.0 {
        from
    } else if share >= 1.0 {
        to
    } else {
        from * libm::pow(to / from, share)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::technology::Catalogue;

    #[test]
    fn designs_stay_inside_the_published_ranges_and_pass_through_the_typical() {
        for technology in Catalogue::published().unwrap().technologies {
            for per in [Per::Mass, Per::Volume] {
                let (energy, power) = per.quantities();
                let (energy, power) = (technology.range(energy), technology.range(power));
                let designs = Design::all(&technology, per);
                for pair in designs.windows(2) {
                    assert!(pair[0].energy_wh >= pair[1].energy_wh);
                }
                for design in &designs {
                    assert!(design.energy_wh >= energy.low && design.energy_wh <= energy.high);
                    let reference = design.circuit.ref_power_kw() * design.energy_wh;
                    assert!(
                        reference >= power.low * 0.999_999 && reference <= power.high * 1.000_001,
                        "{}",
                        technology.id
                    );
                    let delivered = design.circuit.delivered_kwh(design.circuit.ref_power_kw());
                    assert!((delivered - 1.0).abs() < 1e-9, "{} {delivered}", technology.id);
                    if MACHINE_BOUND.contains(&technology.id.as_str()) {
                        assert!(design.circuit.peak_kw() * design.energy_wh <= power.high * 1.000_001);
                    }
                }
                assert_eq!(designs[3].energy_wh, energy.typical);
                assert!(
                    (designs[3].circuit.ref_power_kw() * energy.typical / power.typical - 1.0).abs() < 1e-12
                );
            }
        }
    }
}
