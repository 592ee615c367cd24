//! Stores to be simulated.

use serde::{Deserialize, Serialize};

use super::circuit::{Battery, Capacitor, Coil, Converter, CurveStore, Flywheel, Reservoir};

/// A store to be simulated.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum Store {
    /// A store of fixed efficiencies.
    Fixed(FixedStore),
    /// A battery.
    Battery(Battery),
    /// A capacitor.
    Capacitor(Capacitor),
    /// A reservoir.
    Reservoir(Reservoir),
    /// A flywheel.
    Flywheel(Flywheel),
    /// A coil.
    Coil(Coil),
    /// A store that moves against a force.
    Curve(CurveStore),
}

/// What every circuit has between its element and the site.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Terminals<'a> {
    /// Name for tables.
    pub name: &'a str,
    /// Greatest charge power, kW; none = no limit.
    pub charge_kw: Option<f64>,
    /// Greatest discharge power, kW; none = no limit.
    pub discharge_kw: Option<f64>,
    /// The converter.
    pub converter: Option<Converter>,
}

impl Store {
    /// The terminals of a circuit; a store of fixed efficiencies has no converter of its own.
    pub fn terminals(&self) -> Terminals<'_> {
        macro_rules! of {
            ($store:expr, $converter:expr) => {
                Terminals {
                    name: &$store.name,
                    charge_kw: $store.charge_kw,
                    discharge_kw: $store.discharge_kw,
                    converter: $converter,
                }
            };
        }
        match self {
            Self::Fixed(store) => of!(store, None),
            Self::Battery(store) => of!(store, store.converter),
            Self::Capacitor(store) => of!(store, store.converter),
            Self::Reservoir(store) => of!(store, store.converter),
            Self::Flywheel(store) => of!(store, store.converter),
            Self::Coil(store) => of!(store, store.converter),
            Self::Curve(store) => of!(store, store.converter),
        }
    }
}

/// A store of fixed efficiencies; powers at the terminals, energy inside.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct FixedStore {
    /// Name for tables.
    pub name: String,
    /// Greatest charge power, kW; none = no limit.
    pub charge_kw: Option<f64>,
    /// Greatest discharge power, kW; none = no limit.
    pub discharge_kw: Option<f64>,
    /// Energy inside, kWh.
    pub energy_kwh: f64,
    /// Least level to which it discharges, share of the energy inside; self-discharge goes on below it.
    pub least_level: f64,
    /// Greatest level to which it charges, share of the energy inside.
    pub greatest_level: f64,
    /// Charge efficiency.
    pub charge_efficiency: f64,
    /// Discharge efficiency.
    pub discharge_efficiency: f64,
    /// Self-discharge of the stored energy, per hour.
    pub self_discharge_per_h: f64,
    /// Standing load, kW.
    pub standing_kw: f64,
    /// Level at the start.
    pub start: Start,
}

impl Default for FixedStore {
    fn default() -> Self {
        Self {
            name: String::new(),
            charge_kw: None,
            discharge_kw: None,
            energy_kwh: 0.0,
            least_level: 0.0,
            greatest_level: 1.0,
            charge_efficiency: 1.0,
            discharge_efficiency: 1.0,
            self_discharge_per_h: 0.0,
            standing_kw: 0.0,
            start: Start::Full,
        }
    }
}

/// Level of a store at the start.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Start {
    /// Full.
    #[default]
    Full,
    /// Empty.
    Empty,
    /// Half full.
    Half,
    /// The level at which the record, repeated from full, settles.
    Cyclic,
}
