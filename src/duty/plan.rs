//! What a duty's terms come to, interval by interval.

use std::rc::Rc;

use super::firming;
use super::frequency;
use super::ride::Outage;
use super::series::Known;
use super::shifting;
use super::smoothing::{self, Smooth};
use crate::case::{
    DutyCase, Firming, Foresight, RideThrough, SeriesOf, Shifting, Smoothing, SmoothingMethod,
};
use crate::fault::{Fault, Result, quote};
use crate::losses::Losses;
use crate::record::{Clock, Extra, Record, Role};
use crate::result::Infeasible;
use crate::units::civil::{Date, Reading};
use crate::units::people;

/// Interval by interval, beyond net power.
#[derive(Debug, Clone)]
pub(super) enum Plan {
    /// Nothing: net power says it all.
    Net,
    /// Import and export limits that change with time, kW.
    Limits(LimitSeries),
    /// The power that the store is handed, kW, positive = charge, before any standing load.
    Fixed(Known),
    /// Outages.
    Ride(Outage),
}

/// Limits that change with time, kW; NaN where none applies.
#[derive(Debug, Clone)]
pub(super) struct LimitSeries {
    pub(super) import_kw: Vec<f64>,
    pub(super) export_kw: Vec<f64>,
}

/// What a plan adds to the result.
#[derive(Debug, Clone, Default)]
pub(super) struct Added {
    pub(super) net_discharge_kwh: Option<f64>,
    pub(super) output_kw: Option<f64>,
    pub(super) worst_start: Option<usize>,
    pub(super) reserve_p95_kwh: Option<f64>,
    pub(super) delivered_kwh: Option<f64>,
    pub(super) absorbed_kwh: Option<f64>,
    pub(super) value: Option<f64>,
    pub(super) infeasible: Option<Infeasible>,
    /// The output of least energy, kW, before it is lowered for losses: it is the dearest to find.
    pub(super) output: Option<Rc<Vec<f64>>>,
}

/// Makes the plan of a duty's terms with a store's losses; `cyclic` where the record is repeated. `found` is the output of least
/// energy, where it is known already.
pub(super) fn make(
    record: &Record,
    terms: &DutyCase,
    losses: &Losses,
    cyclic: bool,
    found: Option<&Rc<Vec<f64>>>,
) -> Result<(Plan, Added)> {
    match terms {
        DutyCase::Guess {} | DutyCase::Balance {} | DutyCase::Given { .. } => {
            Ok((Plan::Net, Added::default()))
        }
        DutyCase::Limits { .. } => super::limits::series(record, terms)
            .map(|limits| (limits.map_or(Plan::Net, Plan::Limits), Added::default())),
        DutyCase::Smoothing(terms) => smooth(record, terms, losses, cyclic, found),
        DutyCase::Firming(terms) => firm(record, terms, losses, cyclic),
        DutyCase::RideThrough(terms) => ride(record, terms, losses),
        DutyCase::Frequency(terms) => {
            let steps = record.clock.intervals;
            let column = column(record, &terms.column, "column")?;
            let hertz = Known::of(steps, |i| column.values.get(i));
            let answer = frequency::answer(&hertz, terms, losses, record.step_h());
            let added = Added {
                delivered_kwh: Some(answer.delivered_kwh),
                absorbed_kwh: Some(answer.absorbed_kwh),
                ..Added::default()
            };
            Ok((handed(&answer.power_kw, losses), added))
        }
        DutyCase::Shifting(terms) => shift(record, terms, losses),
    }
}

/// A plan of a power at the terminals: the standing load is put back, since whoever asks takes its own off.
fn handed(power_kw: &[f64], losses: &Losses) -> Plan {
    Plan::Fixed(Known::from_values(power_kw.iter().map(|power| power + losses.standing_kw).collect()))
}

/// Supply or net power less the standing load.
fn power(record: &Record, series: SeriesOf, losses: &Losses) -> Result<Known> {
    let steps = record.clock.intervals;
    match (series, &record.supply_kw) {
        (SeriesOf::Supply, Some(supply)) => {
            Ok(Known::of(steps, |i| Some(supply.get(i)? - losses.standing_kw)))
        }
        (SeriesOf::Supply, None) => Err(Fault::new(
            "the duty is about supply, but no column of the record is one",
            "case, at duty.series",
            "Take series net, or give a column the role of supply.",
        )),
        (SeriesOf::Net, _) => Ok(Known::of(steps, |i| Some(record.net_kw(i)? - losses.standing_kw))),
    }
}

/// The power that a store takes up when `output` is made of `power`.
fn difference(power: &Known, output: &[f64]) -> Vec<f64> {
    (0..power.len()).map(|i| power.get(i).unwrap_or(f64::NAN) - output[i]).collect()
}

fn smooth(
    record: &Record,
    terms: &Smoothing,
    losses: &Losses,
    cyclic: bool,
    found: Option<&Rc<Vec<f64>>>,
) -> Result<(Plan, Added)> {
    /// Longest stretch whose least energy is looked for.
    const LONGEST: usize = 50_000;
    let step_h = record.step_h();
    let mut power = power(record, terms.series, losses)?;
    let least_energy = terms.method == SmoothingMethod::LeastEnergy;
    if let Some(day) = &terms.day {
        power = on_day(&record.clock, &power, day)?;
    }
    if least_energy && power.there().count() > LONGEST {
        return Err(Fault::new(
            format!(
                "the least energy is looked for over at most {} intervals",
                people::whole(LONGEST as f64)
            ),
            "case, at duty.day",
            "Name the day to look at, such as its windiest, or take the method least_power.",
        ));
    }
    let smooth = Smooth {
        method: terms.method,
        ramp_kw: terms.ramp().unwrap_or(f64::INFINITY) * record.clock.step_s() / 60.0,
        feedback_h: terms.feedback_h,
        never_below_zero: terms.series == SeriesOf::Supply,
        closes: cyclic,
    };
    let output = match found {
        Some(found) => Rc::clone(found),
        None => Rc::new(smoothing::output(&power, &smooth, losses, step_h)),
    };
    let kept = least_energy.then(|| Rc::clone(&output));
    let mut output = Vec::clone(&output);
    if least_energy && cyclic {
        let by = firming::lowering(&power, &output, losses, step_h);
        if by > 0.0 {
            let least = if smooth.never_below_zero { 0.0 } else { f64::NEG_INFINITY };
            for output in output.iter_mut().filter(|output| !output.is_nan()) {
                *output = (*output - by).max(least);
            }
        }
    }
    let taken = difference(&power, &output);
    let net_discharge_kwh = Some(0.0 - total(&taken) * step_h);
    let added = Added { net_discharge_kwh, output: kept, ..Added::default() };
    Ok((handed(&taken, losses), added))
}

fn total(values: &[f64]) -> f64 {
    let mut sum = crate::numeric::Sum::default();
    for value in values.iter().filter(|value| !value.is_nan()) {
        sum.add(*value);
    }
    sum.value()
}

/// The power of one day of the record; the rest counts as missing.
fn on_day(clock: &Clock, power: &Known, day: &str) -> Result<Known> {
    let parts: Vec<i64> = day.split('-').filter_map(|part| part.parse().ok()).collect();
    let date = match parts[..] {
        [year, month @ 1..=12, date @ 1..=31] => Date::new(year, month, date),
        _ => {
            return Err(Fault::new(
                format!("{} is no day", quote(day)),
                "case, at duty.day",
                "Write it as year, month and day, such as 2026-06-21.",
            ));
        }
    };
    let chosen = Known::of(power.len(), |i| {
        power.get(i).filter(|_| reading(clock, i).is_some_and(|at| at.date == date))
    });
    if chosen.there().next().is_none() {
        return Err(Fault::new(
            format!("the record holds nothing on {}", quote(day)),
            "case, at duty.day",
            format!("Choose a day from {} to {}.", clock.stamp(0), clock.stamp(clock.intervals)),
        ));
    }
    Ok(chosen)
}

/// What the clock on the wall shows at an interval's start.
pub(super) fn reading(clock: &Clock, i: usize) -> Option<Reading> {
    Reading::new(clock.at_us(i) as f64 + f64::from(clock.offset_s(i)) * 1e6)
}

fn firm(record: &Record, terms: &Firming, losses: &Losses, cyclic: bool) -> Result<(Plan, Added)> {
    let step_h = record.step_h();
    let power = power(record, terms.series, losses)?;
    let steps = power.len();
    let mut output = match (&terms.schedule, terms.block_s) {
        (Some(header), _) => {
            let column = column(record, header, "schedule")?;
            (0..steps).map(|i| column.values.get(i).unwrap_or(f64::NAN)).collect()
        }
        (None, Some(block_s)) => {
            firming::blocks(&power, whole_steps(block_s, record.clock.step_s())?, losses)
        }
        (None, None) => firming::blocks(&power, steps, losses),
    };
    if terms.schedule.is_none() && cyclic && losses.self_discharge_per_h > 0.0 {
        let by = firming::lowering(&power, &output, losses, step_h);
        for output in &mut output {
            *output -= by;
        }
    }
    let taken = difference(&power, &output);
    let first = output.iter().copied().find(|output| !output.is_nan());
    Ok((handed(&taken, losses), Added { output_kw: first, ..Added::default() }))
}

/// A block's length in intervals.
fn whole_steps(block_s: f64, step_s: f64) -> Result<usize> {
    let steps = block_s / step_s;
    let whole = libm::round(steps);
    if whole >= 1.0 && (steps - whole).abs() <= 1e-9 * whole {
        return Ok(whole as usize);
    }
    Err(Fault::new(
        format!("a block of {block_s} s is no whole number of the record's intervals of {step_s} s"),
        "case, at duty.block_s",
        format!("Give {} s or another multiple of the interval.", whole.max(1.0) * step_s),
    ))
}

fn ride(record: &Record, terms: &RideThrough, losses: &Losses) -> Result<(Plan, Added)> {
    let steps = record.clock.intervals;
    let critical = terms.critical.as_ref().map(|header| column(record, header, "critical")).transpose()?;
    let demand = record.demand_kw.as_ref();
    if critical.is_none() && demand.is_none() {
        return Err(Fault::new(
            "riding through an outage needs a demand, and the record has none",
            "case, at duty.critical",
            "Name a column of critical demand, or give a column the role of demand.",
        ));
    }
    if terms.supply_share > 0.0 && record.supply_kw.is_none() {
        return Err(Fault::new(
            "a share of the supply is to work during outages, but no column of the record is a supply",
            "case, at duty.supply_share",
            "Set supply_share to 0, or give a column the role of supply.",
        ));
    }
    let need_kw = Known::of(steps, |i| {
        let wanted = match &critical {
            Some(column) => column.values.get(i)?,
            None => terms.critical_share * demand?.get(i)?,
        };
        let supply = if terms.supply_share > 0.0 {
            terms.supply_share * record.supply_kw.as_ref()?.get(i)?
        } else {
            0.0
        };
        Some(wanted - supply)
    });
    // A rounding of the division must not add an interval.
    let length = libm::ceil(terms.outage_s / record.clock.step_s() * (1.0 - 1e-12)).max(1.0) as usize;
    let outage = Outage { need_kw, steps: length, wraps: terms.wraps };
    let added = match outage.reserve(losses, None, record.step_h()) {
        Some(reserve) => Added {
            worst_start: Some(reserve.worst_start),
            reserve_p95_kwh: Some(reserve.p95_kwh),
            ..Added::default()
        },
        None => Added {
            infeasible: Some(Infeasible {
                why: format!(
                    "An outage of {} is longer than the record of {}: no start of it can be looked at. Ask for an outage within \
                     the record, or give a longer record.",
                    people::duration(terms.outage_s),
                    people::duration(record.clock.span_s())
                ),
                at: "the whole record".to_owned(),
            }),
            ..Added::default()
        },
    };
    Ok((Plan::Ride(outage), added))
}

fn shift(record: &Record, terms: &Shifting, losses: &Losses) -> Result<(Plan, Added)> {
    let steps = record.clock.intervals;
    let column = column(record, &terms.price, "price")?;
    let per_kwh = if per_megawatt_hour(record, column) { 1000.0 } else { 1.0 };
    let price = Known::of(steps, |i| Some(column.values.get(i)? / per_kwh));
    let days = match terms.foresight {
        Foresight::Full => vec![0],
        Foresight::DayAhead => (0..steps)
            .filter(|i| {
                *i == 0
                    || reading(&record.clock, *i).map(|at| at.date)
                        != reading(&record.clock, i - 1).map(|at| at.date)
            })
            .collect(),
    };
    match shifting::schedule(&price, &days, terms, losses, record.step_h()) {
        Ok(schedule) => Ok((
            handed(&schedule.power_kw, losses),
            Added { value: Some(schedule.value), ..Added::default() },
        )),
        Err(from) => {
            let why = format!(
                "From {} at the start, {} at the end cannot be reached with these powers and losses. Ask for another level at the end, or \
                 leave it free.",
                people::energy(terms.start_kwh),
                people::energy(terms.end_kwh.unwrap_or_default())
            );
            let infeasible = Some(Infeasible { why, at: record.clock.stamp(from) });
            Ok((Plan::Fixed(Known::of(steps, |_| None)), Added { infeasible, ..Added::default() }))
        }
    }
}

/// Whether a price column is of a MWh, by its unit or its header.
fn per_megawatt_hour(record: &Record, column: &Extra) -> bool {
    let says = |text: &str| text.as_bytes().windows(3).any(|letters| letters.eq_ignore_ascii_case(b"mwh"));
    says(&column.header) || says(unit_of(record, column))
}

/// The unit of a column that is no power or energy, as the file writes it; empty where it states none.
pub(super) fn unit_of<'r>(record: &'r Record, column: &Extra) -> &'r str {
    let columns = record.reading.files.iter().flat_map(|file| &file.columns);
    columns
        .filter(|other| other.header == column.header)
        .map(|other| other.unit.as_str())
        .next()
        .unwrap_or("")
}

/// The column of a header that a term names.
pub(super) fn column<'r>(record: &'r Record, header: &str, term: &str) -> Result<&'r Extra> {
    record.extra(header).ok_or_else(|| {
        let headers: Vec<&str> = record.extras.iter().map(|extra| extra.header.as_str()).collect();
        Fault::new(
            format!("the duty names a column {} that the record does not hold", quote(header)),
            format!("case, at duty.{term}"),
            if headers.is_empty() {
                "Give the header of a column of numbers, as it stands in the file.".to_owned()
            } else {
                format!("Give one of: {}.", headers.join(", "))
            },
        )
    })
}

/// The one column of a role, where no term names one.
pub(super) fn column_of_role(record: &Record, role: Role) -> Option<&Extra> {
    record.extras.iter().find(|extra| extra.role == role)
}
