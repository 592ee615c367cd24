//! A picture: heading, canvas, read-out, the table behind it. It is drawn on the page's thread for the width it has, and
//! drawn again when the data, the width or the colour scheme change.

use std::sync::Arc;

use gloo::events::EventListener;
use leptos::html::{Canvas, Div};
use leptos::prelude::*;
use wasm_bindgen::JsCast;
use wasm_bindgen::closure::Closure;
use web_sys::{HtmlCanvasElement, KeyboardEvent, PointerEvent, ResizeObserver};

use millpond::chart::{Basis, Hits, Measure, nearest};
use millpond::sheet::Sheet;
use millpond::units::people;

use super::desk::Desk;
use super::drawing::{self, Which};
use super::fold::fold;
use super::readout::{self, Readout};
use super::{save, screen, tables};

/// What is being dragged.
#[derive(Clone, Copy, PartialEq)]
enum Drag {
    /// The window's left or right edge, or all of it by the place where it was taken (µs from its left edge).
    From,
    To,
    Window(f64),
    /// The asked point of the coverage curve.
    Asked,
}

/// A picture with its heading and the table behind it.
pub(crate) fn picture(desk: Desk, which: Which) -> impl IntoView {
    let place = NodeRef::<Div>::new();
    let canvas = NodeRef::<Canvas>::new();
    let width = width_of(place);
    let sheet = drawn_sheet(desk, which);
    let hits = StoredValue::new(Hits::default());
    let reading = RwSignal::new(None::<(usize, Readout)>);
    let height = RwSignal::new(0_u32);

    Effect::new(move || {
        let (Some(canvas), Some(sheet)) = (canvas.get(), sheet.get()) else { return };
        let (width, palette) = (width.get(), desk.scheme.get().palette());
        if width == 0 {
            return;
        }
        let size = (width, drawing::height(which, &sheet, width));
        match drawing::on_canvas(which, &sheet, &canvas, size, screen::density(), palette, false) {
            Ok(drawn) => hits.set_value(drawn),
            Err(fault) => desk.fail(fault),
        }
        height.set(size.1);
        reading.set(None);
    });

    let point = move |index: Option<usize>| {
        let read = index.and_then(|index| {
            let sheet = sheet.get_untracked()?;
            hits.with_value(|hits| readout::read(which, &sheet, hits, index)).map(|read| (index, read))
        });
        if reading.with_untracked(|held| *held != read) {
            reading.set(read);
        }
    };
    let drag = StoredValue::new(None::<Drag>);
    let moved = move |event: PointerEvent| {
        let Some(at) = position(&event) else { return };
        if let Some(drag) = drag.get_value() {
            return hits.with_value(|hits| dragged(desk, drag, hits, at));
        }
        let Some(sheet) = sheet.get_untracked() else { return };
        point(hits.with_value(|hits| readout::locate(which, &sheet, hits, at)));
    };
    let pressed = move |event: PointerEvent| {
        let Some(at) = position(&event) else { return };
        let taken = hits.with_value(|hits| take(desk, which, hits, at));
        if taken.is_some() {
            event.prevent_default();
            if let Some(canvas) = canvas.get_untracked() {
                // Without the capture the drag only ends at the canvas' edge.
                let _ = canvas.set_pointer_capture(event.pointer_id());
                let _ = canvas.focus();
            }
            point(None);
        }
        drag.set_value(taken);
    };
    let released = move |event: PointerEvent| {
        if let (Some(held), Some(at)) = (drag.get_value(), position(&event)) {
            drag.set_value(None);
            hits.with_value(|hits| dropped(desk, held, hits, at));
        }
    };
    let keyed = move |event: KeyboardEvent| {
        let step = match event.key().as_str() {
            "ArrowLeft" => -1,
            "ArrowRight" => 1,
            "ArrowUp" => -row_length(desk, which),
            "ArrowDown" => row_length(desk, which),
            "Home" => isize::MIN,
            "End" => isize::MAX,
            "Escape" => return point(None),
            "Enter" | " " if which == Which::Plane => {
                event.prevent_default();
                if let Some((index, _)) = reading.get_untracked() {
                    let kind = desk.of(|sheet| {
                        sheet.pictures.plane.strands.get(index).map(|strand| strand.technology.clone())
                    });
                    if let Some(kind) = kind {
                        pick(desk, &kind);
                    }
                }
                return;
            }
            _ => return,
        };
        event.prevent_default();
        if event.shift_key() && which == Which::Net && step.abs() == 1 {
            return shift_window(desk, step as f64 / 4.0);
        }
        let Some(sheet) = sheet.get_untracked() else { return };
        let last = readout::count(which, &sheet).saturating_sub(1);
        let next = match reading.get_untracked() {
            _ if step == isize::MIN => 0,
            _ if step == isize::MAX => last,
            Some((index, _)) => index.saturating_add_signed(step).min(last),
            None => last / 2,
        };
        point(Some(next));
    };

    let title = Memo::new(move |_| {
        sheet.with(|sheet| sheet.as_deref().map_or(which.title(), |sheet| which.title_of(sheet)))
    });
    let sentence = move || sheet.with(|sheet| sheet.as_deref().map(|sheet| drawing::sentence(which, sheet)));
    let note = move || match reading.get() {
        Some((_, read)) => view! { <span class="read">{read.words}</span> }.into_any(),
        None => view! { {which.note()} }.into_any(),
    };
    let with_sheet = move |act: fn(Desk, Which, &Sheet)| {
        move |_| {
            if let Some(sheet) = sheet.get_untracked() {
                act(desk, which, &sheet);
            }
        }
    };
    let rows = move || {
        sheet.with(|sheet| {
            sheet.as_deref().map(|sheet| tables::table(which, sheet).rows.len()).unwrap_or_default()
        })
    };
    view! {
        <figure class="picture">
            <figcaption>
                <span class="cap"><b>{which.number()}</b>" "{move || title.get()}</span>
                <span class="acts">
                    <button class="quiet" aria-label=move || format!("Copy the table of {}", title.get())
                        on:click=with_sheet(|desk, which, sheet| save::copy(desk, &tables::table(which, sheet).text()))>"Copy"</button>
                    <button class="quiet" aria-label=move || format!("Save {} as SVG", title.get()) on:click=with_sheet(save::svg)>"SVG"</button>
                    <button class="quiet" aria-label=move || format!("Save {} as PNG", title.get()) on:click=with_sheet(save::png)>"PNG"</button>
                </span>
                <span class="note" aria-live="polite">{note}</span>
            </figcaption>
            <div class="plot" node_ref=place>
                <canvas
                    node_ref=canvas role="img" tabindex="0" aria-label=sentence
                    on:pointermove=moved on:pointerdown=pressed on:pointerup=released
                    on:pointercancel=move |_| drag.set_value(None)
                    on:pointerleave=move |_| point(None)
                    on:keydown=keyed on:blur=move |_| point(None)
                ></canvas>
                {move || reading.get().map(|(_, read)| over(&read, width.get_untracked(), height.get_untracked()))}
            </div>
            {fold(
                "Table behind this picture",
                move || format!("{} rows", people::whole(rows() as f64)),
                false,
                move || sheet.with(|sheet| sheet.as_deref().map(|sheet| tables::table(which, sheet).view())),
            )}
        </figure>
    }
}

/// The sheet, followed only where this picture changes.
fn drawn_sheet(desk: Desk, which: Which) -> Memo<Option<Arc<Sheet>>> {
    let owned = move |held: Option<Option<Arc<Sheet>>>| {
        let new = desk.sheet.get();
        let same = match (held.as_ref().and_then(Option::as_ref), &new) {
            (Some(old), Some(new)) => Arc::ptr_eq(old, new) || drawing::same(which, old, new),
            _ => false,
        };
        match held {
            Some(held) if same => (held, false),
            _ => (new, true),
        }
    };
    Memo::new_owning(owned)
}

/// Picks a kind as a candidate, or puts it back; four letters at most.
pub(crate) fn pick(desk: Desk, technology: &str) {
    desk.look(|view| match view.picks.iter().position(|picked| picked == technology) {
        Some(at) => {
            view.picks.remove(at);
        }
        None if view.picks.len() < 4 => view.picks.push(technology.to_owned()),
        None => {}
    });
}

/// Moves the window of the net power picture to an episode, with some time around it.
pub(crate) fn show_window(desk: Desk, from_us: f64, to_us: f64) {
    let held = desk.of(|sheet| sheet.pictures.net.window_us);
    let length = (held.1 - held.0).max((to_us - from_us) * 1.2);
    let middle = f64::midpoint(from_us, to_us);
    put_window(desk, (middle - length / 2.0, middle + length / 2.0));
}

/// The hairline and the dot of a read-out, over the canvas.
fn over(read: &Readout, width: u32, height: u32) -> impl IntoView + use<> {
    let (x, y) = read.at;
    let (top, foot) = read.hair;
    view! {
        <svg class="over" viewBox=format!("0 0 {width} {height}") aria-hidden="true">
            <path class="cross" d=format!("M{x:.1} {top:.1}V{foot:.1}")></path>
            <circle class="dot" cx=format!("{x:.1}") cy=format!("{y:.1}") r="4"></circle>
        </svg>
    }
}

/// The width of an element, followed as it changes.
fn width_of(place: NodeRef<Div>) -> RwSignal<u32> {
    let width = RwSignal::new(0_u32);
    let watch = StoredValue::new_local(None::<(ResizeObserver, Closure<dyn FnMut()>)>);
    Effect::new(move || {
        let Some(element) = place.get() else { return };
        let measured = element.clone();
        let changed = Closure::<dyn FnMut()>::new(move || {
            let now = u32::try_from(measured.client_width()).unwrap_or(0);
            if now != 0 && width.try_get_untracked() != Some(now) {
                width.try_set(now);
            }
        });
        if let Ok(observer) = ResizeObserver::new(changed.as_ref().unchecked_ref()) {
            observer.observe(&element);
            watch.set_value(Some((observer, changed)));
        }
        width.set(u32::try_from(element.client_width()).unwrap_or(0));
    });
    on_cleanup(move || {
        watch.try_update_value(|watch| {
            if let Some((observer, _)) = watch.take() {
                observer.disconnect();
            }
        });
    });
    // Another screen with another density: browsers tell it as a change of the window.
    let resized = EventListener::new(&window(), "resize", move |_| {
        width.try_update(|_| ());
    });
    let resized = StoredValue::new_local(Some(resized));
    on_cleanup(move || {
        resized.try_update_value(Option::take);
    });
    width
}

/// Where on the canvas the pointer is, px.
fn position(event: &PointerEvent) -> Option<(f64, f64)> {
    let canvas: HtmlCanvasElement = event.current_target()?.dyn_into().ok()?;
    let area = canvas.get_bounding_client_rect();
    Some((f64::from(event.client_x()) - area.left(), f64::from(event.client_y()) - area.top()))
}

fn row_length(desk: Desk, which: Which) -> isize {
    if which == Which::Year {
        isize::try_from(desk.of(|sheet| sheet.pictures.year.cells_per_row)).unwrap_or(1)
    } else {
        1
    }
}

/// What a press takes hold of, if anything; a press on a kind of the plane picks it.
fn take(desk: Desk, which: Which, hits: &Hits, at: (f64, f64)) -> Option<Drag> {
    match which {
        Which::Net => {
            let strip = hits.second.as_ref()?;
            match hits.spot(at).map(|spot| spot.name.as_str()) {
                Some("from") => return Some(Drag::From),
                Some("to") => return Some(Drag::To),
                _ => {}
            }
            if !strip.holds(at) {
                return None;
            }
            let (from, to) = desk.of(|sheet| sheet.pictures.net.window_us);
            let taken = strip.x.at(at.0);
            // Outside the window the press brings it there, taken by its middle.
            Some(Drag::Window(if (from..=to).contains(&taken) { taken - from } else { (to - from) / 2.0 }))
        }
        Which::Coverage => (hits.spot(at)?.name == "asked").then_some(Drag::Asked),
        Which::Plane => {
            let name = hits.spot(at)?.name.clone();
            if desk.of(|sheet| sheet.pictures.plane.strands.iter().any(|strand| strand.technology == name)) {
                pick(desk, &name);
            }
            None
        }
        _ => None,
    }
}

/// While dragging the picture follows as fast as the worker answers.
fn dragged(desk: Desk, drag: Drag, hits: &Hits, at: (f64, f64)) {
    if drag != Drag::Asked && desk.idle() {
        dropped(desk, drag, hits, at);
    }
}

fn dropped(desk: Desk, drag: Drag, hits: &Hits, at: (f64, f64)) {
    if drag == Drag::Asked {
        return ask(desk, hits.main.x.clamp(hits.main.x.at(at.0)));
    }
    let Some(strip) = &hits.second else { return };
    let (from, to) = desk.of(|sheet| sheet.pictures.net.window_us);
    let now = strip.x.at(at.0);
    // An hour is the shortest window.
    let least = 3600e6;
    put_window(
        desk,
        match drag {
            Drag::From => (now.min(to - least), to),
            Drag::To => (from, now.max(from + least)),
            Drag::Window(taken) => (now - taken, now - taken + (to - from)),
            Drag::Asked => return,
        },
    );
}

/// Asks what the curve gives at an energy.
fn ask(desk: Desk, energy_kwh: f64) {
    let point = desk.of(|sheet| {
        let coverage = &sheet.pictures.coverage;
        let curve = coverage.curves.first()?;
        let value = *curve.value.get(nearest(&curve.energy_kwh, energy_kwh)?)?;
        value.is_finite().then_some((coverage.measure, value))
    });
    match point {
        Some((Measure::ServedShare, share)) => {
            desk.edit(|case| case.put(&["requirement", "served_share"], (share * 1e4).round() / 1e4));
        }
        Some((Measure::HeldImportKw, kw)) => desk.edit(|case| {
            super::duty::hold_limits(case);
            case.put(&["duty", "import_limit_kw"], (kw * 100.0).round() / 100.0);
        }),
        _ => {}
    }
}

fn shift_window(desk: Desk, share: f64) {
    let (from, to) = desk.of(|sheet| sheet.pictures.net.window_us);
    let by = (to - from) * share;
    put_window(desk, (from + by, to + by));
}

/// Puts the window within the record, keeping its length where it can.
fn put_window(desk: Desk, (from, to): (f64, f64)) {
    let ends = desk.of(|sheet| {
        let strip = &sheet.pictures.net.strip_us;
        let (first, last) = (strip.first().copied()?, strip.last().copied()?);
        let cell = strip.get(1).map_or(0.0, |second| second - first);
        Some((first, last + cell))
    });
    let Some((first, last)) = ends else { return };
    let length = (to - from).min(last - first);
    let from = from.clamp(first, (last - length).max(first));
    desk.look(|view| view.window_us = Some((from, from + length)));
}

/// What the plane's axes are divided by, in words.
pub(crate) const BASES: [(Basis, &str); 3] =
    [(Basis::Mass, "mass"), (Basis::Volume, "volume"), (Basis::Absolute, "absolute")];
