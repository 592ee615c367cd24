//! Quality marks of readings: measured, estimated, missing, in the spellings that meters and data services use.

use std::collections::BTreeSet;

use super::decode::text;
use super::dialect::Dialect;
use super::number;

/// What a mark says of a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    Measured,
    Estimated,
    Missing,
    Unknown,
}

const MEASURED: [&str; 20] = [
    "measured",
    "actual",
    "valid",
    "validated",
    "good",
    "ok",
    "true value",
    "gemessen",
    "wahrer wert",
    "gültig",
    "gueltig",
    "mesuré",
    "mesure",
    "réel",
    "reel",
    "real",
    "medido",
    "gemeten",
    "regular",
    "normal",
];
const ESTIMATED: [&str; 24] = [
    "estimated",
    "estimate",
    "est",
    "substituted",
    "substitute",
    "interpolated",
    "interpolation",
    "calculated",
    "geschätzt",
    "geschaetzt",
    "ersatzwert",
    "ersatz",
    "interpoliert",
    "estimé",
    "estime",
    "estimada",
    "estimado",
    "geschat",
    "filled",
    "imputed",
    "forecast",
    "edited",
    "repaired",
    "profiled",
];
const MISSING: [&str; 22] = [
    "missing",
    "invalid",
    "bad",
    "error",
    "fault",
    "failed",
    "null",
    "none",
    "n/a",
    "na",
    "nan",
    "no data",
    "gap",
    "fehlt",
    "fehlend",
    "fehlwert",
    "ungültig",
    "ungueltig",
    "manquant",
    "faltante",
    "ontbrekend",
    "absent",
];

/// How the marks of one column are to be read.
#[derive(Debug, Clone)]
pub(super) struct Quality {
    /// The column.
    pub(super) column: usize,
    /// The one column of values that it speaks of; none = all of the row.
    pub(super) of: Option<usize>,
    letters: Letters,
}

/// What single letters mean depends on the set in use.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Letters {
    /// W (true), E or G (estimated, substituted), V (preliminary), F (missing).
    True,
    /// A (actual), E and S and F (estimated, substituted, final substitute), N (none).
    Actual,
    /// The header asks whether the reading is estimated, or missing, or valid: yes and no answer.
    IsEstimated,
    IsMissing,
    IsValid,
    Unknown,
}

impl Quality {
    /// How to read the marks in a column of the table.
    pub(super) fn new(dialect: &Dialect, column: usize, of: Option<usize>) -> Self {
        let mut seen = BTreeSet::new();
        for (_, record) in &dialect.rows {
            if seen.len() < 64 {
                seen.insert(text(number::trim(record.get(column).unwrap_or(b""))).to_lowercase());
            }
        }
        let header = dialect.headers[column].to_lowercase();
        let letters = if seen.contains("w") {
            Letters::True
        } else if seen.contains("a") {
            Letters::Actual
        } else if header.contains("estimat") || header.contains("ersatz") {
            Letters::IsEstimated
        } else if header.contains("missing") || header.contains("fehl") {
            Letters::IsMissing
        } else if header.contains("valid") {
            Letters::IsValid
        } else {
            Letters::Unknown
        };
        Self { column, of, letters }
    }

    /// What a cell says.
    pub(super) fn mark(&self, cell: &[u8]) -> Mark {
        let cell = number::trim(cell);
        if cell.is_empty() {
            return Mark::Unknown;
        }
        let low = text(cell).to_lowercase();
        let word = low.as_str();
        let yes = matches!(word, "1" | "true" | "yes" | "y" | "ja" | "oui" | "si" | "sí");
        let no = matches!(word, "0" | "false" | "no" | "n" | "nein" | "non");
        match (self.letters, word) {
            (Letters::IsEstimated, _) if yes => Mark::Estimated,
            (Letters::IsEstimated | Letters::IsMissing, _) if no => Mark::Measured,
            (Letters::IsMissing, _) if yes => Mark::Missing,
            (Letters::IsValid, _) if yes => Mark::Measured,
            (Letters::IsValid, _) if no => Mark::Missing,
            (Letters::True, "w") | (Letters::Actual, "a") => Mark::Measured,
            (Letters::True, "f") | (Letters::Actual, "n" | "m") => Mark::Missing,
            (Letters::True, "e" | "g" | "s" | "i") | (Letters::Actual, "e" | "s" | "f" | "i") => {
                Mark::Estimated
            }
            (Letters::Unknown, "e" | "est.") => Mark::Estimated,
            _ if MEASURED.contains(&word) => Mark::Measured,
            _ if ESTIMATED.contains(&word) => Mark::Estimated,
            _ if MISSING.contains(&word) => Mark::Missing,
            _ => Mark::Unknown,
        }
    }
}
