//! Numbers as people read them: two to three significant places, grouped by a narrow no-break space that also joins
//! number and unit, with a true minus.

/// Joins number and unit, and groups digits.
pub const NARROW: char = '\u{202f}';

/// A true minus.
const MINUS: char = '\u{2212}';

/// A number with its unit, scaled so that it reads well.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Scaled {
    /// The number.
    pub number: String,
    /// Its unit.
    pub unit: &'static str,
}

impl std::fmt::Display for Scaled {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.unit.is_empty() {
            write!(f, "{}", self.number)
        } else {
            write!(f, "{}{NARROW}{}", self.number, self.unit)
        }
    }
}

/// An energy given in kWh: Wh, kWh, MWh, GWh.
///
/// ```
/// use millpond::units::people::energy;
/// assert_eq!(energy(4740.0).to_string(), "4.74\u{202f}MWh");
/// assert_eq!(energy(-0.25).to_string(), "\u{2212}250\u{202f}Wh");
/// ```
pub fn energy(kwh: f64) -> Scaled {
    scaled(kwh, &[(1e-3, "Wh"), (1.0, "kWh"), (1e3, "MWh"), (1e6, "GWh"), (1e9, "TWh")])
}

/// A power given in kW: W, kW, MW, GW.
pub fn power(kw: f64) -> Scaled {
    scaled(kw, &[(1e-3, "W"), (1.0, "kW"), (1e3, "MW"), (1e6, "GW")])
}

/// A mass given in kg: g, kg, t.
pub fn mass(kg: f64) -> Scaled {
    scaled(kg, &[(1e-3, "g"), (1.0, "kg"), (1e3, "t"), (1e6, "kt"), (1e9, "Mt")])
}

/// A volume given in litres: l, m³.
pub fn volume(l: f64) -> Scaled {
    scaled(l, &[(1.0, "l"), (1e3, "m\u{b3}")])
}

/// A duration given in seconds: ms, s, min, h, d, and years beyond 800 days.
pub fn duration(s: f64) -> Scaled {
    let steps: &[(f64, f64, &'static str)] = &[
        (1.0, 1e-3, "ms"),
        (120.0, 1.0, "s"),
        (7200.0, 60.0, "min"),
        (96.0 * 3600.0, 3600.0, "h"),
        (800.0 * 86_400.0, 86_400.0, "d"),
        (f64::INFINITY, 31_557_600.0, "years"),
    ];
    if s == 0.0 {
        return Scaled { number: "0".to_owned(), unit: "s" };
    }
    let (_, size, unit) =
        steps.iter().find(|(below, _, _)| s.abs() < *below).copied().unwrap_or((0.0, 1.0, "s"));
    Scaled { number: significant(s / size, 3), unit }
}

/// A share as per cent.
pub fn percent(share: f64) -> Scaled {
    let percent = share * 100.0;
    let number = if percent.abs() >= 99.95 && percent.abs() < 100.0 {
        // Rounding must not claim the whole.
        let cut = libm::trunc(percent * 1000.0) / 1000.0;
        plain(cut, 3)
    } else {
        significant(percent, 3)
    };
    Scaled { number, unit: "%" }
}

/// A text with a capital first letter, if that is a plain one: these texts are our own, and a table of all letters is heavy.
pub fn capital(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| {
        std::iter::once(first.to_ascii_uppercase()).chain(letters).collect()
    })
}

/// A number with `places` significant places, grouped.
pub fn significant(value: f64, places: i32) -> String {
    if value == 0.0 || !value.is_finite() {
        return if value.is_finite() { "0".to_owned() } else { "none".to_owned() };
    }
    // Rounded first, so that 999.6 counts as 1000.
    let magnitude = magnitude(value);
    let decimals = (places - 1 - magnitude).max(0);
    let rounded = round_to(value, decimals);
    let decimals = (places - 1 - self::magnitude(rounded)).clamp(0, 12);
    trimmed(&plain(rounded, decimals))
}

/// A whole number, grouped.
pub fn whole(value: f64) -> String {
    plain(value, 0)
}

/// A number with a fixed count of decimals, grouped.
pub fn plain(value: f64, decimals: i32) -> String {
    let decimals = usize::try_from(decimals).unwrap_or(0);
    let text = format!("{:.decimals$}", value.abs());
    let (integer, fraction) = text.split_once('.').unwrap_or((&text, ""));
    let mut grouped = String::new();
    if value < 0.0 && text.bytes().any(|byte| (b'1'..=b'9').contains(&byte)) {
        grouped.push(MINUS);
    }
    let digits = integer.len();
    for (i, digit) in integer.chars().enumerate() {
        if i > 0 && (digits - i) % 3 == 0 && digits > 3 {
            grouped.push(NARROW);
        }
        grouped.push(digit);
    }
    if !fraction.is_empty() {
        grouped.push('.');
        grouped.push_str(fraction);
    }
    grouped
}

fn scaled(value: f64, steps: &[(f64, &'static str)]) -> Scaled {
    let base = steps.iter().find(|(size, _)| *size == 1.0).or(steps.first()).copied().unwrap_or((1.0, ""));
    let (size, unit) = if value == 0.0 {
        base
    } else {
        // The largest unit in which the number, rounded to three places, is at least 1.
        steps
            .iter()
            .rev()
            .find(|(size, _)| value.abs() / size >= 0.9995)
            .or(steps.first())
            .copied()
            .unwrap_or(base)
    };
    Scaled { number: significant(value / size, 3), unit }
}

fn magnitude(value: f64) -> i32 {
    libm::floor(libm::log10(value.abs())) as i32
}

fn round_to(value: f64, decimals: i32) -> f64 {
    let scale = libm::pow(10.0, f64::from(decimals));
    let rounded = libm::round(value * scale) / scale;
    if rounded.is_finite() { rounded } else { value }
}

/// Drops trailing zeros after the point, so that a measured 4.70 is not mistaken for more than it is.
fn trimmed(text: &str) -> String {
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text.to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_well_at_every_size() {
        let n = NARROW;
        for (value, text) in [
            (0.0, format!("0{n}kWh")),
            (0.000_4, format!("0.4{n}Wh")),
            (0.9999, format!("1{n}kWh")),
            (999.6, format!("1{n}MWh")),
            (5193.0, format!("5.19{n}MWh")),
            (-7497.0, format!("\u{2212}7.5{n}MWh")),
        ] {
            assert_eq!(energy(value).to_string(), text);
        }
        assert_eq!(whole(35_124.0), format!("35{n}124"));
        assert_eq!(whole(-0.2), "0");
        assert_eq!(duration(577_800.0).to_string(), format!("6.69{n}d"));
        assert_eq!(percent(0.999_999).to_string(), format!("99.999{n}%"));
        assert_eq!(percent(0.5).to_string(), format!("50{n}%"));
    }
}
