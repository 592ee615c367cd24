//! Instantaneous values, joined by straight lines: each interval lies between two of them.

use super::super::{Role, Series};
use super::Settle;
use crate::fault::Result;

impl Settle {
    /// Turns samples into averages of the intervals between them, exactly for the straight lines. Where net power changes
    /// its sign on the way, what the average hides is kept: with `p` above zero at one end and `q` below it at the other the
    /// line holds two triangles, and the lesser of their mean powers, min(p, q)^2 / (2 (p + q)), is in both sides.
    pub(super) fn join_samples(&mut self) -> Result<()> {
        let outs: Vec<usize> =
            self.sums.out[..=super::Target::Net as usize].iter().flatten().copied().collect();
        let lines = outs.iter().copied();
        let further = self.sums.extras.iter().filter(|extra| extra.1 != Role::Price).map(|extra| extra.2);
        let all: Vec<usize> = lines.chain(further).collect();
        for series in &all {
            bridge(&mut self.table.series[*series], self.joined)?;
        }
        let [supply, demand, net] = [0, 1, 2].map(|target| self.sums.out[target]);
        let at = |out: Option<usize>, i: usize| out.and_then(|out| self.table.series[out].get(i));
        let net_at = |i: usize| match (net, supply, demand) {
            (Some(_), _, _) => at(net, i),
            (None, Some(_), Some(_)) => Some(at(supply, i)? - at(demand, i)?),
            (None, Some(_), None) => at(supply, i),
            _ => None,
        };
        let mut hidden = Vec::new();
        for i in 0..self.points.saturating_sub(1) {
            if let (Some(from), Some(to)) = (net_at(i), net_at(i + 1))
                && from * to < 0.0
            {
                let (p, q) = (from.abs(), to.abs());
                hidden.push((i, p.min(q) * p.min(q) / (2.0 * (p + q))));
            }
        }
        self.hidden_kw = hidden;
        for series in &all {
            let series = &mut self.table.series[*series];
            for i in 0..series.len() {
                match series.get(i).zip(series.get(i + 1)) {
                    Some((from, to)) => series.set(i, from + (to - from) / 2.0)?,
                    None => series.clear(i),
                }
            }
        }
        Ok(())
    }
}

/// Joins samples at most `most` steps apart by straight lines.
fn bridge(series: &mut Series, most: usize) -> Result<()> {
    let mut last: Option<(usize, f64)> = None;
    for i in 0..series.len() {
        let Some(value) = series.get(i) else { continue };
        if let Some((from, start)) = last
            && i - from <= most
        {
            for k in from + 1..i {
                series.set(k, start + (value - start) * ((k - from) as f64 / (i - from) as f64))?;
            }
        }
        last = Some((i, value));
    }
    Ok(())
}
