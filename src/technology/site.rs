//! Judges of the place and the market. Every fact here is judgement from memory, so nothing is ever confirmed.

use super::catalogue::{Indoors, Market, Quantity};
use super::judge::Bench;
use super::need::{Criterion, Judged};
use crate::chart::Verdict;
use crate::units::people::{plain, power};

/// Air outside a kind's range by up to this is met by a heated or cooled enclosure, K.
const ENCLOSURE_K: f64 = 10.0;

/// A plant smaller than the least plausible one by this factor, at best.
const SMALLER: f64 = 2.0;

/// A duty larger than the greatest plausible plant by this factor, at best, as several plants.
const LARGER: f64 = 10.0;

/// From this power on, plants are bought the way utilities buy them, kW.
const UTILITY_KW: f64 = 1000.0;

/// Needs that no site has unless the ground does.
const GROUND: [&str; 3] = ["two basins with height difference", "salt cavern", "shaft or tower"];

/// The judges of the place, in order.
pub(super) fn judge(bench: &Bench) -> Vec<Judged> {
    let mut judged = Vec::new();
    judged.extend(ambient(bench));
    judged.push(plant_size(bench));
    judged.push(siting(bench));
    judged.push(market(bench));
    judged
}

fn ambient(bench: &Bench) -> Option<Judged> {
    let (least, greatest) = bench.need.ambient_c.filter(|(a, b)| a.is_finite() && b.is_finite())?;
    let (least, greatest) = (least.min(greatest), least.max(greatest));
    let published = bench.technology.range(Quantity::AmbientTemperature);
    let outside = (published.low - least).max(greatest - published.high).max(0.0);
    let verdict = if outside <= 0.0 {
        Verdict::Carries
    } else if outside <= ENCLOSURE_K {
        Verdict::Strains
    } else {
        Verdict::Fails
    };
    let celsius = |value: f64| plain(value, 0);
    let reason = format!(
        "Stands in air of {} to {} \u{b0}C; the site has {} to {} \u{b0}C",
        celsius(published.low),
        celsius(published.high),
        celsius(least),
        celsius(greatest)
    );
    Some(
        Judged::plain(Criterion::Ambient, verdict, reason)
            .turned_by("A heated or cooled room would turn it")
            .confirmed(published.verified),
    )
}

fn plant_size(bench: &Bench) -> Judged {
    let place = &bench.technology.siting;
    let asked = bench.need.discharge_kw.max(bench.need.charge_kw).max(bench.power_kw);
    let (load, slack, turn) = if asked < place.least_plant_kw {
        (
            place.least_plant_kw / asked,
            SMALLER,
            format!("A duty of {} would turn it", power(place.least_plant_kw)),
        )
    } else {
        (asked / place.greatest_plant_kw, LARGER, "Several plants would turn it".to_owned())
    };
    Judged::weigh(Criterion::PlantSize, load, load / slack, 0.0)
        .because(format!(
            "Built from {} to {}; {} asked",
            power(place.least_plant_kw),
            power(place.greatest_plant_kw),
            power(asked)
        ))
        .turned_by(turn)
}

fn siting(bench: &Bench) -> Judged {
    let place = &bench.technology.siting;
    let needs = if place.needs.is_empty() { "nothing special".to_owned() } else { place.needs.clone() };
    let quantity = Criterion::Siting;
    if bench.need.indoors == Some(true) {
        return match place.indoors {
            Indoors::Yes => {
                Judged::plain(quantity, Verdict::Carries, format!("Stands indoors; needs {needs}"))
            }
            Indoors::WithMeasures => Judged::plain(
                quantity,
                Verdict::Strains,
                format!("Stands indoors only with measures: {needs}"),
            )
            .turned_by("A place outdoors, or those measures agreed with the local authority, would turn it"),
            Indoors::No => {
                Judged::plain(quantity, Verdict::Fails, format!("Does not stand indoors; needs {needs}"))
                    .turned_by("A place outdoors would be the first condition")
            }
        };
    }
    if GROUND.contains(&place.needs.as_str()) {
        return Judged::plain(quantity, Verdict::Strains, format!("Needs {needs}, which few sites have"))
            .turned_by("Only a site that has it can turn it");
    }
    Judged::plain(quantity, Verdict::Carries, format!("Needs {needs}"))
}

/// A kind that is not bought for single sites strains; experiments too: the physics decides whether they could do it,
/// the words say that none can be bought.
fn market(bench: &Bench) -> Judged {
    let quantity = Criterion::Market;
    match bench.technology.siting.market {
        Market::Site => Judged::plain(quantity, Verdict::Carries, "Bought today for single sites"),
        Market::Utility if bench.power_kw >= UTILITY_KW => {
            Judged::plain(quantity, Verdict::Carries, "Bought by utilities at this size")
        }
        Market::Utility => Judged::plain(quantity, Verdict::Strains, "Sold mostly to utilities")
            .turned_by("A supplier who sells it at this size would turn it"),
        Market::Demonstration => Judged::plain(quantity, Verdict::Strains, "Demonstration plants only")
            .turned_by("A supplier with a warranty would turn it"),
        Market::Experimental => Judged::plain(quantity, Verdict::Strains, "Experimental: none to buy today")
            .turned_by("A product on the market would turn it"),
    }
}
