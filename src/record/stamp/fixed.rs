//! The two layouts that most long files have, read without scanning: `2026-01-31 13:15[:00]` and `31.01.2026 13:15[:00]`.

use super::{DAY, SECOND, Written, days};
use crate::case::DateOrder;

/// Reads a stamp of a fixed layout; none if the cell has another one or is no stamp, for the scanner to decide.
pub(super) fn fixed(cell: &[u8], order: DateOrder) -> Option<Written> {
    if !matches!(cell.len(), 16 | 19) || cell[13] != b':' {
        return None;
    }
    let two = |at: usize| {
        let (tens, ones) = (cell[at].wrapping_sub(b'0'), cell[at + 1].wrapping_sub(b'0'));
        (tens < 10 && ones < 10).then(|| i64::from(tens) * 10 + i64::from(ones))
    };
    let four = |at: usize| Some(two(at)? * 100 + two(at + 2)?);
    if !matches!(cell[10], b' ' | b'T') {
        return None;
    }
    let (date, clear, mark) = match (cell[4], cell[7], cell[2], cell[5]) {
        (b'-', b'-', _, _) => (days(four(0)?, two(5)?, two(8)?)?, true, b'-'),
        (_, _, mark @ (b'.' | b'/' | b'-'), other) if mark == other => match order {
            DateOrder::DayFirst => (days(four(6)?, two(3)?, two(0)?)?, false, mark),
            DateOrder::MonthFirst => (days(four(6)?, two(0)?, two(3)?)?, false, mark),
            DateOrder::YearFirst => return None,
        },
        _ => return None,
    };
    let (hour, minute) = (two(11)?, two(14)?);
    let second = match cell.get(16) {
        None => 0,
        Some(b':') => two(17)?,
        Some(_) => return None,
    };
    if hour > 23 || minute > 59 || second > 59 {
        return None;
    }
    Some(Written {
        civil_us: date * DAY + (hour * 3600 + minute * 60 + second) * SECOND,
        offset_s: None,
        clear,
        timed: true,
        halves: false,
        day_end: false,
        yearless: false,
        fold: None,
        mark,
    })
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::scanned;
    use super::*;

    proptest! {
        #[test]
        fn the_short_way_agrees_with_the_scanner(cell in "[0-9]{2,4}[-./][0-9]{2}[-./][0-9]{2,4}[ T][0-2][0-9]:[0-5][0-9](:[0-6][0-9])?") {
            for order in [DateOrder::DayFirst, DateOrder::MonthFirst, DateOrder::YearFirst] {
                if let Some(short) = fixed(cell.as_bytes(), order) {
                    prop_assert_eq!(Some(short), scanned(cell.as_bytes(), order));
                }
            }
        }
    }

    #[test]
    fn the_usual_layouts_take_the_short_way() {
        for cell in ["2026-01-31T13:15:00", "2026-01-31 13:15", "31.01.2026 13:15", "31/01/2026 13:15:59"] {
            assert!(fixed(cell.as_bytes(), DateOrder::DayFirst).is_some(), "{cell}");
        }
    }
}
