//! Headers and cells to units of power and energy.

/// A unit of power or of energy in the interval.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Unit {
    W,
    Kw,
    Mw,
    Gw,
    Wh,
    Kwh,
    Mwh,
    Gwh,
}

impl Unit {
    /// The unit that a word writes, without regard to case.
    pub(super) fn named(word: &str) -> Option<Self> {
        Some(match word.trim().to_lowercase().as_str() {
            "w" | "watt" | "watts" => Self::W,
            "kw" | "kilowatt" | "kilowatts" | "kwh/h" => Self::Kw,
            "mw" | "megawatt" | "mwh/h" => Self::Mw,
            "gw" => Self::Gw,
            "wh" => Self::Wh,
            "kwh" => Self::Kwh,
            "mwh" => Self::Mwh,
            "gwh" => Self::Gwh,
            _ => return None,
        })
    }

    /// Whether it measures energy.
    pub(super) fn is_energy(self) -> bool {
        matches!(self, Self::Wh | Self::Kwh | Self::Mwh | Self::Gwh)
    }

    /// The unit of energy that belongs to a unit of power; itself if it is one.
    pub(super) fn energy(self) -> Self {
        match self {
            Self::W | Self::Wh => Self::Wh,
            Self::Kw | Self::Kwh => Self::Kwh,
            Self::Mw | Self::Mwh => Self::Mwh,
            Self::Gw | Self::Gwh => Self::Gwh,
        }
    }

    /// As written for people.
    pub(super) fn label(self) -> &'static str {
        match self {
            Self::W => "W",
            Self::Kw => "kW",
            Self::Mw => "MW",
            Self::Gw => "GW",
            Self::Wh => "Wh",
            Self::Kwh => "kWh",
            Self::Mwh => "MWh",
            Self::Gwh => "GWh",
        }
    }

    /// The value as average power in kW over an interval of `step_h` hours.
    pub(super) fn kw(self, value: f64, step_h: f64) -> f64 {
        match self {
            Self::W => value / 1000.0,
            Self::Kw => value,
            Self::Mw => value * 1000.0,
            Self::Gw => value * 1e6,
            Self::Wh => value / 1000.0 / step_h,
            Self::Kwh => value / step_h,
            Self::Mwh => value * 1000.0 / step_h,
            Self::Gwh => value * 1e6 / step_h,
        }
    }
}

/// What a header or a cell of a units row says of the unit.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Stated {
    /// Power or energy.
    Power(Unit),
    /// Another quantity, as written.
    Other(String),
    /// Nothing.
    Nothing,
}

/// Units of other quantities that meter files carry beside power.
const OTHERS: [&str; 44] = [
    "kvar", "kvarh", "var", "varh", "mvar", "mvarh", "kva", "kvah", "va", "mva", "mvah", "v", "kv", "a",
    "ma", "hz", "mhz", "%", "°c", "c", "degc", "°f", "k", "m/s", "km/h", "w/m2", "w/m²", "kwh/m2", "j/cm2",
    "pa", "hpa", "mbar", "bar", "mm", "°", "deg", "eur/kwh", "€/kwh", "eur/mwh", "€/mwh", "m3", "m³", "l/h",
    "rpm",
];

/// The unit of a cell of a units row, brackets allowed.
pub(super) fn unit_cell(cell: &str) -> Stated {
    let bare = cell.trim().trim_matches(|c| matches!(c, '[' | ']' | '(' | ')' | '{' | '}')).trim();
    if let Some(unit) = Unit::named(bare) {
        return Stated::Power(unit);
    }
    let low = bare.to_lowercase();
    if OTHERS.contains(&low.as_str()) || money(&low) {
        return Stated::Other(bare.to_owned());
    }
    Stated::Nothing
}

/// Whether a cell can stand in a row of units.
pub(super) fn in_unit_row(cell: &str) -> bool {
    let low = cell.trim().to_lowercase();
    unit_cell(cell) != Stated::Nothing
        || matches!(
            low.as_str(),
            "" | "-"
                | "[-]"
                | "h"
                | "min"
                | "s"
                | "[h]"
                | "[min]"
                | "[s]"
                | "utc"
                | "unit"
                | "units"
                | "einheit"
        )
}

/// Whether a unit in small letters is money per energy.
pub(super) fn money(low: &str) -> bool {
    let has = |part: &str| low.contains(part);
    has("/") && ["eur", "€", "usd", "$", "ct", "gbp", "£", "chf", "cent"].iter().any(|coin| has(coin))
}

/// The unit that a header carries: in brackets, after a slash, or as its last word.
pub(super) fn unit_of(header: &str) -> Stated {
    let low = header.to_lowercase();
    if money(&low)
        || ["eur_kwh", "eur_mwh", "ct_kwh", "usd_kwh", "gbp_kwh", "per_kwh", "per_mwh"]
            .iter()
            .any(|end| low.contains(end))
    {
        return Stated::Other(String::new());
    }
    for (open, close) in [('[', ']'), ('(', ')'), ('{', '}')] {
        if let Some(start) = header.rfind(open) {
            let inner = &header[start + open.len_utf8()..];
            let inner = inner.split(close).next().unwrap_or("");
            let stated = unit_cell(inner);
            if stated != Stated::Nothing {
                return stated;
            }
        }
    }
    let mark = |c: char| {
        c.is_whitespace() || matches!(c, '_' | '[' | ']' | '(' | ')' | ',' | ';' | ':' | '-' | '.' | '|')
    };
    let words: Vec<&str> = header.split(mark).filter(|word| !word.is_empty()).collect();
    if let Some(stated) =
        words.iter().rev().map(|word| whole_or_after_slash(word)).find(|stated| *stated != Stated::Nothing)
    {
        return stated;
    }
    // power_w: a single letter counts where names are joined by underscores.
    if header.trim_end().to_lowercase().ends_with("_w") {
        return Stated::Power(Unit::W);
    }
    // supplyKW, LoadkWh
    for ending in ["kWh", "KWh", "KWH", "MWh", "MWH", "kW", "KW", "MW"] {
        if let Some(before) = header.trim_end().strip_suffix(ending)
            && before.ends_with(|c: char| c.is_lowercase() || c.is_ascii_digit())
            && let Some(unit) = Unit::named(ending)
        {
            return Stated::Power(unit);
        }
    }
    Stated::Nothing
}

fn whole_or_after_slash(word: &str) -> Stated {
    // Single letters are too often names of columns to be taken for units outside brackets.
    let long = |text: &str| text.chars().count() > 1 || matches!(text, "W" | "%" | "°");
    if long(word) {
        let stated = unit_cell(word);
        if stated != Stated::Nothing {
            return stated;
        }
    }
    match word.rsplit_once('/') {
        Some((_, unit)) if long(unit) => unit_cell(unit),
        _ => Stated::Nothing,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_are_found_in_headers() {
        for (header, unit) in [
            ("supply_kw", Unit::Kw),
            ("demand (kWh)", Unit::Kwh),
            ("Last [kW]", Unit::Kw),
            ("Leistung/kW", Unit::Kw),
            ("Power W", Unit::W),
            ("Erzeugung in MW", Unit::Mw),
            ("supplyKW", Unit::Kw),
            ("kWh", Unit::Kwh),
            ("Wind+PV kW", Unit::Kw),
            ("total_wh", Unit::Wh),
            ("power_w", Unit::W),
        ] {
            assert_eq!(unit_of(header), Stated::Power(unit), "{header}");
        }
        for header in ["price_eur_kwh", "Price [EUR/MWh]", "ct/kWh"] {
            assert!(matches!(unit_of(header), Stated::Other(_)), "{header}");
        }
        assert_eq!(unit_of("Voltage (V)"), Stated::Other("V".to_owned()));
        for header in ["wind", "load", "A", "show"] {
            assert_eq!(unit_of(header), Stated::Nothing, "{header}");
        }
    }
}
