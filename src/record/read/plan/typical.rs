//! Series of a typical year: without a year, put together from months of several years, or of another year than the rest.

use super::super::super::stamp::{DAY, NO_YEAR, date_of, days};
use super::super::super::{Finding, FindingKind, Role};
use super::super::{File, Reader};

/// Most years that a typical year is laid on.
const MOST_YEARS: i64 = 200;

/// Why a file is that of a typical year.
enum Why {
    Yearless,
    Mixed,
    Apart,
}

impl File {
    /// Whether the stamps state no year.
    pub(super) fn yearless(&self) -> bool {
        self.scanned.as_ref().is_some_and(|scanned| scanned.yearless)
    }

    /// First and last instant of the stamps.
    fn ends(&self) -> Option<(i64, i64)> {
        let blocks = &self.scanned.as_ref()?.stats.blocks;
        Some((
            blocks.values().map(|block| block.least).min()?,
            blocks.values().map(|block| block.most).max()?,
        ))
    }

    /// Whether leaps join months of several years to one year.
    fn mixed(&self) -> bool {
        let Some(scanned) = &self.scanned else { return false };
        let leaps = &scanned.stats.leaps;
        // At least two leaps, each to the day of another year that follows in the calendar.
        let of_year = |instant: i64| {
            let (year, _, _) = date_of(instant.div_euclid(DAY));
            instant - days(year, 1, 1).unwrap_or(0) * DAY
        };
        leaps.len() >= 2
            && leaps.iter().all(|(before, after)| {
                // 29 February shifts the days of a year by one.
                (of_year(*after) - of_year(*before)).rem_euclid(365 * DAY) <= 3 * DAY
            })
    }

    fn has(&self, roles: &[Role]) -> bool {
        self.columns.iter().any(|column| roles.contains(&column.role) && !column.into.is_empty())
    }
}

impl Reader {
    /// Finds the files of a typical year and the years that they are laid on. Returns the record's span where only such
    /// files are there.
    pub(super) fn typical_years(&mut self) -> Option<(i64, i64)> {
        let mut found: Vec<Option<Why>> = self
            .files
            .iter()
            .map(|file| {
                if file.yearless() {
                    Some(Why::Yearless)
                } else if file.mixed() {
                    Some(Why::Mixed)
                } else {
                    None
                }
            })
            .collect();
        let use_roles = [Role::Demand, Role::Import, Role::NetImport, Role::NetExport, Role::Export];
        let meters: Vec<(i64, i64)> = self
            .files
            .iter()
            .zip(&found)
            .filter(|(file, why)| why.is_none() && file.has(&use_roles))
            .filter_map(|(file, _)| file.ends())
            .collect();
        let span = meters.iter().copied().reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)));
        if let Some(span) = span {
            for (file, why) in self.files.iter().zip(&mut found) {
                let generates = file.has(&[Role::Supply, Role::Generation]) && !file.has(&use_roles);
                let apart = file.ends().is_some_and(|ends| ends.1 < span.0 || ends.0 > span.1);
                let months = file.ends().is_some_and(|ends| ends.1 - ends.0 >= 20 * DAY);
                if why.is_none() && generates && apart && months && !file.timing.counted() {
                    *why = Some(Why::Apart);
                }
            }
        }
        if found.iter().all(Option::is_none) {
            return None;
        }
        let anchors = self
            .files
            .iter()
            .zip(&found)
            .filter(|(_, why)| why.is_none())
            .filter_map(|(file, _)| file.ends());
        let anchored = anchors.reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)));
        let year_of = |instant: i64| date_of(instant.div_euclid(DAY)).0;
        let mut whole = None;
        let years: Vec<i64> = if let Some((least, most)) = anchored {
            // A day to either side, for the zones.
            let first = year_of(least - DAY);
            (first..=year_of(most + DAY).min(first + MOST_YEARS)).collect()
        } else if found.iter().all(|why| matches!(why, Some(Why::Yearless))) {
            // One common year that no file names: the stamps stand as they are.
            Vec::new()
        } else {
            let mut starts = self.files.iter().filter_map(|file| Some(file.scanned.as_ref()?.stats.ends?.0));
            let year = starts.next().map_or(NO_YEAR, year_of);
            let bound = |year: i64| days(year, 1, 1).map(|day| day * DAY);
            whole = bound(year).zip(bound(year + 1));
            vec![year]
        };
        for (file, why) in self.files.iter_mut().zip(&found) {
            let Some(why) = why else { continue };
            file.typical = !years.is_empty();
            file.years.clone_from(&years);
            let what = match why {
                Why::Yearless => "The stamps state no year",
                Why::Mixed => "The stamps join months of several years",
                Why::Apart => "The series is of another year than the meter's",
            };
            let how = match (years.first(), years.last()) {
                (Some(first), Some(last)) if first != last && anchored.is_some() => {
                    "it is laid on the record's years by month, day and time of day (29 February as 28 February where it has none)".to_owned()
                }
                (Some(_), _) if anchored.is_some() => {
                    "it is laid on the record's year by month, day and time of day (29 February as 28 February where it has none)".to_owned()
                }
                (Some(year), _) => format!("they are laid on {year}"),
                (None, _) => "2001 stands in its place".to_owned(),
            };
            let consequence = if anchored.is_some() {
                " Weather and load do not coincide: a cloudy week of one meets a mild week of the other only by chance."
            } else {
                ""
            };
            self.findings.push(Finding {
                kind: FindingKind::TypicalYear,
                count: 1,
                first_row: None,
                file: file.name.clone(),
                remedy: "laid on the calendar".to_owned(),
                text: format!("{what}: {how}.{consequence}"),
                changes_figures: anchored.is_some(),
            });
        }
        whole
    }
}
