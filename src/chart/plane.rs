//! The Ragone plane: kinds of storage as strands of curves of power against deliverable energy, lines of equal time, and
//! the requirement as a line across it with a tick at the point that the budget sets.

use std::fmt::Write as _;

use super::NARROW;
use super::data::{Basis, Plane, Strand, Verdict};
use super::frame::{Axis, Frame, Hits, Spot};
use super::label::Patch;
use super::palette::Palette;
use super::pen::{Ink, Pen, Text, roomy};
use super::plane_labels::{self, Named};
use super::shape::{self, Lie, Point};
use super::surface::Surface;
use super::ticks;
use crate::fault::Result;
use crate::numeric::rising;
use crate::units::people::{self, NARROW as JOIN};

const TOP: f64 = 44.0;
/// Side of a verdict's mark, px.
const MARK: f64 = 9.0;
/// Dashes of the candidates, A to D.
const DASHES: [&[f64]; 4] = [&[], &[12.0, 5.0], &[10.0, 3.0, 1.5, 3.0], &[4.0, 2.5]];
/// Lines of equal time: hours and name.
const TIMES: [(f64, &str); 5] = [
    (1.0 / 3600.0, "1\u{202f}s"),
    (1.0 / 60.0, "1\u{202f}min"),
    (1.0, "1\u{202f}h"),
    (24.0, "1\u{202f}d"),
    (730.0, "1\u{202f}month"),
];
/// Decades that are shown at most, from the top.
const MOST_DECADES: f64 = 7.0;

/// Height for a width, px.
pub fn height(width: u32) -> u32 {
    (TOP + plot_height(width) + 44.0) as u32
}

fn plot_height(width: u32) -> f64 {
    if width < NARROW { 440.0 } else { 580.0 }
}

fn units(basis: Basis) -> (&'static str, &'static str) {
    match basis {
        Basis::Mass => ("Energy per installed mass, Wh/kg", "Power per installed mass, W/kg"),
        Basis::Volume => ("Energy per installed volume, Wh/l", "Power per installed volume, W/l"),
        Basis::Absolute => ("Energy, kWh", "Power, kW"),
    }
}

/// What it shows, in a sentence.
pub fn sentence(data: &Plane) -> String {
    let (across, up) = units(data.basis);
    let mut text = format!(
        "Ragone plane, {} against {}: {} kinds of storage",
        lower(up),
        lower(across),
        data.strands.len()
    );
    if let Some((power, energy)) = data.requirement {
        let _ = write!(
            text,
            "; the requirement is {} at {}, {}",
            people::energy(energy),
            people::power(power),
            people::duration(energy / power * 3600.0)
        );
        if !data.budget.is_empty() {
            let _ = write!(text, ", with its point at {}", data.budget);
        }
    }
    for (verdict, word) in
        [(Verdict::Carries, "carrying it"), (Verdict::Strains, "straining"), (Verdict::Fails, "failing")]
    {
        let names: Vec<&str> =
            data.strands.iter().filter(|s| s.verdict == Some(verdict)).map(|s| s.name.as_str()).collect();
        if !names.is_empty() {
            let _ = write!(text, "; {word}: {}", names.join(", "));
        }
    }
    text + "."
}

fn lower(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |c| std::iter::once(c.to_ascii_lowercase()).chain(chars).collect())
}

/// Draws the plane.
///
/// In the result, `main` has logarithmic axes in the units of the basis; spots are the names and marks of the kinds, by the
/// identifier of the technology, and "point" for the tick of the requirement.
pub fn plane(surface: &mut dyn Surface, size: (u32, u32), palette: &Palette, data: &Plane) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let narrow = size.0 < NARROW;
    let right = if narrow { 36.0 } else { 62.0 };
    let plot = (0.0, TOP, pen.width - right, TOP + plot_height(size.0));
    let upright = ends(plot, data).y;
    let widest =
        ticks::log(upright.from, upright.to).0.into_iter().map(|p| Text::tick(palette).width(&decade(p)));
    let left = widest.fold(40.0 - 12.0, f64::max) + 12.0;
    let frame = ends((left, plot.1, plot.2, plot.3), data);
    let plot = frame.plot;
    axes(&mut pen, &frame, data.basis, narrow);
    let mut taken = equal_times(&mut pen, &frame, narrow);
    let mut spots = Vec::new();

    // Kinds that were not picked lie below those that were.
    let (picked, others): (Vec<&Strand>, Vec<&Strand>) =
        data.strands.iter().partition(|strand| strand.candidate.is_some());
    let mut named = Vec::new();
    for strand in others.into_iter().chain(picked) {
        if let Some(line) = draw_strand(&mut pen, &frame, strand) {
            named.push(Named { strand, line });
        }
    }
    if data.strands.is_empty() {
        pen.nothing(plot);
    }
    let mut lines: Vec<Vec<Point>> = Vec::new();
    if let Some(line) = requirement(&mut pen, &frame, data, &named, &mut taken, &mut spots) {
        lines.push(line);
    }
    for strand in &data.strands {
        if let (Some((e, p)), Some(verdict)) = (strand.meets, strand.verdict) {
            let at = frame.px(e, p);
            if frame.holds(at) {
                mark(&mut pen, at, verdict);
                taken.push(Patch::around(at, MARK / 2.0 + 2.0));
                spots.push(Spot { name: strand.technology.clone(), area: Patch::around(at, 12.0).area() });
            }
        }
    }
    // The first named keeps its place: candidates, then the others as they were given.
    let places: Vec<f64> = named
        .iter()
        .map(|n| {
            let place = data.strands.iter().position(|s| s.technology == n.strand.technology).unwrap_or(0);
            f64::from(n.strand.candidate.unwrap_or(u8::MAX)) * 1000.0 + place as f64
        })
        .collect();
    let mut waiting: Vec<Option<Named<'_>>> = named.into_iter().map(Some).collect();
    let named: Vec<Named<'_>> = rising(&places).into_iter().filter_map(|i| waiting[i].take()).collect();
    spots.extend(plane_labels::draw(&mut pen, &frame, &named, &taken, &lines));
    pen.lift()?;
    Ok(Hits { main: frame, second: None, spots })
}

/// Positive numbers of a curve.
fn usable(curve: &[(f64, f64)]) -> impl Iterator<Item = (f64, f64)> {
    curve.iter().copied().filter(|(e, p)| e.is_finite() && p.is_finite() && *e > 0.0 && *p > 0.0)
}

/// The axes' ends: all curves at their fullest, the point, and where typical curves meet the requirement.
fn ends(plot: (f64, f64, f64, f64), data: &Plane) -> Frame {
    let none = (f64::INFINITY, 0.0_f64);
    let (mut energy, mut power) = (none, none);
    let widen = |range: &mut (f64, f64), v: f64| *range = (range.0.min(v), range.1.max(v));
    for strand in &data.strands {
        for curve in std::iter::once(&strand.typical).chain(&strand.others) {
            let fullest = usable(curve).map(|c| c.0).fold(0.0, f64::max);
            if fullest > 0.0 {
                widen(&mut energy, fullest);
                widen(&mut power, usable(curve).map(|c| c.1).fold(0.0, f64::max));
            }
        }
        let least = usable(&strand.typical).map(|c| c.1).fold(f64::INFINITY, f64::min);
        if least.is_finite() {
            widen(&mut power, least);
        }
    }
    let points = data.strands.iter().filter_map(|s| s.meets).chain(data.point);
    for (e, p) in points.filter(|(e, p)| e.is_finite() && p.is_finite() && *e > 0.0 && *p > 0.0) {
        widen(&mut energy, e);
        widen(&mut power, p);
    }
    if energy.1 <= 0.0 {
        (energy, power) = ((1.0, 1000.0), (1.0, 10_000.0));
    }
    let bounded = |(low, high): (f64, f64), below: f64, above: f64| {
        let high = high * above;
        ((low * below).max(high / libm::pow(10.0, MOST_DECADES)), high)
    };
    Frame {
        plot,
        x: Axis::log(bounded(energy, 0.5, 1.8), (plot.0, plot.2)),
        y: Axis::log(bounded(power, 0.6, 1.8), (plot.3, plot.1)),
    }
}

fn axes(pen: &mut Pen<'_>, frame: &Frame, basis: Basis, narrow: bool) {
    let (x0, y0, x1, y1) = frame.plot;
    let tick = Text::tick(pen.palette);
    let (decades, between) = ticks::log(frame.x.from, frame.x.to);
    for &e in &decades {
        let x = frame.x.px(e);
        pen.upright(x, y0, y1, pen.grid_ink());
        pen.text((x, y1 + 18.0), &decade(e), tick.middle());
    }
    for &e in &between {
        let x = frame.x.px(e);
        pen.upright(x, y1 - 3.0, y1, pen.hair_ink());
        if decades.len() < 2 && names_too(e) {
            pen.text((x, y1 + 18.0), &decade(e), tick.middle());
        }
    }
    let (decades, between) = ticks::log(frame.y.from, frame.y.to);
    for &p in &decades {
        let y = frame.y.px(p);
        pen.level(x0, x1, y, pen.grid_ink());
        pen.text((x0 - 7.0, y + 4.5), &decade(p), tick.end());
    }
    for &p in &between {
        let y = frame.y.px(p);
        pen.level(x0, x0 + 3.0, y, pen.hair_ink());
        if decades.len() < 2 && names_too(p) {
            pen.text((x0 - 7.0, y + 4.5), &decade(p), tick.end());
        }
    }
    pen.level(x0, x1, y1, pen.axis_ink());
    pen.upright(x0, y0, y1, pen.axis_ink());
    let (across, up) = units(basis);
    pen.text((if narrow { pen.width } else { x1 }, y1 + 38.0), across, tick.end());
    pen.text((0.0, 14.0), up, tick);
}

/// Whether a tick between decades is named where there are too few decades for a scale: at 2 and 5.
fn names_too(value: f64) -> bool {
    let lead = value / libm::pow(10.0, libm::floor(libm::log10(value) + 1e-9));
    (lead - 2.0).abs() < 1e-6 || (lead - 5.0).abs() < 1e-6
}

fn decade(value: f64) -> String {
    people::significant(value, 1)
}

/// A line of constant time, from lower left to upper right, within the frame.
fn time_line(frame: &Frame, hours: f64) -> Option<(Point, Point)> {
    let at = |e: f64| frame.px(e, e / hours);
    shape::clip(at(frame.x.from / 1e3), at(frame.x.to * 1e3), frame.plot)
}

fn equal_times(pen: &mut Pen<'_>, frame: &Frame, narrow: bool) -> Vec<Patch> {
    let (_, y0, x1, _) = frame.plot;
    let look = Text::tick(pen.palette);
    let mut taken = Vec::new();
    for (hours, name) in TIMES {
        // The month's name is too wide for a phone's margin.
        let (hours, name) = if narrow && hours > 700.0 { (720.0, "30\u{202f}d") } else { (hours, name) };
        let Some((a, b)) = time_line(frame, hours) else { continue };
        if libm::hypot(a.0 - b.0, a.1 - b.1) < 20.0 {
            continue;
        }
        pen.dashed(&[a, b], pen.hair_ink(), &[1.0, 4.0]);
        let (at, look) = if b.1 < y0 + 1.0 {
            let half = look.width(name) / 2.0;
            ((b.0.min(pen.width - half), y0 - 6.0), look.middle())
        } else {
            ((x1 + 5.0, b.1 + 4.5), look)
        };
        pen.text(at, name, look);
        taken.push(look.patch(at, name));
    }
    taken
}

/// Draws a kind; gives the visible part of its typical curve, from the top.
fn draw_strand(pen: &mut Pen<'_>, frame: &Frame, strand: &Strand) -> Option<Vec<Point>> {
    let colour = strand.candidate.map_or(pen.palette.strand, |c| pen.palette.candidate(c));
    let dash = strand.candidate.and_then(|c| DASHES.get(usize::from(c))).copied().unwrap_or(&[]);
    let visible = |curve: &[(f64, f64)]| -> Vec<Point> {
        let line: Vec<Point> = usable(curve).map(|(e, p)| frame.px(e, p)).collect();
        shape::clip_line(&line, frame.plot).into_iter().max_by_key(Vec::len).unwrap_or_default()
    };
    let half = strand.others.len().max(1) as f64 / 2.0;
    for (i, other) in strand.others.iter().enumerate() {
        // Distance from the typical curve, 0 to 1: fainter outwards.
        let i = i as f64;
        let away = if i < half { (half - i) / half } else { (i + 1.0 - half) / half };
        let ink = Ink::new(colour, 0.9 * pen.palette.pens.thin).faint(0.8 - 0.45 * away.clamp(0.0, 1.0));
        fading(pen, &visible(other), ink, &[], strand.fluid_only);
    }
    let line = visible(&strand.typical);
    let width = if strand.fluid_only { 2.6 } else { 2.1 };
    fading(pen, &line, Ink::new(colour, width * pen.palette.pens.thin), dash, strand.fluid_only);
    (line.len() > 1)
        .then(|| if line[0].1 <= line[line.len() - 1].1 { line } else { line.into_iter().rev().collect() })
}

/// A curve whose two ends fade to nothing over the last sixth of its height, its dashes carried on.
fn fading(pen: &mut Pen<'_>, line: &[Point], ink: Ink, dash: &[f64], beaded: bool) {
    const STEPS: f64 = 8.0;
    if line.len() < 2 {
        return;
    }
    let (top, bottom) =
        line.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), p| (a.min(p.1), b.max(p.1)));
    let sixth = (bottom - top) / 6.0;
    // Opacity in steps, so that the middle of a curve stays one line.
    let alpha = |y: f64| {
        let share = if sixth < 1.0 { 1.0 } else { ((y - top).min(bottom - y) / sixth).clamp(0.0, 1.0) };
        (libm::ceil(share * STEPS) / STEPS).max(0.06) * ink.alpha
    };
    if beaded {
        for (part, _) in shape::dashes(line, &[0.1, 4.9]) {
            pen.dot(part[0], ink.width * 0.55, ink.colour, alpha(part[0].1));
        }
        return;
    }
    for (part, _) in shape::dashes(&finely(line, sixth / STEPS), dash) {
        let mut from = 0;
        let of = |i: usize| alpha(f64::midpoint(part[i].1, part[i + 1].1));
        for i in 0..part.len().saturating_sub(1) {
            if i + 2 == part.len() || of(i) != of(i + 1) {
                pen.line(&part[from..i + 2], ink.faint(of(i)));
                from = i + 1;
            }
        }
    }
}

/// The line with points added so that no part rises by more than `rise`.
fn finely(line: &[Point], rise: f64) -> Vec<Point> {
    let mut fine = vec![line[0]];
    for ends in line.windows(2) {
        let (a, b) = (ends[0], ends[1]);
        let parts = if rise > 0.5 { libm::ceil((b.1 - a.1).abs() / rise).clamp(1.0, 100.0) } else { 1.0 };
        for k in 1..=parts as usize {
            let s = k as f64 / parts;
            fine.push((a.0 + s * (b.0 - a.0), a.1 + s * (b.1 - a.1)));
        }
    }
    fine
}

/// The requirement: a line of its time across the plane, and a tick square to it at the budget's point, both named.
fn requirement(
    pen: &mut Pen<'_>,
    frame: &Frame,
    data: &Plane,
    named: &[Named<'_>],
    taken: &mut Vec<Patch>,
    spots: &mut Vec<Spot>,
) -> Option<Vec<Point>> {
    let (power, energy) = data.requirement.filter(|(p, e)| *p > 0.0 && *e > 0.0 && (p + e).is_finite())?;
    let palette = pen.palette;
    let ink = Ink::new(palette.requirement, palette.pens.requirement);
    let line = time_line(frame, energy / power);
    if let Some((a, b)) = line {
        pen.line(&[a, b], ink);
    }
    let look = Text::label(palette.ink);
    if let Some(at) = data.point.map(|(e, p)| frame.px(e, p)).filter(|at| frame.holds(*at)) {
        let (a, b) = (frame.px(1.0, 1.0), frame.px(10.0, 10.0));
        let length = libm::hypot(b.0 - a.0, b.1 - a.1);
        let square = ((a.1 - b.1) / length, (b.0 - a.0) / length);
        let ends = [-20.0, 20.0].map(|r| (at.0 + square.0 * r, at.1 + square.1 * r));
        pen.line(&ends, ink);
        taken.push(
            Patch::around(at, 1.0).joined(Patch::around(ends[0], 2.0)).joined(Patch::around(ends[1], 2.0)),
        );
        spots.push(Spot { name: "point".to_owned(), area: Patch::around(at, 20.0).area() });
        let words = look.bold();
        let wide = words.width(&data.budget);
        let places = [
            (ends[1].0 + 5.0, ends[1].1 + 12.0),
            (ends[1].0 - 5.0 - wide, ends[1].1 + 14.0),
            (ends[0].0 - 6.0 - wide, ends[0].1 - 4.0),
            (ends[0].0 + 6.0, ends[0].1 - 4.0),
        ];
        let free = |p: &&Point| within(words.patch(**p, &data.budget), frame);
        if let Some(&place) = places.iter().find(free) {
            pen.text(place, &data.budget, words);
            taken.push(words.patch(place, &data.budget).grown(3.0));
        }
    }
    let (a, b) = line?;
    name_line(pen, frame, (a, b), (power, energy), named, taken);
    Some(vec![a, b])
}

fn within(patch: Patch, frame: &Frame) -> bool {
    let (x0, y0, x1, y1) = frame.plot;
    patch.within(&Patch { x0: x0 + 2.0, y0: y0 + 2.0, x1, y1: y1 - 2.0 })
}

/// Names the requirement beside its line: under its right end, or where there is room for two short lines.
fn name_line(
    pen: &mut Pen<'_>,
    frame: &Frame,
    (a, b): (Point, Point),
    (power, energy): (f64, f64),
    named: &[Named<'_>],
    taken: &mut Vec<Patch>,
) {
    let look = Text::label(pen.palette.ink).end();
    let time = people::duration(energy / power * 3600.0);
    let lines =
        ["requirement".to_owned(), format!("{} at {}, {time}", people::energy(energy), people::power(power))];
    let wide = look.width(&lines[1]).max(look.bold().width(&lines[0]));
    let slope = (b.1 - a.1) / (b.0 - a.0).max(1.0);
    let mut places = Vec::new();
    for share in [0.0, 0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.35, 0.4, 0.5, 0.6, 0.7] {
        let right = b.0 - 6.0 - share * (b.0 - a.0);
        // Below the line at the text's left end, where it is lowest.
        let below = b.1 + slope * (right - wide - b.0) + 22.0;
        let above = b.1 + slope * (right - b.0) - 30.0;
        for y in [below, above, below + 28.0, below + 56.0] {
            let patch = Patch { x0: right - wide, y0: y - 11.0, x1: right, y1: y + 22.0 };
            if within(patch, frame) && taken.iter().all(|t| !t.overlaps(&patch)) {
                places.push(((right, y), patch));
            }
        }
    }
    // The place that covers the fewest typical curves; of several the one nearest to the right end.
    let covered = |patch: &Patch| {
        named.iter().filter(|n| !shape::clip_line(&n.line, patch.grown(3.0).area()).is_empty()).count()
    };
    if let Some(((x, y), patch)) = places.into_iter().min_by_key(|(_, patch)| covered(patch)) {
        pen.text((x, y), &lines[0], look.bold());
        pen.text((x, y + 18.0), &lines[1], look);
        taken.push(patch.grown(3.0));
    }
}

/// A verdict's mark: solid carries, hatched strains, open fails.
fn mark(pen: &mut Pen<'_>, (x, y): Point, verdict: Verdict) {
    let palette = pen.palette;
    let half = MARK / 2.0;
    let area = (x - half, y - half, x + half, y + half);
    let corners = vec![(area.0, area.1), (area.2, area.1), (area.2, area.3), (area.0, area.3)];
    if verdict == Verdict::Carries {
        pen.rect(area, palette.ink, 1.0);
    } else {
        pen.rect(area, palette.paper, 1.0);
    }
    if verdict == Verdict::Strains {
        pen.hatch(std::slice::from_ref(&corners), Lie::Rising, 3.0, Ink::new(palette.ink, 1.0));
    }
    let mut outline = corners;
    outline.extend([outline[0], outline[1]]);
    pen.line(&outline, Ink::new(palette.ink, 1.25));
}

/// A kind's name as it is written on the plane, its candidate letter before it.
pub(super) fn name_of(strand: &Strand) -> String {
    match strand.candidate {
        Some(c) if c < 26 => format!("{}{JOIN} {}", char::from(b'A' + c), strand.name),
        _ => strand.name.clone(),
    }
}
