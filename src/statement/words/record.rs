//! The Record station in words.

use super::{count, figure, stretch};
use crate::assess::Assessment;
use crate::sheet::{Figure, Method, Station};
use crate::units::people::{self, capital};

pub(super) fn station(done: &Assessment) -> Station {
    let duty = &done.duty;
    let totals = &duty.totals;
    let measured = totals.intervals - totals.missing_intervals;
    let changing = totals.findings.iter().filter(|finding| finding.changes_figures).count();
    let notes = totals.findings.len() - changing;
    let findings = match (changing, notes) {
        (0, 0) => "Nothing was found wrong.".to_owned(),
        (0, notes) => {
            format!("{} to read; none changes figures.", capital(&count(notes, "note", "notes")))
        }
        (1, _) => "One finding changes figures; it did not stop the reading.".to_owned(),
        (many, _) => {
            format!("{} findings change figures; none stopped the reading.", capital(&super::in_words(many)))
        }
    };
    let intervals = people::whole(totals.intervals as f64);
    let covered = if totals.missing_intervals == 0 {
        format!("all {intervals} intervals measured")
    } else {
        format!("{} of {intervals} intervals measured", people::whole(measured as f64))
    };
    let span = stretch(totals.step_s * totals.intervals as f64);
    let mut first = Vec::new();
    let mean = |energy: f64| {
        let hours = measured as f64 * totals.step_s / 3600.0;
        if hours > 0.0 { format!("mean {}", people::power(energy / hours)) } else { String::new() }
    };
    if let Some(supply) = totals.supply_kwh {
        first.push(figure("record.supply_kwh", supply, "Supply", people::energy(supply), mean(supply)));
    }
    if let Some(demand) = totals.demand_kwh {
        first.push(figure("record.demand_kwh", demand, "Demand", people::energy(demand), mean(demand)));
    }
    first.push(figure(
        "record.missing_intervals",
        totals.missing_intervals as f64,
        "Missing",
        people::Scaled { number: people::whole(totals.missing_intervals as f64), unit: "intervals" },
        if totals.missing_intervals == 0 { "" } else { "left out: they count for nothing" },
    ));
    first.push(figure(
        "record.filled_share",
        totals.filled_share,
        "Filled",
        people::percent(totals.filled_share),
        "of intervals, by a remedy",
    ));
    Station {
        sentence: format!("{} at {}, {covered}. {findings}", capital(&span), super::step(totals.step_s)),
        rail: format!("{span}, {}", people::duration(totals.step_s)),
        warning: match changing {
            0 => String::new(),
            1 => "1 finding changes figures".to_owned(),
            many => format!("{many} findings change figures"),
        },
        figures: vec![first, beside_the_year(done)],
        method: vec![Method {
            summary: "means of net power; duration curve by sorting".to_owned(),
            text: "Each cell is the mean net power of its hour (of a quarter of an hour in records of up to three weeks). The duration \
                   curve is net power sorted, against the hours for which it is reached or exceeded. Both sides share one power axis."
                .to_owned(),
            formula: String::new(),
            source: "elementary".to_owned(),
            limits: "Averages hide what happens inside an interval: peaks and ramps are lower bounds.".to_owned(),
        }],
        notes: vec![done.duty.record.reading.clock_note.clone()],
    }
}

/// Hours of surplus and deficit, and the steepest change.
fn beside_the_year(done: &Assessment) -> Vec<Figure> {
    let duty = &done.duty;
    let step_h = duty.record.step_h();
    let hours = |sign: f64| {
        duty.episodes
            .iter()
            .filter(|episode| episode.energy_kwh * sign > 0.0)
            .map(|episode| episode.steps)
            .sum::<usize>() as f64
            * step_h
    };
    let plain = |label: &str, value: f64, context: String| Figure {
        path: String::new(),
        value: Some(value),
        label: label.to_owned(),
        number: people::significant(value, 4),
        unit: "h".to_owned(),
        context,
    };
    let mut figures = Vec::new();
    if duty.has_net() {
        figures.push(plain(
            &format!("{} for", capital(super::surplus_word(duty.connection))),
            hours(1.0),
            format!("up to {}", people::power(duty.result.peak_surplus())),
        ));
        figures.push(plain(
            &format!("{} for", capital(super::deficit_word(duty.connection))),
            hours(-1.0),
            format!("up to {}", people::power(duty.result.peak_deficit())),
        ));
    }
    if let Some(ramp) = duty.result.steepest_ramp_kw_per_s {
        figures.push(figure(
            "duty.steepest_ramp_kw_per_s",
            ramp,
            "Steepest change",
            people::Scaled { number: people::significant(ramp * 60.0, 3), unit: "kW/min" },
            "between two intervals, a lower bound",
        ));
    }
    figures
}
