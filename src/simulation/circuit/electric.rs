//! Battery, capacitor and coil.

use super::element::{
    Cause, Causes, Drive, Element, Exact, Flow, LEAK, State, current, decaying, greatest_given_w,
    greatest_taken_w,
};
use super::table::Table;
use crate::case;
use crate::technology::Lumped;

/// Segment of a capacitor whose greatest power is that of the matched load; below it its least voltage decides.
const MATCHED: usize = 1;

/// Share by which a voltage without series resistance may be off its limit and still counts as at it.
const AT_LIMIT: f64 = 1e-10;

/// A battery: open-circuit voltage over charge, series resistance, pair, leak at the open-circuit voltage.
#[derive(Debug, Clone)]
pub(super) struct Battery {
    table: Table,
    charge_c: f64,
    series_ohm: f64,
    /// Resistance and capacitance.
    pair: Option<(f64, f64)>,
    /// 1/ohm.
    leak_s: f64,
    start_soc: f64,
    least_v: f64,
    greatest_v: Option<f64>,
}

impl Battery {
    pub(super) fn new(store: &case::Battery) -> Self {
        Self {
            table: Table::new(&store.open_circuit, store.charge_coulomb),
            charge_c: store.charge_coulomb,
            series_ohm: store.series_ohm,
            pair: store.pair_farad.map(|farad| (store.pair_ohm, farad)),
            leak_s: store.leak_ohm.map_or(0.0, |ohm| 1.0 / ohm),
            start_soc: store.start_soc,
            least_v: store.least_v.unwrap_or(0.0),
            greatest_v: store.greatest_v,
        }
    }

    /// Without series resistance the terminal voltage is a state: the current that holds it where it is.
    fn holding_a(&self, at: State, segment: usize) -> f64 {
        let open_v = self.table.height(segment, at.energy_j);
        let slope = self.table.slope(segment);
        let (sum, push) =
            self.pair.map_or((slope, 0.0), |(ohm, farad)| (slope + 1.0 / farad, at.pair_v / (ohm * farad)));
        if sum > 0.0 { (push - slope * open_v * self.leak_s) / sum } else { 0.0 }
    }
}

impl Element for Battery {
    fn flow(&self, at: State, segment: usize, power_w: f64) -> Flow {
        let open_v = self.table.height(segment, at.energy_j);
        let amps = current(power_w, open_v - at.pair_v, self.series_ohm);
        let leak_w = open_v * open_v * self.leak_s;
        let (pair_v_per_s, pair_w) = self.pair.map_or((0.0, 0.0), |(ohm, farad)| {
            (amps / farad - at.pair_v / (ohm * farad), at.pair_v * at.pair_v / ohm)
        });
        Flow {
            energy_w: -open_v * amps - leak_w,
            pair_v_per_s,
            lost_w: [self.series_ohm * amps * amps, pair_w, leak_w],
        }
    }

    fn limit_w(&self, at: State, segment: usize, discharging: bool) -> f64 {
        let volt = self.table.height(segment, at.energy_j) - at.pair_v;
        if self.series_ohm > 0.0 {
            return if discharging {
                greatest_given_w(volt, self.series_ohm, self.least_v)
            } else {
                greatest_taken_w(volt, self.series_ohm, self.greatest_v)
            };
        }
        if discharging {
            if volt > self.least_v * (1.0 + AT_LIMIT) {
                f64::INFINITY
            } else {
                (volt * self.holding_a(at, segment)).max(0.0)
            }
        } else if self.greatest_v.is_none_or(|most| volt < most * (1.0 - AT_LIMIT)) {
            f64::INFINITY
        } else {
            (-volt * self.holding_a(at, segment)).max(0.0)
        }
    }

    fn ends_j(&self) -> (f64, f64) {
        (0.0, self.table.full_j())
    }

    fn start(&self) -> State {
        let energy_j = if self.start_soc >= 1.0 {
            self.table.full_j()
        } else {
            self.table.energy_j(self.start_soc * self.charge_c)
        };
        State { energy_j, pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        self.table.position(self.table.segment(at.energy_j), at.energy_j) / self.charge_c
    }

    fn causes(&self) -> Causes {
        [Cause::Series, Cause::Pair, Cause::Leak]
    }

    fn idle(&self) -> [bool; 3] {
        [false, false, true]
    }

    fn capacity_j(&self) -> Option<f64> {
        Some(self.table.full_j())
    }

    fn pair_j(&self, at: State) -> f64 {
        self.pair.map_or(0.0, |(_, farad)| 0.5 * farad * at.pair_v * at.pair_v)
    }

    fn segment(&self, energy_j: f64) -> usize {
        self.table.segment(energy_j).min(self.table.len() - 1)
    }

    fn span_j(&self, segment: usize) -> (f64, f64) {
        self.table.span_j(segment)
    }
}

/// A capacitor: series resistance, leak across the capacitance.
#[derive(Debug, Clone)]
pub(super) struct Capacitor {
    farad: f64,
    series_ohm: f64,
    /// 1/ohm.
    leak_s: f64,
    start_v: f64,
    least_v: f64,
    greatest_v: Option<f64>,
    /// Energies between which it works, whatever its terminals allow, J.
    ends_j: (f64, f64),
}

impl Capacitor {
    /// A circuit of the catalogue, or the dual of one: 1 V at full.
    pub(super) fn of(lumped: &Lumped) -> Self {
        let half = 0.5 * lumped.capacitance;
        Self {
            farad: lumped.capacitance,
            series_ohm: lumped.resistance,
            leak_s: half * lumped.decay_per_h,
            start_v: 1.0,
            least_v: 0.0,
            greatest_v: None,
            ends_j: (half * lumped.floor, half),
        }
    }

    pub(super) fn new(store: &case::Capacitor) -> Self {
        Self {
            farad: store.farad,
            series_ohm: store.series_ohm,
            leak_s: store.leak_ohm.map_or(0.0, |ohm| 1.0 / ohm),
            start_v: store.start_v.or(store.greatest_v).unwrap_or(0.0),
            least_v: store.least_v.unwrap_or(0.0),
            greatest_v: store.greatest_v,
            ends_j: (0.0, f64::INFINITY),
        }
    }

    fn volt(&self, at: State) -> f64 {
        (2.0 * at.energy_j.max(0.0) / self.farad).sqrt()
    }

    pub(super) fn energy_j(&self, volt: f64) -> f64 {
        0.5 * self.farad * volt * volt
    }

    /// Along a limit the current is `g (V - V_t)` and the terminals give `i` times `V_t` or, at the matched load, `V/2`: both linear
    /// in V, so that V decays exponentially to a constant, and everything integrates in closed form.
    fn along_limit(&self, at: State, segment: usize, discharging: bool, seconds: f64) -> Exact {
        let volt = self.volt(at);
        let matched = discharging && segment == MATCHED;
        let terminal_v = match (discharging, matched) {
            (true, true) => 0.0,
            (true, false) => self.least_v,
            (false, _) => self.greatest_v.unwrap_or(volt),
        };
        // At the matched load i = V/(2R).
        let conductance = if matched { 0.5 / self.series_ohm } else { 1.0 / self.series_ohm };
        let per_s = (conductance + self.leak_s) / self.farad;
        let rest_v = conductance * terminal_v / (conductance + self.leak_s);
        // V = rest + u e^(-k t); integrals of V - a and (V - a)^2.
        let u = volt - rest_v;
        let once = -libm::expm1(-per_s * seconds) / per_s;
        let twice = -libm::expm1(-2.0 * per_s * seconds) / (2.0 * per_s);
        let first = |a: f64| (rest_v - a) * seconds + u * once;
        let second = |a: f64| (rest_v - a) * ((rest_v - a) * seconds + 2.0 * u * once) + u * u * twice;
        let squares = conductance * second(terminal_v);
        let (given_j, series_j) = if matched {
            // P = V^2/(4R) = g V^2 / 2, and as much is lost.
            (0.5 * squares, 0.5 * squares)
        } else {
            (terminal_v * conductance * first(terminal_v), squares)
        };
        let leak_j = self.leak_s * second(0.0);
        let after = rest_v + u * libm::exp(-per_s * seconds);
        Exact {
            after: State { energy_j: self.energy_j(after), ..at },
            given_j,
            lost_j: [series_j, 0.0, leak_j],
        }
    }
}

impl Element for Capacitor {
    fn flow(&self, at: State, _segment: usize, power_w: f64) -> Flow {
        let volt = self.volt(at);
        let amps = if self.series_ohm > 0.0 { current(power_w, volt, self.series_ohm) } else { 0.0 };
        let (series_w, leak_w) = (self.series_ohm * amps * amps, volt * volt * self.leak_s);
        Flow { energy_w: -power_w - series_w - leak_w, pair_v_per_s: 0.0, lost_w: [series_w, 0.0, leak_w] }
    }

    fn limit_w(&self, at: State, _segment: usize, discharging: bool) -> f64 {
        let volt = self.volt(at);
        if self.series_ohm > 0.0 {
            return if discharging {
                greatest_given_w(volt, self.series_ohm, self.least_v)
            } else {
                greatest_taken_w(volt, self.series_ohm, self.greatest_v)
            };
        }
        if discharging {
            if volt > self.least_v { f64::INFINITY } else { 0.0 }
        } else if self.greatest_v.is_none_or(|most| volt < most * (1.0 - AT_LIMIT)) {
            f64::INFINITY
        } else {
            // At its greatest voltage it takes what leaks.
            volt * volt * self.leak_s
        }
    }

    fn ends_j(&self) -> (f64, f64) {
        self.ends_j
    }

    fn start(&self) -> State {
        State { energy_j: self.energy_j(self.start_v), pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        self.volt(at)
    }

    fn causes(&self) -> Causes {
        [Cause::Series, Cause::None, Cause::Leak]
    }

    fn idle(&self) -> [bool; 3] {
        [false, false, true]
    }

    fn capacity_j(&self) -> Option<f64> {
        self.greatest_v.map(|most| self.energy_j(most) - self.energy_j(self.least_v))
    }

    fn segment(&self, energy_j: f64) -> usize {
        usize::from(energy_j >= self.energy_j(2.0 * self.least_v))
    }

    fn span_j(&self, segment: usize) -> (f64, f64) {
        let edge = self.energy_j(2.0 * self.least_v);
        if segment == MATCHED { (edge, f64::INFINITY) } else { (f64::NEG_INFINITY, edge) }
    }

    fn exact(&self, at: State, segment: usize, drive: Drive, seconds: f64) -> Option<Exact> {
        match drive {
            Drive::Power(power) if self.series_ohm == 0.0 || power == 0.0 => {
                Some(decaying(at, power, 2.0 * self.leak_s / self.farad, seconds, LEAK))
            }
            Drive::Limit { discharging } if self.series_ohm > 0.0 => {
                Some(self.along_limit(at, segment, discharging, seconds))
            }
            _ => None,
        }
    }
}

/// A coil with a series resistance.
#[derive(Debug, Clone)]
pub(super) struct Coil {
    henry: f64,
    series_ohm: f64,
    start_a: f64,
    greatest_v: f64,
    least_a: f64,
    greatest_a: Option<f64>,
    cryogenic_w: f64,
}

impl Coil {
    pub(super) fn new(store: &case::Coil) -> Self {
        Self {
            henry: store.henry,
            series_ohm: store.series_ohm,
            start_a: store.start_a.or(store.greatest_a).unwrap_or(0.0),
            greatest_v: store.greatest_v.unwrap_or(f64::INFINITY),
            least_a: store.least_a.unwrap_or(0.0),
            greatest_a: store.greatest_a,
            cryogenic_w: store.cryogenic_w,
        }
    }

    fn energy_j(&self, amps: f64) -> f64 {
        0.5 * self.henry * amps * amps
    }

    fn amps(&self, at: State) -> f64 {
        (2.0 * at.energy_j.max(0.0) / self.henry).sqrt()
    }
}

impl Element for Coil {
    fn flow(&self, at: State, _segment: usize, power_w: f64) -> Flow {
        let series_w = 2.0 * self.series_ohm / self.henry * at.energy_j.max(0.0);
        Flow { energy_w: -power_w - series_w, pair_v_per_s: 0.0, lost_w: [series_w, 0.0, 0.0] }
    }

    fn limit_w(&self, at: State, _segment: usize, _discharging: bool) -> f64 {
        if self.greatest_v == f64::INFINITY { f64::INFINITY } else { self.greatest_v * self.amps(at) }
    }

    fn ends_j(&self) -> (f64, f64) {
        (self.energy_j(self.least_a), self.greatest_a.map_or(f64::INFINITY, |amps| self.energy_j(amps)))
    }

    fn start(&self) -> State {
        State { energy_j: self.energy_j(self.start_a), pair_v: 0.0 }
    }

    fn value(&self, at: State) -> f64 {
        self.amps(at)
    }

    fn causes(&self) -> Causes {
        [Cause::Series, Cause::None, Cause::None]
    }

    fn idle(&self) -> [bool; 3] {
        [true, false, false]
    }

    fn capacity_j(&self) -> Option<f64> {
        self.greatest_a.map(|most| self.energy_j(most) - self.energy_j(self.least_a))
    }

    fn standing_w(&self) -> f64 {
        self.cryogenic_w
    }

    fn exact(&self, at: State, _segment: usize, drive: Drive, seconds: f64) -> Option<Exact> {
        match drive {
            Drive::Power(power) => Some(decaying(at, power, 2.0 * self.series_ohm / self.henry, seconds, 0)),
            Drive::Limit { .. } => None,
        }
    }

    fn pushed_off(&self, power_w: f64, seconds: f64) -> Option<(f64, f64)> {
        if self.greatest_v == f64::INFINITY {
            return None;
        }
        // From rest the current rises by V t / L, and the power by V times that.
        let rate = self.greatest_v / self.henry;
        let time = seconds.min(power_w / (self.greatest_v * rate));
        Some((time, self.energy_j(rate * time)))
    }
}
