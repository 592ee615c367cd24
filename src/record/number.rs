//! Cells to numbers: decimal and thousands marks, exactly the double nearest to the written decimal.

/// How numbers are written in a file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Marks {
    /// Point or comma.
    pub(super) decimal: u8,
    /// The other mark, where it sets thousands apart. (Spaces and apostrophes between groups of three always do.)
    pub(super) thousands: Option<u8>,
    /// Whether the file holds both decimal marks, so that a lone one in a cell is decimal, whichever it is.
    pub(super) mixed: bool,
}

/// What a cell holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Cell {
    /// Nothing but spaces.
    Empty,
    /// A finite number.
    Number(f64),
    /// Something else.
    Text,
}

/// Reads a cell.
pub(super) fn parse(cell: &[u8], marks: Marks) -> Cell {
    let cell = trim(cell);
    if cell.is_empty() {
        return Cell::Empty;
    }
    let plain = |byte: &u8| byte.is_ascii_digit() || matches!(byte, b'.' | b'-' | b'+' | b'e' | b'E');
    let marks = if marks.mixed { lone(cell, marks) } else { marks };
    if marks.decimal == b'.' && marks.thousands != Some(b'.') && cell.iter().all(plain) {
        return finite(cell);
    }
    let mut clean = [0_u8; 48];
    match cleaned(cell, marks, &mut clean) {
        Some(count) => finite(&clean[..count]),
        None => Cell::Text,
    }
}

/// The marks of a cell in a file that holds both decimal marks.
fn lone(cell: &[u8], marks: Marks) -> Marks {
    let count = |mark: u8| cell.split(|byte| *byte == mark).count() - 1;
    match (count(b'.'), count(b',')) {
        (1, 0) => Marks { decimal: b'.', thousands: None, ..marks },
        (0, 1) => Marks { decimal: b',', thousands: None, ..marks },
        _ => marks,
    }
}

fn finite(bytes: &[u8]) -> Cell {
    // Only digits, signs, points and the exponent's letter get here, so "inf" and "nan" do not.
    match std::str::from_utf8(bytes).ok().and_then(|text| text.parse::<f64>().ok()) {
        Some(value) if value.is_finite() => Cell::Number(value),
        _ => Cell::Text,
    }
}

/// Writes the cell with a decimal point and without thousands marks; none if it is no number.
fn cleaned(cell: &[u8], marks: Marks, clean: &mut [u8; 48]) -> Option<usize> {
    let mut count = 0;
    let mut at = 0;
    // Digits since the last thousands mark, once there was one.
    let mut group: Option<u32> = None;
    let mut digits = 0;
    let mut whole = true;
    while at < cell.len() {
        let (width, kind) = glyph(&cell[at..]);
        let byte = cell[at];
        let separates = kind == Glyph::Space
            || kind == Glyph::Apostrophe
            || (width == 1 && marks.thousands == Some(byte));
        let out = if kind == Glyph::Minus {
            b'-'
        } else if separates {
            let right = match group {
                Some(three) => three == 3,
                None => (1..=3).contains(&digits),
            };
            if !(whole && right) {
                return None;
            }
            group = Some(0);
            at += width;
            continue;
        } else if byte == marks.decimal {
            if !whole || group.is_some_and(|three| three != 3) {
                return None;
            }
            whole = false;
            b'.'
        } else if byte.is_ascii_digit() {
            digits += 1;
            if whole && let Some(three) = &mut group {
                *three += 1;
            }
            byte
        } else if matches!(byte, b'-' | b'+' | b'e' | b'E') {
            if matches!(byte, b'e' | b'E') {
                if group.is_some_and(|three| whole && three != 3) {
                    return None;
                }
                whole = false;
            }
            byte
        } else {
            return None;
        };
        *clean.get_mut(count)? = out;
        count += 1;
        at += width;
    }
    (!(whole && group.is_some_and(|three| three != 3))).then_some(count)
}

#[derive(PartialEq, Eq)]
enum Glyph {
    Space,
    Apostrophe,
    Minus,
    Other,
}

/// Width and kind of the first character: thousands are also set apart by spaces that do not break, of several widths.
fn glyph(bytes: &[u8]) -> (usize, Glyph) {
    match bytes {
        [b' ' | 0xa0, ..] => (1, Glyph::Space),
        [0xc2, 0xa0, ..] => (2, Glyph::Space),
        [0xe2, 0x80, 0xaf | 0x89, ..] => (3, Glyph::Space),
        [b'\'' | 0x92, ..] => (1, Glyph::Apostrophe),
        [0xe2, 0x80, 0x99, ..] => (3, Glyph::Apostrophe),
        [0xe2, 0x88, 0x92, ..] => (3, Glyph::Minus),
        _ => (1, Glyph::Other),
    }
}

/// The cell without outer spaces of any width.
pub(super) fn trim(cell: &[u8]) -> &[u8] {
    let mut cell = cell.trim_ascii();
    loop {
        let (width, kind) = glyph(cell);
        if cell.is_empty() || kind != Glyph::Space {
            break;
        }
        cell = &cell[width..];
    }
    for space in [&b"\xc2\xa0"[..], b"\xe2\x80\xaf"] {
        while let Some(rest) = cell.strip_suffix(space) {
            cell = rest;
        }
    }
    cell.trim_ascii_end()
}

/// What the cells of a file say about its marks.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Evidence {
    /// Cells that only make sense with a decimal comma, or with a decimal point.
    comma: u32,
    point: u32,
    /// Cells in which one of the marks sets thousands apart.
    grouping: u32,
    /// Cells such as "1,234": either.
    either_comma: u32,
    either_point: u32,
    /// Whole numbers other than zero without any mark.
    bare: u32,
    /// The grouping character seen beside the two marks.
    pub(super) grouped_by: Option<char>,
}

impl Evidence {
    /// Looks at a cell.
    pub(super) fn add(&mut self, cell: &[u8]) {
        let cell = trim(cell);
        let body = cell.strip_prefix(b"-").or_else(|| cell.strip_prefix(b"+")).unwrap_or(cell);
        if body.is_empty() || !body.iter().any(u8::is_ascii_digit) {
            return;
        }
        let mut at = 0;
        let mut grouped = None;
        while at < body.len() {
            let (width, kind) = glyph(&body[at..]);
            match kind {
                Glyph::Space => grouped = Some(' '),
                Glyph::Apostrophe => grouped = Some('\''),
                Glyph::Minus => {}
                Glyph::Other => {
                    if !(body[at].is_ascii_digit()
                        || matches!(body[at], b'.' | b',' | b'e' | b'E' | b'-' | b'+'))
                    {
                        return;
                    }
                }
            }
            at += width;
        }
        self.grouped_by = self.grouped_by.or(grouped);
        let count = |mark: u8| body.split(|byte| *byte == mark).count() - 1;
        let last = |mark: u8| body.iter().rposition(|byte| *byte == mark);
        match (count(b','), count(b'.')) {
            (0, 0) => self.bare += u32::from(body.iter().any(|byte| (b'1'..=b'9').contains(byte))),
            (0, 1) | (1, 0) => {
                let comma = count(b',') == 1;
                let at = last(if comma { b',' } else { b'.' }).unwrap_or(0);
                let after = body[at + 1..].iter().take_while(|byte| byte.is_ascii_digit()).count();
                let either = after == 3
                    && at + 4 == body.len()
                    && (1..=3).contains(&at)
                    && body[0] != b'0'
                    && grouped.is_none();
                match (either, comma) {
                    (true, true) => self.either_comma += 1,
                    (true, false) => self.either_point += 1,
                    (false, true) => self.comma += 1,
                    (false, false) => self.point += 1,
                }
            }
            (0, _) => (self.comma, self.grouping) = (self.comma + 1, self.grouping + 1),
            (_, 0) => (self.point, self.grouping) = (self.point + 1, self.grouping + 1),
            _ if last(b',') > last(b'.') => (self.comma, self.grouping) = (self.comma + 1, self.grouping + 1),
            _ => (self.point, self.grouping) = (self.point + 1, self.grouping + 1),
        }
    }

    /// Adds what another column says. Its whole numbers count only beside numbers of its own with a mark.
    pub(super) fn join(&mut self, other: &Self) {
        self.comma += other.comma;
        self.point += other.point;
        self.grouping += other.grouping;
        self.either_comma += other.either_comma;
        self.either_point += other.either_point;
        if other.either_comma + other.either_point > 0 {
            self.bare += other.bare;
        }
        self.grouped_by = self.grouped_by.or(other.grouped_by);
    }

    /// The marks taken, and why.
    pub(super) fn decide(&self, chosen: Option<char>) -> (Marks, &'static str) {
        // A cell with both marks shows that one of them sets thousands apart.
        let mixed = chosen.is_none() && self.comma > 0 && self.point > 0 && self.grouping == 0;
        let comma = Marks { decimal: b',', thousands: Some(b'.'), mixed };
        let point = Marks { decimal: b'.', thousands: Some(b','), mixed };
        match chosen {
            Some(',') => return (comma, "as stated"),
            Some(_) => return (point, "as stated"),
            None => {}
        }
        if self.comma != self.point {
            return if self.comma > self.point {
                (comma, "cells have digits after a comma that are no thousands")
            } else {
                (point, "cells have digits after a point that are no thousands")
            };
        }
        // Only "1,234" or "1.234": with whole numbers beside them the mark sets thousands apart, otherwise it is decimal.
        match (self.either_comma > self.either_point, self.either_point > 0, self.bare > 0) {
            (true, _, false) => (comma, "every number has exactly three digits after a comma"),
            (true, _, true) => (point, "whole numbers stand beside numbers with a comma before three digits"),
            (false, true, true) => {
                (comma, "whole numbers stand beside numbers with a point before three digits")
            }
            (false, true, false) => (point, "every number has exactly three digits after a point"),
            (false, false, _) => (point, "no number has a decimal mark"),
        }
    }

    /// Whether the thousands mark was seen.
    pub(super) fn thousands(&self, marks: Marks) -> Option<char> {
        let other = if marks.decimal == b',' {
            self.point + self.either_point
        } else {
            self.comma + self.either_comma
        };
        if other > 0 { marks.thousands.map(char::from) } else { self.grouped_by }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const POINT: Marks = Marks { decimal: b'.', thousands: Some(b','), mixed: false };
    const COMMA: Marks = Marks { decimal: b',', thousands: Some(b'.'), mixed: false };

    #[test]
    fn numbers_are_read_as_written() {
        for (cell, marks, value) in [
            ("1.5", POINT, 1.5),
            (" -0.1 ", POINT, -0.1),
            ("+3", POINT, 3.0),
            ("1e3", POINT, 1000.0),
            (".5", POINT, 0.5),
            ("1,234.5", POINT, 1234.5),
            ("1,234,567", POINT, 1_234_567.0),
            ("1,5", COMMA, 1.5),
            ("1.234,5", COMMA, 1234.5),
            ("12.345", COMMA, 12_345.0),
            ("1 234,5", COMMA, 1234.5),
            ("1\u{a0}234,5", COMMA, 1234.5),
            ("1\u{202f}234.5", POINT, 1234.5),
            ("1'234.5", POINT, 1234.5),
            ("1’234.5", POINT, 1234.5),
            ("−7,25", COMMA, -7.25),
        ] {
            assert_eq!(parse(cell.as_bytes(), marks), Cell::Number(value), "{cell}");
        }
        assert_eq!(parse(b"1\xa0234,5", COMMA), Cell::Number(1234.5));
    }

    #[test]
    fn what_is_no_number_is_text() {
        for cell in [
            "n/a", "inf", "NaN", "1e999", "1,23.4", "12,34", "1.2.3", "-", ".", "1,2345", "0x10", "1 23",
            "infinity", "1,", "5 kW",
        ] {
            assert_eq!(parse(cell.as_bytes(), POINT), Cell::Text, "{cell}");
        }
        for cell in ["", "  ", "\u{a0}"] {
            assert_eq!(parse(cell.as_bytes(), POINT), Cell::Empty, "{cell:?}");
        }
    }

    #[test]
    fn marks_follow_the_cells() {
        for (cells, decimal) in [
            (&["1,5", "2"][..], b','),
            (&["1.5", "2"], b'.'),
            (&["1.234,5", "1.000"], b','),
            (&["1,234.5", "1,000"], b'.'),
            (&["1,234", "2,345"], b','),
            (&["1,234", "987"], b'.'),
            (&["1.234", "987"], b','),
            (&["1.234", "0"], b'.'),
            (&["12", "7"], b'.'),
            (&["1.234.567", "7"], b','),
        ] {
            let mut evidence = Evidence::default();
            for cell in cells {
                evidence.add(cell.as_bytes());
            }
            assert_eq!(evidence.decide(None).0.decimal, decimal, "{cells:?}");
        }
    }
}
