//! Which sheet of a workbook is read.

use csv::ByteRecord;

use super::dialect::{POINT, any_stamp};
use super::number::{self, Cell};
use super::roles::key;
use super::rows::Rows;
use super::{Finding, FindingKind};
use crate::case::RecordCase;
use crate::fault::{Fault, Result, quote};

/// Columns within which a row's stamp is looked for.
const STAMP_COLUMNS: usize = 8;

/// A sheet of a workbook as a text table.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct WorkbookSheet {
    /// The sheet's name.
    pub name: String,
    /// Its cells in UTF-8, tabs between them; row n of the text is row n of the sheet.
    pub text: Vec<u8>,
    /// What was done to its cells, in words; empty if nothing.
    pub note: String,
    /// How many cells are numbers (and not texts that look like numbers).
    pub numbers: u64,
}

/// Takes the sheet that the case names or else the one with the most rows of readings; returns it with the names of all sheets, its own
/// first, and a finding if another one holds readings too.
///
/// # Errors
/// If the sheet named is not there, or no sheet holds readings.
pub(super) fn choose(
    file: &str,
    sheets: Vec<WorkbookSheet>,
    terms: &RecordCase,
) -> Result<(WorkbookSheet, Vec<String>, Option<Finding>)> {
    let listed = || sheets.iter().map(|sheet| quote(&sheet.name)).collect::<Vec<_>>().join(", ");
    let counts: Vec<(u64, u64)> = sheets.iter().map(|sheet| count(&sheet.text)).collect();
    let taken = if let Some((_, wanted)) = terms.sheets.iter().find(|(name, _)| names(name, file)) {
        sheets.iter().position(|sheet| key(&sheet.name) == key(wanted)).ok_or_else(|| {
            Fault::new(
                format!("the workbook {} has no sheet {}; it has {}", quote(file), quote(wanted), listed()),
                "case, at record.sheets",
                "Name one of its sheets, or remove the entry.",
            )
        })?
    } else {
        // The first of several that are equal.
        let best = (0..counts.len()).rev().max_by_key(|at| counts[*at]);
        best.filter(|at| counts[*at] != (0, 0)).ok_or_else(|| {
            Fault::new(
                format!("no sheet of the workbook holds rows of numbers; it has {}", listed()),
                file,
                "Choose the workbook with the readings.",
            )
        })?
    };
    let others: Vec<usize> = (0..sheets.len()).filter(|at| *at != taken && counts[*at].0 > 0).collect();
    let finding = (!others.is_empty() && !terms.sheets.iter().any(|(name, _)| names(name, file))).then(|| {
        let named: Vec<String> = others.iter().map(|at| quote(&sheets[*at].name)).collect();
        Finding {
            kind: FindingKind::Ignored,
            count: others.len() as u64,
            first_row: None,
            file: file.to_owned(),
            remedy: "one sheet read".to_owned(),
            text: format!(
                "The sheet {} was read, as the one with the most rows of readings; {} also hold{} stamps and {} not used (record.sheets chooses).",
                quote(&sheets[taken].name),
                named.join(", "),
                if named.len() == 1 { "s" } else { "" },
                if named.len() == 1 { "was" } else { "were" },
            ),
            changes_figures: true,
        }
    });
    let mut sheets = sheets;
    let sheet = sheets.swap_remove(taken);
    let mut names: Vec<String> = sheets.into_iter().map(|sheet| sheet.name).collect();
    names.insert(0, sheet.name.clone());
    Ok((sheet, names, finding))
}

/// Whether a name in the case means this file, which may lie in an archive.
pub(super) fn names(name: &str, file: &str) -> bool {
    key(name) == key(file) || file.rsplit_once('/').is_some_and(|(_, last)| key(name) == key(last))
}

/// Rows with a stamp and a number, and rows with a number.
fn count(text: &[u8]) -> (u64, u64) {
    let mut rows = Rows::new(text, b'\t');
    let mut record = ByteRecord::new();
    let (mut stamped, mut numbered) = (0, 0);
    while let Ok(Some(_)) = rows.next(&mut record) {
        let number =
            record.iter().take(256).any(|cell| matches!(number::parse(cell, POINT), Cell::Number(_)));
        numbered += u64::from(number);
        stamped +=
            u64::from(number && record.iter().take(STAMP_COLUMNS).any(|cell| any_stamp(cell).is_some()));
    }
    (stamped, numbered)
}
