//! Ranges of the stores' numbers.

use super::{MOST, number, optional, word};
use crate::case::{Converter, FixedStore, Store};
use crate::fault::{Fault, Result};

/// Least of what must be above zero, and greatest of any number in SI units: far beyond anything built, short of overflow.
const SMALL: f64 = 1e-12;
const LARGE: f64 = 1e18;

/// Points of a table of voltages or forces.
const MOST_POINTS: usize = 5000;

/// The fields of one store, named from `place`.
struct Fields<'a> {
    place: &'a str,
}

impl Fields<'_> {
    fn at(&self, field: &str) -> String {
        format!("{}.{field}", self.place)
    }

    fn inside(&self, field: &str, value: f64, least: f64, greatest: f64, unit: &str) -> Result<()> {
        number(&self.at(field), value, least, greatest, unit)
    }

    /// Above zero.
    fn above(&self, field: &str, value: f64, unit: &str) -> Result<()> {
        self.inside(field, value, SMALL, LARGE, unit)
    }

    /// Zero or above.
    fn not_below_zero(&self, field: &str, value: f64, unit: &str) -> Result<()> {
        self.inside(field, value, 0.0, LARGE, unit)
    }

    /// None, or above zero.
    fn none_or_above(&self, field: &str, value: Option<f64>, unit: &str) -> Result<()> {
        optional(&self.at(field), value, SMALL, LARGE, unit)
    }

    /// A least value, a greatest, and a start between them that is the greatest where none is given.
    fn bounds(
        &self,
        least: (&str, Option<f64>),
        greatest: (&str, Option<f64>),
        start: (&str, Option<f64>),
        unit: &str,
    ) -> Result<()> {
        optional(&self.at(least.0), least.1, 0.0, LARGE, unit)?;
        self.none_or_above(greatest.0, greatest.1, unit)?;
        if let (Some(low), Some(high)) = (least.1, greatest.1)
            && low >= high
        {
            return Err(self.wrong(
                least.0,
                &format!("is {low}, not below {}, {high}", greatest.0),
                "Give a lower one.",
            ));
        }
        match start.1 {
            Some(value) => self.inside(start.0, value, 0.0, greatest.1.unwrap_or(LARGE), unit),
            None if greatest.1.is_none() => Err(self.wrong(
                start.0,
                "is missing",
                &format!("Give it, or {} from which the store then starts.", greatest.0),
            )),
            None => Ok(()),
        }
    }

    /// A table joined by straight lines: it rises in its first column, and its second is above zero except at single points.
    fn table(&self, field: &str, table: &[(f64, f64)]) -> Result<()> {
        if !(2..=MOST_POINTS).contains(&table.len()) {
            return Err(self.wrong(
                field,
                &format!("has {} points", table.len()),
                &format!("Give 2 to {MOST_POINTS} points."),
            ));
        }
        for (k, (x, y)) in table.iter().enumerate() {
            self.inside(&format!("{field}[{k}][0]"), *x, -LARGE, LARGE, "in the unit of the table")?;
            self.inside(&format!("{field}[{k}][1]"), *y, 0.0, LARGE, "in the unit of the table")?;
        }
        if table.windows(2).any(|pair| pair[0].0 >= pair[1].0) {
            return Err(self.wrong(
                field,
                "does not rise in its first column",
                "List the points in order, each once.",
            ));
        }
        if table.windows(2).any(|pair| pair[0].1 + pair[1].1 <= 0.0) {
            return Err(self.wrong(field, "holds no energy over a stretch", "Give values above zero."));
        }
        Ok(())
    }

    fn converter(&self, converter: Option<Converter>) -> Result<()> {
        let Some(converter) = converter else { return Ok(()) };
        self.inside("converter.a_w", converter.a_w, 0.0, MOST, "W")?;
        self.inside("converter.b", converter.b, 0.0, 0.9, "")?;
        self.inside("converter.c_per_w", converter.c_per_w, 0.0, 1.0, "1/W")
    }

    fn wrong(&self, field: &str, what: &str, remedy: &str) -> Fault {
        let field = self.at(field);
        Fault::new(format!("{field} {what}"), format!("case, at {field}"), remedy)
    }
}

/// Checks a store, which stands at `place` in the case.
pub(super) fn check(store: &Store, place: &str) -> Result<()> {
    let is = Fields { place };
    let terminals = store.terminals();
    optional(&is.at("charge_kw"), terminals.charge_kw, 0.0, MOST, "kW")?;
    optional(&is.at("discharge_kw"), terminals.discharge_kw, 0.0, MOST, "kW")?;
    is.converter(terminals.converter)?;
    word(&is.at("name"), terminals.name)?;
    match store {
        Store::Fixed(store) => fixed(&is, store),
        Store::Battery(store) => {
            is.above("charge_coulomb", store.charge_coulomb, "C")?;
            is.table("open_circuit", &store.open_circuit)?;
            let (first, last) = (store.open_circuit[0].0, store.open_circuit[store.open_circuit.len() - 1].0);
            if first != 0.0 || last != 1.0 {
                return Err(is.wrong(
                    "open_circuit",
                    &format!("runs from {first} to {last}"),
                    "Let the state of charge run from 0 to 1.",
                ));
            }
            is.not_below_zero("series_ohm", store.series_ohm, "ohm")?;
            if let Some(farad) = store.pair_farad {
                is.above("pair_farad", farad, "F")?;
                is.above("pair_ohm", store.pair_ohm, "ohm")?;
            } else {
                is.not_below_zero("pair_ohm", store.pair_ohm, "ohm")?;
            }
            is.none_or_above("leak_ohm", store.leak_ohm, "ohm")?;
            is.bounds(
                ("least_v", store.least_v),
                ("greatest_v", store.greatest_v),
                ("start_soc", Some(0.0)),
                "V",
            )?;
            is.inside("start_soc", store.start_soc, 0.0, 1.0, "")
        }
        Store::Capacitor(store) => {
            is.above("farad", store.farad, "F")?;
            is.not_below_zero("series_ohm", store.series_ohm, "ohm")?;
            is.none_or_above("leak_ohm", store.leak_ohm, "ohm")?;
            is.bounds(
                ("least_v", store.least_v),
                ("greatest_v", store.greatest_v),
                ("start_v", store.start_v),
                "V",
            )
        }
        Store::Reservoir(store) => {
            is.above("area_m2", store.area_m2, "m2")?;
            is.above("head_m", store.head_m, "m")?;
            is.not_below_zero("pipe_pa_s2_m6", store.pipe_pa_s2_m6, "Pa s2/m6")?;
            is.inside("turbine_efficiency", store.turbine_efficiency, 1e-3, 1.0, "")?;
            is.inside("pump_efficiency", store.pump_efficiency, 1e-3, 1.0, "")?;
            is.not_below_zero("leak_m3_s_pa", store.leak_m3_s_pa, "m3/(s Pa)")?;
            is.bounds(
                ("start_m3", None),
                ("greatest_m3", store.greatest_m3),
                ("start_m3", store.start_m3),
                "m3",
            )
        }
        Store::Flywheel(store) => {
            is.above("inertia_kg_m2", store.inertia_kg_m2, "kg m2")?;
            is.not_below_zero("viscous_nms", store.viscous_nms, "N m s")?;
            is.not_below_zero("coulomb_nm", store.coulomb_nm, "N m")?;
            is.bounds(
                ("least_rad_s", store.least_rad_s),
                ("greatest_rad_s", store.greatest_rad_s),
                ("start_rad_s", store.start_rad_s),
                "rad/s",
            )
        }
        Store::Coil(store) => {
            is.above("henry", store.henry, "H")?;
            is.not_below_zero("series_ohm", store.series_ohm, "ohm")?;
            is.none_or_above("greatest_v", store.greatest_v, "V")?;
            is.not_below_zero("cryogenic_w", store.cryogenic_w, "W")?;
            is.bounds(
                ("least_a", store.least_a),
                ("greatest_a", store.greatest_a),
                ("start_a", store.start_a),
                "A",
            )
        }
        Store::Curve(store) => {
            is.table("travel_force", &store.travel_force)?;
            is.not_below_zero("viscous_ns_m", store.viscous_ns_m, "N s/m")?;
            is.not_below_zero("coulomb_n", store.coulomb_n, "N")?;
            let (first, last) = (store.travel_force[0].0, store.travel_force[store.travel_force.len() - 1].0);
            optional(&is.at("start_m"), store.start_m, first, last, "m")
        }
    }
}

fn fixed(is: &Fields, store: &FixedStore) -> Result<()> {
    is.inside("energy_kwh", store.energy_kwh, 0.0, MOST, "kWh")?;
    is.inside("least_level", store.least_level, 0.0, 1.0, "")?;
    is.inside("greatest_level", store.greatest_level, store.least_level, 1.0, "")?;
    is.inside("charge_efficiency", store.charge_efficiency, 1e-3, 1.0, "")?;
    is.inside("discharge_efficiency", store.discharge_efficiency, 1e-3, 1.0, "")?;
    is.inside("self_discharge_per_h", store.self_discharge_per_h, 0.0, 1e3, "1/h")?;
    is.inside("standing_kw", store.standing_kw, 0.0, MOST, "kW")
}
