//! Fields and choices: each edits one thing of the case. What is typed is read by the engine's own rules; where it does
//! not read, the remedy stands under the field and the case stays as it was.

use leptos::prelude::*;

use millpond::case;
use millpond::fault::Fault;
use millpond::units::asked::Asked;

use super::desk::Desk;
use super::tree::Tree;

/// A field of the case.
#[derive(Clone, Copy)]
pub(crate) struct Field {
    /// What kind of quantity it takes.
    pub(crate) asked: Asked,
    /// Name for readers, or the words before the field where it stands alone.
    pub(crate) name: &'static str,
    /// Width in letters.
    pub(crate) size: u8,
    /// Its path in the case.
    pub(crate) path: &'static [&'static str],
    /// What it means when it is empty.
    pub(crate) empty: Empty,
}

/// What an empty field means.
#[derive(Clone, Copy)]
pub(crate) enum Empty {
    /// That nothing is asked, or that the engine chooses.
    Nothing,
    /// This value, which is shown as an empty field too.
    As(f64),
    /// This value, which the field then shows.
    Shown(f64),
}

/// The field as an input, with the remedy under it when what is typed does not read. `empty` is shown in muted ink while it
/// is empty: the value in force, or what no value means.
pub(crate) fn input(
    desk: Desk,
    field: Field,
    empty: impl Fn() -> String + Send + Sync + 'static,
) -> impl IntoView {
    input_with(desk, field, empty, |_| {})
}

/// The same, where the case has to be prepared for the value to have its place.
pub(crate) fn input_with(
    desk: Desk,
    field: Field,
    empty: impl Fn() -> String + Send + Sync + 'static,
    prepare: fn(&mut Tree),
) -> impl IntoView {
    let Field { asked, name, size, path, empty: means } = field;
    // What the person typed stands as typed, as long as it means what the case holds.
    let typed = RwSignal::new(String::new());
    let remedy = RwSignal::new(None::<String>);
    let value = Memo::new(move |_| {
        let held = desk.case.with(|case| case.number(path));
        if let Empty::As(value) = means { held.filter(|held| *held != value) } else { held }
    });
    let text = move || {
        let held = value.get();
        let typed = typed.get();
        let stands = remedy.with(Option::is_some) || asked.read(&typed).is_ok_and(|read| read == held);
        if stands { typed } else { asked.show(held) }
    };
    let take = move |event| {
        let entered = event_target_value(&event);
        let read = asked.read(&entered);
        typed.set(entered);
        let taken = read.and_then(|value| {
            let value = match means {
                Empty::Nothing => value,
                Empty::As(usual) | Empty::Shown(usual) => Some(value.unwrap_or(usual)),
            };
            let checked = value.map_or(Ok(()), |value| case::number_at(&path.join("."), value));
            checked.map_err(|Fault { remedy, .. }| remedy)?;
            desk.type_in(|case| {
                prepare(case);
                case.put(path, value);
            });
            Ok(())
        });
        remedy.set(taken.err());
    };
    let id = format!("f-{}", name.replace(' ', "-"));
    let described = format!("{id}-remedy");
    let by = described.clone();
    view! {
        <span class="field">
            <input
                type="text"
                inputmode="decimal"
                autocomplete="off"
                aria-label=name
                size=size
                prop:value=text
                placeholder=empty
                aria-invalid=move || remedy.with(Option::is_some).then_some("true")
                aria-describedby=move || remedy.with(Option::is_some).then(|| by.clone())
                on:input=take
                on:change=move |_| {
                    // Left with a value that reads, the field shows it with its unit.
                    if remedy.with_untracked(Option::is_none) {
                        typed.set(asked.show(value.get_untracked()));
                    }
                }
            />
            {move || remedy.get().map(|remedy| view! { <span class="err" id=described.clone()>{remedy}</span> })}
        </span>
    }
}

/// A choice among a few words.
pub(crate) fn choice<T: Copy + PartialEq + Send + Sync + 'static>(
    name: impl Into<String>,
    options: Vec<(T, String)>,
    value: impl Fn() -> T + Copy + Send + Sync + 'static,
    set: impl Fn(T) + Send + Sync + 'static,
) -> impl IntoView {
    let values: Vec<T> = options.iter().map(|(value, _)| *value).collect();
    let chosen = move |event| {
        if let Some(chosen) =
            event_target_value(&event).parse().ok().and_then(|at: usize| values.get(at).copied())
        {
            set(chosen);
        }
    };
    let options = options.into_iter().enumerate().map(move |(i, (option, words))| {
        view! { <option value=i.to_string() prop:selected=move || value() == option>{words}</option> }
    });
    view! { <select aria-label=name.into() on:change=chosen>{options.collect_view()}</select> }
}

/// A choice among the words that a field of the case knows, each with its words for people. The first stands for a field that is
/// not there.
pub(crate) fn named(
    desk: Desk,
    name: &'static str,
    path: &'static [&'static str],
    words: &'static [(&'static str, &'static str)],
) -> impl IntoView {
    let options = words.iter().map(|(word, shown)| (*word, (*shown).to_owned())).collect();
    let held = move || {
        desk.case.with(|case| {
            let held = case.word(path);
            words.iter().map(|(word, _)| *word).find(|word| *word == held).unwrap_or(words[0].0)
        })
    };
    choice(name, options, held, move |word| desk.edit(|case| case.put(path, word)))
}

/// A yes or no with its words.
pub(crate) fn tick(
    words: &'static str,
    value: impl Fn() -> bool + Send + Sync + 'static,
    set: impl Fn(bool) + Send + Sync + 'static,
) -> impl IntoView {
    view! {
        <label>
            <input type="checkbox" prop:checked=value on:change=move |event| set(event_target_checked(&event)) />
            {words}
        </label>
    }
}

/// One answer of several to a question.
pub(crate) fn answer(
    group: &'static str,
    words: &'static str,
    held: impl Fn() -> bool + Send + Sync + 'static,
    take: impl Fn() + Send + Sync + 'static,
) -> impl IntoView {
    view! {
        <label>
            <input type="radio" name=group prop:checked=held on:change=move |_| take() />
            <span>{words}</span>
        </label>
    }
}
