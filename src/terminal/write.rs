//! Results written for people, for programs and for spreadsheets.

use std::io::{BufWriter, Stdout, Write};

use serde_json::Value;

use super::Form;
use crate::chart::Verdict;
use crate::fault::{Fault, Result};
use crate::result::SiteResult;
use crate::statement::words::SCREENING_NOTE;
use crate::units::people::{duration, energy, percent, power};

/// The columns of the table form: paths in the result object, so that the unit is in the header.
const COLUMNS: &[&str] = &[
    "site",
    "error.what",
    "error.where",
    "error.remedy",
    "record.intervals",
    "record.step_s",
    "record.start",
    "record.end",
    "record.missing_intervals",
    "record.supply_kwh",
    "record.demand_kwh",
    "record.filled_share",
    "duty.kind",
    "duty.connection",
    "duty.surplus_kwh",
    "duty.deficit_kwh",
    "duty.direct_use_kwh",
    "duty.self_consumption",
    "duty.self_sufficiency",
    "duty.surplus_episodes",
    "duty.deficit_episodes",
    "duty.largest_surplus_kwh",
    "duty.largest_deficit_kwh",
    "duty.longest_deficit_s",
    "duty.peak_charge_kw",
    "duty.peak_discharge_kw",
    "duty.steepest_ramp_kw_per_s",
    "duty.infeasible.why",
    "requirement.capacity_no_deficit_full_kwh",
    "requirement.capacity_no_deficit_cyclic_kwh",
    "requirement.capacity_no_curtailment_empty_kwh",
    "requirement.capacity_range_kwh",
    "requirement.least_round_trip_efficiency",
    "requirement.least_capacity_kwh",
    "requirement.least_charge_kw",
    "requirement.least_discharge_kw",
    "requirement.asked.served_share",
    "requirement.asked.power_kw",
    "requirement.asked.delivered_kwh",
    "requirement.asked.usable_kwh",
    "requirement.asked.nameplate_kwh",
    "plane.duration_s",
];

/// Writes results to the standard output.
pub(super) struct Writer {
    form: Form,
    out: BufWriter<Stdout>,
    started: bool,
}

impl Writer {
    pub(super) fn new(form: Form) -> Self {
        Self { form, out: BufWriter::new(std::io::stdout()), started: false }
    }

    /// Writes a site.
    pub(super) fn site(&mut self, result: &SiteResult) -> Result<()> {
        let text = match self.form {
            Form::Json => json(result)? + "\n",
            Form::Csv => {
                let head = if self.started { String::new() } else { COLUMNS.join(",") + "\r\n" };
                head + &row(result)?
            }
            Form::Text => paragraph(result),
        };
        self.started = true;
        self.put(&text)
    }

    /// Writes what follows the last site.
    pub(super) fn end(&mut self) -> Result<()> {
        if self.form == Form::Text {
            self.put(&format!("{SCREENING_NOTE}\n"))?;
        }
        Ok(())
    }

    fn put(&mut self, text: &str) -> Result<()> {
        self.out.write_all(text.as_bytes()).and_then(|()| self.out.flush()).map_err(|error| {
            Fault::new(
                format!("the output cannot be written: {error}"),
                "standard output",
                "Check that the disk has room and that the reader of the output is still there.",
            )
        })
    }
}

fn json(result: &SiteResult) -> Result<String> {
    serde_json::to_string(result).map_err(|error| unwritable(&error))
}

fn unwritable(error: &serde_json::Error) -> Fault {
    Fault::new(format!("the result cannot be written: {error}"), "engine", "Report this as a defect.")
}

fn row(result: &SiteResult) -> Result<String> {
    let value = serde_json::to_value(result).map_err(|error| unwritable(&error))?;
    let cells: Vec<String> = COLUMNS
        .iter()
        .map(|path| {
            let found = path.split('.').try_fold(&value, |value, key| value.get(key));
            match found {
                None | Some(Value::Null) => String::new(),
                Some(Value::String(text)) => quoted(text),
                Some(other) => other.to_string(),
            }
        })
        .collect();
    Ok(cells.join(",") + "\r\n")
}

/// A text cell, guarded where a spreadsheet would take it for a formula.
fn quoted(text: &str) -> String {
    let guard = if text.starts_with(['=', '+', '-', '@', '\t', '\r']) { "'" } else { "" };
    format!("\"{guard}{}\"", text.replace('"', "\"\""))
}

fn paragraph(result: &SiteResult) -> String {
    let mut lines = vec![result.site.clone()];
    if let Some(fault) = &result.error {
        lines.push(format!("  cannot be read: {}", fault.what));
        lines.push(format!("  where:          {}", fault.place));
        lines.push(format!("  remedy:         {}", fault.remedy));
    }
    if let Some(record) = &result.record {
        lines.push(format!(
            "  record       {} intervals of {} from {}, {} missing, {} findings",
            record.intervals,
            duration(record.step_s),
            record.start,
            record.missing_intervals,
            record.findings.len()
        ));
        lines.extend(
            record.findings.iter().map(|finding| format!("    - {} ({})", finding.text, finding.remedy)),
        );
    }
    if let Some(duty) = &result.duty {
        let connection =
            if duty.connection == crate::case::Connection::Islanded { "islanded" } else { "connected" };
        lines.push(format!(
            "  duty         {}, {connection}: surplus {}, deficit {} in {} episodes, up to {}",
            duty.kind,
            energy(duty.surplus()),
            energy(duty.deficit()),
            duty.deficit_episodes,
            power(duty.peak_deficit())
        ));
        if let Some(infeasible) = &duty.infeasible {
            lines.push(format!("    - {}", infeasible.why));
        }
    }
    if let Some(asked) = result.requirement.as_ref().and_then(|requirement| requirement.asked) {
        lines.push(format!(
            "  requirement  {} and {} delivered ({} usable inside, {} nameplate) serve {}",
            power(asked.power_kw),
            energy(asked.delivered_kwh),
            energy(asked.usable_kwh),
            energy(asked.nameplate_kwh),
            percent(asked.served_share)
        ));
    }
    for (verdict, word) in
        [(Verdict::Carries, "carry"), (Verdict::Strains, "strain"), (Verdict::Fails, "fail")]
    {
        let names: Vec<&str> = result
            .screening
            .iter()
            .filter(|kind| kind.verdict == verdict && kind.default_on)
            .map(|kind| kind.name.as_str())
            .collect();
        if !names.is_empty() {
            lines.push(format!("  {word:<12} {}", names.join(", ")));
        }
    }
    for run in &result.simulations {
        lines.push(format!(
            "  store        {}: serves {}, leaves {} unserved and {} curtailed",
            run.store,
            energy(run.served_kwh),
            energy(run.unserved_kwh),
            energy(run.curtailed_kwh)
        ));
    }
    lines.join("\n") + "\n\n"
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_text_cell_cannot_become_a_formula() {
        assert_eq!(quoted("=1+1"), "\"'=1+1\"");
        assert_eq!(quoted("a \"b\""), "\"a \"\"b\"\"\"");
        assert_eq!(quoted("hill-farm"), "\"hill-farm\"");
    }
}
