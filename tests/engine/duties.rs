//! The duties against tests/reference: windows, envelopes, programmes. How each value was obtained stands in its README.md.

use std::rc::Rc;

use millpond::case::{Balance, Case, DutyCase, Smoothing, SmoothingMethod};
use millpond::duty::Duty;
use millpond::record::{Record, Role};
use millpond::requirement::{self, Requirement};
use serde_json::Value;

use crate::site::{case, close, duty, hourly, net, only_column, supply_demand, table, with_column};

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
    let mut case = case(1.0, 1.0, 0.0);
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

#[test]
fn random_series_against_programmes() {
    let all = json(include_str!("../reference/d_random.json"));
    let options =
        |value: &Value| -> Vec<Option<f64>> { value.as_array().unwrap().iter().map(Value::as_f64).collect() };
    for row in all.as_array().unwrap() {
        let what = format!("{}", row["duty"]);
        let mut case = case(
            number(&row["charge_efficiency"]),
            number(&row["discharge_efficiency"]),
            number(&row["self_discharge_per_h"]),
        );
        case.requirement.balance = if row["balance"] == "cyclic" { Balance::Cyclic } else { Balance::Free };
        case.duty = serde_json::from_value(row["duty"].clone()).unwrap();
        let step_s = row["step_s"].as_i64().unwrap();
        let column =
            row["column"].as_array().map(|column| (column[0].as_str().unwrap(), options(&column[1])));
        let record = match (&column, row["net_kw"].is_array()) {
            (Some((name, values)), true) => {
                with_column(&net(step_s, &options(&row["net_kw"])), name, Role::Ignore, values)
            }
            (Some((name, values)), false) => only_column(step_s, name, Role::Ignore, values),
            (None, _) => net(step_s, &options(&row["net_kw"])),
        };
        let (duty, found) = required(&record, &case);
        for (field, found) in [
            ("capacity_kwh", found.result.least_capacity_kwh),
            ("net_discharge_kwh", duty.result.net_discharge_kwh),
            ("reserve_p95_kwh", duty.result.reserve_p95_kwh),
            ("delivered_kwh", duty.result.delivered_kwh),
            ("absorbed_kwh", duty.result.absorbed_kwh),
            ("value", duty.result.value),
        ] {
            match row.get(field) {
                None => {}
                Some(Value::Null) => {
                    assert_eq!(found, None, "{what}: {field}");
                    assert!(required(&record, &case).1.infeasible.is_some(), "{what}");
                }
                Some(expected) => {
                    let (found, expected) = (found.unwrap_or(f64::NAN), number(expected));
                    assert!(
                        (found - expected).abs() <= 1e-7 * expected.abs().max(1.0),
                        "{what}: {field} {found} {expected}"
                    );
                }
            }
        }
    }
}

#[test]
fn what_cannot_be_carried_says_why_and_what_can() {
    let mut case = case(0.95, 0.92, 0.0);
    // 23 hours of 10 kW and one of 30: with G the limit, 23 x 0.95 (G - 10) must bring back (30 - G) / 0.92.
    let record = net(3600, &(0..24).map(|i| Some(if i == 7 { -30.0 } else { -10.0 })).collect::<Vec<_>>());
    case.duty = DutyCase::limits(Some(5.0), None);
    let (_, found) = required(&record, &case);
    let infeasible = found.infeasible.unwrap();
    assert!(infeasible.why.contains("or more"), "{}", infeasible.why);
    assert_eq!((found.result.least_charge_kw, found.result.least_discharge_kw), (None, None));
    let balanced = (23.0 * 0.95 * 10.0 + 30.0 / 0.92) / (23.0 * 0.95 + 1.0 / 0.92);
    assert!(infeasible.why.contains(&format!("allows {balanced:.1}")), "{} {balanced}", infeasible.why);
    case.duty = terms(r#"{"kind": "ride_through", "outage_s": 2500000}"#);
    let (_, found) = required(&hourly(), &case);
    assert!(found.infeasible.unwrap().why.contains("longer than the record"));
    assert_eq!(found.result.least_discharge_kw, None);
    case.duty = terms(
        r#"{"kind": "shifting", "price": "p", "charge_kw": 1, "discharge_kw": 1, "energy_kwh": 9, "start_kwh": 0, "end_kwh": 9}"#,
    );
    let price = only_column(3600, "p", Role::Price, &known(&[0.1, 0.2]));
    assert!(required(&price, &case).1.infeasible.unwrap().why.contains("cannot be reached"));
    // More reactive power than apparent power is allowed, in the second hour.
    let record = with_column(&net(3600, &known(&[-3.0, -3.0])), "q", Role::Reactive, &known(&[1.0, 5.0]));
    case.duty = terms(r#"{"kind": "limits", "import_limit_kva": 4}"#);
    assert_eq!(required(&record, &case).1.infeasible.unwrap().at, record.clock.stamp(1));
}

#[test]
fn terms_that_contradict_are_refused_with_their_place() {
    for (duty, place) in [
        (r#"{"kind": "smoothing", "ramp_kw_per_min": 0}"#, "duty.ramp_kw_per_min"),
        (r#"{"kind": "smoothing"}"#, "duty.ramp_kw_per_min"),
        (
            r#"{"kind": "smoothing", "ramp_kw_per_min": 1, "ramp_share_per_min": 0.1, "rating_kw": 5}"#,
            "ramp_share_per_min",
        ),
        (r#"{"kind": "firming"}"#, "duty"),
        (r#"{"kind": "firming", "block_s": 60, "constant": true}"#, "duty"),
        (r#"{"kind": "ride_through", "outage_s": 0}"#, "duty.outage_s"),
        (
            r#"{"kind": "frequency", "column": "f", "rating_kw": 1, "dead_band_hz": 0.3}"#,
            "duty.full_activation_hz",
        ),
        (
            r#"{"kind": "shifting", "price": "p", "charge_kw": 1, "discharge_kw": 1, "energy_kwh": 2, "start_kwh": 3}"#,
            "duty.start_kwh",
        ),
        (r#"{"kind": "limits", "hours": ["Mon-Fri 40 kW"]}"#, "duty.hours[0]"),
    ] {
        let fault = Case::from_json(&format!(r#"{{"millpond_case": 1, "duty": {duty}}}"#)).unwrap_err();
        assert!(fault.place.contains(place) && !fault.remedy.is_empty(), "{duty}: {fault}");
    }
}

#[test]
fn hours_limit_when_they_say_and_months_are_billed() {
    // 1970-01-01 is a Thursday: three days of hours with 10 kW, and 30 kW at noon.
    let load: Vec<Option<f64>> = (0..72).map(|i| Some(if i % 24 == 12 { -30.0 } else { -10.0 })).collect();
    let record = net(3600, &load);
    let mut case = case(1.0, 1.0, 0.0);
    case.duty = terms(
        r#"{"kind": "limits", "hours": ["Thu 11:00-13:00: 20 kW", "Fri,Sat 00:00-24:00: 25 kW"],
            "billing": {"rate_per_kw": 2, "ratchet_share": 0.5}}"#,
    );
    let (duty, found) = required(&record, &case);
    assert_eq!(found.result.least_discharge_kw, Some(10.0));
    assert_eq!(found.result.least_capacity_kwh, Some(10.0));
    let run = millpond::simulation::run(&duty, &found.asked.unwrap().store, |_| {});
    let billing = run.billing.unwrap();
    assert_eq!((billing.months.len(), billing.months[0].month.as_str()), (1, "1970-01"));
    assert_eq!((billing.months[0].peak_before_kw, billing.months[0].peak_after_kw), (30.0, 25.0));
    assert_eq!(billing.value, 10.0);
}

#[test]
fn a_ratchet_bills_part_of_an_earlier_peak() {
    // January peaks at 30 kW, February at 10 kW; a store holds both to 8 kW.
    let load: Vec<Option<f64>> = (0..59 * 24)
        .map(|i| {
            Some(match i {
                12 => -30.0,
                800 => -10.0,
                _ => -1.0,
            })
        })
        .collect();
    let mut case = case(1.0, 1.0, 0.0);
    case.duty = terms(
        r#"{"kind": "limits", "import_limit_kw": 8, "billing": {"rate_per_kw": 1, "ratchet_share": 0.6, "ratchet_months": 3}}"#,
    );
    let (duty, found) = required(&net(3600, &load), &case);
    let billing = millpond::simulation::run(&duty, &found.asked.unwrap().store, |_| {}).billing.unwrap();
    let billed: Vec<(f64, f64)> =
        billing.months.iter().map(|month| (month.billed_before_kw, month.billed_after_kw)).collect();
    assert_eq!(billed, [(30.0, 8.0), (18.0, 8.0)]);
    assert_eq!(billing.value, 32.0);
}

#[test]
fn a_store_of_the_asked_size_carries_what_is_handed_over() {
    let price = known(&table(include_str!("../reference/site_hourly.csv"))[3]);
    let record = with_column(&hourly(), "price", Role::Price, &price);
    for text in [
        r#"{"kind": "smoothing", "ramp_kw_per_min": 0.1}"#,
        r#"{"kind": "smoothing", "ramp_kw_per_min": 0.1, "method": "least_power"}"#,
        r#"{"kind": "firming", "block_s": 86400}"#,
        r#"{"kind": "firming", "constant": true}"#,
        r#"{"kind": "ride_through", "outage_s": 28800, "supply_share": 1}"#,
        r#"{"kind": "shifting", "price": "price", "charge_kw": 25, "discharge_kw": 20, "energy_kwh": 100}"#,
        r#"{"kind": "shifting", "price": "price", "charge_kw": 25, "discharge_kw": 20, "energy_kwh": 100, "foresight": "day_ahead"}"#,
    ] {
        for rate in [0.0, 1e-4] {
            let mut case = case(0.95, 0.92, rate);
            case.duty = terms(text);
            let (_, found) = required(&record, &case);
            let run = found.asked.unwrap_or_else(|| panic!("{text} {rate}: {:?}", found.infeasible)).run;
            assert!(run.served_kwh > 0.0 && run.unserved_kwh < 1e-6 * run.served_kwh, "{text}: {run:?}");
            assert!(run.curtailed_kwh < 1e-6 * run.served_kwh || text.contains("ride"), "{text}: {run:?}");
            assert!(run.account_residual_kwh.abs() < 1e-9 * run.served_kwh, "{text}");
        }
    }
}

#[test]
fn a_shorter_foresight_is_worth_no_more() {
    let price = known(&table(include_str!("../reference/site_hourly.csv"))[3]);
    let record = with_column(&hourly(), "price", Role::Price, &price);
    let value = |foresight: &str, unit: &str, factor: f64| {
        let scaled: Vec<_> = price.iter().map(|price| price.map(|price| price * factor)).collect();
        let record = with_column(&record, unit, Role::Price, &scaled);
        let mut case = case(0.95, 0.92, 0.0);
        case.duty = terms(&format!(
            r#"{{"kind": "shifting", "price": "{unit}", "charge_kw": 25, "discharge_kw": 25, "energy_kwh": 100, "foresight": "{foresight}"}}"#
        ));
        required(&record, &case).0.result.value.unwrap()
    };
    let (full, day) = (value("full", "p", 1.0), value("day_ahead", "p", 1.0));
    assert!(day > 0.0 && day < full, "{day} {full}");
    close(value("full", "Price EUR/MWh", 1000.0), full, 1e-12);
}
