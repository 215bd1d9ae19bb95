//! The hypergeometric distribution, central and with an odds ratio (Fisher's noncentral form).

use super::binomial::Binomial;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::integer_search::smallest_monotone;
use libm::{exp, hypot, log};

/// Sums over the counts that matter grow with the square root of the group sizes.
const LARGEST_GROUP: u64 = 10_000_000_000;

/// Terms smaller than this share of a sum are left out of it.
const NEGLIGIBLE: f64 = 1e-18;

/// Successes in the first of two groups, given the successes in both together.
///
/// With group sizes `n₁`, `n₂`, `m` successes in all and the odds ratio `ω`:
///
/// # Formula
///
/// ```text
/// P(X = x) ∝ C(n₁, x) C(n₂, m - x) ω^x      max(0, m - n₂) <= x <= min(n₁, m)
/// ```
///
/// Evaluated as a product of two binomial probabilities whose success probabilities have the odds ratio `ω` and
/// expect `m` successes together, so that no term overflows or underflows near the mode.
///
/// # Units and ranges
///
/// Groups of up to 10¹⁰ each, `ω` above 0 and finite; `ω = 1` is the central distribution.
///
/// # Accuracy
///
/// Probabilities, both tails and the mean to 1e-12 of their own size down to 1e-250
/// (`tests/numerics_solvers/binomials.rs`, `tests/reference/hypergeometric.csv`).
///
/// # Sources
///
/// Fisher (1935), Journal of the Royal Statistical Society 98, 39-82, for the conditional distribution; Loader (2000)
/// for the binomial probabilities.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Hypergeometric {
    first: u64,
    second: u64,
    successes: u64,
    odds_ratio: f64,
    binomials: (Binomial, Binomial),
    mode: u64,
    ln_total: f64,
}

impl Hypergeometric {
    /// Central distribution: all successes alike.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when there are more successes than units, or a group is above 10¹⁰.
    pub fn new(first: u64, second: u64, successes: u64) -> Result<Self> {
        Self::with_odds_ratio(first, second, successes, 1.0)
    }

    /// Distribution in which the odds of success are `odds_ratio` times larger in the first group.
    ///
    /// # Errors
    ///
    /// As [`Hypergeometric::new`]; [`NumericsError::OutOfDomain`] when the odds ratio is not above 0 and finite.
    pub fn with_odds_ratio(
        first: u64,
        second: u64,
        successes: u64,
        odds_ratio: f64,
    ) -> Result<Self> {
        if first.max(second) > LARGEST_GROUP {
            return Err(NumericsError::OutOfDomain {
                name: "group size",
                given: first.max(second) as f64,
                allowed: "at most 10000000000",
            });
        }
        if successes > first + second {
            return Err(NumericsError::OutOfDomain {
                name: "successes",
                given: successes as f64,
                allowed: "no more than the units of both groups",
            });
        }
        if !(odds_ratio > 0.0 && odds_ratio.is_finite()) {
            return Err(NumericsError::OutOfDomain {
                name: "odds ratio",
                given: odds_ratio,
                allowed: "above 0 and finite",
            });
        }
        let binomials = matching_binomials(first, second, successes, odds_ratio);
        let mut distribution = Hypergeometric {
            first,
            second,
            successes,
            odds_ratio,
            binomials,
            mode: 0,
            ln_total: 0.0,
        };
        distribution.mode = distribution.find_mode();
        let mode = distribution.mode;
        let total = distribution.sum_down(mode) + distribution.sum_up(mode) - 1.0;
        distribution.ln_total = distribution.ln_weight(mode) + log(total);
        Ok(distribution)
    }

    /// The smallest possible value.
    pub fn lowest(&self) -> u64 {
        self.successes.saturating_sub(self.second)
    }

    /// The largest possible value.
    pub fn highest(&self) -> u64 {
        self.first.min(self.successes)
    }

    /// `P(X = x)`.
    pub fn pmf(&self, x: u64) -> f64 {
        exp(self.ln_pmf(x))
    }

    /// `ln P(X = x)`, minus infinity where the probability is 0.
    pub fn ln_pmf(&self, x: u64) -> f64 {
        if x < self.lowest() || x > self.highest() {
            return f64::NEG_INFINITY;
        }
        self.ln_weight(x) - self.ln_total
    }

    /// `P(X <= x)`, small values directly.
    pub fn cdf(&self, x: u64) -> f64 {
        if x >= self.highest() {
            1.0
        } else if x < self.lowest() {
            0.0
        } else if x < self.mode {
            self.pmf(x) * self.sum_down(x)
        } else {
            (1.0 - self.pmf(x + 1) * self.sum_up(x + 1)).max(0.0)
        }
    }

    /// `P(X > x)`, small values directly.
    pub fn sf(&self, x: u64) -> f64 {
        if x >= self.highest() {
            0.0
        } else if x < self.lowest() {
            1.0
        } else if x < self.mode {
            (1.0 - self.pmf(x) * self.sum_down(x)).max(0.0)
        } else {
            self.pmf(x + 1) * self.sum_up(x + 1)
        }
    }

    /// `P(X >= x)`, small values directly.
    pub fn at_least(&self, x: u64) -> f64 {
        match x.checked_sub(1) {
            Some(below) => self.sf(below),
            None => 1.0,
        }
    }

    /// The smallest `x` with `P(X <= x) >= p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not from 0 to 1.
    pub fn quantile(&self, p: f64) -> Result<u64> {
        if !(0.0..=1.0).contains(&p) {
            return Err(NumericsError::OutOfDomain { name: "p", given: p, allowed: "from 0 to 1" });
        }
        let meets = |x| Ok(self.cdf(x) >= p);
        Ok(smallest_monotone(self.lowest(), self.highest(), Some(self.mode), meets)?.n)
    }

    /// The expected value.
    pub fn mean(&self) -> f64 {
        let at_mode = self.pmf(self.mode);
        // Terms count by their distance from the mode, however small all of them are.
        let least = NEGLIGIBLE * NEGLIGIBLE;
        let (mut below, mut above) = (0.0, 0.0);
        self.walk_down(self.mode, least, |x, term| below += term * (self.mode - x) as f64);
        self.walk_up(self.mode, least, |x, term| above += term * (x - self.mode) as f64);
        self.mode as f64 + at_mode * (above - below)
    }

    fn ln_weight(&self, x: u64) -> f64 {
        self.binomials.0.ln_pmf(x) + self.binomials.1.ln_pmf(self.successes - x)
    }

    /// Weight at `x + 1` over weight at `x`.
    fn ratio_up(&self, x: u64) -> f64 {
        let open = (self.first - x) as f64 * (self.successes - x) as f64;
        let taken = (x + 1) as f64 * (self.second + x + 1 - self.successes) as f64;
        self.odds_ratio * open / taken
    }

    /// The mode is where the weights stop rising; the balanced binomials put it next to `n₁ p₁`.
    fn find_mode(&self) -> u64 {
        let expected = self.binomials.0.mean() as u64;
        let mut x = expected.clamp(self.lowest(), self.highest());
        while x < self.highest() && self.ratio_up(x) > 1.0 {
            x += 1;
        }
        while x > self.lowest() && self.ratio_up(x - 1) < 1.0 {
            x -= 1;
        }
        x
    }

    /// Sum of all weights up to `x`, relative to that at `x`.
    fn sum_down(&self, x: u64) -> f64 {
        let mut sum = 0.0;
        self.walk_down(x, NEGLIGIBLE, |_, term| sum += term);
        sum
    }

    /// Sum of all weights from `x` on, relative to that at `x`.
    fn sum_up(&self, x: u64) -> f64 {
        let mut sum = 0.0;
        self.walk_up(x, NEGLIGIBLE, |_, term| sum += term);
        sum
    }

    /// Visits weights relative to that at `from`, downward until they no longer count.
    fn walk_down(&self, from: u64, least: f64, mut visit: impl FnMut(u64, f64)) {
        let mut term = 1.0;
        let mut sum = 0.0;
        let mut x = from;
        loop {
            visit(x, term);
            sum += term;
            if x == self.lowest() {
                return;
            }
            let shrink = 1.0 / self.ratio_up(x - 1);
            term *= shrink;
            x -= 1;
            // The ratios keep falling, so what is left is below a geometric series.
            if shrink < 1.0 && term < least * sum * (1.0 - shrink) {
                return;
            }
        }
    }

    /// Visits weights relative to that at `from`, upward until they no longer count.
    fn walk_up(&self, from: u64, least: f64, mut visit: impl FnMut(u64, f64)) {
        let mut term = 1.0;
        let mut sum = 0.0;
        let mut x = from;
        loop {
            visit(x, term);
            sum += term;
            if x == self.highest() {
                return;
            }
            let shrink = self.ratio_up(x);
            term *= shrink;
            x += 1;
            if shrink < 1.0 && term < least * sum * (1.0 - shrink) {
                return;
            }
        }
    }
}

/// Binomials whose success probabilities have the odds ratio `ω` and expect `m` successes together.
///
/// The odds `t` in the second group solve `(N - m) ω t² + (n₁ ω + n₂ - m (1 + ω)) t - m = 0`.
fn matching_binomials(
    first: u64,
    second: u64,
    successes: u64,
    odds_ratio: f64,
) -> (Binomial, Binomial) {
    let (n1, n2, m) = (first as f64, second as f64, successes as f64);
    let failures = (first + second - successes) as f64;
    if successes == 0 || failures == 0.0 {
        let p = if successes == 0 { 0.0 } else { 1.0 };
        return (
            Binomial::with_failure(first, p, 1.0 - p),
            Binomial::with_failure(second, p, 1.0 - p),
        );
    }
    let root = odds_ratio.sqrt();
    // Divided by sqrt(ω), which keeps the squares in range.
    let linear = (n1 - m) * root + (n2 - m) / root;
    let discriminant = hypot(linear, 2.0 * failures.sqrt() * m.sqrt());
    // u = t sqrt(ω), the geometric mean of the two odds.
    let u = if linear > 0.0 {
        2.0 * m / (linear + discriminant)
    } else {
        (discriminant - linear) / (2.0 * failures)
    };
    (with_odds(first, u * root), with_odds(second, u / root))
}

fn with_odds(trials: u64, odds: f64) -> Binomial {
    Binomial::with_failure(trials, odds / (1.0 + odds), 1.0 / (1.0 + odds))
}
