//! Which values of a count reject: walked from both ends of its range inward, as far as the level allows.

use super::exact::CLOSE;
use std::cmp::Ordering;

/// Probabilities below this share of the level are added to the rejected ends without being looked at.
const NEGLIGIBLE: f64 = 1e-18;

/// The values that reject: `x < below` or `x >= from`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Ends {
    pub(super) below: u64,
    pub(super) from: u64,
}

impl Ends {
    pub(super) fn contain(self, x: u64) -> bool {
        x < self.below || x >= self.from
    }
}

/// Which values count as extreme.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Extreme {
    /// Large ones: `P(X >= x)` against the level.
    Large,
    /// Small ones: `P(X <= x)` against the level.
    Small,
    /// Improbable ones: the sum of all probabilities not above that of `x` against the level.
    Improbable,
}

/// A count with a unimodal distribution whose probabilities can also be compared in whole numbers.
pub(super) trait Ladder {
    /// The smallest possible value.
    fn lowest(&self) -> u64;
    /// The largest possible value.
    fn highest(&self) -> u64;
    /// A value of largest probability.
    fn mode(&self) -> u64;
    /// Probability of `x + 1` over that of `x`.
    fn ratio_up(&self, x: u64) -> f64;
    /// Whether the two comparisons below are to be had; else rounding decides.
    fn exact(&self) -> bool;
    /// Exact order of two probabilities.
    fn compare(&self, x: u64, y: u64) -> Ordering;
    /// Exact order of the probability of the ends and the level.
    fn compare_with_level(&self, ends: Ends) -> Ordering;
}

/// Probabilities of a ladder relative to that of its mode, as far out as they count.
#[derive(Default)]
pub(super) struct Weights {
    start: u64,
    values: Vec<f64>,
    total: f64,
}

impl Weights {
    /// Fills the buffer anew.
    pub(super) fn fill(&mut self, ladder: &impl Ladder, alpha: f64) {
        let smallest = (NEGLIGIBLE * alpha).max(f64::MIN_POSITIVE);
        self.values.clear();
        let mode = ladder.mode();
        let mut x = mode;
        let mut weight = 1.0;
        self.values.push(weight);
        while x > ladder.lowest() && weight > smallest {
            weight /= ladder.ratio_up(x - 1);
            x -= 1;
            self.values.push(weight);
        }
        self.start = x;
        self.values.reverse();
        x = mode;
        weight = 1.0;
        while x < ladder.highest() && weight > smallest {
            weight *= ladder.ratio_up(x);
            x += 1;
            self.values.push(weight);
        }
        self.total = self.values.iter().sum();
    }

    fn at(&self, x: u64) -> f64 {
        self.values.get(x.wrapping_sub(self.start) as usize).copied().unwrap_or(0.0)
    }

    /// Nothing that counts rejects yet.
    fn outermost(&self, extreme: Extreme) -> Ends {
        let after = self.start + self.values.len() as u64;
        match extreme {
            Extreme::Large => Ends { below: 0, from: after },
            Extreme::Small => Ends { below: self.start, from: u64::MAX },
            Extreme::Improbable => Ends { below: self.start, from: after },
        }
    }

    /// The next wider ends with the probability they add; `None` when everything is inside already.
    fn widen(&self, ladder: &impl Ladder, extreme: Extreme, ends: Ends) -> Option<(Ends, f64)> {
        let after = self.start + self.values.len() as u64;
        let left = ends.below.max(self.start);
        let right = ends.from.min(after).checked_sub(1)?;
        if left > right || right < self.start {
            return None;
        }
        let from_left = Ends { below: left + 1, ..ends };
        let from_right = Ends { from: right, ..ends };
        let (at_left, at_right) = (self.at(left), self.at(right));
        Some(match extreme {
            Extreme::Large => (from_right, at_right),
            Extreme::Small => (from_left, at_left),
            Extreme::Improbable => match self.order(ladder, left, right) {
                Ordering::Less => (from_left, at_left),
                Ordering::Greater => (from_right, at_right),
                Ordering::Equal if left == right => (from_left, at_left),
                Ordering::Equal => {
                    let both = Ends { below: left + 1, from: right };
                    (both, at_left + at_right)
                }
            },
        })
    }

    fn order(&self, ladder: &impl Ladder, x: u64, y: u64) -> Ordering {
        let (at_x, at_y) = (self.at(x), self.at(y));
        if x == y {
            return Ordering::Equal;
        }
        if !ladder.exact() || (at_x - at_y).abs() > CLOSE * at_y {
            return at_x.total_cmp(&at_y);
        }
        ladder.compare(x, y)
    }

    /// The widest ends whose probability is at most `alpha`; whole numbers decide where rounding could.
    pub(super) fn rejecting(&self, ladder: &impl Ladder, extreme: Extreme, alpha: f64) -> Ends {
        let bound = alpha * self.total;
        let mut ends = self.outermost(extreme);
        let mut sum = 0.0;
        while let Some((wider, added)) = self.widen(ladder, extreme, ends) {
            sum += added;
            let within = if ladder.exact() && (sum - bound).abs() <= CLOSE * bound {
                ladder.compare_with_level(wider) != Ordering::Greater
            } else {
                sum <= bound
            };
            if !within {
                break;
            }
            ends = wider;
        }
        ends
    }

    /// Every value with the ends that are as extreme as it, and their probability: its p-value.
    pub(super) fn p_values(&self, ladder: &impl Ladder, extreme: Extreme) -> Vec<(u64, Ends, f64)> {
        let mut values = Vec::with_capacity(self.values.len());
        let mut ends = self.outermost(extreme);
        let mut sum = 0.0;
        while let Some((wider, added)) = self.widen(ladder, extreme, ends) {
            sum += added;
            let p = sum / self.total;
            let from_left = ends.below.max(self.start)..wider.below;
            let from_right = wider.from..ends.from.min(self.start + self.values.len() as u64);
            for x in from_left {
                values.push((x, wider, p));
            }
            for x in from_right {
                if x >= wider.below {
                    values.push((x, wider, p));
                }
            }
            ends = wider;
        }
        values
    }

    /// Probability of a value.
    pub(super) fn probability(&self, x: u64) -> f64 {
        self.at(x) / self.total
    }
}
