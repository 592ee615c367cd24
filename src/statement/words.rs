//! Sentences, key figures and method notes of every station, written once for the page and the statement.

mod duty;
mod kinds;
mod plane;
mod record;
mod requirement;
pub(crate) mod tables;

use crate::assess::Assessment;
use crate::case::{Case, Connection};
use crate::chart::Basis;
use crate::result::SiteResult;
use crate::sheet::{Figure, Pictures, Station, View};
use crate::units::people::{self, Scaled};

/// Said wherever a technology or a size is shown.
pub const SCREENING_NOTE: &str = "This is screening, not design. Stored energy can hurt people: fire and thermal runaway, rotor burst, \
hydrogen, toxic or cryogenic release, crushing magnets, arc flash and the stored energy itself. Siting, protection and \
installation follow the local codes and are the work of licensed practice.";

/// The four stations' words.
#[derive(Debug, Clone)]
pub(crate) struct Words {
    pub(crate) record: Station,
    pub(crate) duty: Station,
    pub(crate) requirement: Station,
    pub(crate) plane: Station,
}

/// All words of a sheet.
pub(crate) fn all(
    done: &Assessment,
    result: &SiteResult,
    case: &Case,
    view: &View,
    pictures: &Pictures,
) -> Words {
    Words {
        record: record::station(done),
        duty: duty::station(done, case),
        requirement: requirement::station(done, case, pictures),
        plane: plane::station(done, result, case, view),
    }
}

/// The budget of the plane's basis in words; empty where none is set.
pub(crate) fn budget(case: &Case, basis: Basis) -> String {
    match basis {
        Basis::Mass => case.site.mass_budget_kg.map(|kg| people::mass(kg).to_string()),
        Basis::Volume => case.site.volume_budget_l.map(|l| people::volume(l).to_string()),
        Basis::Absolute => None,
    }
    .unwrap_or_default()
}

/// A key figure that stands in the result object.
fn figure(path: &str, value: f64, label: &str, shown: Scaled, context: impl Into<String>) -> Figure {
    Figure {
        path: path.to_owned(),
        value: Some(value),
        label: label.to_owned(),
        number: shown.number,
        unit: shown.unit.to_owned(),
        context: context.into(),
    }
}

/// What is short at this site: "deficit", or "import" where a grid serves it.
fn deficit_word(connection: Connection) -> &'static str {
    match connection {
        Connection::Islanded => "deficit",
        Connection::Connected => "import",
    }
}

/// What is left over: "surplus", or "export" where a grid takes it.
fn surplus_word(connection: Connection) -> &'static str {
    match connection {
        Connection::Islanded => "surplus",
        Connection::Connected => "export",
    }
}

/// A count with its noun.
fn count(number: usize, one: &str, many: &str) -> String {
    format!("{} {}", people::whole(number as f64), if number == 1 { one } else { many })
}

/// A small number in words, a large one in figures.
fn in_words(number: usize) -> String {
    const WORDS: [&str; 10] = ["no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine"];
    WORDS.get(number).map_or_else(|| people::whole(number as f64), |word| (*word).to_owned())
}

/// A stretch of time as people say it: "one year", "28 days", "36 hours".
fn stretch(seconds: f64) -> String {
    let days = seconds / 86_400.0;
    if (days - 365.0).abs() <= 1.5 {
        "one year".to_owned()
    } else if days > 1000.0 {
        format!("{} years", people::significant(days / 365.25, 2))
    } else if days >= 3.0 {
        format!("{} days", people::significant(days, 3))
    } else if seconds >= 7200.0 {
        format!("{} hours", people::significant(seconds / 3600.0, 3))
    } else {
        format!("{} minutes", people::significant(seconds / 60.0, 3))
    }
}

/// A step as people say it: "15 minutes", "one hour".
fn step(seconds: f64) -> String {
    if seconds == 3600.0 {
        "one hour".to_owned()
    } else if seconds == 60.0 {
        "one minute".to_owned()
    } else if seconds < 60.0 {
        format!("{} seconds", people::significant(seconds, 4))
    } else if seconds < 7200.0 {
        format!("{} minutes", people::significant(seconds / 60.0, 4))
    } else {
        format!("{} hours", people::significant(seconds / 3600.0, 4))
    }
}
