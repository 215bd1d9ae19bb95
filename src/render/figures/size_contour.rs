//! Units in a group over the difference to detect and the spread.

use plotters::element::{Circle, PathElement, Polygon, Rectangle};
use plotters::style::{Color, RGBColor};

use super::FigureError;
use super::axes::{Axes, Grid, rule};
use super::canvas::{Align, Canvas, Frame};
use super::checks;
use super::clip::{area_inside, line_inside, opened};
use super::labels::{Place, Placed, around};
use super::palette::{ACCENT, CEILING_DASH, DEEP, INK, LABEL, PAPER, SMALL, WARM, shade};
use super::place::{Obstacles, Rect};
use super::text::{Block, CAPITALS};
use crate::report::figures::{Level, SizeContour};

/// Space to the right of the data.
const RIGHT: f64 = 16.0;
/// Widest label inside the figure.
const INSIDE_ROOM: f64 = 210.0;
/// What speaks against a further line of text in the label of a line.
const FURTHER: f64 = 30.0;
/// Half the width of the caps that end the limits.
const CAP: f64 = 6.0;

/// A line of equal size on the canvas, with its label.
struct Line<'a> {
    level: &'a Level,
    pieces: Vec<Vec<(f64, f64)>>,
    /// The label and where it stands.
    label: Option<(Block, Rect)>,
}

/// Draws the units needed in a group over the difference to detect and the spread as an SVG picture.
///
/// Between the lines of equal size the ground darkens as the size rises. A line is expected to reach from edge to
/// edge of the axes; where it ends inside them, the shades meet straight above and below its ends.
///
/// # Errors
///
/// [`FigureError`] for numbers that are not finite, an empty axis, an axis of the difference that crosses zero, no
/// line or too many, lines not in the order of their sizes or with spreads that do not rise, and for a plan outside
/// the axes.
pub fn size_contour(data: &SizeContour) -> Result<String, FigureError> {
    checks::size_contour(data)?;
    let axes = Axes::lay_out(&data.x, &data.y, RIGHT, Some(&data.title));
    let frame = axes.frame;
    let plot = Rect { left: frame.left, top: frame.top, right: frame.right, bottom: frame.bottom };
    let mut lines = lines(data, &frame, plot);
    let mut obstacles = obstacles(data, &frame, plot, &lines);
    let plan = place_plan(data, &frame, &mut obstacles);
    place_sizes(&mut lines, plot, &mut obstacles);
    let mut canvas = Canvas::new(axes.height);
    draw_bands(&mut canvas, &frame, data)?;
    let gaps: Vec<Rect> = lines
        .iter()
        .filter_map(|line| line.label.as_ref().map(|(_, rect)| *rect))
        .chain(plan.iter().map(Placed::rect))
        .collect();
    draw_lines(&mut canvas, &frame, &lines, &gaps)?;
    draw_plan(&mut canvas, &frame, data)?;
    axes.draw(&mut canvas, Grid::Ticks)?;
    for line in &lines {
        let Some((block, rect)) = &line.label else { continue };
        let colour = if line.level.ceiling { WARM } else { DEEP };
        canvas.text(block, (rect.left, rect.top), Align::Left, colour);
    }
    plan.iter().for_each(|label| label.draw(&mut canvas));
    Ok(canvas.finish(&data.description))
}

fn lines<'a>(data: &'a SizeContour, frame: &Frame, plot: Rect) -> Vec<Line<'a>> {
    let of = |level: &'a Level| {
        let points: Vec<_> = level.points.iter().map(|point| frame.point(*point)).collect();
        Line { level, pieces: line_inside(&points, plot), label: None }
    };
    data.levels.iter().map(of).collect()
}

/// What the labels of the plan keep clear of.
fn obstacles(data: &SizeContour, frame: &Frame, plot: Rect, lines: &[Line<'_>]) -> Obstacles {
    let mut obstacles = Obstacles::new(plot.grown(-5.0));
    for line in lines {
        let weight = if line.level.ceiling { 1.0 } else { 0.4 };
        for piece in &line.pieces {
            obstacles.line(piece.clone(), weight);
        }
    }
    let (x, y) = frame.point((data.plan.x, data.plan.y));
    obstacles.mark(Rect::new(x - 8.0, y - 8.0, 16.0, 16.0));
    if let Some((low, high)) = limits(data) {
        let (low, high) = (frame.py(low), frame.py(high));
        obstacles.mark(Rect { left: x - CAP, top: high, right: x + CAP, bottom: low });
    }
    obstacles
}

/// The part of the limits inside the axis.
fn limits(data: &SizeContour) -> Option<(f64, f64)> {
    let limits = data.limits.as_ref()?;
    let (low, high) = (limits.low.max(data.y.from), limits.high.min(data.y.to));
    (low < high).then_some((low, high))
}

/// Labels of the plan and of the limits.
fn place_plan(data: &SizeContour, frame: &Frame, obstacles: &mut Obstacles) -> Vec<Placed> {
    let at = frame.point((data.plan.x, data.plan.y));
    let settings = Block::settings(&data.plan.label, LABEL, true, INSIDE_ROOM, 3);
    let by_plan = |block: Block| {
        let places = around(at, &block);
        (block, places)
    };
    let settings = settings.into_iter().map(by_plan).collect();
    let mut labels = vec![Placed::find(obstacles, settings, DEEP)];
    if let (Some(given), Some((low, high))) = (&data.limits, limits(data)) {
        let (low, high) = (frame.py(low), frame.py(high));
        let by_limits = |block: Block| {
            let places = by_bar(at.0, (high, low), &block);
            (block, places)
        };
        let settings = Block::settings(&given.label, SMALL, false, INSIDE_ROOM, 3);
        let settings = settings.into_iter().map(by_limits).collect();
        labels.push(Placed::find(obstacles, settings, INK));
    }
    labels.into_iter().flatten().collect()
}

/// Places along the bar of the limits, from its ends to its middle, then farther off with a leader to an end.
fn by_bar(x: f64, (top, bottom): (f64, f64), block: &Block) -> Vec<Place> {
    let (width, height) = (block.width(), block.height());
    let mut places = Vec::new();
    for step in 0..20 {
        let part = f64::from(step) / 20.0;
        for (end, down) in [(top, 1.0), (bottom, -1.0)] {
            let middle = end + down * part * (bottom - top) / 2.0;
            for left in [x + CAP + 6.0, x - CAP - 6.0 - width] {
                let rect = Rect::new(left, middle - height / 2.0, width, height);
                places.push(Place { rect, dislike: part * 20.0, point: None });
            }
        }
    }
    for end in [top, bottom] {
        let distant = around((x, end), block).into_iter();
        places.extend(distant.map(|place| Place { dislike: place.dislike + 10.0, ..place }));
    }
    places
}

/// Puts the size on each line, the ceiling's first: towards the upper end, where the lines are farthest apart.
fn place_sizes(lines: &mut [Line<'_>], plot: Rect, obstacles: &mut Obstacles) {
    let mut order: Vec<&mut Line<'_>> = lines.iter_mut().collect();
    order.sort_by_key(|line| !line.level.ceiling);
    for line in order {
        let settings =
            Block::settings(&line.level.label, SMALL, line.level.ceiling, INSIDE_ROOM, 2);
        let places = settings.into_iter().filter_map(|block| {
            let (cost, rect) = place_size(line, &block, plot, obstacles)?;
            Some((cost + FURTHER * (block.lines.len() as f64 - 1.0), block, rect))
        });
        if let Some((_, block, rect)) = places.min_by(|(a, ..), (b, ..)| a.total_cmp(b)) {
            obstacles.take(rect);
            line.label = Some((block, rect));
        }
    }
}

/// The best place for a label on its line inside the plot, and what speaks against it.
fn place_size(
    line: &Line<'_>,
    block: &Block,
    plot: Rect,
    obstacles: &Obstacles,
) -> Option<(f64, Rect)> {
    let further = block.lines.len().saturating_sub(1) as f64 * block.leading();
    let (width, height) = (block.width(), block.size * CAPITALS + further);
    let mut best: Option<(f64, Rect)> = None;
    for step in 1..40 {
        let part = f64::from(step) / 40.0;
        let Some((x, y)) = along(&line.pieces, part) else { continue };
        let rect = Rect::new(x - width / 2.0, y - height / 2.0, width, height);
        if !rect.grown(4.0).within(plot) {
            continue;
        }
        // The line itself runs through its label: that much is no fault.
        let clear = rect.grown(Obstacles::AIR);
        let weight = if line.level.ceiling { 1.0 } else { 0.4 };
        let own: f64 = line.pieces.iter().map(|piece| weight * clear.length_of(piece)).sum();
        let covers = (obstacles.covers(rect) - own).max(0.0);
        let cost = 10.0 * covers + 30.0 * (part - 0.82).abs();
        if best.is_none_or(|(least, _)| cost < least) {
            best = Some((cost, rect));
        }
    }
    best
}

/// The point at a part of the length of a line, its pieces taken together.
fn along(pieces: &[Vec<(f64, f64)>], part: f64) -> Option<(f64, f64)> {
    let segments = || pieces.iter().flat_map(|piece| piece.iter().zip(piece.iter().skip(1)));
    let length = |((x0, y0), (x1, y1)): (&(f64, f64), &(f64, f64))| {
        ((x1 - x0) * (x1 - x0) + (y1 - y0) * (y1 - y0)).sqrt()
    };
    let mut rest = part * segments().map(length).sum::<f64>();
    for (from, to) in segments() {
        let here = length((from, to));
        if here > 0.0 && rest <= here {
            let share = rest / here;
            return Some((from.0 + share * (to.0 - from.0), from.1 + share * (to.1 - from.1)));
        }
        rest -= here;
    }
    None
}

/// From the lightest ground for the smallest sizes to the darkest for the largest.
fn draw_bands(canvas: &mut Canvas, frame: &Frame, data: &SizeContour) -> Result<(), FigureError> {
    let (x, y) = (frame.x, frame.y);
    let plot = Rect { left: x.0, top: y.0, right: x.1, bottom: y.1 };
    let count = data.levels.len() + 1;
    // Larger sizes lie towards a difference of zero.
    let far = if x.0 >= 0.0 { x.0 - (x.1 - x.0) } else { x.1 + (x.1 - x.0) };
    let beyond = (y.0 - (y.1 - y.0), y.1 + (y.1 - y.0));
    canvas.layer(frame, "", |area| {
        area.draw(&Rectangle::new([(x.0, y.0), (x.1, y.1)], shade(0, count).filled()))?;
        for (index, level) in data.levels.iter().enumerate() {
            let (Some(first), Some(last)) = (level.points.first(), level.points.last()) else {
                continue;
            };
            let mut outline = vec![(far, beyond.0), (first.0, beyond.0)];
            outline.extend(&level.points);
            outline.extend([(last.0, beyond.1), (far, beyond.1)]);
            let inside = area_inside(&outline, plot);
            if !inside.is_empty() {
                area.draw(&Polygon::new(inside, shade(index + 1, count).filled()))?;
            }
        }
        Ok(())
    })
}

/// The lines, open where labels stand.
fn draw_lines(
    canvas: &mut Canvas,
    frame: &Frame,
    lines: &[Line<'_>],
    gaps: &[Rect],
) -> Result<(), FigureError> {
    for line in lines {
        let (colour, width, dash): (RGBColor, u32, &str) = match line.level.ceiling {
            true => (WARM, 20, CEILING_DASH),
            false => (ACCENT, 10, ""),
        };
        let pieces = opened(line.pieces.clone(), gaps);
        let attributes = format!(" fill=\"none\" stroke-linejoin=\"round\"{dash}");
        canvas.layer(frame, &attributes, |area| {
            for piece in pieces {
                let points: Vec<_> = piece.into_iter().map(|point| frame.data(point)).collect();
                area.draw(&PathElement::new(points, colour.stroke_width(width)))?;
            }
            Ok(())
        })?;
    }
    Ok(())
}

/// The plan's point and the limits through it.
fn draw_plan(canvas: &mut Canvas, frame: &Frame, data: &SizeContour) -> Result<(), FigureError> {
    let at = (data.plan.x, data.plan.y);
    canvas.layer(frame, "", |area| {
        if let (Some(given), Some((low, high))) = (&data.limits, limits(data)) {
            area.draw(&rule((at.0, low), (at.0, high), INK, 14))?;
            let cap = CAP / (frame.right - frame.left) * (frame.x.1 - frame.x.0);
            // A limit beyond the axis has no cap: the line runs on.
            for end in [given.low, given.high] {
                if end >= frame.y.0 && end <= frame.y.1 {
                    area.draw(&rule((at.0 - cap, end), (at.0 + cap, end), INK, 14))?;
                }
            }
        }
        area.draw(&Circle::new(at, 76, PAPER.filled()))?;
        area.draw(&Circle::new(at, 54, ACCENT.filled()))
    })
}
