//! Time-scale bands: net power split by nested blocks into parts that add up to it exactly.
//!
//! `A_0` = net power, `A_j` = its average over blocks of width j; band j = `A_{j-1} - A_j`, the rest is the last average. Widths that
//! are powers of two are the Haar wavelet (Haar 1910, Math. Ann. 69:331-371, from memory). Blocks begin at the record's start; a last
//! block cut short is averaged over what it has; gaps belong to no average and no band.

use crate::duty::Duty;
use crate::numeric::Sum;
use crate::result::Band;

/// The bands of a duty's net power between the edges (s, rising), fast to slow, then the rest.
pub(super) fn split(duty: &Duty, edges_s: &[f64]) -> Vec<Band> {
    let step_s = duty.record.clock.step_s();
    let widths: Vec<usize> =
        edges_s.iter().map(|edge| libm::round(edge / step_s).max(1.0) as usize).collect();
    let mut bands = Vec::new();
    let mut finer: Option<Vec<f64>> = None;
    let mut finer_width = 1;
    for (j, width) in widths.iter().copied().enumerate() {
        let coarser = block_means(duty, width);
        bands.push(band(duty, (Some(edges_s[j]), (j > 0).then(|| edges_s[j - 1])), |i, net| {
            finer.as_ref().map_or(net, |means| means[i / finer_width]) - coarser[i / width]
        }));
        finer = Some(coarser);
        finer_width = width;
    }
    bands.push(band(duty, (None, edges_s.last().copied()), |i, net| {
        finer.as_ref().map_or(net, |means| means[i / finer_width])
    }));
    bands
}

fn block_means(duty: &Duty, width: usize) -> Vec<f64> {
    let steps = duty.intervals();
    (0..steps.div_ceil(width))
        .map(|block| {
            let (mut sum, mut count) = (Sum::default(), 0_usize);
            for net in (block * width..((block + 1) * width).min(steps)).filter_map(|i| duty.net_kw(i)) {
                sum.add(net);
                count += 1;
            }
            if count == 0 { 0.0 } else { sum.value() / count as f64 }
        })
        .collect()
}

fn band(duty: &Duty, edges: (Option<f64>, Option<f64>), value: impl Fn(usize, f64) -> f64) -> Band {
    let (mut charge, mut discharge) = (0.0_f64, 0.0_f64);
    let (mut least, mut greatest) = (0.0_f64, 0.0_f64);
    let mut sum = Sum::default();
    for i in 0..duty.intervals() {
        let Some(net) = duty.net_kw(i) else { continue };
        let value = value(i, net);
        charge = charge.max(value);
        discharge = discharge.max(-value);
        sum.add(value);
        least = least.min(sum.value());
        greatest = greatest.max(sum.value());
    }
    Band {
        faster_than_s: edges.0,
        slower_than_s: edges.1,
        charge_kw: charge,
        discharge_kw: discharge,
        energy_kwh: (greatest - least) * duty.record.step_h(),
    }
}
