//! A table joined by straight lines, with the energy under it: open-circuit voltage over charge, force over travel.

/// Height over position, and the energy from the first point on.
///
/// In a segment the height is `y + s u` and the energy `E + y u + s u^2 / 2`, so that position follows from energy in closed form.
#[derive(Debug, Clone)]
pub(super) struct Table {
    segments: Vec<Segment>,
}

/// A straight piece.
#[derive(Debug, Clone, Copy)]
struct Segment {
    position: f64,
    height: f64,
    slope: f64,
    from_j: f64,
    to_j: f64,
}

impl Table {
    /// Of points, whose positions are multiplied by `scale`. The case has checked that positions rise and that there is height.
    pub(super) fn new(points: &[(f64, f64)], scale: f64) -> Self {
        let mut from_j = 0.0;
        let segments = points
            .windows(2)
            .map(|pair| {
                let width = (pair[1].0 - pair[0].0) * scale;
                let to_j = from_j + f64::midpoint(pair[0].1, pair[1].1) * width;
                let segment = Segment {
                    position: pair[0].0 * scale,
                    height: pair[0].1,
                    slope: (pair[1].1 - pair[0].1) / width,
                    from_j,
                    to_j,
                };
                from_j = to_j;
                segment
            })
            .collect();
        Self { segments }
    }

    /// Number of segments.
    pub(super) fn len(&self) -> usize {
        self.segments.len()
    }

    /// Energy under the whole table.
    pub(super) fn full_j(&self) -> f64 {
        self.segments.last().map_or(0.0, |segment| segment.to_j)
    }

    /// Energy at the two ends of a segment.
    pub(super) fn span_j(&self, segment: usize) -> (f64, f64) {
        (self.segments[segment].from_j, self.segments[segment].to_j)
    }

    /// Height at an energy, on a segment's line.
    pub(super) fn height(&self, segment: usize, energy_j: f64) -> f64 {
        let Segment { height, slope, from_j, .. } = self.segments[segment];
        (height * height + 2.0 * slope * (energy_j - from_j)).max(0.0).sqrt()
    }

    /// Slope of a segment.
    pub(super) fn slope(&self, segment: usize) -> f64 {
        self.segments[segment].slope
    }

    /// Position at an energy, on a segment's line.
    pub(super) fn position(&self, segment: usize, energy_j: f64) -> f64 {
        let Segment { position, height, from_j, .. } = self.segments[segment];
        let both = height + self.height(segment, energy_j);
        if both > 0.0 { position + 2.0 * (energy_j - from_j) / both } else { position }
    }

    /// Energy at a position.
    pub(super) fn energy_j(&self, position: f64) -> f64 {
        let segment = self.segments.partition_point(|segment| segment.position <= position).saturating_sub(1);
        let Segment { position: from, height, slope, from_j, to_j } = self.segments[segment];
        let u = position - from;
        (from_j + (height + 0.5 * slope * u) * u).clamp(0.0, to_j.max(self.full_j()))
    }

    /// The segment of an energy.
    pub(super) fn segment(&self, energy_j: f64) -> usize {
        self.segments.partition_point(|segment| segment.from_j <= energy_j).saturating_sub(1)
    }
}
