//! The Ragone plane: strands of curves, the requirement's line, and the point that a budget sets on it.

use serde::{Deserialize, Serialize};

use super::catalogue::{Catalogue, MassBasis, Quantity, Technology};
use super::curve::{Circuit, Meeting};
use super::family::{Design, PLACES, Per};
use super::need::{Need, Screening};
use crate::chart::{Basis, Plane, Strand};
use crate::units::people::{mass, volume};

/// Points of a curve.
const POINTS: usize = 60;

/// Greatest duration drawn, hours: two months.
const LONGEST_H: f64 = 1440.0;

/// A curve is drawn down to this many times its reference duration, and to two hours at least.
const SLOWER: f64 = 300.0;

/// A curve is drawn past the requirement's mark down to this share of the power there.
const PAST_MARK: f64 = 0.6;

/// Towards the matched load a curve is drawn until this share of the rated energy is left.
const LEAST_DRAWN: f64 = 0.2;

/// A point of the requirement on the plane, one for each budget asked.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Point {
    /// Its name.
    pub name: String,
    /// "mass" or "volume".
    pub basis: String,
    /// Delivered energy per installed mass, Wh/kg.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub energy_wh_per_kg: Option<f64>,
    /// Power per installed mass, W/kg.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub power_w_per_kg: Option<f64>,
    /// Delivered energy per installed volume, Wh/l.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub energy_wh_per_l: Option<f64>,
    /// Power per installed volume, W/l.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub power_w_per_l: Option<f64>,
}

/// The points that the budgets set, mass first; none for a need that asks nothing.
pub fn points(need: &Need) -> Vec<Point> {
    let per = |budget: Option<f64>| {
        need.duration_s()?;
        let budget = budget.filter(|budget| *budget > 0.0 && budget.is_finite())?;
        Some((need.energy_kwh() * 1000.0 / budget, need.power_kw() * 1000.0 / budget))
    };
    let mut points = Vec::new();
    let blank = |basis: &str| Point {
        name: "requirement".to_owned(),
        basis: basis.to_owned(),
        energy_wh_per_kg: None,
        power_w_per_kg: None,
        energy_wh_per_l: None,
        power_w_per_l: None,
    };
    if let Some((energy, power)) = per(need.mass_budget_kg) {
        points.push(Point { energy_wh_per_kg: Some(energy), power_w_per_kg: Some(power), ..blank("mass") });
    }
    if let Some((energy, power)) = per(need.volume_budget_l) {
        points.push(Point { energy_wh_per_l: Some(energy), power_w_per_l: Some(power), ..blank("volume") });
    }
    points
}

/// The plane as a picture's data.
///
/// Curves are per installed kg or l (the kind's own figure divided by its packing factor) and of the usable share of the
/// rated energy, so that the mark where a curve meets the requirement agrees with the mass in the verdict. Kinds whose
/// figure is no plant's (a fluid, a lifted mass) are drawn per kg of that and marked so. On the absolute plane a kind is
/// the plants that are built: from the least to the greatest power at seven durations across its published range.
///
/// Only kinds that are on at first and the picks are drawn unless `all_kinds`; the first four `picks` get letters.
pub fn plane(
    catalogue: &Catalogue,
    need: Option<&Need>,
    screening: Option<&Screening>,
    basis: Basis,
    all_kinds: bool,
    picks: &[String],
) -> Plane {
    let need = need.filter(|need| need.duration_s().is_some());
    let strands = catalogue
        .technologies
        .iter()
        .filter_map(|technology| {
            let candidate = picks.iter().take(4).position(|pick| *pick == technology.id);
            if !(all_kinds || technology.siting.default_on || candidate.is_some()) {
                return None;
            }
            let (typical, others, meets) = match basis {
                Basis::Mass => curves(technology, need, Per::Mass),
                Basis::Volume => curves(technology, need, Per::Volume),
                Basis::Absolute => plants(technology),
            };
            Some(Strand {
                technology: technology.id.clone(),
                name: technology.name.clone(),
                fluid_only: basis != Basis::Absolute && fluid_only(technology),
                typical,
                others,
                meets,
                verdict: screening
                    .and_then(|screening| screening.find(&technology.id))
                    .map(|kind| kind.verdict),
                candidate: candidate.and_then(|place| u8::try_from(place).ok()),
            })
        })
        .collect();
    let (point, budget) = need.map_or((None, String::new()), |need| budget_point(need, basis));
    Plane {
        basis,
        strands,
        requirement: need.map(|need| (need.power_kw(), need.energy_kwh())),
        point,
        budget,
    }
}

fn fluid_only(technology: &Technology) -> bool {
    technology.siting.packing.is_none()
        || matches!(technology.siting.mass_basis, MassBasis::Fluid | MassBasis::LiftedMass | MassBasis::Media)
}

type Curve = Vec<(f64, f64)>;

fn curves(technology: &Technology, need: Option<&Need>, per: Per) -> (Curve, Vec<Curve>, Option<(f64, f64)>) {
    let packing = technology.siting.packing.unwrap_or(1.0);
    let depth = technology.range(Quantity::DepthOfDischarge).typical / 100.0;
    let place = |design: &Design, power_kw: f64, energy_kwh: f64| {
        (design.energy_wh * energy_kwh * depth / packing, design.energy_wh * power_kw / packing)
    };
    let hours = need.and_then(Need::duration_s).map(|seconds| seconds / 3600.0);
    let meeting = |design: &Design| match design.circuit.meets(hours?, depth) {
        Meeting::Curve(power) => Some(power),
        Meeting::PowerBound(_) | Meeting::RunsDown(_) => None,
    };
    let curve = |design: &Design| -> Curve {
        let circuit = &design.circuit;
        let longest_h = (SLOWER / circuit.ref_power_kw()).clamp(2.0, LONGEST_H);
        let top = top_kw(circuit);
        // Far enough down to hold the mark.
        let bottom = meeting(design).map_or(f64::INFINITY, |power| power * PAST_MARK).min(1.0 / longest_h);
        let ratio = (bottom / top).min(0.5);
        (0..POINTS)
            .map(|i| {
                // Denser at the top, where the knee is.
                let share = i as f64 / (POINTS - 1) as f64;
                let power = top * libm::pow(ratio, share * share);
                place(design, power, circuit.delivered_kwh(power))
            })
            .filter(|(energy, power)| *energy > 0.0 && *power > 0.0)
            .collect()
    };
    let mut typical = Vec::new();
    let mut others = Vec::new();
    let mut meets = None;
    for (design, at) in Design::all(technology, per).iter().zip(PLACES) {
        if at == 0.0 {
            typical = curve(design);
            meets = meeting(design).map(|power| place(design, power, design.circuit.delivered_kwh(power)));
        } else {
            others.push(curve(design));
        }
    }
    (typical, others, meets)
}

/// Power at which a curve's drawing begins: the greatest, or where so little energy is left that the curve only runs
/// along a level line.
fn top_kw(circuit: &Circuit) -> f64 {
    let (mut good, mut poor) = (circuit.ref_power_kw(), circuit.peak_kw());
    let enough = |power: f64| circuit.delivered_kwh(power) >= LEAST_DRAWN;
    if enough(poor) || good >= poor {
        return poor;
    }
    for _ in 0..40 {
        let middle = (good * poor).sqrt();
        if enough(middle) { good = middle } else { poor = middle }
    }
    good
}

fn plants(technology: &Technology) -> (Curve, Vec<Curve>, Option<(f64, f64)>) {
    let (least, greatest) = (technology.siting.least_plant_kw, technology.siting.greatest_plant_kw);
    let lasts = technology.range(Quantity::DischargeDuration);
    let line = |hours: f64| -> Curve {
        (0..POINTS)
            .map(|i| {
                let power = greatest * libm::pow(least / greatest, i as f64 / (POINTS - 1) as f64);
                (power * hours, power)
            })
            .collect()
    };
    let hours = |place: f64| {
        let end = if place < 0.0 { lasts.high } else { lasts.low };
        lasts.typical / 3600.0 * libm::pow(end / lasts.typical, place.abs())
    };
    let others = PLACES.iter().filter(|place| **place != 0.0).map(|place| line(hours(*place))).collect();
    (line(hours(0.0)), others, None)
}

fn budget_point(need: &Need, basis: Basis) -> (Option<(f64, f64)>, String) {
    let points = points(need);
    let found = |word: &str| points.iter().find(|point| point.basis == word);
    match basis {
        Basis::Mass => {
            let at = found("mass").and_then(|point| Some((point.energy_wh_per_kg?, point.power_w_per_kg?)));
            let words =
                at.and(need.mass_budget_kg).map_or_else(String::new, |budget| mass(budget).to_string());
            (at, words)
        }
        Basis::Volume => {
            let at = found("volume").and_then(|point| Some((point.energy_wh_per_l?, point.power_w_per_l?)));
            let words =
                at.and(need.volume_budget_l).map_or_else(String::new, |budget| volume(budget).to_string());
            (at, words)
        }
        Basis::Absolute => (Some((need.energy_kwh(), need.power_kw())), String::new()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::technology::screen;

    fn need() -> Need {
        Need {
            discharge_kw: 87.0,
            energy_kwh: 4740.0,
            mass_budget_kg: Some(80_000.0),
            volume_budget_l: Some(40_000.0),
            ..Need::default()
        }
    }

    #[test]
    fn kinds_on_at_first_and_picks_are_drawn() {
        let catalogue = Catalogue::published().unwrap();
        let picks = ["smes".to_owned(), "li_ion_lfp".to_owned()];
        let few = plane(&catalogue, None, None, Basis::Mass, false, &picks);
        assert_eq!(few.strands.len(), 9);
        let letter = |id: &str| few.strands.iter().find(|strand| strand.technology == id).unwrap().candidate;
        assert_eq!((letter("smes"), letter("li_ion_lfp"), letter("edlc")), (Some(0), Some(1), None));
        assert!(few.requirement.is_none() && few.point.is_none() && few.budget.is_empty());
        assert_eq!(plane(&catalogue, None, None, Basis::Volume, true, &[]).strands.len(), 27);
    }

    #[test]
    fn every_curve_can_be_drawn_on_logarithmic_axes() {
        let catalogue = Catalogue::published().unwrap();
        let need = need();
        for basis in [Basis::Mass, Basis::Volume, Basis::Absolute] {
            for strand in plane(&catalogue, Some(&need), None, basis, true, &[]).strands {
                assert_eq!(strand.others.len(), 6);
                for curve in strand.others.iter().chain([&strand.typical]) {
                    assert!(curve.len() > 50, "{}", strand.technology);
                    assert!(
                        curve.iter().all(|(e, p)| *e > 0.0 && *p > 0.0 && e.is_finite() && p.is_finite())
                    );
                    assert!(curve.windows(2).all(|pair| pair[1].1 < pair[0].1), "power falls along a curve");
                }
                assert_eq!(
                    strand.fluid_only,
                    basis != Basis::Absolute && fluid_only(catalogue.find(&strand.technology).unwrap())
                );
            }
        }
    }

    #[test]
    fn a_mark_lies_on_the_requirement_and_agrees_with_the_mass() {
        let catalogue = Catalogue::published().unwrap();
        let need = need();
        let screening = screen(&catalogue, &need);
        let plane = plane(&catalogue, Some(&need), Some(&screening), Basis::Mass, true, &[]);
        let hours = 4740.0 / 87.0;
        let mut met = 0;
        for strand in &plane.strands {
            if let Some((energy, power)) = strand.meets {
                met += 1;
                let (first, last) = (strand.typical[0], strand.typical[strand.typical.len() - 1]);
                assert!(power <= first.1 && power >= last.1, "the mark lies on the drawn curve");
                assert!((energy / power / hours - 1.0).abs() < 1e-9, "{}", strand.technology);
            }
        }
        assert!(met > 15, "{met}");
        let lfp = plane.strands.iter().find(|strand| strand.technology == "li_ion_lfp").unwrap();
        let kind = screening.find("li_ion_lfp").unwrap();
        assert_eq!(lfp.verdict, Some(kind.verdict));
        // Slow discharge loses less than the reference hour does: 7 % less mass than the box.
        let by_curve = 4740e3 / lfp.meets.unwrap().0;
        let by_box = kind.mass_kg.unwrap().typical;
        assert!(by_curve < by_box && by_curve > 0.9 * by_box, "{by_curve} {by_box}");
        assert_eq!(plane.requirement, Some((87.0, 4740.0)));
        assert_eq!(plane.budget.replace('\u{202f}', " "), "80 t");
    }

    #[test]
    fn each_budget_sets_a_point() {
        let points = points(&need());
        assert_eq!(points.len(), 2);
        assert_eq!((points[0].energy_wh_per_kg, points[0].power_w_per_kg), (Some(59.25), Some(1.0875)));
        assert_eq!((points[1].energy_wh_per_l, points[1].power_w_per_l), (Some(118.5), Some(2.175)));
        let json = serde_json::to_value(&points[0]).unwrap();
        assert_eq!(json["basis"], "mass");
        assert!(json.get("energy_wh_per_l").is_none());
        assert!(super::points(&Need { mass_budget_kg: Some(5.0), ..Need::default() }).is_empty());
    }
}
