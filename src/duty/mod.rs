//! Record to [`Duty`]: the power asked of storage at every moment, and the integrals of net power.
//!
//! [`ask`] is the stage's door. Every duty is, for each interval, a range of allowed storage power (its [`Tube`]); one core
//! (`requirement::capacity`) answers least capacity and feasibility for all of them.

mod episodes;
mod tube;

use std::rc::Rc;

pub use episodes::Episode;
pub use tube::Tube;

use crate::case::{Case, Connection, DutyCase, Positive};
use crate::fault::{Fault, Result, quote};
use crate::record::Record;
use crate::result::{DutyResult, RecordResult};

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
    /// The integrals of net power.
    pub result: DutyResult,
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

    /// The range of storage power allowed in interval `i` after a standing load (kW) is taken from net power; none in a
    /// gap.
    pub fn tube(&self, i: usize, standing_kw: f64) -> Option<Tube> {
        let net = self.net_kw(i)? - standing_kw;
        Some(match self.kind {
            Kind::Balance | Kind::Given => Tube::balance(net),
            Kind::Limits(limits) => Tube::limits(net, &limits),
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
            Some((column_of(record, column)?, if *positive == Positive::Charge { 1.0 } else { -1.0 }))
        }
        _ => None,
    };
    if given.is_none() && record.net_kw.is_none() && record.supply_kw.is_none() && record.demand_kw.is_none()
    {
        return Err(Fault::new(
            "the record has neither supply, demand nor net power",
            record.site.clone(),
            "Give a column one of these roles under \u{201c}As read\u{201d}, or in the case's record.roles.",
        ));
    }
    let mut duty = Duty {
        record: Rc::clone(record),
        kind: Kind::Balance,
        connection: Connection::Connected,
        connection_guessed: false,
        given,
        episodes: Vec::new(),
        totals: episodes::no_totals(),
        result: episodes::nothing(),
    };
    duty.totals = totals(&duty);
    if duty.totals.missing_intervals == duty.totals.intervals {
        return Err(Fault::new(
            format!(
                "none of the {} intervals has all the values that net power needs",
                duty.totals.intervals
            ),
            record.site.clone(),
            "See the findings for the cells that do not read, or give other columns the roles of supply and demand.",
        ));
    }
    let (found, integrals) = episodes::integrate(&duty);
    duty.episodes = found;
    duty.kind = match &case.duty {
        DutyCase::Given { .. } => Kind::Given,
        DutyCase::Balance {} => Kind::Balance,
        DutyCase::Guess {} if !load_only => Kind::Balance,
        DutyCase::Guess {} => Kind::Limits(Limits {
            import_kw: Some(OPENING_LIMIT_SHARE * integrals.peak_discharge_kw),
            export_kw: None,
            recharge: true,
            discharge: false,
        }),
        DutyCase::Limits { import_limit_kw, export_limit_kw, recharge_from_grid, discharge_to_grid } => {
            let opening = Some(OPENING_LIMIT_SHARE * integrals.peak_discharge_kw);
            Kind::Limits(Limits {
                import_kw: import_limit_kw.or(if export_limit_kw.is_none() { opening } else { None }),
                export_kw: *export_limit_kw,
                recharge: *recharge_from_grid,
                discharge: *discharge_to_grid,
            })
        }
    };
    duty.connection_guessed = case.site.connection.is_none();
    duty.connection = case.site.connection.unwrap_or_else(|| guess_connection(duty.kind, &integrals, case));
    let (import_limit_kw, export_limit_kw) = match duty.kind {
        Kind::Limits(limits) => (limits.import_kw, limits.export_kw),
        _ => (None, None),
    };
    duty.result = DutyResult {
        kind: match duty.kind {
            Kind::Balance => "balance",
            Kind::Limits(_) => "limits",
            Kind::Given => "given",
        }
        .to_owned(),
        connection: duty.connection,
        import_limit_kw,
        export_limit_kw,
        ..integrals
    };
    Ok(duty)
}

/// Islanded only if the surplus after losses covers the deficit: otherwise something else must have served it.
fn guess_connection(kind: Kind, integrals: &DutyResult, case: &Case) -> Connection {
    let round_trip = case.requirement.charge_efficiency * case.requirement.discharge_efficiency;
    let covered = integrals.deficit_kwh > 0.0 && round_trip * integrals.surplus_kwh >= integrals.deficit_kwh;
    if covered && !matches!(kind, Kind::Limits(_)) { Connection::Islanded } else { Connection::Connected }
}

fn column_of(record: &Record, header: &str) -> Result<usize> {
    let found = record
        .extra(header)
        .and_then(|extra| record.extras.iter().position(|other| std::ptr::eq(other, extra)));
    found.ok_or_else(|| {
        let headers: Vec<&str> = record.extras.iter().map(|extra| extra.header.as_str()).collect();
        Fault::new(
            format!("the duty names a column {} that the record does not hold", quote(header)),
            "case, at duty.column",
            if headers.is_empty() {
                "Give the header of a column of numbers, as it stands in the file.".to_owned()
            } else {
                format!("Give one of: {}.", headers.join(", "))
            },
        )
    })
}

/// The record's totals, over intervals whose net power is there.
fn totals(duty: &Duty) -> RecordResult {
    use crate::numeric::Sum;
    let record = &duty.record;
    let step_h = record.step_h();
    let (mut supply, mut demand, mut missing) = (Sum::default(), Sum::default(), 0);
    for i in 0..record.clock.intervals {
        if duty.net_kw(i).is_none() {
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
