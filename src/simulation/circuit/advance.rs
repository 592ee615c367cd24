//! One interval of constant power asked at the terminals, with all limits on the way.
//!
//! Between events (a limit begins or ends, the energy ends, a table's line ends) the rates are smooth. Such a stretch is solved in closed
//! form where there is one, and otherwise by steps of Dormand and Prince under error control; the energy in the element is a state, so
//! that every loss is integrated beside it. Events are found by a bracketing secant
//! in the last step.

use super::element::{Drive, Element, LEAK, State};
use super::ode;
use crate::case::Converter;

/// Admissible error of a step, share of a state.
const OF_STATE: f64 = 1e-11;

/// Admissible error of a step, share of what is lost or carried in it.
const OF_FLOW: f64 = 1e-9;

/// The same, share of the energy moved or held.
const OF_SCALE: f64 = 1e-14;

/// Trials with which an event is found in a step.
const MOST_TRIALS: usize = 60;

/// Shortest step, share of the interval.
const SHORTEST: f64 = 1e-12;

/// An element behind its converter.
pub(super) struct Machine<'a> {
    pub(super) element: &'a dyn Element,
    pub(super) converter: Converter,
}

/// What an interval did.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Carried {
    /// Energy given at the terminals, J, negative = taken.
    pub(super) given_j: f64,
    /// Energy given by the element to its converter, J.
    pub(super) inner_j: f64,
    /// Losses of the element by cause, J.
    pub(super) lost_j: [f64; 3],
    /// Time at rest because the energy was at its end, s.
    pub(super) rested_s: f64,
    /// Whether what was asked was carried throughout.
    pub(super) fully: bool,
}

impl Carried {
    fn add(&mut self, other: &Self) {
        self.given_j += other.given_j;
        self.inner_j += other.inner_j;
        for (sum, term) in self.lost_j.iter_mut().zip(other.lost_j) {
            *sum += term;
        }
    }
}

/// What the machine does at a moment.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Mode {
    /// Carries what is asked.
    Asked,
    /// Carries what its terminals allow.
    Limited,
    /// Its terminals allow nothing for now.
    Blocked,
    /// Rests until the interval's end.
    Rest,
}

/// What ends a stretch.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Event {
    /// The energy has come to the end at this value.
    End(f64),
    /// Nothing is left.
    Empty,
    /// The table's line has come to its end.
    Line,
    /// The limit has begun or ended.
    Turn(Mode),
}

impl Event {
    /// How closely it must be found, share of the interval: an end sets the energy, at the others all is continuous.
    fn width(self) -> f64 {
        match self {
            Self::End(_) | Self::Empty => 1e-14,
            Self::Turn(_) => 1e-11,
            Self::Line => 1e-8,
        }
    }
}

/// The power asked in an interval.
#[derive(Debug, Clone, Copy)]
struct Asked {
    bus_w: f64,
    inner_w: f64,
    discharging: bool,
}

/// Part of a stretch.
#[derive(Debug, Clone, Copy)]
struct Trial {
    after: State,
    carried: Carried,
    /// Error over what is admissible.
    error: f64,
}

impl Machine<'_> {
    /// Loss at a power at the terminals, W; none while nothing is carried.
    fn loss_w(&self, bus_w: f64) -> f64 {
        let Converter { a_w, b, c_per_w } = self.converter;
        if bus_w == 0.0 { 0.0 } else { a_w + b * bus_w.abs() + c_per_w * bus_w * bus_w }
    }

    /// Power at the terminals for a power of the element (W, not negative) in a direction: the small root of the quadratic.
    fn bus_w(&self, inner_w: f64, discharging: bool) -> f64 {
        let Converter { a_w, b, c_per_w } = self.converter;
        if discharging {
            let left = (inner_w - a_w).max(0.0);
            2.0 * left / ((1.0 + b) + ((1.0 + b) * (1.0 + b) + 4.0 * c_per_w * left).sqrt())
        } else {
            let needed = inner_w + a_w;
            let root = ((1.0 - b) * (1.0 - b) - 4.0 * c_per_w * needed).max(0.0).sqrt();
            -2.0 * needed / ((1.0 - b) + root)
        }
    }

    /// Least limit of the element at which anything reaches the terminals.
    fn least_w(&self, discharging: bool) -> f64 {
        if discharging { self.converter.a_w } else { 0.0 }
    }

    fn has_converter(&self) -> bool {
        self.converter != Converter::default()
    }

    /// Carries `bus_w` (discharge positive) at the terminals for a time, as far as the circuit can.
    pub(super) fn advance(&self, from: State, bus_w: f64, seconds: f64) -> (State, Carried) {
        let inner_w = bus_w + self.loss_w(bus_w);
        let asked = Asked { bus_w, inner_w, discharging: inner_w > 0.0 || (inner_w == 0.0 && bus_w > 0.0) };
        let mut state = from;
        let mut segment = self.element.segment(state.energy_j);
        let mut mode = self.entry(state, segment, &asked);
        let mut sum = Carried { fully: true, ..Carried::default() };
        let (mut left, mut step) = (seconds, seconds);
        while left > 0.0 {
            segment = self.aligned(state, segment, mode, &asked);
            sum.fully &= mode == Mode::Asked || asked.bus_w == 0.0;
            let pinned = state.energy_j <= 0.0 && self.rates(state, segment, mode, &asked).energy_w < 0.0;
            if mode == Mode::Rest && pinned && state.pair_v == 0.0 {
                sum.rested_s += left;
                break;
            }
            if mode == Mode::Limited
                && state.energy_j == 0.0
                && let Some((time, energy_j)) = self.pushed_off(&asked, seconds)
            {
                sum.inner_j -= energy_j;
                sum.given_j += self.bus_w(energy_j / time, false) * time;
                state.energy_j = energy_j;
                left -= time;
            }
            let span = step.min(left);
            let trial = self.trial(state, segment, mode, pinned, &asked, span);
            // Not a number counts as too large an error.
            if (trial.error > 1.0 || trial.error.is_nan()) && span > SHORTEST * seconds {
                step = span * shrink(trial.error);
                continue;
            }
            let (taken_s, trial, event) =
                self.up_to_event(state, segment, mode, pinned, &asked, span, trial, seconds);
            sum.add(&trial.carried);
            if mode == Mode::Rest {
                sum.rested_s += taken_s;
            }
            state = trial.after;
            left -= taken_s;
            step = if event.is_some() { seconds } else { span * grow(trial.error) };
            match event {
                Some(Event::End(energy_j)) => {
                    state.energy_j = energy_j;
                    mode = Mode::Rest;
                }
                Some(Event::Empty) => state.energy_j = 0.0,
                Some(Event::Turn(next)) => mode = next,
                Some(Event::Line) | None => {}
            }
        }
        if asked.bus_w == 0.0 {
            sum.rested_s = 0.0;
        }
        if sum.fully {
            sum.given_j = asked.bus_w * seconds;
        }
        (state, sum)
    }

    /// The mode in which an interval starts.
    fn entry(&self, at: State, segment: usize, asked: &Asked) -> Mode {
        if asked.bus_w == 0.0 || self.ended(at, asked) {
            return Mode::Rest;
        }
        let limit_w = self.element.limit_w(at, segment, asked.discharging);
        if limit_w >= asked.inner_w.abs() {
            Mode::Asked
        } else if limit_w > self.least_w(asked.discharging) || self.pushed_off(asked, 1.0).is_some() {
            Mode::Limited
        } else {
            Mode::Blocked
        }
    }

    /// Whether the energy is at its end.
    fn ended(&self, at: State, asked: &Asked) -> bool {
        let (least_j, greatest_j) = self.element.ends_j();
        if asked.discharging { at.energy_j <= least_j } else { at.energy_j >= greatest_j }
    }

    /// Power of the element in a mode, W, discharge positive.
    fn inner_w(&self, at: State, segment: usize, mode: Mode, asked: &Asked) -> f64 {
        match mode {
            Mode::Asked => asked.inner_w,
            Mode::Limited => {
                let limit = self.element.limit_w(at, segment, asked.discharging).min(asked.inner_w.abs());
                if asked.discharging { limit } else { -limit }
            }
            Mode::Blocked | Mode::Rest => 0.0,
        }
    }

    fn rates(&self, at: State, segment: usize, mode: Mode, asked: &Asked) -> super::element::Flow {
        self.element.flow(at, segment, self.inner_w(at, segment, mode, asked))
    }

    /// The line of the table on which the element goes on from its ends.
    fn aligned(&self, at: State, segment: usize, mode: Mode, asked: &Asked) -> usize {
        let (low, high) = self.element.span_j(segment);
        if at.energy_j > low && at.energy_j < high {
            return segment;
        }
        let rising = self.rates(at, segment, mode, asked).energy_w > 0.0;
        let last = self.element.segment(f64::MAX);
        if at.energy_j < low || (at.energy_j == low && !rising) {
            segment.saturating_sub(1)
        } else if at.energy_j > high || (at.energy_j == high && rising) {
            (segment + 1).min(last)
        } else {
            segment
        }
    }

    /// Where the rates vanish at no energy (a coil at rest under a greatest voltage), the first moment is given in closed form.
    fn pushed_off(&self, asked: &Asked, seconds: f64) -> Option<(f64, f64)> {
        if asked.discharging { None } else { self.element.pushed_off(-asked.inner_w, 1e-6 * seconds) }
    }

    /// What a stretch of a mode does over a time, without regard to events.
    fn trial(
        &self,
        at: State,
        segment: usize,
        mode: Mode,
        pinned: bool,
        asked: &Asked,
        seconds: f64,
    ) -> Trial {
        let drive = match mode {
            Mode::Asked => Drive::Power(asked.inner_w),
            Mode::Limited => Drive::Limit { discharging: asked.discharging },
            Mode::Blocked | Mode::Rest => Drive::Power(0.0),
        };
        let closed = !pinned && (mode != Mode::Limited || !self.has_converter());
        if closed && let Some(exact) = self.element.exact(at, segment, drive, seconds) {
            let given_j = match mode {
                Mode::Asked => asked.bus_w * seconds,
                Mode::Limited => exact.given_j,
                Mode::Blocked | Mode::Rest => 0.0,
            };
            let carried =
                Carried { given_j, inner_j: exact.given_j, lost_j: exact.lost_j, ..Carried::default() };
            return Trial { after: exact.after, carried, error: 0.0 };
        }
        let rate = |y: &[f64; 7]| {
            let now = State { energy_j: y[0], pair_v: y[1] };
            let inner_w = self.inner_w(now, segment, mode, asked);
            let mut flow = self.element.flow(now, segment, inner_w);
            if pinned {
                // Nothing is left: no more leaks than flows in.
                flow.lost_w[LEAK] += flow.energy_w;
                flow.energy_w = 0.0;
            }
            let bus_w = match mode {
                Mode::Asked => asked.bus_w,
                Mode::Limited => self.bus_w(inner_w.abs(), asked.discharging),
                Mode::Blocked | Mode::Rest => 0.0,
            };
            let [a, b, c] = flow.lost_w;
            [flow.energy_w, flow.pair_v_per_s, inner_w, bus_w, a, b, c]
        };
        let start = [at.energy_j, at.pair_v, 0.0, 0.0, 0.0, 0.0, 0.0];
        let (y, errors) = ode::step(&start, seconds, rate);
        let scale_j = at.energy_j.abs() + asked.inner_w.abs() * seconds;
        let mut error = (errors[0]
            / (OF_STATE * at.energy_j.abs().max(y[0].abs()) + OF_SCALE * scale_j + f64::MIN_POSITIVE))
            .abs();
        error = worse(error, errors[1] / (OF_STATE * at.pair_v.abs().max(y[1].abs()) + 1e-10));
        for j in 2..7 {
            error = worse(error, errors[j] / (OF_FLOW * y[j].abs() + OF_SCALE * scale_j + f64::MIN_POSITIVE));
        }
        let carried =
            Carried { given_j: y[3], inner_j: y[2], lost_j: [y[4], y[5], y[6]], ..Carried::default() };
        Trial { after: State { energy_j: y[0], pair_v: y[1] }, carried, error }
    }

    /// Cuts a stretch at the first event in it.
    #[allow(clippy::too_many_arguments, reason = "the stretch, all of which is tried again")]
    fn up_to_event(
        &self,
        at: State,
        segment: usize,
        mode: Mode,
        pinned: bool,
        asked: &Asked,
        span_s: f64,
        whole: Trial,
        seconds: f64,
    ) -> (f64, Trial, Option<Event>) {
        let Some(mut event) = self.event(whole.after, segment, mode, pinned, asked) else {
            return (span_s, whole, None);
        };
        let distance = |event: Event, at: State| self.distance(event, at, segment, asked);
        let (mut before, mut after, mut trial) = (0.0, span_s, whole);
        let (mut from, mut guess) = (distance(event, at), 0.0);
        for _ in 0..MOST_TRIALS {
            if after - before <= event.width() * seconds {
                break;
            }
            // The secant's root, and from it a little to the side on which the last trial did not lie: both ends close in.
            let to = distance(event, trial.after);
            let root = before + (after - before) * from / (from - to);
            let nudge = (0.01 * (root - guess).abs()).max(0.2 * event.width() * seconds);
            let aimed = if root - before < after - root { root + nudge } else { root - nudge };
            guess = root;
            let middle = if aimed > before && aimed < after { aimed } else { f64::midpoint(before, after) };
            let tried = self.trial(at, segment, mode, pinned, asked, middle);
            if let Some(found) = self.event(tried.after, segment, mode, pinned, asked) {
                if found != event {
                    event = found;
                    from = f64::NAN;
                }
                after = middle;
                trial = tried;
            } else {
                before = middle;
                from = distance(event, tried.after);
            }
        }
        (after, trial, Some(event))
    }

    /// How far a state is from an event, in a measure that changes its sign there; not a number where there is none.
    fn distance(&self, event: Event, at: State, segment: usize, asked: &Asked) -> f64 {
        match event {
            Event::End(energy_j) => at.energy_j - energy_j,
            Event::Empty => at.energy_j,
            Event::Line => {
                let (low, high) = self.element.span_j(segment);
                // The line's end on the side to which the energy moves is the nearer one.
                if at.energy_j - low < high - at.energy_j { at.energy_j - low } else { at.energy_j - high }
            }
            Event::Turn(_) => {
                let limit_w = self.element.limit_w(at, segment, asked.discharging);
                if limit_w.is_finite() { limit_w - asked.inner_w.abs() } else { f64::NAN }
            }
        }
    }

    fn event(&self, at: State, segment: usize, mode: Mode, pinned: bool, asked: &Asked) -> Option<Event> {
        if matches!(mode, Mode::Asked | Mode::Limited) && !pinned && self.ended(at, asked) {
            let (least_j, greatest_j) = self.element.ends_j();
            return Some(Event::End(if asked.discharging { least_j } else { greatest_j }));
        }
        if at.energy_j < 0.0 && !pinned {
            return Some(Event::Empty);
        }
        let (low, high) = self.element.span_j(segment);
        if (at.energy_j < low && segment > 0)
            || (at.energy_j > high && segment < self.element.segment(f64::MAX))
        {
            return Some(Event::Line);
        }
        if mode == Mode::Rest {
            return None;
        }
        let limit_w = self.element.limit_w(at, segment, asked.discharging);
        let least_w = self.least_w(asked.discharging);
        match mode {
            Mode::Asked if limit_w < asked.inner_w.abs() => {
                Some(Event::Turn(if limit_w > least_w { Mode::Limited } else { Mode::Blocked }))
            }
            Mode::Limited if limit_w >= asked.inner_w.abs() => Some(Event::Turn(Mode::Asked)),
            // A converter's constant loss would switch on and off at this limit without end: it stays off.
            Mode::Limited if limit_w <= least_w => {
                Some(Event::Turn(if least_w > 0.0 { Mode::Rest } else { Mode::Blocked }))
            }
            Mode::Blocked if limit_w > least_w => Some(Event::Turn(Mode::Limited)),
            _ => None,
        }
    }
}

/// The larger error; not a number stays one.
fn worse(a: f64, b: f64) -> f64 {
    let b = b.abs();
    if b > a || b.is_nan() { b } else { a }
}

/// Step sizes by the usual rule for order 5: safety 0.9, exponent 1/5.
fn shrink(error: f64) -> f64 {
    if error.is_finite() { (0.9 * libm::pow(error, -0.2)).clamp(0.1, 0.9) } else { 0.1 }
}

fn grow(error: f64) -> f64 {
    if error > 0.0 { (0.9 * libm::pow(error, -0.2)).clamp(0.2, 5.0) } else { 5.0 }
}
