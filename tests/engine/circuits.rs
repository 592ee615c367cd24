//! Stores as circuits: against the tables of an independent integration and of a circuit simulator, and the window of a fixed store.

use std::fmt::Write as _;

use millpond::case::{Case, Store};
use millpond::result::{CircuitLosses, LossesByCause, SimulationResult};
use millpond::simulation;
use serde_json::Value;

use crate::site::{case, close, duty, hourly, net, table};

/// A store from its fields as JSON.
pub(crate) fn store(fields: &str) -> Store {
    let text = format!(r#"{{"millpond_case": 1, "stores": [{fields}]}}"#);
    Case::from_json(&text).unwrap().stores.remove(0)
}

/// A run on powers in W, discharge positive.
pub(crate) fn run(store: &Store, step_s: i64, powers_w: &[f64]) -> SimulationResult {
    let values: Vec<Option<f64>> = powers_w.iter().map(|power| Some(-power / 1000.0)).collect();
    simulation::run_circuit(&duty(&net(step_s, &values), &Case::default()), store, |_| {})
}

pub(crate) fn losses(run: &SimulationResult) -> CircuitLosses {
    match run.losses_kwh {
        LossesByCause::Circuit(losses) => losses,
        LossesByCause::Fixed(_) => panic!("a circuit has the losses of a circuit"),
    }
}

/// Runs a store on the first steps of a table, for each number of steps, and compares state, losses and stored energy.
fn follow(fields: &str, text: &str, step_s: i64, of: impl Fn(&CircuitLosses) -> Vec<f64>, tolerance: f64) {
    let store = store(fields);
    let columns = table(text);
    let rows = columns[0].len();
    assert_eq!(rows, 16);
    for k in 0..rows {
        let found = run(&store, step_s, &columns[2][..=k]);
        close(found.state_end.unwrap(), columns[3][k], tolerance);
        // A battery's table has the voltage of its pair in the next column.
        let first = if store_is_battery(&store) { 5 } else { 4 };
        let lost = of(&losses(&found));
        for (j, lost) in lost.iter().enumerate() {
            close(lost * 3.6e6, columns[first + j][k], tolerance);
        }
        close(found.stored_end_kwh * 3.6e6, columns[first + lost.len()][k], tolerance);
        assert_eq!((found.unserved_kwh, found.curtailed_kwh), (0.0, 0.0));
        assert!(found.account_residual_kwh.abs() < 1e-10 * found.stored_start_kwh);
    }
}

fn store_is_battery(store: &Store) -> bool {
    matches!(store, Store::Battery(_))
}

pub(crate) const BATTERY: &str = r#"{"kind": "battery", "charge_coulomb": 72000, "series_ohm": 0.12, "pair_ohm": 0.06, "pair_farad": 500,
    "open_circuit": [[0, 320], [0.1, 350], [0.3, 362], [0.6, 370], [0.9, 385], [1, 400]], "leak_ohm": 20000, "start_soc": 0.6}"#;
const CAPACITOR: &str = r#"{"kind": "capacitor", "farad": 60, "series_ohm": 0.02, "leak_ohm": 5000, "start_v": 380, "least_v": 200}"#;
const RESERVOIR: &str = r#"{"kind": "reservoir", "area_m2": 5000, "head_m": 80, "start_m3": 12000, "pipe_pa_s2_m6": 7355,
    "turbine_efficiency": 0.9, "pump_efficiency": 0.88, "leak_m3_s_pa": 1e-9}"#;
const FLYWHEEL: &str = r#"{"kind": "flywheel", "inertia_kg_m2": 40, "viscous_nms": 1e-4, "coulomb_nm": 0.2, "start_rad_s": 1200}"#;
const COIL: &str = r#"{"kind": "coil", "henry": 2, "series_ohm": 0.001, "start_a": 1800}"#;

#[test]
fn a_battery_follows_its_table() {
    let of = |lost: &CircuitLosses| vec![lost.series, lost.pair, lost.leak];
    follow(BATTERY, include_str!("../reference/g_battery.csv"), 60, of, 1e-9);
}

#[test]
fn a_capacitor_follows_its_table() {
    let of = |lost: &CircuitLosses| vec![lost.series, lost.leak];
    follow(CAPACITOR, include_str!("../reference/g_supercapacitor.csv"), 60, of, 1e-9);
}

#[test]
fn a_reservoir_follows_its_table() {
    let of = |lost: &CircuitLosses| vec![lost.pipe, lost.machine, lost.leak];
    follow(RESERVOIR, include_str!("../reference/g_pumped_hydro.csv"), 900, of, 1e-9);
}

#[test]
fn a_flywheel_follows_its_table() {
    let of = |lost: &CircuitLosses| vec![lost.viscous, lost.coulomb];
    follow(FLYWHEEL, include_str!("../reference/g_flywheel.csv"), 60, of, 1e-9);
}

#[test]
fn a_coil_follows_its_table() {
    follow(COIL, include_str!("../reference/g_coil.csv"), 60, |lost| vec![lost.series], 1e-9);
}

#[test]
fn a_force_over_travel_follows_its_table() {
    // The reference's force is F0 exp(-x / z0); as a table of straight lines it is off by (h / z0)^2 / 8, 2.5e-8 at 0.1 mm / 4.5.
    let mut points = String::new();
    for k in 0..=4500_u32 {
        let x = 1e-1 * f64::from(k) / 4500.0;
        write!(points, "{}[{x}, {}]", if k == 0 { "" } else { ", " }, 40_000.0 * libm::exp(-x / 0.05))
            .unwrap();
    }
    let fields = format!(
        r#"{{"kind": "curve", "travel_force": [{points}], "viscous_ns_m": 2e5, "coulomb_n": 100, "start_m": {}}}"#,
        -0.05 * libm::log(0.4)
    );
    let of = |lost: &CircuitLosses| vec![lost.viscous, lost.coulomb];
    follow(&fields, include_str!("../reference/g_potential_curve.csv"), 30, of, 1e-6);
}

#[test]
fn closed_forms_and_limits_of_the_circuits() {
    let all: Value = serde_json::from_str(include_str!("../reference/g_circuits.json")).unwrap();
    let number = |value: &Value| value.as_f64().unwrap();
    // Flywheel without Coulomb drag.
    let wheel =
        store(r#"{"kind": "flywheel", "inertia_kg_m2": 40, "viscous_nms": 1e-4, "start_rad_s": 1200}"#);
    close(
        run(&wheel, 60, &[20_000.0]).state_end.unwrap(),
        number(&all["flywheel"]["exact_step_no_coulomb_20kW_60s_omega"]),
        1e-12,
    );
    let coil = run(&store(COIL), 60, &table(include_str!("../reference/g_coil.csv"))[2]);
    close(coil.stored_end_kwh * 3.6e6, number(&all["coil"]["exact_stored_end_J"]), 1e-12);
    // Over a second the state moves by a per cent or less, so that what is carried is about the limit at the start.
    let limit = |fields: &str, asked: f64| {
        let found = run(&store(fields), 1, &[asked]);
        found.served_kwh * 3.6e6
    };
    let battery = BATTERY.replace("\"start_soc\"", "\"least_v\": 300, \"start_soc\"");
    close(limit(&battery, 1e6), number(&all["battery"]["power_limit_at_start_with_Vmin_300_W"]), 0.02);
    close(limit(BATTERY, 1e7), number(&all["battery"]["power_limit_at_start_W"]), 0.02);
    close(limit(RESERVOIR, 1e8), number(&all["pumped_hydro"]["max_turbine_power_at_start_W"]), 1e-3);
}

#[test]
fn a_converter_takes_its_quadratic() {
    let all: Value = serde_json::from_str(include_str!("../reference/g_circuits.json")).unwrap();
    let fields =
        COIL.replace("\"start_a\"", r#""converter": {"a_w": 150, "b": 0.01, "c_per_w": 5e-7}, "start_a""#);
    let fields = fields.replace("0.001", "0");
    for row in all["converter"]["rows"].as_array().unwrap() {
        let (bus, loss) = (row[0].as_f64().unwrap(), row[1].as_f64().unwrap());
        let found = run(&store(&fields), 60, &[bus]);
        // The constant part only while it carries.
        let expected = if bus == 0.0 { 0.0 } else { loss * 60.0 };
        assert!((losses(&found).converter * 3.6e6 - expected).abs() < 1e-8 * (1.0 + expected), "{bus}");
        let inner = row[2].as_f64().unwrap() * f64::from(u8::from(bus != 0.0));
        assert!(((found.stored_start_kwh - found.stored_end_kwh) * 3.6e6 - inner * 60.0).abs() < 1e-6);
    }
}

#[test]
fn the_window_of_a_fixed_store_is_that_of_the_trace() {
    let trace = table(include_str!("../reference/c_dispatch_trace.csv"));
    let all: Value = serde_json::from_str(include_str!("../reference/bc_capacity.json")).unwrap();
    let books = &all["dispatch"];
    let store = store(
        r#"{"kind": "fixed", "energy_kwh": 500, "least_level": 0.1, "greatest_level": 0.95, "charge_kw": 30, "discharge_kw": 35,
            "charge_efficiency": 0.95, "discharge_efficiency": 0.92, "self_discharge_per_h": 0.0005, "standing_kw": 0.4, "start": "half"}"#,
    );
    let mut steps = Vec::new();
    let run = simulation::run_circuit(&duty(&hourly(), &case(1.0, 1.0, 0.0)), &store, |step| {
        steps.push((step.carried_kw, step.after_kwh));
    });
    for k in 0..168 {
        let carried = trace[2][k] - trace[3][k];
        assert!((steps[k].0 - carried).abs() < 1e-8 && (steps[k].1 - trace[4][k]).abs() < 1e-6, "step {k}");
    }
    let LossesByCause::Fixed(lost) = run.losses_kwh else { panic!() };
    for (found, expected) in [
        (run.served_kwh, "discharged_kwh"),
        (run.unserved_kwh, "unserved_kwh"),
        (run.curtailed_kwh, "spill_kwh"),
        (run.stored_end_kwh, "stored_end_kwh"),
        (lost.self_discharge, "leak_loss_kwh"),
        (lost.charging, "charge_loss_kwh"),
        (lost.discharging, "discharge_loss_kwh"),
    ] {
        close(found, books[expected].as_f64().unwrap(), 1e-9);
    }
    let least = steps.iter().map(|step| step.1).fold(f64::INFINITY, f64::min);
    close(least, books["stored_min_kwh"].as_f64().unwrap(), 1e-9);
    assert!(run.account_residual_kwh.abs() < 1e-9);
}

#[test]
fn random_powers_that_hit_limits_agree_with_an_independent_integration() {
    let all: Value = serde_json::from_str(include_str!("../reference/circuit_runs.json")).unwrap();
    let runs = all.as_array().unwrap();
    assert_eq!(runs.len(), 13);
    for (k, expected) in runs.iter().enumerate() {
        let store = store(&expected["store"].to_string());
        let powers: Vec<f64> =
            expected["powers_w"].as_array().unwrap().iter().map(|v| v.as_f64().unwrap()).collect();
        let found = run(&store, expected["step_s"].as_i64().unwrap(), &powers);
        let asked: f64 =
            powers.iter().map(|power| power.abs()).sum::<f64>() * expected["step_s"].as_f64().unwrap();
        let near = |found_kwh: f64, name: &str, expected: &Value| {
            let (found, expected) = (found_kwh * 3.6e6, expected.as_f64().unwrap());
            assert!(
                (found - expected).abs() <= 1e-8 * asked,
                "run {k}, {name}: {found}, expected {expected}"
            );
        };
        near(found.served_kwh, "served", &expected["served_j"]);
        near(found.unserved_kwh, "unserved", &expected["unserved_j"]);
        near(found.curtailed_kwh, "curtailed", &expected["curtailed_j"]);
        near(found.stored_end_kwh, "stored", &expected["stored_end_j"]);
        let lost = serde_json::to_value(found.losses_kwh).unwrap();
        for (cause, joule) in expected["losses_j"].as_object().unwrap() {
            near(lost[cause].as_f64().unwrap(), cause, joule);
        }
        close(found.state_end.unwrap(), expected["state_end"].as_f64().unwrap(), 1e-7);
        let causes = found.unserved_by_cause;
        close(causes.power + causes.energy, found.unserved_kwh, 1e-9);
        assert!(
            found.account_residual_kwh.abs() * 3.6e6 < 1e-11 * asked,
            "run {k}: {}",
            found.account_residual_kwh
        );
    }
}

#[test]
fn a_store_that_cannot_be_is_refused_by_its_fields_name() {
    for (fields, place) in [
        (BATTERY.replace("72000", "0"), "stores[0].charge_coulomb"),
        (BATTERY.replace("[0.3, 362]", "[0.05, 362]"), "stores[0].open_circuit"),
        (BATTERY.replace("[1, 400]", "[0.95, 400]"), "stores[0].open_circuit"),
        (BATTERY.replace("\"pair_ohm\": 0.06", "\"pair_ohm\": 0"), "stores[0].pair_ohm"),
        (CAPACITOR.replace("\"least_v\": 200", "\"least_v\": 200, \"greatest_v\": 100"), "stores[0].least_v"),
        (CAPACITOR.replace("\"start_v\": 380, ", ""), "stores[0].start_v"),
        (RESERVOIR.replace("0.88", "1.2"), "stores[0].pump_efficiency"),
        (FLYWHEEL.replace("viscous_nms\": 1e-4", "viscous_nms\": -1"), "stores[0].viscous_nms"),
        (COIL.replace("henry", "henries"), "henries"),
    ] {
        let text = format!(r#"{{"millpond_case": 1, "stores": [{fields}]}}"#);
        let fault = Case::from_json(&text).unwrap_err();
        assert!(fault.place.contains(place) || fault.what.contains(place), "{place}: {fault}");
    }
}

#[test]
fn a_store_at_its_end_rests_and_leaks_on() {
    // Full, asked to charge for an hour: it rests, and only leaks.
    let full = store(
        r#"{"kind": "flywheel", "inertia_kg_m2": 40, "viscous_nms": 1e-4, "greatest_rad_s": 1000, "least_rad_s": 500}"#,
    );
    let found = run(&full, 3600, &[-1000.0]);
    close(found.curtailed_kwh, 1.0, 1e-12);
    close(found.state_end.unwrap(), 1000.0 * libm::exp(-1e-4 / 40.0 * 3600.0), 1e-12);
    close(found.energy_kwh.unwrap(), 0.5 * 40.0 * (1e6 - 2.5e5) / 3.6e6, 1e-12);
    // Asked for more than there is: 15 MJ are given, the rest is unserved for want of energy.
    let lossless =
        store(r#"{"kind": "flywheel", "inertia_kg_m2": 40, "greatest_rad_s": 1000, "least_rad_s": 500}"#);
    let found = run(&lossless, 3600, &[5000.0]);
    close(found.served_kwh, 15.0 / 3.6, 1e-12);
    close(found.unserved_by_cause.energy, 5.0 - 15.0 / 3.6, 1e-11);
    assert_eq!(found.unserved_by_cause.power, 0.0);
    close(found.tracking_error.unwrap(), 1.0 - 15.0 / 18.0, 1e-11);
    // A coil at rest under a greatest voltage: the current rises by V t / L.
    let coil = store(r#"{"kind": "coil", "henry": 2, "start_a": 0, "greatest_v": 10, "greatest_a": 2000}"#);
    close(run(&coil, 60, &[-1e6]).state_end.unwrap(), 300.0, 1e-9);
    // A capacitor without series resistance holds its greatest voltage with what leaks.
    let held = store(r#"{"kind": "capacitor", "farad": 60, "leak_ohm": 500, "greatest_v": 400}"#);
    let found = run(&held, 600, &[-1000.0]);
    close(losses(&found).leak * 3.6e6, 400.0 * 400.0 / 500.0 * 600.0, 1e-8);
    close(found.state_end.unwrap(), 400.0, 1e-9);
}
