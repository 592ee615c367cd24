//! The deciding week: the power asked of a store against the power it carried, and its level below.

use std::fmt::Write as _;

use super::NARROW;
use super::data::Week;
use super::frame::{Frame, Hits};
use super::label::{Patch, Placer};
use super::net::time_axis;
use super::palette::Palette;
use super::pen::{Ink, Pen, Text, roomy};
use super::shape::Point;
use super::surface::Surface;
use super::ticks;
use super::words::{extent, in_unit, most, power_unit};
use crate::fault::Result;
use crate::numeric::rising;
use crate::units::people;

const TOP: f64 = 28.0;
const BAND: f64 = 84.0;

/// Height for a width, px.
pub fn height(width: u32) -> u32 {
    (TOP + plot_height(width) + 44.0 + BAND + 26.0) as u32
}

fn plot_height(width: u32) -> f64 {
    if width < NARROW { 180.0 } else { 200.0 }
}

fn unserved_word(data: &Week) -> &str {
    if data.unserved_word.is_empty() { "unserved" } else { &data.unserved_word }
}

/// What it shows, in a sentence.
pub fn sentence(data: &Week) -> String {
    let (Some((from, to)), Some(_)) = (extent(&[&data.t_us]), extent(&[&data.asked_kw])) else {
        return "Power asked of the store and carried by it: no data.".to_owned();
    };
    let mut unserved = 0.0;
    for ((t, asked), carried) in data.t_us.windows(2).zip(&data.asked_kw).zip(&data.carried_kw) {
        let missing = (carried - asked).max(0.0) * (t[1] - t[0]) / 3600e6;
        if *asked < 0.0 && missing.is_finite() {
            unserved += missing;
        }
    }
    let mut text = format!(
        "Power asked of the store and carried by it from {} to {}",
        ticks::moment(from),
        ticks::moment(to)
    );
    if !data.store.is_empty() {
        let _ = write!(text, " ({})", data.store);
    }
    let _ = write!(text, ": {} {}", people::energy(unserved), unserved_word(data));
    if let Some((low, high)) = extent(&[&data.level]) {
        let _ =
            write!(text, "; its level runs between {} and {}", people::percent(low), people::percent(high));
    }
    text + "."
}

/// Draws the deciding week.
///
/// In the result, `main` is the power (x in microseconds of clock reading, y in kW, charge positive), `second` the level
/// (a share).
pub fn week(surface: &mut dyn Surface, size: (u32, u32), palette: &Palette, data: &Week) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let (x0, x1) = (44.0, pen.width - 6.0);
    let plot = (x0, TOP, x1, TOP + plot_height(size.0));
    let powers = extent(&[&data.asked_kw, &data.carried_kw]).unwrap_or((0.0, 1.0));
    let (kw, unit) = power_unit(most(powers));
    let ((low, high), marks) = ticks::roomy(in_unit(powers, kw), 0.14, 6);
    let span = held_span(&data.t_us);
    let frame = Frame::new(plot, span, (low * kw, high * kw));
    let tick = Text::tick(palette);
    let long = format!("Power, {unit}, charge above and discharge below the line");
    let short = format!("Power, {unit}, charge above the line");
    let title = if tick.width(&long) + tick.width(&data.store) + 24.0 < pen.width { &long } else { &short };
    pen.text((0.0, 13.0), title, tick);
    if tick.width(title) + tick.width(&data.store) + 16.0 < pen.width {
        pen.text((x1, 13.0), &data.store, Text::tick(palette).end());
    }
    for &p in &marks.values {
        let y = frame.y.px(p * kw);
        if p != 0.0 {
            pen.level(x0, x1, y, pen.grid_ink());
        }
        pen.text((x0 - 6.0, y + 4.5), &marks.text(p), tick.end());
    }
    if data.t_us.is_empty() || extent(&[&data.asked_kw]).is_none() {
        pen.nothing(plot);
    }
    draw_powers(&mut pen, &frame, data);
    let band_top = plot.3 + 40.0;
    let band = Frame::new((x0, band_top, x1, band_top + BAND), span, (0.0, 1.0));
    draw_level(&mut pen, &band, data);
    time_axis(&mut pen, &band, band.plot.3);
    pen.lift()?;
    Ok(Hits { main: frame, second: Some(band), spots: Vec::new() })
}

/// From the first sample to the end of the last, which holds as long as the one before it (alone: an hour).
fn held_span(t_us: &[f64]) -> (f64, f64) {
    let (Some(&from), Some(&last)) = (t_us.first(), t_us.last()) else { return (0.0, 1.0) };
    let step = if t_us.len() > 1 { last - t_us[t_us.len() - 2] } else { 3600e6 };
    (from, last + step.max(0.0))
}

/// Areas between two lines over the runs where both have numbers.
fn between(upper: &[Point], lower: &[Point]) -> Vec<Vec<Point>> {
    let joined: Vec<Point> = upper.iter().zip(lower).map(|(a, b)| (a.0, a.1 + b.1)).collect();
    let mut areas = Vec::new();
    let mut from = 0;
    while from < joined.len() {
        let length = joined[from..].iter().take_while(|p| (p.0 + p.1).is_finite()).count();
        if length > 1 {
            let to = from + length;
            let mut area = upper[from..to].to_vec();
            area.extend(lower[from..to].iter().rev());
            areas.push(area);
        }
        from += length.max(1);
    }
    areas.retain(|a| {
        let half = a.len() / 2;
        (0..half).any(|i| (a[i].1 - a[a.len() - 1 - i].1).abs() > 0.3)
    });
    areas
}

fn draw_powers(pen: &mut Pen<'_>, frame: &Frame, data: &Week) {
    let palette = pen.palette;
    let zero = frame.y.px(0.0);
    // Each sample holds until the next: steps, so that areas are energies.
    let held = |value: &dyn Fn(f64, f64) -> f64| -> Vec<Point> {
        let count = data.t_us.len().min(data.asked_kw.len()).min(data.carried_kw.len());
        let mut line = Vec::with_capacity(2 * count);
        for i in 0..count {
            let y = frame.y.px(value(data.asked_kw[i], data.carried_kw[i]));
            let next = if i + 1 < count { data.t_us[i + 1] } else { frame.x.to };
            line.extend([(frame.x.px(data.t_us[i]), y), (frame.x.px(next), y)]);
        }
        line
    };
    let flat: Vec<Point> = held(&|a, c| if (a + c).is_finite() { 0.0 } else { f64::NAN });
    let asked = held(&|a, _| a);
    let carried = held(&|a, c| if a.is_finite() { c } else { f64::NAN });
    let served_down = held(&|a, c| if a < 0.0 { c.min(0.0) } else { 0.0 * (a + c) });
    let asked_down = held(&|a, c| if a < 0.0 { a } else { 0.0 * (a + c) });
    let served_up = held(&|a, c| if a > 0.0 { c.max(0.0) } else { 0.0 * (a + c) });
    let asked_up = held(&|a, c| if a > 0.0 { a } else { 0.0 * (a + c) });

    for area in between(&flat, &carried) {
        pen.fill(&area, palette.level_fill, 1.0);
    }
    let curtailed = between(&asked_up, &served_up);
    pen.lining(&curtailed, 0.45);
    let unserved = between(&served_down, &asked_down);
    pen.ground(&unserved);
    pen.line(&asked, Ink::new(palette.muted, 0.9 * palette.pens.thin));
    pen.line(&carried, Ink::new(palette.level, palette.pens.line));
    for (line, other) in [(&asked_down, &served_down)] {
        for part in apart(line, other) {
            pen.line(&part, Ink::new(palette.deficit, palette.pens.line));
        }
    }
    pen.level(frame.plot.0, frame.plot.2, zero, pen.axis_ink());
    labels(pen, frame, data, [&served_down, &asked_down, &asked_up, &served_up, &carried]);
}

/// The parts of a line that lie away from another of the same x.
fn apart(line: &[Point], other: &[Point]) -> Vec<Vec<Point>> {
    let mut parts: Vec<Vec<Point>> = Vec::new();
    let mut open = false;
    for (p, q) in line.iter().zip(other) {
        let away = (p.1 - q.1).abs() > 0.3;
        if away && open {
            if let Some(part) = parts.last_mut() {
                part.push(*p);
            }
        } else if away {
            parts.push(vec![*p]);
        }
        open = away;
    }
    parts.retain(|p| p.len() > 1);
    parts
}

/// Names the three parts where each is largest.
fn labels(pen: &mut Pen<'_>, frame: &Frame, data: &Week, lines: [&[Point]; 5]) {
    let [served_down, asked_down, asked_up, served_up, carried] = lines;
    let palette = pen.palette;
    let (x0, y0, x1, y1) = frame.plot;
    let zero = frame.y.px(0.0);
    let mut placer = Placer::new(Patch { x0: x0 + 2.0, y0: y0 - 8.0, x1, y1: y1 + 8.0 });
    placer.take(Patch { x0, y0: zero - 2.0, x1, y1: zero + 2.0 });
    // Names stand on paper, off the areas between the axis and what was asked or carried.
    let off = |patch: &Patch| {
        [asked_down, asked_up, carried].into_iter().all(|line| {
            line.iter().filter(|p| p.0 > patch.x0 - 3.0 && p.0 < patch.x1 + 3.0 && p.1.is_finite()).all(|p| {
                let (top, bottom) = (p.1.min(zero), p.1.max(zero));
                bottom <= patch.y0 || top >= patch.y1
            })
        })
    };
    // Where the two lines stand furthest apart, most of all for long.
    let widest = |a: &[Point], b: &[Point]| -> Option<(Point, Point)> {
        let apart = |i: usize| {
            let (p, q) = (a.get(i)?, b.get(i)?);
            Some((p.1 - q.1).abs()).filter(|d| d.is_finite())
        };
        let mut best: Option<(f64, usize)> = None;
        for i in 0..a.len().min(b.len()) {
            let Some(here) = apart(i).filter(|d| *d > 3.0) else { continue };
            let around =
                (i.saturating_sub(6)..=i + 6).map(|k| apart(k).unwrap_or(0.0)).fold(f64::INFINITY, f64::min);
            let score = around + 0.1 * here;
            if best.is_none_or(|(least, _)| score > least) {
                best = Some((score, i));
            }
        }
        best.map(|(_, i)| (a[i], b[i]))
    };
    let flat: Vec<Point> =
        carried.iter().map(|p| (p.0, if p.1.is_finite() { zero } else { f64::NAN })).collect();
    let named = [
        (widest(served_down, asked_down), unserved_word(data), palette.deficit_text),
        (widest(asked_up, served_up), "curtailed", palette.surplus_text),
        (widest(carried, &flat), "carried", palette.level_text),
    ];
    for (place, name, colour) in named {
        let Some((p, q)) = place else { continue };
        let thing = (p.0 + 1.0, f64::midpoint(p.1, q.1));
        let look = Text::label(colour).bold();
        let wide = look.width(name);
        let mut options = Vec::new();
        for dx in [12.0, 30.0, 50.0, 80.0, 120.0, 170.0, 230.0] {
            for dy in [-14.0, 0.0, 14.0, 28.0, -28.0, 44.0, -44.0, 62.0, -62.0, 82.0, -82.0, 104.0, -104.0] {
                options
                    .extend([(thing.0 + dx, thing.1 + dy + 5.0), (thing.0 - dx - wide, thing.1 + dy + 5.0)]);
            }
        }
        let far = |o: &Point| {
            let near = if o.0 > thing.0 { o.0 } else { o.0 + wide };
            libm::hypot(near - thing.0, o.1 - 5.0 - thing.1)
        };
        let distances: Vec<f64> = options.iter().map(far).collect();
        let options: Vec<Point> = rising(&distances).into_iter().map(|i| options[i]).collect();
        let fits = |o: &&Point| {
            let patch = look.patch(**o, name).grown(3.0);
            placer.free(&patch) && off(&patch)
        };
        let Some(&(x, y)) = options.iter().find(fits) else { continue };
        let patch = look.patch((x, y), name);
        placer.take(patch.grown(3.0));
        let end = if x > thing.0 { x - 4.0 } else { x + wide + 4.0 };
        pen.leader((end, y - 4.5), thing);
        pen.text((x, y), name, look);
    }
}

/// The level as a filled band.
fn draw_level(pen: &mut Pen<'_>, band: &Frame, data: &Week) {
    let palette = pen.palette;
    let (x0, y0, x1, y1) = band.plot;
    let tick = Text::tick(palette);
    for share in [0.0, 0.5, 1.0] {
        let y = band.y.px(share);
        if share > 0.0 {
            pen.level(x0, x1, y, pen.grid_ink());
        }
        pen.text((x0 - 6.0, y + 4.5), &people::whole(share * 100.0), tick.end());
    }
    pen.text((0.0, y0 - 14.0), "Level, % of usable", tick);
    let line: Vec<Point> = data.t_us.iter().zip(&data.level).map(|(&t, &s)| band.px(t, s)).collect();
    let flat: Vec<Point> = line.iter().map(|p| (p.0, if p.1.is_finite() { y1 } else { f64::NAN })).collect();
    for area in between(&line, &flat) {
        pen.fill(&area, palette.level_fill, 1.0);
    }
    pen.line(&line, Ink::new(palette.level, 2.0));
}
