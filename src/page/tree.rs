//! The case as the page holds it: the tree of its file. The page knows paths, not types; what a case may hold is for the engine to
//! say, which reads the text of the tree as it reads any case file. So the page does not grow with the case.

use js_sys::{Array, JSON, Object, Reflect};
use wasm_bindgen::{JsCast, JsValue};

use millpond::case;

/// A value of the tree. A field that is null is not there: both mean its default.
#[derive(Debug, Clone, Default, PartialEq)]
pub(crate) enum Tree {
    /// Not there.
    #[default]
    None,
    Flag(bool),
    Number(f64),
    Text(String),
    List(Vec<Tree>),
    Fields(Vec<(String, Tree)>),
}

impl From<f64> for Tree {
    fn from(value: f64) -> Self {
        Self::Number(value)
    }
}

impl From<bool> for Tree {
    fn from(value: bool) -> Self {
        Self::Flag(value)
    }
}

impl From<&str> for Tree {
    fn from(word: &str) -> Self {
        if word.is_empty() { Self::None } else { Self::Text(word.to_owned()) }
    }
}

impl<T: Into<Self>> From<Option<T>> for Tree {
    fn from(value: Option<T>) -> Self {
        value.map_or(Self::None, Into::into)
    }
}

impl Tree {
    /// The case of a person who has not chosen anything.
    pub(crate) fn untouched() -> Self {
        Self::of_case(case::UNTOUCHED).unwrap_or_default()
    }

    /// The tree of a case file's text; none if it is not one that this version may read.
    pub(crate) fn of_case(text: &str) -> Option<Self> {
        let tree = Self::of(&JSON::parse(text).ok()?);
        let version = tree.number(&["millpond_case"])?;
        (version <= f64::from(case::VERSION)).then_some(tree)
    }

    /// The tree of a text; none if it is no JSON.
    pub(crate) fn of_text(text: &str) -> Self {
        JSON::parse(text).map(|value| Self::of(&value)).unwrap_or_default()
    }

    /// Lays another tree over this one: its fields take the place of those of their names, the rest stays.
    pub(crate) fn lay_over(&mut self, other: &Self) {
        match (self, other) {
            (_, Self::None) => {}
            (Self::Fields(fields), Self::Fields(others)) => {
                for (name, value) in others {
                    match fields.iter_mut().find(|(field, _)| field == name) {
                        Some((_, field)) => field.lay_over(value),
                        None => fields.push((name.clone(), value.clone())),
                    }
                }
            }
            (this, other) => *this = other.clone(),
        }
    }

    /// The text of the case file.
    pub(crate) fn text(&self) -> String {
        let text = JSON::stringify_with_replacer_and_space(&self.value(), &JsValue::NULL, &JsValue::from(2));
        text.map(String::from).unwrap_or_default()
    }

    fn of(value: &JsValue) -> Self {
        if let Some(number) = value.as_f64() {
            return Self::Number(number);
        }
        if let Some(flag) = value.as_bool() {
            return Self::Flag(flag);
        }
        if let Some(text) = value.as_string() {
            return Self::Text(text);
        }
        if let Some(list) = value.dyn_ref::<Array>() {
            return Self::List(list.iter().map(|entry| Self::of(&entry)).collect());
        }
        let Some(object) = value.dyn_ref::<Object>() else { return Self::None };
        let entries = Object::entries(object);
        let fields = entries.iter().filter_map(|entry| {
            let entry: Array = entry.dyn_into().ok()?;
            let value = Self::of(&entry.get(1));
            (value != Self::None).then_some((entry.get(0).as_string()?, value))
        });
        Self::Fields(fields.collect())
    }

    fn value(&self) -> JsValue {
        match self {
            Self::None => JsValue::NULL,
            Self::Flag(flag) => JsValue::from(*flag),
            Self::Number(number) => JsValue::from(*number),
            Self::Text(text) => JsValue::from(text.as_str()),
            Self::List(list) => list.iter().map(Self::value).collect::<Array>().into(),
            Self::Fields(fields) => {
                let object = Object::new();
                for (name, field) in fields {
                    // A plain object takes any property.
                    let _ = Reflect::set(&object, &name.as_str().into(), &field.value());
                }
                object.into()
            }
        }
    }

    /// The value at a path.
    pub(crate) fn get(&self, path: &[&str]) -> &Self {
        let mut at = self;
        for name in path {
            let Self::Fields(fields) = at else { return &Self::None };
            match fields.iter().find(|(field, _)| field == name) {
                Some((_, value)) => at = value,
                None => return &Self::None,
            }
        }
        at
    }

    /// The number at a path.
    pub(crate) fn number(&self, path: &[&str]) -> Option<f64> {
        if let Self::Number(number) = self.get(path) { Some(*number) } else { None }
    }

    /// The word at a path; empty if there is none.
    pub(crate) fn word(&self, path: &[&str]) -> &str {
        if let Self::Text(text) = self.get(path) { text } else { "" }
    }

    /// The yes or no at a path.
    pub(crate) fn flag(&self, path: &[&str]) -> Option<bool> {
        if let Self::Flag(flag) = self.get(path) { Some(*flag) } else { None }
    }

    /// Puts a value at a path; none takes the field away.
    pub(crate) fn put(&mut self, path: &[&str], value: impl Into<Self>) {
        self.put_at(path, value.into());
    }

    fn put_at(&mut self, path: &[&str], value: Self) {
        let Some((name, rest)) = path.split_first() else {
            *self = value;
            return;
        };
        if !matches!(self, Self::Fields(_)) {
            *self = Self::Fields(Vec::new());
        }
        let Self::Fields(fields) = self else { return };
        let at = fields.iter().position(|(field, _)| field == name).unwrap_or_else(|| {
            fields.push(((*name).to_owned(), Self::None));
            fields.len() - 1
        });
        fields[at].1.put_at(rest, value);
        if fields[at].1 == Self::None {
            fields.remove(at);
        }
    }

    /// The names and values inside, those of a list by their places.
    pub(crate) fn inside(&self) -> Vec<(String, &Self)> {
        match self {
            Self::Fields(fields) => fields.iter().map(|(name, field)| (name.clone(), field)).collect(),
            Self::List(list) => {
                list.iter().enumerate().map(|(place, entry)| (place.to_string(), entry)).collect()
            }
            _ => Vec::new(),
        }
    }

    /// The value as text, if it has nothing inside.
    pub(crate) fn leaf(&self) -> String {
        match self {
            Self::Flag(flag) => flag.to_string(),
            Self::Number(number) => number.to_string(),
            Self::Text(text) => text.clone(),
            _ => String::new(),
        }
    }
}
