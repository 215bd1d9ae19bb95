//! The Poisson distribution.

use crate::numerics::error::{NumericsError, Result};
use crate::numerics::integer_search::smallest_monotone;
use crate::numerics::special::gamma::{gamma_tails, poisson_density};

/// Number of events when `mean` are expected.
///
/// # Formula
///
/// ```text
/// P(X = k)  = μ^k e^-μ / k!
/// P(X <= k) = Q(k + 1, μ)
/// ```
///
/// # Units and ranges
///
/// `μ` from 0 to 2⁵².
///
/// # Accuracy
///
/// Probabilities and both tails to 1e-12 of their own size down to 1e-250 (`tests/reference/poisson.csv`).
///
/// # Sources
///
/// Loader (2000), Fast and accurate computation of binomial probabilities, for the saddle-point form.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Poisson {
    mean: f64,
}

impl Poisson {
    /// Largest mean for which every count near it is a whole double.
    const LARGEST_MEAN: f64 = (1u64 << 52) as f64;

    /// Events with the given mean.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when the mean is not from 0 to 2⁵².
    pub fn new(mean: f64) -> Result<Self> {
        if !(0.0..=Self::LARGEST_MEAN).contains(&mean) {
            return Err(NumericsError::OutOfDomain {
                name: "mean",
                given: mean,
                allowed: "from 0 to 2^52",
            });
        }
        Ok(Poisson { mean })
    }

    /// `P(X = k)`.
    pub fn pmf(&self, k: u64) -> f64 {
        poisson_density(k as f64, self.mean).value()
    }

    /// `ln P(X = k)`, minus infinity where the probability is 0.
    pub fn ln_pmf(&self, k: u64) -> f64 {
        poisson_density(k as f64, self.mean).ln()
    }

    /// `P(X <= k)`, small values directly.
    pub fn cdf(&self, k: u64) -> f64 {
        gamma_tails(k as f64 + 1.0, self.mean).upper()
    }

    /// `P(X > k)`, small values directly.
    pub fn sf(&self, k: u64) -> f64 {
        gamma_tails(k as f64 + 1.0, self.mean).lower()
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
    /// [`NumericsError::OutOfDomain`] when `p` is not from 0 to below 1.
    pub fn quantile(&self, p: f64) -> Result<u64> {
        if !(0.0..1.0).contains(&p) {
            return Err(NumericsError::OutOfDomain {
                name: "p",
                given: p,
                allowed: "from 0 to below 1",
            });
        }
        self.smallest(|k| self.cdf(k) >= p)
    }

    /// The smallest `k` with `P(X > k) <= p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not above 0 and at most 1.
    pub fn upper_quantile(&self, p: f64) -> Result<u64> {
        if !(p > 0.0 && p <= 1.0) {
            return Err(NumericsError::OutOfDomain {
                name: "p",
                given: p,
                allowed: "above 0, at most 1",
            });
        }
        self.smallest(|k| self.sf(k) <= p)
    }

    fn smallest(&self, meets: impl Fn(u64) -> bool) -> Result<u64> {
        let hint = Some(self.mean as u64);
        Ok(smallest_monotone(0, 1 << 53, hint, |k| Ok(meets(k)))?.n)
    }
}
