//! The steps that the person took: undo and redo over the whole case and the files it is about.

use std::rc::Rc;

use gloo::events::{EventListener, EventListenerOptions};
use leptos::prelude::*;
use wasm_bindgen::JsCast;
use web_sys::{Element, File, KeyboardEvent};

use millpond::case::change::{Change, words};

use super::desk::Desk;
use super::tree::Tree;

/// Steps that are remembered.
const MOST: usize = 200;

/// The case after a step, and what led to it.
#[derive(Clone)]
pub(crate) struct Step {
    /// What was done.
    pub(crate) words: String,
    /// The case since then.
    pub(crate) case: Tree,
    /// The files it is about.
    pub(crate) files: Rc<Vec<File>>,
    /// Under which name it is kept in the browser.
    pub(crate) id: Rc<str>,
    /// The field that was being typed in, which the next letter may go on with.
    typed: Option<Vec<String>>,
}

/// All steps, and the one that the page is at.
pub(crate) struct Steps {
    pub(crate) list: Vec<Step>,
    pub(crate) at: usize,
}

/// What the page shows of the steps.
#[derive(Clone, Default, PartialEq)]
pub(crate) struct Trail {
    /// Each step in words.
    pub(crate) words: Vec<String>,
    /// The one that the page is at.
    pub(crate) at: usize,
}

impl Step {
    /// A step that begins something.
    pub(crate) fn first(words: String, case: Tree, files: Rc<Vec<File>>, id: Rc<str>) -> Self {
        Self { words, case, files, id, typed: None }
    }
}

impl Steps {
    /// A desk on which nothing has been done.
    pub(crate) fn new(case: Tree, id: Rc<str>) -> Self {
        Self { list: vec![Step::first("Start".to_owned(), case, Rc::default(), id)], at: 0 }
    }

    /// The step that the page is at.
    pub(crate) fn here(&self) -> &Step {
        &self.list[self.at]
    }

    /// A changed case. Letters typed into one field make one step.
    pub(crate) fn change(&mut self, case: Tree, typed: bool) {
        let here = self.here();
        let goes_on = typed && here.typed.is_some() && self.at + 1 == self.list.len() && self.at > 0;
        if goes_on {
            let before = &self.list[self.at - 1];
            let changes = differences(&before.case, &case);
            if changes.is_empty() {
                self.list.pop();
                self.at -= 1;
                return;
            }
            let now = differences(&here.case, &case);
            let same = |list: &[Change]| list.first().map(|change| &change.path) == here.typed.as_ref();
            if same(&changes) && (now.is_empty() || same(&now)) {
                let words = words(&changes);
                let here = &mut self.list[self.at];
                (here.words, here.case) = (words, case);
                return;
            }
        }
        let changes = differences(&here.case, &case);
        let field = changes.first().map(|change| change.path.clone());
        let Some(field) = field else { return };
        let step = Step { words: words(&changes), case, typed: typed.then_some(field), ..here.clone() };
        self.push(step);
    }

    /// A step after the one that the page is at; what had been undone is gone.
    pub(crate) fn push(&mut self, step: Step) {
        self.list.truncate(self.at + 1);
        self.list.push(step);
        if self.list.len() > MOST {
            self.list.remove(0);
        }
        self.at = self.list.len() - 1;
    }

    /// Has the steps of one kept case be those of another.
    pub(crate) fn rename(&mut self, old: &str, new: &Rc<str>) {
        for step in self.list.iter_mut().filter(|step| *step.id == *old) {
            step.id = Rc::clone(new);
        }
    }

    /// What the page shows of it.
    pub(crate) fn trail(&self) -> Trail {
        Trail { words: self.list.iter().map(|step| step.words.clone()).collect(), at: self.at }
    }
}

/// Undo and redo by the keys that every editor has.
pub(crate) fn listen(desk: Desk) {
    let options = EventListenerOptions::enable_prevent_default();
    EventListener::new_with_options(&document(), "keydown", options, move |event| {
        let Some(key) = event.dyn_ref::<KeyboardEvent>() else { return };
        if !(key.ctrl_key() || key.meta_key()) || key.alt_key() {
            return;
        }
        let back = match (key.key().as_str(), key.shift_key()) {
            ("z", false) => true,
            ("z" | "Z", true) | ("y", false) => false,
            _ => return,
        };
        // What does not read has not reached the case: there the browser takes letters back.
        let target = event.target().and_then(|target| target.dyn_into::<Element>().ok());
        if target.is_some_and(|target| target.get_attribute("aria-invalid").is_some()) {
            return;
        }
        event.prevent_default();
        if back { desk.undo() } else { desk.redo() }
    })
    .forget();
}

/// The leaves in which two cases differ, in the order of the fields.
fn differences(old: &Tree, new: &Tree) -> Vec<Change> {
    let mut changes = Vec::new();
    compare(old, new, &mut Vec::new(), &mut changes);
    changes
}

fn compare(old: &Tree, new: &Tree, path: &mut Vec<String>, changes: &mut Vec<Change>) {
    let (before, now) = (old.inside(), new.inside());
    if before.is_empty() && now.is_empty() {
        let (old, new) = (old.leaf(), new.leaf());
        if old != new {
            changes.push(Change { path: path.clone(), old, new });
        }
        return;
    }
    let of = |list: &[(String, &Tree)], name: &str| {
        list.iter().find(|(other, _)| other == name).map_or(Tree::None, |(_, value)| (*value).clone())
    };
    let added = now.iter().filter(|(name, _)| before.iter().all(|(other, _)| other != name));
    for (name, _) in before.iter().chain(added) {
        let (old, new) = (of(&before, name), of(&now, name));
        if old != new {
            path.push(name.clone());
            compare(&old, &new, path, changes);
            path.pop();
        }
    }
}
