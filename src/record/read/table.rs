//! A table found: its dialect and shape, and the files that it stands for, one for each channel.

use std::rc::Rc;

use super::super::decode::{Container, Decoded};
use super::super::dialect::{self, Dialect};
use super::super::made::Made;
use super::super::roles;
use super::super::rows::Rows;
use super::super::shape::{self, Channel, Cut, Days, Keys, Shape, Survey};
use super::super::timing::{self, Timing};
use super::{File, Reader, Stage};
use crate::case::{RecordCase, Stamp};
use crate::fault::{Fault, Result};

/// A table whose channels are still to be listed.
pub(super) struct Unsurveyed {
    pub(super) source: usize,
    pub(super) table: Table,
    pub(super) keys: Keys,
}

/// A table whose channels are being listed.
pub(super) struct Surveyed {
    pub(super) source: usize,
    table: Table,
    pub(super) rows: Rows<Decoded>,
    pub(super) survey: Survey,
}

/// What is known of a table before its columns are.
pub(super) struct Table {
    name: String,
    container: Container,
    made: Made,
    dialect: Dialect,
    days: Option<Rc<Days>>,
}

impl Reader {
    /// How a table is written and shaped, and the columns that may name channels.
    pub(super) fn shape(
        &self,
        name: String,
        container: Container,
        head: &[u8],
        made: Made,
    ) -> Result<(Table, Option<Keys>)> {
        let stated;
        let terms = if made.words.is_empty() {
            &self.terms
        } else {
            stated = RecordCase {
                separator: Some('\t'),
                decimal: if made.point { Some('.') } else { self.terms.decimal },
                ..self.terms.clone()
            };
            &stated
        };
        let mut dialect = dialect::decide(&name, head, terms)?;
        if !made.runs.is_empty() {
            // A table made here has one row per reading.
            dialect.renumber(&made.runs);
            return Ok((Table { name, container, made, dialect, days: None }, None));
        }
        let role = |column: usize| roles::stated(&terms.roles, &name, &dialect.headers[column]).copied();
        let (starts, ends) = (terms.stamp == Some(Stamp::Start), terms.stamp == Some(Stamp::End));
        let days = shape::days(&dialect, starts, ends).map(Rc::new);
        let times = match &days {
            Some(days) => vec![days.date],
            None => timing::choose(&name, &dialect, &role, terms.step_s)?.columns(),
        };
        let keys = shape::keys(&dialect, &times, days.as_deref(), &role);
        Ok((Table { name, container, made, dialect, days }, keys))
    }

    /// Begins to list the channels of a table.
    pub(super) fn open_survey(&mut self, unsurveyed: Unsurveyed) -> Result<()> {
        let Unsurveyed { source, table, keys } = unsurveyed;
        let Some(text) = self.sources.get_mut(source).and_then(Option::take) else {
            return Err(Fault::new("a file is no longer there", table.name, "Choose the files again."));
        };
        let rows = Rows::new(Decoded::open(text, &table.container), table.dialect.separator);
        let survey = Survey::new(&table.name, keys, table.dialect.first_row);
        self.stage = Stage::Survey(Box::new(Surveyed { source, table, rows, survey }));
        Ok(())
    }

    /// Takes the channels that a survey found.
    pub(super) fn surveyed(&mut self, surveyed: Surveyed) -> Result<()> {
        let Surveyed { source, table, rows, survey } = surveyed;
        self.sources[source] = Some(rows.into_text().into_source());
        match survey.finish() {
            None => self.add(source, &table, None),
            Some((keys, channels)) => {
                channels.into_iter().try_for_each(|channel| self.add(source, &table, Some((&keys, channel))))
            }
        }
    }

    /// Adds a file: a table as it stands, or one channel of it.
    pub(super) fn add(
        &mut self,
        source: usize,
        table: &Table,
        channel: Option<(&Keys, Channel)>,
    ) -> Result<()> {
        let Table { name, container, made, dialect, days } = table;
        let alone = shape::alone(
            dialect,
            days.as_deref(),
            channel.as_ref().map(|channel| channel.0),
            channel.as_ref().map(|channel| &channel.1),
        );
        let role = |column: usize| roles::stated(&self.terms.roles, name, &alone.headers[column]).copied();
        let timing = match days {
            Some(days) if days.elapsed => Timing::DateElapsed(0, 1),
            Some(_) => Timing::DateClock(0, 1),
            None => timing::choose(name, &alone, &role, self.terms.step_s)?,
        };
        let columns = roles::columns(name, &alone, timing, &self.terms, &self.named)?;
        let cut = channel
            .map(|(keys, channel)| Rc::new(Cut { keys: keys.columns.clone(), wanted: channel.wanted }));
        self.files.push(File {
            name: name.clone(),
            source,
            container: container.clone(),
            made: made.clone(),
            dialect: alone,
            shape: Shape { days: days.clone(), cut },
            timing,
            columns,
            scanned: None,
            late: false,
            late_why: String::new(),
            typical: false,
            years: Vec::new(),
        });
        Ok(())
    }
}
