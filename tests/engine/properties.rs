//! What must hold for any record.

use millpond::case::{Case, FixedStore, Start};
use millpond::requirement::{self, Losses, Ranges};
use millpond::simulation;
use proptest::prelude::*;

use crate::site::{case, duty, net};

fn series() -> impl Strategy<Value = Vec<Option<f64>>> {
    // Whole numbers bring ties and zeros; one in ten is a gap.
    prop::collection::vec(
        prop_oneof![9 => (-20i32..20).prop_map(|n| Some(f64::from(n))), 1 => Just(None)],
        1..120,
    )
    .prop_filter("a record has at least one value", |values| values.iter().any(Option::is_some))
}

fn near(a: f64, b: f64, scale: f64) -> bool {
    (a - b).abs() <= 1e-9 * scale.max(1.0)
}

proptest! {
    #[test]
    fn surplus_minus_deficit_is_net_energy(values in series()) {
        let duty = duty(&net(900, &values), &Case::default());
        let total: f64 = values.iter().flatten().sum::<f64>() * 0.25;
        prop_assert!(near(duty.result.surplus() - duty.result.deficit(), total, 1e3));
        let episodes: f64 = duty.episodes.iter().map(|episode| episode.energy_kwh).sum();
        prop_assert!(near(episodes, total, 1e3));
    }

    #[test]
    fn scaling_power_scales_energy(values in series(), factor in 0.1f64..50.0) {
        let terms = case(0.9, 0.8, 0.0);
        let scaled: Vec<_> = values.iter().map(|value| value.map(|value| value * factor)).collect();
        let one = requirement::derive(&duty(&net(900, &values), &terms), &terms).result;
        let other = requirement::derive(&duty(&net(900, &scaled), &terms), &terms).result;
        for (a, b) in [
            (one.capacity_no_deficit_full_kwh, other.capacity_no_deficit_full_kwh),
            (one.capacity_no_deficit_cyclic_kwh, other.capacity_no_deficit_cyclic_kwh),
            (one.capacity_range_kwh, other.capacity_range_kwh),
        ] {
            prop_assert_eq!(a.is_some(), b.is_some());
            if let (Some(a), Some(b)) = (a, b) {
                prop_assert!(near(a * factor, b, 1e4), "{} {}", a * factor, b);
            }
        }
    }

    #[test]
    fn splitting_an_interval_changes_nothing(values in series(), rate in prop_oneof![Just(0.0), 0.0f64..0.1]) {
        let terms = case(0.95, 0.9, rate);
        let halves: Vec<_> = values.iter().flat_map(|value| [*value, *value]).collect();
        let one = requirement::derive(&duty(&net(1800, &values), &terms), &terms).result;
        let other = requirement::derive(&duty(&net(900, &halves), &terms), &terms).result;
        for (a, b) in [
            (one.capacity_no_deficit_full_kwh, other.capacity_no_deficit_full_kwh),
            (one.capacity_no_deficit_cyclic_kwh, other.capacity_no_deficit_cyclic_kwh),
            (one.capacity_no_curtailment_empty_kwh, other.capacity_no_curtailment_empty_kwh),
        ] {
            prop_assert_eq!(a.is_some(), b.is_some());
            if let (Some(a), Some(b)) = (a, b) {
                prop_assert!(near(a, b, 1e3), "{} {}", a, b);
            }
        }
    }

    #[test]
    fn coverage_from_ranges_is_what_a_run_serves(
        values in series(),
        power in prop_oneof![Just(None), (1.0f64..20.0).prop_map(Some)],
        energy in 0.0f64..100.0,
    ) {
        let terms = case(0.9, 0.85, 0.0);
        let duty = duty(&net(3600, &values), &terms);
        let ranges = Ranges::of(&duty, &Losses::of(&terms.requirement), power);
        let store = FixedStore {
            charge_kw: power,
            discharge_kw: power,
            energy_kwh: energy,
            charge_efficiency: 0.9,
            discharge_efficiency: 0.85,
            start: Start::Cyclic,
            ..FixedStore::default()
        };
        let run = simulation::run(&duty, &store, |_| {});
        prop_assert!(near(ranges.unserved_kwh(energy), run.unserved_kwh, 1e3), "{} {}", ranges.unserved_kwh(energy), run.unserved_kwh);
        prop_assert!(near(run.served_kwh + run.unserved_kwh, duty.result.deficit(), 1e3));
    }

    #[test]
    fn the_capacity_for_a_share_leaves_that_share(values in series(), share in 0.0f64..1.0) {
        let terms = case(0.9, 0.85, 0.0);
        let duty = duty(&net(3600, &values), &terms);
        let ranges = Ranges::of(&duty, &Losses::of(&terms.requirement), None);
        if let Some(capacity) = ranges.capacity_kwh(share) {
            prop_assert!(ranges.unserved_kwh(capacity) <= share * duty.result.deficit() + 1e-6);
            if capacity > 1e-6 {
                prop_assert!(ranges.unserved_kwh(capacity * 0.999) >= share * duty.result.deficit() - 1e-6);
            }
        }
    }

    #[test]
    fn the_energy_account_closes(
        values in series(),
        energy in 0.0f64..50.0,
        rate in 0.0f64..0.2,
        standing in 0.0f64..2.0,
        start in prop_oneof![Just(Start::Full), Just(Start::Empty), Just(Start::Half), Just(Start::Cyclic)],
    ) {
        let duty = duty(&net(3600, &values), &Case::default());
        let store = FixedStore {
            charge_kw: Some(7.0),
            discharge_kw: None,
            energy_kwh: energy,
            charge_efficiency: 0.93,
            discharge_efficiency: 0.88,
            self_discharge_per_h: rate,
            standing_kw: standing,
            start,
            ..FixedStore::default()
        };
        let mut lowest = f64::INFINITY;
        let mut highest = f64::NEG_INFINITY;
        let run = simulation::run(&duty, &store, |step| {
            lowest = lowest.min(step.after_kwh);
            highest = highest.max(step.after_kwh);
        });
        prop_assert!(lowest >= 0.0 && highest <= energy);
        prop_assert!(run.account_residual_kwh.abs() <= 1e-9 * (run.served_kwh + energy).max(1.0), "{}", run.account_residual_kwh);
        if start == Start::Cyclic {
            prop_assert!(near(run.stored_start_kwh, run.stored_end_kwh, energy.max(1.0)));
        }
    }

    #[test]
    fn bands_are_part_of_the_need(values in series()) {
        // Splitting never helps: the bands' powers add up to at least the whole's.
        let terms = Case::default();
        let duty = duty(&net(900, &values), &terms);
        let bands = requirement::derive(&duty, &terms).result.bands;
        let discharge: f64 = bands.iter().map(|band| band.discharge_kw).sum();
        prop_assert!(discharge + 1e-9 >= duty.result.peak_deficit());
    }
}
