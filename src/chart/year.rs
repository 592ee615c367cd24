//! The year at a glance: a row per week, Monday to Sunday to the right, beside the duration curve, whose power axis is the
//! colour bar of the sheet.

use std::fmt::Write as _;

use super::NARROW;
use super::data::{DurationCurve, YearSheet};
use super::frame::{Frame, Hits};
use super::label::{Patch, Placer};
use super::palette::{Palette, Rgb};
use super::pen::{Ink, Pen, Text, roomy};
use super::shape::{Lie, Point};
use super::surface::Surface;
use super::ticks::{self, DAY_US};
use super::words::extent;
use super::year_curve::{self, Place};
use crate::fault::Result;
use crate::numeric::sort_rising;
use crate::units::civil::Reading;
use crate::units::people;

const TOP: f64 = 26.0;
const LEFT: f64 = 44.0;
/// Height of the curve where it stands below the sheet.
const CURVE: f64 = 200.0;

/// Height for a width, px; `rows` as [`rows`] counts them.
pub fn height(width: u32, rows: usize) -> u32 {
    let sheet = sheet_height(width, rows);
    let below = if width < NARROW { sheet + 52.0 + CURVE + 26.0 } else { sheet.max(CURVE) + 30.0 };
    (TOP + below) as u32
}

/// Rows of a sheet.
pub fn rows(data: &YearSheet) -> usize {
    data.net_kw.len().div_ceil(data.cells_per_row.max(1))
}

/// What it shows, in a sentence.
pub fn sentence(data: &YearSheet, curve: &DurationCurve) -> String {
    let known = data.net_kw.iter().filter(|p| p.is_finite()).count() as f64;
    if known == 0.0 {
        return "Net power of the record, a row per week: no data.".to_owned();
    }
    let short = data.net_kw.iter().filter(|p| **p < 0.0).count() as f64;
    let mut text = format!(
        "Net power, a row per week from {} on, beside its duration curve: {} in {} of the time, {} surplus and {} {}.",
        Reading::new(data.start_us).map_or_else(String::new, |t| ticks::day(t.date)),
        word(curve),
        people::percent(short / known),
        people::energy(curve.surplus_kwh),
        people::energy(curve.deficit_kwh.abs()),
        word(curve),
    );
    if let Some((from, to)) = data.critical_us {
        let _ =
            write!(text, " The critical period runs from {} to {}.", ticks::moment(from), ticks::moment(to));
    }
    text
}

/// The word for the deficit side.
pub(super) fn word(curve: &DurationCurve) -> &str {
    if curve.deficit_word.is_empty() { "deficit" } else { &curve.deficit_word }
}

fn row_height(width: u32, rows: usize) -> f64 {
    let (whole, least) = if width < NARROW { (290.0, 5.0) } else { (371.0, 7.0) };
    libm::floor(whole / rows.max(1) as f64).clamp(least, 40.0)
}

fn sheet_height(width: u32, rows: usize) -> f64 {
    row_height(width, rows) * rows.max(1) as f64
}

/// Draws the year sheet with its duration curve.
///
/// In the result, `main` is the sheet (x in cells of a row, y in rows, downwards), `second` the curve (x in hours).
pub fn year_sheet(
    surface: &mut dyn Surface,
    size: (u32, u32),
    palette: &Palette,
    data: &YearSheet,
    curve: &DurationCurve,
) -> Result<Hits> {
    let size = roomy(size);
    let mut pen = Pen::new(surface, size, palette);
    let narrow = size.0 < NARROW;
    let width = f64::from(size.0);
    let rows = rows(data);
    let tall = sheet_height(size.0, rows);
    let wide = if narrow { width - LEFT - 12.0 } else { libm::floor((width - LEFT - 114.0) * 0.715) };
    let sheet = (LEFT, TOP, LEFT + wide.max(60.0), TOP + tall);
    let powers = extent(&[&data.net_kw, &curve.net_kw]);
    let scale = Scale::of(powers.unwrap_or((0.0, 0.0)));

    let main = draw_sheet(&mut pen, sheet, data, rows, &scale);
    let place = if narrow {
        let top = sheet.3 + 52.0;
        Place { bar: 46.0, plot: (66.0, top, width - 8.0, top + CURVE), title: (0.0, top - 16.0), narrow }
    } else {
        let bar = sheet.2 + 92.0;
        let plot = (bar + 20.0, TOP, width - 8.0, TOP + tall.max(CURVE));
        Place { bar, plot, title: (bar - 34.0, TOP - 12.0), narrow }
    };
    let second = year_curve::draw(&mut pen, &place, curve, powers.unwrap_or((0.0, 1.0)), &scale);
    pen.lift()?;
    Ok(Hits { main, second: Some(second), spots: Vec::new() })
}

/// The two-ended colour scale: round steps, the same on both sides unless one side is under half the other.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scale {
    /// Half width of the band about zero, kW.
    zero: f64,
    /// Steps of the deficit and the surplus side, kW.
    steps: (f64, f64),
}

impl Scale {
    pub(super) fn of((least, greatest): (f64, f64)) -> Self {
        let (down, up) = ((-least).max(0.0), greatest.max(0.0));
        let most = down.max(up);
        let own = |side: f64| round_up(if side > 0.0 && side < most / 2.0 { side } else { most } / 5.0);
        let steps = (own(down), own(up));
        Self { zero: steps.0.min(steps.1) / 3.0, steps }
    }

    /// Step of a power: negative in deficit, 0 about zero, at most 5 either way.
    pub(super) fn class(&self, kw: f64) -> i8 {
        if kw.abs() < self.zero {
            return 0;
        }
        let (step, sign) = if kw < 0.0 { (self.steps.0, -1) } else { (self.steps.1, 1) };
        sign * (1 + libm::floor(kw.abs() / step).min(4.0) as i8)
    }

    /// Edges between the steps within two ends, from below, with the step above each.
    pub(super) fn bands(&self, low: f64, high: f64) -> Vec<(f64, f64, i8)> {
        let mut edges = vec![low, -self.zero, self.zero, high];
        for k in 1..5 {
            edges.extend([-self.steps.0 * f64::from(k), self.steps.1 * f64::from(k)]);
        }
        edges.retain(|e| *e >= low && *e <= high);
        sort_rising(&mut edges);
        edges.dedup();
        edges.windows(2).map(|w| (w[0], w[1], self.class(f64::midpoint(w[0], w[1])))).collect()
    }
}

/// The next step that is easy to read.
fn round_up(value: f64) -> f64 {
    if !(value > 0.0 && value.is_finite()) {
        return 1.0;
    }
    let ten = libm::pow(10.0, libm::floor(libm::log10(value)));
    [1.0, 1.2, 1.5, 1.8, 2.0, 2.5, 3.0, 3.6, 4.0, 5.0, 6.0, 8.0]
        .into_iter()
        .map(|m| m * ten)
        .find(|s| *s >= value * (1.0 - 1e-9))
        .unwrap_or(10.0 * ten)
}

/// The colour of a step.
pub(super) fn shade(p: &Palette, class: i8) -> Rgb {
    match class {
        ..=-5 => p.scale_d5,
        -4 => p.scale_d4,
        -3 => p.scale_d3,
        -2 => p.scale_d2,
        -1 => p.scale_d1,
        0 => p.scale_0,
        1 => p.scale_s1,
        2 => p.scale_s2,
        3 => p.scale_s3,
        4 => p.scale_s4,
        5.. => p.scale_s5,
    }
}

/// The fine hatch in paper colour on everything in deficit.
pub(super) fn fine_hatch(pen: &mut Pen<'_>, areas: &[Vec<Point>]) {
    pen.hatch(areas, Lie::Rising, 4.0, Ink::new(pen.palette.paper, 0.6).faint(0.55));
}

pub(super) fn corners((x0, y0, x1, y1): (f64, f64, f64, f64)) -> Vec<Point> {
    vec![(x0, y0), (x1, y0), (x1, y1), (x0, y1)]
}

fn draw_sheet(
    pen: &mut Pen<'_>,
    sheet: (f64, f64, f64, f64),
    data: &YearSheet,
    rows: usize,
    scale: &Scale,
) -> Frame {
    let (x0, y0, x1, y1) = sheet;
    let per_row = data.cells_per_row.max(1);
    let tall = (y1 - y0) / rows.max(1) as f64;
    // Cells end on whole px, so that no seam shows between them.
    let x = |cell: usize| libm::round(x0 + (x1 - x0) * cell as f64 / per_row as f64);
    let y = |row: usize| y0 + tall * row as f64;
    let mut runs: Vec<(i8, (f64, f64, f64, f64))> = Vec::new();
    for (row, cells) in data.net_kw.chunks(per_row).enumerate() {
        let mut from = 0;
        for group in
            cells.chunk_by(|a, b| a.is_finite() == b.is_finite() && scale.class(*a) == scale.class(*b))
        {
            let to = from + group.len();
            if group[0].is_finite() {
                runs.push((scale.class(group[0]), (x(from), y(row), x(to), y(row + 1))));
            }
            from = to;
        }
    }
    for class in -5..=5 {
        for (_, area) in runs.iter().filter(|(c, _)| *c == class) {
            pen.rect(*area, shade(pen.palette, class), 1.0);
        }
    }
    let short: Vec<Vec<Point>> = runs.iter().filter(|(c, _)| *c < 0).map(|(_, a)| corners(*a)).collect();
    fine_hatch(pen, &short);
    if runs.is_empty() {
        pen.nothing(sheet);
        pen.level(x0, x1, y1, pen.axis_ink());
    }
    heads(pen, sheet, data);
    sides(pen, sheet, data, rows);
    bracket(pen, sheet, data, rows);
    Frame {
        plot: sheet,
        x: super::Axis::linear((0.0, per_row as f64), (x0, x1)),
        y: super::Axis::linear((0.0, rows.max(1) as f64), (y0, y1)),
    }
}

/// Microseconds in a row.
fn row_us(data: &YearSheet) -> f64 {
    let us = data.cell_s * 1e6 * data.cells_per_row.max(1) as f64;
    if us > 0.0 { us } else { 7.0 * DAY_US }
}

/// Days over the columns, with paper seams between them; hours where a row is a day.
fn heads(pen: &mut Pen<'_>, (x0, y0, x1, y1): (f64, f64, f64, f64), data: &YearSheet) {
    let look = Text::tick(pen.palette).middle();
    let days = libm::round(row_us(data) / DAY_US).max(1.0);
    let seam = Ink::new(pen.palette.paper, 1.0);
    if days > 1.0 && days <= 31.0 {
        let step = (x1 - x0) / days;
        for k in 0..days as usize {
            let left = x0 + step * k as f64;
            if k > 0 {
                pen.upright(left, y0, y1, seam);
            }
            if step >= 30.0
                && let Some(at) = Reading::new(data.start_us + k as f64 * DAY_US)
            {
                pen.text((left + step / 2.0, y0 - 8.0), ticks::weekday(at.date), look);
            }
        }
    } else if days <= 1.0 {
        for (hour, name) in [(0.0, "00:00"), (6.0, "06:00"), (12.0, "12:00"), (18.0, "18:00")] {
            let left = x0 + (x1 - x0) * hour / 24.0;
            if hour > 0.0 {
                pen.upright(left, y0, y1, seam);
            }
            pen.text((left, y0 - 8.0), name, Text::tick(pen.palette));
        }
    }
}

/// Months at the left, or the date of each row where there are few.
fn sides(pen: &mut Pen<'_>, (x0, y0, _, y1): (f64, f64, f64, f64), data: &YearSheet, rows: usize) {
    let look = Text::tick(pen.palette).end();
    let tall = (y1 - y0) / rows.max(1) as f64;
    let mut placer = Placer::new(Patch { x0: 0.0, y0: y0 - 4.0, x1: x0, y1: y1 + 6.0 });
    let ink = pen.axis_ink();
    let mut before = None;
    for row in 0..rows {
        let from = data.start_us + row as f64 * row_us(data);
        let (Some(first), Some(last)) = (Reading::new(from), Reading::new(from + row_us(data) - 1.0)) else {
            continue;
        };
        let y = y0 + tall * row as f64;
        if tall >= 15.0 {
            pen.text((x0 - 8.0, y + tall / 2.0 + 4.5), &ticks::day(first.date), look);
            continue;
        }
        // The row that holds the first of a month, and the row at the top.
        let month = last.date.month_start();
        if before == Some(month) || row > 0 && first.date > month {
            continue;
        }
        before = Some(month);
        pen.level(x0 - 5.0, x0 - 1.0, y, ink);
        let text = ticks::month(month);
        let at = (x0 - 8.0, y + 10.0);
        if placer.first_free(&[look.patch(at, text)]).is_some() {
            pen.text(at, text, look);
        }
    }
}

/// The critical period as a bracket at the right edge, open where it runs past the record's end.
fn bracket(pen: &mut Pen<'_>, (_, y0, x1, y1): (f64, f64, f64, f64), data: &YearSheet, rows: usize) {
    let Some((from, to)) = data.critical_us else { return };
    let row = |us: f64| (us - data.start_us) / row_us(data);
    let (first, last) = (libm::floor(row(from)), libm::floor(row(to - 1.0)) + 1.0);
    if !(first < last && last > 0.0 && first < rows as f64) {
        return;
    }
    let tall = (y1 - y0) / rows.max(1) as f64;
    let top = y0 + first.max(0.0) * tall;
    let bottom = (y0 + last * tall).min(y1);
    let (x, arm) = (x1 + 4.0, 5.0);
    let mut line = vec![(x + arm, top), (x + arm, bottom)];
    if first >= 0.0 {
        line.insert(0, (x, top));
    }
    if last <= rows as f64 {
        line.push((x, bottom));
    }
    pen.line(&line, Ink::new(pen.palette.requirement, pen.palette.pens.requirement));
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_round_and_shared_unless_one_side_is_small() {
        assert_eq!(Scale::of((-86.0, 199.0)).steps, (18.0, 40.0));
        assert_eq!(Scale::of((-150.0, 199.0)).steps, (40.0, 40.0));
        assert_eq!(Scale::of((0.0, 0.0)).steps, (1.0, 1.0));
    }

    #[test]
    fn classes_meet_at_their_edges() {
        let scale = Scale::of((-100.0, 100.0));
        for (kw, class) in [(0.0, 0), (-99.0, -5), (99.0, 5), (25.0, 2), (-25.0, -2), (1e9, 5)] {
            assert_eq!(scale.class(kw), class, "{kw}");
        }
        let bands = scale.bands(-100.0, 100.0);
        assert_eq!(bands.len(), 11);
        assert!(bands.windows(2).all(|w| w[0].1 == w[1].0 && w[0].2 < w[1].2));
    }
}
