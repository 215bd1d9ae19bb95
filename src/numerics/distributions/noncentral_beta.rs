//! The noncentral beta distribution (type I: the noncentrality belongs to the first shape).

use super::beta::{Beta, fraction_of_ratio, outside};
use super::invert::positive_quantile;
use super::noncentral_f::{
    ln_ratio_density, point_tails, ratio_noncentrality, ratio_start, ratio_tails,
};
use super::{
    Continuous, degrees_of_freedom, ln_density_at_zero, noncentrality_parameter, number, settled,
};
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::scaled::Tails;
use crate::numerics::special::beta::{BetaFamily, BetaPoint};
use crate::numerics::special::poisson_mixture::{Weights, density_sum};

/// Distribution of `X / (X + Y)` with `X` noncentral chi-squared on `2a` degrees of freedom and `Y` central on `2b`.
///
/// # Formula
///
/// ```text
/// F(x) = Σ p_j I_x(a + j, b),   p_j = e^-w w^j / j!,   w = λ/2
/// ```
///
/// # Units and ranges
///
/// `a`, `b`: shapes, above 0 and at most 1e18. `λ` = `ncp`: noncentrality, 0 to 1e12.
///
/// # Accuracy
///
/// Tails: relative 1e-12 up to `λ` = 1e6, both tails down to 1e-290 (`tests/reference/noncentral_tails.tsv`).
///
/// # Sources
///
/// Seber (1963), Biometrika 50, 542-544. Summed as in
/// [`NoncentralChiSquared`](super::noncentral_chi_squared::NoncentralChiSquared).
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, NoncentralBeta};
///
/// let power = NoncentralBeta::new(1.5, 18.0, 12.0)?.sf(0.1928)?;
/// assert!(power > 0.79 && power < 0.80);
/// assert!(NoncentralBeta::new(1.5, 0.0, 12.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoncentralBeta {
    a: f64,
    b: f64,
    ncp: f64,
}

impl NoncentralBeta {
    /// The distribution with shapes `a` and `b` and noncentrality `ncp`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] unless the shapes are above 0 and at
    /// most 1e18 and `0 <= ncp <= 1e12`.
    pub fn new(a: f64, b: f64, ncp: f64) -> Result<Self> {
        Ok(Self {
            a: degrees_of_freedom("a", a)?,
            b: degrees_of_freedom("b", b)?,
            ncp: noncentrality_parameter(ncp)?,
        })
    }

    /// The noncentrality at which `P(X > x) = p`; relative error of the tail reached: 1e-12.
    ///
    /// # Errors
    ///
    /// * [`NumericsError::OutOfDomain`] when an argument is outside its
    ///   range, or no noncentrality gives the tail `p`: an upper tail below that of the central distribution, say.
    /// * [`NumericsError::NoBracket`] when the noncentrality would have to be
    ///   beyond its largest value.
    pub fn ncp_for_sf(a: f64, b: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(a, b, x, p, true)
    }

    /// The noncentrality at which `P(X <= x) = p`; accuracy and errors as [`Self::ncp_for_sf`].
    pub fn ncp_for_cdf(a: f64, b: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(a, b, x, p, false)
    }

    fn solve_ncp(a: f64, b: f64, x: f64, p: f64, upper: bool) -> Result<f64> {
        let (a, b) = (degrees_of_freedom("a", a)?, degrees_of_freedom("b", b)?);
        if !(x > 0.0 && x < 1.0) {
            return Err(NumericsError::OutOfDomain {
                name: "x",
                given: x,
                allowed: "inside (0, 1)",
            });
        }
        ratio_noncentrality("noncentrality of beta", a, b, p, upper, b / a * (x / (1.0 - x)))
    }

    fn tails(&self, x: f64) -> Tails {
        let Self { a, b, ncp } = *self;
        outside(x).unwrap_or_else(|| point_tails(BetaPoint::of_fraction(a, b, x), 0.5 * ncp))
    }

    fn solve(&self, p: f64, upper: bool) -> Result<f64> {
        let (a, b, w) = (self.a, self.b, 0.5 * self.ncp);
        let start = ratio_start(a, b, w, p, upper);
        let ratio = positive_quantile("quantile of noncentral beta", p, upper, start, |f| {
            (ratio_tails(a, b, w, f), ln_ratio_density(a, b, w, f) - libm::log(f))
        })?;
        Ok(fraction_of_ratio(a, b, ratio))
    }
}

impl Continuous for NoncentralBeta {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        let Self { a, b, ncp } = *self;
        if ncp == 0.0 {
            return Beta::new(a, b)?.ln_density(x);
        }
        let w = 0.5 * ncp;
        if x == 0.0 {
            return Ok(ln_density_at_zero(a, libm::log(b) - w));
        }
        if x == 1.0 {
            // With b = 1 the mixture of the powers (a + j) x^(a + j - 1) has the value a + w.
            return Ok(ln_density_at_zero(b, libm::log(a + w)));
        }
        if !(0.0..=1.0).contains(&x) {
            return Ok(f64::NEG_INFINITY);
        }
        let sum = density_sum(BetaFamily(BetaPoint::of_fraction(a, b, x)), Weights { q: 0.0, w });
        Ok(sum.ln() - libm::log(x) - libm::log1p(-x))
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
        if self.ncp == 0.0 { Beta::new(self.a, self.b)?.quantile(p) } else { self.solve(p, false) }
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        if self.ncp == 0.0 {
            Beta::new(self.a, self.b)?.upper_quantile(p)
        } else {
            self.solve(p, true)
        }
    }
}
