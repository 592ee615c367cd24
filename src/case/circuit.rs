//! Stores given as lumped circuits: SI units at the element, ratings at the terminals.

use serde::{Deserialize, Serialize};

/// Loss of a converter between terminals and element: `a + b |P| + c P^2` of the terminal power, `a` only while it carries power.
///
/// Quadratic form: Schmidt and Sauer 1996, Sonnenenergie 4 (from memory).
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields, default)]
pub struct Converter {
    /// Constant part, W.
    pub a_w: f64,
    /// Share of the power.
    pub b: f64,
    /// Part that grows with the square, 1/W.
    pub c_per_w: f64,
}

/// A circuit's own fields, and those that every circuit has.
macro_rules! circuits {
    ($($(#[$about:meta])* $name:ident { $($(#[$field_about:meta])* $field:ident: $kind:ty,)* })*) => {
        $(
            $(#[$about])*
            #[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
            #[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
            #[serde(deny_unknown_fields)]
            pub struct $name {
                /// Name for tables.
                #[serde(default)]
                pub name: String,
                /// Greatest charge power at the terminals, kW; none = no limit but the circuit's own.
                #[serde(default)]
                pub charge_kw: Option<f64>,
                /// Greatest discharge power at the terminals, kW; none = no limit but the circuit's own.
                #[serde(default)]
                pub discharge_kw: Option<f64>,
                /// The converter; none = none.
                #[serde(default)]
                pub converter: Option<Converter>,
                $($(#[$field_about])* pub $field: $kind,)*
            }
        )*
    };
}

circuits! {
    /// A battery: charge behind an open-circuit voltage, a series resistance, a pair of resistance and capacitance, a leak at the
    /// open-circuit voltage.
    Battery {
        /// Charge between empty and full, C.
        charge_coulomb: f64,
        /// Open-circuit voltage: state of charge from 0 to 1, V; joined by straight lines.
        open_circuit: Vec<(f64, f64)>,
        /// Series resistance, ohm.
        #[serde(default)]
        series_ohm: f64,
        /// Resistance of the pair, ohm.
        #[serde(default)]
        pair_ohm: f64,
        /// Capacitance of the pair, F; none = no pair.
        #[serde(default)]
        pair_farad: Option<f64>,
        /// Leak, ohm; none = no leak.
        #[serde(default)]
        leak_ohm: Option<f64>,
        /// State of charge at the start.
        #[serde(default = "full")]
        start_soc: f64,
        /// Least terminal voltage on discharge, V; none = no limit.
        #[serde(default)]
        least_v: Option<f64>,
        /// Greatest terminal voltage on charge, V; none = no limit.
        #[serde(default)]
        greatest_v: Option<f64>,
    }

    /// A capacitor with series resistance and a leak.
    Capacitor {
        /// Capacitance, F.
        farad: f64,
        /// Series resistance, ohm.
        #[serde(default)]
        series_ohm: f64,
        /// Leak, ohm; none = no leak.
        #[serde(default)]
        leak_ohm: Option<f64>,
        /// Inner voltage at the start, V; none = the greatest.
        #[serde(default)]
        start_v: Option<f64>,
        /// Least terminal voltage on discharge, V; none = no limit.
        #[serde(default)]
        least_v: Option<f64>,
        /// Greatest terminal voltage on charge, V; none = no limit.
        #[serde(default)]
        greatest_v: Option<f64>,
    }

    /// A reservoir of upright walls above a fixed head, with pipe, turbine and pump.
    Reservoir {
        /// Area, m2.
        area_m2: f64,
        /// Head when empty, m.
        head_m: f64,
        /// Volume at the start, m3; none = the greatest.
        #[serde(default)]
        start_m3: Option<f64>,
        /// Greatest volume, m3; none = no limit.
        #[serde(default)]
        greatest_m3: Option<f64>,
        /// Pressure lost in the pipe over the square of the flow, Pa s2/m6.
        #[serde(default)]
        pipe_pa_s2_m6: f64,
        /// Efficiency of the turbine.
        #[serde(default = "full")]
        turbine_efficiency: f64,
        /// Efficiency of the pump.
        #[serde(default = "full")]
        pump_efficiency: f64,
        /// Flow that leaks over the pressure, m3/(s Pa).
        #[serde(default)]
        leak_m3_s_pa: f64,
    }

    /// A flywheel.
    Flywheel {
        /// Moment of inertia, kg m2.
        inertia_kg_m2: f64,
        /// Viscous drag, N m s.
        #[serde(default)]
        viscous_nms: f64,
        /// Coulomb drag, N m.
        #[serde(default)]
        coulomb_nm: f64,
        /// Speed at the start, rad/s; none = the greatest.
        #[serde(default)]
        start_rad_s: Option<f64>,
        /// Least speed to which it discharges, rad/s; none = standstill.
        #[serde(default)]
        least_rad_s: Option<f64>,
        /// Greatest speed, rad/s; none = no limit.
        #[serde(default)]
        greatest_rad_s: Option<f64>,
    }

    /// A coil with a series resistance, cooled at a constant power.
    Coil {
        /// Inductance, H.
        henry: f64,
        /// Series resistance, ohm.
        #[serde(default)]
        series_ohm: f64,
        /// Current at the start, A; none = the greatest.
        #[serde(default)]
        start_a: Option<f64>,
        /// Greatest voltage at the terminals, V; none = no limit.
        #[serde(default)]
        greatest_v: Option<f64>,
        /// Least current to which it discharges, A; none = 0.
        #[serde(default)]
        least_a: Option<f64>,
        /// Greatest current, A; none = no limit.
        #[serde(default)]
        greatest_a: Option<f64>,
        /// Standing load of the cooling, W.
        #[serde(default)]
        cryogenic_w: f64,
    }

    /// A store that moves against a force: a spring, magnets, a lifted mass.
    CurveStore {
        /// Force over travel: m, N; joined by straight lines.
        travel_force: Vec<(f64, f64)>,
        /// Viscous drag, N s/m.
        #[serde(default)]
        viscous_ns_m: f64,
        /// Coulomb drag while it moves, N.
        #[serde(default)]
        coulomb_n: f64,
        /// Travel at the start, m; none = the last point.
        #[serde(default)]
        start_m: Option<f64>,
    }
}

fn full() -> f64 {
    1.0
}
