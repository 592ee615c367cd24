//! What the elements of all circuits have in common.

/// A cause of loss inside an element.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Cause {
    Series,
    Pair,
    Leak,
    Pipe,
    Machine,
    Viscous,
    Coulomb,
    /// The element has fewer causes.
    None,
}

/// The causes of an element, in the order of [`Flow::lost_w`]; a leak that goes on when nothing is left stands last.
pub(super) type Causes = [Cause; 3];

/// Place of the leak among the causes.
pub(super) const LEAK: usize = 2;

/// State of an element.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct State {
    /// Energy in the main element, J.
    pub(super) energy_j: f64,
    /// Voltage of the pair, V (batteries).
    pub(super) pair_v: f64,
}

/// Rates at a state.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Flow {
    /// Of the energy in the main element, W.
    pub(super) energy_w: f64,
    /// Of the pair's voltage, V/s.
    pub(super) pair_v_per_s: f64,
    /// Losses by cause, W.
    pub(super) lost_w: [f64; 3],
}

/// Part of a step in closed form.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Exact {
    /// State after it.
    pub(super) after: State,
    /// Energy given at the element's terminals, J, negative = taken.
    pub(super) given_j: f64,
    /// Losses by cause, J.
    pub(super) lost_j: [f64; 3],
}

/// What drives an element.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Drive {
    /// A constant power at its terminals, W, discharge positive.
    Power(f64),
    /// As much as its terminals allow.
    Limit {
        /// Discharging, or charging.
        discharging: bool,
    },
}

/// An element: energy, losses and limits under power at its terminals. Power is positive when the element discharges.
pub(super) trait Element {
    /// Rates at a state under a power. `segment` is the piece of a table on whose line the element is.
    fn flow(&self, at: State, segment: usize, power_w: f64) -> Flow;

    /// Greatest power that the terminals allow at a state, W, zero or above; infinite = no limit.
    fn limit_w(&self, at: State, segment: usize, discharging: bool) -> f64;

    /// Energy at which discharging ends, and at which charging ends, J.
    fn ends_j(&self) -> (f64, f64);

    /// State at the start.
    fn start(&self) -> State;

    /// The state in the unit of the result (state of charge, V, m3, rad/s, A, m).
    fn value(&self, at: State) -> f64;

    /// Causes of its losses.
    fn causes(&self) -> Causes;

    /// Which of them go on while nothing is carried.
    fn idle(&self) -> [bool; 3];

    /// Usable energy, J; none = unbounded.
    fn capacity_j(&self) -> Option<f64>;

    /// Energy in the pair, J.
    fn pair_j(&self, _at: State) -> f64 {
        0.0
    }

    /// Standing load, W.
    fn standing_w(&self) -> f64 {
        0.0
    }

    /// Segment of an energy.
    fn segment(&self, _energy_j: f64) -> usize {
        0
    }

    /// Energies between which a segment holds, J.
    fn span_j(&self, _segment: usize) -> (f64, f64) {
        (f64::NEG_INFINITY, f64::INFINITY)
    }

    /// The closed form over a time, if there is one.
    fn exact(&self, _at: State, _segment: usize, _drive: Drive, _seconds: f64) -> Option<Exact> {
        None
    }

    /// Where charging along the limit starts from an energy of zero and the rates vanish there: a short time (s, at most the one given)
    /// during which it takes at most this power, and the energy after it, J.
    fn pushed_off(&self, _power_w: f64, _seconds: f64) -> Option<(f64, f64)> {
        None
    }
}

/// The closed form of `dS/dt = -P - k S`, the losses all of one cause: `S' = (S + P/k) e^(-k t) - P/k`.
pub(super) fn decaying(at: State, power_w: f64, per_s: f64, seconds: f64, cause: usize) -> Exact {
    let z = per_s * seconds;
    // t (1 - e^-z)/z, which is t for z = 0.
    let time = if z == 0.0 { seconds } else { -libm::expm1(-z) / per_s };
    let energy_j = at.energy_j - (power_w + per_s * at.energy_j) * time;
    let mut lost_j = [0.0; 3];
    // Without cancellation: k S t (1-e^-z)/z - P (t - time).
    let late = if z < 1e-3 {
        seconds * z * (1.0 / 2.0 - z * (1.0 / 6.0 - z * (1.0 / 24.0 - z / 120.0)))
    } else {
        seconds - time
    };
    lost_j[cause] = per_s * at.energy_j * time - power_w * late;
    Exact { after: State { energy_j, ..at }, given_j: power_w * seconds, lost_j }
}

/// Current for a power behind a resistance: the small root of `P = i (V - R i)`, exact at R = 0; 0 where there is no voltage.
pub(super) fn current(power_w: f64, volt: f64, ohm: f64) -> f64 {
    let both = volt + (volt * volt - 4.0 * ohm * power_w).max(0.0).sqrt();
    if power_w == 0.0 || both <= 0.0 { 0.0 } else { 2.0 * power_w / both }
}

/// Power that a voltage behind a resistance can give down to a least terminal voltage: at the matched load, or at that voltage.
pub(super) fn greatest_given_w(volt: f64, ohm: f64, least_v: f64) -> f64 {
    if volt <= least_v {
        0.0
    } else if 2.0 * least_v > volt {
        least_v * (volt - least_v) / ohm
    } else {
        volt * volt / (4.0 * ohm)
    }
}

/// Power that a voltage behind a resistance can take up to a greatest terminal voltage.
pub(super) fn greatest_taken_w(volt: f64, ohm: f64, greatest_v: Option<f64>) -> f64 {
    greatest_v.map_or(f64::INFINITY, |most| if volt >= most { 0.0 } else { most * (most - volt) / ohm })
}
