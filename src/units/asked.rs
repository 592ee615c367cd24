//! Quantities as people type them: "12 kW", "1,5 MWh", "80 t", "94 %".
//!
//! A bare number takes the quantity's own unit. A unit of another quantity is refused with the remedy in words, because
//! power and energy are the two things most easily mistaken for one another here.

use super::people::{self, NARROW};

/// What is asked for. The value travels in the unit named with each.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Asked {
    /// A power, kW.
    Power,
    /// An energy, kWh.
    Energy,
    /// A mass, kg.
    Mass,
    /// A volume, l.
    Volume,
    /// A share, 0 to 1, typed and shown as per cent.
    Share,
    /// A duration, s.
    Seconds,
    /// A long duration, years.
    Years,
    /// A temperature, degrees Celsius.
    Temperature,
}

/// Units as people write them: spelling (lower case unless case tells them apart), what they measure, size in its own unit.
const UNITS: [(&str, Asked, f64); 34] = [
    ("W", Asked::Power, 1e-3),
    ("kW", Asked::Power, 1.0),
    ("MW", Asked::Power, 1e3),
    ("GW", Asked::Power, 1e6),
    ("Wh", Asked::Energy, 1e-3),
    ("kWh", Asked::Energy, 1.0),
    ("MWh", Asked::Energy, 1e3),
    ("GWh", Asked::Energy, 1e6),
    ("MJ", Asked::Energy, 1.0 / 3.6),
    ("GJ", Asked::Energy, 1e3 / 3.6),
    ("g", Asked::Mass, 1e-3),
    ("kg", Asked::Mass, 1.0),
    ("t", Asked::Mass, 1e3),
    ("kt", Asked::Mass, 1e6),
    ("l", Asked::Volume, 1.0),
    ("L", Asked::Volume, 1.0),
    ("m3", Asked::Volume, 1e3),
    ("m\u{b3}", Asked::Volume, 1e3),
    ("%", Asked::Share, 1e-2),
    ("per cent", Asked::Share, 1e-2),
    ("percent", Asked::Share, 1e-2),
    ("ms", Asked::Seconds, 1e-3),
    ("s", Asked::Seconds, 1.0),
    ("min", Asked::Seconds, 60.0),
    ("h", Asked::Seconds, 3600.0),
    ("d", Asked::Seconds, 86_400.0),
    ("a", Asked::Years, 1.0),
    ("year", Asked::Years, 1.0),
    ("years", Asked::Years, 1.0),
    ("months", Asked::Years, 1.0 / 12.0),
    ("\u{b0}C", Asked::Temperature, 1.0),
    ("C", Asked::Temperature, 1.0),
    ("deg C", Asked::Temperature, 1.0),
    ("\u{2103}", Asked::Temperature, 1.0),
];

impl Asked {
    /// The unit of a bare number.
    pub const fn unit(self) -> &'static str {
        match self {
            Self::Power => "kW",
            Self::Energy => "kWh",
            Self::Mass => "kg",
            Self::Volume => "l",
            Self::Share => "%",
            Self::Seconds => "s",
            Self::Years => "years",
            Self::Temperature => "\u{b0}C",
        }
    }

    /// What it is, with its article.
    const fn words(self) -> &'static str {
        match self {
            Self::Power => "a power",
            Self::Energy => "an energy",
            Self::Mass => "a mass",
            Self::Volume => "a volume",
            Self::Share => "a share",
            Self::Seconds => "a time",
            Self::Years => "a number of years",
            Self::Temperature => "a temperature",
        }
    }

    /// Reads what was typed: the value in the quantity's own unit, or none for an empty text.
    ///
    /// # Errors
    /// The remedy as a sentence, if there is no number in it or the unit is of something else.
    ///
    /// ```
    /// use millpond::units::asked::Asked;
    /// assert_eq!(Asked::Power.read("1,5 MW"), Ok(Some(1500.0)));
    /// assert_eq!(
    ///     Asked::Power.read("12 kWh").unwrap_err(),
    ///     "12\u{202f}kWh is an energy; a power is asked, e.g. 12\u{202f}kW"
    /// );
    /// ```
    pub fn read(self, text: &str) -> Result<Option<f64>, String> {
        let text = text.trim();
        if text.is_empty() {
            return Ok(None);
        }
        let is_number =
            |c: char| c.is_ascii_digit() || ".,'+-\u{2212}\u{2019}".contains(c) || c.is_whitespace();
        let cut = text.find(|c| !is_number(c)).unwrap_or(text.len());
        let (digits, unit) = (text[..cut].trim(), text[cut..].trim());
        let example = if self == Self::Share { "90" } else { "12" };
        let Some(value) = number(digits) else {
            return Err(format!("Give {}, e.g. {example}{NARROW}{}", self.words(), self.unit()));
        };
        if unit.is_empty() {
            return Ok(Some(scaled(value, self.bare())));
        }
        let exact = UNITS.iter().find(|(name, ..)| *name == unit);
        let loose = || {
            let mut same = UNITS.iter().filter(|(name, ..)| name.eq_ignore_ascii_case(unit));
            // "mw" may be milliwatts or megawatts, but nobody asks milliwatts of a site's store.
            same.find(|(_, kind, _)| *kind == self).or_else(|| same.next())
        };
        match exact.or_else(loose) {
            Some((_, kind, size)) if *kind == self => Ok(Some(scaled(value, *size))),
            // Years and seconds measure the same thing at two scales.
            Some((_, Self::Years, size)) if self == Self::Seconds => Ok(Some(value * size * 31_557_600.0)),
            Some((_, Self::Seconds, size)) if self == Self::Years => Ok(Some(value * size / 31_557_600.0)),
            Some((name, kind, _)) => Err(format!(
                "{digits}{NARROW}{name} is {}; {} is asked, e.g. {digits}{NARROW}{}",
                kind.words(),
                self.words(),
                self.unit(),
            )),
            None => Err(format!(
                "The unit {} is not known; {} is asked, e.g. {digits}{NARROW}{}",
                crate::fault::quote(unit),
                self.words(),
                self.unit(),
            )),
        }
    }

    /// A value as the text of its field, with its unit; empty for none.
    pub fn show(self, value: Option<f64>) -> String {
        value.map_or_else(String::new, |value| {
            let (value, unit) = match self {
                Self::Mass if value.abs() >= 1e3 => (value / 1e3, "t"),
                Self::Volume if value.abs() >= 1e3 => (value / 1e3, "m\u{b3}"),
                _ => (value / self.bare(), self.unit()),
            };
            format!("{}{NARROW}{unit}", people::significant(value, 6))
        })
    }

    const fn bare(self) -> f64 {
        if matches!(self, Self::Share) { 1e-2 } else { 1.0 }
    }
}

/// A value in units of a size. A unit that is a whole part of one divides, so that 94 % is 0.94 to the last bit.
fn scaled(value: f64, size: f64) -> f64 {
    let parts = 1.0 / size;
    if parts > 1.0 && parts == libm::trunc(parts) { value / parts } else { value * size }
}

/// A number with a decimal point or comma and grouped digits; of two marks the last is the decimal one.
fn number(text: &str) -> Option<f64> {
    let plain: String = text
        .chars()
        .filter(|c| !c.is_whitespace() && !"'\u{2019}".contains(*c))
        .map(|c| if c == '\u{2212}' { '-' } else { c })
        .collect();
    let marks = |mark: char| plain.matches(mark).count();
    let decimal = match (marks('.'), marks(',')) {
        (0, 0) => None,
        (_, 0) => (marks('.') == 1).then_some('.'),
        (0, _) => (marks(',') == 1).then_some(','),
        _ if plain.rfind('.') > plain.rfind(',') => Some('.'),
        _ => Some(','),
    };
    let digits: String = plain
        .chars()
        .filter_map(|c| match c {
            '.' | ',' if Some(c) == decimal => Some('.'),
            '.' | ',' => None,
            other => Some(other),
        })
        .collect();
    digits.parse().ok().filter(|value: &f64| value.is_finite())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_read_with_either_decimal_mark() {
        for (text, value) in [
            ("12", 12.0),
            ("1,5", 1.5),
            ("1.5", 1.5),
            ("1.234,5", 1234.5),
            ("1,234.5", 1234.5),
            ("1\u{202f}234", 1234.0),
            ("1'234.5", 1234.5),
            ("1.234.567", 1_234_567.0),
            ("\u{2212}12", -12.0),
        ] {
            assert_eq!(number(text), Some(value), "{text}");
        }
        for text in ["", "-", "1-2", "--", "."] {
            assert_eq!(number(text), None, "{text}");
        }
    }

    #[test]
    fn units_scale_to_the_own_unit() {
        for (asked, text, value) in [
            (Asked::Power, "250 W", 0.25),
            (Asked::Power, "2mw", 2000.0),
            (Asked::Mass, "80 t", 80_000.0),
            (Asked::Volume, "3 m\u{b3}", 3000.0),
            (Asked::Share, "94 %", 0.94),
            (Asked::Share, "94", 0.94),
            (Asked::Seconds, "20 ms", 0.02),
            (Asked::Years, "15", 15.0),
            (Asked::Temperature, "-12 \u{b0}C", -12.0),
        ] {
            assert_eq!(asked.read(text), Ok(Some(value)), "{text}");
        }
        assert_eq!(Asked::Power.read("  "), Ok(None));
    }

    #[test]
    fn a_wrong_unit_says_what_it_is_and_what_is_asked() {
        let fault = Asked::Power.read("12 kWh").unwrap_err();
        assert_eq!(fault.replace(NARROW, " "), "12 kWh is an energy; a power is asked, e.g. 12 kW");
        let fault = Asked::Mass.read("3 stone").unwrap_err();
        assert_eq!(
            fault.replace(NARROW, " "),
            "The unit \u{201c}stone\u{201d} is not known; a mass is asked, e.g. 3 kg"
        );
        let fault = Asked::Share.read("most").unwrap_err();
        assert_eq!(fault.replace(NARROW, " "), "Give a share, e.g. 90 %");
    }

    #[test]
    fn what_is_shown_reads_back() {
        for (asked, value) in [
            (Asked::Power, 87.35),
            (Asked::Power, 12_345.0),
            (Asked::Mass, 80_000.0),
            (Asked::Share, 0.9),
            (Asked::Years, 15.0),
            (Asked::Temperature, -12.0),
        ] {
            let text = asked.show(Some(value));
            let read = asked.read(&text).unwrap().unwrap();
            assert!((read - value).abs() <= 1e-12 * value.abs(), "{text}");
        }
        assert_eq!(Asked::Power.show(None), "");
    }
}
