//! Judges of pace and time: ramp, response, take-over, efficiency, holding, cycles and years.

use super::catalogue::{Model, Quantity, Range};
use super::judge::{Bench, per_hours};
use super::need::{Criterion, Judged, Pair};
use crate::chart::Verdict;
use crate::units::people::{duration, percent, significant, whole};

/// Greatest share of the stored energy that may be lost while it is held, where no efficiency was asked.
const MOST_LOST: f64 = 0.5;

/// Cycles and years are worth saying; under this standing share the estimate behind it does not decide.
const SLIGHT: f64 = 0.01;

/// The judges of pace, in order.
pub(super) fn judge(bench: &Bench) -> Vec<Judged> {
    [
        ramp(bench),
        response(bench),
        transfer(bench),
        round_trip(bench),
        holding(bench),
        cycles(bench),
        years(bench),
    ]
    .into_iter()
    .flatten()
    .collect()
}

/// A number that was asked: finite and not negative.
fn asked(value: Option<f64>) -> Option<f64> {
    value.filter(|value| value.is_finite() && *value >= 0.0)
}

/// A plant of the power asked reaches it within its response time.
fn ramp(bench: &Bench) -> Option<Judged> {
    let asked = asked(bench.need.ramp_kw_per_s)?;
    let published = bench.technology.range(Quantity::ResponseTime);
    let (typical, good) = (bench.power_kw / published.typical, bench.power_kw / published.low);
    let rate = |value: f64| format!("{}\u{202f}kW/s", significant(value, 3));
    Some(
        Judged::weigh(Criterion::Ramp, asked / typical, asked / good, bench.need.margin())
            .because(format!("Ramps at {}, {} at best; {} asked", rate(typical), rate(good), rate(asked)))
            .turned_by("A faster kind beside it for the steep part would turn it")
            .confirmed(published.verified),
    )
}

fn response(bench: &Bench) -> Option<Judged> {
    let asked = asked(bench.need.response_s)?;
    let published = bench.technology.range(Quantity::ResponseTime);
    Some(within(bench, Criterion::Response, published, asked).because(format!(
        "Full power in {}, {} at best; {} asked",
        duration(published.typical),
        duration(published.low),
        duration(asked)
    )))
}

/// Kinds with the usual converter of a grid plant break the supply for as long as they take to start.
fn transfer(bench: &Bench) -> Option<Judged> {
    let asked = asked(bench.need.transfer_s)?;
    if bench.technology.siting.no_break {
        return Some(Judged::plain(
            Criterion::Transfer,
            Verdict::Carries,
            "Takes over without a break with its usual converter",
        ));
    }
    let published = bench.technology.range(Quantity::ResponseTime);
    Some(
        within(bench, Criterion::Transfer, published, asked)
            .because(format!(
                "Takes over after {}, {} at best; a break of {} allowed",
                duration(published.typical),
                duration(published.low),
                duration(asked)
            ))
            .confirmed(false),
    )
}

/// A time that must not be longer than asked.
fn within(bench: &Bench, quantity: Criterion, published: &Range, asked: f64) -> Judged {
    Judged::weigh(quantity, published.typical / asked, published.low / asked, bench.need.margin())
        .turned_by(format!("{} allowed, or a faster kind beside it, would turn it", duration(published.low)))
        .confirmed(published.verified)
}

fn round_trip(bench: &Bench) -> Option<Judged> {
    let asked = asked(bench.need.round_trip_efficiency)?;
    let returns = bench.round_trip();
    let published = bench.technology.range(Quantity::RoundTripEfficiency);
    Some(
        Judged::weigh(
            Criterion::RoundTripEfficiency,
            lost_of(returns.typical, asked),
            lost_of(returns.good, asked),
            bench.need.margin(),
        )
        .because(format!(
            "Returns {} at {}, {} at best; at least {} asked",
            percent(returns.typical),
            duration(bench.hours * 3600.0),
            percent(returns.good),
            percent(asked)
        ))
        .turned_by(format!("Enough surplus to live with {} would turn it", percent(returns.good)))
        .confirmed(published.verified),
    )
}

/// Losses over the losses allowed.
fn lost_of(returned: f64, asked: f64) -> f64 {
    (1.0 - returned).max(0.0) / (1.0 - asked).max(0.0)
}

/// What is left of stored energy after the mean hold, with the standing load counted against it.
///
/// The standing load is spread over the energy held: by Little's law each kWh delivered was held for the mean hold, so
/// that a store whose level averages full draws (standing load per rated kWh) x hold for it; a lower level draws more,
/// so this is the least. Pumps and machines (fixed circuits, flow batteries) scale with power, cooling and heating with
/// energy. For hot batteries the published self-discharge is that heat, and only it is counted.
fn holding(bench: &Bench) -> Option<Judged> {
    let hold_h = asked(bench.need.mean_hold_s)? / 3600.0;
    let published = bench.technology.range(Quantity::SelfDischarge);
    let data = &bench.technology.circuit;
    let left = |leak_h: Option<f64>, heat: f64| {
        if data.self_discharge_is_standing {
            return libm::pow(1.0 - heat / 100.0, hold_h / per_hours(&published.unit));
        }
        let Some(tau) = leak_h else { return 1.0 };
        match data.model {
            Model::Fixed => libm::exp(-hold_h / tau),
            Model::Potential | Model::Kinetic => {
                let window = 1.0 - data.state_min_frac * data.state_min_frac;
                (1.0 + libm::expm1(-2.0 * hold_h / tau) / window).max(0.0)
            }
        }
    };
    let with_power = bench.technology.stands_with_power();
    let standing = if data.self_discharge_is_standing {
        0.0
    } else {
        data.standing_load_frac * hold_h * if with_power { 1.0 / bench.hours } else { data.ref_power_kw }
    };
    let kept = Pair {
        typical: left(data.leak_time_constant_s.map(|s| s / 3600.0), published.typical) / (1.0 + standing),
        good: left(bench.good_leak_h(), published.low) / (1.0 + standing),
    };
    // Where the conversion alone is worse than asked, that criterion says so; holding is then judged by itself.
    let returns = bench.round_trip();
    let wanted = asked(bench.need.round_trip_efficiency);
    let allowed = |returned: f64| {
        wanted.map(|wanted| 1.0 - wanted / returned).filter(|allowed| *allowed > 0.0).unwrap_or(MOST_LOST)
    };
    let load = Pair {
        typical: (1.0 - kept.typical) / allowed(returns.typical),
        good: (1.0 - kept.good) / allowed(returns.good),
    };
    Some(
        Judged::weigh(Criterion::SelfDischarge, load.typical, load.good, bench.need.margin())
            .because(format!(
                "Keeps {} of its energy over a mean hold of {}, standing load included; at most {} may go",
                percent(kept.typical),
                duration(hold_h * 3600.0),
                percent(allowed(returns.typical))
            ))
            .turned_by("Shorter holding, or more surplus to make up for it, would turn it")
            .confirmed(published.verified && standing < SLIGHT),
    )
}

/// Cycles over the service life against the cycle life. Where no service life is asked, over the kind's own calendar
/// life: it then can strain, by wearing out before its years are over, but never fails.
fn cycles(bench: &Bench) -> Option<Judged> {
    let yearly = asked(bench.need.cycles_per_year)?;
    let published = bench.technology.range(Quantity::CycleLife);
    let calendar = bench.technology.range(Quantity::CalendarLife);
    let service = asked(bench.need.service_life_years);
    let total = yearly * service.unwrap_or(calendar.typical);
    let (typical, mut good) = (total / published.typical, total / published.high);
    if service.is_none() {
        good = good.min(1.0);
    }
    Some(
        Judged::weigh(Criterion::Cycles, typical, good, bench.need.margin())
            .because(format!(
                "Lasts {} full cycles, {} at best; {} in {} years{}",
                whole(published.typical),
                whole(published.high),
                whole(total),
                significant(service.unwrap_or(calendar.typical), 2),
                if service.is_some() { " asked" } else { ", its calendar life" }
            ))
            .turned_by(format!(
                "Worn out after about {} years, then replaced",
                years_text(published.typical / yearly)
            ))
            .confirmed(published.verified),
    )
}

fn years(bench: &Bench) -> Option<Judged> {
    let asked = asked(bench.need.service_life_years)?;
    let published = bench.technology.range(Quantity::CalendarLife);
    Some(
        Judged::weigh(
            Criterion::ServiceLife,
            asked / published.typical,
            asked / published.high,
            bench.need.margin(),
        )
        .because(format!(
            "Lasts {} years, {} at best; {} asked",
            significant(published.typical, 2),
            significant(published.high, 2),
            significant(asked, 2)
        ))
        .turned_by(format!("One replacement after {} years would turn it", significant(published.typical, 2)))
        .confirmed(published.verified),
    )
}

fn years_text(years: f64) -> String {
    significant(years, 2)
}
