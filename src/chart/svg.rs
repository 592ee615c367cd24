//! Pictures as SVG text: the same drawing, through plotters' SVG backend, made small and fit for a document.

use std::fmt::Write as _;

use plotters::backend::SVGBackend;

use super::frame::Hits;
use super::pen::{FAMILY, FINE, OUTLINED};
use super::surface::{Over, Surface};
use crate::fault::Result;

/// Draws a picture of a size in px to SVG text, with a sentence as its text equivalent.
///
/// ```
/// use millpond::chart::{LIGHT, NetPower, net, net_power, svg};
/// let data = NetPower::default();
/// let text = svg((320, 300), &net::sentence(&data), |surface| net_power(surface, (320, 300), &LIGHT, &data)).unwrap();
/// assert!(text.starts_with("<svg width=\"320\" height=\"300\""));
/// ```
pub fn svg(
    size: (u32, u32),
    sentence: &str,
    draw: impl FnOnce(&mut dyn Surface) -> Result<Hits>,
) -> Result<String> {
    let mut text = String::new();
    let scaled = (size.0 * FINE as u32, size.1 * FINE as u32);
    draw(&mut Over(SVGBackend::with_string(&mut text, scaled)))?;
    Ok(finish(&text, size, scaled, sentence))
}

/// Gives the root its true size, typeface and sentence, outlines haloes, and joins runs of lines of one look into paths.
fn finish(raw: &str, size: (u32, u32), scaled: (u32, u32), sentence: &str) -> String {
    let mut out = format!(
        "<svg width=\"{}\" height=\"{}\" viewBox=\"0 0 {} {}\" xmlns=\"http://www.w3.org/2000/svg\" role=\"img\" \
         aria-label=\"{}\" font-family=\"{FAMILY}\" stroke-linejoin=\"round\">\n",
        size.0,
        size.1,
        scaled.0,
        scaled.1,
        escape(sentence),
    );
    let family = format!(" font-family=\"{}\"", escape(FAMILY));
    let outline = format!("opacity=\"{OUTLINED}\" fill=\"");
    let mut path = Path::default();
    let mut lines = raw.lines().skip(1);
    while let Some(line) = lines.next() {
        if path.took(line, &mut out) {
            continue;
        }
        path.end(&mut out);
        if line.starts_with("<text") {
            let mut tag = line.replace(&family, "").replace("font-weight=\"bold\"", "font-weight=\"600\"");
            if let Some((before, after)) = tag.split_once(&outline)
                && let Some((colour, rest)) = after.split_once('"')
            {
                tag = format!(
                    "{before}fill=\"{colour}\" stroke=\"{colour}\" stroke-width=\"{}\"{rest}",
                    4.0 * FINE
                );
            }
            out.push_str(&tag.replace(" opacity=\"1\"", ""));
            out.push_str(lines.next().unwrap_or_default());
            out.push_str(lines.next().unwrap_or_default());
        } else {
            out.push_str(&line.replace(" opacity=\"1\"", ""));
        }
        out.push('\n');
    }
    path.end(&mut out);
    out
}

/// A run of lines, areas or rectangles of one look.
#[derive(Default)]
struct Path {
    look: String,
    steps: String,
}

impl Path {
    /// Takes a tag if it is one that can be joined; a change of look ends the path before.
    fn took(&mut self, line: &str, out: &mut String) -> bool {
        let Some((look, steps)) = joinable(line) else { return false };
        if look != self.look {
            self.end(out);
            self.look = look;
        }
        self.steps.push_str(&steps);
        true
    }

    fn end(&mut self, out: &mut String) {
        if !self.steps.is_empty() {
            let look = self.look.replace(" opacity=\"1\"", "");
            let _ = writeln!(out, "<path{look} d=\"{}\"/>", self.steps);
            self.steps.clear();
        }
    }
}

/// The look of a line or area, and its steps as path data.
fn joinable(line: &str) -> Option<(String, String)> {
    if let Some(rest) = line.strip_prefix("<polyline") {
        let (look, points) = rest.split_once(" points=\"")?;
        return Some((look.to_owned(), steps(points, "")?));
    }
    if let Some(rest) = line.strip_prefix("<polygon") {
        let (look, points) = rest.split_once(" points=\"")?;
        return Some((look.to_owned(), steps(points, "z")?));
    }
    let rest = line.strip_prefix("<rect")?;
    let value = |name: &str| rest.split_once(&format!(" {name}=\""))?.1.split_once('"').map(|(v, _)| v);
    let (x, y, width, height) = (value("x")?, value("y")?, value("width")?, value("height")?);
    let look = format!(" opacity=\"{}\" fill=\"{}\"", value("opacity")?, value("fill")?);
    Some((look, format!("M{x},{y}h{width}v{height}h-{width}z")))
}

fn steps(points: &str, close: &str) -> Option<String> {
    let points = points.strip_suffix("\"/>")?.trim_end();
    Some(format!("M{}{close}", points.replacen(' ', "L", 1)))
}

fn escape(text: &str) -> String {
    text.replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
        .replace('"', "&quot;")
        .replace('\'', "&apos;")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_of_one_look_become_one_path() {
        let raw = "<svg>\n<polyline fill=\"none\" opacity=\"1\" stroke=\"#000000\" stroke-width=\"20\" points=\"0,0 20,0 \"/>\n\
                   <polyline fill=\"none\" opacity=\"1\" stroke=\"#000000\" stroke-width=\"20\" points=\"0,40 20,40 \"/>\n</svg>\n";
        let text = finish(raw, (1, 2), (20, 40), "a \"line\"");
        assert!(text.contains(
            "<path fill=\"none\" stroke=\"#000000\" stroke-width=\"20\" d=\"M0,0L20,0M0,40L20,40\"/>"
        ));
        assert!(text.contains("aria-label=\"a &quot;line&quot;\""), "{text}");
    }

    #[test]
    fn what_is_written_is_escaped() {
        assert_eq!(escape("<a & 'b'>"), "&lt;a &amp; &apos;b&apos;&gt;");
    }
}
