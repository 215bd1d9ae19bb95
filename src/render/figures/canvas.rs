//! The SVG of a figure: layers that plotters draws, and text that we place.

use std::fmt::Write as _;

use plotters::coord::Shift;
use plotters::coord::types::RangedCoordf64;
use plotters::drawing::DrawingAreaErrorKind;
use plotters::prelude::{Cartesian2d, DrawingArea, IntoDrawingArea, SVGBackend};
use plotters::style::RGBColor;

use super::FigureError;
use super::palette::{PAPER, hex};
use super::place::Rect;
use super::text::{Block, CAPITALS};

/// Width of every figure, in its own units; set 15 cm wide, one is 0.56 pt.
pub(super) const WIDTH: f64 = 760.0;

/// Plotters counts in whole units: ten of its own to one of ours.
pub(super) const FINE: f64 = 10.0;

/// Where the data are drawn, and which part of them.
#[derive(Clone, Copy, Debug)]
pub(super) struct Frame {
    pub(super) left: f64,
    pub(super) right: f64,
    pub(super) top: f64,
    pub(super) bottom: f64,
    pub(super) x: (f64, f64),
    pub(super) y: (f64, f64),
}

impl Frame {
    pub(super) fn px(&self, x: f64) -> f64 {
        self.left + (x - self.x.0) / (self.x.1 - self.x.0) * (self.right - self.left)
    }

    pub(super) fn py(&self, y: f64) -> f64 {
        self.bottom - (y - self.y.0) / (self.y.1 - self.y.0) * (self.bottom - self.top)
    }

    pub(super) fn point(&self, (x, y): (f64, f64)) -> (f64, f64) {
        (self.px(x), self.py(y))
    }

    /// From the canvas back to the data.
    pub(super) fn data(&self, (x, y): (f64, f64)) -> (f64, f64) {
        let across = (x - self.left) / (self.right - self.left);
        let up = (self.bottom - y) / (self.bottom - self.top);
        (self.x.0 + across * (self.x.1 - self.x.0), self.y.0 + up * (self.y.1 - self.y.0))
    }
}

/// What plotters draws on: data coordinates inside a frame.
pub(super) type Area<'a> = DrawingArea<SVGBackend<'a>, Cartesian2d<RangedCoordf64, RangedCoordf64>>;

/// What plotters may answer.
pub(super) type Drawn = Result<(), DrawingAreaErrorKind<std::io::Error>>;

/// Where a block of text is anchored: its left edge, its middle or its right edge.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Align {
    Left,
    Middle,
    Right,
}

/// A figure being drawn.
pub(super) struct Canvas {
    height: f64,
    body: String,
}

impl Canvas {
    pub(super) fn new(height: f64) -> Self {
        Self { height, body: String::new() }
    }

    /// A layer in data coordinates; `attributes` hold for all its shapes, a dash pattern for instance.
    pub(super) fn layer(
        &mut self,
        frame: &Frame,
        attributes: &str,
        draw: impl FnOnce(&Area<'_>) -> Drawn,
    ) -> Result<(), FigureError> {
        let mut shapes = String::new();
        let size = (fine(WIDTH) as u32, fine(self.height) as u32);
        let root: DrawingArea<SVGBackend<'_>, Shift> =
            SVGBackend::with_string(&mut shapes, size).into_drawing_area();
        let area = root.apply_coord_spec(Cartesian2d::new(
            frame.x.0..frame.x.1,
            frame.y.0..frame.y.1,
            (fine(frame.left)..fine(frame.right), fine(frame.bottom)..fine(frame.top)),
        ));
        draw(&area).map_err(|error| FigureError::Drawing(error.to_string()))?;
        area.present().map_err(|error| FigureError::Drawing(error.to_string()))?;
        drop(area);
        drop(root);
        // The layer joins a picture that has its own root element.
        let inner = shapes.split_once(">\n").map_or("", |(_, rest)| rest);
        let inner = inner.trim_end().strip_suffix("</svg>").unwrap_or(inner);
        self.put(format_args!("<g transform=\"scale(0.1)\"{attributes}>\n{inner}</g>\n"));
        Ok(())
    }

    /// A block of text, the top of its first line's capitals at `y`.
    pub(super) fn text(
        &mut self,
        block: &Block,
        (x, y): (f64, f64),
        align: Align,
        colour: RGBColor,
    ) {
        let anchor = match align {
            Align::Left => "start",
            Align::Middle => "middle",
            Align::Right => "end",
        };
        let weight = if block.semibold { " font-weight=\"600\"" } else { "" };
        let mut baseline = y + block.size * CAPITALS;
        for line in &block.lines {
            self.put(format_args!(
                "<text x=\"{}\" y=\"{}\" font-size=\"{}\" text-anchor=\"{anchor}\" fill=\"{}\"{weight}>{}</text>\n",
                number(x),
                number(baseline),
                number(block.size),
                hex(colour),
                escape(line)
            ));
            baseline += block.leading();
        }
    }

    /// A plate of paper that keeps text apart from what it lies on.
    pub(super) fn plate(&mut self, rect: Rect) {
        self.put(format_args!(
            "<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" rx=\"3\" fill=\"{}\"/>\n",
            number(rect.left),
            number(rect.top),
            number(rect.right - rect.left),
            number(rect.bottom - rect.top),
            hex(PAPER)
        ));
    }

    /// A hairline from a label to what it names.
    pub(super) fn leader(&mut self, from: (f64, f64), to: (f64, f64), colour: RGBColor) {
        self.put(format_args!(
            "<line x1=\"{}\" y1=\"{}\" x2=\"{}\" y2=\"{}\" stroke=\"{}\" stroke-width=\"0.8\"/>\n",
            number(from.0),
            number(from.1),
            number(to.0),
            number(to.1),
            hex(colour)
        ));
    }

    /// The whole picture.
    pub(super) fn finish(self, description: &str) -> String {
        let (width, height) = (number(WIDTH), number(self.height));
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" \
             viewBox=\"0 0 {width} {height}\" role=\"img\" \
             font-family=\"'Libertinus Serif', 'Linux Libertine', Georgia, serif\">\n\
             <title>{}</title>\n{}</svg>\n",
            escape(description),
            self.body
        )
    }

    fn put(&mut self, piece: std::fmt::Arguments<'_>) {
        // Writing to a string cannot fail.
        let _ = self.body.write_fmt(piece);
    }
}

/// In plotters' units; the whole canvas has less than ten thousand.
pub(super) fn fine(value: f64) -> i32 {
    (value * FINE).round() as i32
}

/// At most two decimals, no trailing zeros.
fn number(value: f64) -> String {
    let text = format!("{value:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

/// The text with XML's own characters escaped and characters that XML cannot hold replaced.
fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            '"' => out.push_str("&quot;"),
            '\u{fffe}' | '\u{ffff}' => out.push('\u{fffd}'),
            c if c.is_control() => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_short() {
        assert_eq!(number(12.0), "12");
        assert_eq!(number(0.456), "0.46");
        assert_eq!(number(-0.001), "0");
        assert_eq!(number(100.0), "100");
    }

    #[test]
    fn text_cannot_leave_its_element() {
        assert_eq!(
            escape("</text><script a=\"b\">&\u{7}"),
            "&lt;/text&gt;&lt;script a=&quot;b&quot;&gt;&amp; "
        );
    }
}
