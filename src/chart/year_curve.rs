//! The duration curve beside the year sheet, on the colour bar as its power axis.

use super::data::DurationCurve;
use super::frame::Frame;
use super::label::{Patch, Placer};
use super::pen::{Ink, Pen, Text};
use super::shape::Point;
use super::ticks;
use super::words::{at, in_unit, most, power_unit};
use super::year::{Scale, corners, fine_hatch, shade, word};
use crate::units::people::{self, NARROW};

/// Where the curve goes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Place {
    /// Left edge of the colour bar.
    pub(super) bar: f64,
    /// Left, top, right, bottom of the curve.
    pub(super) plot: (f64, f64, f64, f64),
    /// Where the axis title starts.
    pub(super) title: Point,
    /// For a phone.
    pub(super) narrow: bool,
}

const BAR: f64 = 12.0;

pub(super) fn draw(
    pen: &mut Pen<'_>,
    place: &Place,
    curve: &DurationCurve,
    mut powers: (f64, f64),
    scale: &Scale,
) -> Frame {
    let (x0, y0, x1, y1) = place.plot;
    if let Some(limit) = curve.import_limit_kw.filter(|l| l.is_finite()) {
        powers.0 = powers.0.min(-limit);
    }
    let (kw, unit) = power_unit(most(powers));
    let ((low, high), marks) = ticks::rounded(in_unit(powers, kw), true, if y1 - y0 > 250.0 { 7 } else { 5 });
    let (low, high) = (low * kw, high * kw);
    let hours = curve.hours.iter().copied().filter(|h| h.is_finite()).fold(0.0, f64::max);
    let frame = Frame::new(place.plot, (0.0, hours), (low, high));
    let palette = pen.palette;
    let tick = Text::tick(palette);

    for (from, to, class) in scale.bands(low, high) {
        let area = (place.bar, frame.y.px(to), place.bar + BAR, frame.y.px(from));
        pen.rect(area, shade(palette, class), 1.0);
        if class < 0 {
            fine_hatch(pen, &[corners(area)]);
        }
    }
    let mut edge = corners((place.bar, y0, place.bar + BAR, y1));
    edge.push(edge[0]);
    pen.line(&edge, Ink::new(palette.ink, palette.pens.hair));
    for &p in &marks.values {
        let y = frame.y.px(p * kw);
        pen.level(place.bar - 4.0, place.bar, y, pen.axis_ink());
        pen.text((place.bar - 8.0, y + 4.5), &marks.text(p), tick.end());
        if p != 0.0 {
            pen.level(x0, x1, y, pen.grid_ink());
        }
    }
    let over = if place.narrow { ", against hours reached" } else { "" };
    pen.text(place.title, &format!("Net power, {unit}{over}"), tick);

    let line: Vec<Point> = curve.hours.iter().zip(&curve.net_kw).map(|(&h, &p)| frame.px(h, p)).collect();
    let zero = frame.y.px(0.0);
    let (above, below) = halves(&line, zero);
    if line.iter().all(|p| !p.1.is_finite()) {
        pen.nothing(place.plot);
    }
    pen.water(&area(&above, zero));
    pen.ground(&area(&below, zero));
    pen.line(&above, Ink::new(palette.surplus, palette.pens.line));
    pen.line(&below, Ink::new(palette.deficit, palette.pens.line));
    pen.level(x0, x1, zero, pen.axis_ink());

    if low < 0.0 {
        pen.level(x0, x1, y1, pen.axis_ink());
    }
    hour_ticks(pen, &frame);
    labels(pen, &frame, curve, (&above, &below));
    frame
}

/// The curve's parts above and below zero, each ending where it crosses.
fn halves(line: &[Point], zero: f64) -> (Vec<Point>, Vec<Point>) {
    let (mut above, mut below) = (Vec::new(), Vec::new());
    let mut before: Option<Point> = None;
    for &p in line.iter().filter(|p| p.1.is_finite()) {
        if let Some(b) = before
            && (b.1 < zero) != (p.1 < zero)
        {
            let cross = (b.0 + (zero - b.1) / (p.1 - b.1) * (p.0 - b.0), zero);
            above.push(cross);
            below.push(cross);
        }
        if p.1 <= zero {
            above.push(p);
        }
        if p.1 > zero {
            below.push(p);
        }
        before = Some(p);
    }
    (above, below)
}

fn area(line: &[Point], zero: f64) -> Vec<Vec<Point>> {
    let (Some(first), Some(last)) = (line.first(), line.last()) else { return Vec::new() };
    let mut area = line.to_vec();
    area.extend([(last.0, zero), (first.0, zero)]);
    vec![area]
}

fn hour_ticks(pen: &mut Pen<'_>, frame: &Frame) {
    let (x0, _, x1, y1) = frame.plot;
    let marks = ticks::linear(0.0, frame.x.to, (((x1 - x0) / 42.0) as usize).clamp(1, 8));
    let look = Text::tick(pen.palette);
    let last = marks.values.len().saturating_sub(1);
    let mut placer = Placer::new(Patch { x0: x0 - 20.0, y0: y1, x1: pen.width, y1: y1 + 30.0 });
    for (i, &h) in marks.values.iter().enumerate() {
        let x = frame.x.px(h);
        pen.upright(x, y1, y1 + 4.0, pen.axis_ink());
        let text = if i == last { format!("{}{NARROW}h", marks.text(h)) } else { marks.text(h) };
        let look =
            if i == last && x + look.width(&text) / 2.0 > pen.width { look.end() } else { look.middle() };
        let at = (if i == last { x.min(pen.width) } else { x }, y1 + 18.0);
        if placer.first_free(&[look.patch(at, &text)]).is_some() {
            pen.text(at, &text, look);
        }
    }
}

/// Surplus and deficit with their energies, and the limit.
fn labels(pen: &mut Pen<'_>, frame: &Frame, curve: &DurationCurve, (above, below): (&[Point], &[Point])) {
    let palette = pen.palette;
    let (x0, y0, x1, y1) = frame.plot;
    let zero = frame.y.px(0.0);
    let mut placer = Placer::new(Patch { x0: x0 + 4.0, y0: y0 + 2.0, x1, y1: y1 - 2.0 });
    for line in [above, below] {
        placer.avoid(line);
    }
    placer.take(Patch { x0, y0: zero - 2.0, x1, y1: zero + 2.0 });
    if let Some(limit) = curve.import_limit_kw.filter(|l| l.is_finite()) {
        let y = frame.y.px(-limit);
        pen.level(x0, x1, y, Ink::new(palette.requirement, palette.pens.line));
        placer.take(Patch { x0, y0: y - 2.0, x1, y1: y + 2.0 });
        let look = Text::label(palette.ink);
        let text = format!("import limit, {}", people::power(limit));
        let options = [(x0 + 6.0, y + 17.0), (x0 + 6.0, y - 6.0)].map(|at| (at, text.as_str()));
        pen.text_at(&mut placer, &options, look);
    }
    let (heard, short) = (curve.surplus_kwh, curve.deficit_kwh.abs());
    let sides = [
        (above, "surplus", heard, palette.surplus_text, true),
        (below, word(curve), short, palette.deficit_text, false),
    ];
    for (line, name, energy, colour, up) in sides {
        if line.len() < 2 || energy == 0.0 {
            continue;
        }
        let look = Text::label(colour);
        let number = people::energy(energy).to_string();
        let wide = look.width(name).max(look.bold().width(&number));
        let (from, to) = if up { (zero, y0) } else { (zero, y1) };
        // Beside the curve first, on the empty side; then within the area.
        let mut options = Vec::new();
        for across in [0.5, 0.62, 0.4, 0.75, 0.9, 0.3, 0.2] {
            for share in [0.55, 0.42, 0.68, 0.3, 0.8, 0.18] {
                let x = x0 + across * (x1 - x0) - if up { 0.0 } else { wide };
                options
                    .push((x.clamp(x0 + 6.0, (x1 - wide - 2.0).max(x0 + 6.0)), from + share * (to - from)));
            }
        }
        let empty = |o: &Point| {
            let (xs, ys): (Vec<f64>, Vec<f64>) = line.iter().copied().unzip();
            [o.0 - 5.0, o.0 + wide + 5.0]
                .iter()
                .all(|x| at(&xs, &ys, *x).is_none_or(|y| if up { y > o.1 + 22.0 } else { y < o.1 - 14.0 }))
        };
        let (free, covered): (Vec<Point>, Vec<Point>) = options.into_iter().partition(empty);
        let options = [free, covered].concat();
        let patches: Vec<Patch> = options
            .iter()
            .map(|o| Patch { x0: o.0, y0: o.1 - 11.0, x1: o.0 + wide, y1: o.1 + 21.0 })
            .collect();
        if let Some(i) = placer.first_clear(&patches) {
            let (x, y) = options[i];
            pen.text((x, y), name, look);
            pen.text((x, y + 17.0), &number, look.bold());
            continue;
        }
        // No room for two lines: one.
        let line = format!("{name} {number}");
        let wide = look.width(&line);
        let mut options = Vec::new();
        for y in [18.0, 32.0, 46.0, 60.0, 80.0, 110.0] {
            for across in [0.55, 0.8, 0.3, 1.0, 0.1] {
                let x = x0 + 6.0 + across * (x1 - x0 - wide - 10.0).max(0.0);
                options.push(((x, if up { zero - y + 12.0 } else { zero + y }), line.as_str()));
            }
        }
        pen.text_at(&mut placer, &options, look);
    }
}
