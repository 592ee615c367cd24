//! The least size of every kind, verified by runs.

use millpond::case::{Balance, Case, Connection, FixedStore, Start};
use millpond::duty::Duty;
use millpond::job::{Job, finish};
use millpond::requirement::Requirement;
use millpond::result::Sizing;
use millpond::technology::{Catalogue, Design, Per};
use millpond::{requirement, simulation};

use crate::site::{close, duty, hourly};

fn case(share: f64) -> Case {
    let mut case = Case::default();
    case.requirement.served_share = Some(share);
    case.site.connection = Some(Connection::Islanded);
    case
}

fn sizings(duty: &Duty, requirement: &Requirement, case: &Case) -> Vec<Sizing> {
    let catalogue = Catalogue::published().unwrap();
    finish(simulation::Sizes::new(duty, requirement.asked.as_ref(), case, &catalogue)).unwrap()
}

#[test]
fn every_kind_is_sized_or_says_why_not() {
    for share in [0.4, 0.6, 0.9] {
        let case = case(share);
        let duty = duty(&hourly(), &case);
        let sizings = sizings(&duty, &requirement::derive(&duty, &case), &case);
        assert_eq!(sizings.len(), 27);
        for sizing in &sizings {
            match sizing.served_share {
                // At most what 0.1 % of the size can bring too much.
                Some(served) => {
                    assert!(
                        served >= share - 1e-8 && served < share + 2e-3,
                        "{}: {served}",
                        sizing.technology
                    );
                    assert!(sizing.usable_kwh.unwrap() > 0.0 && sizing.delivered_kwh.unwrap() > 0.0);
                    assert!(sizing.runs <= 60);
                }
                None => assert!(!sizing.note.is_empty(), "{}", sizing.technology),
            }
        }
        let reached = sizings.iter().filter(|sizing| sizing.served_share.is_some()).count();
        assert!(if share < 0.5 { reached >= 18 } else { reached >= 1 }, "{reached} at {share}");
    }
}

#[test]
fn a_kind_of_fixed_efficiencies_is_the_fixed_store_of_that_size() {
    for balance in [Balance::Cyclic, Balance::Free] {
        let mut case = case(0.5);
        case.requirement.balance = balance;
        let duty = duty(&hourly(), &case);
        let requirement = requirement::derive(&duty, &case);
        let catalogue = Catalogue::published().unwrap();
        let mut checked = 0;
        for sizing in sizings(&duty, &requirement, &case) {
            let technology = catalogue.find(&sizing.technology).unwrap();
            let circuit = Design::at(technology, Per::Mass, 0.0).circuit;
            let lumped = circuit.lumped(sizing.depth);
            let (true, Some(usable)) = (lumped.fixed, sizing.usable_kwh) else { continue };
            let asked_kw = requirement.asked.as_ref().unwrap().point.power_kw;
            let standing = technology.standing(asked_kw, circuit.ref_power_kw());
            let served = |share_of_size: f64| {
                let rated = usable / lumped.energy_kwh * share_of_size;
                let rating = asked_kw + standing.fixed_kw;
                let store = FixedStore {
                    charge_kw: Some(rating),
                    discharge_kw: Some(rating.min(rated * lumped.peak_kw)),
                    energy_kwh: usable * share_of_size,
                    charge_efficiency: lumped.charge,
                    discharge_efficiency: lumped.discharge,
                    self_discharge_per_h: lumped.decay_per_h,
                    standing_kw: standing.fixed_kw,
                    start: if balance == Balance::Cyclic { Start::Cyclic } else { Start::Full },
                    ..FixedStore::default()
                };
                1.0 - simulation::run(&duty, &store, |_| {}).unserved_kwh / duty.result.deficit_kwh
            };
            close(served(1.0), sizing.served_share.unwrap(), 1e-6);
            assert!(served(1.0) >= 0.5 - 1e-7 && served(0.9989) < 0.5, "{}", sizing.technology);
            checked += 1;
        }
        assert!(checked >= 5, "{checked}");
    }
}

#[test]
fn the_sizing_goes_one_kind_a_slice() {
    let case = case(0.4);
    let duty = duty(&hourly(), &case);
    let requirement = requirement::derive(&duty, &case);
    let catalogue = Catalogue::published().unwrap();
    let mut job = simulation::Sizes::new(&duty, requirement.asked.as_ref(), &case, &catalogue);
    for k in 1..=27 {
        assert!(job.advance(1).unwrap().is_none());
        close(job.progress().done, f64::from(k) / 27.0, 1e-12);
    }
    assert_eq!(job.advance(1).unwrap().unwrap().len(), 27);
}
