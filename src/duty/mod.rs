//! Record to [`Duty`]: the power asked of storage at every moment, and the integrals of net power.
//!
//! [`ask`] is the stage's door. Every duty is, for each interval, a range of allowed storage power (its [`Tube`]); one core
//! (`requirement::capacity`) answers least capacity and feasibility for all of them.

mod episodes;
mod firming;
mod frequency;
mod hours;
mod limits;
mod plan;
mod polygon;
mod ride;
mod series;
mod shifting;
mod smoothing;
mod tube;

use std::rc::Rc;

pub use episodes::Episode;
pub(crate) use hours::Hours;
pub(crate) use ride::Reserve;
pub use tube::Tube;

use plan::Plan;

use crate::case::{Balance, Case, Connection, DutyCase, Positive, SmoothingMethod};
use crate::fault::{Fault, Result};
use crate::losses::Losses;
use crate::record::Record;
use crate::result::{DutyResult, Infeasible, RecordResult};
use crate::units::civil::Reading;

/// The share of the greatest import that a limits duty holds where no limit was entered. A starting point, no more.
const OPENING_LIMIT_SHARE: f64 = 0.8;

/// What is asked of storage.
#[derive(Debug, Clone)]
pub struct Duty {
    /// The record it was made from.
    pub record: Rc<Record>,
    /// The kind with its terms.
    pub kind: Kind,
    /// Islanded or connected.
    pub connection: Connection,
    /// Whether the connection was guessed.
    pub connection_guessed: bool,
    /// Column that stands for net power (kind `given`): index in the record's extras, and its sign.
    given: Option<(usize, f64)>,
    /// Maximal runs of one sign of net power, in order.
    pub episodes: Vec<Episode>,
    /// The record's totals.
    pub totals: RecordResult,
    /// The integrals of net power, and what the kind adds.
    pub result: DutyResult,
    /// Why no store can carry it, where its terms alone say so.
    pub infeasible: Option<Infeasible>,
    /// The terms as the case gives them.
    terms: DutyCase,
    /// Whether the record is repeated.
    cyclic: bool,
    /// The losses with which the plan was made.
    losses: Losses,
    /// First interval of the worst outage.
    worst_start: Option<usize>,
    /// The output of least energy, kept for other losses.
    output: Option<Rc<Vec<f64>>>,
    /// What the terms come to, interval by interval.
    plan: Rc<Plan>,
}

/// The kinds of duty, with their terms in force.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Kind {
    /// Serve deficits from surplus; surplus may be curtailed.
    Balance,
    /// Hold limits at the connection point.
    Limits(Limits),
    /// Carry a column: charge asked may be left, discharge must be served.
    Given,
    /// Hold ramps down.
    Smoothing,
    /// Make a fixed output.
    Firming,
    /// Carry the critical demand through outages.
    RideThrough,
    /// Answer the grid's frequency.
    Frequency,
    /// Shift energy by price.
    Shifting,
}

impl Kind {
    /// The word of the case and the result.
    pub fn word(self) -> &'static str {
        match self {
            Self::Balance => "balance",
            Self::Limits(_) => "limits",
            Self::Given => "given",
            Self::Smoothing => "smoothing",
            Self::Firming => "firming",
            Self::RideThrough => "ride_through",
            Self::Frequency => "frequency",
            Self::Shifting => "shifting",
        }
    }

    /// Whether it is about net power: deficits served from surplus.
    pub fn balances(self) -> bool {
        matches!(self, Self::Balance | Self::Given)
    }

    /// Whether it fixes the store's power in every interval.
    pub fn hands_over(self) -> bool {
        matches!(self, Self::Smoothing | Self::Firming | Self::Frequency | Self::Shifting)
    }
}

/// Limits at the connection point.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limits {
    /// Greatest import, kW; none = no limit.
    pub import_kw: Option<f64>,
    /// Greatest export, kW; none = no limit.
    pub export_kw: Option<f64>,
    /// Whether the store may be charged from the grid below the import limit.
    pub recharge: bool,
    /// Whether the store may discharge into the grid below the export limit.
    pub discharge: bool,
}

impl Duty {
    /// Net power of interval `i` (kW, positive = surplus), none in a gap. For kind `given` its column.
    pub fn net_kw(&self, i: usize) -> Option<f64> {
        match self.given {
            None => self.record.net_kw(i),
            Some((column, sign)) => self.record.extras.get(column)?.values.get(i).map(|value| sign * value),
        }
    }

    /// Number of intervals.
    pub fn intervals(&self) -> usize {
        self.record.clock.intervals
    }

    /// Power that the store is handed in interval `i` (kW, positive = charge), before any standing load: net power, or what the
    /// kind fixes; none in a gap. For outages, minus the critical net demand.
    pub fn handed_kw(&self, i: usize) -> Option<f64> {
        match self.plan.as_ref() {
            Plan::Net | Plan::Limits(_) => self.net_kw(i),
            Plan::Fixed(power) => power.get(i),
            Plan::Ride(outage) => Some(0.0 - outage.need_kw.get(i)?),
        }
    }

    /// Whether the record has a net power; otherwise it holds only the column that the duty needs.
    pub fn has_net(&self) -> bool {
        self.given.is_some() || self.record.has_net()
    }

    /// Net power for pictures; where there is none, the power that the store is handed.
    pub fn shown_kw(&self, i: usize) -> Option<f64> {
        if self.has_net() { self.net_kw(i) } else { self.handed_kw(i) }
    }

    /// The limits in force in interval `i`, where those without hours are `limits`: of all that apply, the lowest.
    pub fn limits_at(&self, i: usize, limits: &Limits) -> Limits {
        let Plan::Limits(series) = self.plan.as_ref() else { return *limits };
        let lower = |plain: Option<f64>, timed: f64| {
            let lowest = plain.unwrap_or(f64::NAN).min(timed);
            (!lowest.is_nan()).then_some(lowest)
        };
        Limits {
            import_kw: lower(limits.import_kw, series.import_kw[i]),
            export_kw: lower(limits.export_kw, series.export_kw[i]),
            ..*limits
        }
    }

    /// Whether the limits change with time.
    pub fn timed_limits(&self) -> bool {
        matches!(self.plan.as_ref(), Plan::Limits(_))
    }

    /// The range of storage power allowed in interval `i` after a standing load (kW) is taken from net power; none in a
    /// gap. For outages, the range while one lasts.
    pub fn tube(&self, i: usize, standing_kw: f64) -> Option<Tube> {
        let power = self.handed_kw(i)? - standing_kw;
        Some(match self.kind {
            Kind::Balance | Kind::Given | Kind::RideThrough => Tube::balance(power),
            Kind::Limits(limits) => Tube::limits(power, &self.limits_at(i, &limits)),
            Kind::Smoothing | Kind::Firming | Kind::Frequency | Kind::Shifting => Tube::fixed(power),
        })
    }

    /// Whether the store must end as full as it began: as the case says, but for duties whose power follows from terms that know
    /// nothing of the store's level.
    pub fn is_cyclic(&self) -> bool {
        self.cyclic
            && match &self.terms {
                DutyCase::Smoothing(terms) => terms.method == SmoothingMethod::LeastEnergy,
                DutyCase::Firming(terms) => terms.schedule.is_none(),
                DutyCase::Frequency(_) | DutyCase::Shifting(_) | DutyCase::RideThrough(_) => false,
                _ => true,
            }
    }

    /// The reserves that outages need with these losses; none for other kinds, or where no start can be looked at. Charging during an
    /// outage is limited by `charge_kw` (none = no limit).
    pub(crate) fn reserve(&self, losses: &Losses, charge_kw: Option<f64>) -> Option<Reserve> {
        match self.plan.as_ref() {
            Plan::Ride(outage) => outage.reserve(losses, charge_kw, self.record.step_h()),
            _ => None,
        }
    }

    /// The intervals that a store is run over, as the first and their number: the whole record, or the worst outage, which may run over
    /// the record's end.
    pub fn run_intervals(&self) -> (usize, usize) {
        match (self.plan.as_ref(), self.worst_start) {
            (Plan::Ride(outage), Some(start)) => (start, outage.steps),
            (Plan::Ride(_), None) => (0, 0),
            _ => (0, self.intervals()),
        }
    }

    /// What the clock on the wall shows at the start of interval `i`.
    pub fn reading(&self, i: usize) -> Option<Reading> {
        plan::reading(&self.record.clock, i)
    }

    /// The terms as the case gives them.
    pub fn terms(&self) -> &DutyCase {
        &self.terms
    }

    /// The same duty for a store of other losses: some powers depend on them (blocks that close, the return of frequency, schedules).
    ///
    /// # Errors
    /// None that [`ask`] has not met before.
    pub fn under(&self, losses: &Losses) -> Result<Self> {
        if self.losses == *losses {
            return Ok(self.clone());
        }
        let (plan, added) = plan::make(&self.record, &self.terms, losses, self.cyclic, self.output.as_ref())?;
        Ok(Self {
            plan: Rc::new(plan),
            losses: *losses,
            infeasible: added.infeasible,
            worst_start: added.worst_start,
            ..self.clone()
        })
    }
}

/// Turns a record into the duty of a case.
///
/// # Errors
/// If the record lacks a column that the duty needs.
pub fn ask(record: &Rc<Record>, case: &Case) -> Result<Duty> {
    let load_only = record.net_kw.is_none() && record.supply_kw.is_none();
    let given = match &case.duty {
        DutyCase::Given { column, positive } => {
            let extra = plan::column(record, column, "column")?;
            let place = record.extras.iter().position(|other| std::ptr::eq(other, extra)).unwrap_or_default();
            Some((place, if *positive == Positive::Charge { 1.0 } else { -1.0 }))
        }
        _ => None,
    };
    // The other kinds live on a column of their own.
    let needs_net = matches!(
        case.duty,
        DutyCase::Guess {}
            | DutyCase::Balance {}
            | DutyCase::Limits { .. }
            | DutyCase::Smoothing(_)
            | DutyCase::Firming(_)
    );
    if needs_net && !record.has_net() {
        return Err(Fault::new(
            "the record has neither supply, demand nor net power",
            record.site.clone(),
            "Give a column one of these roles under \u{201c}As read\u{201d}, or in the case's record.roles.",
        ));
    }
    let losses = Losses::of(&case.requirement);
    let cyclic = case.requirement.balance == Balance::Cyclic;
    let (plan, added) = plan::make(record, &case.duty, &losses, cyclic, None)?;
    let mut duty = Duty {
        record: Rc::clone(record),
        kind: Kind::Balance,
        connection: Connection::Connected,
        connection_guessed: false,
        given,
        episodes: Vec::new(),
        totals: episodes::no_totals(),
        result: episodes::nothing(),
        infeasible: added.infeasible,
        terms: case.duty.clone(),
        cyclic,
        losses,
        worst_start: added.worst_start,
        output: added.output,
        plan: Rc::new(plan),
    };
    duty.totals = totals(&duty);
    if duty.infeasible.is_none() && (0..duty.intervals()).all(|i| duty.handed_kw(i).is_none()) {
        return Err(Fault::new(
            format!("none of the {} intervals has all the values that the duty needs", duty.totals.intervals),
            record.site.clone(),
            "See the findings for the cells that do not read, or give other columns the roles that the duty needs.",
        ));
    }
    let (found, integrals) = episodes::integrate(&duty);
    duty.episodes = found;
    duty.kind = kind(&case.duty, load_only, integrals.peak_discharge_kw.unwrap_or_default());
    duty.connection_guessed = case.site.connection.is_none();
    duty.connection = case.site.connection.unwrap_or_else(|| guess_connection(duty.kind, &integrals, case));
    let (import_limit_kw, export_limit_kw) = match duty.kind {
        Kind::Limits(limits) => (limits.import_kw, limits.export_kw),
        _ => (None, None),
    };
    duty.result = DutyResult {
        kind: duty.kind.word().to_owned(),
        connection: duty.connection,
        import_limit_kw,
        export_limit_kw,
        net_discharge_kwh: added.net_discharge_kwh,
        output_kw: added.output_kw,
        worst_start: added.worst_start.map(|i| record.clock.stamp(i)),
        reserve_p95_kwh: added.reserve_p95_kwh,
        delivered_kwh: added.delivered_kwh,
        absorbed_kwh: added.absorbed_kwh,
        value: added.value,
        ..integrals
    };
    Ok(duty)
}

/// The kind in force.
fn kind(terms: &DutyCase, load_only: bool, peak_kw: f64) -> Kind {
    let opening = Some(OPENING_LIMIT_SHARE * peak_kw);
    match terms {
        DutyCase::Given { .. } => Kind::Given,
        DutyCase::Balance {} => Kind::Balance,
        DutyCase::Guess {} if !load_only => Kind::Balance,
        DutyCase::Guess {} => {
            Kind::Limits(Limits { import_kw: opening, export_kw: None, recharge: true, discharge: false })
        }
        DutyCase::Limits {
            import_limit_kw,
            export_limit_kw,
            recharge_from_grid,
            discharge_to_grid,
            hours,
            import_limit_column,
            export_limit_column,
            import_limit_kva,
            ..
        } => {
            let none = import_limit_kw.is_none()
                && export_limit_kw.is_none()
                && hours.is_empty()
                && import_limit_column.is_none()
                && export_limit_column.is_none()
                && import_limit_kva.is_none();
            Kind::Limits(Limits {
                import_kw: if none { opening } else { *import_limit_kw },
                export_kw: *export_limit_kw,
                recharge: *recharge_from_grid,
                discharge: *discharge_to_grid,
            })
        }
        DutyCase::Smoothing(_) => Kind::Smoothing,
        DutyCase::Firming(_) => Kind::Firming,
        DutyCase::RideThrough(_) => Kind::RideThrough,
        DutyCase::Frequency(_) => Kind::Frequency,
        DutyCase::Shifting(_) => Kind::Shifting,
    }
}

/// Islanded only if the surplus after losses covers the deficit: otherwise something else must have served it.
fn guess_connection(kind: Kind, integrals: &DutyResult, case: &Case) -> Connection {
    let round_trip = case.requirement.charge_efficiency * case.requirement.discharge_efficiency;
    let (surplus, deficit) = (integrals.surplus(), integrals.deficit());
    let covered = deficit > 0.0 && round_trip * surplus >= deficit;
    if covered && kind.balances() { Connection::Islanded } else { Connection::Connected }
}

/// The record's totals, over intervals whose net power is there.
fn totals(duty: &Duty) -> RecordResult {
    use crate::numeric::Sum;
    let record = &duty.record;
    let step_h = record.step_h();
    let (mut supply, mut demand, mut missing) = (Sum::default(), Sum::default(), 0);
    for i in 0..record.clock.intervals {
        if duty.shown_kw(i).is_none() {
            missing += 1;
        }
        if record.net_kw(i).is_some() {
            supply.add(record.supply_kw.as_ref().and_then(|series| series.get(i)).unwrap_or(0.0));
            demand.add(record.demand_kw.as_ref().and_then(|series| series.get(i)).unwrap_or(0.0));
        }
    }
    RecordResult {
        intervals: record.clock.intervals,
        step_s: record.clock.step_s(),
        start: record.clock.stamp(0),
        end: record.clock.stamp(record.clock.intervals),
        missing_intervals: missing,
        supply_kwh: record.supply_kw.as_ref().map(|_| supply.value() * step_h),
        demand_kwh: record.demand_kw.as_ref().map(|_| demand.value() * step_h),
        filled_share: if record.clock.intervals == 0 {
            0.0
        } else {
            record.filled as f64 / record.clock.intervals as f64
        },
        findings: record.findings.clone(),
    }
}
