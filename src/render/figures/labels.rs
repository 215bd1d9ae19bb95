//! Labels inside a figure.

use plotters::style::RGBColor;

use super::canvas::{Align, Canvas};
use super::place::{Obstacles, Rect};
use super::text::Block;

/// A label that has found its place.
pub(super) struct Placed {
    block: Block,
    colour: RGBColor,
    rect: Rect,
    /// Whether something lies below it.
    covers: bool,
    leader: Option<((f64, f64), (f64, f64))>,
}

/// Distance from which a label is tied to its point by a leader.
const NEAR: f64 = 16.0;
/// Space between a leader and its point, and its label.
const GAP: (f64, f64) = (8.0, 2.0);

impl Placed {
    /// Finds the best of the places and takes it; `point` is what the label names, if it is one point.
    pub(super) fn find(
        obstacles: &mut Obstacles,
        block: Block,
        places: Vec<(Rect, f64)>,
        colour: RGBColor,
        point: Option<(f64, f64)>,
    ) -> Option<Self> {
        if block.lines.is_empty() {
            return None;
        }
        let spot = obstacles.best(places.into_iter())?;
        obstacles.take(spot.rect);
        let leader = point.and_then(|point| leader(point, spot.rect));
        if let Some((from, to)) = leader {
            obstacles.line(vec![from, to], 1.0);
        }
        Some(Self { block, colour, rect: spot.rect, covers: spot.covers > 0.0, leader })
    }

    /// The room that the text takes.
    pub(super) fn rect(&self) -> Rect {
        self.rect
    }

    /// Draws text and leader on whatever is there.
    pub(super) fn draw(&self, canvas: &mut Canvas) {
        if let Some((from, to)) = self.leader {
            canvas.leader(from, to, self.colour);
        }
        canvas.text(&self.block, (self.rect.left, self.rect.top), Align::Left, self.colour);
    }

    /// As [`draw`](Self::draw), with a veil below text that lies on something.
    pub(super) fn draw_veiled(&self, canvas: &mut Canvas) {
        if self.covers {
            canvas.veil(self.rect.grown(3.0));
        }
        self.draw(canvas);
    }
}

/// From the point to the nearest spot of the label, if that is not near.
fn leader((x, y): (f64, f64), rect: Rect) -> Option<((f64, f64), (f64, f64))> {
    let near = (x.max(rect.left).min(rect.right), y.max(rect.top).min(rect.bottom));
    let (dx, dy) = (near.0 - x, near.1 - y);
    let distance = (dx * dx + dy * dy).sqrt();
    if distance <= NEAR {
        return None;
    }
    let (across, down) = (dx / distance, dy / distance);
    let from = (x + across * GAP.0, y + down * GAP.0);
    let to = (near.0 - across * GAP.1, near.1 - down * GAP.1);
    Some((from, to))
}

/// Places around a point, near ones and those to the lower right first.
pub(super) fn around((x, y): (f64, f64), block: &Block) -> Vec<(Rect, f64)> {
    let (width, height) = (block.width(), block.height());
    let mut places = Vec::new();
    for distance in [12.0, 22.0, 36.0, 54.0, 76.0, 102.0, 132.0] {
        let sides = [
            (x + distance, y + distance * 0.7),
            (x + distance, y - height / 2.0),
            (x - width - distance, y - height - distance * 0.7),
            (x - width - distance, y - height / 2.0),
            (x + distance, y - height - distance * 0.7),
            (x - width - distance, y + distance * 0.7),
            (x - width / 2.0, y - height - distance),
            (x - width / 2.0, y + distance),
        ];
        for (order, (left, top)) in sides.into_iter().enumerate() {
            places.push((Rect::new(left, top, width, height), distance + order as f64));
        }
    }
    places
}
