//! Lines and areas cut to a rectangle.

use super::place::Rect;

type Point = (f64, f64);

/// The parts of a line inside the rectangle.
pub(super) fn line_inside(points: &[Point], rect: Rect) -> Vec<Vec<Point>> {
    let mut pieces: Vec<Vec<Point>> = Vec::new();
    for (from, to) in points.iter().zip(points.iter().skip(1)) {
        if let Some((enter, leave)) = rect.span(*from, *to) {
            append(&mut pieces, between(*from, *to, enter), between(*from, *to, leave));
        }
    }
    pieces
}

/// The parts of lines outside the rectangle.
fn lines_outside(lines: &[Vec<Point>], rect: Rect) -> Vec<Vec<Point>> {
    let mut pieces: Vec<Vec<Point>> = Vec::new();
    for line in lines {
        for (from, to) in line.iter().zip(line.iter().skip(1)) {
            let (enter, leave) = rect.span(*from, *to).unwrap_or((1.0, 1.0));
            if enter > 0.0 {
                append(&mut pieces, *from, between(*from, *to, enter));
            }
            if leave < 1.0 {
                append(&mut pieces, between(*from, *to, leave), *to);
            }
        }
    }
    pieces
}

/// Space between a label and the ends of a line that it interrupts.
const GAP: f64 = 3.5;
/// A line that passes a label at this distance or farther is not interrupted.
const TOUCH: f64 = 1.5;
/// Shortest piece of an interrupted line.
const STUB: f64 = 8.0;

/// Lines interrupted by labels, without the stubs that are left between two of them.
pub(super) fn opened(lines: Vec<Vec<Point>>, labels: &[Rect]) -> Vec<Vec<Point>> {
    let mut pieces = lines;
    for label in labels {
        let close = label.grown(TOUCH);
        let (hit, clear): (Vec<_>, Vec<_>) =
            pieces.into_iter().partition(|piece| close.length_of(piece) > 0.0);
        let cut = lines_outside(&hit, label.grown(GAP));
        pieces = clear;
        pieces.extend(cut.into_iter().filter(|piece| length(piece) >= STUB));
    }
    pieces
}

fn length(points: &[Point]) -> f64 {
    let steps = points.iter().zip(points.iter().skip(1));
    steps.map(|((x0, y0), (x1, y1))| ((x1 - x0) * (x1 - x0) + (y1 - y0) * (y1 - y0)).sqrt()).sum()
}

/// Joins a segment to the last piece if it goes on from its end.
fn append(pieces: &mut Vec<Vec<Point>>, from: Point, to: Point) {
    match pieces.last_mut() {
        Some(piece) if piece.last() == Some(&from) => piece.push(to),
        _ => pieces.push(vec![from, to]),
    }
}

fn between((x0, y0): Point, (x1, y1): Point, part: f64) -> Point {
    if part <= 0.0 {
        (x0, y0)
    } else if part >= 1.0 {
        (x1, y1)
    } else {
        (x0 + part * (x1 - x0), y0 + part * (y1 - y0))
    }
}

/// The part of an area inside the rectangle (Sutherland and Hodgman 1974).
pub(super) fn area_inside(outline: &[Point], rect: Rect) -> Vec<Point> {
    // Signed distance from each side, positive inside.
    let sides: [&dyn Fn(Point) -> f64; 4] =
        [&|(x, _)| x - rect.left, &|(x, _)| rect.right - x, &|(_, y)| y - rect.top, &|(_, y)| {
            rect.bottom - y
        }];
    let mut outline = outline.to_vec();
    for inside in sides {
        let mut kept = Vec::with_capacity(outline.len() + 4);
        let mut previous = outline.last().copied();
        for point in &outline {
            let Some(before) = previous.replace(*point) else { continue };
            let (a, b) = (inside(before), inside(*point));
            if (a < 0.0) != (b < 0.0) {
                kept.push(between(before, *point, a / (a - b)));
            }
            if b >= 0.0 {
                kept.push(*point);
            }
        }
        outline = kept;
    }
    outline
}

#[cfg(test)]
mod tests {
    use super::*;

    const SQUARE: Rect = Rect { left: 0.0, top: 0.0, right: 10.0, bottom: 10.0 };

    #[test]
    fn a_line_is_cut_where_it_leaves_and_joined_where_it_goes_on() {
        let line = [(-5.0, 5.0), (5.0, 5.0), (5.0, 15.0), (8.0, 15.0), (8.0, 5.0)];
        let inside = line_inside(&line, SQUARE);
        assert_eq!(
            inside,
            [vec![(0.0, 5.0), (5.0, 5.0), (5.0, 10.0)], vec![(8.0, 10.0), (8.0, 5.0)]]
        );
        let outside = lines_outside(&[line.to_vec()], SQUARE);
        assert_eq!(
            outside,
            [
                vec![(-5.0, 5.0), (0.0, 5.0)],
                vec![(5.0, 10.0), (5.0, 15.0), (8.0, 15.0), (8.0, 10.0)]
            ]
        );
    }

    #[test]
    fn an_interrupted_line_leaves_no_stubs() {
        let line = vec![vec![(0.0, 5.0), (100.0, 5.0)]];
        let labels = [Rect::new(20.0, 0.0, 10.0, 10.0), Rect::new(42.0, 0.0, 10.0, 10.0)];
        let pieces = opened(line.clone(), &labels);
        assert_eq!(pieces, [vec![(0.0, 5.0), (16.5, 5.0)], vec![(55.5, 5.0), (100.0, 5.0)]]);
        assert_eq!(opened(line.clone(), &[Rect::new(20.0, 7.0, 10.0, 10.0)]), line);
        assert_eq!(opened(line, &[Rect::new(20.0, 6.0, 10.0, 10.0)]).len(), 2);
    }

    #[test]
    fn an_area_is_cut_to_the_rectangle() {
        let triangle = [(5.0, 5.0), (25.0, 5.0), (5.0, 25.0)];
        let inside = area_inside(&triangle, SQUARE);
        let area: f64 = inside
            .iter()
            .zip(inside.iter().cycle().skip(1))
            .map(|((x0, y0), (x1, y1))| (x0 * y1 - x1 * y0) / 2.0)
            .sum();
        assert!((area.abs() - 25.0).abs() < 1e-9, "{area} {inside:?}");
        assert!(area_inside(&[(20.0, 20.0), (30.0, 20.0), (30.0, 30.0)], SQUARE).is_empty());
    }
}
