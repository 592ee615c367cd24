//! The terminal program as its user calls it.

use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;

fn millpond(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_millpond")).args(arguments).output().unwrap()
}

/// A folder of this test's own.
fn folder(name: &str) -> PathBuf {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(name);
    let _ = std::fs::remove_dir_all(&folder);
    std::fs::create_dir_all(&folder).unwrap();
    folder
}

fn write(folder: &Path, name: &str, text: &str) -> String {
    let path = folder.join(name);
    std::fs::write(&path, text).unwrap();
    path.to_str().unwrap().to_owned()
}

const GOOD: &str =
    "time,supply kW,demand kW\n2026-03-02 00:00,4,2\n2026-03-02 01:00,0,3\n2026-03-02 02:00,5,1\n";

fn objects(output: &Output) -> Vec<Value> {
    String::from_utf8(output.stdout.clone())
        .unwrap()
        .lines()
        .map(|line| serde_json::from_str(line).unwrap())
        .collect()
}

#[test]
fn one_object_a_site_in_the_order_of_the_list() {
    let folder = folder("order");
    let (one, two) = (write(&folder, "one.csv", GOOD), write(&folder, "two.csv", GOOD));
    let bad = write(&folder, "bad.csv", "");
    let output = millpond(&[&one, &bad, &two, "--out", "json", "--jobs", "2"]);
    assert_eq!(output.status.code(), Some(1), "a site failed");
    let objects = objects(&output);
    assert_eq!(
        objects.iter().map(|object| object["site"].as_str().unwrap()).collect::<Vec<_>>(),
        ["one", "bad", "two"]
    );
    assert_eq!(objects[0]["error"], Value::Null);
    assert_eq!(objects[0]["duty"]["surplus_kwh"], 6.0);
    assert_eq!(objects[1]["error"]["what"], "the file is empty");
    assert_eq!(objects[1]["duty"], Value::Null);
    assert!(objects[1]["error"]["where"].as_str().unwrap().contains("bad.csv"));
}

#[test]
fn a_folder_is_one_site_and_each_entry_of_another_is_one() {
    let folder = folder("folders");
    std::fs::create_dir(folder.join("farm")).unwrap();
    write(&folder.join("farm"), "a.csv", GOOD);
    let single = millpond(&[folder.join("farm").to_str().unwrap(), "--out", "json"]);
    assert_eq!(single.status.code(), Some(0));
    assert_eq!(objects(&single)[0]["site"], "farm");
    write(&folder, "mill.csv", GOOD);
    write(&folder, "quay.csv", GOOD);
    let each = |part: &str| {
        let output = millpond(&["--each", folder.to_str().unwrap(), "--out", "json", "--part", part]);
        objects(&output).iter().map(|object| object["site"].as_str().unwrap().to_owned()).collect::<Vec<_>>()
    };
    assert_eq!(each("1/1"), ["farm", "mill", "quay"]);
    assert_eq!(each("1/2"), ["farm", "quay"]);
    assert_eq!(each("2/2"), ["mill"]);
}

#[test]
fn a_wrong_call_or_case_is_status_two_and_says_what_to_do() {
    let folder = folder("wrong");
    let good = write(&folder, "good.csv", GOOD);
    for arguments in
        [&["--out", "json"][..], &[&good, "--part", "3/2"], &[&good, "--jobs", "0"], &[&good, "--colour"]]
    {
        assert_eq!(millpond(arguments).status.code(), Some(2), "{arguments:?}");
    }
    for (name, text, place) in [
        ("unknown.json", r#"{"millpond_case": 1, "site": {"mass": 5}}"#, "site"),
        (
            "range.json",
            r#"{"millpond_case": 1, "requirement": {"charge_efficiency": 1.5}}"#,
            "charge_efficiency",
        ),
        ("future.json", r#"{"millpond_case": 2}"#, "millpond_case"),
        ("nan.json", r#"{"millpond_case": 1, "requirement": {"standing_kw": NaN}}"#, "case file"),
        ("not.json", "supply,demand", "case file"),
    ] {
        let case = write(&folder, name, text);
        let output = millpond(&[&good, "--case", &case]);
        let error = String::from_utf8(output.stderr).unwrap();
        assert_eq!(output.status.code(), Some(2), "{name}");
        assert!(error.contains("remedy:") && error.contains(place), "{name}: {error}");
    }
    assert_eq!(millpond(&["--help"]).status.code(), Some(0));
}

#[test]
fn a_case_is_followed() {
    let folder = folder("case");
    let good = write(&folder, "good.csv", GOOD);
    let case = write(
        &folder,
        "case.json",
        r#"{"millpond_case": 1, "duty": {"kind": "limits", "import_limit_kw": 1},
            "site": {"connection": "connected", "mass_budget_kg": 100},
            "stores": [{"kind": "fixed", "name": "shed", "energy_kwh": 2, "start": "cyclic"}]}"#,
    );
    let output = millpond(&[&good, "--case", &case, "--out", "json"]);
    let object = &objects(&output)[0];
    assert_eq!(object["duty"]["kind"], "limits");
    assert_eq!(object["requirement"]["least_capacity_kwh"], 2.0);
    assert_eq!(object["simulations"][0]["store"], "shed");
    crate::site::close(object["simulations"][0]["least_import_limit_kw"].as_f64().unwrap(), 1.0, 1e-9);
    assert_eq!(object["plane"]["points"][0]["basis"], "mass");
}

#[test]
fn the_table_has_a_row_a_site_under_one_header() {
    let folder = folder("table");
    let (good, bad) = (write(&folder, "good.csv", GOOD), write(&folder, "=bad.csv", "\u{0}\u{1}"));
    let output = millpond(&[&good, &bad, "--out", "csv"]);
    let text = String::from_utf8(output.stdout).unwrap();
    let rows: Vec<Vec<String>> = csv::ReaderBuilder::new()
        .has_headers(false)
        .from_reader(text.as_bytes())
        .records()
        .map(|row| row.unwrap().iter().map(str::to_owned).collect())
        .collect();
    assert_eq!(rows.len(), 3);
    let column = |name: &str| rows[0].iter().position(|head| head == name).unwrap();
    assert_eq!(rows[1][column("duty.surplus_kwh")], "6.0");
    assert_eq!(rows[2][column("site")], "'=bad", "guarded against spreadsheets");
    assert!(!rows[2][column("error.what")].is_empty());
}

#[test]
fn a_case_that_carries_its_record_is_a_site() {
    use millpond::case::{CarriedFile, Case};
    use millpond::record::Memory;
    let folder = folder("carried");
    let file = write(&folder, "farm.csv", GOOD);
    let mut case = Case::default();
    case.requirement.charge_efficiency = 0.9;
    let bare = write(&folder, "bare.json", &case.to_json().unwrap());
    case.files.push(CarriedFile::pack(&mut Memory::new("farm.csv", GOOD)).unwrap());
    let whole = write(&folder, "whole.json", &case.to_json().unwrap());

    let expected = millpond(&[&file, "--case", &bare, "--out", "json"]).stdout;
    assert!(!expected.is_empty());
    for call in [
        vec![whole.as_str(), "--out", "json"],
        vec!["--case", &whole, "--out", "json"],
        vec![&file, "--case", &whole, "--out", "json"],
    ] {
        assert_eq!(millpond(&call).stdout, expected, "{call:?}");
    }
    let output = millpond(&[&bare, "--out", "json"]);
    assert_eq!(output.status.code(), Some(1));
    assert_eq!(objects(&output)[0]["error"]["what"], "the case carries no record");
}

#[test]
fn the_fields_and_the_schema_of_a_case_are_told() {
    let fields = String::from_utf8(millpond(&["--case-fields"]).stdout).unwrap();
    assert!(fields.contains("`duty.import_limit_kw`: number | null. Greatest import, kW"), "{fields}");
    let schema: Value = serde_json::from_slice(&millpond(&["--case-schema"]).stdout).unwrap();
    assert_eq!(schema["properties"]["millpond_case"]["type"], "integer");
    assert_eq!(schema["additionalProperties"], false, "unknown fields are errors there too");
}
