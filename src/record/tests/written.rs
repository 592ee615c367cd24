//! A record written in any dialect and shape is the record read back.

use super::*;

/// How a table is written.
#[derive(Debug, Clone)]
struct Hand {
    separator: char,
    comma: bool,
    stamps: usize,
    shape: usize,
    energy: bool,
    newest_first: bool,
    end: &'static str,
}

fn hand() -> impl Strategy<Value = Hand> {
    let ends = prop::sample::select(vec!["\n", "\r\n"]);
    let separators = prop::sample::select(vec![';', '\t', '|', ',']);
    (separators, any::<bool>(), 0usize..6, 0usize..4, any::<bool>(), any::<bool>(), ends).prop_map(
        |(separator, comma, stamps, shape, energy, newest_first, end)| Hand {
            separator,
            // Decimal commas between commas cannot be told apart.
            comma: comma && separator != ',',
            stamps,
            shape,
            energy,
            newest_first,
            end,
        },
    )
}

impl Hand {
    fn stamp(&self, i: usize) -> String {
        let (day, hour, minute) = (20 + i / 96, i / 4 % 24, i % 4 * 15);
        match self.stamps {
            0 => format!("2026-01-{day} {hour:02}:{minute:02}"),
            1 => format!("{day}.01.2026 {hour:02}:{minute:02}"),
            2 => format!(
                "01/{day}/2026 {}:{minute:02} {}",
                (hour + 11) % 12 + 1,
                if hour < 12 { "AM" } else { "PM" }
            ),
            3 => format!("202601{day}{hour:02}{minute:02}"),
            4 => format!("2026-01-{day}T{hour:02}:{minute:02}:00Z"),
            _ => format!("{day}-Jan-26 {hour:02}:{minute:02}:00"),
        }
    }

    fn number(&self, value: f64) -> String {
        let value = if self.energy { value / 4.0 } else { value };
        if self.comma { value.to_string().replace('.', ",") } else { value.to_string() }
    }

    /// The table of a supply and a demand (kW at a quarter of an hour).
    fn write(&self, supply: &[f64], demand: &[f64]) -> String {
        let unit = if self.energy { "kWh" } else { "kW" };
        let row = |cells: &[String]| cells.join(&self.separator.to_string()) + self.end;
        let text = |cells: &[&str]| row(&cells.iter().map(|cell| (*cell).to_owned()).collect::<Vec<_>>());
        let count = supply.len();
        let (head, mut rows): (String, Vec<String>) = match self.shape {
            // One row per reading.
            0 => (
                text(&["time", &format!("PV [{unit}]"), &format!("load [{unit}]")]),
                (0..count)
                    .map(|i| row(&[self.stamp(i), self.number(supply[i]), self.number(demand[i])]))
                    .collect(),
            ),
            // One row per channel and reading.
            1 => (
                text(&["time", "channel", "value", "unit"]),
                (0..count)
                    .flat_map(|i| [("PV", supply[i], i), ("load", demand[i], i)])
                    .map(|(name, value, i)| {
                        row(&[self.stamp(i), name.to_owned(), self.number(value), unit.to_owned()])
                    })
                    .collect(),
            ),
            // One row per channel and day.
            2 => {
                let times = (0..96).map(|i| format!("{:02}:{:02}", i / 4, i % 4 * 15));
                let head: Vec<String> =
                    ["date".to_owned(), "channel".to_owned()].into_iter().chain(times).collect();
                let days = (0..count / 96).flat_map(|day| [("PV", supply, day), ("load", demand, day)]);
                let rows = days.map(|(name, values, day)| {
                    let cells = values[day * 96..(day + 1) * 96].iter().map(|value| self.number(*value));
                    let stamp = self.stamp(day * 96);
                    let date = stamp.split([' ', 'T']).next().unwrap_or_default();
                    let date = if self.stamps == 3 { &stamp[..8] } else { date };
                    row(&[date.to_owned(), format!("{name} {unit}")]
                        .into_iter()
                        .chain(cells)
                        .collect::<Vec<_>>())
                });
                (row(&head), rows.collect())
            }
            // Running readings; whole energies keep them exact.
            _ => {
                let mut totals = (500.0, 700.0);
                let rows = (0..=count).map(|i| {
                    let comma =
                        |value: f64| value.to_string().replace('.', if self.comma { "," } else { "." });
                    let cells = [self.stamp(i), comma(totals.0), comma(totals.1)];
                    totals.0 += supply.get(i).unwrap_or(&0.0) / 4.0;
                    totals.1 += demand.get(i).unwrap_or(&0.0) / 4.0;
                    row(&cells)
                });
                (text(&["time", "PV reading [kWh]", "load reading [kWh]"]), rows.collect())
            }
        };
        if self.newest_first {
            rows.reverse();
        }
        head + &rows.concat()
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(120))]

    #[test]
    fn whatever_the_hand_the_record_is_the_same(
        hand in hand(),
        values in prop::collection::vec((0u32..400, 1u32..400), 192),
    ) {
        // Quarters of a kilowatt: every sum and difference of them is exact.
        let supply_kw: Vec<f64> = values.iter().map(|(supply, _)| f64::from(*supply) / 4.0).collect();
        let demand_kw: Vec<f64> = values.iter().map(|(_, demand)| f64::from(*demand) / 4.0).collect();
        let text = hand.write(&supply_kw, &demand_kw);
        let record = read_text(&text);
        prop_assert_eq!(supply(&record), some(&supply_kw), "{:?}\n{}", hand, &text[..400]);
        prop_assert_eq!(demand(&record), some(&demand_kw), "{:?}", hand);
        prop_assert_eq!(record.clock.stamp(0), "2026-01-20T00:00:00+00:00");
        prop_assert_eq!((record.clock.step_s(), record.clock.intervals), (900.0, 192));
    }
}
