//! Tests of two independent proportions: their rejection regions, and power by full enumeration.

use super::binomial::Binomial;
use super::conditional::fisher_ends;
use super::ends::{Ends, Extreme};
use super::exact::Decimal;
use super::large_sample::{LargeSample, StandardError};
use super::unconditional::{Ordered, unconditional_ends};
use crate::numerics::distributions::normal::normal_upper_quantile;
use crate::numerics::error::{NumericsError, Result};

/// Largest group: two words a margin are kept.
const LARGEST_GROUP: u64 = 1_000_000;

/// Largest group for Fisher's test, whose margins take a time that grows with the square root of their number.
const LARGEST_CONDITIONAL_GROUP: u64 = 100_000;

/// Probabilities below this share of the largest one are left out of a power.
const NEGLIGIBLE: f64 = 1e-30;

/// What is tested against equal proportions.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Alternative {
    /// The first group's proportion is the larger one.
    FirstLarger,
    /// The proportions differ.
    TwoSided,
}

/// A test of two independent proportions.
///
/// Below, `p̂ᵢ = xᵢ / nᵢ`, and `p̄` is the proportion of both groups together. The normal critical value is that of
/// `alpha`, two-sided of `alpha / 2`; a statistic equal to it rejects.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum ProportionTest {
    /// `(p̂₁ - p̂₂) / sqrt(p̄ (1 - p̄) (1/n₁ + 1/n₂))`; 0/0 counts as 0.
    PooledZ,
    /// The same with variance `p̂₁ (1 - p̂₁) / n₁ + p̂₂ (1 - p̂₂) / n₂`; a difference with variance 0 rejects.
    UnpooledZ,
    /// The pooled statistic with the difference reduced by `(1/n₁ + 1/n₂) / 2` (Yates 1934).
    Yates,
    /// Fisher's conditional test; two-sided by the sum of all probabilities not above the observed one.
    Fisher,
    /// Barnard's unconditional test ordered by the pooled statistic, maximised over the common proportion.
    Barnard,
    /// Boschloo's unconditional test ordered by Fisher's p-value of the same alternative.
    Boschloo,
    /// Two-sided as twice the smaller of Boschloo's one-sided p-values; one-sided the same as Boschloo's.
    BoschlooDoubled,
}

/// The tables that a test rejects, for groups of fixed sizes.
///
/// # Method
///
/// For each number of successes in both groups together the rejected splits lie at the two ends, so that two whole
/// numbers a margin hold the region: memory grows with `n₁ + n₂`, not with their product.
///
/// # Accuracy
///
/// The region is exact: ties between tables and p-values equal to `alpha` are decided in whole numbers, `alpha` being
/// the decimal it is written as (above 20 000 units together, in double precision). Unconditional p-values are maximised with a guaranteed bound; a decision nearer to
/// `alpha` than 1e-9 is the maximum's own rounding. Power to 1e-13 absolute and 1e-11 relative
/// (`tests/reference/two_proportions.csv`).
///
/// # Sources
///
/// Fisher (1935), Journal of the Royal Statistical Society 98, 39-82; Barnard (1947), Biometrika 34, 123-138; Boschloo
/// (1970), Statistica Neerlandica 24, 1-9; Yates (1934), Supplement to the Journal of the Royal Statistical Society 1,
/// 217-235.
///
/// # Example
///
/// ```
/// use sufficit::numerics::discrete::{Alternative, ProportionTest, TwoBinomialRegion};
///
/// let fisher = TwoBinomialRegion::new(ProportionTest::Fisher, 20, 20, 0.05, Alternative::TwoSided)?;
/// assert!(fisher.rejects(15, 5) && !fisher.rejects(12, 8));
/// assert!(fisher.size_at(0.3)? <= 0.05);
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TwoBinomialRegion {
    first: u64,
    second: u64,
    ends: Vec<Ends>,
}

impl TwoBinomialRegion {
    /// The region of `test` for groups of `first` and `second` units.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when a group is empty or above 10⁶ (Fisher's test: 10⁵; unconditional tests:
    /// 1000 in both together),
    /// or `alpha` is not above 0 and at most 0.5.
    pub fn new(
        test: ProportionTest,
        first: u64,
        second: u64,
        alpha: f64,
        alternative: Alternative,
    ) -> Result<Self> {
        check_sizes(test, first, second)?;
        let level = checked_level(alpha)?;
        let extreme = match alternative {
            Alternative::FirstLarger => Extreme::Large,
            Alternative::TwoSided => Extreme::Improbable,
        };
        let ends = match test {
            ProportionTest::PooledZ => {
                large_sample(first, second, StandardError::Pooled, alpha, alternative)?
            }
            ProportionTest::UnpooledZ => {
                large_sample(first, second, StandardError::Unpooled, alpha, alternative)?
            }
            ProportionTest::Yates => {
                large_sample(first, second, StandardError::PooledCorrected, alpha, alternative)?
            }
            ProportionTest::Fisher => fisher_ends(first, second, alpha, level, extreme),
            ProportionTest::Barnard => {
                unconditional_ends(first, second, alpha, Ordered::ByPooledStatistic(alternative))?
            }
            ProportionTest::Boschloo => {
                unconditional_ends(first, second, alpha, Ordered::ByFisher(extreme))?
            }
            ProportionTest::BoschlooDoubled => boschloo_doubled(first, second, alpha, alternative)?,
        };
        Ok(TwoBinomialRegion { first, second, ends })
    }

    /// Whether `x1` and `x2` successes reject; counts beyond the group sizes never do.
    pub fn rejects(&self, x1: u64, x2: u64) -> bool {
        if x1 > self.first || x2 > self.second {
            return false;
        }
        self.margin(x1 + x2).is_some_and(|ends| ends.contain(x1))
    }

    /// Probability of rejection when the proportions are `p1` and `p2`, over all tables.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when a proportion is not from 0 to 1.
    pub fn power(&self, p1: f64, p2: f64) -> Result<f64> {
        let first = Window::new(self.first, p1)?;
        let second = Window::new(self.second, p2)?;
        let mut power = 0.0;
        for (x1, weight) in first.pairs() {
            let from = (x1 + second.start) as usize;
            let margins = self.ends.get(from..).unwrap_or_default();
            let row: f64 = second
                .probabilities
                .iter()
                .zip(margins)
                .map(|(&probability, ends)| if ends.contain(x1) { probability } else { 0.0 })
                .sum();
            power += weight * row;
        }
        Ok(power.min(1.0))
    }

    /// Probability of rejection when both proportions are `p`.
    ///
    /// # Errors
    ///
    /// As [`TwoBinomialRegion::power`].
    pub fn size_at(&self, p: f64) -> Result<f64> {
        self.power(p, p)
    }

    fn margin(&self, successes: u64) -> Option<Ends> {
        self.ends.get(successes as usize).copied()
    }
}

/// The probabilities of a binomial count, as far as they matter.
struct Window {
    start: u64,
    probabilities: Vec<f64>,
}

impl Window {
    fn new(trials: u64, p: f64) -> Result<Self> {
        let count = Binomial::new(trials, p)?;
        let mode = (count.mean() as u64).min(trials);
        let smallest = NEGLIGIBLE * count.pmf(mode);
        let mut start = mode;
        let mut probabilities = Vec::new();
        for k in (0..=mode).rev() {
            let probability = count.pmf(k);
            if probability < smallest {
                break;
            }
            probabilities.push(probability);
            start = k;
        }
        probabilities.reverse();
        for k in mode + 1..=trials {
            let probability = count.pmf(k);
            if probability < smallest {
                break;
            }
            probabilities.push(probability);
        }
        Ok(Window { start, probabilities })
    }

    fn pairs(&self) -> impl Iterator<Item = (u64, f64)> {
        (self.start..).zip(self.probabilities.iter().copied())
    }
}

fn check_sizes(test: ProportionTest, first: u64, second: u64) -> Result<()> {
    let (largest, allowed) = if test == ProportionTest::Fisher {
        (LARGEST_CONDITIONAL_GROUP, "from 1 to 100000 for Fisher's test")
    } else {
        (LARGEST_GROUP, "from 1 to 1000000")
    };
    for size in [first, second] {
        if !(1..=largest).contains(&size) {
            return Err(NumericsError::OutOfDomain {
                name: "group size",
                given: size as f64,
                allowed,
            });
        }
    }
    Ok(())
}

fn checked_level(alpha: f64) -> Result<Decimal> {
    let allowed = alpha > 0.0 && alpha <= 0.5;
    match Decimal::new(alpha) {
        Some(level) if allowed => Ok(level),
        _ => Err(NumericsError::OutOfDomain {
            name: "alpha",
            given: alpha,
            allowed: "above 0 and at most 0.5",
        }),
    }
}

fn large_sample(
    first: u64,
    second: u64,
    standard_error: StandardError,
    alpha: f64,
    alternative: Alternative,
) -> Result<Vec<Ends>> {
    let tail = match alternative {
        Alternative::FirstLarger => alpha,
        Alternative::TwoSided => 0.5 * alpha,
    };
    let test = LargeSample {
        first,
        second,
        standard_error,
        critical: normal_upper_quantile(tail)?,
        alternative,
    };
    Ok(test.ends())
}

/// One-sided at half the level in both directions; the other direction is this one with the groups' outcomes turned.
fn boschloo_doubled(
    first: u64,
    second: u64,
    alpha: f64,
    alternative: Alternative,
) -> Result<Vec<Ends>> {
    let tail = match alternative {
        Alternative::FirstLarger => alpha,
        Alternative::TwoSided => 0.5 * alpha,
    };
    let upper = unconditional_ends(first, second, tail, Ordered::ByFisher(Extreme::Large))?;
    if alternative == Alternative::FirstLarger {
        return Ok(upper);
    }
    let lower = unconditional_ends(first, second, tail, Ordered::ByFisher(Extreme::Small))?;
    Ok(upper
        .iter()
        .zip(&lower)
        .map(|(upper, lower)| Ends { below: lower.below, from: upper.from })
        .collect())
}
