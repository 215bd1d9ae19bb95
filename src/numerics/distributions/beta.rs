//! The beta distribution.

use super::fisher_f::{f_tails, ln_central_ratio_density};
use super::invert::positive_quantile;
use super::noncentral_f::ratio_start;
use super::{Continuous, degrees_of_freedom, ln_density_at_zero, number, settled};
use crate::numerics::error::Result;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::{BetaPoint, beta_step, beta_tails};

/// The beta distribution on [0, 1].
///
/// # Formula
///
/// ```text
/// F(x) = I_x(a, b)
/// ```
///
/// # Units and ranges
///
/// `a`, `b`: shapes, above 0 and at most 1e18. Close to 1 a double holds few digits of `1 - x`: an upper quantile
/// there is as good as its own rounding.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12, both tails down to 1e-290 (`tests/reference/central_tails.tsv`); quantiles: relative
/// 1e-13 (`tests/reference/quantiles.csv`).
///
/// # Sources
///
/// As [`FisherF`](super::fisher_f::FisherF): `x` is turned into the ratio `b x / (a (1 - x))`, which keeps both ends.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, Beta};
///
/// assert!((Beta::new(2.0, 3.0)?.cdf(0.5)? - 0.6875).abs() < 1e-15);
/// assert!(Beta::new(0.0, 3.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Beta {
    a: f64,
    b: f64,
}

impl Beta {
    /// The distribution with shapes `a` and `b`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless both are above 0 and at most
    /// 1e18.
    pub fn new(a: f64, b: f64) -> Result<Self> {
        Ok(Self { a: degrees_of_freedom("a", a)?, b: degrees_of_freedom("b", b)? })
    }

    fn tails(&self, x: f64) -> Tails {
        outside(x).unwrap_or_else(|| beta_tails(BetaPoint::of_fraction(self.a, self.b, x)))
    }

    fn solve(&self, p: f64, upper: bool) -> Result<f64> {
        let Self { a, b } = *self;
        let start = ratio_start(a, b, 0.0, p, upper);
        let ratio = positive_quantile("quantile of beta", p, upper, start, |f| {
            (f_tails(a, b, 0.0, f, beta_tails), ln_central_ratio_density(a, b, f) - libm::log(f))
        })?;
        Ok(fraction_of_ratio(a, b, ratio))
    }
}

/// The tails outside the support and at its ends.
pub(crate) fn outside(x: f64) -> Option<Tails> {
    if x <= 0.0 {
        Some(Tails::Lower(Scaled::ZERO))
    } else if x >= 1.0 {
        Some(Tails::Upper(Scaled::ZERO))
    } else {
        None
    }
}

/// The beta variable that belongs to an F variable.
pub(crate) fn fraction_of_ratio(a: f64, b: f64, ratio: f64) -> f64 {
    let odds = a / b * ratio;
    if odds < 1.0 { odds / (1.0 + odds) } else { 1.0 / (1.0 + b / a / ratio) }
}

/// Logarithm of a density at 0 or 1, `shape` being the shape that belongs to that end and `other` the other one.
pub(crate) fn ln_density_at_end(shape: f64, other: f64) -> f64 {
    ln_density_at_zero(shape, libm::log(other))
}

impl Continuous for Beta {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        let Self { a, b } = *self;
        if x == 0.0 {
            return Ok(ln_density_at_end(a, b));
        }
        if x == 1.0 {
            return Ok(ln_density_at_end(b, a));
        }
        if !(0.0..=1.0).contains(&x) {
            return Ok(f64::NEG_INFINITY);
        }
        let step = beta_step(BetaPoint::of_fraction(a, b, x)).times(a);
        Ok(step.ln() - libm::log(x) - libm::log1p(-x))
    }

    fn cdf(&self, x: f64) -> Result<f64> {
        settled(self.tails(number("x", x)?).lower())
    }

    fn sf(&self, x: f64) -> Result<f64> {
        settled(self.tails(number("x", x)?).upper())
    }

    fn ln_cdf(&self, x: f64) -> Result<f64> {
        settled(self.tails(number("x", x)?).ln_lower())
    }

    fn ln_sf(&self, x: f64) -> Result<f64> {
        settled(self.tails(number("x", x)?).ln_upper())
    }

    fn quantile(&self, p: f64) -> Result<f64> {
        self.solve(p, false)
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        self.solve(p, true)
    }
}
