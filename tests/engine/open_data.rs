//! Files of other people, read as they come.

use millpond::case::RecordCase;
use millpond::job::finish;
use millpond::numeric::Sum;
use millpond::record::{FindingKind, Memory, read};

/// A week of the German utilities' standard load profile for households (BDEW, H0), as the package demandlib 0.2.2 of the Python Package
/// Index holds it (MIT licence, copyright oemof developer group; columns of other profiles left out). It is normalised to 1000 kWh a
/// year as average kilowatts of quarter-hours: 672 of them, whose sum in the file's own digits is 79.8304 kW and thus 19.9576 kWh.
#[test]
fn a_published_load_profile_reads_without_correction() {
    let text = include_str!("../reference/load_profile_week.csv");
    let source = Memory::new("load_profile_week.csv", text);
    let record =
        finish(read("profile", vec![Box::new(source)], &RecordCase::default(), &[]).unwrap()).unwrap();
    assert_eq!((record.clock.intervals, record.clock.step_s()), (672, 900.0));
    assert!(record.clock.stamp(0).starts_with("2007-01-01T00:00:00"));
    let demand = record.demand_kw.as_ref().unwrap();
    let mut sum = Sum::default();
    for i in 0..record.clock.intervals {
        sum.add(demand.get(i).unwrap());
    }
    assert!((sum.value() * record.step_h() - 19.9576).abs() < 1e-12, "{}", sum.value());
    let kinds: Vec<FindingKind> = record.findings.iter().map(|finding| finding.kind).collect();
    // It has no unit and a header that means nothing outside its trade, which is said; the columns of words are not used.
    assert!(kinds.contains(&FindingKind::UnitDoubt), "{kinds:?}");
    assert!(kinds.contains(&FindingKind::Ignored), "{kinds:?}");
    assert!(!kinds.contains(&FindingKind::Gap) && !kinds.contains(&FindingKind::Text), "{kinds:?}");
}
