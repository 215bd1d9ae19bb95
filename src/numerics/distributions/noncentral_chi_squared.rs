//! The noncentral chi-squared distribution.

use super::chi_squared::ChiSquared;
use super::invert::{noncentrality, positive_quantile};
use super::{
    Continuous, degrees_of_freedom, ln_density_at_zero, noncentrality_parameter, number, positive,
    settled,
};
use crate::numerics::error::Result;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::gamma::{GammaFamily, gamma_tails};
use crate::numerics::special::normal::normal_quantile_guess;
use crate::numerics::special::poisson_mixture::{Weights, density_sum, mixture_tails, slope_sum};

/// Distribution of a sum of `df` squared normal variables of unit variance whose squared means add up to `ncp`.
///
/// # Formula
///
/// ```text
/// F(x) = Σ p_j P(ν/2 + j, x/2),   p_j = e^-w w^j / j!,   w = λ/2
/// ```
///
/// # Units and ranges
///
/// `ν` = `df`: degrees of freedom, above 0 and at most 1e18. `λ` = `ncp`: noncentrality, 0 to 1e12.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12 up to `λ` = 1e6, both tails down to 1e-290 (`tests/reference/noncentral_chi2_cdf.csv`,
/// `noncentral_tails.tsv`, `densities.tsv`); beyond, as the argument's own rounding allows.
///
/// # Sources
///
/// Fisher (1928), Proceedings of the Royal Society A 121, 654-673. Near the mean, summed from `j = 0`; elsewhere in the
/// direction of growing tails, from where the terms begin to matter, and for large noncentralities as an integral over
/// real `j`.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, NoncentralChiSquared};
///
/// // 80 % power of a 5 % test with one degree of freedom.
/// let ncp = NoncentralChiSquared::ncp_for_sf(1.0, 3.841458820694124, 0.8)?;
/// assert!((ncp - 7.848861).abs() < 1e-5);
/// assert!(NoncentralChiSquared::new(1.0, -1.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoncentralChiSquared {
    df: f64,
    ncp: f64,
}

impl NoncentralChiSquared {
    /// The distribution with `df` degrees of freedom and noncentrality `ncp`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless `0 < df <= 1e18` and
    /// `0 <= ncp <= 1e12`.
    pub fn new(df: f64, ncp: f64) -> Result<Self> {
        Ok(Self { df: degrees_of_freedom("df", df)?, ncp: noncentrality_parameter(ncp)? })
    }

    /// The noncentrality at which `P(X > x) = p`; relative error of the tail reached: 1e-12.
    ///
    /// # Errors
    ///
    /// * [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) when an argument is outside its
    ///   range, or no noncentrality gives the tail `p`: an upper tail below that of the central distribution, say.
    /// * [`NumericsError::NoBracket`](crate::numerics::NumericsError::NoBracket) when the noncentrality would have to be
    ///   beyond its largest value.
    pub fn ncp_for_sf(df: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(df, x, p, true)
    }

    /// The noncentrality at which `P(X <= x) = p`; accuracy and errors as [`Self::ncp_for_sf`].
    pub fn ncp_for_cdf(df: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(df, x, p, false)
    }

    fn solve_ncp(df: f64, x: f64, p: f64, upper: bool) -> Result<f64> {
        let df = degrees_of_freedom("df", df)?;
        let x = positive("x", x)?;
        let (a, half) = (0.5 * df, 0.5 * x);
        let spread = |w: f64| (a + 2.0 * w).sqrt();
        noncentrality("noncentrality of chi-squared", p, upper, half - a, spread, |w| {
            let slope = slope_sum(GammaFamily { a, x: half }, Weights { q: 0.0, w });
            (tails(a, w, half), slope)
        })
    }

    fn tails(&self, x: f64) -> Tails {
        tails(0.5 * self.df, 0.5 * self.ncp, 0.5 * x)
    }

    fn ln_density_inside(&self, x: f64) -> f64 {
        if 0.5 * x > REMOTE {
            return self.tails(x).ln_upper();
        }
        let family = GammaFamily { a: 0.5 * self.df, x: 0.5 * x };
        density_sum(family, Weights { q: 0.0, w: 0.5 * self.ncp }).ln() - libm::log(x)
    }

    /// Patnaik (1949): a scaled central chi-squared with the same mean and variance.
    fn starting_point(&self, p: f64, upper: bool) -> f64 {
        let (mean, spread) = (self.df + self.ncp, self.df + 2.0 * self.ncp);
        let (scale, df) = (spread / mean, mean * mean / spread);
        let z = if upper { -normal_quantile_guess(p) } else { normal_quantile_guess(p) };
        let h = 2.0 / (9.0 * df);
        let root = (1.0 - h + z * h.sqrt()).max(0.05);
        scale * df * root * root * root
    }
}

/// Beyond this the tail is zero as an `f64` for all parameters, and its logarithm is `-(sqrt(x) - sqrt(ncp))² / 2` to
/// twelve digits.
const REMOTE: f64 = 1e30;

fn tails(a: f64, w: f64, x: f64) -> Tails {
    if x <= 0.0 {
        Tails::Lower(Scaled::ZERO)
    } else if x == f64::INFINITY {
        Tails::Upper(Scaled::ZERO)
    } else if w == 0.0 {
        gamma_tails(a, x)
    } else if x > REMOTE {
        let root = x.sqrt() - w.sqrt();
        Tails::Upper(Scaled { factor: 1.0, exponent: -root * root })
    } else {
        mixture_tails(GammaFamily { a, x }, w, x < a + w)
    }
}

impl Continuous for NoncentralChiSquared {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        if self.ncp == 0.0 {
            return ChiSquared::new(self.df)?.ln_density(x);
        }
        if x == 0.0 {
            return Ok(ln_density_at_zero(0.5 * self.df, libm::log(0.5) - 0.5 * self.ncp));
        }
        Ok(if x < 0.0 || x == f64::INFINITY {
            f64::NEG_INFINITY
        } else {
            self.ln_density_inside(x)
        })
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
        if self.ncp == 0.0 {
            return ChiSquared::new(self.df)?.quantile(p);
        }
        let start = self.starting_point(p, false);
        positive_quantile("quantile of noncentral chi-squared", p, false, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        if self.ncp == 0.0 {
            return ChiSquared::new(self.df)?.upper_quantile(p);
        }
        let start = self.starting_point(p, true);
        positive_quantile("quantile of noncentral chi-squared", p, true, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }
}
