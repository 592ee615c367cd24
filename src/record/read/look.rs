//! The first look at a source: its container, dialect and shape, and the files that it stands for.

use std::rc::Rc;

use super::super::decode::{self, Container, Decoded};
use super::super::dialect::{self, Dialect};
use super::super::roles;
use super::super::rows::Rows;
use super::super::shape::{self, Channel, Cut, Days, Keys, Shape, Survey};
use super::super::timing::{self, Timing};
use super::{File, Reader};
use crate::case::Stamp;
use crate::fault::Result;

/// A source whose channels are being listed.
pub(super) struct Surveyed {
    name: String,
    container: Container,
    dialect: Dialect,
    days: Option<Rc<Days>>,
    pub(super) rows: Rows<Decoded>,
    pub(super) survey: Survey,
}

impl Reader {
    /// Looks at the head of the source at hand; returns what must be surveyed before more can be said.
    pub(super) fn look(&mut self) -> Result<Option<Box<Surveyed>>> {
        let Some(source) = self.sources.get_mut(self.at).and_then(Option::take) else { return Ok(None) };
        let name = source.name().to_owned();
        let (source, looked) = decode::look(source);
        self.sources[self.at] = Some(source);
        let (container, head) = looked?;
        let dialect = dialect::decide(&name, &head, &self.terms)?;
        let stated =
            |column: usize| roles::stated(&self.terms.roles, &name, &dialect.headers[column]).copied();
        let (starts, ends) = (self.terms.stamp == Some(Stamp::Start), self.terms.stamp == Some(Stamp::End));
        let days = shape::days(&dialect, starts, ends).map(Rc::new);
        let times = match &days {
            Some(days) => vec![days.date],
            None => timing::choose(&name, &dialect, &stated, self.terms.step_s)?.columns(),
        };
        let keys = shape::keys(&dialect, &times, days.as_deref(), &stated);
        if let Some(keys) = keys
            && let Some(source) = self.sources[self.at].take()
        {
            let rows = Rows::new(Decoded::open(source, &container), dialect.separator);
            let survey = Survey::new(&name, keys, dialect.first_row);
            return Ok(Some(Box::new(Surveyed { name, container, dialect, days, rows, survey })));
        }
        self.add(&name, &container, &dialect, days, None)?;
        Ok(None)
    }

    /// Takes the channels that a survey found.
    pub(super) fn surveyed(&mut self, surveyed: Surveyed) -> Result<()> {
        let Surveyed { name, container, dialect, days, rows, survey } = surveyed;
        self.sources[self.at] = Some(rows.into_text().into_source());
        match survey.finish() {
            None => self.add(&name, &container, &dialect, days, None),
            Some((keys, channels)) => {
                for channel in channels {
                    self.add(&name, &container, &dialect, days.clone(), Some((&keys, channel)))?;
                }
                Ok(())
            }
        }
    }

    /// Adds a file: a source as it stands, or one channel of it.
    fn add(
        &mut self,
        name: &str,
        container: &Container,
        dialect: &Dialect,
        days: Option<Rc<Days>>,
        channel: Option<(&Keys, Channel)>,
    ) -> Result<()> {
        let alone = shape::alone(
            dialect,
            days.as_deref(),
            channel.as_ref().map(|channel| channel.0),
            channel.as_ref().map(|channel| &channel.1),
        );
        let stated = |column: usize| roles::stated(&self.terms.roles, name, &alone.headers[column]).copied();
        let timing = match &days {
            Some(days) if days.elapsed => Timing::DateElapsed(0, 1),
            Some(_) => Timing::DateClock(0, 1),
            None => timing::choose(name, &alone, &stated, self.terms.step_s)?,
        };
        let columns = roles::columns(name, &alone, timing, &self.terms, &self.named)?;
        let cut = channel
            .map(|(keys, channel)| Rc::new(Cut { keys: keys.columns.clone(), wanted: channel.wanted }));
        self.files.push(File {
            name: name.to_owned(),
            source: self.at,
            container: container.clone(),
            dialect: alone,
            shape: Shape { days, cut },
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
