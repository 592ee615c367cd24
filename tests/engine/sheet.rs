//! The sheet of every demo site: words, figures and pictures hang together.

use std::rc::Rc;

use millpond::case::Case;
use millpond::job::finish;
use millpond::record::{Memory, read, site_name};
use millpond::sheet::{Lay, Sheet, View};
use millpond::technology::Catalogue;
use serde_json::Value;

fn sheet(file: &str) -> Sheet {
    sheet_of(file, Case::default())
}

fn sheet_of(file: &str, case: Case) -> Sheet {
    let path = format!("{}/demo-profiles/{file}", env!("CARGO_MANIFEST_DIR"));
    let source = Memory::new(file, std::fs::read(path).unwrap());
    let named = case.duty.columns();
    let record =
        finish(read(&site_name(file), vec![Box::new(source)], &case.record, &named).unwrap()).unwrap();
    let catalogue = Rc::new(Catalogue::published().unwrap());
    finish(Lay::new(Rc::new(record), case, View::default(), catalogue)).unwrap()
}

/// Words, figures and lists of a sheet agree with its result.
fn figures_are_the_results(file: &str, sheet: &Sheet) {
    let result: Value = serde_json::from_str(&sheet.result).unwrap();
    for station in [&sheet.record, &sheet.duty, &sheet.requirement, &sheet.plane] {
        assert!(station.sentence.ends_with('.') && !station.rail.is_empty(), "{file}: {}", station.sentence);
        for figure in station.figures.iter().flatten() {
            assert!(!figure.number.is_empty() && !figure.label.is_empty(), "{file}: {}", figure.path);
            if !figure.path.is_empty() {
                let found = figure.path.split('.').fold(&result, |value, key| &value[key]);
                assert_eq!(found.as_f64(), figure.value, "{file}: {}", figure.path);
            }
        }
    }
    for listed in &sheet.listed {
        let found = listed.path.split('.').fold(&result, |value, key| match key.parse::<usize>() {
            Ok(index) => &value[index],
            Err(_) => &value[key],
        });
        assert_eq!(found.to_string(), listed.value, "{file}: {}", listed.path);
    }
}

#[test]
fn every_figure_is_the_results_and_every_picture_is_whole() {
    for file in ["hill-farm.csv", "wind-island.csv", "solar-workshop.txt", "cold-store.csv"] {
        let mut sheet = sheet(file);
        figures_are_the_results(file, &sheet);
        let pictures = &sheet.pictures;
        assert_eq!(pictures.net.t_us.len(), pictures.net.least_kw.len());
        assert_eq!(pictures.cumulative.t_us.len(), pictures.cumulative.energy_kwh.len());
        assert_eq!(pictures.year.net_kw.len() % pictures.year.cells_per_row, 0);
        for curve in &pictures.coverage.curves {
            assert_eq!(curve.energy_kwh.len(), curve.value.len());
            assert!(curve.energy_kwh.windows(2).all(|pair| pair[0] <= pair[1]), "{file}: energy rises");
        }
        let week = pictures.week.as_ref().expect("each demo asks something of a store");
        assert!(week.level.iter().all(|level| (-1e-9..=1.0 + 1e-9).contains(level)), "{file}");
        if let Some(critical) = &pictures.cumulative.critical {
            let (t, energy) = (&pictures.cumulative.t_us, &pictures.cumulative.energy_kwh);
            let at = |us: f64| {
                energy[t.iter().position(|t| *t == us).expect("the critical dates are among the samples")]
            };
            crate::site::close(at(critical.from_us), critical.from_kwh, 1e-9);
            crate::site::close(
                critical.from_kwh - at(critical.to_us),
                critical.from_kwh - critical.to_kwh,
                1e-6,
            );
        }
        assert!(
            sheet.pictures.columns_mut().iter().all(|column| !column.is_empty()) || file == "cold-store.csv",
            "{file}"
        );
    }
}

#[test]
fn islanded_sites_show_a_critical_period_and_connected_ones_do_not() {
    assert!(sheet("wind-island.csv").pictures.cumulative.critical.is_some());
    assert!(sheet("solar-workshop.txt").pictures.cumulative.critical.is_none());
    assert!(sheet("cold-store.csv").pictures.cumulative.t_us.is_empty(), "limits have no such curve");
}

#[test]
fn sites_with_a_case_of_their_own_show_what_it_asks() {
    let sites: Value = serde_json::from_str(include_str!("../../demo-profiles/sites.json")).unwrap();
    let mut kinds = Vec::new();
    for site in sites.as_array().unwrap().iter().filter(|site| site["case"].is_object()) {
        let file = site["file"].as_str().unwrap();
        let sheet = sheet_of(file, Case::from_json(&site["case"].to_string()).unwrap());
        figures_are_the_results(file, &sheet);
        let result: Value = serde_json::from_str(&sheet.result).unwrap();
        assert!(result["requirement"]["least_capacity_kwh"].as_f64().unwrap() > 0.0, "{file}");
        assert_eq!(result["duty"]["connection"], site["connection"], "{file}");
        assert!(!result["screening"].as_array().unwrap().is_empty(), "{file}");
        let curve = &sheet.pictures.coverage.curves[0];
        assert!(curve.value.windows(2).all(|pair| pair[0] <= pair[1] + 1e-9), "{file}: {:?}", curve.value);
        assert!(
            (curve.value.last().unwrap() - 1.0).abs() < 1e-6,
            "{file}: all is carried with all of the energy"
        );
        let week = sheet.pictures.week.as_ref().unwrap();
        assert!(week.level.iter().all(|level| (-1e-9..=1.0 + 1e-9).contains(level)), "{file}");
        assert!(sheet.pictures.year.net_kw.iter().any(|kw| !kw.is_nan()), "{file}");
        kinds.push(result["duty"]["kind"].as_str().unwrap().to_owned());
    }
    assert_eq!(kinds, ["smoothing", "ride_through", "frequency", "shifting"]);
}
