//! Laying the sheet: the stages and the pictures, one slice of work at a time.

use std::borrow::Cow;
use std::rc::Rc;

use super::{Heads, Pictures, Sheet, Terms, View, episodes, pictures};
use crate::assess::{self, Assessment};
use crate::case::{Case, Connection};
use crate::duty::{self, Kind};
use crate::fault::{Fault, Result};
use crate::job::{Job, Progress};
use crate::record::{Record, Zone};
use crate::requirement;
use crate::statement::words;
use crate::technology::{self, Catalogue};

/// The work that lays a sheet. A slice is one stage or one picture: each takes some milliseconds for a year at 15 minutes.
#[derive(Debug)]
pub struct Lay {
    record: Rc<Record>,
    case: Case,
    view: View,
    catalogue: Rc<Catalogue>,
    assessment: Option<Assessment>,
    pictures: Pictures,
    next: Stage,
}

/// What is done next.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Stage {
    Duty,
    Screening,
    Stores,
    Year,
    Net,
    Coverage,
    Week,
    Cumulative,
    Plane,
    Words,
}

impl Lay {
    /// The work for a record, a case and a view.
    pub fn new(record: Rc<Record>, case: Case, view: View, catalogue: Rc<Catalogue>) -> Self {
        Self {
            record,
            case,
            view,
            catalogue,
            assessment: None,
            pictures: Pictures::default(),
            next: Stage::Duty,
        }
    }

    /// Does one stage and returns the sheet after the last.
    fn stage(&mut self) -> Result<Option<Sheet>> {
        let Some(done) = &mut self.assessment else {
            if let Cow::Owned(edited) = self.catalogue.edited(&self.case.catalogue)? {
                self.catalogue = Rc::new(edited);
            }
            let duty = duty::ask(&self.record, &self.case)?;
            let requirement = requirement::derive(&duty, &self.case);
            self.assessment = Some(Assessment {
                duty,
                requirement,
                need: None,
                screening: technology::Screening::default(),
                simulations: Vec::new(),
                sizings: Vec::new(),
            });
            self.next = Stage::Screening;
            return Ok(None);
        };
        let (duty, requirement) = (&done.duty, &done.requirement);
        self.next = match self.next {
            Stage::Duty | Stage::Screening => {
                let (need, screening) = assess::screen(duty, requirement, &self.case, &self.catalogue);
                done.need = need;
                done.screening = screening;
                Stage::Stores
            }
            Stage::Stores => match self.case.stores.get(done.simulations.len()) {
                Some(store) => {
                    let run = assess::simulate(duty, store, done.simulations.len());
                    done.simulations.push(run);
                    Stage::Stores
                }
                None => Stage::Year,
            },
            Stage::Year => {
                let critical = pictures::critical(duty, requirement, &self.case);
                self.pictures.year = pictures::year(duty, critical.as_ref());
                self.pictures.duration = pictures::duration(duty);
                Stage::Net
            }
            Stage::Net => {
                self.pictures.net = pictures::net(duty, &self.view);
                Stage::Coverage
            }
            Stage::Coverage => {
                self.pictures.coverage = pictures::coverage(duty, requirement, &self.case);
                Stage::Week
            }
            Stage::Week => {
                self.pictures.week = requirement.asked.as_ref().map(|asked| pictures::week(duty, asked));
                Stage::Cumulative
            }
            Stage::Cumulative => {
                self.pictures.cumulative = pictures::cumulative(duty, requirement, &self.case);
                Stage::Plane
            }
            Stage::Plane => {
                let mut plane = technology::plane(
                    &self.catalogue,
                    done.need.as_ref(),
                    Some(&done.screening),
                    self.view.basis,
                    self.view.all_kinds,
                    &self.view.picks,
                );
                if plane.budget.is_empty() {
                    plane.budget = words::budget(&self.case, self.view.basis);
                }
                self.pictures.plane = plane;
                Stage::Words
            }
            Stage::Words => return self.sheet().map(Some),
        };
        Ok(None)
    }

    fn sheet(&mut self) -> Result<Sheet> {
        let Some(done) = self.assessment.take() else {
            return Err(Fault::new("the sheet was laid already", "engine", "Report this as a defect."));
        };
        let result = done.result();
        let words = words::all(&done, &result, &self.case, &self.view, &self.pictures);
        let (power_kw, served_share) = done
            .requirement
            .asked
            .as_ref()
            .map_or((0.0, 0.0), |asked| (asked.point.power_kw, asked.point.served_share));
        let limits = match done.duty.kind {
            Kind::Limits(limits) => (limits.import_kw, limits.export_kw),
            _ => (None, None),
        };
        Ok(Sheet {
            reading: self.record.reading.clone(),
            heads: heads(&self.record, &done, &result.version),
            record: words.record,
            duty: words.duty,
            requirement: words.requirement,
            plane: words.plane,
            episodes: episodes(&done.duty),
            terms: Terms {
                kind: done.duty.result.kind.clone(),
                import_limit_kw: limits.0,
                export_limit_kw: limits.1,
                power_kw,
                served_share,
                charge_efficiency: done.requirement.working.losses.charge,
                discharge_efficiency: done.requirement.working.losses.discharge,
                efficiency_assumed: done.requirement.working.assumed,
            },
            pictures: std::mem::take(&mut self.pictures),
            ..Sheet::of(&result)?
        })
    }
}

fn heads(record: &Record, done: &Assessment, version: &str) -> Heads {
    let files: Vec<&str> = record.reading.files.iter().map(|file| file.name.as_str()).collect();
    let zone = match &record.clock.zone {
        Zone::Unstated => "zone not stated".to_owned(),
        Zone::Fixed(0) => "UTC".to_owned(),
        Zone::Fixed(seconds) => {
            let sign = if *seconds < 0 { '\u{2212}' } else { '+' };
            let minutes = seconds.unsigned_abs() / 60;
            if minutes % 60 == 0 {
                format!("UTC{sign}{}", minutes / 60)
            } else {
                format!("UTC{sign}{}:{:02}", minutes / 60, minutes % 60)
            }
        }
        Zone::Named(zone) => zone.iana_name().unwrap_or("named zone").to_owned(),
    };
    Heads {
        record: files.join(", "),
        connection: match done.duty.connection {
            Connection::Islanded => "islanded",
            Connection::Connected => "connected",
        }
        .to_owned(),
        clock: format!("{zone}, {}", crate::units::people::duration(record.clock.step_s())),
        version: format!("{version}, zones {}", crate::result::zones()),
    }
}

impl Job for Lay {
    type Output = Sheet;

    fn advance(&mut self, budget: usize) -> Result<Option<Sheet>> {
        let mut left = budget;
        loop {
            if let Some(sheet) = self.stage()? {
                return Ok(Some(sheet));
            }
            let cost = self.record.clock.intervals * 4;
            if left <= cost {
                return Ok(None);
            }
            left -= cost;
        }
    }

    fn progress(&self) -> Progress {
        let what = match self.next {
            Stage::Duty => "finding capacities",
            Stage::Screening => "judging technologies",
            Stage::Stores => "running stores",
            Stage::Year | Stage::Net => "drawing the year",
            Stage::Coverage => "finding what each energy covers",
            Stage::Week => "running the asked store",
            Stage::Cumulative => "finding the critical period",
            Stage::Plane => "drawing the plane",
            Stage::Words => "writing sentences",
        };
        Progress { what, done: f64::from(self.next as u8) / f64::from(Stage::Words as u8) }
    }
}
