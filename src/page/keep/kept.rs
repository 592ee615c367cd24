//! What is kept, in which state keeping is, and what a person is told of it.

use js_sys::{Date, JSON, Reflect};
use serde::{Deserialize, Serialize};
use wasm_bindgen::JsValue;

use crate::bridge::Trouble;
use crate::page::tree::Tree;

/// Whether and how the case is kept.
#[derive(Clone, Copy, Default, PartialEq)]
pub(crate) enum Keeping {
    /// Not known yet.
    #[default]
    Starting,
    /// Everything so far is kept, with the record or without.
    On { record: bool },
    /// The person wants nothing kept.
    Nothing,
    /// Kept without the record, since there is no room for it.
    NoRoom,
    /// It cannot be kept, and why.
    Cannot(&'static str),
}

impl Keeping {
    /// The state in words.
    pub(crate) fn words(self) -> &'static str {
        match self {
            Self::Starting => "",
            Self::On { record: true } => "Kept in this browser, with the record.",
            Self::On { record: false } => "Kept in this browser, without the record.",
            Self::Nothing => "Nothing is kept on this computer.",
            Self::NoRoom => {
                "The browser has no room for the record: the case is kept without it. Save it with its record as a file."
            }
            Self::Cannot(why) => why,
        }
    }
}

pub(super) const FROM_DISK: &str = "A page opened from disk keeps nothing. Save the case as a file.";
const DENIED: &str = "This browser does not let the page keep anything (a private window, or a setting). Save the case as a file before you leave.";
const FULL: &str = "The browser has no room left to keep the case. Save it as a file, or remove kept cases.";
const REFUSED: &str = "The browser did not keep the last step. Save the case as a file.";
pub(super) const EVICTED: &str = "What was kept here is gone: browsers remove it when they need room, or when their data are cleared. Case files are not concerned.";
pub(super) const ELSEWHERE: &str =
    "That case is open in another tab. What you see here is a copy, kept as a case of its own.";
pub(super) const WAITS: &str =
    "The case you were at last is open in another tab. Open it from the kept cases to work on a copy here.";
pub(super) const GONE: &str = "That case is no longer kept in this browser.";
pub(super) const UNREAD: &str =
    "The browser did not hand the kept record over. Reload the page to try again.";
pub(super) const BARE: &str = "The case was kept without its record: hand over the meter file again.";

/// A kept case.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub(crate) struct Kept {
    /// Its key.
    pub(crate) id: String,
    /// Its name for people.
    pub(crate) name: String,
    /// When it was changed last, ms since 1970.
    pub(crate) changed_ms: f64,
    /// Names of its record's files.
    pub(crate) files: Vec<String>,
    /// Whether those are kept too.
    pub(crate) record: bool,
    /// The step that it is at.
    pub(super) at: usize,
    /// Each step in words, and the case after it as the text of its file.
    pub(super) steps: Vec<(String, String)>,
    /// What cannot be read, as it stands.
    #[serde(skip)]
    pub(crate) damaged: Option<String>,
}

impl Kept {
    /// When it was changed last, on this computer's clock.
    pub(crate) fn when(&self) -> String {
        let date = Date::new(&self.changed_ms.into());
        let two = |number: u32| format!("{number:02}");
        format!(
            "{}-{}-{} {}:{}",
            date.get_full_year(),
            two(date.get_month() + 1),
            two(date.get_date()),
            two(date.get_hours()),
            two(date.get_minutes())
        )
    }
}

/// A kept case, or what is left of it.
pub(super) fn entry(value: JsValue) -> Kept {
    let text = JSON::stringify(&value).ok().map(String::from).unwrap_or_default();
    let id = Reflect::get(&value, &"id".into()).ok().and_then(|id| id.as_string()).unwrap_or_default();
    let kept: Option<Kept> = serde_wasm_bindgen::from_value(value).ok();
    match kept {
        Some(kept)
            if kept.at < kept.steps.len()
                && kept.steps.iter().all(|(_, case)| Tree::of_case(case).is_some()) =>
        {
            kept
        }
        _ => Kept { name: "damaged".to_owned(), id, damaged: Some(text), ..Kept::default() },
    }
}

/// What a person is told of a trouble.
pub(super) fn sentence(trouble: Trouble) -> &'static str {
    match trouble {
        Trouble::Denied => DENIED,
        Trouble::Full => FULL,
        Trouble::Refused => REFUSED,
    }
}
