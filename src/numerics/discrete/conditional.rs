//! Fisher's conditional test of two proportions, one margin at a time.

use super::ends::{Ends, Extreme, Ladder, Weights};
use super::exact::{Decimal, LARGEST_EXACT, Natural, choose, compare_share};
use std::cmp::Ordering;

/// Group sizes and the successes of both together: the distribution of the successes in the first group.
#[derive(Clone, Copy)]
pub(super) struct Margin {
    pub(super) first: u64,
    pub(super) second: u64,
    pub(super) successes: u64,
    pub(super) level: Decimal,
}

impl Margin {
    /// `C(n₁, x) C(n₂, m - x)`.
    fn tables(&self, x: u64) -> Natural {
        let mut product = choose(self.first, x);
        let k = (self.successes - x).min(self.second + x - self.successes);
        // C(n₂, k) grows one exact division at a time.
        for i in 0..k {
            product.multiply(self.second - i);
            product.divide(i + 1);
        }
        product
    }

    /// Number of tables at the ends.
    pub(super) fn tables_at(&self, ends: Ends) -> Natural {
        let mut sum = Natural::zero();
        if ends.below > self.lowest() {
            let mut term = self.tables(self.lowest());
            sum.add(&term);
            for x in self.lowest()..ends.below.min(self.highest() + 1) - 1 {
                term.multiply(self.first - x);
                term.divide(x + 1);
                term.multiply(self.successes - x);
                term.divide(self.second + x + 1 - self.successes);
                sum.add(&term);
            }
        }
        let from = ends.from.max(ends.below).max(self.lowest());
        if from <= self.highest() {
            let mut term = self.tables(self.highest());
            sum.add(&term);
            for x in (from..self.highest()).rev() {
                term.multiply(x + 1);
                term.divide(self.first - x);
                term.multiply(self.second + x + 1 - self.successes);
                term.divide(self.successes - x);
                sum.add(&term);
            }
        }
        sum
    }

    /// Number of tables in all.
    pub(super) fn all_tables(&self) -> Natural {
        choose(self.first + self.second, self.successes)
    }
}

impl Ladder for Margin {
    fn lowest(&self) -> u64 {
        self.successes.saturating_sub(self.second)
    }

    fn highest(&self) -> u64 {
        self.first.min(self.successes)
    }

    fn mode(&self) -> u64 {
        let expected = (self.first + 1) as f64 * (self.successes + 1) as f64
            / (self.first + self.second + 2) as f64;
        (expected as u64).clamp(self.lowest(), self.highest())
    }

    fn ratio_up(&self, x: u64) -> f64 {
        let open = (self.first - x) as f64 * (self.successes - x) as f64;
        open / ((x + 1) as f64 * (self.second + x + 1 - self.successes) as f64)
    }

    fn exact(&self) -> bool {
        self.first + self.second <= LARGEST_EXACT
    }

    fn compare(&self, x: u64, y: u64) -> Ordering {
        let mirrored = self.first == self.second && x + y == self.successes;
        if mirrored {
            return Ordering::Equal;
        }
        self.tables(x).compare(&self.tables(y))
    }

    fn compare_with_level(&self, ends: Ends) -> Ordering {
        compare_share(&self.tables_at(ends), &self.all_tables(), self.level)
    }
}

/// The splits that reject, for each number of successes in both groups together.
pub(super) fn fisher_ends(
    first: u64,
    second: u64,
    alpha: f64,
    level: Decimal,
    extreme: Extreme,
) -> Vec<Ends> {
    let mut weights = Weights::default();
    (0..=first + second)
        .map(|successes| {
            let margin = Margin { first, second, successes, level };
            weights.fill(&margin, alpha);
            weights.rejecting(&margin, extreme, alpha)
        })
        .collect()
}
