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
/// What a further line of a label counts against a unit of distance.
const FURTHER: f64 = 8.0;

/// Where a label might stand.
pub(super) struct Place {
    pub(super) rect: Rect,
    /// What speaks against it beside all that it covers.
    pub(super) dislike: f64,
    /// The point to which a leader ties the label, unless that is near or the label lies along what it names.
    pub(super) point: Option<(f64, f64)>,
}

impl Placed {
    /// Finds the best of the places, of all the ways to set the text, and takes it.
    pub(super) fn find(
        obstacles: &mut Obstacles,
        settings: Vec<(Block, Vec<Place>)>,
        colour: RGBColor,
    ) -> Option<Self> {
        let mut best: Option<(f64, Self)> = None;
        for (block, places) in settings {
            if block.lines.is_empty() {
                continue;
            }
            for place in places {
                let spot = obstacles.weigh(place.rect);
                let leader = place.point.and_then(|point| leader(point, spot.rect));
                let tie = leader.map_or(0.0, |(from, to)| obstacles.weigh_leader(from, to));
                let further = FURTHER * (block.lines.len() - 1) as f64;
                let cost = spot.cost + place.dislike + tie + further;
                if best.as_ref().is_none_or(|(least, _)| cost < *least) {
                    let (rect, covers) = (spot.rect, spot.covers);
                    best =
                        Some((cost, Self { block: block.clone(), colour, rect, covers, leader }));
                }
            }
        }
        let (_, found) = best?;
        obstacles.take(found.rect);
        if let Some((from, to)) = found.leader {
            obstacles.line(vec![from, to], 1.0);
        }
        Some(found)
    }

    /// The room that the text takes.
    pub(super) fn rect(&self) -> Rect {
        self.rect
    }

    /// Draws text and leader, on a plate of paper if the text lies on something.
    pub(super) fn draw(&self, canvas: &mut Canvas) {
        if self.covers {
            canvas.plate(self.rect.grown(3.0));
        }
        if let Some((from, to)) = self.leader {
            canvas.leader(from, to, self.colour);
        }
        canvas.text(&self.block, (self.rect.left, self.rect.top), Align::Left, self.colour);
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
pub(super) fn around((x, y): (f64, f64), block: &Block) -> Vec<Place> {
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
            (x + distance * 2.0, y + distance * 0.7),
            (x - width - distance * 2.0, y - height - distance * 0.7),
            (x + distance * 2.0, y - height - distance * 0.7),
            (x - width - distance * 2.0, y + distance * 0.7),
        ];
        for (order, (left, top)) in sides.into_iter().enumerate() {
            let rect = Rect::new(left, top, width, height);
            places.push(Place { rect, dislike: distance + order as f64, point: Some((x, y)) });
        }
    }
    places
}
