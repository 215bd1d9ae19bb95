//! The three tests of two proportions that compare a difference with its standard error.

use super::ends::Ends;
use super::two_binomials::Alternative;

/// How the standard error is formed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum StandardError {
    /// From the common proportion.
    Pooled,
    /// From each group's own proportion.
    Unpooled,
    /// From the common proportion, with the difference reduced by half a success in each group.
    PooledCorrected,
}

/// A comparison of two groups of fixed sizes with a normal critical value.
pub(super) struct LargeSample {
    pub(super) first: u64,
    pub(super) second: u64,
    pub(super) standard_error: StandardError,
    pub(super) critical: f64,
    pub(super) alternative: Alternative,
}

impl LargeSample {
    /// The splits that reject, for each number of successes in both groups together.
    pub(super) fn ends(&self) -> Vec<Ends> {
        (0..=self.first + self.second)
            .map(|successes| {
                let lowest = successes.saturating_sub(self.second);
                let after = self.first.min(successes) + 1;
                // For a given margin the statistic rises with the successes of the first group.
                let from = first_true(lowest, after, |x| {
                    self.statistic(x, successes - x) >= self.critical
                });
                let below = match self.alternative {
                    Alternative::FirstLarger => 0,
                    Alternative::TwoSided => first_true(lowest, after, |x| {
                        -self.statistic(x, successes - x) < self.critical
                    }),
                };
                Ends { below, from }
            })
            .collect()
    }

    /// Difference over standard error; 0/0 is 0, and a difference without any spread is infinite.
    fn statistic(&self, x1: u64, x2: u64) -> f64 {
        let (n1, n2) = (self.first as f64, self.second as f64);
        let (x1, x2) = (x1 as f64, x2 as f64);
        // n₁ n₂ times the difference, in whole numbers.
        let difference = x1 * n2 - x2 * n1;
        let reduced = match self.standard_error {
            StandardError::PooledCorrected => self.reduced(difference, 0.5 * (n1 + n2)),
            StandardError::Pooled | StandardError::Unpooled => difference,
        };
        if reduced == 0.0 {
            return 0.0;
        }
        let variance = match self.standard_error {
            StandardError::Unpooled => {
                x1 * (n1 - x1) * n2 * n2 / n1 + x2 * (n2 - x2) * n1 * n1 / n2
            }
            StandardError::Pooled | StandardError::PooledCorrected => {
                (x1 + x2) * (n1 + n2 - x1 - x2) * n1 * n2 / (n1 + n2)
            }
        };
        reduced / variance.sqrt()
    }

    /// Two-sided, the correction shrinks the difference towards 0 and not beyond.
    fn reduced(&self, difference: f64, correction: f64) -> f64 {
        match self.alternative {
            Alternative::FirstLarger => difference - correction,
            Alternative::TwoSided => difference.signum() * (difference.abs() - correction).max(0.0),
        }
    }
}

/// The first number from `low` to below `high` for which a predicate that turns true once is true, else `high`.
fn first_true(low: u64, high: u64, predicate: impl Fn(u64) -> bool) -> u64 {
    let (mut low, mut high) = (low, high);
    while low < high {
        let middle = low + (high - low) / 2;
        if predicate(middle) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    low
}
