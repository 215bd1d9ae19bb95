//! The exact binomial test of one proportion: critical counts, size and power.

use super::binomial::Binomial;
use super::ends::{Ends, Extreme, Ladder, Weights};
use super::exact::{Decimal, LARGEST_EXACT, Natural, compare_share};
use crate::numerics::error::{NumericsError, Result};
use std::cmp::Ordering;

/// Which counts a binomial test calls extreme.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum BinomialRule {
    /// Reject for many successes: `P(X >= x) <= alpha`.
    UpperTail,
    /// Reject for few successes: `P(X <= x) <= alpha`.
    LowerTail,
    /// Reject when either tail probability is at most `alpha / 2`.
    EqualTails,
    /// Reject when the sum of all probabilities not above that of `x` is at most `alpha`.
    LeastProbable,
}

/// The counts that an exact binomial test rejects.
///
/// # Accuracy
///
/// Exact: probabilities that come within 1e-9 of the level or of each other are compared in whole numbers, the null
/// proportion and `alpha` being the decimals they are written as (`tests/reference/one_proportion_exact.csv`). Above
/// 20 000 trials, or 19 decimal places of the null proportion, double precision decides.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct BinomialRegion {
    trials: u64,
    ends: Ends,
}

impl BinomialRegion {
    /// The region for `trials` trials, null proportion `p0` and level `alpha`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when there are no trials or more than 10⁷, `p0` is not above 0 and below 1, or
    /// `alpha` is not above 0 and below 1.
    pub fn new(trials: u64, p0: f64, alpha: f64, rule: BinomialRule) -> Result<Self> {
        if !(1..=10_000_000).contains(&trials) {
            return Err(NumericsError::OutOfDomain {
                name: "trials",
                given: trials as f64,
                allowed: "from 1 to 10000000",
            });
        }
        let null = inner_decimal("null proportion", p0)?;
        let level = inner_decimal("alpha", alpha)?;
        let region = |extreme, alpha: f64, level| {
            let ladder = Null { trials, p0, odds: null.odds(), level };
            let mut weights = Weights::default();
            weights.fill(&ladder, alpha);
            weights.rejecting(&ladder, extreme, alpha)
        };
        let ends = match rule {
            BinomialRule::UpperTail => region(Extreme::Large, alpha, level),
            BinomialRule::LowerTail => region(Extreme::Small, alpha, level),
            BinomialRule::LeastProbable => region(Extreme::Improbable, alpha, level),
            BinomialRule::EqualTails => {
                let half = level.halved();
                Ends {
                    below: region(Extreme::Small, 0.5 * alpha, half).below,
                    from: region(Extreme::Large, 0.5 * alpha, half).from,
                }
            }
        };
        Ok(BinomialRegion { trials, ends })
    }

    /// The largest count that rejects on the lower side, if any does.
    pub fn lower_critical(&self) -> Option<u64> {
        self.ends.below.checked_sub(1)
    }

    /// The smallest count that rejects on the upper side, if any does.
    pub fn upper_critical(&self) -> Option<u64> {
        (self.ends.from <= self.trials).then_some(self.ends.from)
    }

    /// Whether `x` successes reject.
    pub fn rejects(&self, x: u64) -> bool {
        x <= self.trials && self.ends.contain(x)
    }

    /// Probability of rejection when the proportion is `p`; at the null proportion, the size of the test.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not from 0 to 1.
    pub fn power(&self, p: f64) -> Result<f64> {
        let count = Binomial::new(self.trials, p)?;
        let lower = self.lower_critical().map_or(0.0, |x| count.cdf(x));
        let upper = self.upper_critical().map_or(0.0, |x| count.at_least(x));
        Ok((lower + upper).min(1.0))
    }
}

fn inner_decimal(name: &'static str, value: f64) -> Result<Decimal> {
    match Decimal::new(value) {
        Some(decimal) if value > 0.0 && value < 1.0 => Ok(decimal),
        _ => Err(NumericsError::OutOfDomain { name, given: value, allowed: "above 0 and below 1" }),
    }
}

/// The count under the null hypothesis.
struct Null {
    trials: u64,
    p0: f64,
    /// The null proportion as whole odds of success and failure.
    odds: Option<(u64, u64)>,
    level: Decimal,
}

impl Null {
    /// Numbers proportional to the probabilities of 0, 1, 2, … successes: `C(n, x) a^x b^(n-x)`.
    fn outcomes(&self, mut visit: impl FnMut(u64, &Natural)) {
        let Some((success, failure)) = self.odds else {
            return;
        };
        let mut outcomes = Natural::one();
        for _ in 0..self.trials {
            outcomes.multiply(failure);
        }
        for x in 0..=self.trials {
            visit(x, &outcomes);
            outcomes.multiply(self.trials - x);
            outcomes.divide(x + 1);
            outcomes.multiply(success);
            outcomes.divide(failure);
        }
    }
}

impl Ladder for Null {
    fn lowest(&self) -> u64 {
        0
    }

    fn highest(&self) -> u64 {
        self.trials
    }

    fn mode(&self) -> u64 {
        (((self.trials + 1) as f64 * self.p0) as u64).min(self.trials)
    }

    fn ratio_up(&self, x: u64) -> f64 {
        (self.trials - x) as f64 / (x + 1) as f64 * (self.p0 / (1.0 - self.p0))
    }

    fn exact(&self) -> bool {
        self.odds.is_some() && self.trials <= LARGEST_EXACT
    }

    fn compare(&self, x: u64, y: u64) -> Ordering {
        let (mut at_x, mut at_y) = (Natural::zero(), Natural::zero());
        self.outcomes(|k, outcomes| {
            if k == x {
                at_x = outcomes.clone();
            }
            if k == y {
                at_y = outcomes.clone();
            }
        });
        at_x.compare(&at_y)
    }

    fn compare_with_level(&self, ends: Ends) -> Ordering {
        let mut part = Natural::zero();
        let mut whole = Natural::zero();
        self.outcomes(|x, outcomes| {
            whole.add(outcomes);
            if ends.contain(x) {
                part.add(outcomes);
            }
        });
        compare_share(&part, &whole, self.level)
    }
}
