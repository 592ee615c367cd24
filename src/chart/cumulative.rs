//! The cumulative energy curve: where it falls furthest lies the critical period, and the fall is the capacity.

use super::NARROW;
use super::data::{Critical, Cumulative};
use super::frame::{Frame, Hits};
use super::label::{Patch, Placer};
use super::net::time_axis;
use super::palette::Palette;
use super::pen::{Ink, Pen, Text, roomy};
use super::shape::Point;
use super::surface::Surface;
use super::ticks;
use super::words::{at, energy_unit, extent, most};
use crate::fault::Result;
use crate::units::people::{self, NARROW as JOIN};

const TOP: f64 = 28.0;

/// Height for a width, px.
pub fn height(width: u32) -> u32 {
    (TOP + plot_height(width) + 24.0) as u32
}

fn plot_height(width: u32) -> f64 {
    if width < NARROW { 236.0 } else { 266.0 }
}

/// What it shows, in a sentence.
pub fn sentence(data: &Cumulative) -> String {
    if extent(&[&data.energy_kwh]).is_none() {
        return "Net energy since the start, after losses: no data.".to_owned();
    }
    match &data.critical {
        None => {
            "Net energy since the start, after losses, never falls: no store is needed for energy.".to_owned()
        }
        Some(c) => format!(
            "Net energy since the start, after losses, falls furthest from {} to {}, {}; the fall is {} delivered.",
            ticks::moment(c.from_us),
            ticks::moment(c.to_us),
            period(c),
            people::energy(c.delivered_kwh),
        ),
    }
}

/// The critical period's length: days and hours.
fn period(c: &Critical) -> String {
    let hours = libm::round((c.to_us - c.from_us) / 3600e6).max(0.0);
    let (days, rest) = (libm::floor(hours / 24.0), hours % 24.0);
    if days >= 1.0 {
        format!("{}{JOIN}d {}{JOIN}h", people::whole(days), people::whole(rest))
    } else {
        people::duration((c.to_us - c.from_us) / 1e6).to_string()
    }
}

/// Draws the cumulative energy curve. In the result, `main` has x in microseconds of clock reading and y in kWh.
pub fn cumulative(
    surface: &mut dyn Surface,
    size: (u32, u32),
    palette: &Palette,
    data: &Cumulative,
) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let plot = (44.0, TOP, pen.width - 6.0, TOP + plot_height(size.0));
    let (x0, y0, x1, y1) = plot;
    let critical = data
        .critical
        .filter(|c| (c.from_us + c.to_us + c.from_kwh + c.to_kwh).is_finite() && c.to_us > c.from_us);
    let levels = extent(&[&data.energy_kwh]).unwrap_or((0.0, 1.0));
    let levels = critical.map_or(levels, |c| (levels.0.min(c.to_kwh), levels.1.max(c.from_kwh)));
    // A flat line has no span of its own.
    let levels =
        if levels.1 - levels.0 > 1e-6 * most(levels) { levels } else { ticks::rounded(levels, false, 4).0 };
    // Room below the fall for the period's dimension, and above it for its words.
    let span = levels.1 - levels.0;
    let (below, above) = if critical.is_some() { (46.0, 24.0) } else { (8.0, 8.0) };
    let per_px = span / (y1 - y0 - below - above);
    let (low, high) = (levels.0 - below * per_px, levels.1 + above * per_px);
    let (size_kwh, unit) = energy_unit(levels.0.abs().max(levels.1.abs()));
    let frame = Frame::new(plot, extent(&[&data.t_us]).unwrap_or((0.0, 1.0)), (low, high));
    let marks = ticks::linear(low / size_kwh, high / size_kwh, 7);
    let tick = Text::tick(palette);
    for &v in &marks.values {
        let y = frame.y.px(v * size_kwh);
        if y < y1 - 3.0 {
            pen.level(x0, x1, y, pen.grid_ink());
        }
        pen.text((x0 - 6.0, y + 4.5), &marks.text(v), tick.end());
    }
    let long = format!("Net energy since the start, after losses, {unit}");
    let title = if tick.width(&long) < pen.width { long } else { format!("Net energy after losses, {unit}") };
    pen.text((0.0, 13.0), &title, tick);

    if let Some(c) = &critical {
        let area = fallen(&frame, data, c);
        pen.ground(&[area]);
    }
    let line: Vec<Point> = data.t_us.iter().zip(&data.energy_kwh).map(|(&t, &e)| frame.px(t, e)).collect();
    if line.iter().all(|p| !p.1.is_finite()) {
        pen.nothing(plot);
    }
    pen.line(&line, Ink::new(palette.requirement, palette.pens.requirement));
    time_axis(&mut pen, &frame, y1);
    if let Some(c) = &critical {
        dimensions(&mut pen, &frame, c, &line);
    }
    pen.lift()?;
    Ok(Hits { main: frame, second: None, spots: Vec::new() })
}

/// The area between the level at which the period starts and the curve under it.
fn fallen(frame: &Frame, data: &Cumulative, c: &Critical) -> Vec<Point> {
    let top = frame.y.px(c.from_kwh);
    let (from, to) = (frame.x.px(c.from_us), frame.x.px(c.to_us).min(frame.plot.2));
    let mut area = vec![(from.max(frame.plot.0), top)];
    for (&t, &e) in data.t_us.iter().zip(&data.energy_kwh) {
        let (x, y) = frame.px(t, e);
        if t > c.from_us && t < c.to_us && y.is_finite() {
            area.push((x, y.max(top)));
        }
    }
    if let Some(end) = at(&data.t_us, &data.energy_kwh, c.to_us) {
        area.push((to, frame.y.px(end).max(top)));
    }
    let last = area.last().map_or(to, |p| p.0);
    area.push((last, top));
    area
}

/// The fall as an upright dimension, the period as a level one.
fn dimensions(pen: &mut Pen<'_>, frame: &Frame, c: &Critical, line: &[Point]) {
    let (x0, y0, x1, y1) = frame.plot;
    let (top, bottom) = (frame.y.px(c.from_kwh), frame.y.px(c.to_kwh));
    let (from, to) = (frame.x.px(c.from_us), frame.x.px(c.to_us));
    let (left, right) = (from.max(x0), to.min(x1));
    if left >= x1 || right <= x0 {
        return;
    }
    let upright = if right + 40.0 <= x1 { right + 24.0 } else { x1 - 6.0 };
    let solid = Ink::new(pen.palette.ink, 0.9);
    pen.level(left, (upright + 10.0).min(x1), top, solid);
    if upright > right {
        pen.level(right, (upright + 10.0).min(x1), bottom, solid);
    }
    pen.upwards(upright, top, bottom);
    let base = y1 - 15.0;
    for (x, y) in [(from, top), (to, bottom)] {
        if x >= x0 && x <= x1 {
            pen.dotted((x, y), (x, base + 2.0));
        }
    }
    pen.across((left, from < x0), (right, to > x1), base);

    let look = Text::label(pen.palette.ink).bold();
    let mut placer = Placer::new(Patch { x0: x0 - 2.0, y0: y0 - 10.0, x1: pen.width - 1.0, y1: y1 - 16.0 });
    placer.avoid(line);
    let energy = people::energy(c.delivered_kwh);
    let words = [
        format!("the fall, {energy} delivered, is the capacity"),
        format!("{energy} delivered"),
        energy.to_string(),
    ];
    let mut options = Vec::new();
    for text in &words {
        let wide = look.width(text);
        for at in [
            upright + 4.0 - wide,
            right - wide,
            f64::midpoint(left, right) - wide / 2.0,
            left,
            x1 - wide,
            x0 + 4.0,
        ] {
            if at + wide <= x1 {
                options.push(((at, top - 8.0), text.as_str()));
            }
        }
    }
    pen.text_at(&mut placer, &options, look);
    let words = [format!("critical period, {}", period(c)), period(c)];
    let mut options = Vec::new();
    for text in &words {
        let half = look.width(text) / 2.0;
        let x = f64::midpoint(left, right).clamp(x0 + half, (x1 - half).max(x0 + half));
        options.push(((x, base - 7.0), text.as_str()));
    }
    pen.text_at(&mut placer, &options, look.middle());
}
