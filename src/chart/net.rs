//! Net power over a window: surplus above the line and deficit below, the largest episodes as dimensions; below it a strip
//! of the whole record with the window as a selection.

use std::fmt::Write as _;

use super::NARROW;
use super::data::{EpisodeMark, NetPower};
use super::frame::{Axis, Frame, Hits, Spot};
use super::label::{Patch, Placer};
use super::palette::Palette;
use super::pen::{Ink, Pen, Text, crisp, roomy};
use super::shape::{self, Point};
use super::surface::Surface;
use super::ticks::{self, TimeTick};
use super::words::{extent, in_unit, most, power_unit};
use crate::fault::Result;
use crate::numeric::rising;
use crate::units::people;

const TOP: f64 = 46.0;
const STRIP: f64 = 38.0;

/// Height for a width, px.
pub fn height(width: u32) -> u32 {
    (TOP + plot_height(width) + 132.0) as u32
}

fn plot_height(width: u32) -> f64 {
    if width < NARROW { 210.0 } else { 250.0 }
}

/// What it shows, in a sentence.
pub fn sentence(data: &NetPower) -> String {
    let (Some((least, _)), Some((_, greatest))) = (extent(&[&data.least_kw]), extent(&[&data.greatest_kw]))
    else {
        return "Net power over a window of the record: no data.".to_owned();
    };
    let (from, to) = data.window_us;
    let mut text = format!(
        "Net power from {} to {}, between {} and {}.",
        ticks::moment(from),
        ticks::moment(to),
        people::power(least),
        people::power(greatest),
    );
    let largest = |sign: f64| {
        data.episodes
            .iter()
            .filter(|e| e.energy_kwh * sign > 0.0)
            .max_by(|a, b| (a.energy_kwh * sign).total_cmp(&(b.energy_kwh * sign)))
    };
    for (sign, word) in [(-1.0, "deficit"), (1.0, "surplus")] {
        if let Some(episode) = largest(sign) {
            let _ = write!(
                text,
                " Its largest {word} is {} over {} from {}.",
                people::energy(episode.energy_kwh.abs()),
                hours(episode),
                ticks::moment(episode.from_us),
            );
        }
    }
    text
}

fn hours(episode: &EpisodeMark) -> people::Scaled {
    people::Scaled { number: people::significant((episode.to_us - episode.from_us) / 3600e6, 3), unit: "h" }
}

/// Draws net power over a window.
///
/// In the result, `main` is the power (x in microseconds of clock reading, y in kW), `second` the strip; the spots "from"
/// and "to" are the window's grips.
pub fn net_power(
    surface: &mut dyn Surface,
    size: (u32, u32),
    palette: &Palette,
    data: &NetPower,
) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let narrow = size.0 < NARROW;
    let plot = (44.0, TOP, pen.width - 6.0, TOP + plot_height(size.0));
    let mut powers = extent(&[&data.least_kw, &data.greatest_kw]).unwrap_or((0.0, 1.0));
    for limit in data.limits_kw.iter().filter(|l| l.is_finite()) {
        powers = (powers.0.min(*limit), powers.1.max(*limit));
    }
    let (kw, unit) = power_unit(most(powers));
    let ((low, high), marks) = ticks::roomy(in_unit(powers, kw), 0.05, 6);
    let shown = extent(&[&data.t_us]).unwrap_or((0.0, 1.0));
    let window = if data.window_us.1 > data.window_us.0 { data.window_us } else { shown };
    let frame = Frame::new(plot, window, (low * kw, high * kw));
    let tick = Text::tick(palette);

    pen.text((0.0, 14.0), &format!("Net power, {unit}"), tick);
    for &p in &marks.values {
        let y = frame.y.px(p * kw);
        if p != 0.0 {
            pen.level(plot.0, plot.2, y, pen.grid_ink());
        }
        pen.text((plot.0 - 6.0, y + 4.5), &marks.text(p), tick.end());
    }
    draw_areas(&mut pen, &frame, data);
    let zero = frame.y.px(0.0);
    pen.level(plot.0, plot.2, zero, pen.axis_ink());
    if data.t_us.is_empty() || extent(&[&data.greatest_kw]).is_none() {
        pen.nothing(plot);
    }
    draw_limits(&mut pen, &frame, &data.limits_kw);
    draw_episodes(&mut pen, &frame, &data.episodes, narrow);
    let base = plot.3 + 30.0;
    time_axis(&mut pen, &frame, base);
    let (second, spots) =
        draw_strip(&mut pen, (plot.0, base + 36.0, plot.2, base + 36.0 + STRIP), data, window);
    pen.lift()?;
    Ok(Hits { main: frame, second, spots })
}

/// The time axis of a frame, drawn at `y` below it.
pub(super) fn time_axis(pen: &mut Pen<'_>, frame: &Frame, y: f64) {
    let (x0, _, x1, _) = frame.plot;
    pen.level(x0, x1, y, pen.axis_ink());
    let look = Text::tick(pen.palette);
    let mut placer = Placer::new(Patch { x0: x0 - 8.0, y0: y, x1: pen.width, y1: y + 30.0 });
    for TimeTick { us, long, label } in ticks::time(frame.x.from, frame.x.to, x1 - x0) {
        let x = frame.x.px(us as f64);
        pen.upright(x.min(x1 - 0.5), y, y + if long { 6.0 } else { 3.0 }, pen.axis_ink());
        if let Some(text) = label {
            let at = (x + 3.0, y + 17.0);
            if placer.first_free(&[look.patch(at, &text)]).is_some() {
                pen.text(at, &text, look);
            }
        }
    }
}

/// Runs of the series as positions of (least, greatest), a missing value between runs.
fn envelope(frame: &Frame, data: &NetPower) -> Vec<Vec<(f64, f64, f64)>> {
    let mut runs: Vec<Vec<(f64, f64, f64)>> = vec![Vec::new()];
    for ((&t, &least), &greatest) in data.t_us.iter().zip(&data.least_kw).zip(&data.greatest_kw) {
        let x = frame.x.px(t);
        if !(x + least + greatest).is_finite() {
            runs.push(Vec::new());
        } else if let Some(run) = runs.last_mut()
            && x >= frame.plot.0 - 2.0
            && x <= frame.plot.2 + 2.0
        {
            run.push((x.clamp(frame.plot.0, frame.plot.2), least, greatest));
        }
    }
    runs.retain(|r| !r.is_empty());
    runs
}

fn draw_areas(pen: &mut Pen<'_>, frame: &Frame, data: &NetPower) {
    let zero = frame.y.px(0.0);
    let palette = pen.palette;
    let runs = envelope(frame, data);
    for up in [true, false] {
        let lines: Vec<Vec<Point>> = runs
            .iter()
            .map(|run| {
                run.iter()
                    .map(|&(x, least, greatest)| {
                        (x, frame.y.px(if up { greatest.max(0.0) } else { least.min(0.0) }))
                    })
                    .collect()
            })
            .collect();
        let areas: Vec<Vec<Point>> = lines
            .iter()
            .filter(|line| line.len() > 1 && line.iter().any(|p| p.1 != zero))
            .map(|line| {
                let mut area = line.clone();
                area.extend([(line[line.len() - 1].0, zero), (line[0].0, zero)]);
                area
            })
            .collect();
        let colour = if up {
            pen.water(&areas);
            palette.surplus
        } else {
            pen.ground(&areas);
            palette.deficit
        };
        let ink = Ink::new(colour, 1.1 * palette.pens.thin);
        for line in &lines {
            for part in away(line, zero) {
                pen.line(&part, ink);
            }
        }
    }
}

/// The parts of a line that leave a level, so that nothing is drawn along the axis.
fn away(line: &[Point], level: f64) -> Vec<Vec<Point>> {
    if let [alone] = line {
        return if alone.1 == level { Vec::new() } else { vec![vec![*alone]] };
    }
    let mut parts: Vec<Vec<Point>> = Vec::new();
    for ends in line.windows(2) {
        if ends[0].1 == level && ends[1].1 == level {
            continue;
        }
        match parts.last_mut() {
            Some(part) if part.last() == Some(&ends[0]) => part.push(ends[1]),
            _ => parts.push(ends.to_vec()),
        }
    }
    parts
}

fn draw_limits(pen: &mut Pen<'_>, frame: &Frame, limits: &[f64]) {
    let look = Text::label(pen.palette.ink);
    for &limit in limits.iter().filter(|l| l.is_finite()) {
        let y = frame.y.px(limit);
        pen.level(frame.plot.0, frame.plot.2, y, Ink::new(pen.palette.requirement, pen.palette.pens.line));
        let (word, y) = if limit < 0.0 { ("import limit", y + 15.0) } else { ("export limit", y - 6.0) };
        pen.text((frame.plot.0 + 6.0, y), &format!("{word}, {}", people::power(limit.abs())), look);
    }
}

/// The largest episodes as dimensions: surpluses above, deficits below, each with its energy and hours.
fn draw_episodes(pen: &mut Pen<'_>, frame: &Frame, episodes: &[EpisodeMark], narrow: bool) {
    let (x0, y0, x1, y1) = frame.plot;
    let palette = pen.palette;
    let most = if narrow { 2 } else { ((x1 - x0) / 220.0) as usize };
    for up in [true, false] {
        let (line, base, colour) = if up {
            (y0 - 10.0, y0 - 18.0, palette.surplus_text)
        } else {
            (y1 + 6.0, y1 + 22.0, palette.deficit_text)
        };
        let look = Text::label(colour).middle();
        let mut placer = Placer::new(Patch { x0, y0: base - 16.0, x1, y1: base + 8.0 });
        if up {
            // The axis title stands at the left.
            placer.take(Patch {
                x0: 0.0,
                y0: 0.0,
                x1: Text::tick(palette).width("Net power, kW") + 8.0,
                y1: 18.0,
            });
        }
        let in_view: Vec<&EpisodeMark> = episodes
            .iter()
            .filter(|e| (e.energy_kwh > 0.0) == up && e.energy_kwh != 0.0 && e.from_us < e.to_us)
            .filter(|e| e.to_us > frame.x.from && e.from_us < frame.x.to)
            .collect();
        // The largest first, the earlier first among equals.
        let by_time = rising(&in_view.iter().map(|e| e.from_us).collect::<Vec<_>>());
        let sizes: Vec<f64> = by_time.iter().map(|i| -in_view[*i].energy_kwh.abs()).collect();
        let order = rising(&sizes).into_iter().map(|i| in_view[by_time[i]]);
        let mut drawn = 0;
        for episode in order {
            let (from, to) = (frame.x.px(episode.from_us), frame.x.px(episode.to_us));
            let (left, right) = (from.max(x0), to.min(x1));
            if drawn == most || right - left < 14.0 {
                continue;
            }
            let text = format!("{}, {}", people::energy(episode.energy_kwh), hours(episode));
            let half = look.width(&text) / 2.0;
            if 2.0 * half > x1 - x0 {
                continue;
            }
            let middle = f64::midpoint(left, right).clamp(x0 + half, x1 - half);
            let patch = look.patch((middle, base), &text).grown(4.0);
            let free = Patch { x0: patch.x0.max(x0), x1: patch.x1.min(x1), ..patch };
            if placer.first_free(&[Patch { y0: base - 10.0, y1: base + 3.0, ..free }]).is_none() {
                continue;
            }
            drawn += 1;
            pen.across((left, from < x0), (right, to > x1), line);
            pen.text((middle, base), &text, look);
        }
    }
}

/// The whole record as daily means, with the window washed and its two grips.
fn draw_strip(
    pen: &mut Pen<'_>,
    area: (f64, f64, f64, f64),
    data: &NetPower,
    window: (f64, f64),
) -> (Option<Frame>, Vec<Spot>) {
    let (x0, y0, x1, y1) = area;
    let count = data.strip_us.len().min(data.strip_kw.len());
    let (Some((least, greatest)), true) = (extent(&[&data.strip_kw]), count > 1) else {
        return (None, Vec::new());
    };
    let cell = (data.strip_us[count - 1] - data.strip_us[0]) / (count - 1) as f64;
    let x = Axis::linear((data.strip_us[0], data.strip_us[count - 1] + cell), (x0, x1));
    let y =
        Axis::linear((least.min(0.0), greatest.max(0.0).max(least.min(0.0) + 1e-9)), (y1 - 1.0, y0 + 1.0));
    let palette = pen.palette;
    let (from, to) = (x.px(window.0).clamp(x0, x1), x.px(window.1).clamp(x0, x1));
    pen.rect((from, y0 - 2.0, to, y1 + 2.0), palette.selection, 1.0);
    let zero = y.px(0.0);
    let points: Vec<Point> =
        (0..count).map(|i| (x.px(data.strip_us[i] + cell / 2.0), y.px(data.strip_kw[i]))).collect();
    for run in shape::runs(&points) {
        for (up, colour, alpha) in [(true, palette.surplus, 0.8), (false, palette.deficit, 0.85)] {
            let mut side: Vec<Point> =
                run.iter().map(|p| (p.0, if up { p.1.min(zero) } else { p.1.max(zero) })).collect();
            side.insert(0, (run[0].0 - cell * 0.5 * (x1 - x0) / (x.to - x.from), side[0].1));
            side.push((
                run[run.len() - 1].0 + cell * 0.5 * (x1 - x0) / (x.to - x.from),
                side[side.len() - 1].1,
            ));
            side.extend([(side[side.len() - 1].0, zero), (side[0].0, zero)]);
            pen.fill(&side, colour, alpha);
        }
    }
    pen.level(x0, x1, zero, pen.axis_ink());
    let mut spots = Vec::new();
    for (name, at) in [("from", from), ("to", to)] {
        let at = crisp(at);
        pen.line(&[(at, y0 - 4.0), (at, y1 + 4.0)], Ink::new(palette.selection_edge, 1.5));
        let middle = f64::midpoint(y0, y1);
        let grip = (at - 2.5, middle - 7.0, at + 2.5, middle + 7.0);
        pen.rect(grip, palette.paper, 1.0);
        let outline =
            [(grip.0, grip.1), (grip.2, grip.1), (grip.2, grip.3), (grip.0, grip.3), (grip.0, grip.1)];
        pen.line(&outline, Ink::new(palette.selection_edge, 1.25));
        spots.push(Spot { name: name.to_owned(), area: (at - 12.0, y0 - 4.0, at + 12.0, y1 + 4.0) });
    }
    let frame = Frame { plot: area, x, y };
    time_axis(pen, &frame, y1 + 6.0);
    (Some(frame), spots)
}
