//! Tables in other shapes than one row per reading, and other values than averages.

use super::*;
use crate::case::Values;

/// A value for each quarter of an hour of `days` days, drawn by a fixed rule.
fn drawn(days: usize) -> Vec<f64> {
    (0..days * 96).map(|i| 5.0 + (i * 37 % 101) as f64 / 4.0).collect()
}

fn quarter(i: usize) -> String {
    format!("{:02}:{:02}", i / 4, i % 4 * 15)
}

#[test]
fn a_row_per_day_is_dealt_out_as_its_times_of_day() {
    type Label = fn(usize) -> String;
    let values = drawn(3);
    let labels: [(&str, Label); 6] = [
        ("starts", quarter),
        ("ends", |i| quarter(i + 1)),
        ("ends at midnight", |i| quarter((i + 1) % 96)),
        ("counts", |i| format!("Interval {}", i + 1)),
        ("four digits", |i| quarter(i).replace(':', "")),
        ("spans", |i| format!("{} - {}", quarter(i), quarter(i + 1))),
    ];
    for (name, label) in labels {
        let header: Vec<String> = (0..96).map(label).collect();
        let mut text = format!("Lastgang kW\n\nDatum;{}\n", header.join(";"));
        for (day, row) in values.chunks(96).enumerate() {
            let cells: Vec<String> = row.iter().map(|value| value.to_string().replace('.', ",")).collect();
            text.push_str(&format!("{:02}.01.2026;{}\n", day + 1, cells.join(";")));
        }
        let record = read_text(&text);
        assert_eq!(demand(&record), some(&values), "{name}");
        assert_eq!(record.clock.stamp(0), "2026-01-01T00:00:00+00:00", "{name}");
        assert_eq!(found(&record, FindingKind::UnitDoubt), None, "{name}");
    }
}

#[test]
fn a_day_on_which_clocks_change_has_an_hour_more_or_less() {
    // 100 columns: the last four are filled on the day with 25 hours alone.
    let header: Vec<String> = (1..=100).map(|i| i.to_string()).collect();
    let mut text = format!("Date,{}\n", header.join(","));
    let mut expected = Vec::new();
    for (day, filled) in [(25, 96), (26, 100), (27, 96)] {
        let row: Vec<f64> = (0..filled).map(|i| f64::from(day) + f64::from(i * 37 % 101) / 4.0).collect();
        let cells: Vec<String> = row.iter().map(f64::to_string).collect();
        text.push_str(&format!("2025-10-{day},{}{}\n", cells.join(","), ",".repeat(100 - filled as usize)));
        expected.extend(row);
    }
    let terms = RecordCase { zone: Some("Europe/Berlin".to_owned()), ..RecordCase::default() };
    let record = read_with(&[("load.csv", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&expected));
    assert_eq!(record.clock.stamp(0), "2025-10-25T00:00:00+02:00");
}

#[test]
fn channels_in_rows_become_columns() {
    let rows = [(0, 4.0, 0.0), (15, 3.0, 0.5), (30, 0.0, 2.0), (45, 1.0, 0.0)];
    let mut mixed = "Zählpunkt;Kennzahl;Zeit;Wert;Einheit\n".to_owned();
    let mut sorted = mixed.clone();
    for (minute, drawn, fed) in rows {
        mixed.push_str(&format!("DE1;1-1:1.29.0;31.01.2026 00:{minute:02};{drawn};kWh\n"));
        mixed.push_str(&format!("DE1;1-1:2.29.0;31.01.2026 00:{minute:02};{fed};kWh\n"));
    }
    for (code, pick) in [("1-1:1.29.0", 0), ("1-1:2.29.0", 1)] {
        for (minute, drawn, fed) in rows {
            let value = [drawn, fed][pick];
            sorted.push_str(&format!("DE1;{code};31.01.2026 00:{minute:02};{value};kWh\n"));
        }
    }
    for text in [mixed, sorted] {
        let record = read_text(&text);
        assert_eq!(net(&record), some(&[-16.0, -10.0, 8.0, -4.0]), "{text}");
        let roles: Vec<Role> = record.reading.files.iter().map(|file| file.columns[3].role).collect();
        assert_eq!(roles, [Role::Import, Role::Export]);
        // In the second quarter 3 kWh were drawn and 0.5 kWh fed.
        let both =
            record.findings.iter().find(|f| f.kind == FindingKind::Netted && f.changes_figures).unwrap();
        assert_eq!(both.count, 1);
        assert!(both.text.contains("8\u{202f}kWh drawn and 2.5\u{202f}kWh fed"), "{}", both.text);
    }
}

#[test]
fn a_running_reading_is_the_sum_of_what_went_before() {
    let energies = [1.5, 0.0, 2.25, 4.0, 0.5, 3.0];
    let mut reading = 99_995.5;
    let mut text = "time;Zählerstand Bezug [kWh]\n".to_owned();
    for (i, energy) in energies.iter().chain(&[0.0]).enumerate() {
        text.push_str(&format!("31.01.2026 {i:02}:00;{reading}\n"));
        reading = (reading + energy) % 100_000.0;
    }
    let record = read_text(&text);
    assert_eq!(demand(&record), some(&energies));
    assert_eq!(found(&record, FindingKind::Register).unwrap().count, 1);
    // Rows from the newest to the oldest, and a reading that is missing.
    let mut rows: Vec<&str> = text.lines().collect();
    rows[1..].reverse();
    assert_eq!(demand(&read_text(&(rows.join("\n") + "\n"))), some(&energies));
    let holed: Vec<&str> = text.lines().filter(|line| !line.contains(" 02:00")).collect();
    let record = read_text(&(holed.join("\n") + "\n"));
    assert_eq!(demand(&record), [Some(1.5), None, None, Some(4.0), Some(0.5), Some(3.0)]);
    assert!(record.findings.iter().any(|f| f.text.contains("2.25\u{202f}kWh")), "{:?}", record.findings);
    // A reset to zero counts on from there; another meter's reading says nothing.
    let reset = "time,meter reading (kWh)\n2026-01-31 00:00,500\n2026-01-31 01:00,502\n2026-01-31 02:00,1\n2026-01-31 03:00,4\n2026-01-31 04:00,4\n";
    assert_eq!(demand(&read_text(reset)), [Some(2.0), Some(1.0), Some(3.0), Some(0.0)]);
    assert_eq!(
        demand(&read_text(
            &reset
                .replace("02:00,1", "02:00,77")
                .replace("03:00,4", "03:00,80")
                .replace("04:00,4", "04:00,80")
        )),
        [Some(2.0), None, Some(3.0), Some(0.0)]
    );
}

#[test]
fn phases_are_added_up_and_a_total_is_not_counted_twice() {
    let mut phases = "time,L1 kW,L2 kW,L3 kW\n".to_owned();
    let mut parts = "time,Load A kW,Load B kW,Load total kW\n".to_owned();
    for i in 0..24 {
        phases.push_str(&format!("2026-01-31 {i:02}:00,{},2,1\n", 3 + i % 2));
        parts.push_str(&format!("2026-01-31 {i:02}:00,{},2,{}\n", 1 + i % 3, 3 + i % 3));
    }
    let record = read_text(&phases);
    assert_eq!(demand(&record)[..2], some(&[6.0, 7.0]));
    // 84 of 156 kWh.
    let told = found(&record, FindingKind::Phases).unwrap();
    assert!(told.text.contains("“L1 kW” with 53.8\u{202f}%"), "{}", told.text);
    let record = read_text(&parts);
    assert_eq!(demand(&record)[..3], some(&[3.0, 4.0, 5.0]));
}

#[test]
fn files_with_other_steps_keep_their_energy() {
    // methods of resampling, check value alignment_union_grid: supply at 20 min, demand at 15 min.
    let supply: &[u8] = b"time,PV kW\n2026-01-31 00:00,9\n2026-01-31 00:20,3\n2026-01-31 00:40,6\n";
    let demand_file: &[u8] =
        b"time,load kW\n2026-01-31 00:00,5\n2026-01-31 00:15,7\n2026-01-31 00:30,2\n2026-01-31 00:45,6\n";
    let record = read_with(&[("s", supply), ("d", demand_file)], &RecordCase::default(), &[]).unwrap();
    assert_eq!(record.clock.step_s(), 300.0);
    let net: Vec<f64> = net(&record).into_iter().flatten().collect();
    let minutes = |sign: f64| net.iter().map(|net| (net * sign).max(0.0) * 5.0).sum::<f64>();
    assert_eq!((net.len(), minutes(1.0), minutes(-1.0)), (12, 100.0, 40.0));
    assert!(found(&record, FindingKind::MixedSteps).is_some());
}

#[test]
fn rows_at_another_step_than_stated_are_dealt_out() {
    // Check values resample_10_to_15_min and resample_7_to_5_min.
    for (step, values, to, expected) in [
        (
            10,
            &[3.0, 6.0, 0.0, -2.0, 4.0, 7.0, 1.0, 5.0, 9.0][..],
            15,
            &[4.0, 2.0, 0.0, 6.0, 7.0 / 3.0, 23.0 / 3.0][..],
        ),
        (7, &[1.0, 4.0, -3.0, 2.0, 8.0], 5, &[1.0, 2.8, 2.6, -3.0, 1.0, 4.4, 8.0]),
    ] {
        let mut text = "time,net export kW\n".to_owned();
        for (i, value) in values.iter().enumerate() {
            let at = i * step;
            text.push_str(&format!("2026-01-31 {:02}:{:02},{value}\n", at / 60, at % 60));
        }
        let terms = RecordCase { step_s: Some(f64::from(to) * 60.0), ..RecordCase::default() };
        let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
        let found = net(&record);
        assert_eq!(found.len(), expected.len());
        for (found, expected) in found.iter().zip(expected) {
            assert!((found.unwrap() - expected).abs() < 1e-12, "{found:?} {expected}");
        }
    }
}

#[test]
fn a_step_that_changes_halfway_keeps_every_energy() {
    let mut text = "time,load kWh\n".to_owned();
    for hour in 0..24 {
        text.push_str(&format!("2026-01-30 {hour:02}:00,8\n"));
    }
    for quarter_of_day in 0..96 {
        text.push_str(&format!("2026-01-31 {},2\n", quarter(quarter_of_day)));
    }
    let record = read_text(&text);
    assert_eq!(record.clock.step_s(), 900.0);
    assert_eq!(demand(&record), vec![Some(8.0); 192]);
}

#[test]
fn samples_are_joined_by_lines_and_cross_zero_on_the_way() {
    // Check value hand_samples: 4.8333 kWh of surplus, 2.0833 kWh of deficit.
    let text = "time,net export kW\n2026-01-31 00:00,3\n2026-01-31 00:30,1\n2026-01-31 01:00,-2\n2026-01-31 02:00,-1\n\
                2026-01-31 02:30,0\n2026-01-31 04:00,5\n";
    let terms = RecordCase { reading: Values::Samples, ..RecordCase::default() };
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!((record.clock.intervals, record.clock.step_s()), (8, 1800.0));
    let hidden: f64 = record.hidden_kw.iter().map(|hidden| hidden.1).sum();
    let side = |sign: f64| {
        let means: f64 = net(&record).into_iter().flatten().map(|net| (net * sign).max(0.0)).sum();
        (means + hidden) * record.step_h()
    };
    assert!((side(1.0) - 4.833_333_333_333_333).abs() < 1e-12);
    assert!((side(-1.0) - 2.083_333_333_333_333_5).abs() < 1e-12);
    assert!(record.reading.clock_note.contains("joined by straight lines"));
}

#[test]
fn the_reference_site_read_as_samples() {
    // Check value same_numbers_read_as_instantaneous_samples.
    let terms = RecordCase { reading: Values::Samples, ..RecordCase::default() };
    let text = include_str!("../../../tests/reference/site_hourly.csv");
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    let case = crate::case::Case::default();
    let duty = crate::duty::ask(&std::rc::Rc::new(record), &case).unwrap();
    assert!((duty.result.surplus_kwh.unwrap() / 8_912.501_552_517_473 - 1.0).abs() < 1e-12);
    assert!((duty.result.deficit_kwh.unwrap() / 7_324.234_052_517_47 - 1.0).abs() < 1e-12);
    assert_eq!((duty.record.clock.intervals, duty.record.hidden_kw.len()), (671, 83));
}
