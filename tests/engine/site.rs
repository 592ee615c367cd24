//! Records made directly from values, and the reference files.

use std::rc::Rc;

use millpond::case::{Case, DutyCase};
use millpond::duty::{self, Duty};
use millpond::record::{Clock, Extra, Reading, Record, Role, Series, Zone};

/// A record of net power (kW) with a step in seconds; `None` is a gap.
pub(crate) fn net(step_s: i64, values: &[Option<f64>]) -> Rc<Record> {
    let mut record = empty(step_s, values.len());
    record.net_kw = Some(Series::from_values(values).unwrap());
    Rc::new(record)
}

/// A record of supply and demand.
pub(crate) fn supply_demand(step_s: i64, supply: &[f64], demand: &[f64]) -> Rc<Record> {
    let mut record = empty(step_s, supply.len());
    let series =
        |values: &[f64]| Series::from_values(&values.iter().copied().map(Some).collect::<Vec<_>>()).unwrap();
    record.supply_kw = Some(series(supply));
    record.demand_kw = Some(series(demand));
    Rc::new(record)
}

fn empty(step_s: i64, intervals: usize) -> Record {
    Record {
        site: "test".to_owned(),
        clock: Clock { start_us: 0, step_us: step_s * 1_000_000, intervals, zone: Zone::Unstated },
        supply_kw: None,
        demand_kw: None,
        net_kw: None,
        extras: Vec::new(),
        findings: Vec::new(),
        reading: Reading::default(),
        hidden_kw: Vec::new(),
        filled: 0,
    }
}

/// A table of numbers by column; an empty cell is NaN.
pub(crate) fn table(text: &str) -> Vec<Vec<f64>> {
    let mut columns: Vec<Vec<f64>> = Vec::new();
    for line in text.lines().skip(1) {
        for (i, cell) in line.split(',').enumerate() {
            if columns.len() <= i {
                columns.push(Vec::new());
            }
            columns[i].push(cell.parse().unwrap_or(f64::NAN));
        }
    }
    columns
}

/// The reference site: 672 hours of supply and demand.
pub(crate) fn hourly() -> Rc<Record> {
    let columns = table(include_str!("../reference/site_hourly.csv"));
    supply_demand(3600, &columns[1], &columns[2])
}

/// A case with these efficiencies and self-discharge.
pub(crate) fn case(charge: f64, discharge: f64, self_discharge_per_h: f64) -> Case {
    let mut case = Case::default();
    case.requirement.charge_efficiency = charge;
    case.requirement.discharge_efficiency = discharge;
    case.requirement.self_discharge_per_h = self_discharge_per_h;
    case
}

/// The duty of a case.
pub(crate) fn duty(record: &Rc<Record>, case: &Case) -> Duty {
    duty::ask(record, case).unwrap()
}

/// Limits that let the store recharge from the grid and discharge into it.
pub(crate) fn limits(import: Option<f64>, export: Option<f64>) -> DutyCase {
    let mut duty = DutyCase::limits(import, export);
    if let DutyCase::Limits { discharge_to_grid, .. } = &mut duty {
        *discharge_to_grid = true;
    }
    duty
}

/// A record with this column beside what it has.
pub(crate) fn with_column(
    record: &Rc<Record>,
    header: &str,
    role: Role,
    values: &[Option<f64>],
) -> Rc<Record> {
    let mut record = Record::clone(record);
    record.extras.push(Extra {
        header: header.to_owned(),
        role,
        values: Series::from_values(values).unwrap(),
    });
    Rc::new(record)
}

/// A record of nothing but a column.
pub(crate) fn only_column(step_s: i64, header: &str, role: Role, values: &[Option<f64>]) -> Rc<Record> {
    with_column(&Rc::new(empty(step_s, values.len())), header, role, values)
}

/// Asserts that two numbers agree to a relative tolerance.
#[track_caller]
pub(crate) fn close(found: f64, expected: f64, relative: f64) {
    let scale = expected.abs().max(1e-300);
    assert!((found - expected).abs() <= relative * scale, "found {found}, expected {expected}");
}
