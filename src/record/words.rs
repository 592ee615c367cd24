//! Headers to roles: the words that people use for them in several languages.

use super::Role;

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
        "period", "mtu", "utc", "unix", "epoch",
    ],
);
const DATE: Words = (&["datum", "fecha"], &["date", "tag", "day", "jour", "dag"]);
const CLOCK: Words = (
    &["uhrzeit", "time of day"],
    &["time", "zeit", "heure", "hora", "tijd", "hour", "stunde", "uur", "clock"],
);

const END: Words = (
    &[
        "period end",
        "interval end",
        "hour ending",
        "time ending",
        "end time",
        "endzeit",
        "zeit bis",
        "hourending",
    ],
    &["end", "ende", "ending", "endet", "bis", "to", "until", "hasta", "fin", "einde", "tot", "he", "stop"],
);

/// Whether the header of a stamp says that it marks the end of an interval.
pub(super) fn says_end(header: &str) -> bool {
    matches(header, END).is_some()
}

const CHANNEL: Words = (
    &[
        "channel",
        "kanal",
        "register",
        "meter",
        "obis",
        "zähler",
        "zaehler",
        "messstelle",
        "zählpunkt",
        "zaehlpunkt",
        "lokation",
        "variable",
        "direction",
        "richtung",
        "parameter",
        "device",
        "compteur",
        "contador",
        "medidor",
        "sensor",
        "circuit",
        "measurement",
    ],
    &[
        "type", "typ", "name", "code", "point", "tag", "signal", "kennzahl", "quantity", "stream", "suffix",
        "series", "reihe", "ean", "site", "id", "flow", "sens",
    ],
);

/// Whether a header names the channel, register or meter of a row.
pub(super) fn says_channel(header: &str) -> bool {
    matches(header, CHANNEL).is_some()
}

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
const REGISTER: Words = (
    &[
        "zählerstand",
        "zaehlerstand",
        "meter reading",
        "meterreading",
        "meterstand",
        "cumulative",
        "kumul",
        "cumul",
        "lifetime",
        "acumul",
        "counter",
        "register",
        "totali",
    ],
    &["reading", "index", "total", "stand", "relevé", "lectura", "odometer"],
);

/// Whether a header speaks of a running meter reading.
pub(super) fn says_register(header: &str) -> bool {
    matches(header, REGISTER).is_some() || obis(header).is_some_and(|code| code.1 == 8)
}

/// The quantity and the kind of value of a code of the OBIS scheme (IEC 62056-61), "1-1:1.29.0": C and D of A-B:C.D.E.
fn obis(header: &str) -> Option<(u32, u32)> {
    let code = header
        .split(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | ':' | '-' | '*')))
        .find(|word| word.matches('.').count() == 2)?;
    let code = code.rsplit(':').next()?;
    let code = code.split('*').next()?;
    let mut parts = code.split('.').map(|part| part.parse::<u32>().ok().filter(|part| *part < 256));
    let (c, d, _) = (parts.next()??, parts.next()??, parts.next()??);
    Some((c, d))
}

/// What a code of the OBIS scheme, or the sign that meters print in its place, says of the role.
fn coded(header: &str) -> Option<Guess> {
    if let Some((quantity, _)) = obis(header) {
        return Some(match quantity {
            1 | 21 | 41 | 61 => Guess::Role(Role::Import, "a code for active energy drawn"),
            2 | 22 | 42 | 62 => Guess::Role(Role::Export, "a code for active energy fed"),
            16 => Guess::Role(Role::NetImport, "a code for active energy, net"),
            3..=8 => Guess::Role(Role::Reactive, "a code for reactive energy"),
            14 => Guess::Role(Role::Frequency, "a code for frequency"),
            _ => Guess::Role(Role::Ignore, "a code for another quantity"),
        });
    }
    let words =
        || header.split(|c: char| c.is_whitespace() || matches!(c, '[' | ']' | '(' | ')' | ',' | '/' | '_'));
    let says = |signs: &[&str]| words().any(|word| signs.contains(&word));
    if says(&["A+", "+A", "P+", "+P"]) {
        Some(Guess::Role(Role::Import, "the sign for active energy drawn"))
    } else if says(&["A-", "-A", "P-", "-P"]) {
        Some(Guess::Role(Role::Export, "the sign for active energy fed"))
    } else if says(&["R+", "R-", "+R", "-R", "Q+", "Q-", "+Q", "-Q", "Ri+", "Ri-", "Rc+", "Rc-"]) {
        Some(Guess::Role(Role::Reactive, "the sign for reactive energy"))
    } else {
        None
    }
}

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
    if let Some(guess) = coded(header) {
        return guess;
    }
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
            ("DE000123 / 1-1:1.29.0", Role::Import),
            ("1-0:2.8.0*255 (kWh)", Role::Export),
            ("A- [kWh]", Role::Export),
            ("1-1:3.29.0", Role::Reactive),
            ("Zählerstand Bezug", Role::Import),
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
