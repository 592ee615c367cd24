//! A fold: one ruled row that opens. What is inside is made only once it has been opened.

use leptos::prelude::*;

use millpond::sheet::{Method, Sheet, Station};

use super::desk::Desk;

/// A fold with a name, muted words beside it and what is inside.
pub(crate) fn fold<V: IntoView + 'static>(
    name: &'static str,
    count: impl Fn() -> String + Send + Sync + 'static,
    open: bool,
    inside: impl Fn() -> V + Send + Sync + 'static,
) -> impl IntoView {
    let opened = RwSignal::new(open);
    view! {
        <details class="fold" open=open on:toggle=move |_| opened.set(true)>
            <summary>{name}<span class="count">{count}</span></summary>
            <div>{move || opened.get().then(&inside)}</div>
        </details>
    }
}

/// "How this was computed" of a station, its `index`-th method.
pub(crate) fn method(desk: Desk, of: fn(&Sheet) -> &Station, index: usize) -> impl IntoView {
    let method = Memo::new(move |_| desk.of(|sheet| of(sheet).method.get(index).cloned()));
    move || {
        method.get().map(|shown| {
            let summary = shown.summary.clone();
            fold("How this was computed", move || summary.clone(), false, move || explanation(&shown))
        })
    }
}

/// The methods from the `first`-th on: those of tables, after those of the pictures.
pub(crate) fn methods_from(desk: Desk, of: fn(&Sheet) -> &Station, first: usize) -> impl IntoView {
    let count = Memo::new(move |_| desk.of(|sheet| of(sheet).method.len()));
    move || (first..count.get()).map(|index| method(desk, of, index)).collect_view()
}

fn explanation(method: &Method) -> impl IntoView + use<> {
    let paragraph = |text: &str| (!text.is_empty()).then(|| view! { <p>{text.to_owned()}</p> });
    let source = (!method.source.is_empty()).then(|| format!("Source: {}", method.source));
    view! {
        {paragraph(&method.text)}
        {(!method.formula.is_empty()).then(|| view! { <p class="eq"><i>{method.formula.clone()}</i></p> })}
        {source.map(|source| view! { <p>{source}</p> })}
        {(!method.limits.is_empty()).then(|| view! { <p>"Limits: " {method.limits.clone()}</p> })}
    }
}
