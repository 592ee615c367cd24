//! What the page holds: the files' names, the case, the view, the last sheet and the state of the work. Everything else
//! is derived from these.

use std::rc::Rc;
use std::sync::Arc;

use gloo::timers::callback::Timeout;
use leptos::prelude::*;
use web_sys::File;

use millpond::chart::Scheme;
use millpond::fault::Fault;
use millpond::record::site_of;
use millpond::sheet::{Sheet, View};

use crate::bridge::Progress;
use crate::bridge::client::{Bridge, Event};
use crate::bridge::host;

use super::keep::{self, Keeping, Kept};
use super::steps::{Step, Steps, Trail};
use super::tree::Tree;

/// A person who types is left to finish, ms.
const TYPING_MS: u32 = 150;

/// Said while a worker that took over from a dead one is at work.
const ANEW: &str = "The computation stopped and was started anew with the same case.";

/// The page's state, handed to every station.
#[derive(Clone, Copy)]
pub(crate) struct Desk {
    /// Names of the open files.
    pub(crate) files: RwSignal<Vec<String>>,
    /// Everything that the person chose.
    pub(crate) case: RwSignal<Tree>,
    /// What the person looks at.
    pub(crate) view: RwSignal<View>,
    /// What the engine made of it last.
    pub(crate) sheet: RwSignal<Option<Arc<Sheet>>>,
    /// What is being done, if anything.
    pub(crate) status: RwSignal<Status>,
    /// The colours that pictures are drawn in.
    pub(crate) scheme: RwSignal<Scheme>,
    /// The steps taken, for the list of them.
    pub(crate) trail: RwSignal<Trail>,
    /// Whether and how the case is kept in the browser.
    pub(crate) keeping: RwSignal<Keeping>,
    /// What is kept there.
    pub(crate) kept: RwSignal<Vec<Kept>>,
    steps: StoredValue<Steps, LocalStorage>,
    /// Meter files that came together with a case file, until that is read.
    meters: StoredValue<Vec<File>, LocalStorage>,
    bridge: StoredValue<Bridge, LocalStorage>,
    waits: Waits,
}

/// What the page waits for beside the worker.
#[derive(Clone, Copy)]
struct Waits {
    /// A person who types.
    typing: StoredValue<Option<Timeout>, LocalStorage>,
    /// Files on their way, or a kept case.
    fetching: StoredValue<u32, LocalStorage>,
}

impl Waits {
    fn none(self) -> bool {
        self.typing.with_value(Option::is_none) && self.fetching.get_value() == 0
    }
}

/// What is being done, and what last went wrong.
#[derive(Debug, Clone, Default, PartialEq)]
pub(crate) struct Status {
    /// Whether the sheet shown is not yet that of the case.
    pub(crate) busy: bool,
    /// How far the work is.
    pub(crate) progress: Option<Progress>,
    /// What stopped it.
    pub(crate) fault: Option<Fault>,
    /// A remark in words.
    pub(crate) remark: &'static str,
}

impl Desk {
    /// An empty desk with its worker on the way.
    pub(crate) fn new() -> Self {
        let sheet = RwSignal::new(None);
        let status = RwSignal::new(Status::default());
        let first = first_case();
        let steps = StoredValue::new_local(Steps::new(first.clone(), keep::new_id()));
        let (files, case, view) =
            (RwSignal::new(Vec::new()), RwSignal::new(first), RwSignal::new(View::default()));
        let scheme = super::screen::scheme();
        let waits = Waits { typing: StoredValue::new_local(None), fetching: StoredValue::new_local(0) };
        let desk = StoredValue::<Option<Self>, LocalStorage>::new_local(None);
        let bridge = StoredValue::<Option<Bridge>, LocalStorage>::new_local(None);
        let made = Bridge::new(move |event| {
            heard(sheet, status, desk, event);
            if let Some(bridge) = bridge.get_value() {
                settle(&bridge, waits);
            }
        });
        bridge.set_value(Some(made.clone()));
        let this = Self {
            files,
            case,
            view,
            sheet,
            status,
            scheme,
            trail: RwSignal::new(Trail::default()),
            keeping: RwSignal::new(Keeping::Starting),
            kept: RwSignal::new(Vec::new()),
            steps,
            meters: StoredValue::new_local(Vec::new()),
            bridge: StoredValue::new_local(made),
            waits,
        };
        desk.set_value(Some(this));
        this
    }

    /// Opens files in place of those that are open; the case stays, but for what was corrected of other files' reading.
    pub(crate) fn open(self, files: Vec<File>) {
        // A case without files waits for its own.
        let again = self.files.with_untracked(|open| {
            open.is_empty() || open.iter().eq(files.iter().map(File::name).collect::<Vec<_>>().iter())
        });
        let case = self.case.with_untracked(|case| if again { case.clone() } else { afresh(case) });
        self.open_as(files, case, !again);
    }

    /// Opens files with a case of their own.
    pub(crate) fn open_with(self, files: Vec<File>, case: Tree) {
        self.open_as(files, case, true);
    }

    /// Opens files as a step; another site is kept as a case of its own.
    fn open_as(self, files: Vec<File>, case: Tree, another: bool) {
        if files.is_empty() {
            return;
        }
        let names: Vec<String> = files.iter().map(File::name).collect();
        let words = format!("Opened {}", names.join(", "));
        let files = Rc::new(files);
        self.steps.update_value(|steps| {
            let first = steps.here().files.is_empty();
            let untouched = first && steps.list.len() == 1;
            let id = if another && !first { keep::new_id() } else { Rc::clone(&steps.here().id) };
            if first {
                // What was chosen before there were files is about these.
                for step in &mut steps.list {
                    step.files = Rc::clone(&files);
                }
            }
            let step = Step::first(words, case, files, id);
            if untouched { *steps = Steps { list: vec![step], at: 0 } } else { steps.push(step) }
        });
        self.arrive(true);
    }

    /// Takes up steps that were kept. Without files the case is there, and its record has to be handed over again.
    pub(crate) fn resume(self, steps: Steps) {
        self.steps.set_value(steps);
        self.arrive(true);
    }

    /// One step back.
    pub(crate) fn undo(self) {
        if let Some(at) = self.steps.with_value(|steps| steps.at.checked_sub(1)) {
            self.go(at);
        }
    }

    /// One step forward again.
    pub(crate) fn redo(self) {
        self.go(self.steps.with_value(|steps| steps.at + 1));
    }

    /// Goes to a step of the list.
    pub(crate) fn go(self, at: usize) {
        let other = self.steps.try_update_value(|steps| {
            if at == steps.at || at >= steps.list.len() {
                return None;
            }
            let before = Rc::clone(&steps.here().files);
            steps.at = at;
            Some(!Rc::ptr_eq(&before, &steps.here().files))
        });
        if let Some(Some(other)) = other {
            self.arrive(other);
        }
    }

    /// Something of the steps.
    pub(crate) fn with_steps<T>(self, pick: impl FnOnce(&Steps) -> T) -> T {
        self.steps.with_value(pick)
    }

    /// Has the steps of one kept case be those of another.
    pub(crate) fn rename_steps(self, old: &str, new: &Rc<str>) {
        self.steps.update_value(|steps| steps.rename(old, new));
    }

    /// Puts what the present step holds on the desk, and has it computed.
    fn arrive(self, open: bool) {
        let Step { case, files, .. } = self.steps.with_value(|steps| steps.here().clone());
        self.waits.typing.set_value(None);
        self.case.set(case);
        if open && files.is_empty() {
            self.files.set(Vec::new());
            self.sheet.set(None);
            self.bridge.with_value(Bridge::close);
            self.settle_soon();
        } else if open {
            let names: Vec<String> = files.iter().map(File::name).collect();
            let site = site_of(&names);
            self.files.set(names);
            self.view.update(|view| view.window_us = None);
            self.begin();
            let (files, case) = (files.as_slice().to_vec(), self.case_text());
            self.bridge.with_value(|bridge| bridge.open(files, site, case, self.view.get_untracked()));
        } else {
            self.post_case();
        }
        self.told();
    }

    /// After every step: the list shows it, and the browser keeps it.
    fn told(self) {
        self.trail.set(self.steps.with_value(Steps::trail));
        keep::soon(self);
    }

    /// Waits for something that is on its way; the page is not settled before [`Self::fetched`].
    pub(crate) fn fetch(self) {
        super::screen::settled(false);
        self.waits.fetching.update_value(|count| *count += 1);
    }

    /// What was on its way is here, or will not come.
    pub(crate) fn fetched(self) {
        self.waits.fetching.update_value(|count| *count = count.saturating_sub(1));
        self.settle_soon();
    }

    /// Changes the case at once.
    pub(crate) fn edit(self, change: impl FnOnce(&mut Tree)) {
        self.take(change, false);
        self.waits.typing.set_value(None);
        self.post_case();
    }

    /// Changes the case as a person types: computed after a pause.
    pub(crate) fn type_in(self, change: impl FnOnce(&mut Tree)) {
        self.take(change, true);
        if self.bridge.with_value(Bridge::has_files) {
            self.begin();
            self.waits.typing.set_value(Some(Timeout::new(TYPING_MS, move || {
                self.waits.typing.set_value(None);
                self.post_case();
            })));
        }
    }

    /// Changes words of the case as a person types them; no figure depends on them, so nothing is computed.
    pub(crate) fn type_words(self, change: impl FnOnce(&mut Tree)) {
        self.take(change, true);
    }

    /// Name of the case for people: its own, or that of the site.
    pub(crate) fn name(self) -> String {
        let own = self.case.with_untracked(|case| case.word(&["name"]).to_owned());
        if !own.is_empty() {
            return own;
        }
        let names = self.files.get_untracked();
        if names.is_empty() { "case without a record".to_owned() } else { site_of(&names) }
    }

    /// Says something in passing.
    pub(crate) fn remark(self, words: &'static str) {
        self.status.update(|status| status.remark = words);
    }

    /// Changes what is looked at.
    pub(crate) fn look(self, change: impl FnOnce(&mut View)) {
        self.view.update(change);
        if self.bridge.with_value(Bridge::has_files) {
            self.begin();
            self.bridge.with_value(|bridge| bridge.look(self.view.get_untracked()));
        }
    }

    /// Whether the last request has been answered.
    pub(crate) fn idle(self) -> bool {
        !self.bridge.with_value(Bridge::waiting)
    }

    /// Leaves off; the old figures stay and say so.
    pub(crate) fn stop(self) {
        self.waits.typing.set_value(None);
        self.bridge.with_value(Bridge::stop);
        self.status.set(Status {
            remark: "Stopped. The figures are of the case before; change any term to compute again.",
            ..Status::default()
        });
        self.settle_soon();
    }

    /// Shows a fault that came about on the page.
    pub(crate) fn fail(self, fault: Fault) {
        self.status.update(|status| status.fault = Some(fault));
        self.settle_soon();
    }

    /// Marks the page as settled once what is shown has been drawn and nothing is awaited.
    pub(crate) fn settle_soon(self) {
        self.bridge.with_value(|bridge| settle(bridge, self.waits));
    }

    /// Something of the sheet, or its default without one.
    pub(crate) fn of<T: Default>(self, pick: impl FnOnce(&Sheet) -> T) -> T {
        self.sheet.with(|sheet| sheet.as_deref().map(pick).unwrap_or_default())
    }

    fn take(self, change: impl FnOnce(&mut Tree), typed: bool) {
        let mut case = self.case.get_untracked();
        change(&mut case);
        self.steps.update_value(|steps| steps.change(case.clone(), typed));
        self.case.set(case);
        self.told();
    }

    fn post_case(self) {
        if self.bridge.with_value(Bridge::has_files) {
            self.begin();
            let case = self.case_text();
            self.bridge.with_value(|bridge| bridge.change(case, self.view.get_untracked()));
        }
    }

    /// The case as the text of its file, also kept for the page that follows one that broke.
    pub(crate) fn case_text(self) -> String {
        let text = self.case.with_untracked(Tree::text);
        host::keep(&text);
        text
    }

    /// Has the engine read the text of a case file; it becomes the case if all of it reads.
    pub(crate) fn read_case(self, name: String, text: String, meters: Vec<File>) {
        super::screen::settled(false);
        self.meters.set_value(meters);
        self.bridge.with_value(|bridge| bridge.read_case(name, text));
    }

    /// Has the engine pack the open files into the case, to be saved.
    pub(crate) fn pack(self) {
        super::screen::settled(false);
        let case = self.case_text();
        self.bridge.with_value(|bridge| bridge.pack(case));
    }

    /// Takes over a case that was read, with the files of its record if it carries them.
    fn take_over(self, text: &str, files: Vec<File>) {
        let Some(case) = Tree::of_case(text) else { return };
        let files = match self.meters.try_update_value(std::mem::take) {
            Some(chosen) if !chosen.is_empty() => chosen,
            _ => files,
        };
        if !files.is_empty() {
            return self.open_with(files, case);
        }
        self.edit(move |held| *held = case);
    }

    fn begin(self) {
        super::screen::settled(false);
        self.status.update(|status| {
            status.busy = true;
            status.progress = None;
            status.remark = "";
        });
    }
}

fn heard(
    sheet: RwSignal<Option<Arc<Sheet>>>,
    status: RwSignal<Status>,
    desk: StoredValue<Option<Desk>, LocalStorage>,
    event: Event,
) {
    match event {
        Event::Progress(progress) => status.update(|status| status.progress = Some(progress)),
        Event::Sheet(made) => {
            // The result may hold its own error: what could be read is shown beside it.
            let fault = made.error.clone();
            sheet.set(Some(made));
            // What was said when the work began still holds; that it began anew does not matter any more.
            status.update(|status| {
                let remark = if status.remark == ANEW { "" } else { status.remark };
                *status = Status { fault, remark, ..Status::default() };
            });
        }
        Event::Fault(fault) => status.set(Status { fault: Some(fault), ..Status::default() }),
        Event::Case { case, files } => {
            if let Some(desk) = desk.get_value() {
                desk.take_over(&case, files);
            }
        }
        Event::Packed(text) => {
            if let Some(desk) = desk.get_value() {
                super::save::packed(desk, &text);
            }
        }
        Event::Failed(fault) => status.update(|status| status.fault = Some(fault)),
        Event::Restarted => {
            status.update(|status| {
                status.remark = ANEW;
            });
        }
    }
}

/// The flag turns true only after effects have drawn, and not if more was asked meanwhile.
fn settle(bridge: &Bridge, waits: Waits) {
    let bridge = bridge.clone();
    Timeout::new(0, move || {
        if !bridge.waiting() && waits.none() {
            super::screen::settled(true);
        }
    })
    .forget();
}

/// The case of a page in this window that broke; otherwise the default.
fn first_case() -> Tree {
    // A text that does not read is no case; the page that broke may have been of another version.
    host::kept().and_then(|text| Tree::of_case(&text)).unwrap_or_else(Tree::untouched)
}

/// The case without what belongs to one file's columns.
fn afresh(case: &Tree) -> Tree {
    let mut case = case.clone();
    read_afresh(&mut case);
    case
}

/// Forgets what was corrected of the reading, but for the remedies.
pub(crate) fn read_afresh(case: &mut Tree) {
    let remedies = case.get(&["record", "remedies"]).clone();
    let record = Tree::untouched().get(&["record"]).clone();
    case.put(&["record"], record);
    case.put(&["record", "remedies"], remedies);
}
