//! For every kind of the catalogue the least size with which a run meets the asked point: how much of each would do.
//!
//! The store is the kind's typical design scaled by its rated energy, used to its typical depth, behind a converter for the asked power. The search
//! starts from the exact falling-range curve of a store of fixed efficiencies and is corrected by runs of the circuit: each run's missing energy is
//! read as a step on that curve. It ends with two runs, of the size found and of one at most 0.1 % smaller that fails.
//!
//! Where standing load or leak grow with the size, a larger store need not serve more; then sizes are scanned, and a note says so.

use super::run_of::{Ask, Outcome, Rig};
use crate::case::Case;
use crate::duty::{Duty, Kind};
use crate::fault::Result;
use crate::job::{Job, Progress};
use crate::requirement::{Asked, Losses, Ranges};
use crate::result::Sizing;
use crate::technology::{Catalogue, Design, Lumped, Per, Quantity, Standing, Technology};

/// Width of the bracket that ends a search, share of the size.
const WIDTH: f64 = 1e-3;

/// Runs after which a search ends, at the least size that it saw serve.
const MOST_RUNS: usize = 40;

/// Runs without a size that serves, after which sizes are scanned.
const PATIENCE: usize = 8;

/// Sizes of a scan, each this much larger than the last.
const SCAN: usize = 28;
const SCAN_STEP: f64 = 1.25;

/// Missing energy that is rounding, share of what is asked.
const ROUNDING: f64 = 1e-9;

/// The sizing of all kinds as a job, one kind a slice.
#[derive(Debug)]
pub struct Sizes<'a> {
    duty: &'a Duty,
    case: &'a Case,
    catalogue: &'a Catalogue,
    asked: Option<&'a Asked>,
    /// The powers asked without a standing load of the store's own, shared by all kinds that have none.
    ask: Option<Ask>,
    done: Vec<Sizing>,
}

impl<'a> Sizes<'a> {
    /// For a duty and its asked point; nothing is sized where nothing is asked.
    pub fn new(duty: &'a Duty, asked: Option<&'a Asked>, case: &'a Case, catalogue: &'a Catalogue) -> Self {
        Self { duty, case, catalogue, asked, ask: None, done: Vec::new() }
    }
}

impl Job for Sizes<'_> {
    type Output = Vec<Sizing>;

    fn advance(&mut self, _budget: usize) -> Result<Option<Self::Output>> {
        let (Some(asked), Some(technology)) = (self.asked, self.catalogue.technologies.get(self.done.len()))
        else {
            return Ok(Some(std::mem::take(&mut self.done)));
        };
        let standing_kw = asked.store.standing_kw;
        let ask = self.ask.get_or_insert_with(|| Ask::new(self.duty, standing_kw));
        self.done.push(Search::new(self.duty, asked, technology, ask).find(self.case));
        Ok(None)
    }

    fn progress(&self) -> Progress {
        let all = self.catalogue.technologies.len().max(1);
        Progress { what: "sizing kinds", done: self.done.len() as f64 / all as f64 }
    }
}

/// The search for one kind.
struct Search<'a> {
    technology: &'a Technology,
    design: Design,
    depth: f64,
    lumped: Lumped,
    rig: Rig<'a>,
    power_kw: f64,
    /// Energy that may be missing, kWh.
    allowed_kwh: f64,
    /// The curve of a store of fixed efficiencies; none where limits are held.
    ranges: Option<Ranges>,
    /// Rated energy at the start, kWh.
    first_kwh: f64,
    /// What no size serves, kWh.
    best_missed_kwh: f64,
    /// Whether losses grow with the size.
    grows: bool,
    runs: usize,
}

/// A size that was run.
#[derive(Debug, Clone, Copy)]
struct Tried {
    size_kwh: f64,
    outcome: Outcome,
}

impl<'a> Search<'a> {
    fn new(duty: &'a Duty, asked: &'a Asked, technology: &'a Technology, ask: &'a Ask) -> Self {
        let design = Design::at(technology, Per::Mass, 0.0);
        let depth = technology.range(Quantity::DepthOfDischarge).typical / 100.0;
        let lumped = design.circuit.lumped(depth);
        let power_kw = asked.point.power_kw;
        let standing = technology.standing(power_kw, design.circuit.ref_power_kw());
        let tolerated = (1.0 - asked.point.served_share).max(0.0);
        let mut search = Self {
            technology,
            design,
            depth,
            lumped,
            power_kw,
            allowed_kwh: tolerated * ask.asked_kwh() + ROUNDING * ask.asked_kwh(),
            ranges: None,
            first_kwh: (power_kw / lumped.peak_kw).max(1e-9),
            best_missed_kwh: 0.0,
            grows: standing.per_kwh_kw > 0.0 || (!lumped.fixed && lumped.decay_per_h > 0.0),
            runs: 0,
            rig: Rig::new(duty, ask, lumped, standing, power_kw, asked.store.start),
        };
        search.guess(duty, asked, standing);
        search
    }

    /// The first guess, by the exact curve of a store with the efficiencies of the circuit at the duration asked.
    fn guess(&mut self, duty: &Duty, asked: &Asked, standing: Standing) {
        let data = &self.technology.circuit;
        let circuit = &self.design.circuit;
        let fixed_part = data.eta_charge * data.eta_discharge;
        let hours = asked.point.delivered_kwh / self.power_kw;
        let running = circuit.meets(hours, self.depth).power_kw().unwrap_or(circuit.ref_power_kw());
        let running = running.min(circuit.ref_power_kw());
        let each_way = (circuit.round_trip(running, running).unwrap_or(fixed_part) / fixed_part).sqrt();
        let losses = |each_way: f64, own_kw: f64| Losses {
            charge: data.eta_charge * each_way,
            discharge: data.eta_discharge * each_way,
            self_discharge_per_h: 0.0,
            standing_kw: asked.store.standing_kw + own_kw,
        };
        if let Kind::Limits(_) = duty.kind {
            let usable =
                asked.point.usable_kwh * asked.store.discharge_efficiency / losses(each_way, 0.0).discharge;
            self.first_kwh = self.first_kwh.max(usable / self.lumped.energy_kwh);
            return;
        }
        // A bound for every size: no conversion is better than the fixed parts of its efficiencies, and the energy that even such a store
        // needs brings its standing load with it.
        let best = |own_kw: f64| Ranges::of(duty, &losses(1.0, own_kw), Some(self.power_kw + own_kw));
        let mut bound = best(standing.fixed_kw);
        if standing.per_kwh_kw > 0.0
            && let Some(usable) = bound.capacity_kwh(self.allowed_kwh / bound.deficit_kwh())
        {
            bound = best(standing.fixed_kw + standing.per_kwh_kw * usable / self.lumped.energy_kwh);
        }
        self.best_missed_kwh = bound.floor_kwh();
        if self.best_missed_kwh > self.allowed_kwh {
            return;
        }
        let by_power = self.first_kwh;
        for _ in 0..2 {
            let own_kw = standing.fixed_kw + standing.per_kwh_kw * self.first_kwh;
            let ranges = Ranges::of(duty, &losses(each_way, own_kw), Some(self.power_kw + own_kw));
            let usable =
                ranges.capacity_kwh(self.allowed_kwh / ranges.deficit_kwh()).unwrap_or(ranges.greatest_kwh());
            self.first_kwh = by_power.max(usable / self.lumped.energy_kwh);
            self.ranges = Some(ranges);
            if standing.per_kwh_kw == 0.0 {
                break;
            }
        }
    }

    fn find(mut self, case: &Case) -> Sizing {
        if self.best_missed_kwh > self.allowed_kwh {
            let most = 1.0 - self.best_missed_kwh / self.rig.asked_kwh();
            let note = format!(
                "No size serves what is asked: its conversion losses and standing load leave {} of it at most.",
                crate::units::people::percent(most.max(0.0))
            );
            return self.sizing(None, note, case);
        }
        let mut note = String::new();
        let mut found = self.bracket(None, None, PATIENCE);
        if found.is_none() {
            found = self.scan(&mut note);
        }
        self.sizing(found, note, case)
    }

    fn run(&mut self, size_kwh: f64) -> Tried {
        self.runs += 1;
        Tried { size_kwh, outcome: self.rig.run(size_kwh) }
    }

    fn serves(&self, tried: &Tried) -> bool {
        tried.outcome.missed_kwh <= self.allowed_kwh
    }

    /// Closes in on the least size that serves, from a size that fails and one that serves if they are known; none if none that serves
    /// comes up in `patience` runs.
    fn bracket(
        &mut self,
        mut fails: Option<Tried>,
        mut serves: Option<Tried>,
        patience: usize,
    ) -> Option<Tried> {
        let mut size = match (fails, serves) {
            (Some(low), Some(high)) => self.between(&low, &high),
            _ => self.first_kwh,
        };
        let mut tries = 0;
        while tries < MOST_RUNS {
            if serves.is_none() && tries >= patience {
                return None;
            }
            tries += 1;
            let tried = self.run(size);
            let root = self.root(&tried);
            if self.serves(&tried) {
                serves = Some(tried);
            } else {
                fails = Some(tried);
            }
            size = match (fails, serves) {
                (Some(low), Some(high)) if high.size_kwh <= low.size_kwh * (1.0 + WIDTH) => {
                    return Some(high);
                }
                // A size that almost nothing is left of serves too: nothing needs to be stored.
                (None, Some(high)) if high.size_kwh < 1e-9 * self.first_kwh => return Some(high),
                (Some(low), Some(high)) => {
                    // A little beyond the root on the side that is still open, so that the next run closes the bracket.
                    let root = root.unwrap_or_else(|| self.between(&low, &high));
                    let margin = 0.4 * WIDTH * root;
                    let near_high = high.size_kwh - root < root - low.size_kwh;
                    let aimed = if tries > PATIENCE {
                        f64::midpoint(low.size_kwh, high.size_kwh)
                    } else if near_high {
                        root - margin
                    } else {
                        root + margin
                    };
                    let aimed = if high.size_kwh - aimed < 0.5 * margin || aimed - low.size_kwh < 0.5 * margin
                    {
                        self.between(&low, &high)
                    } else {
                        aimed
                    };
                    if aimed > low.size_kwh && aimed < high.size_kwh {
                        aimed
                    } else {
                        f64::midpoint(low.size_kwh, high.size_kwh)
                    }
                }
                (Some(low), None) => {
                    root.filter(|root| *root < 3.0 * low.size_kwh)
                        .unwrap_or(low.size_kwh * 1.5)
                        .max(low.size_kwh * (1.0 + 0.6 * WIDTH))
                        * (1.0 + 0.3 * WIDTH)
                }
                (None, Some(high)) => {
                    root.filter(|root| *root > 0.3 * high.size_kwh)
                        .unwrap_or(high.size_kwh * 0.6)
                        .min(high.size_kwh * (1.0 - 0.6 * WIDTH))
                        * (1.0 - 0.3 * WIDTH)
                }
                (None, None) => self.first_kwh,
            };
        }
        serves
    }

    /// Where the exact curve, moved to pass through a run, leaves what is allowed; none where it says nothing.
    fn root(&self, tried: &Tried) -> Option<f64> {
        let ranges = self.ranges.as_ref()?;
        let deficit = ranges.deficit_kwh();
        let on_curve = |missed: f64| ranges.capacity_kwh(missed / deficit);
        let (here, there) = (on_curve(tried.outcome.missed_kwh)?, on_curve(self.allowed_kwh)?);
        let root = tried.size_kwh + (there - here) / self.lumped.energy_kwh;
        (root.is_finite() && root > 0.0 && here != there).then_some(root)
    }

    /// Between two sizes, by the missing energies where they tell.
    fn between(&self, low: &Tried, high: &Tried) -> f64 {
        let (over, under) =
            (low.outcome.missed_kwh - self.allowed_kwh, self.allowed_kwh - high.outcome.missed_kwh);
        let share = if over + under > 0.0 { over / (over + under) } else { 0.5 };
        low.size_kwh + (high.size_kwh - low.size_kwh) * share.clamp(0.05, 0.95)
    }

    /// Tries sizes from small to large, for a kind whose losses grow with its size.
    fn scan(&mut self, note: &mut String) -> Option<Tried> {
        let mut size = 0.3 * self.first_kwh;
        let mut best: Option<Tried> = None;
        let mut before: Option<Tried> = None;
        let mut worse = 0;
        for _ in 0..SCAN {
            let tried = self.run(size);
            if self.serves(&tried) {
                if self.grows {
                    "Found by a scan of sizes: its losses grow with its size, so that more need not serve more."
                        .clone_into(note);
                }
                return self.bracket(before, Some(tried), usize::MAX);
            }
            worse = if best.is_some_and(|best| tried.outcome.missed_kwh >= best.outcome.missed_kwh) {
                worse + 1
            } else {
                best = Some(tried);
                0
            };
            if worse >= 3 {
                break;
            }
            before = Some(tried);
            size *= SCAN_STEP;
        }
        let best = best?;
        *note = format!(
            "No size serves what is asked: {}. At best {} of it, with {} of rated energy.",
            if self.grows { "its losses grow with its size" } else { "its losses leave too little" },
            crate::units::people::percent(self.served(&best).max(0.0)),
            crate::units::people::energy(best.size_kwh)
        );
        None
    }

    fn served(&self, tried: &Tried) -> f64 {
        1.0 - tried.outcome.missed_kwh / self.rig.asked_kwh()
    }

    fn sizing(&self, found: Option<Tried>, mut note: String, case: &Case) -> Sizing {
        let size = found.map(|tried| tried.size_kwh);
        let terms = &case.requirement;
        // Nameplate energy at the start of life: what fades until its end, and the margin, on top.
        let nameplate = size.map(|size| size / terms.end_of_life * (1.0 + terms.margin));
        let packed = |per: Per| {
            let (energy, _) = per.quantities();
            let per_kwh = 1000.0 / self.technology.range(energy).typical;
            Some(nameplate? * per_kwh * self.technology.siting.packing?)
        };
        let power_kw = size.map(|size| self.power_kw.min(size * self.lumped.peak_kw));
        if note.is_empty() && power_kw.is_some_and(|power| power < self.power_kw) {
            "Meets the share with less than the asked power.".clone_into(&mut note);
        }
        Sizing {
            technology: self.technology.id.clone(),
            delivered_kwh: size.map(|size| {
                let power = (self.power_kw / size).min(self.design.circuit.ref_power_kw());
                size * self.lumped.delivered_kwh(power)
            }),
            usable_kwh: size.map(|size| size * self.lumped.energy_kwh),
            depth: self.depth,
            nameplate_kwh: nameplate,
            power_kw,
            mass_kg: packed(Per::Mass),
            volume_l: packed(Per::Volume),
            served_share: found.map(|tried| self.served(&tried)),
            runs: self.runs,
            note,
        }
    }
}
