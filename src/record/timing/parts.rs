//! Stamps whose year, month, day and hour stand in columns of their own.

use super::super::dialect::Dialect;
use super::Profile;

/// Columns of the parts of a stamp.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::record) struct Parts {
    pub(super) year: Option<usize>,
    pub(super) month: usize,
    pub(super) day: usize,
    pub(super) hour: Option<usize>,
    pub(super) minute: Option<usize>,
    /// Number of the day's first hour.
    pub(super) first: i64,
}

impl Parts {
    pub(super) fn columns(self) -> impl Iterator<Item = usize> {
        [self.year, Some(self.month), Some(self.day), self.hour, self.minute].into_iter().flatten()
    }
}

/// Columns headed year, month, day and hour, whose numbers can be that.
pub(super) fn parts(dialect: &Dialect, profiles: &[Profile], free: &dyn Fn(&usize) -> bool) -> Option<Parts> {
    let find = |names: &[&str], least: f64, most: f64| {
        (0..profiles.len()).find(|column| {
            let header = dialect.headers[*column].to_lowercase();
            let mut words = header.split(|c: char| !c.is_alphanumeric()).filter(|word| !word.is_empty());
            let profile = &profiles[*column];
            free(column)
                && words.any(|word| names.contains(&word))
                && profile.mostly(profile.values.len())
                && profile.values.iter().all(|value| (least..=most).contains(value))
        })
    };
    let month = find(&["month", "mo", "monat", "mois", "mes", "maand", "mm"], 1.0, 12.0)?;
    let day = find(&["day", "dy", "tag", "jour", "dia", "día", "dag", "dd"], 1.0, 31.0)?;
    let year = find(&["year", "yr", "jahr", "année", "annee", "año", "jaar", "yyyy"], 0.0, 9999.0);
    let hour = find(&["hour", "hr", "stunde", "heure", "hora", "uur", "hh", "h"], 0.0, 24.0);
    let minute = find(&["minute", "min", "minuto", "mi"], 0.0, 60.0);
    let first = hour.map_or(0, |hour| {
        let values = &profiles[hour].values;
        i64::from(values.contains(&24.0) && !values.contains(&0.0))
    });
    Some(Parts { year, month, day, hour, minute, first })
}
