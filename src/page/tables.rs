//! The table behind each picture: for the fold under it, and for the clipboard.

use leptos::prelude::*;

use millpond::chart::ticks::moment;
use millpond::chart::{Basis, Measure};
use millpond::sheet::Sheet;
use millpond::units::people;

use super::drawing::Which;

/// Rows that a fold shows; the copy has them all.
const SHOWN: usize = 200;

/// A table behind a picture.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Table {
    /// Heads with units.
    pub(crate) heads: Vec<String>,
    /// The rows: a name or time, then numbers; none where the picture has a gap.
    pub(crate) rows: Vec<(String, Vec<Option<f64>>)>,
}

/// The table behind a picture.
pub(crate) fn table(which: Which, sheet: &Sheet) -> Table {
    let pictures = &sheet.pictures;
    let known = |value: &f64| value.is_finite().then_some(*value);
    let (heads, rows): (Vec<String>, Vec<_>) = match which {
        Which::Year => {
            let year = &pictures.year;
            let time = |i: usize| moment(year.start_us + i as f64 * year.cell_s * 1e6);
            let rows = year.net_kw.iter().enumerate().map(|(i, net)| (time(i), vec![known(net)]));
            (heads(&["From", "Net power, kW"]), rows.filter(|(_, row)| row[0].is_some()).collect())
        }
        Which::Net => {
            let net = &pictures.net;
            let rows = net.t_us.iter().zip(&net.least_kw).zip(&net.greatest_kw);
            let rows = rows.map(|((t, least), greatest)| (moment(*t), vec![known(least), known(greatest)]));
            (heads(&["From", "Least net power, kW", "Greatest, kW"]), rows.collect())
        }
        Which::Coverage => {
            let measure = match pictures.coverage.measure {
                Measure::ServedShare => "Share served",
                Measure::SelfSufficiency => "Self-sufficiency",
                Measure::HeldImportKw => "Import held, kW",
                Measure::CarriedShare => "Share carried",
            };
            let rows = pictures.coverage.curves.iter().flat_map(|curve| {
                let power =
                    curve.power_kw.map_or_else(|| "no limit".to_owned(), |kw| people::power(kw).to_string());
                let points = curve.energy_kwh.iter().zip(&curve.value);
                points.map(move |(energy, value)| (power.clone(), vec![known(energy), known(value)]))
            });
            (heads(&["Power", "Delivered, kWh", measure]), rows.collect())
        }
        Which::Week => {
            let rows = pictures.week.iter().flat_map(|week| {
                let rows = week.t_us.iter().zip(&week.asked_kw).zip(&week.carried_kw).zip(&week.level);
                rows.map(|(((t, asked), carried), level)| {
                    (moment(*t), vec![known(asked), known(carried), known(level)])
                })
            });
            (heads(&["From", "Asked, kW", "Carried, kW", "Level, of 1"]), rows.collect())
        }
        Which::Cumulative => {
            let curve = &pictures.cumulative;
            let rows =
                curve.t_us.iter().zip(&curve.energy_kwh).map(|(t, energy)| (moment(*t), vec![known(energy)]));
            (heads(&["At", "Net energy since the start, kWh"]), rows.collect())
        }
        Which::Plane => {
            let units = match pictures.plane.basis {
                Basis::Mass => ["Kind", "Energy, Wh/kg", "Power, W/kg"],
                Basis::Volume => ["Kind", "Energy, Wh/l", "Power, W/l"],
                Basis::Absolute => ["Kind", "Energy, kWh", "Power, kW"],
            };
            let rows = pictures.plane.strands.iter().flat_map(|strand| {
                let points = strand.typical.iter();
                points.map(|(energy, power)| (strand.name.clone(), vec![known(energy), known(power)]))
            });
            (heads(&units), rows.collect())
        }
    };
    Table { heads, rows }
}

fn heads(words: &[&str]) -> Vec<String> {
    words.iter().map(|word| (*word).to_owned()).collect()
}

impl Table {
    /// Cells parted by tabs, whole numbers and a decimal point, as spreadsheets take them.
    pub(crate) fn text(&self) -> String {
        let mut text = self.heads.join("\t");
        for (name, numbers) in &self.rows {
            text.push('\n');
            text.push_str(name);
            for number in numbers {
                text.push('\t');
                text.push_str(&number.map(|number| number.to_string()).unwrap_or_default());
            }
        }
        text
    }

    /// The table for a fold.
    pub(crate) fn view(&self) -> impl IntoView + use<> {
        let more = self.rows.len().saturating_sub(SHOWN);
        let heads = self.heads.iter().enumerate().map(|(i, head)| {
            view! { <th class=if i == 0 { "" } else { "n" }>{head.clone()}</th> }
        });
        let rows = self.rows.iter().take(SHOWN).map(|(name, numbers)| {
            let numbers = numbers.iter().map(|number| {
                view! { <td class="n">{number.map_or_else(|| "–".to_owned(), |number| people::significant(number, 4))}</td> }
            });
            view! { <tr><td>{name.clone()}</td>{numbers.collect_view()}</tr> }
        });
        view! {
            <div class="scroll" tabindex="0" role="region" aria-label="Table behind this picture"><table>
                <thead><tr>{heads.collect_view()}</tr></thead>
                <tbody>{rows.collect_view()}</tbody>
            </table></div>
            {(more > 0).then(|| view! {
                <p class="note">{format!("{} further rows: Copy takes them all.", people::whole(more as f64))}</p>
            })}
        }
    }
}
