//! Reservoir, flywheel and a store that moves against a force.

use super::element::{Cause, Causes, Drive, Element, Exact, Flow, LEAK, State, current, decaying};
use super::table::Table;
use crate::case;

/// Weight of a cubic metre of water, N/m3: 1000 kg/m3 times standard gravity.
const WEIGHT: f64 = 9806.65;

/// A reservoir of upright walls.
#[derive(Debug, Clone)]
pub(super) struct Reservoir {
    area_m2: f64,
    head_m: f64,
    pipe: f64,
    turbine: f64,
    pump: f64,
    leak: f64,
    start_m3: f64,
    greatest_m3: Option<f64>,
}

impl Reservoir {
    pub(super) fn new(store: &case::Reservoir) -> Self {
        Self {
            area_m2: store.area_m2,
            head_m: store.head_m,
            pipe: store.pipe_pa_s2_m6,
            turbine: store.turbine_efficiency,
            pump: store.pump_efficiency,
            leak: store.leak_m3_s_pa,
            start_m3: store.start_m3.or(store.greatest_m3).unwrap_or(0.0),
            greatest_m3: store.greatest_m3,
        }
    }

    fn energy_j(&self, volume: f64) -> f64 {
        WEIGHT * (self.head_m + 0.5 * volume / self.area_m2) * volume
    }

    /// Head over the turbine, m: the square root of what the energy's quadratic in the volume gives.
    fn head(&self, at: State) -> f64 {
        (self.head_m * self.head_m + 2.0 * at.energy_j / (WEIGHT * self.area_m2)).max(0.0).sqrt()
    }

    /// Flow through the turbine for a power: the small root of `P = eta Q (p - K Q^2)` by Viete's formula.
    fn turbine_flow(&self, power_w: f64, pascal: f64) -> f64 {
        let hydraulic = power_w / self.turbine;
        let plain = hydraulic / pascal;
        if self.pipe * plain * plain < 1e-9 * pascal {
            // Two terms of the series: the next is of the order of the square of the ratio.
            return plain * (1.0 + self.pipe * plain * plain / pascal);
        }
        let r = (pascal / (3.0 * self.pipe)).sqrt();
        let sine = (hydraulic / (2.0 * self.pipe * r * r * r)).min(1.0);
        2.0 * r * libm::sin(libm::asin(sine) / 3.0)
    }

    /// Flow through the pump for a power: the root of `eta P = Q (p + K Q^2)`.
    fn pump_flow(&self, power_w: f64, pascal: f64) -> f64 {
        let hydraulic = power_w * self.pump;
        let plain = hydraulic / pascal;
        if self.pipe * plain * plain < 1e-9 * pascal {
            return plain * (1.0 - self.pipe * plain * plain / pascal);
        }
        let r = (pascal / (3.0 * self.pipe)).sqrt();
        2.0 * r * libm::sinh(libm::asinh(hydraulic / (2.0 * self.pipe * r * r * r)) / 3.0)
    }
}

impl Element for Reservoir {
    fn flow(&self, at: State, _segment: usize, power_w: f64) -> Flow {
        let pascal = WEIGHT * self.head(at);
        let leak_w = self.leak * pascal * pascal;
        let (flow, machine_w) = if power_w > 0.0 {
            (self.turbine_flow(power_w, pascal), power_w * (1.0 / self.turbine - 1.0))
        } else {
            (self.pump_flow(-power_w, pascal), -power_w * (1.0 - self.pump))
        };
        let pipe_w = self.pipe * flow * flow * flow;
        Flow {
            energy_w: -power_w - pipe_w - machine_w - leak_w,
            pair_v_per_s: 0.0,
            lost_w: [pipe_w, machine_w, leak_w],
        }
    }

    fn limit_w(&self, at: State, _segment: usize, discharging: bool) -> f64 {
        if !discharging || self.pipe == 0.0 {
            return f64::INFINITY;
        }
        let pascal = WEIGHT * self.head(at);
        2.0 / 3.0 * self.turbine * pascal * (pascal / (3.0 * self.pipe)).sqrt()
    }

    fn ends_j(&self) -> (f64, f64) {
        (0.0, self.greatest_m3.map_or(f64::INFINITY, |volume| self.energy_j(volume)))
    }

    fn start(&self) -> State {
        State { energy_j: self.energy_j(self.start_m3), pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        2.0 * at.energy_j / (WEIGHT * (self.head_m + self.head(at)))
    }

    fn causes(&self) -> Causes {
        [Cause::Pipe, Cause::Machine, Cause::Leak]
    }

    fn idle(&self) -> [bool; 3] {
        [false, false, true]
    }

    fn capacity_j(&self) -> Option<f64> {
        self.greatest_m3.map(|volume| self.energy_j(volume))
    }

    fn exact(&self, at: State, _segment: usize, drive: Drive, seconds: f64) -> Option<Exact> {
        // With nothing flowing the pressure decays exponentially: dV/dt = -G p and dp/dt = w/A dV/dt.
        let Drive::Power(power) = drive else { return None };
        if power != 0.0 {
            return None;
        }
        let per_s = 2.0 * self.leak * WEIGHT / self.area_m2;
        // Half of A p^2 / w decays; the energy is that less its value at the bottom.
        let bottom_j = 0.5 * WEIGHT * self.area_m2 * self.head_m * self.head_m;
        let whole = State { energy_j: at.energy_j + bottom_j, ..at };
        let mut exact = decaying(whole, 0.0, per_s, seconds, LEAK);
        exact.after.energy_j = at.energy_j - exact.lost_j[LEAK];
        Some(exact)
    }
}

/// A flywheel.
#[derive(Debug, Clone)]
pub(super) struct Flywheel {
    inertia: f64,
    viscous: f64,
    coulomb: f64,
    start: f64,
    least: f64,
    greatest: Option<f64>,
}

impl Flywheel {
    pub(super) fn new(store: &case::Flywheel) -> Self {
        Self {
            inertia: store.inertia_kg_m2,
            viscous: store.viscous_nms,
            coulomb: store.coulomb_nm,
            start: store.start_rad_s.or(store.greatest_rad_s).unwrap_or(0.0),
            least: store.least_rad_s.unwrap_or(0.0),
            greatest: store.greatest_rad_s,
        }
    }

    fn energy_j(&self, speed: f64) -> f64 {
        0.5 * self.inertia * speed * speed
    }

    fn speed(&self, at: State) -> f64 {
        (2.0 * at.energy_j.max(0.0) / self.inertia).sqrt()
    }
}

impl Element for Flywheel {
    fn flow(&self, at: State, _segment: usize, power_w: f64) -> Flow {
        let speed = self.speed(at);
        let (viscous_w, coulomb_w) = (self.viscous * speed * speed, self.coulomb * speed);
        Flow {
            energy_w: -power_w - viscous_w - coulomb_w,
            pair_v_per_s: 0.0,
            lost_w: [viscous_w, coulomb_w, 0.0],
        }
    }

    fn limit_w(&self, _at: State, _segment: usize, _discharging: bool) -> f64 {
        f64::INFINITY
    }

    fn ends_j(&self) -> (f64, f64) {
        (self.energy_j(self.least), self.greatest.map_or(f64::INFINITY, |speed| self.energy_j(speed)))
    }

    fn start(&self) -> State {
        State { energy_j: self.energy_j(self.start), pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        self.speed(at)
    }

    fn causes(&self) -> Causes {
        [Cause::Viscous, Cause::Coulomb, Cause::None]
    }

    fn idle(&self) -> [bool; 3] {
        [true, true, false]
    }

    fn capacity_j(&self) -> Option<f64> {
        self.greatest.map(|most| self.energy_j(most) - self.energy_j(self.least))
    }

    fn exact(&self, at: State, _segment: usize, drive: Drive, seconds: f64) -> Option<Exact> {
        match drive {
            Drive::Power(power) if self.coulomb == 0.0 => {
                Some(decaying(at, power, 2.0 * self.viscous / self.inertia, seconds, 0))
            }
            _ => None,
        }
    }
}

/// A store that moves against a force.
#[derive(Debug, Clone)]
pub(super) struct Curve {
    table: Table,
    viscous: f64,
    coulomb: f64,
    start_j: f64,
}

impl Curve {
    pub(super) fn new(store: &case::CurveStore) -> Self {
        let table = Table::new(&store.travel_force, 1.0);
        let start_j = store.start_m.map_or(table.full_j(), |start| table.energy_j(start));
        Self { table, viscous: store.viscous_ns_m, coulomb: store.coulomb_n, start_j }
    }

    /// Force at the machine: friction takes from it on the way down and adds to it on the way up.
    fn force(&self, at: State, segment: usize, discharging: bool) -> f64 {
        let force = self.table.height(segment, at.energy_j);
        if discharging { force - self.coulomb } else { force + self.coulomb }
    }
}

impl Element for Curve {
    fn flow(&self, at: State, segment: usize, power_w: f64) -> Flow {
        if power_w == 0.0 {
            return Flow { energy_w: 0.0, pair_v_per_s: 0.0, lost_w: [0.0; 3] };
        }
        let speed = current(power_w, self.force(at, segment, power_w > 0.0), self.viscous);
        let (viscous_w, coulomb_w) = (self.viscous * speed * speed, self.coulomb * speed.abs());
        Flow {
            energy_w: -power_w - viscous_w - coulomb_w,
            pair_v_per_s: 0.0,
            lost_w: [viscous_w, coulomb_w, 0.0],
        }
    }

    fn limit_w(&self, at: State, segment: usize, discharging: bool) -> f64 {
        if !discharging {
            return f64::INFINITY;
        }
        let force = self.force(at, segment, true);
        if force <= 0.0 {
            0.0
        } else if self.viscous > 0.0 {
            force * force / (4.0 * self.viscous)
        } else {
            f64::INFINITY
        }
    }

    fn ends_j(&self) -> (f64, f64) {
        (0.0, self.table.full_j())
    }

    fn start(&self) -> State {
        State { energy_j: self.start_j, pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        self.table.position(self.table.segment(at.energy_j), at.energy_j)
    }

    fn causes(&self) -> Causes {
        [Cause::Viscous, Cause::Coulomb, Cause::None]
    }

    fn idle(&self) -> [bool; 3] {
        [false; 3]
    }

    fn capacity_j(&self) -> Option<f64> {
        Some(self.table.full_j())
    }

    fn segment(&self, energy_j: f64) -> usize {
        self.table.segment(energy_j).min(self.table.len() - 1)
    }

    fn span_j(&self, segment: usize) -> (f64, f64) {
        self.table.span_j(segment)
    }
}
