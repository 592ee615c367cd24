//! Where data lie on a picture: what the page needs to read values off it and to draw a read-out over it.

/// One axis: the data values at its two ends, which lie at the two pixel positions.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Axis {
    /// Value at `px_from`.
    pub from: f64,
    /// Value at `px_to`.
    pub to: f64,
    /// Pixel position of `from`.
    pub px_from: f64,
    /// Pixel position of `to`.
    pub px_to: f64,
    /// Logarithmic.
    pub log: bool,
}

impl Axis {
    /// A linear axis; a span of nothing or of no number becomes one of 1.
    pub fn linear((from, to): (f64, f64), (px_from, px_to): (f64, f64)) -> Self {
        let (from, to) = if from.is_finite() && to.is_finite() { (from, to) } else { (0.0, 1.0) };
        let to = if to == from { from + 1.0 } else { to };
        Self { from, to, px_from, px_to, log: false }
    }

    /// A logarithmic axis; ends that are no positive numbers become 1 and 10.
    pub fn log((from, to): (f64, f64), (px_from, px_to): (f64, f64)) -> Self {
        let usable = |v: f64| v.is_finite() && v > 0.0;
        let (from, to) = if usable(from) && usable(to) && from != to { (from, to) } else { (1.0, 10.0) };
        Self { from, to, px_from, px_to, log: true }
    }

    /// Pixel position of a value; NaN for no number (or, on a logarithmic axis, for a number that is not positive).
    pub fn px(&self, value: f64) -> f64 {
        let share = if self.log {
            if value <= 0.0 {
                return f64::NAN;
            }
            libm::log(value / self.from) / libm::log(self.to / self.from)
        } else {
            (value - self.from) / (self.to - self.from)
        };
        self.px_from + share * (self.px_to - self.px_from)
    }

    /// Value at a pixel position.
    pub fn at(&self, px: f64) -> f64 {
        let share = (px - self.px_from) / (self.px_to - self.px_from);
        if self.log {
            self.from * libm::pow(self.to / self.from, share)
        } else {
            self.from + share * (self.to - self.from)
        }
    }

    /// The value, moved to the nearer end where it lies outside.
    pub fn clamp(&self, value: f64) -> f64 {
        let (low, high) = if self.from <= self.to { (self.from, self.to) } else { (self.to, self.from) };
        value.clamp(low, high)
    }
}

/// A rectangle of a picture with its two axes, px.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Frame {
    /// Left, top, right, bottom, px.
    pub plot: (f64, f64, f64, f64),
    /// The level axis.
    pub x: Axis,
    /// The upright axis.
    pub y: Axis,
}

impl Frame {
    /// A frame over a rectangle with linear axes: `x` from left to right, `y` from bottom to top.
    pub fn new(plot: (f64, f64, f64, f64), x: (f64, f64), y: (f64, f64)) -> Self {
        Self { plot, x: Axis::linear(x, (plot.0, plot.2)), y: Axis::linear(y, (plot.3, plot.1)) }
    }

    /// Pixel position of a point.
    pub fn px(&self, x: f64, y: f64) -> (f64, f64) {
        (self.x.px(x), self.y.px(y))
    }

    /// Whether a pixel position lies on it.
    pub fn holds(&self, (x, y): (f64, f64)) -> bool {
        let (x0, y0, x1, y1) = self.plot;
        x >= x0 && x <= x1 && y >= y0 && y <= y1
    }
}

/// Something on a picture that can be pointed at or dragged.
#[derive(Debug, Clone, PartialEq)]
pub struct Spot {
    /// What it is: a technology's identifier, a mark's name, "from", "to".
    pub name: String,
    /// Left, top, right, bottom, px.
    pub area: (f64, f64, f64, f64),
}

/// What a drawn picture gives back.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Hits {
    /// The main frame: the year sheet (x in cells of a row, y in rows), the power, the coverage, the plane.
    pub main: Frame,
    /// The second one, if the picture has it: the duration curve, the strip, the level band.
    pub second: Option<Frame>,
    /// Things to point at.
    pub spots: Vec<Spot>,
}

impl Hits {
    /// The spot at a pixel position; of several the last drawn.
    pub fn spot(&self, (x, y): (f64, f64)) -> Option<&Spot> {
        self.spots.iter().rev().find(|s| {
            let (x0, y0, x1, y1) = s.area;
            x >= x0 && x <= x1 && y >= y0 && y <= y1
        })
    }
}

/// Index of the value nearest to `value` in a rising series; none if it has no numbers.
pub fn nearest(series: &[f64], value: f64) -> Option<usize> {
    if series.is_empty() || value.is_nan() {
        return None;
    }
    let after = series.partition_point(|&v| v < value);
    let before = after.saturating_sub(1);
    let after = after.min(series.len() - 1);
    let nearer = if (series[after] - value).abs() < (value - series[before]).abs() { after } else { before };
    series[nearer].is_finite().then_some(nearer)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pixel_and_value_are_inverse() {
        for axis in [Axis::linear((-100.0, 200.0), (300.0, 10.0)), Axis::log((0.01, 20_000.0), (600.0, 30.0))]
        {
            for value in [0.02, 1.0, 150.0] {
                assert!((axis.at(axis.px(value)) - value).abs() < 1e-9 * value.max(1.0), "{axis:?} {value}");
            }
        }
    }

    #[test]
    fn an_axis_of_nothing_still_maps() {
        for axis in [
            Axis::linear((5.0, 5.0), (0.0, 100.0)),
            Axis::linear((f64::NAN, 1.0), (0.0, 100.0)),
            Axis::log((0.0, -1.0), (0.0, 100.0)),
        ] {
            assert!(axis.px(5.0).is_finite(), "{axis:?}");
        }
        assert!(Axis::log((1.0, 10.0), (0.0, 1.0)).px(-1.0).is_nan());
    }

    #[test]
    fn the_nearest_sample_is_found() {
        let series = [0.0, 10.0, 20.0];
        for (value, index) in [(-5.0, 0), (4.0, 0), (6.0, 1), (14.9, 1), (99.0, 2)] {
            assert_eq!(nearest(&series, value), Some(index), "{value}");
        }
        assert_eq!(nearest(&[], 1.0), None);
    }
}
