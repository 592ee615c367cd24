//! Small pictures of data at the edge, kept as SVG text, and proof that no data make a picture panic or write no-numbers.

use proptest::prelude::*;

use super::samples;
use super::*;

const MONDAY: f64 = 1_704_067_200e6;
const HOUR: f64 = 3600e6;

fn hours(count: usize) -> Vec<f64> {
    (0..count).map(|h| MONDAY + h as f64 * HOUR).collect()
}

/// A picture as SVG text; it must hold numbers only.
fn sound(size: (u32, u32), draw: impl FnOnce(&mut dyn Surface) -> crate::fault::Result<Hits>) -> String {
    let text = svg(size, "", draw).unwrap();
    assert!(!text.contains("NaN") && !text.contains("inf") && !text.contains("2147483647"), "{text}");
    text
}

fn net_of(kw: Vec<f64>) -> NetPower {
    NetPower {
        t_us: hours(kw.len()),
        greatest_kw: kw.clone(),
        window_us: (MONDAY, MONDAY + (kw.len().max(2) - 1) as f64 * HOUR),
        strip_us: hours(kw.len()),
        strip_kw: kw.clone(),
        least_kw: kw,
        ..NetPower::default()
    }
}

fn coverage_of(energy_kwh: Vec<f64>, value: Vec<f64>, measure: Measure) -> Coverage {
    Coverage { measure, curves: vec![CoverageCurve { power_kw: None, energy_kwh, value }], marks: vec![] }
}

fn week_of(asked: Vec<f64>, carried: Vec<f64>) -> Week {
    Week {
        t_us: hours(asked.len()),
        level: asked.iter().map(|a| a * 0.0 + 0.5).collect(),
        asked_kw: asked,
        carried_kw: carried,
        ..Week::default()
    }
}

fn sheet_of(net_kw: Vec<f64>) -> YearSheet {
    YearSheet { start_us: MONDAY, cell_s: 3600.0, cells_per_row: 168, net_kw, critical_us: None }
}

fn strand_of(curve: Vec<(f64, f64)>) -> Plane {
    let strand =
        Strand { technology: "one".into(), name: "One kind".into(), typical: curve, ..Strand::default() };
    Plane { strands: vec![strand], ..Plane::default() }
}

#[test]
fn a_gap_lifts_the_pen() {
    let data = net_of(vec![10.0, 20.0, f64::NAN, f64::NAN, -10.0, -5.0]);
    insta::assert_snapshot!(sound((320, 388), |s| net_power(s, (320, 388), &LIGHT, &data)));
}

#[test]
fn a_single_point_is_a_dot() {
    let data = coverage_of(vec![500.0], vec![0.4], Measure::ServedShare);
    insta::assert_snapshot!(sound((320, 318), |s| coverage(s, (320, 318), &LIGHT, &data)));
}

#[test]
fn a_flat_line_has_an_axis() {
    let data = Cumulative { t_us: hours(48), energy_kwh: vec![5.0; 48], critical: None };
    insta::assert_snapshot!(sound((320, 288), |s| cumulative(s, (320, 288), &LIGHT, &data)));
}

#[test]
fn all_surplus_has_no_deficit_side() {
    let sheet = sheet_of((0..336).map(|h| f64::from(h % 24) + 1.0).collect());
    let curve = DurationCurve {
        hours: vec![0.0, 168.0, 336.0],
        net_kw: vec![24.0, 12.0, 1.0],
        surplus_kwh: 4200.0,
        ..DurationCurve::default()
    };
    let size = (320, year::height(320, year::rows(&sheet)));
    let text = sound(size, |s| year_sheet(s, size, &LIGHT, &sheet, &curve));
    assert!(!text.contains("deficit") && text.contains("surplus"));
    insta::assert_snapshot!(text);
}

#[test]
fn a_logarithmic_axis_shows_decades() {
    let data = strand_of(vec![(100.0, 1.0), (90.0, 10.0), (40.0, 100.0)]);
    insta::assert_snapshot!(sound((320, 528), |s| plane(s, (320, 528), &LIGHT, &data)));
}

#[test]
fn a_store_that_carries_all_leaves_nothing_hatched() {
    let data = week_of(vec![10.0, -10.0, 5.0], vec![10.0, -10.0, 5.0]);
    let text = sound((320, 362), |s| week(s, (320, 362), &LIGHT, &data));
    assert!(!text.to_lowercase().contains(&LIGHT.deficit_fill.to_string()));
    insta::assert_snapshot!(text);
}

/// Draws every picture of one series.
fn draw_all(values: &[f64], size: (u32, u32)) {
    let v = values.to_vec();
    let net = NetPower {
        episodes: values
            .windows(3)
            .map(|w| EpisodeMark { from_us: w[0], to_us: w[1], energy_kwh: w[2] })
            .collect(),
        limits_kw: values.iter().copied().take(2).collect(),
        ..net_of(v.clone())
    };
    sound(size, |s| net_power(s, size, &LIGHT, &net));
    let _ = net::sentence(&net);
    for measure in
        [Measure::ServedShare, Measure::SelfSufficiency, Measure::HeldImportKw, Measure::CarriedShare]
    {
        let mut data = coverage_of(v.clone(), v.clone(), measure);
        data.marks = values
            .windows(2)
            .map(|w| CoverageMark { name: "asked".to_owned(), energy_kwh: w[0], value: w[1] })
            .collect();
        sound(size, |s| coverage(s, size, &LIGHT, &data));
        let _ = coverage::sentence(&data);
    }
    let critical = values.first().map(|&a| Critical {
        from_us: MONDAY + HOUR,
        to_us: MONDAY + 9.0 * HOUR,
        from_kwh: a,
        to_kwh: values[values.len() - 1],
        delivered_kwh: a,
    });
    let data = Cumulative { t_us: hours(v.len()), energy_kwh: v.clone(), critical };
    sound(size, |s| cumulative(s, size, &LIGHT, &data));
    let _ = cumulative::sentence(&data);
    let data = week_of(v.clone(), values.iter().rev().copied().collect());
    sound(size, |s| week(s, size, &LIGHT, &data));
    let _ = week::sentence(&data);
    let sheet = YearSheet { critical_us: Some((MONDAY, MONDAY + 99.0 * HOUR)), ..sheet_of(v.clone()) };
    let curve = DurationCurve {
        hours: v.clone(),
        net_kw: v.clone(),
        import_limit_kw: values.first().copied(),
        ..DurationCurve::default()
    };
    sound(size, |s| year_sheet(s, size, &LIGHT, &sheet, &curve));
    let _ = year::sentence(&sheet, &curve);
    let pairs: Vec<(f64, f64)> = values.windows(2).map(|w| (w[0], w[1])).collect();
    let mut data = strand_of(pairs.clone());
    data.point = pairs.first().copied();
    data.requirement = pairs.last().copied();
    data.strands[0].others = vec![pairs.clone(), vec![]];
    data.strands[0].meets = pairs.first().copied();
    data.strands[0].verdict = Some(Verdict::Strains);
    sound(size, |s| plane(s, size, &LIGHT, &data));
    let _ = plane::sentence(&data);
}

#[test]
fn data_at_the_edge_are_drawn() {
    let nan = f64::NAN;
    let cases: [&[f64]; 12] = [
        &[],
        &[7.0],
        &[nan],
        &[nan, nan, nan],
        &[0.0, 0.0, 0.0],
        &[5.0, 5.0, 5.0],
        &[-5.0, -6.0],
        &[nan, 3.0, nan],
        &[1e300, -1e300],
        &[f64::INFINITY, 1.0, f64::NEG_INFINITY],
        &[1e-300, 2e-300],
        &[1.0, 1.0 + f64::EPSILON],
    ];
    for values in cases {
        for size in [(0, 0), (1, 1), (320, 300), (742, 400), (3000, 50)] {
            draw_all(values, size);
        }
    }
}

#[test]
fn the_mapping_given_back_is_the_one_drawn_with() {
    let data = samples::net();
    let size = (742, net::height(742));
    let mut hits = Hits::default();
    svg(size, "", |s| {
        hits = net_power(s, size, &LIGHT, &data)?;
        Ok(hits.clone())
    })
    .unwrap();
    let index = nearest(&data.t_us, hits.main.x.at(hits.main.x.px(data.t_us[100]))).unwrap();
    assert_eq!(index, 100);
    let grip = hits.second.unwrap().x.px(data.window_us.0);
    assert_eq!(hits.spot((grip, f64::from(size.1) - 45.0)).unwrap().name, "from");
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]
    #[test]
    fn any_numbers_are_drawn(values in prop::collection::vec(prop_oneof![
        -1e3..1e3_f64, -1e12..1e12_f64, Just(f64::NAN), Just(0.0), prop::num::f64::ANY,
    ], 0..12), width in 0u32..900) {
        draw_all(&values, (width, 400));
    }
}
