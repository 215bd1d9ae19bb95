//! Power against the number of units in a group.

use plotters::element::{Circle, PathElement, Polygon};
use plotters::style::{Color, RGBColor};

use super::FigureError;
use super::axes::{Axes, EDGE, Grid, rule};
use super::canvas::{Align, Canvas, Frame, WIDTH};
use super::checks;
use super::labels::{Place, Placed, around};
use super::palette::{ACCENT, BAND, BESIDE, CEILING_DASH, GREY, INK, LABEL, PAPER, SMALL, WARM};
use super::place::{Obstacles, Rect, spread};
use super::text::Block;
use crate::report::figures::{Assumed, Curve, PowerCurve};

/// Widest label at the end of a curve.
const END_ROOM: f64 = 158.0;
/// Widest label inside the figure.
const INSIDE_ROOM: f64 = 190.0;
/// What speaks against the label of the choice along its upright rule, away from its point.
const FOOT: f64 = 45.0;
/// Distance from the end of a curve to its label.
const END_GAP: f64 = 20.0;

/// The label at the end of a curve.
struct End {
    block: Block,
    colour: RGBColor,
    at: (f64, f64),
    top: f64,
}

/// Draws power against the number of units in a group as an SVG picture.
///
/// # Errors
///
/// [`FigureError`] for numbers that are not finite, an empty axis, no curve or more than three, a curve whose sizes do
/// not rise, and for a target, choice or ceiling outside the axes.
pub fn power_curve(data: &PowerCurve) -> Result<String, FigureError> {
    checks::power_curve(data)?;
    let blocks: Vec<Block> = data.curves.iter().map(|curve| end_block(curve, END_ROOM)).collect();
    let widest = blocks.iter().map(Block::width).fold(0.0, f64::max);
    let axes = Axes::lay_out(&data.x, &data.y, END_GAP + widest + EDGE, None);
    let frame = axes.frame;
    let curves: Vec<Vec<(f64, f64)>> =
        data.curves.iter().map(|curve| thin(&frame, &curve.points)).collect();
    let labels = place_labels(&axes, data, &curves);
    let gaps: Vec<Rect> = labels.iter().map(Placed::rect).collect();
    let mut canvas = Canvas::new(axes.height);
    draw_band(&mut canvas, &frame, data, &curves)?;
    axes.grid(&mut canvas, &gaps)?;
    draw_rules(&mut canvas, &frame, data)?;
    draw_curves(&mut canvas, &frame, data, &curves)?;
    axes.draw(&mut canvas, Grid::Rules)?;
    draw_ends(&mut canvas, ends(data, blocks, &curves, &frame));
    labels.iter().for_each(|label| label.draw(&mut canvas));
    Ok(canvas.finish(&data.description))
}

fn end_block(curve: &Curve, room: f64) -> Block {
    Block::new(&curve.label, SMALL, curve.assumed == Assumed::Planned, room, 3)
}

fn colour(assumed: Assumed) -> RGBColor {
    match assumed {
        Assumed::Planned => ACCENT,
        Assumed::Low | Assumed::High => BESIDE,
    }
}

/// Long dashes for the low spread, short ones for the high one.
fn dash(assumed: Assumed) -> &'static str {
    match assumed {
        Assumed::Planned => " fill=\"none\" stroke-linejoin=\"round\" stroke-linecap=\"round\"",
        Assumed::Low => " fill=\"none\" stroke-linejoin=\"round\" stroke-dasharray=\"130 50\"",
        Assumed::High => " fill=\"none\" stroke-linejoin=\"round\" stroke-dasharray=\"40 45\"",
    }
}

/// The points of a curve inside the axes, without those too near to be told apart.
fn thin(frame: &Frame, points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let inside = |(x, y): &(f64, f64)| *x >= frame.x.0 && *x <= frame.x.1 && y.is_finite();
    let mut out: Vec<(f64, f64)> = Vec::new();
    let mut last = None;
    for (x, y) in points.iter().filter(|point| inside(point)) {
        let point = (*x, y.max(frame.y.0).min(frame.y.1));
        let place = frame.point(point);
        let near = |(px, py): (f64, f64)| (place.0 - px).abs() < 0.8 && (place.1 - py).abs() < 0.8;
        if !last.is_some_and(near) {
            out.push(point);
            last = Some(place);
        }
    }
    out
}

fn draw_band(
    canvas: &mut Canvas,
    frame: &Frame,
    data: &PowerCurve,
    curves: &[Vec<(f64, f64)>],
) -> Result<(), FigureError> {
    let find = |assumed: Assumed| {
        data.curves.iter().zip(curves).find(|(curve, _)| curve.assumed == assumed).map(|(_, p)| p)
    };
    let (Some(low), Some(high)) = (find(Assumed::Low), find(Assumed::High)) else {
        return Ok(());
    };
    let outline: Vec<(f64, f64)> = low.iter().chain(high.iter().rev()).copied().collect();
    canvas.layer(frame, "", |area| area.draw(&Polygon::new(outline, BAND.filled())))
}

fn draw_rules(canvas: &mut Canvas, frame: &Frame, data: &PowerCurve) -> Result<(), FigureError> {
    let target = rule((frame.x.0, data.target.at), (frame.x.1, data.target.at), GREY, 10);
    canvas.layer(frame, " stroke-dasharray=\"15 30\"", |area| area.draw(&target))?;
    let chosen = rule((data.chosen.x, frame.y.0), (data.chosen.x, data.chosen.y), ACCENT, 10);
    canvas.layer(frame, "", |area| area.draw(&chosen))?;
    if let Some(ceiling) = &data.ceiling {
        let line = rule((ceiling.at, frame.y.0), (ceiling.at, frame.y.1), WARM, 16);
        canvas.layer(frame, CEILING_DASH, |area| area.draw(&line))?;
    }
    Ok(())
}

/// The planned curve last, so that it lies on top.
fn draw_curves(
    canvas: &mut Canvas,
    frame: &Frame,
    data: &PowerCurve,
    curves: &[Vec<(f64, f64)>],
) -> Result<(), FigureError> {
    for planned in [false, true] {
        for (curve, points) in data.curves.iter().zip(curves) {
            if (curve.assumed == Assumed::Planned) != planned {
                continue;
            }
            let width = if planned { 24 } else { 15 };
            let line = PathElement::new(points.clone(), colour(curve.assumed).stroke_width(width));
            canvas.layer(frame, dash(curve.assumed), |area| area.draw(&line))?;
        }
    }
    let at = (data.chosen.x, data.chosen.y);
    canvas.layer(frame, "", |area| {
        area.draw(&Circle::new(at, 70, PAPER.filled()))?;
        area.draw(&Circle::new(at, 48, ACCENT.filled()))
    })
}

/// The labels at the ends of the curves, from the highest end to the lowest and none on another.
fn ends(
    data: &PowerCurve,
    blocks: Vec<Block>,
    curves: &[Vec<(f64, f64)>],
    frame: &Frame,
) -> Vec<End> {
    let mut ends: Vec<(f64, End)> = Vec::new();
    for ((curve, block), points) in data.curves.iter().zip(blocks).zip(curves) {
        let Some(last) = points.last() else { continue };
        let (x, y) = frame.point(*last);
        // Of curves that end together the one that lies higher before is named first.
        let mean = points.iter().map(|(_, y)| y).sum::<f64>() / points.len() as f64;
        let order = y * 1e3 - mean;
        let end = End { block, colour: colour(curve.assumed), at: (x, y), top: 0.0 };
        ends.push((order, end));
    }
    ends.sort_by(|(a, _), (b, _)| a.total_cmp(b));
    let wanted: Vec<(f64, f64)> =
        ends.iter().map(|(_, end)| (end.at.1, end.block.height())).collect();
    let tops = spread(&wanted, 7.0, (frame.top - 8.0, frame.bottom));
    ends.into_iter().zip(tops).map(|((_, end), top)| End { top, ..end }).collect()
}

fn draw_ends(canvas: &mut Canvas, ends: Vec<End>) {
    let left =
        ends.iter().map(|end| WIDTH - EDGE - end.block.width()).fold(f64::INFINITY, f64::min);
    for end in ends {
        let middle = end.top + end.block.height() / 2.0 - end.block.size * 0.05;
        let from = (end.at.0 + 4.0, end.at.1);
        canvas.leader(from, (left - 5.0, middle), end.colour);
        let ink = if end.block.semibold { end.colour } else { INK };
        canvas.text(&end.block, (left, end.top), Align::Left, ink);
    }
}

/// What labels among the curves keep clear of.
fn obstacles(axes: &Axes, data: &PowerCurve, curves: &[Vec<(f64, f64)>]) -> Obstacles {
    let frame = axes.frame;
    let mut obstacles = Obstacles::new(axes.room());
    axes.rules().for_each(|[from, to]| obstacles.yielding(from, to));
    for points in curves {
        obstacles.line(points.iter().map(|point| frame.point(*point)).collect(), 1.0);
    }
    let (x, y) = frame.point((data.chosen.x, data.chosen.y));
    obstacles.line(vec![(x, frame.bottom), (x, y)], 1.0);
    obstacles.mark(Rect::new(x - 7.0, y - 7.0, 14.0, 14.0));
    let level = frame.py(data.target.at);
    obstacles.line(vec![(frame.left, level), (frame.right, level)], 0.6);
    if let Some(ceiling) = &data.ceiling {
        let limit = frame.px(ceiling.at);
        obstacles.line(vec![(limit, frame.top), (limit, frame.bottom)], 1.0);
    }
    obstacles
}

/// Labels among the curves: the choice first, then the ceiling, then the target.
fn place_labels(axes: &Axes, data: &PowerCurve, curves: &[Vec<(f64, f64)>]) -> Vec<Placed> {
    let frame = axes.frame;
    let mut obstacles = obstacles(axes, data, curves);
    let at = frame.point((data.chosen.x, data.chosen.y));
    let by_choice = |block: Block| {
        let mut places = around(at, &block);
        places.extend(beside(at.0, (at.1 + 20.0, frame.bottom), &block, FOOT));
        (block, places)
    };
    let settings = Block::settings(&data.chosen.label, LABEL, true, INSIDE_ROOM, 3);
    let settings = settings.into_iter().map(by_choice).collect();
    let mut labels = vec![Placed::find(&mut obstacles, settings, ACCENT)];
    if let Some(ceiling) = &data.ceiling {
        let by_ceiling = |block: Block| {
            let places = beside(frame.px(ceiling.at), (frame.top, frame.bottom), &block, 0.0);
            (block, places)
        };
        let settings = Block::settings(&ceiling.label, LABEL, false, INSIDE_ROOM, 3);
        let settings = settings.into_iter().map(by_ceiling).collect();
        labels.push(Placed::find(&mut obstacles, settings, WARM));
    }
    let block = Block::new(&data.target.label, LABEL, false, 1.5 * INSIDE_ROOM, 1);
    let places = along(frame.py(data.target.at), &frame, &block);
    labels.push(Placed::find(&mut obstacles, vec![(block, places)], GREY));
    labels.into_iter().flatten().collect()
}

/// Places beside an upright line, upper ones first; `dislike` holds for all.
fn beside(line: f64, (top, bottom): (f64, f64), block: &Block, dislike: f64) -> Vec<Place> {
    let (width, height) = (block.width(), block.height());
    let mut places = Vec::new();
    for step in 0..24 {
        let top = top + f64::from(step) * (bottom - top - height) / 24.0;
        for left in [line + 8.0, line - 8.0 - width] {
            let rect = Rect::new(left, top, width, height);
            places.push(Place { rect, dislike: dislike + f64::from(step), point: None });
        }
    }
    places
}

/// Places above and below a level line, from its left end to its right end.
fn along(line: f64, frame: &Frame, block: &Block) -> Vec<Place> {
    let (width, height) = (block.width(), block.height());
    let mut places = Vec::new();
    for step in 0..40 {
        let left = frame.left + 6.0 + f64::from(step) * (frame.right - frame.left - width) / 40.0;
        for (order, top) in [line - 7.0 - height, line + 7.0].into_iter().enumerate() {
            let rect = Rect::new(left, top, width, height);
            let dislike = f64::from(step) + 0.5 * order as f64;
            places.push(Place { rect, dislike, point: None });
        }
    }
    places
}
