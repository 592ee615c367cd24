//! The pictures' series, made from the stages' values: decimated to what the eye can see.

use super::View;
use crate::case::{Balance, Case, Connection};
use crate::chart::{Critical, Cumulative, DurationCurve, EpisodeMark, Measure, NetPower, Week, YearSheet};
use crate::duty::{Duty, Episode, Kind};
use crate::numeric::{Sum, rising, sort_falling};
use crate::record::Clock;
use crate::requirement::capacity::{self, CriticalPeriod};
use crate::requirement::{Asked, Requirement};
use crate::simulation;
use crate::units::people::{energy, power};

mod coverage;

pub(super) use coverage::coverage;

const HOUR_US: f64 = 3.6e9;
const DAY_US: f64 = 24.0 * HOUR_US;

/// Most samples of a line: two for each pixel of a wide picture.
const SAMPLES: usize = 2000;

/// Most episodes named on a picture.
const NAMED: usize = 6;

/// Clock reading at the start of interval `i`, microseconds.
pub(super) fn reading_us(clock: &Clock, i: usize) -> f64 {
    clock.at_us(i) as f64 + f64::from(clock.offset_s(i)) * 1e6
}

/// The critical period of an islanded balance, or of any duty that must serve all deficits; none where limits are held or no
/// capacity serves everything.
pub(super) fn critical(duty: &Duty, requirement: &Requirement, case: &Case) -> Option<CriticalPeriod> {
    if !duty.kind.balances() || duty.connection == Connection::Connected {
        return None;
    }
    let losses = &requirement.working.losses;
    let cyclic =
        case.requirement.balance == Balance::Cyclic && capacity::balance(duty, losses, true).is_some();
    capacity::critical(duty, losses, cyclic)
}

/// The year sheet: hourly means, quarter-hourly for records of up to three weeks.
pub(super) fn year(duty: &Duty, critical: Option<&CriticalPeriod>) -> YearSheet {
    let clock = &duty.record.clock;
    if clock.intervals == 0 {
        return YearSheet::default();
    }
    let short = clock.span_s() <= 21.0 * 86_400.0;
    let cell_s = if short { 900.0 } else { 3600.0 };
    let first = clock.civil(0);
    let into_week_us =
        f64::from(first.weekday) * DAY_US + f64::from(first.hour) * HOUR_US + f64::from(first.minute) * 6e7;
    let first_us = reading_us(clock, 0);
    // Seconds below the minute belong to the first cell.
    let start_us = ((first_us - into_week_us) / 6e7).floor() * 6e7;
    let cells_per_row = libm::round(604_800.0 / cell_s) as usize;
    let last_us = reading_us(clock, clock.intervals - 1) + clock.step_us as f64;
    let rows = libm::ceil((last_us - start_us) / (7.0 * DAY_US)).max(1.0) as usize;
    let cells = rows * cells_per_row;
    let (mut sums, mut counts) = (vec![0.0; cells], vec![0_u32; cells]);
    let wide = clock.step_s() > cell_s;
    for i in 0..clock.intervals {
        let Some(net) = duty.shown_kw(i) else { continue };
        let from = (reading_us(clock, i) - start_us) / (cell_s * 1e6);
        let from_cell = from.max(0.0) as usize;
        // An interval longer than a cell fills all that it covers.
        let to_cell = if wide { libm::ceil(from + clock.step_s() / cell_s) as usize } else { from_cell + 1 };
        for cell in from_cell..to_cell.min(cells) {
            sums[cell] += net;
            counts[cell] += 1;
        }
    }
    let net_kw = sums
        .iter()
        .zip(&counts)
        .map(|(sum, count)| if *count == 0 { f64::NAN } else { sum / f64::from(*count) })
        .collect();
    YearSheet {
        start_us,
        cell_s,
        cells_per_row,
        net_kw,
        critical_us: critical.map(|period| {
            (reading_us(clock, period.from), reading_us(clock, period.to.min(clock.intervals)))
        }),
    }
}

/// The duration curve of net power.
pub(super) fn duration(duty: &Duty) -> DurationCurve {
    let mut values: Vec<f64> = (0..duty.intervals()).filter_map(|i| duty.shown_kw(i)).collect();
    sort_falling(&mut values);
    let step_h = duty.record.step_h();
    let most = 600.min(values.len());
    let at = |k: usize| if most < 2 { 0 } else { k * (values.len() - 1) / (most - 1) };
    let connected = duty.connection == Connection::Connected;
    let mut hours: Vec<f64> = (0..most).map(|k| at(k) as f64 * step_h).collect();
    let mut net_kw: Vec<f64> = (0..most).map(|k| values[at(k)]).collect();
    if let Some(last) = values.last() {
        // The last value holds to the end of its interval.
        hours.push(values.len() as f64 * step_h);
        net_kw.push(*last);
    }
    DurationCurve {
        hours,
        net_kw,
        surplus_kwh: duty.result.surplus(),
        deficit_kwh: duty.result.deficit(),
        import_limit_kw: duty.result.import_limit_kw,
        deficit_word: if connected { "import" } else { "deficit" }.to_owned(),
    }
}

/// Net power in the view's window, or around the largest deficit.
pub(super) fn net(duty: &Duty, view: &View) -> NetPower {
    let clock = &duty.record.clock;
    if clock.intervals == 0 {
        return NetPower::default();
    }
    let (from, to) = view.window_us.map_or_else(|| usual_window(duty), |window| intervals_of(clock, window));
    let stride = (to - from).div_ceil(SAMPLES).max(1);
    let mut picture = NetPower {
        window_us: (reading_us(clock, from), reading_us(clock, to)),
        limits_kw: [duty.result.import_limit_kw.map(|limit| -limit), duty.result.export_limit_kw]
            .into_iter()
            .flatten()
            .collect(),
        ..NetPower::default()
    };
    for start in (from..to).step_by(stride) {
        let (mut least, mut greatest) = (f64::INFINITY, f64::NEG_INFINITY);
        for net in (start..(start + stride).min(to)).filter_map(|i| duty.shown_kw(i)) {
            least = least.min(net);
            greatest = greatest.max(net);
        }
        let there = least <= greatest;
        picture.t_us.push(reading_us(clock, start));
        picture.least_kw.push(if there { least } else { f64::NAN });
        picture.greatest_kw.push(if there { greatest } else { f64::NAN });
    }
    let inside: Vec<_> = duty
        .episodes
        .iter()
        .filter(|episode| episode.start < to && episode.start + episode.steps > from)
        .collect();
    picture.episodes = largest(&inside, NAMED)
        .into_iter()
        .map(|episode| EpisodeMark {
            from_us: reading_us(clock, episode.start),
            to_us: reading_us(clock, episode.start + episode.steps),
            energy_kwh: episode.energy_kwh,
        })
        .collect();
    let cell = strip_cell(clock);
    for start in (0..clock.intervals).step_by(cell) {
        let (mut sum, mut count) = (Sum::default(), 0_usize);
        for net in (start..(start + cell).min(clock.intervals)).filter_map(|i| duty.shown_kw(i)) {
            sum.add(net);
            count += 1;
        }
        picture.strip_us.push(reading_us(clock, start));
        picture.strip_kw.push(if count == 0 { f64::NAN } else { sum.value() / count as f64 });
    }
    picture
}

/// The episodes of most energy, at most `most`; of equal ones those that were given first.
pub(super) fn largest<'d>(episodes: &[&'d Episode], most: usize) -> Vec<&'d Episode> {
    let keys: Vec<f64> = episodes.iter().map(|episode| -episode.energy_kwh.abs()).collect();
    rising(&keys).into_iter().take(most).map(|i| episodes[i]).collect()
}

/// Intervals in a cell of the strip: a day, or less where the record is short.
fn strip_cell(clock: &Clock) -> usize {
    let day = libm::round(86_400.0 / clock.step_s()).max(1.0) as usize;
    let most = clock.intervals.div_ceil(400).max(1);
    if clock.intervals / day >= 60 { day.max(most) } else { (clock.intervals / 240).max(1) }
}

fn intervals_of(clock: &Clock, window_us: (f64, f64)) -> (usize, usize) {
    let at = |us: f64| {
        // One correction step is enough: offsets change by far less than a window.
        let guess = ((us - reading_us(clock, 0)) / clock.step_us as f64).clamp(0.0, clock.intervals as f64);
        let back = (us - reading_us(clock, guess as usize)) / clock.step_us as f64;
        libm::round(guess + back).clamp(0.0, clock.intervals as f64) as usize
    };
    let from = at(window_us.0).min(clock.intervals - 1);
    (from, at(window_us.1).max(from + 1))
}

/// Two weeks around the largest deficit (or surplus), or the whole of a short record.
fn usual_window(duty: &Duty) -> (usize, usize) {
    let clock = &duty.record.clock;
    if clock.span_s() <= 21.0 * 86_400.0 {
        return (0, clock.intervals);
    }
    let day = 86_400.0 / clock.step_s();
    let largest = duty
        .episodes
        .iter()
        .min_by(|a, b| a.energy_kwh.total_cmp(&b.energy_kwh))
        .map_or((0, 0), |episode| (episode.start, episode.steps));
    let load_only = duty.result.surplus() == 0.0 || duty.episodes.is_empty();
    let (start, steps) = if load_only { (deepest(duty), 1) } else { largest };
    let length = (14.0 * day).max(1.6 * steps as f64).min(clock.intervals as f64) as usize;
    let middle = start + steps / 2;
    let from = middle.saturating_sub(length / 2).min(clock.intervals - length);
    (from, from + length)
}

/// The interval of the greatest deficit.
fn deepest(duty: &Duty) -> usize {
    (0..duty.intervals())
        .filter_map(|i| duty.shown_kw(i).map(|net| (i, net)))
        .min_by(|a, b| a.1.total_cmp(&b.1))
        .map_or(0, |(i, _)| i)
}

/// The week in which the asked store leaves most unserved, or stands lowest where it leaves nothing.
pub(super) fn week(asked: &Asked) -> Week {
    let duty = &asked.duty;
    let clock = &duty.record.clock;
    let (from, to) =
        if duty.kind == Kind::RideThrough { (0, duty.run_intervals().1) } else { deciding(asked) };
    let (length, first_run) = (to - from, duty.run_intervals().0);
    let stride = length.div_ceil(SAMPLES).max(1);
    let capacity = asked.store.energy_kwh;
    let connected =
        duty.connection == Connection::Connected && !duty.kind.hands_over() && duty.kind != Kind::RideThrough;
    let mut week = Week {
        store: format!("{} delivered, {}", energy(asked.point.delivered_kwh), power(asked.point.power_kw)),
        unserved_word: if connected { "remaining import" } else { "unserved" }.to_owned(),
        ..Week::default()
    };
    let (mut sums, mut count, mut i) = ((0.0, 0.0, f64::NAN), 0_usize, 0_usize);
    simulation::run_from(duty, &asked.store, asked.start_kwh, |step| {
        if (from..to).contains(&i) {
            if count == 0 {
                // An outage over the record's end goes on beyond it.
                let beyond_us = if step.interval < first_run { clock.span_s() * 1e6 } else { 0.0 };
                week.t_us.push(reading_us(clock, step.interval) + beyond_us);
                sums = (0.0, 0.0, step.level_kwh);
            }
            count += 1;
            sums.0 += if step.gap { f64::NAN } else { step.asked_kw };
            sums.1 += step.carried_kw;
            if count == stride || i + 1 == to {
                week.asked_kw.push(sums.0 / count as f64);
                week.carried_kw.push(sums.1 / count as f64);
                week.level.push(if capacity > 0.0 { sums.2 / capacity } else { 0.0 });
                count = 0;
            }
        }
        i += 1;
    });
    week
}

/// First interval of that week, and the one after its last.
fn deciding(asked: &Asked) -> (usize, usize) {
    let duty = &asked.duty;
    let clock = &duty.record.clock;
    let day = libm::round(86_400.0 / clock.step_s()).max(1.0) as usize;
    let length = (7 * day).min(clock.intervals);
    // Whole days from the first midnight.
    let into_day = reading_us(clock, 0).rem_euclid(DAY_US) / clock.step_us as f64;
    let first = if into_day == 0.0 { 0 } else { (day as f64 - into_day).max(0.0) as usize % day };
    let days = (clock.intervals.saturating_sub(first)).div_ceil(day).max(1);
    let (mut unserved, mut lowest) = (vec![0.0; days], vec![f64::INFINITY; days]);
    let mut i = 0_usize;
    simulation::run_from(duty, &asked.store, asked.start_kwh, |step| {
        if let Some(cell) = i.checked_sub(first).map(|since: usize| since / day) {
            unserved[cell] += (step.carried_kw.min(0.0) - step.asked_kw.min(0.0)).max(0.0);
            lowest[cell] = f64::min(lowest[cell], step.after_kwh);
        }
        i += 1;
    });
    let weeks = days.saturating_sub(6).max(1);
    let span = |start: usize| start..(start + 7).min(days);
    let most = (0..weeks)
        .map(|start| (start, span(start).map(|cell| unserved[cell]).sum::<f64>()))
        .fold((0, 0.0), |best, next| if next.1 > best.1 { next } else { best });
    let start = if most.1 > 0.0 {
        most.0
    } else {
        let deepest = (0..days).min_by(|a, b| lowest[*a].total_cmp(&lowest[*b])).unwrap_or(0);
        deepest.saturating_sub(3).min(weeks - 1)
    };
    let from = (first + start * day).min(clock.intervals - length);
    (from, from + length)
}

/// The cumulative energy curve after losses, with the critical period; empty where limits are held.
pub(super) fn cumulative(duty: &Duty, requirement: &Requirement, case: &Case) -> Cumulative {
    let clock = &duty.record.clock;
    if matches!(duty.kind, Kind::Limits(_) | Kind::RideThrough) || clock.intervals == 0 {
        return Cumulative::default();
    }
    // Where the power that is handed over depends on the losses, it is that of the working ones.
    let duty = requirement.asked.as_ref().map_or(duty, |asked| &asked.duty);
    let losses = &requirement.working.losses;
    let step_h = duty.record.step_h();
    let period = critical(duty, requirement, case);
    // The whole of a connected year; the surroundings of the critical period of an islanded one, so that its fall can be read.
    let (first, last) =
        period.filter(|period| period.to <= clock.intervals).map_or((0, clock.intervals), |period| {
            let around = (period.to - period.from).max(libm::round(3.0 * 86_400.0 / clock.step_s()) as usize);
            (period.from.saturating_sub(around), (period.to + around).min(clock.intervals))
        });
    let stride = (last - first).div_ceil(SAMPLES / 2).max(1);
    let keep = |i: usize| {
        (first..=last).contains(&i)
            && ((i - first).is_multiple_of(stride)
                || i == last
                || period.is_some_and(|period| i == period.from || i == period.to))
    };
    let mut picture = Cumulative::default();
    let mut sum = Sum::default();
    let (mut from_kwh, total);
    from_kwh = 0.0;
    for i in 0..=clock.intervals {
        if period.is_some_and(|period| i == period.from) {
            from_kwh = sum.value();
        }
        if keep(i) {
            picture.t_us.push(reading_us(clock, i));
            picture.energy_kwh.push(sum.value());
        }
        if i < clock.intervals {
            sum.add(capacity::handed_inflow(duty, losses, step_h, i));
        }
    }
    total = sum.value();
    // A fall over the record's end goes on in the repeated record: the curve is continued to the period's end.
    if let Some(period) = period
        && period.to > clock.intervals
    {
        let span_us = clock.span_s() * 1e6;
        let mut sum = Sum::default();
        sum.add(total);
        for i in 0..(period.to - clock.intervals).min(clock.intervals) {
            sum.add(capacity::handed_inflow(duty, losses, step_h, i));
            if (i + 1).is_multiple_of(stride) || i + 1 + clock.intervals == period.to {
                picture.t_us.push(reading_us(clock, i + 1) + span_us);
                picture.energy_kwh.push(sum.value());
            }
        }
    }
    picture.critical = period.map(|period| Critical {
        from_us: reading_us(clock, period.from),
        to_us: if period.to <= clock.intervals {
            reading_us(clock, period.to)
        } else {
            reading_us(clock, period.to - clock.intervals) + clock.span_s() * 1e6
        },
        from_kwh,
        to_kwh: from_kwh - period.capacity_kwh,
        delivered_kwh: period.capacity_kwh * losses.discharge,
    });
    picture
}

/// What a coverage picture of this duty measures.
pub(super) fn measure(duty: &Duty) -> Measure {
    if matches!(duty.kind, Kind::Limits(_)) {
        Measure::HeldImportKw
    } else if duty.connection == Connection::Connected
        && duty.totals.demand_kwh.is_some_and(|demand| demand > 0.0)
    {
        Measure::SelfSufficiency
    } else {
        Measure::ServedShare
    }
}
