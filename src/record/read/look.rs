//! The first stage: what each file is, and the tables that it holds.

use std::collections::VecDeque;

use super::super::archive::{self, Archive};
use super::super::decode::{self, Container, Decoded, Kind};
use super::super::made::Made;
use super::super::sheets::{self, WorkbookSheet};
use super::super::{Finding, FindingKind, Memory, Source, nem12, usage_xml};
use super::Reader;
use super::table::Unsurveyed;
use crate::fault::{Fault, Result, quote};

/// Largest workbook (bytes).
const MOST_WORKBOOK: u64 = 256 << 20;

/// Entries of an archive that a finding names.
const MOST_NAMED: usize = 6;

/// A file that is still to be looked at.
struct Waiting {
    source: Box<dyn Source>,
    /// The archive that it lies in, by its place in the list.
    within: Option<usize>,
}

/// An archive whose entries are being looked at.
struct Opened {
    name: String,
    /// Entries that are still to be looked at.
    left: usize,
    found: usize,
    /// Entries that are no table, and why.
    ignored: Vec<(String, String)>,
}

/// A workbook on its way to text tables.
enum Workbook {
    None,
    /// Its bytes, for whoever can read them.
    Asked(Vec<u8>),
    Taken,
    Given(Result<Vec<WorkbookSheet>>),
}

/// Turns the bytes of a workbook into its sheets.
type BookReader = fn(Vec<u8>) -> Result<Vec<WorkbookSheet>>;

/// What there is to look at.
pub(super) struct Look {
    queue: VecDeque<Waiting>,
    archives: Vec<Opened>,
    /// Files that are no table.
    refused: Vec<Box<dyn Source>>,
    /// Tables whose channels are still to be listed.
    pub(super) surveys: VecDeque<Unsurveyed>,
    workbook: Workbook,
    /// The workbook that is waited for, by its name and the archive that it lies in.
    awaited: Option<(String, Option<usize>)>,
    /// Names of the workbooks that were read.
    workbooks: Vec<String>,
    /// Reads workbooks, where it is part of this program.
    reader: Option<BookReader>,
}

impl Look {
    pub(super) fn new(sources: Vec<Box<dyn Source>>) -> Self {
        #[cfg(feature = "sheets")]
        let reader: Option<BookReader> = Some(super::super::workbook_sheets);
        #[cfg(not(feature = "sheets"))]
        let reader = None;
        Self {
            queue: sources.into_iter().map(|source| Waiting { source, within: None }).collect(),
            archives: Vec::new(),
            refused: Vec::new(),
            surveys: VecDeque::new(),
            workbook: Workbook::None,
            awaited: None,
            workbooks: Vec::new(),
            reader,
        }
    }

    pub(super) fn into_sources(self) -> impl Iterator<Item = Box<dyn Source>> {
        self.refused.into_iter().chain(self.queue.into_iter().map(|waiting| waiting.source))
    }
}

impl Reader {
    /// Leaves workbooks to the caller, as a program does that has no reader of them: see [`Reader::workbook`].
    #[must_use]
    pub fn without_workbooks(mut self) -> Self {
        self.look.reader = None;
        self
    }

    /// The bytes of a workbook that the caller has to turn into text tables, once for each: the reading waits until
    /// [`Reader::give_sheets`] brings them. None while there is nothing to do.
    pub fn workbook(&mut self) -> Option<Vec<u8>> {
        match std::mem::replace(&mut self.look.workbook, Workbook::Taken) {
            Workbook::Asked(bytes) => Some(bytes),
            other => {
                self.look.workbook = other;
                None
            }
        }
    }

    /// Brings the sheets of the workbook that was asked for, or why there are none.
    pub fn give_sheets(&mut self, sheets: Result<Vec<WorkbookSheet>>) {
        if matches!(self.look.workbook, Workbook::Taken) {
            self.look.workbook = Workbook::Given(sheets);
        }
    }

    /// Whether the reading waits for the sheets of a workbook.
    pub(super) fn waits(&self) -> bool {
        matches!(self.look.workbook, Workbook::Asked(_) | Workbook::Taken)
    }

    /// Looks at the next file; true once there is none left.
    pub(super) fn look(&mut self) -> Result<bool> {
        match std::mem::replace(&mut self.look.workbook, Workbook::None) {
            Workbook::None => {}
            Workbook::Asked(_) => {
                return Err(Fault::new(
                    "this program has no reader of workbooks",
                    self.look.awaited.take().map_or_else(String::new, |awaited| awaited.0),
                    "Save the sheet with the readings as CSV and choose that file.",
                ));
            }
            Workbook::Taken => {
                self.look.workbook = Workbook::Taken;
                return Ok(false);
            }
            Workbook::Given(sheets) => {
                if let Some((name, within)) = self.look.awaited.take() {
                    let looked = self.sheets(&name, sheets);
                    self.looked(&name, within, looked)?;
                }
            }
        }
        if let Some(Waiting { source, within }) = self.look.queue.pop_front() {
            let name = source.name().to_owned();
            let looked = self.look_at(source, within);
            if !self.waits() {
                self.looked(&name, within, looked)?;
            }
        }
        if self.waits() || !self.look.queue.is_empty() {
            return Ok(false);
        }
        if let Some(name) = self
            .terms
            .sheets
            .keys()
            .find(|name| !self.look.workbooks.iter().any(|file| sheets::names(name, file)))
        {
            return Err(Fault::new(
                format!("no workbook is named {}", quote(name)),
                "case, at record.sheets",
                "Correct the name, or remove the entry.",
            ));
        }
        Ok(true)
    }

    /// Notes what came of a file; within an archive it need not be a table.
    fn looked(&mut self, name: &str, within: Option<usize>, looked: Result<()>) -> Result<()> {
        let Some(archive) = within.and_then(|at| self.look.archives.get_mut(at)) else { return looked };
        archive.left -= 1;
        match looked {
            Ok(()) => archive.found += 1,
            Err(fault) => {
                let path = name.strip_prefix(&archive.name).unwrap_or(name).trim_start_matches('/');
                archive.ignored.push((path.to_owned(), fault.what));
            }
        }
        if archive.left > 0 {
            return Ok(());
        }
        let named = |most: usize| {
            let mut list: Vec<String> = archive
                .ignored
                .iter()
                .take(most)
                .map(|(path, why)| format!("{} ({why})", quote(path)))
                .collect();
            if archive.ignored.len() > most {
                list.push(format!("{} more", archive.ignored.len() - most));
            }
            list.join(", ")
        };
        if archive.found == 0 {
            return Err(Fault::new(
                format!("the archive holds no table of readings; it holds {}", named(MOST_NAMED)),
                archive.name.clone(),
                "Choose the archive or the file that holds the readings.",
            ));
        }
        if !archive.ignored.is_empty() {
            let count = archive.ignored.len();
            self.findings.push(Finding {
                kind: FindingKind::Ignored,
                count: count as u64,
                first_row: None,
                file: archive.name.clone(),
                remedy: "left out".to_owned(),
                text: format!(
                    "{count} file{} in the archive {} no table of readings: {}.",
                    if count == 1 { "" } else { "s" },
                    if count == 1 { "is" } else { "are" },
                    named(MOST_NAMED)
                ),
                changes_figures: false,
            });
        }
        Ok(())
    }

    fn look_at(&mut self, source: Box<dyn Source>, within: Option<usize>) -> Result<()> {
        let name = source.name().to_owned();
        let (source, looked) = decode::look(source);
        let (container, head) = match looked {
            Ok(looked) => looked,
            Err(fault) => {
                self.look.refused.push(source);
                return Err(fault);
            }
        };
        match container.kind {
            Kind::Text => self.table(source, container, &head, Made::default()),
            Kind::Zip => self.archive(source, within),
            Kind::Compound => {
                let mut source = source;
                let bytes = archive::whole(source.as_mut(), MOST_WORKBOOK)?;
                self.ask(name, within, bytes)
            }
            Kind::Nem12 | Kind::Usage => {
                let text = Decoded::open(source, &container);
                let make = if container.kind == Kind::Nem12 { nem12::tables } else { usage_xml::tables };
                for (text, made) in make(text, self.terms.stamp.unwrap_or_default(), &mut self.findings)? {
                    self.made_table(&name, text, made)?;
                }
                Ok(())
            }
        }
    }

    /// A zip archive: a workbook, or an archive of files that are looked at one by one.
    fn archive(&mut self, source: Box<dyn Source>, within: Option<usize>) -> Result<()> {
        let archive = Archive::open(source)?;
        let name = archive.name.clone();
        let kind = archive.small("mimetype")?.unwrap_or_default();
        if archive.holds("xl/workbook.bin") {
            // Some of its kinds of cells are not known to the reader, which would pass over them without a word.
            return Err(Fault::new(
                "the file is a binary workbook (.xlsb), which is not read here",
                name,
                "Save it as .xlsx and choose that file.",
            ));
        }
        if archive.holds("xl/workbook.xml")
            || kind.starts_with(b"application/vnd.oasis.opendocument.spreadsheet")
        {
            archive.check()?;
            return self.ask(name, within, archive.bytes(MOST_WORKBOOK)?);
        }
        if archive.holds("[Content_Types].xml") || archive.holds("META-INF/manifest.xml") {
            return Err(Fault::new(
                "the file is an office document, not a workbook",
                name,
                "Choose the workbook or text table with the readings.",
            ));
        }
        if within.is_some() {
            return Err(Fault::new(
                "it is an archive within the archive",
                name,
                "Unpack it and choose the files inside.",
            ));
        }
        if archive.entries.is_empty() {
            return Err(Fault::new("the archive is empty", name, "Choose the file that holds the readings."));
        }
        let at = self.look.archives.len();
        // Copies that a system leaves beside the files for itself.
        let (own, entries): (Vec<_>, Vec<_>) = archive
            .entries
            .iter()
            .partition(|entry| entry.path.split('/').any(|part| part == "__MACOSX" || part.starts_with('.')));
        let ignored = own.iter().map(|entry| (entry.path.clone(), "a hidden file of a system".to_owned()));
        self.look.archives.push(Opened {
            name: archive.name.clone(),
            left: entries.len(),
            found: 0,
            ignored: ignored.collect(),
        });
        if entries.is_empty() {
            return Err(Fault::new(
                "the archive holds nothing but hidden files",
                name,
                "Choose the file that holds the readings.",
            ));
        }
        let mut first = vec![0; decode::HEAD];
        let mut sources = Vec::with_capacity(entries.len());
        for entry in entries {
            let mut source = archive.entry(entry)?;
            // Damage is a fault of the archive, whatever the entry may be.
            let mut count = 0;
            while count < first.len() {
                match source.read_at(count as u64, &mut first[count..])? {
                    0 => break,
                    more => count += more,
                }
            }
            sources.push(source);
        }
        for source in sources.into_iter().rev() {
            self.look.queue.push_front(Waiting { source: Box::new(source), within: Some(at) });
        }
        Ok(())
    }

    /// Tells of characters that were left out because nobody sees them.
    pub(super) fn hidden(&mut self, at: usize, count: u64) {
        // The channels of a table share its characters.
        let again = at > 0 && self.files[at - 1].source == self.files[at].source;
        if count == 0 || again {
            return;
        }
        self.findings.push(Finding {
            kind: FindingKind::Ignored,
            count,
            first_row: None,
            file: self.files[at].name.clone(),
            remedy: "left out".to_owned(),
            text: format!(
                "{count} character{} that cannot be seen (zero-width spaces, marks of direction or of byte order) {} left out.",
                if count == 1 { "" } else { "s" },
                if count == 1 { "was" } else { "were" }
            ),
            changes_figures: false,
        });
    }

    /// Has a workbook turned into text tables, here or by the caller.
    fn ask(&mut self, name: String, within: Option<usize>, bytes: Vec<u8>) -> Result<()> {
        if let Some(reader) = self.look.reader {
            return self.sheets(&name, reader(bytes));
        }
        self.look.workbook = Workbook::Asked(bytes);
        self.look.awaited = Some((name, within));
        Ok(())
    }

    fn sheets(&mut self, name: &str, sheets: Result<Vec<WorkbookSheet>>) -> Result<()> {
        let sheets = sheets.map_err(|fault| Fault { place: name.to_owned(), ..fault })?;
        let (sheet, names, finding) = sheets::choose(name, sheets, &self.terms)?;
        self.look.workbooks.push(name.to_owned());
        self.findings.extend(finding);
        let mut words = format!("workbook, sheet {} of {}", quote(&sheet.name), names.len());
        if !sheet.note.is_empty() {
            words = format!("{words}, {}", sheet.note);
        }
        let made = Made { words, sheets: names, point: sheet.numbers > 0, ..Made::default() };
        let WorkbookSheet { text, .. } = sheet;
        self.made_table(name, text, made)
    }

    /// A table made from another kind of file.
    fn made_table(&mut self, name: &str, text: impl Into<Vec<u8>>, made: Made) -> Result<()> {
        let (source, looked) = decode::look(Box::new(Memory::new(name, text)));
        let (container, head) = looked?;
        let mut container = container;
        container.words.clone_from(&made.words);
        self.table(source, container, &head, made)
    }

    /// A text table: its dialect, stamps and columns.
    fn table(
        &mut self,
        source: Box<dyn Source>,
        container: Container,
        head: &[u8],
        made: Made,
    ) -> Result<()> {
        let name = source.name().to_owned();
        let at = self.sources.len();
        let looked = self.shape(name, container, head, made).and_then(|(table, keys)| match keys {
            Some(keys) => {
                self.look.surveys.push_back(Unsurveyed { source: at, table, keys });
                Ok(())
            }
            None => self.add(at, &table, None),
        });
        match looked {
            Ok(()) => self.sources.push(Some(source)),
            Err(_) => self.look.refused.push(source),
        }
        looked
    }
}
