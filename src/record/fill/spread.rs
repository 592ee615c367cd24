//! Rows whose intervals are no whole steps of the clock: their energy is dealt out to the steps that they overlap
//! (cumulative energy at the edges, straight in between: methods of resampling interval averages).

use csv::ByteRecord;

use super::super::decode::text;
use super::super::grid::Grid;
use super::{Fill, Table};
use crate::fault::Result;

/// What is kept of a row until the length of its interval is known.
#[derive(Debug, Default)]
pub(super) struct Pending {
    row: Option<(u64, i64)>,
    record: ByteRecord,
}

impl Fill {
    /// Takes a row whose interval lasts from its stamp to the next one's.
    pub(super) fn spread(&mut self, row: u64, instant: i64, grid: &Grid, table: &mut Table) -> Result<()> {
        let before = self.pending.row;
        // Where the neighbour that tells the length comes first, the row is done at once; otherwise it waits.
        let waits = self.plan.falling == self.plan.fit.late;
        if before.is_some_and(|(_, before)| before == instant) {
            let shown = text(self.plan.timing.cell(&self.record));
            self.repeat.add(row, || shown);
            return Ok(());
        }
        let length = |other: i64| {
            let distance = (instant - other).abs();
            if distance <= self.plan.fit.longest_us { distance } else { self.plan.fit.step_us }
        };
        if waits {
            if let Some((last, before)) = before {
                let length = length(before);
                std::mem::swap(&mut self.record, &mut self.pending.record);
                self.deal(last, before, length, grid, table)?;
            } else {
                std::mem::swap(&mut self.record, &mut self.pending.record);
            }
        } else {
            let length = before.map_or(self.plan.fit.step_us, |(_, before)| length(before));
            self.deal(row, instant, length, grid, table)?;
        }
        self.pending.row = Some((row, instant));
        Ok(())
    }

    /// The last row, of which nothing tells the length.
    pub(in crate::record) fn last(&mut self, grid: &Grid, table: &mut Table) -> Result<()> {
        if self.plan.covers.is_empty() || self.plan.falling != self.plan.fit.late {
            return Ok(());
        }
        let Some((row, instant)) = self.pending.row.take() else { return Ok(()) };
        std::mem::swap(&mut self.record, &mut self.pending.record);
        self.deal(row, instant, self.plan.fit.step_us, grid, table)
    }

    fn deal(&mut self, row: u64, instant: i64, length: i64, grid: &Grid, table: &mut Table) -> Result<()> {
        let clock = &grid.clock;
        self.cells(row, length);
        let start = (if self.plan.fit.late { instant - length } else { instant }) - clock.start_us;
        let end = start + length;
        let last = i64::try_from(clock.intervals).unwrap_or(i64::MAX);
        let cells = start.div_euclid(clock.step_us).max(0)
            ..(end - 1).div_euclid(clock.step_us).saturating_add(1).min(last);
        for at in cells {
            let (Ok(i), edge) = (usize::try_from(at), at * clock.step_us) else { continue };
            let share = (end.min(edge + clock.step_us) - start.max(edge)) as f64 / clock.step_us as f64;
            table.seen[self.plan.lane].set(i);
            for ((slot, cover), value) in self.plan.slots.iter().zip(&self.plan.covers).zip(&self.sums) {
                let Some(value) = value else { continue };
                let sum = table.series[*slot].get(i).unwrap_or(0.0) + value * share;
                table.series[*slot].set(i, sum)?;
                let covered = table.series[*cover].get(i).unwrap_or(0.0) + share;
                table.series[*cover].set(i, covered)?;
            }
        }
        Ok(())
    }
}
