//! What each column of each file is added to.

use super::super::super::fill::{FilePlan, Use};
use super::super::super::grid::Grid;
use super::super::super::quality::Quality;
use super::super::super::roles::{self, Column, Target};
use super::super::super::settle::Register;
use super::super::super::unit::Unit;
use super::super::super::{Role, settle::Sums};
use super::super::{File, Reader};
use crate::case::DateOrder;

/// A running reading: header, unit and what it is added to.
type Reading = (String, Option<Unit>, Vec<(Target, f64)>);

/// Files with the same sums that follow each other in time, and so share series.
struct Lane {
    targets: Vec<Target>,
    readings: Vec<Reading>,
    spread: bool,
    series: Vec<usize>,
    covers: Vec<usize>,
    spans: Vec<(i64, i64)>,
}

/// The readings of a file.
fn readings(file: &File) -> impl Iterator<Item = (usize, &Column)> {
    file.columns.iter().enumerate().filter(|(_, column)| column.register && !column.into.is_empty())
}

impl Sums {
    fn add_series(&mut self) -> usize {
        self.series += 1;
        self.series - 1
    }
}

impl Reader {
    /// Sorts files into lanes: files with the same sums that follow each other in time share one, files that overlap are
    /// added up. Returns the number of lanes.
    pub(super) fn lanes(&mut self, grid: &Grid) -> usize {
        let mut lanes: Vec<Lane> = Vec::new();
        for (index, file) in self.files.iter().enumerate() {
            let Some(fit) = grid.fits.get(index).copied() else { continue };
            let scale = |column: &Column| {
                roles::stated(&self.terms.scale, &file.name, &column.header).copied().unwrap_or(1.0)
            };
            let mut targets: Vec<Target> = file
                .columns
                .iter()
                .filter(|column| !column.register)
                .flat_map(|column| &column.into)
                .map(|into| into.0)
                .collect();
            targets.sort_unstable();
            targets.dedup();
            let own: Vec<_> = readings(file)
                .map(|(_, column)| (roles::key(&column.header), column.unit, column.into.clone()))
                .collect();
            let span = file.scanned.as_ref().and_then(|scanned| grid.span(&scanned.stats)).unwrap_or((0, 0));
            let free = |lane: &Lane| {
                !file.typical
                    && lane.spans.iter().all(|other| {
                        let shared = span.1.min(other.1) - span.0.max(other.0);
                        shared * 10 <= (span.1 - span.0).min(other.1 - other.0) && span.0 != other.0
                    })
            };
            let same =
                |lane: &Lane| lane.targets == targets && lane.readings == own && lane.spread == fit.spread;
            let at = lanes.iter().position(|lane| same(lane) && free(lane)).unwrap_or_else(|| {
                let mut series = Vec::new();
                for target in &targets {
                    let at = self.sums.add_series();
                    self.sums.targets[*target as usize].push((at, 1.0));
                    series.push(at);
                }
                for (_, column) in readings(file) {
                    let at = self.sums.add_series();
                    let unit = column.unit.unwrap_or(Unit::Kwh).energy();
                    self.sums.registers.push(Register::new(
                        at,
                        column.header.clone(),
                        unit,
                        fit.late,
                        scale(column),
                    ));
                    for (target, sign) in &column.into {
                        self.sums.targets[*target as usize].push((at, *sign));
                        self.sums.own[*target as usize] = true;
                    }
                    series.push(at);
                }
                let covers: Vec<usize> = if fit.spread {
                    series.iter().map(|_| self.sums.add_series()).collect()
                } else {
                    Vec::new()
                };
                self.sums.spread.extend(series.iter().copied().zip(covers.iter().copied()));
                lanes.push(Lane {
                    targets: targets.clone(),
                    readings: own.clone(),
                    spread: fit.spread,
                    series,
                    covers,
                    spans: Vec::new(),
                });
                lanes.len() - 1
            });
            // A lane with a file of a typical year is full.
            lanes[at].spans.push(if file.typical { (i64::MIN / 4, i64::MAX / 4) } else { span });
            let mut slots = lanes[at].series.clone();
            let mut covers = lanes[at].covers.clone();
            let mut uses = Vec::new();
            for (cell, column) in file.columns.iter().enumerate() {
                let mut into: Vec<(usize, f64)> = if column.register {
                    let nth = readings(file).position(|(at, _)| at == cell);
                    nth.map(|nth| (targets.len() + nth, 1.0)).into_iter().collect()
                } else {
                    let slot = |target: &Target| targets.iter().position(|other| other == target);
                    let factor = scale(column);
                    column
                        .into
                        .iter()
                        .filter_map(|(target, sign)| Some((slot(target)?, sign * factor)))
                        .collect()
                };
                if column.extra && !column.register {
                    let wanted = roles::key(&column.header);
                    let known = self
                        .sums
                        .extras
                        .iter()
                        .find(|extra| roles::key(&extra.0) == wanted)
                        .map(|extra| extra.2);
                    let series = known.unwrap_or_else(|| {
                        let role = if column.role == Role::Ignore { Role::Asked } else { column.role };
                        let at = self.sums.add_series();
                        self.sums.extras.push((column.header.clone(), role, at));
                        at
                    });
                    into.push((slots.len(), scale(column)));
                    slots.push(series);
                    if fit.spread {
                        let cover = self.sums.add_series();
                        self.sums.spread.push((series, cover));
                        covers.push(cover);
                    }
                }
                if !into.is_empty() {
                    let watched = matches!(
                        column.role,
                        Role::Supply | Role::Demand | Role::Generation | Role::Import | Role::Export
                    );
                    let unit = if column.register { None } else { column.unit };
                    let phase = column.phase && !column.register && !column.into.is_empty();
                    uses.push(Use::new(cell, column.header.clone(), unit, into, watched, phase));
                }
            }
            let falling = file.falling();
            self.plans.push(Some(FilePlan {
                index,
                name: file.name.clone(),
                timing: file.timing,
                order: file.scanned.as_ref().map_or(DateOrder::DayFirst, |scanned| scanned.order),
                marks: file.dialect.marks,
                first_row: file.dialect.first_row,
                headers: file.dialect.headers.clone(),
                quality: quality(file),
                uses,
                slots,
                covers,
                fit,
                falling,
                years: if file.typical { file.years.clone() } else { Vec::new() },
                lane: at,
                repeat: self.terms.remedies.repeat,
                resolver: file.resolver(self.zone.as_ref()),
            }));
        }
        // A sum with a running reading in it needs a series of its own to be written to.
        for target in 0..roles::TARGETS {
            let members = &self.sums.targets[target];
            let out = members.first().map(|first| first.0);
            let shared = self.sums.own[target] && target <= Target::Net as usize;
            self.sums.out[target] = if shared { Some(self.sums.add_series()) } else { out };
        }
        lanes.len()
    }
}

/// The columns of quality marks, and what they speak of.
fn quality(file: &File) -> Vec<Quality> {
    let marks: Vec<usize> =
        (0..file.columns.len()).filter(|at| file.columns[*at].role == Role::Quality).collect();
    marks
        .iter()
        .map(|at| {
            // Of several each stands beside its own values.
            let beside = (0..*at)
                .rev()
                .find(|value| !file.columns[*value].into.is_empty() || file.columns[*value].extra);
            Quality::new(&file.dialect, *at, if marks.len() > 1 { beside } else { None })
        })
        .collect()
}
