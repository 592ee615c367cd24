//! The duties against tests/reference: windows, envelopes, programmes. How each value was obtained stands in its README.md.

use std::rc::Rc;

use millpond::case::{Balance, Case, DutyCase, Smoothing, SmoothingMethod};
use millpond::duty::Duty;
use millpond::record::{Record, Role};
use millpond::requirement::{self, Requirement};
use serde_json::Value;

use crate::site::{case, close, duty, hourly, only_column, supply_demand, table, with_column};

fn json(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

fn reference(name: &str) -> Value {
    json(include_str!("../reference/d_duties.json"))[name].clone()
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|value| value.as_f64().unwrap_or(f64::NAN)).collect()
}

fn rows(value: &Value) -> Vec<Vec<f64>> {
    value["rows"].as_array().unwrap().iter().map(numbers).collect()
}

fn known(values: &[f64]) -> Vec<Option<f64>> {
    values.iter().copied().map(Some).collect()
}

/// A duty as it stands in a case file.
fn terms(text: &str) -> DutyCase {
    serde_json::from_str(text).unwrap()
}

fn required(record: &Rc<Record>, case: &Case) -> (Duty, Requirement) {
    let duty = duty(record, case);
    let requirement = requirement::derive(&duty, case);
    (duty, requirement)
}

/// The reference day at one minute: a fast source and a spiky load.
fn minute() -> Rc<Record> {
    let columns = table(include_str!("../reference/site_minute.csv"));
    supply_demand(60, &columns[1], &columns[2])
}

fn smoothing(ramp: f64, method: SmoothingMethod, balance: Balance) -> Case {
    let mut case = Case::default();
    case.duty =
        DutyCase::Smoothing(Smoothing { ramp_kw_per_min: Some(ramp), method, ..Smoothing::default() });
    case.requirement.balance = balance;
    case
}

#[test]
fn ramps_held_by_three_methods() {
    for row in rows(&reference("ramp_limiting_minute_lossless")) {
        let (causal, found) =
            required(&minute(), &smoothing(row[0], SmoothingMethod::Causal, Balance::Cyclic));
        close(found.result.least_capacity_kwh.unwrap(), row[2], 1e-9);
        close(
            found.result.least_discharge_kw.unwrap().max(found.result.least_charge_kw.unwrap()),
            row[1],
            1e-9,
        );
        close(causal.result.net_discharge_kwh.unwrap(), row[3], 1e-9);
        let (middle, found) =
            required(&minute(), &smoothing(row[0], SmoothingMethod::LeastPower, Balance::Cyclic));
        close(
            found.result.least_discharge_kw.unwrap().max(found.result.least_charge_kw.unwrap()),
            row[6],
            1e-7,
        );
        close(found.result.least_capacity_kwh.unwrap(), row[8], 1e-9);
        close(middle.result.net_discharge_kwh.unwrap(), row[9], 1e-9);
        for (balance, expected) in [(Balance::Free, row[4]), (Balance::Cyclic, row[5])] {
            let (_, found) = required(&minute(), &smoothing(row[0], SmoothingMethod::LeastEnergy, balance));
            close(found.result.least_capacity_kwh.unwrap(), expected, 1e-7);
        }
    }
}

#[test]
fn a_step_down_takes_the_energy_of_its_ramp() {
    let expected = reference("ramp_step_80kw_2kw_per_min");
    let supply: Vec<f64> = std::iter::repeat_n(80.0, 5).chain(std::iter::repeat_n(0.0, 60)).collect();
    let record = supply_demand(60, &supply, &vec![0.0; 65]);
    let (duty, found) = required(&record, &smoothing(2.0, SmoothingMethod::Causal, Balance::Cyclic));
    close(found.result.least_discharge_kw.unwrap(), number(&expected["P_kw"]), 1e-12);
    close(found.result.least_capacity_kwh.unwrap(), number(&expected["E_kwh"]), 1e-12);
    close(duty.result.net_discharge_kwh.unwrap(), number(&expected["E_kwh"]), 1e-12);
}

#[test]
fn feedback_keeps_the_level_from_drifting() {
    let plain = required(&minute(), &smoothing(2.0, SmoothingMethod::Causal, Balance::Cyclic));
    let mut held = smoothing(2.0, SmoothingMethod::Causal, Balance::Cyclic);
    if let DutyCase::Smoothing(terms) = &mut held.duty {
        terms.feedback_h = Some(0.5);
    }
    let held = required(&minute(), &held);
    let drift = |found: &(Duty, Requirement)| found.0.result.net_discharge_kwh.unwrap().abs();
    assert!(drift(&held) < 0.05 * drift(&plain), "{} {}", drift(&held), drift(&plain));
    // The ramp still holds: output = supply less what the store takes up.
    let supply = &table(include_str!("../reference/site_minute.csv"))[1];
    let output: Vec<f64> = (0..supply.len()).map(|i| supply[i] - held.0.handed_kw(i).unwrap()).collect();
    assert!(output.windows(2).all(|pair| (pair[1] - pair[0]).abs() <= 2.0 + 1e-9));
}

#[test]
fn blocks_of_constant_output() {
    for row in reference("block_average_output")["rows"].as_array().unwrap() {
        let losses = if row[1] == "lossless" { (1.0, 1.0) } else { (0.95, 0.92) };
        let mut case = case(losses.0, losses.1, 0.0);
        case.duty = terms(&format!(r#"{{"kind": "firming", "block_s": {}}}"#, number(&row[0]) * 3600.0));
        let (duty, found) = required(&hourly(), &case);
        close(found.result.least_discharge_kw.unwrap(), number(&row[2]), 1e-9);
        close(found.result.least_charge_kw.unwrap(), number(&row[3]), 1e-9);
        close(found.result.least_capacity_kwh.unwrap(), number(&row[4]), 1e-9);
        close(duty.result.output_kw.unwrap(), number(&row[5]), 1e-9);
        if number(&row[0]) == 672.0 {
            case.duty = terms(r#"{"kind": "firming", "constant": true}"#);
            close(required(&hourly(), &case).1.result.least_capacity_kwh.unwrap(), number(&row[4]), 1e-9);
        }
    }
}

#[test]
fn reserves_for_outages_of_any_start() {
    let hours = hourly();
    for row in rows(&reference("ride_through_circular")) {
        let mut case = case(0.95, 0.92, 0.0);
        case.duty = terms(&format!(
            r#"{{"kind": "ride_through", "outage_s": {}, "critical_share": 0.6, "supply_share": {}}}"#,
            row[0] * 3600.0,
            row[1]
        ));
        let (duty, found) = required(&hours, &case);
        close(found.result.least_capacity_kwh.unwrap(), row[2], 1e-9);
        assert_eq!(duty.result.worst_start.as_deref(), Some(hours.clock.stamp(row[3] as usize).as_str()));
        close(found.result.least_discharge_kw.unwrap(), row[4], 1e-9);
        assert_eq!(found.result.least_charge_kw, Some(0.0));
        close(duty.result.reserve_p95_kwh.unwrap(), row[5], 1e-9);
    }
}

#[test]
fn schedules_of_greatest_value() {
    let hand = reference("shift_hand");
    let prices = known(&numbers(&hand["price"]));
    let mut case = case(0.9, 0.9, 0.0);
    case.duty =
        terms(r#"{"kind": "shifting", "price": "p", "charge_kw": 2, "discharge_kw": 2, "energy_kwh": 3}"#);
    let (duty, found) = required(&only_column(3600, "p", Role::Price, &prices), &case);
    close(duty.result.value.unwrap(), number(&hand["value"]), 1e-12);
    assert_eq!((found.result.least_capacity_kwh, found.result.least_charge_kw), (Some(3.0), Some(2.0)));
    assert_eq!((duty.result.surplus_kwh, found.result.capacity_range_kwh), (None, None));

    let site = reference("shift_site");
    let price = known(&table(include_str!("../reference/site_hourly.csv"))[3]);
    let record = with_column(&hourly(), "price", Role::Price, &price);
    for row in rows(&site) {
        let mut case = crate::site::case(0.95, 0.92, row[2]);
        let end = if row[4].is_nan() { "null".to_owned() } else { row[4].to_string() };
        case.duty = terms(&format!(
            r#"{{"kind": "shifting", "price": "price", "charge_kw": {p}, "discharge_kw": {p}, "energy_kwh": {}, "start_kwh": {},
                "end_kwh": {end}}}"#,
            row[0],
            row[3],
            p = row[1]
        ));
        close(required(&record, &case).0.result.value.unwrap(), row[5], 1e-9);
    }

    let negative = reference("shift_negative_price");
    let prices = known(&numbers(&negative["price"]));
    let mut case = crate::site::case(0.8, 0.8, 0.0);
    case.duty =
        terms(r#"{"kind": "shifting", "price": "p", "charge_kw": 2, "discharge_kw": 2, "energy_kwh": 2}"#);
    let (duty, _) = required(&only_column(3600, "p", Role::Price, &prices), &case);
    close(duty.result.value.unwrap(), number(&negative["exact_no_simultaneous"]), 1e-12);
}
