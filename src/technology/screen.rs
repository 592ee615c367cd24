//! The screening: every kind judged, criterion by criterion, on its circuit at the need's duration.

use super::catalogue::{Catalogue, Technology};
use super::family::Per;
use super::judge::Bench;
use super::need::{Judged, Need, Screened, Screening};
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
    let weight = |judged: &Judged| {
        judged.load.map_or(0.5, |load| if verdict == Verdict::Fails { load.good } else { load.typical })
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
    use super::*;

    #[test]
    fn probe() {
        let catalogue = Catalogue::published().unwrap();
        let base = Need { margin: 0.1, ..Need::default() };
        let duties = [
            ("50kW/100kWh", Need { discharge_kw: 50.0, charge_kw: 50.0, energy_kwh: 100.0, response_s: Some(1.0), round_trip_efficiency: Some(0.8), mean_hold_s: Some(6.0 * 3600.0), ..base.clone() }),
            ("87kW/5MWh", Need { discharge_kw: 87.0, charge_kw: 99.0, energy_kwh: 5000.0, round_trip_efficiency: Some(0.30), mean_hold_s: Some(60.0 * 3600.0), mass_budget_kg: Some(80_000.0), cycles_per_year: Some(29.0), ambient_c: Some((-12.0, 26.0)), transfer_s: None, ..base.clone() }),
            ("200kW/10s", Need { discharge_kw: 200.0, charge_kw: 200.0, energy_kwh: 200.0 / 360.0, response_s: Some(0.5), round_trip_efficiency: Some(0.7), ..base.clone() }),
        ];
        for (name, need) in duties {
            println!("=== {name}");
            for kind in screen(&catalogue, &need).technologies {
                let marks: Vec<String> = kind.criteria.iter().map(|j| format!("{:?}:{}", j.quantity, match j.verdict { Verdict::Carries => "c", Verdict::Strains => "S", Verdict::Fails => "F" })).collect();
                println!("{:28} {:?} conf={} mass={:?}\n     {}\n     {}", kind.technology, kind.verdict, kind.confirmed, kind.mass_kg.map(|m| (m.typical.round(), m.good.round())), marks.join(" "), kind.deciding);
            }
        }
    }
}
