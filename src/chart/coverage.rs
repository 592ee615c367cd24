//! What a store serves against the energy that it delivers, for up to three powers, with the points that matter named.

use std::fmt::Write as _;

use super::NARROW;
use super::data::{Coverage, CoverageCurve, CoverageMark, Measure};
use super::frame::{Frame, Hits, Spot};
use super::label::{Patch, Placer, spread};
use super::palette::Palette;
use super::pen::{Ink, Pen, Text, roomy};
use super::shape::Point;
use super::surface::Surface;
use super::ticks::{self, Ticks};
use super::words::{at, energy_unit, extent, in_unit, power_unit};
use crate::fault::Result;
use crate::units::people;

const TOP: f64 = 34.0;

/// Height for a width, px.
pub fn height(width: u32) -> u32 {
    (TOP + plot_height(width) + 44.0) as u32
}

fn plot_height(width: u32) -> f64 {
    if width < NARROW { 240.0 } else { 268.0 }
}

/// What it shows, in a sentence.
pub fn sentence(data: &Coverage) -> String {
    let mut text = format!("{} against delivered energy", title(data.measure));
    match data.curves.len() {
        0 => return text + ": no data.",
        1 => text.push_str(" at one power"),
        n => {
            let _ = write!(text, " at {n} powers");
        }
    }
    for (i, mark) in data.marks.iter().enumerate() {
        text.push_str(if i == 0 { ": " } else { "; " });
        let _ = write!(
            text,
            "{} {} at {}",
            mark.name,
            value_text(data.measure, mark.value),
            people::energy(mark.energy_kwh)
        );
    }
    text + "."
}

fn title(measure: Measure) -> &'static str {
    match measure {
        Measure::ServedShare => "Deficit served",
        Measure::SelfSufficiency => "Demand met on the site",
        Measure::HeldImportKw => "Import limit that can be held",
        Measure::CarriedShare => "Discharge carried of what is asked",
    }
}

fn value_text(measure: Measure, value: f64) -> String {
    match measure {
        Measure::ServedShare | Measure::SelfSufficiency | Measure::CarriedShare => {
            people::percent(value).to_string()
        }
        Measure::HeldImportKw => people::power(value).to_string(),
    }
}

fn power_text(curve: &CoverageCurve) -> String {
    curve.power_kw.map_or_else(|| "no limit".to_owned(), |kw| people::power(kw).to_string())
}

/// Draws what is served against delivered energy.
///
/// In the result, `main` has x in kWh delivered and y in the measure (shares from 0 to 1, or kW); each mark is a spot.
pub fn coverage(
    surface: &mut dyn Surface,
    size: (u32, u32),
    palette: &Palette,
    data: &Coverage,
) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let narrow = size.0 < NARROW;
    let names =
        data.curves.iter().map(|c| Text::label(palette.ink).bold().width(&power_text(c))).fold(0.0, f64::max);
    let right = if narrow { 10.0 } else { names + 18.0 };
    let plot = (44.0, TOP, pen.width - right, TOP + plot_height(size.0));
    let frame = axes(&mut pen, plot, data);
    let mut placer =
        Placer::new(Patch { x0: plot.0 + 2.0, y0: plot.1 - 18.0, x1: pen.width, y1: plot.3 - 4.0 });
    let mut lines = Vec::new();
    for (i, curve) in data.curves.iter().take(3).enumerate().rev() {
        let line: Vec<Point> =
            curve.energy_kwh.iter().zip(&curve.value).map(|(&e, &v)| frame.px(e, v)).collect();
        let pens = palette.pens;
        match i {
            0 => pen.line(&line, Ink::new(palette.requirement, pens.requirement)),
            1 => pen.dashed(&line, Ink::new(palette.requirement, 1.25 * pens.thin), &[8.0, 3.0]),
            _ => pen.dashed(&line, Ink::new(palette.requirement, 1.25 * pens.thin), &[3.0, 3.0]),
        }
        placer.avoid(&line);
        lines.push(line);
    }
    if lines.iter().flatten().all(|p| !p.1.is_finite()) {
        pen.nothing(plot);
    }
    let spots = draw_marks(&mut pen, &frame, data, &mut placer);
    draw_names(&mut pen, &frame, data, &mut placer, narrow);
    pen.lift()?;
    Ok(Hits { main: frame, second: None, spots })
}

fn axes(pen: &mut Pen<'_>, plot: (f64, f64, f64, f64), data: &Coverage) -> Frame {
    let share = data.measure != Measure::HeldImportKw;
    let found = extent(&data.curves.iter().map(|c| c.value.as_slice()).collect::<Vec<_>>());
    // Shares are their own unit.
    let (kw, power) = if share { (1.0, "") } else { power_unit(found.map_or(1.0, |e| e.1)) };
    let ((low, high), upright) = if matches!(data.measure, Measure::ServedShare | Measure::CarriedShare) {
        ((0.0, 1.0), ticks::linear(0.0, 1.0, 5))
    } else {
        let (low, high) = found.unwrap_or((0.0, 1.0));
        let zero = low < 0.4 * high;
        let rounded = ticks::rounded(in_unit((low, high), kw), zero, 5);
        if share { ((rounded.0.0.max(0.0), rounded.0.1.min(1.0)), rounded.1) } else { rounded }
    };
    let most =
        extent(&data.curves.iter().map(|c| c.energy_kwh.as_slice()).collect::<Vec<_>>()).map_or(1.0, |e| e.1);
    let marked = data.marks.iter().map(|m| m.energy_kwh).filter(|e| e.is_finite()).fold(0.0, f64::max);
    let most = if most.max(marked) > 0.0 { most.max(marked) } else { 1.0 };
    let frame = Frame::new(plot, (0.0, most), (low * kw, high * kw));
    let (x0, _, x1, y1) = plot;
    let tick = Text::tick(pen.palette);
    let percent = Ticks { step: upright.step * 100.0, values: Vec::new() };
    for &v in &upright.values {
        let y = frame.y.px(v * kw);
        if y < y1 - 1.0 {
            pen.level(x0, x1, y, pen.grid_ink());
        }
        let text = if share { percent.text(v * 100.0) } else { upright.text(v) };
        pen.text((x0 - 6.0, y + 4.5), &text, tick.end());
    }
    let unit = if share { "%" } else { power };
    pen.text((0.0, 13.0), &format!("{}, {unit}", title(data.measure)), tick);
    pen.level(x0, x1, y1, pen.axis_ink());
    let (size, unit) = energy_unit(most);
    let level = ticks::linear(0.0, most / size, (((x1 - x0) / 70.0) as usize).clamp(2, 8));
    for &e in &level.values {
        let x = frame.x.px(e * size);
        pen.upright(x.min(x1), y1, y1 + 4.0, pen.axis_ink());
        let text = level.text(e);
        let half = tick.width(&text) / 2.0;
        pen.text((x.min(pen.width - half), y1 + 18.0), &text, tick.middle());
    }
    pen.text((x1, y1 + 36.0), &format!("Delivered energy, {unit}"), tick.end());
    frame
}

/// Dotted drops with ticks at both ends and three short lines each; marks at one place share them.
fn draw_marks(pen: &mut Pen<'_>, frame: &Frame, data: &Coverage, placer: &mut Placer) -> Vec<Spot> {
    let base = frame.plot.3;
    let mut groups: Vec<(String, &CoverageMark, Point)> = Vec::new();
    for mark in &data.marks {
        let at = frame.px(mark.energy_kwh, frame.y.clamp(mark.value));
        if !(at.0 + at.1).is_finite() {
            continue;
        }
        match groups.iter_mut().find(|(_, _, other)| (other.0 - at.0).abs() < 3.0) {
            Some((names, ..)) => *names = format!("{names}, {}", mark.name),
            None => groups.push((mark.name.clone(), mark, at)),
        }
    }
    let mut spots = Vec::new();
    for (_, _, at) in &groups {
        pen.dotted(*at, (at.0, base));
        pen.tick(*at, 6.0);
        pen.tick((at.0, base), 5.0);
        placer.take(Patch { x0: at.0 - 1.0, y0: at.1, x1: at.0 + 1.0, y1: base });
        placer.take(Patch::around(*at, 6.0));
    }
    let count = groups.len();
    for (i, (names, mark, at)) in groups.into_iter().enumerate() {
        let look = Text::label(pen.palette.ink);
        let lines =
            [names, people::energy(mark.energy_kwh).to_string(), value_text(data.measure, mark.value)];
        // All three lines where they stay clear, or else the name alone.
        let mut options = Vec::new();
        for (count_of_lines, share) in [0.44, 0.36, 0.52, 0.28, 0.6, 0.7, 0.2, 0.8, 0.9]
            .map(|s| (3, s))
            .into_iter()
            .chain([0.44, 0.36, 0.28, 0.2, 0.14, 0.1, 0.06].map(|s| (1, s)))
        {
            let wide = lines[..count_of_lines]
                .iter()
                .enumerate()
                .map(|(k, l)| look.bold_if(k == 0).width(l))
                .fold(0.0, f64::max);
            // The first and the last stand before their drop, the one between after it, if they can.
            let before = if count < 3 { i == 0 } else { i != 1 };
            for side in [before, !before] {
                let y = frame.plot.3 - share * (frame.plot.3 - frame.plot.1);
                let x = if side { at.0 - 8.0 - wide } else { at.0 + 8.0 };
                let tall = if count_of_lines == 1 { 4.0 } else { 40.0 };
                options.push((
                    count_of_lines,
                    side,
                    Patch { x0: x, y0: y - 12.0, x1: x + wide, y1: y + tall },
                ));
            }
        }
        let patches: Vec<Patch> = options.iter().map(|o| o.2).collect();
        if let Some(found) = placer.first_clear(&patches) {
            let (count_of_lines, before, patch) = options[found];
            for (k, line) in lines[..count_of_lines].iter().enumerate() {
                let look = look.bold_if(k == 0);
                let at = (if before { patch.x1 } else { patch.x0 }, patch.y0 + 12.0 + 18.0 * k as f64);
                pen.text(at, line, if before { look.end() } else { look });
            }
        }
        spots.push(Spot {
            name: mark.name.clone(),
            area: (at.0 - 12.0, at.1 - 12.0, at.0 + 12.0, base + 8.0),
        });
    }
    spots
}

/// Names of the powers, at the right ends or, on a phone, beside the curves.
fn draw_names(pen: &mut Pen<'_>, frame: &Frame, data: &Coverage, placer: &mut Placer, narrow: bool) {
    let curves: Vec<&CoverageCurve> = data.curves.iter().take(3).collect();
    if narrow {
        for (i, curve) in curves.iter().enumerate() {
            let look = Text::label(pen.palette.ink).middle().bold_if(i == 0);
            let text = power_text(curve);
            let mut options = Vec::new();
            for share in [0.62, 0.7, 0.54, 0.8, 0.45, 0.35, 0.9] {
                let energy = share * frame.x.to;
                if let Some(value) = at(&curve.energy_kwh, &curve.value, energy) {
                    let (x, y) = frame.px(energy, value);
                    options.extend([((x, y - 7.0), text.as_str()), ((x, y + 17.0), text.as_str())]);
                }
            }
            pen.text_at(placer, &options, look);
        }
        return;
    }
    let ends: Vec<(usize, f64)> = curves
        .iter()
        .enumerate()
        .filter_map(|(i, c)| {
            let last = c.value.iter().rev().find(|v| v.is_finite())?;
            Some((i, frame.y.px(frame.y.clamp(*last)) + 5.0))
        })
        .collect();
    let wanted: Vec<f64> = ends.iter().map(|e| e.1).collect();
    let placed = spread(&wanted, 18.0, (frame.plot.1, frame.plot.3 + 4.0));
    for ((i, _), y) in ends.iter().zip(placed) {
        pen.text(
            (frame.plot.2 + 8.0, y),
            &power_text(curves[*i]),
            Text::label(pen.palette.ink).bold_if(*i == 0),
        );
    }
}
