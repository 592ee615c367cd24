//! The screening: every kind judged, criterion by criterion, on its circuit at the need's duration.

use super::catalogue::{Catalogue, Technology};
use super::family::Per;
use super::judge::Bench;
use super::need::{Criterion, Judged, Need, Screened, Screening};
use super::{hazards, pace, site, size};
use crate::chart::Verdict;

/// Judges every kind of the catalogue on a need.
///
/// A kind carries a criterion if its typical value meets it with the margin, strains if only the good end of its
/// range does, and fails if not even that does; the worst criterion is its verdict. A need that asks no power or no
/// energy gives an empty list.
///
/// ```
/// use millpond::chart::Verdict;
/// use millpond::technology::{Catalogue, Need, screen};
/// let need = Need { discharge_kw: 50.0, charge_kw: 50.0, energy_kwh: 100.0, ..Need::default() };
/// let screening = screen(&Catalogue::published()?, &need);
/// assert_eq!(screening.duration_s, Some(7200.0));
/// assert_eq!(screening.find("li_ion_lfp").unwrap().verdict, Verdict::Carries);
/// assert_eq!(screening.find("flywheel_steel").unwrap().verdict, Verdict::Fails);
/// # Ok::<(), millpond::fault::Fault>(())
/// ```
pub fn screen(catalogue: &Catalogue, need: &Need) -> Screening {
    let technologies =
        catalogue.technologies.iter().filter_map(|technology| screened(technology, need)).collect();
    Screening { duration_s: need.duration_s(), technologies }
}

fn screened(technology: &Technology, need: &Need) -> Option<Screened> {
    let bench = Bench::new(technology, need)?;
    let mut criteria = size::judge(&bench);
    criteria.extend(pace::judge(&bench));
    criteria.extend(size::judge_budgets(&bench));
    criteria.extend(site::judge(&bench));
    let verdict = criteria.iter().map(|judged| judged.verdict).max().unwrap_or(Verdict::Carries);
    let confirmed = criteria.iter().filter(|judged| judged.verdict == verdict).all(|judged| judged.confirmed);
    Some(Screened {
        technology: technology.id.clone(),
        name: technology.name.clone(),
        verdict,
        confirmed,
        mass_kg: size::needed(technology, need, Per::Mass),
        volume_l: size::needed(technology, need, Per::Volume),
        deciding: deciding(&criteria, verdict),
        criteria,
        hazards: hazards::caution(technology),
        siting: technology.constraints.clone(),
        market: technology.siting.market,
        default_on: technology.siting.default_on,
    })
}

/// The line of the criterion that decided: of those with the worst verdict, the one that is furthest from being met
/// (of kinds that carry: nearest to not being met), and what would turn it.
fn deciding(criteria: &[Judged], verdict: Verdict) -> String {
    let weight = |judged: &Judged| match (verdict, judged.load) {
        (Verdict::Fails, Some(load)) => load.good,
        // A store that is charged as hard as it is discharged is always just met: no news.
        (Verdict::Carries, Some(_)) if judged.quantity == Criterion::ChargePower => 0.0,
        (_, Some(load)) => load.typical,
        // What the place needs is worth more than a number met with room, and less than one met narrowly.
        (_, None) if judged.quantity == Criterion::Siting => 0.5,
        (Verdict::Carries, None) => 0.0,
        (_, None) => 0.4,
    };
    let mut first: Option<&Judged> = None;
    for judged in criteria.iter().filter(|judged| judged.verdict == verdict) {
        if first.is_none_or(|first| weight(judged) > weight(first)) {
            first = Some(judged);
        }
    }
    match first {
        Some(judged) if judged.turn.is_empty() => format!("{}.", judged.reason),
        Some(judged) => format!("{}. {}.", judged.reason, judged.turn),
        None => String::new(),
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::technology::Pair;

    fn catalogue() -> Catalogue {
        Catalogue::published().unwrap()
    }

    /// Two hours at 50 kW, quickly, at 80 %.
    fn two_hours() -> Need {
        Need {
            discharge_kw: 50.0,
            charge_kw: 50.0,
            energy_kwh: 100.0,
            response_s: Some(1.0),
            round_trip_efficiency: Some(0.8),
            margin: 0.1,
            ..Need::default()
        }
    }

    fn verdict_of(screening: &Screening, id: &str, quantity: Criterion) -> Verdict {
        let kind = screening.find(id).unwrap();
        kind.criteria.iter().find(|judged| judged.quantity == quantity).unwrap().verdict
    }

    #[test]
    fn a_two_hour_duty_is_for_batteries() {
        let screening = screen(&catalogue(), &two_hours());
        assert_eq!(screening.technologies.len(), 27);
        for id in ["li_ion_lfp", "li_ion_nmc", "sodium_ion", "lead_acid"] {
            assert_eq!(screening.find(id).unwrap().verdict, Verdict::Carries, "{id}");
        }
        for id in
            ["flywheel_steel", "flywheel_composite", "capacitor_electrolytic_film", "edlc", "magnet_spring"]
        {
            assert_eq!(verdict_of(&screening, id, Criterion::Duration), Verdict::Fails, "{id}");
        }
        assert_eq!(verdict_of(&screening, "gravity_solid", Criterion::PlantSize), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "gravity_solid", Criterion::Siting), Verdict::Strains);
        let wheel = &screening.find("flywheel_steel").unwrap().deciding;
        assert_eq!(
            wheel.replace('\u{202f}', " "),
            "Built for 2 min, 21.9 min at best; 2 h asked. A duty of at most 21.9 min would turn it."
        );
        let hydrogen = screening.find("hydrogen_tank").unwrap();
        let returns = hydrogen
            .criteria
            .iter()
            .find(|judged| judged.quantity == Criterion::RoundTripEfficiency)
            .unwrap();
        assert!(returns.verdict == Verdict::Fails && returns.confirmed, "24 to 40 % was read");
    }

    #[test]
    fn a_ten_second_duty_is_for_wheels_and_capacitors() {
        let need = Need { discharge_kw: 200.0, charge_kw: 200.0, energy_kwh: 200.0 / 360.0, ..two_hours() };
        let screening = screen(&catalogue(), &need);
        for id in ["flywheel_steel", "flywheel_composite", "edlc", "lithium_ion_capacitor"] {
            assert_eq!(screening.find(id).unwrap().verdict, Verdict::Carries, "{id}");
        }
        assert_eq!(verdict_of(&screening, "pumped_hydro", Criterion::Response), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "pumped_hydro", Criterion::PlantSize), Verdict::Fails);
    }

    #[test]
    fn an_islanded_duty_of_days_is_for_what_holds_energy() {
        let need = Need {
            discharge_kw: 87.0,
            charge_kw: 99.0,
            energy_kwh: 5000.0,
            round_trip_efficiency: Some(0.3),
            response_s: None,
            mean_hold_s: Some(60.0 * 3600.0),
            mass_budget_kg: Some(85_000.0),
            ..two_hours()
        };
        let screening = screen(&catalogue(), &need);
        assert_eq!(screening.find("li_ion_lfp").unwrap().verdict, Verdict::Carries);
        let hydrogen = screening.find("hydrogen_tank").unwrap();
        assert_eq!(hydrogen.verdict, Verdict::Strains);
        assert!(hydrogen.confirmed && hydrogen.deciding.starts_with("Returns 33"), "{}", hydrogen.deciding);
        assert_eq!(verdict_of(&screening, "vanadium_redox_flow", Criterion::Mass), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "vanadium_redox_flow", Criterion::Duration), Verdict::Carries);
        assert_eq!(verdict_of(&screening, "iron_air", Criterion::PlantSize), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "flywheel_steel", Criterion::SelfDischarge), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "flywheel_steel", Criterion::Energy), Verdict::Fails);
        assert_eq!(screening.find("hydrogen_cavern").unwrap().mass_kg, None, "gas in rock is no plant mass");
    }

    #[test]
    fn masses_follow_the_box_by_hand() {
        let screening = screen(&catalogue(), &two_hours());
        let near = |pair: Option<Pair>, typical: f64, good: f64| {
            let pair = pair.unwrap();
            assert!((pair.typical - typical).abs() < 0.01 && (pair.good - good).abs() < 0.01, "{pair:?}");
        };
        let lfp = screening.find("li_ion_lfp").unwrap();
        // 100 kWh / (150 Wh/kg x 0.9) x 2; 100 kWh / (205 Wh/kg x 1) x 2.
        near(lfp.mass_kg, 1481.48, 975.61);
        // 100 kWh / (325 Wh/l x 0.9) x 2; 100 kWh / (430 Wh/l x 1) x 2.
        near(lfp.volume_l, 683.76, 465.12);
        // Power-bound: 50 kW / 14.6 W/kg x 1.5; 100 kWh / (900 Wh/kg x 0.98) x 1.5 = 170.07 beats 50 kW / 500 W/kg x 1.5.
        near(screening.find("hydrogen_tank").unwrap().mass_kg, 5136.99, 170.07);
        for id in ["pumped_hydro", "caes_cavern", "liquid_air", "gravity_solid", "pumped_thermal"] {
            assert_eq!(screening.find(id).unwrap().mass_kg, None);
        }
    }

    #[test]
    fn nothing_asked_gives_no_kinds() {
        for (power, energy) in
            [(0.0, 0.0), (0.0, 5.0), (5.0, 0.0), (f64::NAN, 5.0), (5.0, f64::INFINITY), (-5.0, 5.0)]
        {
            let screening =
                screen(&catalogue(), &Need { discharge_kw: power, energy_kwh: energy, ..Need::default() });
            assert_eq!(screening, Screening::default(), "{power} {energy}");
        }
        let charging = Need { charge_kw: 5.0, energy_kwh: 10.0, ..Need::default() };
        assert_eq!(
            screen(&catalogue(), &charging).duration_s,
            Some(7200.0),
            "a duty that only charges has a duration"
        );
    }

    #[test]
    fn what_the_site_asks_is_judged() {
        let need = Need {
            transfer_s: Some(0.0),
            indoors: Some(true),
            ambient_c: Some((-25.0, 30.0)),
            service_life_years: Some(20.0),
            cycles_per_year: Some(365.0),
            ramp_kw_per_s: Some(100.0),
            ..two_hours()
        };
        let screening = screen(&catalogue(), &need);
        assert_eq!(verdict_of(&screening, "vanadium_redox_flow", Criterion::Transfer), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "li_ion_lfp", Criterion::Transfer), Verdict::Carries);
        assert_eq!(verdict_of(&screening, "li_ion_lfp", Criterion::Siting), Verdict::Strains);
        assert_eq!(verdict_of(&screening, "edlc", Criterion::Siting), Verdict::Carries);
        assert_eq!(verdict_of(&screening, "hydrogen_tank", Criterion::Siting), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "li_ion_lfp", Criterion::Ambient), Verdict::Carries);
        assert_eq!(verdict_of(&screening, "lead_acid", Criterion::Ambient), Verdict::Strains);
        assert_eq!(verdict_of(&screening, "smes", Criterion::Ambient), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "li_ion_lfp", Criterion::ServiceLife), Verdict::Strains);
        assert_eq!(verdict_of(&screening, "li_ion_nmc", Criterion::ServiceLife), Verdict::Fails);
        assert_eq!(
            verdict_of(&screening, "li_ion_lfp", Criterion::Cycles),
            Verdict::Strains,
            "7300 of 5000 to 12000"
        );
        assert_eq!(verdict_of(&screening, "lead_acid", Criterion::Cycles), Verdict::Fails);
        assert_eq!(verdict_of(&screening, "hydrogen_tank", Criterion::Ramp), Verdict::Fails);
    }

    fn needs() -> impl Strategy<Value = Need> {
        let maybe = |most: f64| proptest::option::of(0.0..most);
        (
            (1e-3..1e6_f64, 0.0..1e6_f64, 1e-6..1e8_f64, maybe(1.2), maybe(1e5), maybe(1e7)),
            (maybe(1e4), maybe(60.0), maybe(1e3), maybe(10.0), maybe(1e9), maybe(1e9), 0.0..0.5_f64),
        )
            .prop_map(|(a, b)| Need {
                discharge_kw: a.0,
                charge_kw: a.1,
                energy_kwh: a.2,
                round_trip_efficiency: a.3,
                ramp_kw_per_s: a.4,
                mean_hold_s: a.5,
                cycles_per_year: b.0,
                service_life_years: b.1,
                response_s: b.2,
                transfer_s: b.3,
                mass_budget_kg: b.4,
                volume_budget_l: b.5,
                margin: b.6,
                ..Need::default()
            })
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(24))]

        #[test]
        fn a_larger_budget_never_worsens_a_verdict(need in needs(), budget in 1.0..1e7_f64, factor in 1.0..100.0_f64) {
            let catalogue = catalogue();
            let small = Need { mass_budget_kg: Some(budget), volume_budget_l: Some(budget), ..need };
            let large = Need {
                mass_budget_kg: Some(budget * factor), volume_budget_l: Some(budget * factor), ..small.clone()
            };
            let none = Need { mass_budget_kg: None, volume_budget_l: None, ..small.clone() };
            let (small, large, none) = (screen(&catalogue, &small), screen(&catalogue, &large), screen(&catalogue, &none));
            for ((small, large), none) in small.technologies.iter().zip(&large.technologies).zip(&none.technologies) {
                prop_assert!(large.verdict <= small.verdict && none.verdict <= large.verdict, "{}", small.technology);
                for (a, b) in small.criteria.iter().zip(&large.criteria) {
                    prop_assert!(b.verdict <= a.verdict, "{} {:?}", small.technology, a.quantity);
                }
            }
        }

        #[test]
        fn any_need_gives_finite_numbers_that_survive_the_journey(need in needs()) {
            let screening = screen(&catalogue(), &need);
            prop_assert_eq!(screening.technologies.len(), 27);
            let text = serde_json::to_string(&screening).unwrap();
            let back: Screening = serde_json::from_str(&text).unwrap();
            prop_assert_eq!(&back, &screening);
            for kind in &screening.technologies {
                prop_assert!(!kind.deciding.is_empty());
                prop_assert_eq!(kind.criteria.iter().map(|judged| judged.verdict).max(), Some(kind.verdict));
                for judged in &kind.criteria {
                    prop_assert!(judged.turn.is_empty() == (judged.verdict == Verdict::Carries), "{:?}", judged);
                    prop_assert!(!judged.reason.contains("NaN") && !judged.reason.contains("inf"), "{}", judged.reason);
                    if let Some(load) = judged.load {
                        prop_assert!(load.good <= load.typical && load.typical.is_finite());
                    }
                }
            }
        }
    }
}
