//! Headers to units and roles: the words that people use for them in several languages.

use super::Role;

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

fn money(low: &str) -> bool {
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

/// What a header says of the role.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Guess {
    /// A role, by this word.
    Role(Role, &'static str),
    /// Net power of unknown sign, by this word.
    Net(&'static str),
    /// Nothing known.
    Unknown,
}

/// Words that stand anywhere in a header, then words that stand alone.
type Words = (&'static [&'static str], &'static [&'static str]);

const TIME: Words = (
    &[
        "timestamp",
        "zeitstempel",
        "datetime",
        "date_time",
        "zeitpunkt",
        "horodat",
        "fecha y hora",
        "tijdstip",
        "datum/uhrzeit",
        "date/time",
        "date time",
    ],
    &[
        "time", "zeit", "tijd", "stamp", "ts", "from", "von", "start", "begin", "beginn", "interval",
        "period", "mtu", "utc",
    ],
);
const DATE: Words = (&["datum", "fecha"], &["date", "tag", "day", "jour", "dag"]);
const CLOCK: Words = (
    &["uhrzeit", "time of day"],
    &["time", "zeit", "heure", "hora", "tijd", "hour", "stunde", "uur", "clock"],
);

/// Whether a header speaks of a stamp.
pub(super) fn says_time(header: &str) -> bool {
    matches(header, TIME).is_some() || says_date(header) || says_clock(header)
}

/// Whether a header speaks of a date.
pub(super) fn says_date(header: &str) -> bool {
    matches(header, DATE).is_some()
}

/// Whether a header speaks of a time of day.
pub(super) fn says_clock(header: &str) -> bool {
    matches(header, CLOCK).is_some()
}

fn matches(header: &str, (parts, alone): Words) -> Option<&'static str> {
    let low = header.to_lowercase();
    let words: Vec<&str> =
        low.split(|c: char| !c.is_alphanumeric()).filter(|word| !word.is_empty()).collect();
    parts
        .iter()
        .find(|part| low.contains(**part))
        .or_else(|| alone.iter().find(|word| words.contains(word)))
        .copied()
}

const QUALITY: Words = (
    &[
        "quality",
        "qualität",
        "qualitaet",
        "qualité",
        "calidad",
        "kwaliteit",
        "status",
        "validity",
        "estimated",
        "ersatzwert",
    ],
    &["flag", "flags", "güte", "valid", "état", "estado", "comment", "kommentar", "note"],
);
const REACTIVE: Words = (
    &["reactive", "blindleistung", "blindarbeit", "réactive", "reactiva", "blindvermogen", "kvar"],
    &["var", "blind"],
);
const PRICE: Words = (
    &["price", "preis", "precio", "prijs", "tariff", "tarif", "eur/", "€/", "ct/kwh"],
    &["prix", "spot", "eur"],
);
const FREQUENCY: Words = (&["frequen", "fréquence", "frecuencia"], &["freq", "hz"]);
const SCHEDULE: Words = (&["schedule", "fahrplan", "programme", "programa", "planned"], &["plan"]);
const CRITICAL: Words = (&["critical", "kritisch", "critique", "crítica"], &[]);
const ASKED: Words = (&["asked", "setpoint", "sollwert", "requested"], &[]);
const OF_STORE: Words = (
    &[
        "battery",
        "batterie",
        "speicher",
        "storage",
        "batería",
        "accu",
        "stockage",
        "almacenamiento",
        "opslag",
    ],
    &["store", "bess", "ess"],
);
const DISCHARGE: Words = (&["discharg", "entlad", "décharge", "descarga", "ontlad"], &[]);
const CHARGE: Words = (&["charg", "lade", "carga", "laad"], &[]);
const UNUSED: Words = (
    &[
        "temperat",
        "irradian",
        "einstrahlung",
        "windspeed",
        "wind speed",
        "wind_speed",
        "windgeschw",
        "voltage",
        "spannung",
        "cos phi",
        "cosphi",
        "power factor",
        "leistungsfaktor",
        "zählerstand",
        "zaehlerstand",
        "meter reading",
        "humidity",
        "ladezustand",
        "state of charge",
        "forecast",
        "prognose",
        "apparent",
        "scheinleistung",
    ],
    &[
        "soc",
        "current",
        "strom_a",
        "index",
        "id",
        "nr",
        "no",
        "row",
        "temp",
        "pf",
        "weekday",
        "wochentag",
        "month",
        "year",
        "end",
        "bis",
        "to",
        "until",
        "dst",
    ],
);
const NET: Words =
    (&["netto", "saldo", "solde", "balance", "bilanz", "residual", "residuel"], &["net", "neto", "nette"]);
const IMPORT: Words = (
    &[
        "import",
        "bezug",
        "from grid",
        "from_grid",
        "grid_in",
        "purchase",
        "soutirage",
        "soutirée",
        "afname",
        "entnahme",
        "withdraw",
    ],
    &["consumed_from", "bought"],
);
const EXPORT: Words = (
    &[
        "export",
        "einspeis",
        "rückspeis",
        "rueckspeis",
        "rücklieferung",
        "to grid",
        "to_grid",
        "feed-in",
        "feed in",
        "feedin",
        "feed_in",
        "injection",
        "injectée",
        "inyec",
        "teruglever",
        "surplus",
        "überschuss",
        "ueberschuss",
        "abgabe",
        "invoeding",
    ],
    &["sold", "excédent"],
);
const SUPPLY: Words = (
    &[
        "supply",
        "generat",
        "produc",
        "produk",
        "photovolt",
        "fotovolt",
        "turbine",
        "hydro",
        "wasserkraft",
        "erzeug",
        "génér",
        "gener",
        "opwek",
        "solar",
        "solaire",
        "éolien",
        "eolien",
        "eólic",
        "eolic",
        "bhkw",
        "genset",
        "available",
        "yield",
        "ertrag",
    ],
    &["pv", "wind", "chp", "inverter", "wr", "zon", "zonne", "feed", "output", "gen", "sun"],
);
const DEMAND: Words = (
    &[
        "demand",
        "consum",
        "consomm",
        "konsum",
        "verbrauch",
        "bedarf",
        "lastgang",
        "usage",
        "verbruik",
        "vraag",
        "belasting",
        "netzlast",
        "gesamtlast",
        "demande",
        "demanda",
        "soutir",
        "residuallast",
        "base load",
        "baseload",
    ],
    &[
        "load", "loads", "last", "use", "used", "carga", "charge", "conso", "appelée", "house", "building",
        "site",
    ],
);
const GRID: Words = (&[], &["grid", "netz", "red", "réseau", "reseau", "mains", "utility", "pcc"]);

/// What a header says of the role of a column of numbers.
pub(super) fn guess(header: &str) -> Guess {
    let has = |words: Words| matches(header, words);
    if let Some(word) = has(OF_STORE) {
        if has(DISCHARGE).is_some() {
            return Guess::Role(Role::StoreDischarge, word);
        }
        if has(CHARGE).is_some() && has(UNUSED).is_none() {
            return Guess::Role(Role::StoreCharge, word);
        }
        return Guess::Role(Role::Ignore, word);
    }
    for (words, role) in [
        (QUALITY, Role::Quality),
        (REACTIVE, Role::Reactive),
        (PRICE, Role::Price),
        (FREQUENCY, Role::Frequency),
        (UNUSED, Role::Ignore),
        (SCHEDULE, Role::Schedule),
        (CRITICAL, Role::Critical),
        (ASKED, Role::Asked),
    ] {
        if let Some(word) = has(words) {
            return Guess::Role(role, word);
        }
    }
    if let Some(word) = has(NET) {
        return if has(EXPORT).is_some() {
            Guess::Role(Role::NetExport, word)
        } else if has(IMPORT).is_some() || has(DEMAND).is_some() {
            Guess::Role(Role::NetImport, word)
        } else if has(SUPPLY).is_some() {
            // Net generation is generation after the plant's own use.
            Guess::Role(Role::Supply, word)
        } else {
            Guess::Net(word)
        };
    }
    for (words, role) in
        [(EXPORT, Role::Export), (IMPORT, Role::Import), (SUPPLY, Role::Supply), (DEMAND, Role::Demand)]
    {
        if let Some(word) = has(words) {
            return Guess::Role(role, word);
        }
    }
    has(GRID).map_or(Guess::Unknown, Guess::Net)
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

    #[test]
    fn roles_are_found_in_headers() {
        for (header, role) in [
            ("supply_kw", Role::Supply),
            ("PV [kW]", Role::Supply),
            ("Wind+PV kW", Role::Supply),
            ("Erzeugung (kWh)", Role::Supply),
            ("Production (kW)", Role::Supply),
            ("Turbine 2", Role::Supply),
            ("demand_kw", Role::Demand),
            ("Last [kW]", Role::Demand),
            ("Verbrauch kWh", Role::Demand),
            ("Consommation (kW)", Role::Demand),
            ("consumo", Role::Demand),
            ("verbruik", Role::Demand),
            ("Netzbezug kWh", Role::Import),
            ("Grid import", Role::Import),
            ("Einspeisung", Role::Export),
            ("Teruglevering", Role::Export),
            ("net load kW", Role::NetImport),
            ("Residuallast", Role::NetImport),
            ("net export", Role::NetExport),
            ("price_eur_kwh", Role::Price),
            ("Status", Role::Quality),
            ("battery discharge", Role::StoreDischarge),
            ("Temperatur", Role::Ignore),
        ] {
            assert!(
                matches!(guess(header), Guess::Role(found, _) if found == role),
                "{header}: {:?}",
                guess(header)
            );
        }
        assert_eq!(guess("net_kw"), Guess::Net("net"));
        assert_eq!(guess("kW"), Guess::Unknown);
        assert_eq!(guess("column 2"), Guess::Unknown);
    }
}
