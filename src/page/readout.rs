//! What a picture says at a place: the sample nearest to the pointer, or the one that the arrow keys have reached.

use std::fmt::Write;

use millpond::chart::ticks::moment;
use millpond::chart::{Hits, Measure, Verdict, nearest};
use millpond::sheet::Sheet;
use millpond::units::people::{self, NARROW};

use super::drawing::Which;

/// Microseconds in a second.
const SECOND_US: f64 = 1e6;

/// What is read at a sample.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Readout {
    /// In words.
    pub(crate) words: String,
    /// Where the sample lies, px.
    pub(crate) at: (f64, f64),
    /// Upper and lower end of the hairline, px.
    pub(crate) hair: (f64, f64),
}

/// How many samples the arrow keys go through.
pub(crate) fn count(which: Which, sheet: &Sheet) -> usize {
    let pictures = &sheet.pictures;
    match which {
        Which::Year => pictures.year.net_kw.len(),
        Which::Net => pictures.net.t_us.len(),
        Which::Coverage => pictures.coverage.curves.first().map_or(0, |curve| curve.energy_kwh.len()),
        Which::Week => pictures.week.as_ref().map_or(0, |week| week.t_us.len()),
        Which::Cumulative => pictures.cumulative.t_us.len(),
        Which::Plane => pictures.plane.strands.len(),
    }
}

/// The sample under a pixel position.
pub(crate) fn locate(which: Which, sheet: &Sheet, hits: &Hits, at: (f64, f64)) -> Option<usize> {
    let frame = &hits.main;
    let (left, _, right, _) = frame.plot;
    if at.0 < left || at.0 > right {
        return None;
    }
    let pictures = &sheet.pictures;
    let x = frame.x.at(at.0);
    match which {
        Which::Year => {
            if !frame.holds(at) {
                return None;
            }
            let row = frame.y.at(at.1).max(0.0) as usize;
            let cell = (x.max(0.0) as usize).min(pictures.year.cells_per_row.saturating_sub(1));
            let index = row * pictures.year.cells_per_row + cell;
            pictures.year.net_kw.get(index)?.is_finite().then_some(index)
        }
        Which::Net if frame.holds(at) => nearest(&pictures.net.t_us, x),
        Which::Coverage => nearest(&pictures.coverage.curves.first()?.energy_kwh, x),
        Which::Week => nearest(&pictures.week.as_ref()?.t_us, x),
        Which::Cumulative => nearest(&pictures.cumulative.t_us, x),
        Which::Plane => pictures
            .plane
            .strands
            .iter()
            .enumerate()
            .filter_map(|(i, strand)| {
                let apart = |(energy, power): &(f64, f64)| {
                    let (px, py) = frame.px(*energy, *power);
                    (px - at.0).abs() + (py - at.1).abs()
                };
                let least = strand
                    .typical
                    .iter()
                    .map(apart)
                    .filter(|apart| apart.is_finite())
                    .min_by(f64::total_cmp)?;
                (least < 24.0).then_some((i, least))
            })
            .min_by(|a, b| a.1.total_cmp(&b.1))
            .map(|(i, _)| i),
        Which::Net => None,
    }
}

/// What is read at a sample; none where there is nothing.
pub(crate) fn read(which: Which, sheet: &Sheet, hits: &Hits, index: usize) -> Option<Readout> {
    let frame = &hits.main;
    let pictures = &sheet.pictures;
    let hair = (frame.plot.1, frame.plot.3);
    let read = match which {
        Which::Year => {
            let year = &pictures.year;
            let net = known(*year.net_kw.get(index)?)?;
            let (row, cell) = (index / year.cells_per_row.max(1), index % year.cells_per_row.max(1));
            let from = year.start_us + index as f64 * year.cell_s * SECOND_US;
            let at = frame.px(cell as f64 + 0.5, row as f64 + 0.5);
            // On the sheet of weeks a hairline would cross other weeks.
            Readout { words: format!("{}: net {}", moment(from), people::power(net)), at, hair: (at.1, at.1) }
        }
        Which::Net => {
            let net = &pictures.net;
            let t = *net.t_us.get(index)?;
            let (least, greatest) = (known(*net.least_kw.get(index)?)?, known(*net.greatest_kw.get(index)?)?);
            let words = if least == greatest {
                format!("{}: net {}", moment(t), people::power(least))
            } else {
                format!("from {}: net {} to {}", moment(t), people::power(least), people::power(greatest))
            };
            Readout {
                words,
                at: frame.px(t, if least.abs() > greatest.abs() { least } else { greatest }),
                hair,
            }
        }
        Which::Coverage => {
            let coverage = &pictures.coverage;
            let first = coverage.curves.first()?;
            let energy = *first.energy_kwh.get(index)?;
            let measure = |value: f64| match coverage.measure {
                Measure::ServedShare => format!("{} served", people::percent(value)),
                Measure::SelfSufficiency => format!("{} self-sufficient", people::percent(value)),
                Measure::HeldImportKw => format!("import held at {}", people::power(value)),
                Measure::CarriedShare => format!("{} carried", people::percent(value)),
            };
            let mut words = format!("{} delivered:", people::energy(energy));
            for (i, curve) in coverage.curves.iter().enumerate() {
                let Some(value) = nearest(&curve.energy_kwh, energy).and_then(|j| known(curve.value[j]))
                else {
                    continue;
                };
                let power =
                    curve.power_kw.map_or_else(|| "any power".to_owned(), |kw| people::power(kw).to_string());
                // A String takes whatever is written to it.
                let _ = write!(words, "{} {} at {power}", if i == 0 { "" } else { "," }, measure(value));
            }
            Readout { words, at: frame.px(energy, *first.value.get(index)?), hair }
        }
        Which::Week => {
            let week = pictures.week.as_ref()?;
            let t = *week.t_us.get(index)?;
            let (asked, carried) = (known(*week.asked_kw.get(index)?)?, known(*week.carried_kw.get(index)?)?);
            let level = week.level.get(index).copied().and_then(known);
            let level = level.map_or_else(String::new, |level| format!(", level {}", people::percent(level)));
            let words = format!(
                "{}: asked {}, carried {}{level}",
                moment(t),
                people::power(asked),
                people::power(carried)
            );
            Readout { words, at: frame.px(t, carried), hair }
        }
        Which::Cumulative => {
            let t = *pictures.cumulative.t_us.get(index)?;
            let energy = known(*pictures.cumulative.energy_kwh.get(index)?)?;
            let words = format!("{}: {} since the start", moment(t), people::energy(energy));
            Readout { words, at: frame.px(t, energy), hair }
        }
        Which::Plane => {
            let strand = pictures.plane.strands.get(index)?;
            let verdict = match strand.verdict {
                Some(Verdict::Carries) => ": carries",
                Some(Verdict::Strains) => ": strains",
                Some(Verdict::Fails) => ": fails",
                None => "",
            };
            let (energy_unit, power_unit) = match pictures.plane.basis {
                millpond::chart::Basis::Mass => ("Wh/kg", "W/kg"),
                millpond::chart::Basis::Volume => ("Wh/l", "W/l"),
                millpond::chart::Basis::Absolute => ("kWh", "kW"),
            };
            let middle = strand.typical.get(strand.typical.len() / 2).copied();
            let (energy, power) = strand.meets.or(middle)?;
            let meets = if strand.meets.is_some() { "meets the line at" } else { "typically" };
            let words = format!(
                "{}{verdict}, {meets} {}{NARROW}{energy_unit} and {}{NARROW}{power_unit}",
                strand.name,
                people::significant(energy, 3),
                people::significant(power, 3),
            );
            let at = frame.px(energy, power);
            Readout { words, at, hair: (at.1, at.1) }
        }
    };
    (read.at.0.is_finite() && read.at.1.is_finite()).then_some(read)
}

fn known(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}
