//! A typical year laid on the years of the record.

use super::super::decode::text;
use super::super::grid::Grid;
use super::super::stamp::{DAY, date_of, days};
use super::super::timing::Moment;
use super::{Fill, MOST_ROWS, Table};
use crate::fault::Result;

impl Fill {
    /// Lays a row of a typical year on each year of the record, by month, day and time of day.
    pub(super) fn lay(&mut self, row: u64, moment: Moment, grid: &Grid, table: &mut Table) -> Result<()> {
        let (day, time) = (moment.us.div_euclid(DAY), moment.us.rem_euclid(DAY));
        let (_, month, of_month) = date_of(day);
        let whole = self.cells(row, self.plan.fit.step_us);
        let mut placed = false;
        for y in 0..self.plan.years.len() {
            let year = self.plan.years[y];
            // A year without leap day lends its 28 February.
            let lent = if (month, of_month) == (2, 28) { days(year, 2, 29) } else { None };
            for (day, is_lent) in [(days(year, month, of_month), false), (lent, true)] {
                let Some(day) = day else { continue };
                placed = true;
                let moment = Moment { us: day * DAY + time, ..moment };
                for instant in self.plan.resolver.moments(&moment).into_iter().flatten() {
                    let Some(i) = grid.step_at(self.plan.fit.start(instant).0) else { continue };
                    if !whole && table.holes.len() < MOST_ROWS {
                        table.holes.entry(i).or_insert((self.plan.index, row));
                    }
                    if is_lent {
                        self.lent(i, table)?;
                    } else {
                        self.store(row, i, &grid.clock, table)?;
                    }
                }
            }
        }
        if !placed {
            let shown = text(self.plan.timing.cell(&self.record));
            self.leap_days.add(row, || shown);
        }
        Ok(())
    }

    /// Stores a value lent to a leap day, which a row of the leap day itself goes before.
    fn lent(&mut self, i: usize, table: &mut Table) -> Result<()> {
        let end = (i + self.plan.fit.cells).min(table.series.first().map_or(0, super::Series::len));
        for i in i..end {
            for (slot, value) in self.plan.slots.iter().zip(&self.sums) {
                if let (Some(value), None) = (value, table.series[*slot].get(i)) {
                    table.series[*slot].set(i, *value)?;
                }
            }
        }
        Ok(())
    }
}
