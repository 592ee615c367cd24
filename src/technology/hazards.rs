//! Hazard cautions in plain words.

use super::catalogue::Technology;

/// The standard words of caution, each with the marks in the published text that call for it.
const WORDS: [(&str, &[&str]); 7] = [
    (
        "fire and thermal runaway",
        &["thermal runaway", "fire", "flammable", "burning", "ignition", "overheating"],
    ),
    ("rotor burst", &["rotor burst", "overspeed"]),
    ("hydrogen", &["hydrogen"]),
    (
        "toxic or cryogenic release",
        &[
            "toxic",
            "cryogenic",
            "bromine",
            "acid",
            "caustic",
            "asphyxiation",
            "fluorides",
            "boil-off",
            "cyanide",
        ],
    ),
    ("crushing magnets", &["crushing between magnets", "strong magnetic fields"]),
    (
        "arc flash and stored energy",
        &[
            "arc",
            "residual",
            "fault current",
            "short-circuit",
            "high dc current",
            "sudden release",
            "rupture",
            "dropped load",
            "pressur",
            "dam or penstock",
        ],
    ),
    ("hot parts", &["hot surfaces", "hot cells", "molten", "hot exhaust"]),
];

/// Which of the standard words of caution apply to a kind, in a fixed order.
pub fn hazard_words(technology: &Technology) -> Vec<&'static str> {
    let text = technology.hazards.to_lowercase();
    // Whole words for the short marks, so that "hydrogen cyanide" counts as toxic, not as hydrogen gas.
    let text = text.replace("hydrogen cyanide", "cyanide");
    WORDS
        .iter()
        .filter(|(_, marks)| marks.iter().any(|mark| starts_a_word(&text, mark)))
        .map(|(word, _)| *word)
        .collect()
}

/// One line of caution for the page: the standard words, then the published text.
pub fn caution(technology: &Technology) -> String {
    let words = hazard_words(technology);
    let detail = technology.hazards.trim_end_matches('.');
    if words.is_empty() {
        format!("{detail}.")
    } else {
        format!("{}: {}.", sentence(&words.join(", ")), lower_first(detail))
    }
}

fn starts_a_word(text: &str, mark: &str) -> bool {
    text.match_indices(mark).any(|(at, _)| !text[..at].chars().next_back().is_some_and(char::is_alphanumeric))
}

fn sentence(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |first| first.to_uppercase().chain(chars).collect())
}

/// Lower case for the first letter, unless the first word is an abbreviation.
fn lower_first(text: &str) -> String {
    let mut chars = text.chars();
    match (chars.next(), chars.clone().next()) {
        (Some(first), Some(second)) if second.is_lowercase() => first.to_lowercase().chain(chars).collect(),
        _ => text.to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::technology::Catalogue;

    #[test]
    fn the_standard_words_apply_where_they_should() {
        let catalogue = Catalogue::published().unwrap();
        let words = |id: &str| hazard_words(catalogue.find(id).unwrap());
        assert!(words("li_ion_lfp").contains(&"fire and thermal runaway"));
        assert!(words("flywheel_composite").contains(&"rotor burst"));
        assert!(words("hydrogen_tank").contains(&"hydrogen"));
        assert!(words("zinc_bromine_flow").contains(&"toxic or cryogenic release"));
        assert!(words("smes").contains(&"toxic or cryogenic release"));
        assert!(words("magnet_spring").contains(&"crushing magnets"));
        assert!(words("edlc").contains(&"arc flash and stored energy"));
        assert!(!words("sodium_ion").contains(&"hydrogen"), "hydrogen cyanide is toxic, not hydrogen");
        assert!(!words("pumped_hydro").contains(&"rotor burst"));
    }

    #[test]
    fn every_kind_has_a_caution_of_standard_words() {
        for technology in Catalogue::published().unwrap().technologies {
            assert!(!hazard_words(&technology).is_empty(), "{}", technology.id);
            let text = caution(&technology);
            assert!(text.ends_with('.') && text.len() > 20, "{text}");
        }
    }
}
