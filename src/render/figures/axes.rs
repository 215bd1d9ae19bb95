//! Margins, titles, ticks and rules that every figure has.

use plotters::element::PathElement;
use plotters::style::{Color, RGBColor};

use super::FigureError;
use super::canvas::{Align, Canvas, Frame, WIDTH};
use super::clip::opened;
use super::palette::{FAINT, GREY, INK, LABEL, RULE, SMALL};
use super::place::Rect;
use super::text::{Block, CAPITALS};
use crate::report::figures::{Axis, Tick};

/// Height of the part with the data.
const PLOT: f64 = 300.0;
/// Space at the edges of the canvas.
pub(super) const EDGE: f64 = 4.0;
/// Widest label of a tick beside the vertical axis.
const TICK_ROOM: f64 = 130.0;
/// Length of a tick.
const TICK: f64 = 5.0;

/// The parts of a figure around its data.
pub(super) struct Axes {
    pub(super) frame: Frame,
    /// Height of the whole canvas.
    pub(super) height: f64,
    y_title: Block,
    x_title: Block,
    right_title: Option<Block>,
    y_ticks: Vec<(f64, Block)>,
    x_ticks: Vec<(f64, Block, bool)>,
}

/// How much is drawn.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Grid {
    /// Faint horizontal rules at the ticks of the vertical axis.
    Rules,
    /// Ticks at both axes.
    Ticks,
}

impl Axes {
    /// Room for titles and ticks; `right` is kept free beside the data, `right_title` stands above them.
    pub(super) fn lay_out(x: &Axis, y: &Axis, right: f64, right_title: Option<&str>) -> Self {
        let block = |tick: &Tick| Block::new(&tick.text, SMALL, false, TICK_ROOM, 1);
        let y_labels: Vec<(f64, Block)> =
            y.ticks.iter().map(|tick| (tick.position, block(tick))).collect();
        let widest = y_labels.iter().map(|(_, block)| block.width()).fold(24.0, f64::max);
        let left = EDGE + widest + 12.0;
        let across = WIDTH - 2.0 * EDGE;
        let share = if right_title.is_some() { across / 2.0 - 10.0 } else { across };
        let y_title = Block::new(&y.title, LABEL, false, share, 2);
        let right_title = right_title.map(|title| Block::new(title, LABEL, true, share, 2));
        let titles = right_title.as_ref().map_or(0.0, Block::height).max(y_title.height());
        let top = EDGE + titles + 16.0;
        let bottom = top + PLOT;
        let frame =
            Frame { left, right: WIDTH - right, top, bottom, x: (x.from, x.to), y: (y.from, y.to) };
        let x_title = Block::new(&x.title, LABEL, false, across, 2);
        let height = bottom + 12.0 + SMALL + 10.0 + x_title.height() + EDGE;
        let x_labels: Vec<(f64, Block)> =
            x.ticks.iter().map(|tick| (tick.position, block(tick))).collect();
        let x_ticks = thinned(&frame, x_labels);
        Self { frame, height, y_title, x_title, right_title, y_ticks: y_labels, x_ticks }
    }

    /// The part of the canvas in which labels of the data may stand.
    pub(super) fn room(&self) -> Rect {
        let Frame { left, right, top, bottom, .. } = self.frame;
        Rect { left: left + 2.0, top: top - 6.0, right: right - 2.0, bottom: bottom - 4.0 }
    }

    /// The rules of the grid on the canvas.
    pub(super) fn rules(&self) -> impl Iterator<Item = [(f64, f64); 2]> {
        let Frame { left, right, .. } = self.frame;
        self.y_ticks.iter().map(move |(y, _)| {
            let level = self.frame.py(*y);
            [(left, level), (right, level)]
        })
    }

    /// Rules below the data, open at the gaps.
    pub(super) fn grid(&self, canvas: &mut Canvas, gaps: &[Rect]) -> Result<(), FigureError> {
        let pieces = self.rules().flat_map(|[from, to]| opened(vec![vec![from, to]], gaps));
        canvas.layer(&self.frame, "", |area| {
            for piece in pieces {
                let points: Vec<_> =
                    piece.into_iter().map(|point| self.frame.data(point)).collect();
                area.draw(&PathElement::new(points, FAINT.stroke_width(8)))?;
            }
            Ok(())
        })
    }

    /// Axis, ticks, their labels and the titles.
    pub(super) fn draw(&self, canvas: &mut Canvas, grid: Grid) -> Result<(), FigureError> {
        let frame = self.frame;
        let (x_tick, y_tick) = (
            TICK / (frame.bottom - frame.top) * (frame.y.1 - frame.y.0),
            TICK / (frame.right - frame.left) * (frame.x.1 - frame.x.0),
        );
        canvas.layer(&frame, "", |area| {
            area.draw(&rule((frame.x.0, frame.y.0), (frame.x.1, frame.y.0), RULE, 10))?;
            for (x, _, _) in &self.x_ticks {
                area.draw(&rule((*x, frame.y.0), (*x, frame.y.0 - x_tick), RULE, 10))?;
            }
            if grid == Grid::Ticks {
                area.draw(&rule((frame.x.0, frame.y.0), (frame.x.0, frame.y.1), RULE, 10))?;
                for (y, _) in &self.y_ticks {
                    area.draw(&rule((frame.x.0, *y), (frame.x.0 - y_tick, *y), RULE, 10))?;
                }
            }
            Ok(())
        })?;
        self.texts(canvas);
        Ok(())
    }

    fn texts(&self, canvas: &mut Canvas) {
        let frame = self.frame;
        for (y, block) in &self.y_ticks {
            let top = frame.py(*y) - block.size * CAPITALS / 2.0;
            canvas.text(block, (frame.left - 10.0, top), Align::Right, GREY);
        }
        for (x, block, shown) in &self.x_ticks {
            if *shown {
                let middle = inside(frame.px(*x), block.width());
                canvas.text(block, (middle, frame.bottom + 12.0), Align::Middle, GREY);
            }
        }
        canvas.text(&self.y_title, (EDGE, EDGE), Align::Left, INK);
        if let Some(title) = &self.right_title {
            canvas.text(title, (frame.right, EDGE), Align::Right, super::palette::ACCENT);
        }
        let middle = inside((frame.left + frame.right) / 2.0, self.x_title.width());
        let top = frame.bottom + 12.0 + SMALL + 10.0;
        canvas.text(&self.x_title, (middle, top), Align::Middle, INK);
    }
}

/// A straight rule in data coordinates, its width in tenths of a unit.
pub(super) fn rule(
    from: (f64, f64),
    to: (f64, f64),
    colour: RGBColor,
    width: u32,
) -> PathElement<(f64, f64)> {
    PathElement::new(vec![from, to], colour.stroke_width(width))
}

/// Marks every tick, and the labels of as many as do not touch each other: all, every second, every third ...
fn thinned(frame: &Frame, labels: Vec<(f64, Block)>) -> Vec<(f64, Block, bool)> {
    let count = labels.len();
    let clear = |stride: usize| {
        let mut end = f64::NEG_INFINITY;
        labels.iter().step_by(stride).all(|(x, block)| {
            let middle = inside(frame.px(*x), block.width());
            let start = middle - block.width() / 2.0;
            let free = start >= end + 8.0;
            end = start + block.width();
            free
        })
    };
    let stride = (1..=count.max(1)).find(|stride| clear(*stride)).unwrap_or(1);
    labels
        .into_iter()
        .enumerate()
        .map(|(index, (x, block))| (x, block, index.is_multiple_of(stride)))
        .collect()
}

/// The middle of a centred text, moved so that its ends stay on the canvas.
fn inside(middle: f64, width: f64) -> f64 {
    let half = width / 2.0 + EDGE;
    middle.min(WIDTH - half).max(half)
}
