//! The worker's side: holds the files and the record, works one slice per turn of its loop, and answers.

use std::cell::RefCell;
use std::rc::Rc;

use gloo::events::EventListener;
use js_sys::{Array, Function, Reflect, Uint8Array, global};
use wasm_bindgen::{JsCast, JsValue};
use web_sys::{DedicatedWorkerGlobalScope, File, MessageChannel, MessageEvent, MessagePort};

use millpond::case::{CarriedFile, Case, RecordCase};
use millpond::fault::{Fault, Result};
use millpond::job::Job;
use millpond::record::{self, Record, Source, WorkbookSheet};
use millpond::sheet::{Lay, View};
use millpond::technology::Catalogue;

use super::blob::BlobSource;
use super::{Act, Answer, Progress, Request, workbook};

/// How long a slice should take, ms: short enough to hear the next request at once.
const SLICE_MS: f64 = 16.0;
/// How often progress is told, ms.
const TELL_MS: f64 = 100.0;
/// Budget of the first slice, and its bounds.
const BUDGETS: (usize, usize, usize) = (2_000, 20_000, 200_000_000);

/// Serves the page from inside a worker: listens, and works when there is work.
pub(crate) fn serve(scope: &DedicatedWorkerGlobalScope) {
    let Ok(channel) = MessageChannel::new() else {
        super::log("this browser has no message channels");
        return;
    };
    let turns = channel.port1();
    let worker = Rc::new(RefCell::new(Worker {
        scope: scope.clone(),
        next: channel.port2(),
        site: String::new(),
        files: Vec::new(),
        case: Case::default(),
        view: View::default(),
        revision: 0,
        record: None,
        catalogue: None,
        work: None,
        books: Books::default(),
        budget: BUDGETS.1,
        told_ms: 0.0,
    }));

    let heard = Rc::clone(&worker);
    EventListener::new(scope, "message", move |event| {
        if let Some(event) = event.dyn_ref::<MessageEvent>() {
            heard.borrow_mut().hear(&event.data());
        }
    })
    .forget();

    // A message to itself comes after the messages that are already waiting, without the delay that timers have.
    EventListener::new(&turns, "message", move |_| worker.borrow_mut().turn()).forget();
    turns.start();
    // The first sign of life: the page waits for it before it takes silence for a hang.
    if let Ok(envelope) = super::envelope(&Answer::Pong) {
        let _ = scope.post_message(&envelope);
    }
}

/// Tells the page that this worker is done for; the browser's own error event may come without words.
pub(crate) fn last_words(scope: &DedicatedWorkerGlobalScope, text: String) {
    // If even this fails, the page's watch over the worker will notice.
    let _ = super::envelope(&Answer::Died { text }).and_then(|envelope| scope.post_message(&envelope));
}

struct Worker {
    scope: DedicatedWorkerGlobalScope,
    next: MessagePort,
    site: String,
    files: Vec<File>,
    case: Case,
    view: View,
    revision: u32,
    /// The record, and the terms it was read by.
    record: Option<(Rc<Record>, Terms)>,
    catalogue: Option<Rc<Catalogue>>,
    work: Option<Work>,
    books: Books,
    budget: usize,
    told_ms: f64,
}

/// What the reading of a record depends on: the case's part, and the columns that the duty names.
#[derive(PartialEq)]
struct Terms {
    case: RecordCase,
    named: Vec<String>,
}

impl Terms {
    fn of(case: &Case) -> Self {
        Self { case: case.record.clone(), named: case.duty.columns() }
    }
}

/// The workbooks among the files, in the order in which the reading comes to them.
#[derive(Default)]
struct Books {
    /// The sheets of those that were read before: they are kept for the next reading of the same files.
    read: Vec<Vec<WorkbookSheet>>,
    /// How many the reading has come to.
    at: usize,
    /// The number of the last question, and whether the work waits for its answer.
    asked: u32,
    waits: bool,
}

enum Work {
    Reading(Box<record::Reader>),
    Laying(Box<Lay>),
}

impl Worker {
    fn hear(&mut self, data: &JsValue) {
        if let Some((id, sheets)) = workbook::answer(data) {
            return self.take_sheets(id, sheets);
        }
        // The start of the worker (the compiled module) also comes as a message; it has no envelope.
        let Ok(request) = super::open::<Request>(data) else { return };
        match request {
            Request::Open { revision, site, case, view } => {
                self.files = files_beside(data);
                self.record = None;
                self.books.read.clear();
                (self.site, self.view, self.revision) = (site, view, revision);
                self.begin_with(&case);
            }
            Request::Change { revision, case, view } => {
                (self.view, self.revision) = (view, revision);
                self.begin_with(&case);
            }
            Request::ReadCase { errand, name, text } => self.read_case(errand, &name, &text),
            Request::Pack { errand, case } => {
                let packed = pack(&case, &files_beside(data));
                self.answer(&match packed {
                    Ok(text) => Answer::Packed { errand, text },
                    Err(fault) => Answer::Failed { errand, fault },
                });
            }
            Request::Keep { number, act } => keep(self.scope.clone(), number, act, super::list(data, "kept")),
            Request::Look { revision, view } => {
                (self.view, self.revision) = (view, revision);
                self.begin();
            }
            Request::Stop => self.work = None,
            Request::Ping => self.answer(&Answer::Pong),
        }
    }

    fn begin_with(&mut self, case: &str) {
        match Case::from_json(case) {
            Ok(case) => {
                self.case = case;
                self.begin();
            }
            Err(fault) => self.fail(fault),
        }
    }

    /// Reads a case file whole, or says what is wrong with it.
    fn read_case(&self, errand: u32, name: &str, text: &str) {
        let read = || -> Result<(String, Vec<String>, Array)> {
            let mut case = Case::from_json(text)?;
            let (mut names, bytes) = (Vec::new(), Array::new());
            for file in std::mem::take(&mut case.files) {
                bytes.push(&Uint8Array::from(file.unpack()?.as_slice()));
                names.push(file.name);
            }
            Ok((case.to_json()?, names, bytes))
        };
        match read() {
            Ok((case, names, bytes)) => {
                let posted = super::envelope(&Answer::Case { errand, case, names }).and_then(|envelope| {
                    super::beside(&envelope, "files", &bytes)?;
                    self.scope.post_message(&envelope)
                });
                if let Err(error) = posted {
                    self.undelivered(&error);
                }
            }
            Err(fault) => {
                let place = &fault.place;
                let within = place.strip_prefix("case file").or_else(|| place.strip_prefix("case"));
                let fault = Fault { place: format!("{name}{}", within.unwrap_or_default()), ..fault };
                self.answer(&Answer::Failed { errand, fault });
            }
        }
    }

    /// Begins what the case asks for now, in place of whatever was being done.
    fn begin(&mut self) {
        if self.files.is_empty() {
            self.work = None;
            return;
        }
        let was_idle = self.work.is_none();
        let terms = Terms::of(&self.case);
        let kept = self
            .record
            .as_ref()
            .filter(|(_, read_by)| *read_by == terms)
            .map(|(record, _)| Rc::clone(record));
        let work = match kept {
            Some(record) => self.lay(record),
            None => self.read(&terms),
        };
        match work {
            Ok(work) => {
                self.work = Some(work);
                // While the work waits for a workbook there is no turn on its way.
                let waited = std::mem::take(&mut self.books.waits);
                self.books.at = 0;
                if was_idle || waited {
                    self.go_on();
                }
            }
            Err(fault) => self.fail(fault),
        }
    }

    fn read(&self, terms: &Terms) -> Result<Work> {
        let sources = self
            .files
            .iter()
            .map(|file| BlobSource::new(file.clone()).map(|source| Box::new(source) as Box<dyn Source>))
            .collect::<Result<Vec<_>>>()?;
        let reader = record::read(&self.site, sources, &terms.case, &terms.named)?;
        Ok(Work::Reading(Box::new(reader.without_workbooks())))
    }

    fn lay(&mut self, record: Rc<Record>) -> Result<Work> {
        // Parsed once, at the first need: every later sheet is laid from the same one.
        let catalogue = match &self.catalogue {
            Some(catalogue) => Rc::clone(catalogue),
            None => Rc::clone(self.catalogue.insert(Rc::new(Catalogue::published()?))),
        };
        Ok(Work::Laying(Box::new(Lay::new(record, self.case.clone(), self.view.clone(), catalogue))))
    }

    /// If the reading has come to a workbook: gives it the sheets, or asks for them; true if it has to wait.
    fn waits_for_sheets(&mut self) -> bool {
        let Some(Work::Reading(job)) = &mut self.work else { return false };
        let Some(bytes) = job.workbook() else { return false };
        let at = self.books.at;
        self.books.at += 1;
        if let Some(sheets) = self.books.read.get(at) {
            job.give_sheets(Ok(sheets.clone()));
            return false;
        }
        self.books.asked += 1;
        self.books.waits = true;
        if let Err(error) = workbook::ask(&self.scope, self.books.asked, &bytes) {
            self.undelivered(&error);
        }
        true
    }

    fn take_sheets(&mut self, id: u32, sheets: Result<Vec<WorkbookSheet>>) {
        // An answer to a reading that was left off meanwhile.
        if id != self.books.asked || !std::mem::take(&mut self.books.waits) {
            return;
        }
        let Some(Work::Reading(job)) = &mut self.work else { return };
        if let Ok(sheets) = &sheets {
            self.books.read.push(sheets.clone());
        }
        job.give_sheets(sheets);
        self.go_on();
    }

    /// One slice.
    fn turn(&mut self) {
        let started = now_ms();
        let Some(work) = &mut self.work else { return };
        let (progress, reading) = match work {
            Work::Reading(job) => (job.progress(), true),
            Work::Laying(job) => (job.progress(), false),
        };
        let step = match work {
            Work::Reading(job) => job.advance(self.budget).map(|record| record.map(Done::Record)),
            Work::Laying(job) => {
                job.advance(self.budget).map(|sheet| sheet.map(|sheet| Done::Sheet(Box::new(sheet))))
            }
        };
        let ended = now_ms();
        self.adapt(ended - started);
        match step {
            Ok(None) => {
                if self.waits_for_sheets() {
                    return;
                }
                if ended - self.told_ms >= TELL_MS {
                    self.told_ms = ended;
                    let progress = Progress { reading, what: progress.what.to_owned(), done: progress.done };
                    self.answer(&Answer::Progress { revision: self.revision, progress });
                }
                self.go_on();
            }
            Ok(Some(Done::Record(record))) => {
                let record = Rc::new(record);
                self.record = Some((Rc::clone(&record), Terms::of(&self.case)));
                match self.lay(record) {
                    Ok(work) => {
                        self.work = Some(work);
                        self.go_on();
                    }
                    Err(fault) => self.fail(fault),
                }
            }
            Ok(Some(Done::Sheet(sheet))) => {
                self.work = None;
                self.deliver(sheet);
            }
            Err(fault) => self.fail(fault),
        }
    }

    /// Moves the budget towards slices of the wished length; one slow slice (a first touch of memory, a pause of the
    /// browser) must not throw it off, so it moves by at most a factor of two.
    fn adapt(&mut self, took_ms: f64) {
        let factor = (SLICE_MS / took_ms.max(1.0)).clamp(0.5, 2.0);
        self.budget = ((self.budget as f64 * factor) as usize).clamp(BUDGETS.0, BUDGETS.2);
    }

    fn go_on(&self) {
        if self.next.post_message(&JsValue::NULL).is_err() {
            super::log("the worker cannot post to itself");
        }
    }

    fn fail(&mut self, fault: Fault) {
        self.work = None;
        self.answer(&Answer::Fault { revision: self.revision, fault });
    }

    fn deliver(&self, mut sheet: Box<millpond::sheet::Sheet>) {
        let (columns, buffers) = super::take_columns(&mut sheet);
        let posted =
            super::envelope(&Answer::Sheet { revision: self.revision, sheet }).and_then(|envelope| {
                super::beside(&envelope, "columns", &columns)?;
                self.scope.post_message_with_transfer(&envelope, &buffers)
            });
        if let Err(error) = posted {
            self.undelivered(&error);
        }
    }

    fn answer(&self, answer: &Answer) {
        if let Err(error) = super::envelope(answer).and_then(|envelope| self.scope.post_message(&envelope)) {
            self.undelivered(&error);
        }
    }

    fn undelivered(&self, error: &JsValue) {
        let text = format!("an answer could not be sent: {error:?}");
        super::log(&text);
        last_words(&self.scope, text);
    }
}

/// Keeps something, or takes it from there, and answers when that is done.
fn keep(scope: DedicatedWorkerGlobalScope, number: u32, act: Act, beside: Array) {
    wasm_bindgen_futures::spawn_local(async move {
        let (trouble, found) = match super::keeper::keep(act, &beside).await {
            Ok(found) => (None, found),
            Err(trouble) => (Some(trouble), Array::new()),
        };
        let posted = super::envelope(&Answer::Kept { number, trouble }).and_then(|envelope| {
            super::beside(&envelope, "kept", &found)?;
            scope.post_message(&envelope)
        });
        if let Err(error) = posted {
            super::log(&format!("an answer could not be sent: {error:?}"));
        }
    });
}

/// The files that came with an envelope.
fn files_beside(data: &JsValue) -> Vec<File> {
    super::list(data, "files").iter().filter_map(|file| file.dyn_into().ok()).collect()
}

/// The text of a case file that carries these files.
fn pack(case: &str, files: &[File]) -> Result<String> {
    let mut case = Case::from_json(case)?;
    for file in files {
        case.files.push(CarriedFile::pack(&mut BlobSource::new(file.clone())?)?);
    }
    let text = case.to_json()?;
    // What is saved must be readable again.
    Case::from_json(&text)?;
    Ok(text)
}

enum Done {
    Record(Record),
    Sheet(Box<millpond::sheet::Sheet>),
}

/// The worker's own scope; none where there is a document.
pub(crate) fn scope() -> Option<DedicatedWorkerGlobalScope> {
    global().dyn_into().ok()
}

/// Milliseconds on a clock that only runs forward; for the length of slices, never for a result.
fn now_ms() -> f64 {
    let read = || -> std::result::Result<JsValue, JsValue> {
        let performance = Reflect::get(&global(), &"performance".into())?;
        let now: Function = Reflect::get(&performance, &"now".into())?.dyn_into()?;
        now.call0(&performance)
    };
    read().ok().and_then(|value| value.as_f64()).unwrap_or(0.0)
}

/// On a panic: the console has the words, and the page hears of it.
pub(crate) fn report_panics() {
    std::panic::set_hook(Box::new(|panic| {
        let text = panic.to_string();
        super::log(&text);
        if let Some(scope) = scope() {
            last_words(&scope, text);
        }
    }));
}
