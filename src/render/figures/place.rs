//! Finding room for labels.

/// A rectangle on the canvas.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Rect {
    pub(super) left: f64,
    pub(super) top: f64,
    pub(super) right: f64,
    pub(super) bottom: f64,
}

impl Rect {
    pub(super) fn new(left: f64, top: f64, width: f64, height: f64) -> Self {
        Self { left, top, right: left + width, bottom: top + height }
    }

    pub(super) fn grown(self, by: f64) -> Self {
        Self {
            left: self.left - by,
            top: self.top - by,
            right: self.right + by,
            bottom: self.bottom + by,
        }
    }

    pub(super) fn overlap(self, other: Self) -> f64 {
        let width = self.right.min(other.right) - self.left.max(other.left);
        let height = self.bottom.min(other.bottom) - self.top.max(other.top);
        if width > 0.0 && height > 0.0 { width * height } else { 0.0 }
    }

    pub(super) fn within(self, other: Self) -> bool {
        self.left >= other.left
            && self.right <= other.right
            && self.top >= other.top
            && self.bottom <= other.bottom
    }

    /// The part of a segment inside the rectangle, as fractions of its length (Liang and Barsky 1984).
    pub(super) fn span(self, (x0, y0): (f64, f64), (x1, y1): (f64, f64)) -> Option<(f64, f64)> {
        let (dx, dy) = (x1 - x0, y1 - y0);
        let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
        let sides = [
            (-dx, x0 - self.left),
            (dx, self.right - x0),
            (-dy, y0 - self.top),
            (dy, self.bottom - y0),
        ];
        for (slope, room) in sides {
            if slope == 0.0 {
                if room < 0.0 {
                    return None;
                }
            } else if slope < 0.0 {
                enter = enter.max(room / slope);
            } else {
                leave = leave.min(room / slope);
            }
        }
        (enter < leave).then_some((enter, leave))
    }

    /// Length of the part of a segment inside the rectangle.
    pub(super) fn crossed(self, from: (f64, f64), to: (f64, f64)) -> f64 {
        let (dx, dy) = (to.0 - from.0, to.1 - from.1);
        let length = (dx * dx + dy * dy).sqrt();
        self.span(from, to).map_or(0.0, |(enter, leave)| (leave - enter) * length)
    }

    /// Length of the part of a line inside the rectangle.
    pub(super) fn length_of(self, points: &[(f64, f64)]) -> f64 {
        points.iter().zip(points.iter().skip(1)).map(|(a, b)| self.crossed(*a, *b)).sum()
    }
}

/// What labels should keep clear of.
pub(super) struct Obstacles {
    room: Rect,
    taken: Vec<Rect>,
    marks: Vec<Rect>,
    lines: Vec<(Vec<(f64, f64)>, f64)>,
    yielding: Vec<[(f64, f64); 2]>,
}

/// A place for a label and what is wrong with it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Spot {
    pub(super) rect: Rect,
    /// Whether something lies below a label here.
    pub(super) covers: bool,
    /// The worse the place, the higher.
    pub(super) cost: f64,
}

/// Overlapping another label counts this much more than crossing a line.
const LABEL_WEIGHT: f64 = 8.0;
/// As much as a unit of covered line counts against a unit of distance.
const COVER_WEIGHT: f64 = 10.0;
/// What a unit of a line that yields to labels counts.
const YIELDING_WEIGHT: f64 = 1.0;
/// What a line crossed by a leader counts, and a label.
const CROSSING: (f64, f64) = (14.0, 400.0);

impl Obstacles {
    /// Space kept free between a label and a line.
    pub(super) const AIR: f64 = 3.0;
    /// A line this near to a label counts as below it.
    const TOUCH: f64 = 1.0;
    /// Space kept free between two labels.
    const APART: f64 = 8.0;

    pub(super) fn new(room: Rect) -> Self {
        Self { room, taken: Vec::new(), marks: Vec::new(), lines: Vec::new(), yielding: Vec::new() }
    }

    /// A line that is left open where a label stands; labels had rather stand elsewhere.
    pub(super) fn yielding(&mut self, from: (f64, f64), to: (f64, f64)) {
        self.yielding.push([from, to]);
    }

    /// A line on the canvas; a heavy one is crossed less gladly.
    pub(super) fn line(&mut self, points: Vec<(f64, f64)>, weight: f64) {
        self.lines.push((points, weight));
    }

    /// A mark that must not be covered, such as a point.
    pub(super) fn mark(&mut self, rect: Rect) {
        self.marks.push(rect);
    }

    /// The place of a label.
    pub(super) fn take(&mut self, rect: Rect) {
        self.taken.push(rect);
    }

    /// What a label at this place would cover.
    pub(super) fn covers(&self, rect: Rect) -> f64 {
        let clear = rect.grown(Self::AIR);
        let apart = rect.grown(Self::APART);
        let labels: f64 = self.taken.iter().map(|other| apart.overlap(*other)).sum::<f64>()
            + self.marks.iter().map(|mark| clear.overlap(*mark)).sum::<f64>();
        let lines: f64 =
            self.lines.iter().map(|(points, weight)| weight * clear.length_of(points)).sum();
        labels * LABEL_WEIGHT + lines
    }

    /// A place, moved to the nearest edge of the room if it lies outside, and what speaks against it.
    pub(super) fn weigh(&self, rect: Rect) -> Spot {
        let inside = self.moved_inside(rect);
        let shift = (inside.left - rect.left).abs() + (inside.top - rect.top).abs();
        let clear = inside.grown(Self::AIR);
        let opened: f64 = self.yielding.iter().map(|line| clear.length_of(line)).sum();
        let close = inside.grown(Self::TOUCH);
        let covers = self.lines.iter().any(|(points, _)| close.length_of(points) > 0.0)
            || self.marks.iter().chain(&self.taken).any(|other| close.overlap(*other) > 0.0);
        let cost = COVER_WEIGHT * self.covers(inside) + YIELDING_WEIGHT * opened + shift;
        Spot { rect: inside, covers, cost }
    }

    /// What speaks against a leader.
    pub(super) fn weigh_leader(&self, from: (f64, f64), to: (f64, f64)) -> f64 {
        let segments = self.lines.iter().flat_map(|(line, _)| line.iter().zip(line.iter().skip(1)));
        let lines = segments.filter(|(a, b)| cross((from, to), (**a, **b))).count() as f64;
        let labels = self.taken.iter().filter(|rect| rect.span(from, to).is_some()).count() as f64;
        let marks: f64 = self.marks.iter().map(|rect| rect.crossed(from, to)).sum();
        CROSSING.0 * lines + CROSSING.1 * labels + marks
    }

    fn moved_inside(&self, rect: Rect) -> Rect {
        if rect.within(self.room) {
            return rect;
        }
        let (width, height) = (rect.right - rect.left, rect.bottom - rect.top);
        let left = rect.left.min(self.room.right - width).max(self.room.left);
        let top = rect.top.min(self.room.bottom - height).max(self.room.top);
        Rect::new(left, top, width, height)
    }
}

/// Whether two segments cross.
fn cross((a, b): ((f64, f64), (f64, f64)), (c, d): ((f64, f64), (f64, f64))) -> bool {
    let side = |(x0, y0): (f64, f64), (x1, y1): (f64, f64), (x, y): (f64, f64)| {
        (x1 - x0) * (y - y0) - (y1 - y0) * (x - x0)
    };
    (side(a, b, c) > 0.0) != (side(a, b, d) > 0.0) && (side(c, d, a) > 0.0) != (side(c, d, b) > 0.0)
}

/// Moves blocks of the given heights that want to be centred at the given heights apart, in their order, inside
/// `range`; returns their tops. Blocks that are too many for the range are packed from its top.
pub(super) fn spread(wanted: &[(f64, f64)], gap: f64, range: (f64, f64)) -> Vec<f64> {
    let mut tops: Vec<f64> = Vec::with_capacity(wanted.len());
    let mut floor = range.0;
    for (centre, height) in wanted {
        let top = (centre - height / 2.0).max(floor);
        tops.push(top);
        floor = top + height + gap;
    }
    let mut ceiling = range.1;
    for (top, (_, height)) in tops.iter_mut().zip(wanted).rev() {
        *top = top.min(ceiling - height);
        ceiling = *top - gap;
    }
    let mut floor = range.0;
    for (top, (_, height)) in tops.iter_mut().zip(wanted) {
        *top = top.max(floor);
        floor = *top + height + gap;
    }
    tops
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_length_of_a_crossing_is_that_inside() {
        let rect = Rect::new(0.0, 0.0, 10.0, 10.0);
        assert!((rect.crossed((-5.0, 5.0), (15.0, 5.0)) - 10.0).abs() < 1e-12);
        assert!((rect.crossed((2.0, 2.0), (5.0, 6.0)) - 5.0).abs() < 1e-12);
        assert_eq!(rect.crossed((-5.0, 12.0), (15.0, 12.0)), 0.0);
        assert_eq!(rect.crossed((12.0, -1.0), (12.0, 20.0)), 0.0);
    }

    #[test]
    fn spread_blocks_keep_their_order_and_do_not_touch() {
        let wanted = [(50.0, 20.0), (52.0, 20.0), (54.0, 20.0)];
        let tops = spread(&wanted, 4.0, (0.0, 100.0));
        assert_eq!(tops, [32.0, 56.0, 80.0].map(|top: f64| top.min(80.0)));
        let crowded = spread(&[(5.0, 20.0), (5.0, 20.0)], 4.0, (0.0, 100.0));
        assert_eq!(crowded, [0.0, 24.0]);
    }

    #[test]
    fn a_label_avoids_lines_and_labels_and_stays_inside() {
        let mut obstacles = Obstacles::new(Rect::new(0.0, 0.0, 100.0, 100.0));
        obstacles.take(Rect::new(0.0, 0.0, 50.0, 50.0));
        obstacles.line(vec![(60.0, 0.0), (60.0, 100.0)], 1.0);
        obstacles.yielding((0.0, 90.0), (100.0, 90.0));
        let spot = |x, y| obstacles.weigh(Rect::new(x, y, 20.0, 10.0));
        assert!(!spot(10.0, 70.0).covers && spot(10.0, 70.0).cost == 0.0);
        assert!(spot(10.0, 10.0).covers && spot(10.0, 10.0).cost > spot(55.0, 60.0).cost);
        assert!(spot(55.0, 60.0).covers);
        // Near the line, not on it.
        assert!(!spot(38.0, 60.0).covers && spot(38.0, 60.0).cost > 0.0);
        assert!(!spot(10.0, 85.0).covers && spot(10.0, 85.0).cost > 0.0);
        assert_eq!(spot(95.0, 95.0).rect, Rect::new(80.0, 90.0, 20.0, 10.0));
    }

    #[test]
    fn a_leader_is_weighed_by_what_it_crosses() {
        let mut obstacles = Obstacles::new(Rect::new(0.0, 0.0, 100.0, 100.0));
        obstacles.line(vec![(60.0, 0.0), (60.0, 50.0), (70.0, 100.0)], 1.0);
        obstacles.take(Rect::new(10.0, 10.0, 20.0, 20.0));
        assert_eq!(obstacles.weigh_leader((40.0, 20.0), (55.0, 20.0)), 0.0);
        assert_eq!(obstacles.weigh_leader((40.0, 20.0), (65.0, 20.0)), CROSSING.0);
        assert_eq!(obstacles.weigh_leader((5.0, 20.0), (50.0, 20.0)), CROSSING.1);
    }
}
