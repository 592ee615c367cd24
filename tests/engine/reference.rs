//! Checks against tests/reference. How each value there was obtained stands in tests/reference/README.md.

use millpond::case::{Case, DutyCase, FixedStore, Start, Store};
use millpond::requirement::cycles::rainflow;
use millpond::requirement::{self, Losses, Ranges, capacity};
use millpond::simulation;
use serde_json::Value;

use crate::site::{case, close, duty, hourly, limits, net, table};

fn json(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(number).collect()
}

#[test]
fn integrals_and_episodes_of_the_hand_series() {
    let all = json(include_str!("../reference/a_net.json"));
    let hand = &all["hand_interval"];
    let values: Vec<Option<f64>> = numbers(&hand["n_kw"]).into_iter().map(Some).collect();
    let duty = duty(&net(1800, &values), &Case::default());
    close(duty.result.surplus_kwh, number(&hand["surplus_kwh"]), 1e-12);
    close(duty.result.deficit_kwh, number(&hand["deficit_kwh"]), 1e-12);
    let expected = hand["episodes"].as_array().unwrap();
    assert_eq!(duty.episodes.len(), expected.len());
    for (episode, expected) in duty.episodes.iter().zip(expected) {
        assert_eq!(episode.start as u64, expected["start"].as_u64().unwrap());
        assert_eq!(episode.steps as u64, expected["steps"].as_u64().unwrap());
        close(episode.energy_kwh, number(&expected["sign"]) * number(&expected["energy_kwh"]), 1e-12);
        close(episode.peak_kw.abs(), number(&expected["peak_kw"]), 1e-12);
    }
}

#[test]
fn integrals_of_the_site() {
    let all = json(include_str!("../reference/a_net.json"));
    let site = &all["site_hourly"];
    let duty = duty(&hourly(), &Case::default());
    let result = &duty.result;
    close(result.surplus_kwh, number(&site["surplus_kwh"]), 1e-9);
    close(result.deficit_kwh, number(&site["deficit_kwh"]), 1e-9);
    close(duty.totals.supply_kwh.unwrap(), number(&site["supply_kwh"]), 1e-9);
    close(duty.totals.demand_kwh.unwrap(), number(&site["demand_kwh"]), 1e-9);
    close(result.direct_use_kwh.unwrap(), number(&site["direct_use_kwh"]), 1e-9);
    close(result.peak_charge_kw, number(&site["peak_surplus_kw"]), 1e-12);
    close(result.peak_discharge_kw, number(&site["peak_deficit_kw"]), 1e-12);
    assert_eq!(result.surplus_episodes as u64, site["n_surplus_episodes"].as_u64().unwrap());
    assert_eq!(result.deficit_episodes as u64, site["n_deficit_episodes"].as_u64().unwrap());
    close(result.largest_deficit_kwh.unwrap(), number(&site["largest_deficit_episode"]["energy_kwh"]), 1e-12);
    close(result.largest_surplus_kwh.unwrap(), number(&site["largest_surplus_episode_kwh"]), 1e-12);
    let steepest =
        number(&site["max_up_ramp_kw_per_h"]).max(number(&site["max_down_ramp_kw_per_h"])) / 3600.0;
    close(result.steepest_ramp_kw_per_s.unwrap(), steepest, 1e-12);
}

#[test]
fn capacities_of_the_hand_series_and_the_site() {
    let all = json(include_str!("../reference/bc_capacity.json"));
    for name in [
        "hand_lossless",
        "hand_0.9_0.9_feasible",
        "site_lossless",
        "site_0.95_0.92",
        "site_0.90_0.88_infeasible",
    ] {
        let expected = &all[name];
        let record = if name.starts_with("hand") {
            net(3600, &numbers(&expected["n_kw"]).into_iter().map(Some).collect::<Vec<_>>())
        } else {
            hourly()
        };
        let case = case(number(&expected["etac"]), number(&expected["etad"]), 0.0);
        let result = requirement::derive(&duty(&record, &case), &case).result;
        close(result.capacity_no_deficit_full_kwh.unwrap(), number(&expected["no_deficit_start_full"]), 1e-9);
        close(
            result.capacity_no_curtailment_empty_kwh.unwrap(),
            number(&expected["no_spill_start_empty"]),
            1e-9,
        );
        close(result.capacity_range_kwh.unwrap(), number(&expected["range_W"]), 1e-9);
        close(result.least_round_trip_efficiency.unwrap(), number(&expected["deficit_over_surplus"]), 1e-9);
        if let Some(cyclic) = expected["no_deficit_cyclic"].as_f64() {
            close(result.capacity_no_deficit_cyclic_kwh.unwrap(), cyclic, 1e-9);
            close(result.least_capacity_kwh.unwrap(), cyclic, 1e-9);
            assert!(result.least_discharge_kw.is_some());
        } else {
            assert_eq!(result.capacity_no_deficit_cyclic_kwh, None);
            assert_eq!((result.least_capacity_kwh, result.least_charge_kw), (None, None));
        }
    }
}

#[test]
fn capacities_with_self_discharge() {
    let all = json(include_str!("../reference/bc_capacity.json"));
    let mut feasible = 0;
    for row in all["self_discharge_0.95_0.92"].as_array().unwrap() {
        let case = case(0.95, 0.92, number(&row["sigma_per_h"]));
        let duty = duty(&hourly(), &case);
        let losses = Losses::of(&case.requirement);
        close(capacity::balance(&duty, &losses, false).unwrap(), number(&row["noncyclic_kwh"]), 1e-9);
        let repeated = capacity::balance(&duty, &losses, true);
        if let Some(expected) = row["cyclic_kwh"].as_f64() {
            feasible += 1;
            close(repeated.unwrap(), expected, 1e-9);
        } else {
            assert_eq!(repeated, None);
        }
    }
    assert!(feasible >= 4, "{feasible}");
}

#[test]
fn falling_ranges_and_tolerated_unserved_shares() {
    let all = json(include_str!("../reference/bc_capacity.json"));
    let case = case(0.95, 0.92, 0.0);
    let duty = duty(&hourly(), &case);
    let ranges = Ranges::of(&duty, &Losses::of(&case.requirement), None);
    for row in all["tolerated_unserved_cyclic_0.95_0.92"].as_array().unwrap() {
        close(ranges.capacity_kwh(number(&row["eps"])).unwrap(), number(&row["capacity_kwh"]), 1e-9);
    }
    for row in all["unserved_curve_no_cap"]["rows"].as_array().unwrap() {
        let row = numbers(row);
        close(ranges.unserved_kwh(row[0]), row[1], 1e-9);
    }
}

#[test]
fn equal_coverage_over_power() {
    let columns = table(include_str!("../reference/c_iso_coverage.csv"));
    let mut case = case(0.95, 0.92, 0.0);
    let mut reached = 0;
    for ((power, share), expected) in columns[0].iter().zip(&columns[1]).zip(&columns[2]) {
        case.requirement.powers_kw = vec![*power];
        case.requirement.unserved_shares = vec![*share];
        let rows = requirement::derive(&duty(&hourly(), &case), &case).result.coverage;
        assert_eq!(rows.len(), 2, "no limit first, then the power");
        assert_eq!(rows[0].power_kw, None);
        if expected.is_nan() {
            assert_eq!(rows[1].capacity_kwh, None, "{power} kW, {share}");
        } else {
            reached += 1;
            close(rows[1].capacity_kwh.unwrap(), *expected, 1e-7);
        }
    }
    assert_eq!(reached, 17);
}

#[test]
fn a_run_with_self_discharge_leaves_what_the_programme_leaves() {
    // greedy_vs_lp_cyclic: 400 kWh, but with 30 kW charge and 35 kW discharge; here the run itself is compared.
    let all = json(include_str!("../reference/bc_capacity.json"));
    let expected = &all["greedy_vs_lp_cyclic"];
    let case = case(0.95, 0.92, 0.0005);
    let store = FixedStore {
        charge_kw: Some(30.0),
        discharge_kw: Some(35.0),
        energy_kwh: 400.0,
        charge_efficiency: 0.95,
        discharge_efficiency: 0.92,
        self_discharge_per_h: 0.0005,
        start: Start::Cyclic,
        ..FixedStore::default()
    };
    let duty = duty(&hourly(), &case);
    let run = simulation::run(&duty, &store, |_| {});
    close(run.unserved_kwh, number(&expected["unserved_kwh"]), 1e-9);
    close(run.stored_start_kwh, number(&expected["periodic_start_kwh"]), 1e-9);
    close(run.stored_end_kwh, run.stored_start_kwh, 1e-9);
}

#[test]
fn holds_and_cycles_of_runs_on_the_site() {
    let all = json(include_str!("../reference/hi_cycles.json"));
    let case = case(0.95, 0.92, 0.0);
    let duty = duty(&hourly(), &case);
    for row in all["hold_site_periodic"]["rows"].as_array().unwrap() {
        let row = numbers(row);
        let store = FixedStore {
            charge_kw: Some(row[1]),
            discharge_kw: Some(row[1]),
            energy_kwh: row[0],
            charge_efficiency: 0.95,
            discharge_efficiency: 0.92,
            start: Start::Cyclic,
            ..FixedStore::default()
        };
        let run = simulation::run(&duty, &store, |_| {});
        close(run.mean_hold_s.unwrap(), row[4] * 3600.0, 1e-9);
        close(run.equivalent_full_cycles.unwrap() * row[0], row[3], 1e-9);
        // Charge and discharge of a closed cycle are each half of the variation.
        close(run.rainflow_cycles.unwrap(), run.equivalent_full_cycles.unwrap(), 1e-9);
        assert!(run.account_residual_kwh.abs() < 1e-9 * run.served_kwh);
    }
}

#[test]
fn import_and_export_limits() {
    let all = json(include_str!("../reference/d_duties.json"));
    let row_check = |duty_case: DutyCase, capacity: f64, charge: f64, discharge: f64, cyclic: bool| {
        let mut case = case(0.95, 0.92, 0.0);
        case.duty = duty_case;
        if !cyclic {
            case.requirement.balance = millpond::case::Balance::Free;
        }
        let result = requirement::derive(&duty(&hourly(), &case), &case).result;
        close(result.least_capacity_kwh.unwrap(), capacity, 1e-9);
        close(result.least_charge_kw.unwrap(), charge, 1e-12);
        close(result.least_discharge_kw.unwrap(), discharge, 1e-12);
    };
    for row in all["peak_shaving_grid_recharge_cyclic"]["rows"].as_array().unwrap() {
        let row = numbers(row);
        row_check(limits(Some(row[0]), None), row[2], 0.0, row[1], true);
    }
    for row in all["curtailment_avoidance_cyclic"]["rows"].as_array().unwrap() {
        let row = numbers(row);
        row_check(limits(None, Some(row[0])), row[2], row[1], 0.0, true);
    }
    for row in all["both_limits"]["rows"].as_array().unwrap() {
        let row = numbers(row);
        let (charge, discharge) = ((93.661 - row[1]).max(0.0), (63.295 - row[0]).max(0.0));
        row_check(limits(Some(row[0]), Some(row[1])), row[2], charge, discharge, true);
        row_check(limits(Some(row[0]), Some(row[1])), row[3], charge, discharge, false);
    }
}

#[test]
fn least_import_limit_of_a_store() {
    let all = json(include_str!("../reference/d_duties.json"));
    for name in ["least_import_limit", "least_import_limit_energy_bound"] {
        let expected = &all[name];
        let mut case = case(0.95, 0.92, 0.0);
        case.duty = limits(Some(30.0), None);
        case.stores = vec![Store::Fixed(FixedStore {
            charge_kw: expected["charge_cap_kw"].as_f64(),
            discharge_kw: expected["discharge_cap_kw"].as_f64(),
            energy_kwh: number(&expected["E_kwh"]),
            charge_efficiency: 0.95,
            discharge_efficiency: 0.92,
            start: Start::Cyclic,
            ..FixedStore::default()
        })];
        let Store::Fixed(store) = &case.stores[0] else { unreachable!() };
        let run = simulation::run(&duty(&hourly(), &case), store, |_| {});
        close(run.least_import_limit_kw.unwrap(), number(&expected["G_kw"]), 1e-6);
    }
}

#[test]
fn bands_of_the_hand_series() {
    let all = json(include_str!("../reference/e_bands.json"));
    let values = numbers(&all["hand"]["n_kw"]);
    let mut case = Case::default();
    case.requirement.band_edges_s = vec![7200.0, 14_400.0, 28_800.0];
    let record = net(3600, &values.into_iter().map(Some).collect::<Vec<_>>());
    let bands = requirement::derive(&duty(&record, &case), &case).result.bands;
    let mut expected: Vec<Vec<f64>> = all["hand"]["bands"].as_array().unwrap().iter().map(numbers).collect();
    expected.push(numbers(&all["hand"]["rest"]));
    assert_eq!(bands.len(), expected.len());
    for (band, values) in bands.iter().zip(&expected) {
        close(band.charge_kw, values.iter().copied().fold(0.0, f64::max), 1e-12);
        close(
            band.discharge_kw,
            values.iter().copied().fold(0.0, |most, value| f64::max(most, -value)),
            1e-12,
        );
    }
    assert_eq!((bands[0].faster_than_s, bands[0].slower_than_s), (Some(7200.0), None));
    assert_eq!((bands[3].faster_than_s, bands[3].slower_than_s), (None, Some(28_800.0)));
}

#[test]
fn bands_of_the_site_by_calendar_blocks() {
    let all = json(include_str!("../reference/e_bands.json"));
    let expected = all["calendar_672"]["bands"].as_array().unwrap();
    let mut case = Case::default();
    case.requirement.band_edges_s = vec![21_600.0, 86_400.0, 604_800.0, 2_419_200.0];
    let bands = requirement::derive(&duty(&hourly(), &case), &case).result.bands;
    for (band, expected) in bands.iter().zip(expected).take(4) {
        close(band.charge_kw, number(&expected["P_surplus_kw"]), 1e-9);
        close(band.discharge_kw, number(&expected["P_deficit_kw"]), 1e-9);
        close(band.energy_kwh, number(&expected["E_kwh"]), 1e-9);
    }
}

#[test]
fn rainflow_counts_of_the_standards_example() {
    // ASTM E1049-85, worked figure of the rainflow section, as reproduced in public test suites.
    let all = json(include_str!("../reference/hi_cycles.json"));
    let cycles = rainflow(numbers(&all["astm_example"]["series"]), 0.0);
    for row in all["astm_example"]["counts"].as_array().unwrap() {
        let row = numbers(row);
        let count: f64 = cycles.iter().filter(|cycle| cycle.range == row[0]).map(|cycle| cycle.count).sum();
        assert_eq!(count, row[1], "range {}", row[0]);
    }
    assert_eq!(cycles.iter().map(|cycle| cycle.count).sum::<f64>(), 4.0);
}

#[test]
fn coverage_with_self_discharge_is_what_a_run_leaves() {
    let mut case = case(0.95, 0.92, 0.0005);
    case.requirement.powers_kw = vec![60.0];
    case.requirement.unserved_shares = vec![0.2];
    let duty = duty(&hourly(), &case);
    let row = requirement::derive(&duty, &case).result.coverage[1];
    let store = FixedStore {
        charge_kw: row.power_kw,
        discharge_kw: row.power_kw,
        energy_kwh: row.capacity_kwh.unwrap(),
        charge_efficiency: 0.95,
        discharge_efficiency: 0.92,
        self_discharge_per_h: 0.0005,
        start: Start::Cyclic,
        ..FixedStore::default()
    };
    let run = simulation::run(&duty, &store, |_| {});
    close(run.unserved_kwh, 0.2 * duty.result.deficit_kwh, 1e-6);
}
