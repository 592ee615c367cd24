//! Coverage for all capacities at once: the falling ranges of the periodic cumulative energy curve.
//!
//! Start the period at the curve's maximum, take turning points, remove closed cycles by the four-point rule, and keep every
//! falling leg `p`. Then, for a net gain over the period, the unserved energy of a store of capacity `E` that takes every surplus and
//! serves every deficit is `discharge efficiency x sum of max(0, p - E)`. For a net loss the same is done with the curve upside down.
//! Derived here; it is the two-sided reflection problem (Ghomrasni and Lochowski, arXiv:1311.6405). Checked against simulation and
//! linear programmes.

use super::Losses;
use crate::duty::Duty;
use crate::numeric::{Sum, sort_falling};

/// The exact coverage of a duty's deficit by a store of one power limit, for every capacity. Without self-discharge.
#[derive(Debug, Clone)]
pub struct Ranges {
    /// Falling ranges, kWh inside, falling.
    falls: Vec<f64>,
    /// Running sums of the ranges, same order.
    sums: Vec<f64>,
    /// Unserved at any capacity, kWh at the terminals: above the power limit, and what the year does not yield.
    floor_kwh: f64,
    /// The deficit, kWh at the terminals.
    deficit_kwh: f64,
    discharge_efficiency: f64,
}

impl Ranges {
    /// Of a duty's net power (less the standing load), with the power limit (kW, both ways; none = no limit).
    pub fn of(duty: &Duty, losses: &Losses, power_kw: Option<f64>) -> Self {
        let step_h = duty.record.step_h();
        let cap = power_kw.unwrap_or(f64::INFINITY);
        let (mut deficit, mut above, mut moved) = (Sum::default(), Sum::default(), Sum::default());
        // Turning points of the cumulative curve: runs of one sign are merged first.
        let mut points = vec![0.0];
        let mut curve = Sum::default();
        let mut direction = 0.0;
        for i in 0..duty.intervals() {
            let Some(net) = duty.net_kw(i) else { continue };
            let net = net - losses.standing_kw;
            if net < 0.0 {
                deficit.add(-net);
                above.add((-net - cap).max(0.0));
            }
            let inflow = losses.inflow_kwh(-net.clamp(-cap, cap), step_h);
            if inflow == 0.0 {
                continue;
            }
            moved.add(inflow.abs());
            if inflow * direction < 0.0 {
                points.push(curve.value());
            }
            direction = inflow;
            curve.add(inflow);
        }
        points.push(curve.value());
        let mut drift = curve.value();
        if drift.abs() <= 1e-9 * moved.value() {
            drift = 0.0;
        }
        let sign = if drift < 0.0 { -1.0 } else { 1.0 };
        let mut ranges = falling_ranges(&points, sign);
        sort_falling(&mut ranges);
        let mut sum = Sum::default();
        let sums = ranges
            .iter()
            .map(|range| {
                sum.add(*range);
                sum.value()
            })
            .collect();
        let lost = if drift < 0.0 { losses.discharge * -drift } else { 0.0 };
        Self {
            falls: ranges,
            sums,
            floor_kwh: above.value() * step_h + lost,
            deficit_kwh: deficit.value() * step_h,
            discharge_efficiency: losses.discharge,
        }
    }

    /// Unserved energy (kWh at the terminals, per pass of the record) with a capacity (kWh inside).
    pub fn unserved_kwh(&self, capacity_kwh: f64) -> f64 {
        let larger = self.falls.partition_point(|range| *range > capacity_kwh);
        let sum = if larger == 0 { 0.0 } else { self.sums[larger - 1] - larger as f64 * capacity_kwh };
        self.floor_kwh + self.discharge_efficiency * sum
    }

    /// The deficit, kWh at the terminals.
    pub fn deficit_kwh(&self) -> f64 {
        self.deficit_kwh
    }

    /// Least unserved energy at any capacity, kWh at the terminals.
    pub fn floor_kwh(&self) -> f64 {
        self.floor_kwh
    }

    /// Least capacity (kWh inside) that leaves at most this share of the deficit unserved; none = not reachable.
    pub fn capacity_kwh(&self, unserved_share: f64) -> Option<f64> {
        let tolerance = 1e-12 * self.deficit_kwh;
        let room = unserved_share * self.deficit_kwh - self.floor_kwh;
        if room < -tolerance {
            return None;
        }
        let room = room.max(0.0) / self.discharge_efficiency;
        if self.sums.last().is_none_or(|all| *all <= room) {
            return Some(0.0);
        }
        // Between two neighbouring ranges the sum is linear; the first segment whose lower end exceeds the room holds the answer.
        for (k, sum) in self.sums.iter().enumerate() {
            let count = (k + 1) as f64;
            let below = self.falls.get(k + 1).copied().unwrap_or(0.0);
            if sum - count * below >= room {
                return Some(((sum - room) / count).max(0.0));
            }
        }
        Some(0.0)
    }

    /// Capacity (kWh inside) beyond which nothing more is served.
    pub fn greatest_kwh(&self) -> f64 {
        self.falls.first().copied().unwrap_or(0.0)
    }

    /// Corners of the curve of unserved energy against capacity: capacities (kWh inside), rising from 0, at most about `most`.
    pub fn corners(&self, most: usize) -> Vec<f64> {
        let mut corners = vec![0.0];
        let stride = self.falls.len().div_ceil(most.max(1)).max(1);
        // Always the largest ranges: the curve's long right arm has few corners.
        let mut picked: Vec<f64> = self
            .falls
            .iter()
            .enumerate()
            .filter(|(k, _)| *k < most / 2 || k % stride == 0)
            .map(|(_, range)| *range)
            .collect();
        picked.reverse();
        corners.extend(picked);
        corners.dedup();
        corners
    }
}

/// Falling ranges of the periodic curve through `points` (turning points, with the last one a period after the first); `sign`
/// -1 turns it upside down.
fn falling_ranges(points: &[f64], sign: f64) -> Vec<f64> {
    let drift = sign * (points.last().copied().unwrap_or(0.0) - points.first().copied().unwrap_or(0.0));
    let body = &points[..points.len().saturating_sub(1)];
    let Some(top) = body
        .iter()
        .enumerate()
        .max_by(|a, b| (sign * a.1).total_cmp(&(sign * b.1)).then(b.0.cmp(&a.0)))
        .map(|(i, _)| i)
    else {
        return Vec::new();
    };
    let rotated = body[top..]
        .iter()
        .map(|point| sign * point)
        .chain(body[..=top].iter().map(|point| sign * point + drift));
    let mut ranges = Vec::new();
    let mut stack: Vec<f64> = Vec::new();
    for point in rotated {
        // Rotation can leave a point between its neighbours (the period's seam): only turning points may stay.
        while let [.., a, b] = stack[..] {
            if (b - a) * (point - b) >= 0.0 {
                stack.pop()
            } else {
                break;
            };
        }
        if stack.last() == Some(&point) {
            continue;
        }
        stack.push(point);
        while let [.., a, b, c, d] = stack[..] {
            let inner = (c - b).abs();
            if inner > (b - a).abs() || inner > (d - c).abs() {
                break;
            }
            ranges.push(inner);
            let last = stack.len();
            stack.drain(last - 3..last - 1);
        }
    }
    ranges.extend(stack.windows(2).filter(|pair| pair[1] < pair[0]).map(|pair| pair[0] - pair[1]));
    ranges
}
