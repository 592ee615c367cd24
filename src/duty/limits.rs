//! Limits that change with time: by hours and days, from a column, and of apparent power.

use super::hours::Hours;
use super::plan::{LimitSeries, column, column_of_role, reading, unit_of};
use crate::case::DutyCase;
use crate::fault::{Fault, Result};
use crate::record::{Record, Role};

/// Units of reactive power: size in kvar, and whether it is an energy of the interval. None stated = kvar.
const REACTIVE: [(&str, f64, bool); 6] = [
    ("var", 1e-3, false),
    ("kvar", 1.0, false),
    ("Mvar", 1e3, false),
    ("varh", 1e-3, true),
    ("kvarh", 1.0, true),
    ("Mvarh", 1e3, true),
];

/// The limits of a case's terms beside its two plain ones; none where there are no others.
///
/// Of all limits that apply in an interval the lowest holds. With a limit S of apparent power and the reactive power Q, the import is
/// limited to the root of S2 - Q2; where Q alone exceeds S, to less than nothing, which no store can hold.
pub(super) fn series(record: &Record, terms: &DutyCase) -> Result<Option<LimitSeries>> {
    let DutyCase::Limits {
        hours, import_limit_column, export_limit_column, import_limit_kva, reactive, ..
    } = terms
    else {
        return Ok(None);
    };
    if hours.is_empty()
        && import_limit_column.is_none()
        && export_limit_column.is_none()
        && import_limit_kva.is_none()
    {
        return Ok(None);
    }
    let steps = record.clock.intervals;
    let mut limits = LimitSeries { import_kw: vec![f64::NAN; steps], export_kw: vec![f64::NAN; steps] };
    let hours =
        hours.iter().enumerate().map(|(i, text)| Hours::parse(text, i)).collect::<Result<Vec<_>>>()?;
    if !hours.is_empty() {
        for i in 0..steps {
            let Some(at) = reading(&record.clock, i) else { continue };
            for line in hours.iter().filter(|line| line.holds(at)) {
                let side = if line.export { &mut limits.export_kw } else { &mut limits.import_kw };
                side[i] = side[i].min(line.limit_kw);
            }
        }
    }
    for (header, term, side) in [
        (import_limit_column, "import_limit_column", &mut limits.import_kw),
        (export_limit_column, "export_limit_column", &mut limits.export_kw),
    ] {
        let Some(header) = header else { continue };
        let values = &column(record, header, term)?.values;
        for (i, limit) in side.iter_mut().enumerate() {
            let value = values.get(i);
            if value.is_some_and(|value| value < 0.0) {
                return Err(Fault::new(
                    format!(
                        "the column of limits holds {} kW at {}",
                        value.unwrap_or_default(),
                        record.clock.stamp(i)
                    ),
                    format!("case, at duty.{term}"),
                    "Limits are zero or more; correct the column, or name another.",
                ));
            }
            *limit = limit.min(value.unwrap_or(f64::NAN));
        }
    }
    if let Some(apparent) = import_limit_kva {
        let reactive = match reactive {
            Some(header) => column(record, header, "reactive")?,
            None => column_of_role(record, Role::Reactive).ok_or_else(|| {
                Fault::new(
                    "a limit of apparent power needs the reactive power, and no column of the record holds it",
                    "case, at duty.reactive",
                    "Name the column of reactive power (kvar), or give an import limit in kW.",
                )
            })?,
        };
        let unit = unit_of(record, reactive);
        let size = REACTIVE.iter().find(|(name, ..)| name.eq_ignore_ascii_case(unit));
        let size = size.map_or(1.0, |(_, size, energy)| if *energy { size / record.step_h() } else { *size });
        for (i, limit) in limits.import_kw.iter_mut().enumerate() {
            if let Some(kvar) = reactive.values.get(i).map(|value| value * size) {
                let left = apparent * apparent - kvar * kvar;
                *limit = limit.min(if left >= 0.0 { libm::sqrt(left) } else { f64::NEG_INFINITY });
            }
        }
    }
    Ok(Some(limits))
}
