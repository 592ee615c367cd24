//! What the page holds: the files' names, the case, the view, the last sheet and the state of the work. Everything else
//! is derived from these.

use std::sync::Arc;

use gloo::timers::callback::Timeout;
use leptos::prelude::*;
use web_sys::File;

use millpond::case::Case;
use millpond::chart::Scheme;
use millpond::fault::{Fault, Result};
use millpond::record::site_of;
use millpond::sheet::{Sheet, View};

use crate::bridge::Progress;
use crate::bridge::client::{Bridge, Event};
use crate::bridge::{case_text, host, of_json, words};

/// A person who types is left to finish, ms.
const TYPING_MS: u32 = 150;

/// The page's state, handed to every station.
#[derive(Clone, Copy)]
pub(crate) struct Desk {
    /// Names of the open files.
    pub(crate) files: RwSignal<Vec<String>>,
    /// Everything that the person chose.
    pub(crate) case: RwSignal<Case>,
    /// What the person looks at.
    pub(crate) view: RwSignal<View>,
    /// What the engine made of it last.
    pub(crate) sheet: RwSignal<Option<Arc<Sheet>>>,
    /// What is being done, if anything.
    pub(crate) status: RwSignal<Status>,
    /// The colours that pictures are drawn in.
    pub(crate) scheme: RwSignal<Scheme>,
    bridge: StoredValue<Bridge, LocalStorage>,
    typing: StoredValue<Option<Timeout>, LocalStorage>,
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
        let (files, case, view) =
            (RwSignal::new(Vec::new()), RwSignal::new(first_case()), RwSignal::new(View::default()));
        let scheme = super::screen::scheme();
        let typing = StoredValue::new_local(None);
        let bridge = StoredValue::<Option<Bridge>, LocalStorage>::new_local(None);
        let made = Bridge::new(move |event| {
            heard(sheet, status, event);
            if let Some(bridge) = bridge.get_value() {
                settle(&bridge, typing);
            }
        });
        bridge.set_value(Some(made.clone()));
        Self { files, case, view, sheet, status, scheme, bridge: StoredValue::new_local(made), typing }
    }

    /// Opens files in place of those that are open; the case stays, but for what was corrected of other files' reading.
    pub(crate) fn open(self, files: Vec<File>) {
        let again = self
            .files
            .with_untracked(|open| open.iter().eq(files.iter().map(File::name).collect::<Vec<_>>().iter()));
        let case = self.case.with_untracked(|case| if again { case.clone() } else { afresh(case) });
        self.open_with(files, case);
    }

    /// Opens files with a case of their own.
    pub(crate) fn open_with(self, files: Vec<File>, case: Case) {
        if files.is_empty() {
            return;
        }
        let names: Vec<String> = files.iter().map(File::name).collect();
        let site = site_of(&names);
        self.files.set(names);
        self.case.set(case);
        self.view.update(|view| view.window_us = None);
        self.typing.set_value(None);
        self.begin();
        if let Some(case) = self.case_text() {
            self.bridge.with_value(|bridge| bridge.open(files, site, case, self.view.get_untracked()));
        }
    }

    /// Changes the case at once.
    ///
    /// # Errors
    /// If a number is out of its range; the case is then as it was.
    pub(crate) fn edit(self, change: impl FnOnce(&mut Case)) -> Result<()> {
        self.take(change)?;
        self.typing.set_value(None);
        self.post_case();
        Ok(())
    }

    /// Changes the case as a person types: computed after a pause.
    ///
    /// # Errors
    /// As [`Self::edit`].
    pub(crate) fn type_in(self, change: impl FnOnce(&mut Case)) -> Result<()> {
        self.take(change)?;
        if self.bridge.with_value(Bridge::has_files) {
            self.begin();
            self.typing.set_value(Some(Timeout::new(TYPING_MS, move || {
                self.typing.set_value(None);
                self.post_case();
            })));
        }
        Ok(())
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
        self.typing.set_value(None);
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
        self.bridge.with_value(|bridge| settle(bridge, self.typing));
    }

    /// Something of the sheet, or its default without one.
    pub(crate) fn of<T: Default>(self, pick: impl FnOnce(&Sheet) -> T) -> T {
        self.sheet.with(|sheet| sheet.as_deref().map(pick).unwrap_or_default())
    }

    fn take(self, change: impl FnOnce(&mut Case)) -> Result<()> {
        let mut case = self.case.get_untracked();
        change(&mut case);
        case.check()?;
        self.case.set(case);
        Ok(())
    }

    fn post_case(self) {
        if self.bridge.with_value(Bridge::has_files) {
            self.begin();
            if let Some(case) = self.case_text() {
                self.bridge.with_value(|bridge| bridge.change(case, self.view.get_untracked()));
            }
        }
    }

    /// The case as the text of its file, also kept for the page that follows one that broke.
    pub(crate) fn case_text(self) -> Option<String> {
        match self.case.with_untracked(case_text) {
            Ok(text) => {
                host::keep(&text);
                Some(text)
            }
            Err(error) => {
                self.fail(Fault::new(
                    format!("the case cannot be written: {}", words(&error)),
                    "case",
                    "Report this as a defect.",
                ));
                None
            }
        }
    }

    /// Says what is wrong with the text of a case file that did not read.
    pub(crate) fn explain(self, name: String, case: String) {
        self.begin();
        self.bridge.with_value(|bridge| bridge.explain(name, case));
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

fn heard(sheet: RwSignal<Option<Arc<Sheet>>>, status: RwSignal<Status>, event: Event) {
    match event {
        Event::Progress(progress) => status.update(|status| status.progress = Some(progress)),
        Event::Sheet(made) => {
            // The result may hold its own error: what could be read is shown beside it.
            let fault = made.error.clone();
            sheet.set(Some(made));
            status.set(Status { fault, ..Status::default() });
        }
        Event::Fault(fault) => status.set(Status { fault: Some(fault), ..Status::default() }),
        Event::Restarted => {
            status.update(|status| {
                status.remark = "The computation stopped and was started anew with the same case.";
            });
        }
    }
}

/// The flag turns true only after effects have drawn, and not if more was asked meanwhile.
fn settle(bridge: &Bridge, typing: StoredValue<Option<Timeout>, LocalStorage>) {
    let bridge = bridge.clone();
    Timeout::new(0, move || {
        if !bridge.waiting() && typing.with_value(Option::is_none) {
            super::screen::settled(true);
        }
    })
    .forget();
}

/// The case of a page in this window that broke; otherwise the default.
fn first_case() -> Case {
    // A text that does not read is no case; the page that broke may have been of another version.
    host::kept()
        .and_then(|text| of_json(&text))
        .filter(|case: &Case| case.check().is_ok())
        .unwrap_or_default()
}

/// The case without what belongs to one file's columns.
fn afresh(case: &Case) -> Case {
    let mut case = case.clone();
    let remedies = case.record.remedies;
    case.record = millpond::case::RecordCase { remedies, ..Default::default() };
    case
}
