//! The colour schemes by name, and the palette as custom properties for the page.

use std::fmt::Write as _;

use super::palette::{DARK, HIGH, HIGH_DARK, LIGHT, PRINT, Palette, Pens, Rgb};

/// A colour scheme.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Scheme {
    /// Light.
    #[default]
    Light,
    /// Dark.
    Dark,
    /// On paper.
    Print,
    /// More contrast, light.
    High,
    /// More contrast, dark.
    HighDark,
}

impl Scheme {
    /// All schemes.
    pub const ALL: [Self; 5] = [Self::Light, Self::Dark, Self::Print, Self::High, Self::HighDark];

    /// Its palette.
    pub const fn palette(self) -> &'static Palette {
        match self {
            Self::Light => &LIGHT,
            Self::Dark => &DARK,
            Self::Print => &PRINT,
            Self::High => &HIGH,
            Self::HighDark => &HIGH_DARK,
        }
    }
}

impl Palette {
    /// Line colour of a candidate (0 = A); kinds past the fourth take the colour of those not picked.
    pub const fn candidate(&self, index: u8) -> Rgb {
        match index {
            0 => self.candidate_a,
            1 => self.candidate_b,
            2 => self.candidate_c,
            3 => self.candidate_d,
            _ => self.strand,
        }
    }

    /// Text colour of a candidate (0 = A).
    pub const fn candidate_text(&self, index: u8) -> Rgb {
        match index {
            0 => self.candidate_a_text,
            1 => self.candidate_b_text,
            2 => self.candidate_c_text,
            3 => self.candidate_d_text,
            _ => self.ink,
        }
    }

    /// Custom properties of this scheme, a declaration a line.
    pub fn declarations(&self, indent: &str) -> String {
        let mut css = String::new();
        for (name, colour) in self.roles() {
            let _ = writeln!(css, "{indent}--{name}: {colour};");
        }
        let Pens { hair, thin, line, requirement } = self.pens;
        let _ = writeln!(
            css,
            "{indent}--pen-hair: {hair}; --pen-thin: {thin}; --pen-line: {line}; --pen-requirement: {requirement};"
        );
        css
    }
}

/// The colour part of the page's style tokens: every scheme under the conditions that choose it.
pub fn tokens() -> String {
    let block = |media: &str, selector: &str, scheme: &str, palette: &Palette| {
        let (indent, open, close) = if media.is_empty() {
            ("  ", String::new(), "")
        } else {
            ("    ", format!("@media {media} {{\n  "), "}\n")
        };
        let end = if media.is_empty() { "}\n" } else { "  }\n" };
        format!(
            "{open}{selector} {{\n{indent}color-scheme: {scheme};\n{}{end}{close}\n",
            palette.declarations(indent)
        )
    };
    let dark = "screen and (prefers-color-scheme: dark)";
    let more = "screen and (prefers-contrast: more)";
    [
        block("", ":root", "light", &LIGHT),
        block(dark, ":root:not([data-scheme=\"light\"])", "dark", &DARK),
        block("screen", ":root[data-scheme=\"dark\"]", "dark", &DARK),
        block(more, ":root:not([data-contrast=\"usual\"])", "light", &HIGH),
        block("screen", ":root[data-contrast=\"more\"]", "light", &HIGH),
        block(
            "screen and (prefers-contrast: more) and (prefers-color-scheme: dark)",
            ":root:not([data-contrast=\"usual\"]):not([data-scheme=\"light\"])",
            "dark",
            &HIGH_DARK,
        ),
        block("screen", ":root[data-contrast=\"more\"][data-scheme=\"dark\"]", "dark", &HIGH_DARK),
        block(
            "print",
            ":root, :root[data-scheme], :root[data-contrast], :root[data-scheme][data-contrast]",
            "light",
            &PRINT,
        ),
    ]
    .concat()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Relative luminance, WCAG 2.2.
    fn luminance(Rgb(r, g, b): Rgb) -> f64 {
        let linear = |c: u8| {
            let c = f64::from(c) / 255.0;
            if c <= 0.040_45 { c / 12.92 } else { libm::pow((c + 0.055) / 1.055, 2.4) }
        };
        0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b)
    }

    /// Contrast ratio, WCAG 2.2.
    fn contrast(a: Rgb, b: Rgb) -> f64 {
        let (a, b) = (luminance(a), luminance(b));
        (a.max(b) + 0.05) / (a.min(b) + 0.05)
    }

    /// Lightness, CIE 1976 L*.
    fn lightness(colour: Rgb) -> f64 {
        let y = luminance(colour);
        if y > 216.0 / 24389.0 { 116.0 * libm::cbrt(y) - 16.0 } else { y * 24389.0 / 27.0 }
    }

    fn role(palette: &Palette, name: &str) -> Rgb {
        palette.roles().iter().find(|(n, _)| *n == name).unwrap_or_else(|| panic!("no role {name}")).1
    }

    #[test]
    fn contrast_of_black_on_white_is_21() {
        assert!((contrast(Rgb(0, 0, 0), Rgb(255, 255, 255)) - 21.0).abs() < 1e-9);
    }

    #[test]
    fn text_and_lines_hold_their_contrast_in_every_scheme() {
        let text = [
            "ink",
            "muted",
            "link",
            "error",
            "surplus-text",
            "deficit-text",
            "level-text",
            "candidate-a-text",
            "candidate-b-text",
            "candidate-c-text",
            "candidate-d-text",
        ];
        let lines = [
            "rule-strong",
            "surplus",
            "deficit",
            "level",
            "strand",
            "focus",
            "requirement",
            "selection-edge",
            "candidate-a",
            "candidate-b",
            "candidate-c",
            "candidate-d",
        ];
        for scheme in Scheme::ALL {
            let palette = scheme.palette();
            let least = if matches!(scheme, Scheme::High | Scheme::HighDark) { 7.0 } else { 4.5 };
            for (names, least) in [(&text[..], least), (&lines[..], 3.0)] {
                for name in names {
                    for ground in [palette.paper, palette.wash] {
                        let found = contrast(role(palette, name), ground);
                        assert!(found >= least, "{scheme:?} {name} on {ground}: {found:.2}");
                    }
                }
            }
        }
    }

    #[test]
    fn ink_can_be_read_on_every_fill() {
        for scheme in Scheme::ALL {
            let p = scheme.palette();
            for fill in [p.surplus_fill, p.deficit_fill, p.level_fill, p.selection] {
                assert!(contrast(p.ink, fill) >= 4.5, "{scheme:?} {fill}");
            }
        }
    }

    #[test]
    fn signs_and_candidates_differ_in_grey() {
        for palette in [&LIGHT, &DARK] {
            for group in [
                [palette.surplus, palette.deficit, palette.level, palette.requirement],
                [palette.candidate_a, palette.candidate_b, palette.candidate_c, palette.candidate_d],
            ] {
                for (i, &a) in group.iter().enumerate() {
                    for &b in &group[i + 1..] {
                        assert!((lightness(a) - lightness(b)).abs() > 7.0, "{a} {b}");
                    }
                }
            }
        }
    }

    #[test]
    fn tokens_hold_every_role_of_every_scheme() {
        let css = tokens();
        assert_eq!(css.matches("--paper: ").count(), 8);
        assert_eq!(css.matches('{').count(), css.matches('}').count());
        assert!(css.contains("--candidate-b-text: #776200;"), "{css}");
    }
}
