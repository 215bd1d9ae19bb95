//! The binomial distribution.

use crate::numerics::error::{NumericsError, Result};
use crate::numerics::integer_search::smallest_monotone;
use crate::numerics::scaled::Tails;
use crate::numerics::special::beta::{BetaPoint, beta_tails};
use crate::numerics::special::gamma::stirling_remainder;
use crate::numerics::special::logarithms::ln_ratio_minus;
use libm::{exp, fma, log, log1p};
use std::f64::consts::TAU;

/// Number of successes in `n` independent trials of probability `p`.
///
/// # Formula
///
/// ```text
/// P(X = k)  = n! / (k! (n-k)!) p^k (1-p)^(n-k)
/// P(X <= k) = I_{1-p}(n - k, k + 1)
/// ```
///
/// The probabilities come in Loader's saddle-point form, `exp(-D(k) + σ(n) - σ(k) - σ(n-k)) sqrt(n / (2π k (n-k)))`
/// with deviance `D` and Stirling's remainder `σ`, in which nothing large cancels.
///
/// # Units and ranges
///
/// `n` up to 2⁵³ trials, `p` from 0 to 1.
///
/// # Accuracy
///
/// Probabilities and both tails to 1e-12 of their own size down to 1e-250 (`tests/numerics_solvers/binomials.rs`,
/// `tests/reference/binomial.csv`).
///
/// # Sources
///
/// Loader (2000), Fast and accurate computation of binomial probabilities.
///
/// # Example
///
/// ```
/// use sufficit::numerics::discrete::Binomial;
///
/// let successes = Binomial::new(10, 0.5)?;
/// assert!((successes.pmf(5) - 252.0 / 1024.0).abs() < 1e-15);
/// assert!(Binomial::new(10, 1.5).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Binomial {
    trials: u64,
    probability: f64,
    failure: f64,
}

impl Binomial {
    /// `trials` trials with the given probability of success.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] for more than 2⁵³ trials or a probability outside 0..=1.
    pub fn new(trials: u64, probability: f64) -> Result<Self> {
        if trials > 1 << 53 {
            return Err(NumericsError::OutOfDomain {
                name: "trials",
                given: trials as f64,
                allowed: "at most 2^53",
            });
        }
        if !(0.0..=1.0).contains(&probability) {
            return Err(NumericsError::OutOfDomain {
                name: "probability",
                given: probability,
                allowed: "from 0 to 1",
            });
        }
        Ok(Self::with_failure(trials, probability, 1.0 - probability))
    }

    /// For probabilities so near to 1 that only their complement is known well; the two must add up to 1.
    pub(super) fn with_failure(trials: u64, probability: f64, failure: f64) -> Self {
        Binomial { trials, probability, failure }
    }

    /// The expected number of successes.
    pub fn mean(&self) -> f64 {
        self.trials as f64 * self.probability
    }

    /// `P(X = k)`.
    pub fn pmf(&self, k: u64) -> f64 {
        exp(self.ln_pmf(k))
    }

    /// `ln P(X = k)`, minus infinity where the probability is 0.
    pub fn ln_pmf(&self, k: u64) -> f64 {
        let (p, q) = (self.probability, self.failure);
        if k > self.trials {
            return f64::NEG_INFINITY;
        }
        let n = self.trials as f64;
        let successes = k as f64;
        let failures = (self.trials - k) as f64;
        if k == 0 {
            return if self.trials == 0 { 0.0 } else { n * ln_of_complement(p, q) };
        }
        if k == self.trials {
            return n * ln_of_complement(q, p);
        }
        if p == 0.0 || q == 0.0 {
            return f64::NEG_INFINITY;
        }
        // Rounded once: the deviance multiplies an error of n p by its own size.
        let gap = fma(n, p, -successes);
        let deviance = successes * ln_ratio_minus(n * p / successes, gap / successes)
            + failures * ln_ratio_minus(n * q / failures, -gap / failures);
        let remainder =
            stirling_remainder(n) - stirling_remainder(successes) - stirling_remainder(failures);
        deviance + remainder + 0.5 * log(n / (TAU * successes * failures))
    }

    /// `P(X <= k)`, small values directly.
    pub fn cdf(&self, k: u64) -> f64 {
        if k >= self.trials {
            return 1.0;
        }
        self.tails(k).map_or(1.0 - self.probability.floor(), Tails::lower)
    }

    /// `P(X > k)`, small values directly.
    pub fn sf(&self, k: u64) -> f64 {
        if k >= self.trials {
            return 0.0;
        }
        self.tails(k).map_or(self.probability.floor(), Tails::upper)
    }

    /// `P(X >= k)`, small values directly.
    pub fn at_least(&self, k: u64) -> f64 {
        match k.checked_sub(1) {
            Some(below) => self.sf(below),
            None => 1.0,
        }
    }

    /// The smallest `k` with `P(X <= k) >= p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not from 0 to 1.
    pub fn quantile(&self, p: f64) -> Result<u64> {
        self.smallest(p, |k| self.cdf(k) >= p)
    }

    /// The smallest `k` with `P(X > k) <= p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not from 0 to 1.
    pub fn upper_quantile(&self, p: f64) -> Result<u64> {
        self.smallest(p, |k| self.sf(k) <= p)
    }

    fn smallest(&self, p: f64, meets: impl Fn(u64) -> bool) -> Result<u64> {
        if !(0.0..=1.0).contains(&p) {
            return Err(NumericsError::OutOfDomain { name: "p", given: p, allowed: "from 0 to 1" });
        }
        let middle = self.mean() as u64;
        Ok(smallest_monotone(0, self.trials, Some(middle), |k| Ok(meets(k)))?.n)
    }

    /// Tails around `k` below `n`, through the beta distribution; nothing where the outcome is certain.
    fn tails(&self, k: u64) -> Option<Tails> {
        let (p, q) = (self.probability, self.failure);
        if p == 0.0 || q == 0.0 {
            return None;
        }
        let a = (self.trials - k) as f64;
        let b = (k + 1) as f64;
        let odds = b * q / p;
        // b (1-p)/p - a without the cancellation near the mean.
        let excess = -fma(a + b, p, -b) / p;
        Some(beta_tails(BetaPoint::new(a, b, odds, excess)))
    }
}

/// Logarithm of `complement = 1 - p`, from whichever of the two is the smaller.
fn ln_of_complement(p: f64, complement: f64) -> f64 {
    if p < 0.5 { log1p(-p) } else { log(complement) }
}
