//! The case as it travels: what reads, what does not, and what the person is told.

use millpond::case::{CarriedFile, Case, DutyCase, VERSION};
use millpond::record::Memory;
use proptest::prelude::*;

fn refused(text: &str) -> millpond::fault::Fault {
    Case::from_json(text).map(|_| ()).unwrap_err()
}

/// A case of this version with a field of the person's writing.
fn with(field: &str) -> String {
    format!(r#"{{"millpond_case": {VERSION}, {field}}}"#)
}

#[test]
fn cases_of_version_1_are_read_as_long_as_there_is_a_millpond() {
    // Written by the first version that had cases. This text never changes; what it means must not either.
    let case = Case::from_json(include_str!("../reference/case_version_1.json")).unwrap();
    assert_eq!(case.record.zone.as_deref(), Some("Europe/Berlin"));
    assert_eq!(case.record.roles.len(), 2);
    assert!(matches!(
        case.duty,
        DutyCase::Limits {
            import_limit_kw: Some(40.0),
            export_limit_kw: None,
            recharge_from_grid: false,
            ..
        }
    ));
    assert_eq!(case.requirement.charge_efficiency, 0.95);
    assert_eq!(case.site.mass_budget_kg, Some(5000.0));
    assert_eq!(case.stores.len(), 1);
}

#[test]
fn a_version_of_the_future_says_what_to_open_it_with() {
    let fault = refused(r#"{"millpond_case": 999, "a field of that time": {"deep": []}}"#);
    assert!(fault.what.contains("999") && fault.remedy.contains("newer"), "{fault}");
    for text in [r#"{"millpond_case": "1"}"#, r#"{"millpond_case": -1}"#, r#"{"millpond_case": 1.5}"#, "{}"] {
        assert_eq!(refused(text).place, "case file, at millpond_case", "{text}");
    }
}

#[test]
fn the_path_of_a_field_that_does_not_read_is_named() {
    for (field, path) in [
        (r#""site": {"mass": 5000}"#, "site.mass"),
        (r#""site": {"mass_budget_kg": "heavy"}"#, "site.mass_budget_kg"),
        (r#""record": {"roles": {"PV": "sunshine"}}"#, "record.roles.PV"),
        (r#""record": {"remedies": {"gap": "mend"}}"#, "record.remedies.gap"),
        (r#""duty": {"kind": "limits", "import_limit_kw": "forty"}"#, "duty.import_limit_kw"),
        (r#""duty": {"kind": "limits", "inport_limit_kw": 40}"#, "duty.inport_limit_kw"),
        (r#""duty": {"kind": "levitation"}"#, "duty.kind"),
        (r#""stores": [{"kind": "fixed"}, {"kind": "fixed", "energy_kwh": [1]}]"#, "stores[1].energy_kwh"),
        (r#""stores": [{"kind": "fixed", "weight": 1}]"#, "stores[0].weight"),
        (
            r#""catalogue": [{"technology": "li_ion_lfp", "quantity": "colour", "low": 1, "typical": 1, "high": 1}]"#,
            "catalogue[0].quantity",
        ),
        (
            r#""prices": {"stores": [{"technology": "li_ion_lfp", "per_kwh": true}]}"#,
            "prices.stores[0].per_kwh",
        ),
        (r#""seed": -1"#, "seed"),
    ] {
        let fault = refused(&with(field));
        assert_eq!(fault.place, format!("case file, at {path}"), "{field}: {fault}");
    }
}

#[test]
fn numbers_out_of_range_are_named_with_their_range() {
    for (field, path) in [
        (r#""requirement": {"charge_efficiency": 1.2}"#, "requirement.charge_efficiency"),
        (r#""requirement": {"charge_efficiency": 0}"#, "requirement.charge_efficiency"),
        (r#""requirement": {"margin": -0.1}"#, "requirement.margin"),
        (r#""requirement": {"powers_kw": [1, -1]}"#, "requirement.powers_kw[1]"),
        (r#""site": {"ambient_least_c": -400}"#, "site.ambient_least_c"),
        (r#""site": {"mass_budget_kg": 1e300}"#, "site.mass_budget_kg"),
        (r#""stores": [{"kind": "fixed", "energy_kwh": -1}]"#, "stores[0].energy_kwh"),
        (r#""duty": {"kind": "limits", "import_limit_kw": -5}"#, "duty.import_limit_kw"),
        (r#""prices": {"discount_rate": 8}"#, "prices.discount_rate"),
        (
            r#""catalogue": [{"technology": "li_ion_lfp", "quantity": "cycle_life", "low": 3, "typical": 1, "high": 2}]"#,
            "catalogue[0].typical",
        ),
    ] {
        let fault = refused(&with(field));
        assert!(fault.place.ends_with(&format!("at {path}")), "{field}: {fault}");
    }
}

#[test]
fn no_spelling_of_no_number_gets_in() {
    for number in [
        "NaN",
        "nan",
        "Infinity",
        "-Infinity",
        "1e999",
        "-1e999",
        "+1",
        "0x10",
        ".5",
        "1.",
        "1,5",
        "\"5\"",
        "null5",
    ] {
        let text = with(&format!(r#""site": {{"response_s": {number}}}"#));
        let fault = refused(&text);
        assert!(fault.place.starts_with("case file"), "{number}: {fault}");
    }
}

#[test]
fn a_key_that_comes_twice_is_refused_wherever_it_is() {
    for field in [
        r#""site": {}, "site": {"indoors": true}"#,
        r#""site": {"indoors": true, "indoors": false}"#,
        r#""record": {"roles": {"PV": "supply", "PV": "ignore"}}"#,
        r#""record": {"units": {"PV": "kW", "PV": "MW"}}"#,
        r#""duty": {"kind": "limits", "import_limit_kw": 1, "import_limit_kw": 2}"#,
        r#""stores": [{"kind": "fixed", "energy_kwh": 1, "energy_kwh": 2}]"#,
    ] {
        let fault = refused(&with(field));
        assert!(fault.what.contains("duplicate"), "{field}: {fault}");
    }
}

#[test]
fn depth_and_size_are_limited() {
    let deep = with(&format!(r#""site": {}{}"#, "[".repeat(100_000), "]".repeat(100_000)));
    assert!(refused(&deep).place.starts_with("case file"));
    let deep = with(&format!(r#""duty": {}1{}"#, r#"{"kind":"#.repeat(50_000), "}".repeat(50_000)));
    assert!(refused(&deep).place.starts_with("case file"));
    let long = with(&format!(r#""notes": "{}""#, "x".repeat(5 << 20)));
    assert!(refused(&long).what.contains("bytes long"));
    let long = with(&format!(r#""notes": "{}""#, "x".repeat(30_000)));
    assert_eq!(refused(&long).place, "case, at notes");
    let many = with(&format!(r#""stores": [{}]"#, vec![r#"{"kind": "fixed"}"#; 1000].join(",")));
    assert_eq!(refused(&many).place, "case, at stores");
    assert_eq!(refused(&with(r#""name": "two\nlines""#)).place, "case, at name");
    assert_eq!(refused(&with(r#""name": "nought\u0000""#)).place, "case, at name");
}

#[test]
fn what_is_no_case_says_so_and_where() {
    for text in ["", "[]", "null", "not json", "{\"millpond_case\": 1", "\u{0}", "{\"millpond_case\": 1} {}"]
    {
        let fault = refused(text);
        assert!(fault.place.starts_with("case file") && !fault.remedy.is_empty(), "{text:?}: {fault}");
    }
    // A message quotes no more than a line's worth of what it refuses, and none of its control characters.
    let fault = refused(&with(&format!(r#""{}\u0007\n<b>": 1"#, "x".repeat(10_000))));
    let told = fault.to_string();
    assert!(told.len() < 2_000 && !told.chars().any(char::is_control), "{told}");
}

#[test]
fn markup_is_a_name_like_any_other() {
    let name = r"<img src=x onerror=alert(1)>";
    let case = Case::from_json(&with(&format!(r#""name": "{name}""#))).unwrap();
    assert_eq!(case.name, name);
}

#[test]
fn a_byte_order_mark_does_not_matter() {
    assert!(Case::from_json(&format!("\u{feff}{}", with(r#""seed": 7"#))).is_ok_and(|case| case.seed == 7));
}

#[test]
fn a_record_travels_inside_without_a_change() {
    let bytes = b"time;kW\r\n31.01.2026 00:00;1,5\r\n\xe9\xff";
    let mut case = Case { name: "farm".to_owned(), ..Case::default() };
    case.files.push(CarriedFile::pack(&mut Memory::new("farm.csv", bytes.as_slice())).unwrap());
    let back = Case::from_json(&case.to_json().unwrap()).unwrap();
    assert_eq!(back, case);
    assert_eq!(back.files[0].unpack().unwrap(), bytes);
}

proptest! {
    /// Whatever numbers a case holds, they come back bit for bit.
    #[test]
    fn a_case_comes_back_bit_for_bit(
        efficiency in 0.001..1.0_f64, power in 0.0..1e9_f64, shares in prop::collection::vec(0.0..1.0_f64, 0..5),
        notes in "\\PC{0,40}", seed: u32, energy in 0.0..1e9_f64,
    ) {
        let mut case = Case { notes, seed, ..Case::default() };
        case.requirement.charge_efficiency = efficiency;
        case.requirement.served_power_kw = Some(power);
        case.requirement.unserved_shares = shares;
        case.stores.push(millpond::case::Store::Fixed(millpond::case::FixedStore { energy_kwh: energy, ..Default::default() }));
        prop_assert_eq!(Case::from_json(&case.to_json().unwrap()).unwrap(), case);
    }

    /// No text brings the reader down, and what it refuses it refuses with a place and a remedy.
    #[test]
    fn no_text_brings_the_reader_down(cut in 0..700_usize, at in 0..700_usize, with in "\\PC{0,6}") {
        let good = Case::default().to_json().unwrap();
        let mut text: Vec<char> = good.chars().collect();
        let at = at.min(text.len());
        let end = (at + cut % 9).min(text.len());
        text.splice(at..end, with.chars());
        if let Err(fault) = Case::from_json(&text.into_iter().collect::<String>()) {
            prop_assert!(fault.place.starts_with("case") && !fault.remedy.is_empty());
        }
    }
}
