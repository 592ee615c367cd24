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
