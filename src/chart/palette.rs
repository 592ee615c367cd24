//! The colour roles, in one place: they feed the pictures and, as custom properties, the page.
//!
//! Roles, not colours, are named in code. Values were chosen so that text holds a WCAG 2 contrast of 4.5 and lines 3.0 on
//! paper and wash in every scheme (7.0 for text in the two of more contrast), and so that the signs, and the candidates,
//! stay apart without colour vision; the tests keep the first and the distances in lightness.

#![allow(clippy::unreadable_literal, reason = "six hexadecimal digits are how a colour is read")]

/// A colour, 8 bits a channel, sRGB.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Rgb(pub u8, pub u8, pub u8);

const fn rgb(hex: u32) -> Rgb {
    let [_, r, g, b] = hex.to_be_bytes();
    Rgb(r, g, b)
}

impl std::fmt::Display for Rgb {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "#{:02x}{:02x}{:02x}", self.0, self.1, self.2)
    }
}

/// Pen widths, px.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Pens {
    /// Hairlines: leaders, small ticks.
    pub hair: f64,
    /// Axes and dimensions.
    pub thin: f64,
    /// Curves.
    pub line: f64,
    /// The requirement and the chosen curve.
    pub requirement: f64,
}

macro_rules! roles {
    ($($field:ident, $name:literal, $doc:literal;)+) => {
        /// The colours of a scheme by role, and its pen widths.
        #[derive(Debug, Clone, Copy, PartialEq)]
        pub struct Palette {
            $(#[doc = $doc] pub $field: Rgb,)+
            /// Pen widths, px.
            pub pens: Pens,
        }

        impl Palette {
            /// Every role by the name of its custom property (without the leading dashes).
            pub fn roles(&self) -> Vec<(&'static str, Rgb)> {
                vec![$(($name, self.$field)),+]
            }
        }
    };
}

roles! {
    desk, "desk", "Ground around the sheet.";
    paper, "paper", "The sheet.";
    wash, "wash", "Ground of fields.";
    rule, "rule", "Hairlines between rows.";
    rule_strong, "rule-strong", "Rules that carry structure; leaders; equal times.";
    ink, "ink", "Text and axes.";
    muted, "muted", "Secondary text and tick labels.";
    requirement, "requirement", "The requirement as a line.";
    surplus, "surplus", "Surplus, as a line.";
    surplus_text, "surplus-text", "Surplus, as text.";
    surplus_fill, "surplus-fill", "Surplus, as an area.";
    deficit, "deficit", "Deficit, as a line.";
    deficit_text, "deficit-text", "Deficit, as text.";
    deficit_fill, "deficit-fill", "Deficit, as an area.";
    level, "level", "Level, as a line.";
    level_text, "level-text", "Level, as text.";
    level_fill, "level-fill", "Level, as an area.";
    strand, "strand", "Kinds that are not picked.";
    grid, "grid", "Grid lines.";
    candidate_a, "candidate-a", "Candidate A, as a line.";
    candidate_b, "candidate-b", "Candidate B, as a line.";
    candidate_c, "candidate-c", "Candidate C, as a line.";
    candidate_d, "candidate-d", "Candidate D, as a line.";
    candidate_a_text, "candidate-a-text", "Candidate A, as text.";
    candidate_b_text, "candidate-b-text", "Candidate B, as text.";
    candidate_c_text, "candidate-c-text", "Candidate C, as text.";
    candidate_d_text, "candidate-d-text", "Candidate D, as text.";
    link, "link", "Links.";
    focus, "focus", "Focus outline.";
    error, "error", "Errors.";
    error_wash, "error-wash", "Ground of an error.";
    selection, "selection", "Ground of a selection.";
    selection_edge, "selection-edge", "Edge of a selection.";
    scale_d5, "scale-d5", "Year scale: deficit, step 5.";
    scale_d4, "scale-d4", "Year scale: deficit, step 4.";
    scale_d3, "scale-d3", "Year scale: deficit, step 3.";
    scale_d2, "scale-d2", "Year scale: deficit, step 2.";
    scale_d1, "scale-d1", "Year scale: deficit, step 1.";
    scale_0, "scale-0", "Year scale: about zero.";
    scale_s1, "scale-s1", "Year scale: surplus, step 1.";
    scale_s2, "scale-s2", "Year scale: surplus, step 2.";
    scale_s3, "scale-s3", "Year scale: surplus, step 3.";
    scale_s4, "scale-s4", "Year scale: surplus, step 4.";
    scale_s5, "scale-s5", "Year scale: surplus, step 5.";
}

/// Light scheme.
pub const LIGHT: Palette = Palette {
    desk: rgb(0xe9edeb),
    paper: rgb(0xfbfcfb),
    wash: rgb(0xf1f4f2),
    rule: rgb(0xd5dcd9),
    rule_strong: rgb(0x7f8c89),
    ink: rgb(0x14201f),
    muted: rgb(0x566361),
    requirement: rgb(0x14201f),
    surplus: rgb(0x05596d),
    surplus_text: rgb(0x05596d),
    surplus_fill: rgb(0xc3dbde),
    deficit: rgb(0xb0522f),
    deficit_text: rgb(0xa0451f),
    deficit_fill: rgb(0xf1d3c3),
    level: rgb(0x7e8aab),
    level_text: rgb(0x555f80),
    level_fill: rgb(0xdfe5ed),
    strand: rgb(0x7c8986),
    grid: rgb(0xe3e8e6),
    candidate_a: rgb(0x5458d6),
    candidate_b: rgb(0xa08500),
    candidate_c: rgb(0x6b0f49),
    candidate_d: rgb(0x455010),
    candidate_a_text: rgb(0x4e52cc),
    candidate_b_text: rgb(0x776200),
    candidate_c_text: rgb(0x6b0f49),
    candidate_d_text: rgb(0x455010),
    link: rgb(0x05596d),
    focus: rgb(0x1d4ed8),
    error: rgb(0xa3083f),
    error_wash: rgb(0xfbe9ee),
    selection: rgb(0xf6e7a6),
    selection_edge: rgb(0x8a6d00),
    scale_d5: rgb(0xa5481f),
    scale_d4: rgb(0xc0703f),
    scale_d3: rgb(0xd79a72),
    scale_d2: rgb(0xe9c3a8),
    scale_d1: rgb(0xf5e3d7),
    scale_0: rgb(0xf4f6f4),
    scale_s1: rgb(0xdbe9ea),
    scale_s2: rgb(0xb0cfd3),
    scale_s3: rgb(0x74a8b1),
    scale_s4: rgb(0x377c8a),
    scale_s5: rgb(0x0a4a59),
    pens: Pens { hair: 0.75, thin: 1.0, line: 1.75, requirement: 2.25 },
};

/// Dark scheme.
pub const DARK: Palette = Palette {
    desk: rgb(0x0c1213),
    paper: rgb(0x141c1d),
    wash: rgb(0x1c2627),
    rule: rgb(0x2f3b3b),
    rule_strong: rgb(0x74837f),
    ink: rgb(0xe8eeec),
    muted: rgb(0xa3b1ae),
    requirement: rgb(0xf4f8f6),
    surplus: rgb(0x60bdd6),
    surplus_text: rgb(0x78c9de),
    surplus_fill: rgb(0x1b434c),
    deficit: rgb(0xe87b55),
    deficit_text: rgb(0xee9574),
    deficit_fill: rgb(0x4b2d20),
    level: rgb(0x768093),
    level_text: rgb(0xa4aec2),
    level_fill: rgb(0x2a3442),
    strand: rgb(0x6f7f7c),
    grid: rgb(0x232e2e),
    candidate_a: rgb(0x8190dd),
    candidate_b: rgb(0xe0a417),
    candidate_c: rgb(0xcf4586),
    candidate_d: rgb(0xc2f0bb),
    candidate_a_text: rgb(0x98a5ea),
    candidate_b_text: rgb(0xe0a417),
    candidate_c_text: rgb(0xe27bab),
    candidate_d_text: rgb(0xc2f0bb),
    link: rgb(0x78c9de),
    focus: rgb(0xffd75e),
    error: rgb(0xff8fae),
    error_wash: rgb(0x3a1822),
    selection: rgb(0x4d4520),
    selection_edge: rgb(0xd8bb4a),
    scale_d5: rgb(0xf0a071),
    scale_d4: rgb(0xc97a4f),
    scale_d3: rgb(0x975836),
    scale_d2: rgb(0x633c28),
    scale_d1: rgb(0x38271f),
    scale_0: rgb(0x1a2324),
    scale_s1: rgb(0x1b3136),
    scale_s2: rgb(0x1f4851),
    scale_s3: rgb(0x2b6b78),
    scale_s4: rgb(0x4696a5),
    scale_s5: rgb(0x7fd0df),
    pens: Pens { hair: 0.75, thin: 1.0, line: 1.75, requirement: 2.25 },
};

/// On paper, always the light values on white.
pub const PRINT: Palette = Palette {
    desk: rgb(0xffffff),
    paper: rgb(0xffffff),
    wash: rgb(0xffffff),
    rule: rgb(0xb9c1be),
    rule_strong: rgb(0x5c6866),
    ink: rgb(0x000000),
    muted: rgb(0x454f4d),
    requirement: rgb(0x000000),
    grid: rgb(0xd9dedc),
    error_wash: rgb(0xffffff),
    selection: rgb(0xefe3ad),
    scale_0: rgb(0xffffff),
    pens: Pens { hair: 0.5, thin: 0.75, line: 1.4, requirement: 2.0 },
    ..LIGHT
};

/// More contrast, light.
pub const HIGH: Palette = Palette {
    desk: rgb(0xffffff),
    paper: rgb(0xffffff),
    wash: rgb(0xffffff),
    rule: rgb(0x5a5a5a),
    rule_strong: rgb(0x000000),
    ink: rgb(0x000000),
    muted: rgb(0x262e2d),
    requirement: rgb(0x000000),
    surplus: rgb(0x1a5f66),
    surplus_text: rgb(0x155258),
    deficit: rgb(0x6f2817),
    deficit_text: rgb(0x6f2817),
    level: rgb(0x0b284a),
    level_text: rgb(0x0b284a),
    strand: rgb(0x4c5755),
    grid: rgb(0xb4bab8),
    candidate_a: rgb(0x144192),
    candidate_b: rgb(0x66581d),
    candidate_c: rgb(0x541c3a),
    candidate_d: rgb(0x1f2200),
    candidate_a_text: rgb(0x144192),
    candidate_b_text: rgb(0x66581d),
    candidate_c_text: rgb(0x541c3a),
    candidate_d_text: rgb(0x1f2200),
    link: rgb(0x00414f),
    focus: rgb(0x0000d6),
    error: rgb(0x8a0032),
    error_wash: rgb(0xffffff),
    selection: rgb(0xffe24d),
    selection_edge: rgb(0x000000),
    scale_0: rgb(0xffffff),
    pens: Pens { hair: 1.0, thin: 1.25, line: 2.25, requirement: 3.0 },
    ..LIGHT
};

/// More contrast, dark.
pub const HIGH_DARK: Palette = Palette {
    desk: rgb(0x000000),
    paper: rgb(0x000000),
    wash: rgb(0x000000),
    rule: rgb(0xb0b0b0),
    rule_strong: rgb(0xffffff),
    ink: rgb(0xffffff),
    muted: rgb(0xdbe3e1),
    requirement: rgb(0xffffff),
    surplus: rgb(0x4ca9aa),
    surplus_text: rgb(0x7fd4d5),
    deficit: rgb(0xf3a381),
    deficit_text: rgb(0xf7b497),
    level: rgb(0xb3d5ff),
    level_text: rgb(0xc8e0ff),
    strand: rgb(0xb3c0bd),
    grid: rgb(0x4a5554),
    candidate_a: rgb(0xb0a4fd),
    candidate_b: rgb(0xe4ca15),
    candidate_c: rgb(0xe56e9f),
    candidate_d: rgb(0xd1fabc),
    candidate_a_text: rgb(0xbdb3ff),
    candidate_b_text: rgb(0xe4ca15),
    candidate_c_text: rgb(0xf08fb6),
    candidate_d_text: rgb(0xd1fabc),
    link: rgb(0x8fe0ef),
    focus: rgb(0xffe24d),
    error: rgb(0xffb3c8),
    error_wash: rgb(0x000000),
    selection: rgb(0x5c5200),
    selection_edge: rgb(0xffffff),
    scale_0: rgb(0x000000),
    pens: Pens { hair: 1.0, thin: 1.25, line: 2.25, requirement: 3.0 },
    ..DARK
};
