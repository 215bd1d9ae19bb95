//! The chi-squared distribution.

use super::invert::positive_quantile;
use super::{Continuous, degrees_of_freedom, ln_density_at_zero, number, settled};
use crate::numerics::error::Result;
use crate::numerics::scaled::Tails;
use crate::numerics::special::gamma::{gamma_tails, log_gamma, poisson_density};
use crate::numerics::special::normal::normal_quantile_guess;

/// The chi-squared distribution.
///
/// # Formula
///
/// ```text
/// F(x) = P(ν/2, x/2)
/// ```
///
/// # Units and ranges
///
/// `ν` = `df`: degrees of freedom, above 0 and at most 1e18, need not be whole. `P` is the regularised lower incomplete
/// gamma function.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12, both tails down to 1e-290 (`tests/reference/central_tails.tsv`); quantiles: relative
/// 1e-13 (`tests/reference/quantiles.csv`).
///
/// # Sources
///
/// Power series and continued fraction: DLMF 8.11.4 and 8.9.2. Start of the quantile: Wilson, Hilferty (1931), PNAS 17,
/// 684-688.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, ChiSquared};
///
/// let critical = ChiSquared::new(1.0)?.upper_quantile(0.05)?;
/// assert!((critical - 3.841459).abs() < 1e-6);
/// assert!(ChiSquared::new(0.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ChiSquared {
    df: f64,
}

impl ChiSquared {
    /// The distribution with `df` degrees of freedom.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless `0 < df <= 1e18`.
    pub fn new(df: f64) -> Result<Self> {
        Ok(Self { df: degrees_of_freedom("df", df)? })
    }

    /// Degrees of freedom.
    pub fn df(&self) -> f64 {
        self.df
    }

    fn tails(&self, x: f64) -> Tails {
        gamma_tails(0.5 * self.df, 0.5 * x)
    }

    fn ln_density_inside(&self, x: f64) -> f64 {
        let a = 0.5 * self.df;
        poisson_density(a, 0.5 * x).times(a).ln() - libm::log(x)
    }

    /// Wilson and Hilferty (1931) near the centre, the leading power for small lower tails.
    fn starting_point(&self, p: f64, upper: bool) -> f64 {
        let z = if upper { -normal_quantile_guess(p) } else { normal_quantile_guess(p) };
        let spread = 2.0 / (9.0 * self.df);
        let root = 1.0 - spread + z * spread.sqrt();
        let cube = if root > 0.0 { self.df * root * root * root } else { 0.0 };
        if root > 0.3 {
            return cube;
        }
        let a = 0.5 * self.df;
        let ln_p = if upper { libm::log1p(-p) } else { libm::log(p) };
        2.0 * libm::exp((ln_p + log_gamma(a + 1.0)) / a)
    }
}

impl Continuous for ChiSquared {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        if x == 0.0 {
            return Ok(ln_density_at_zero(0.5 * self.df, libm::log(0.5)));
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
        let start = self.starting_point(p, false);
        positive_quantile("quantile of chi-squared", p, false, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        let start = self.starting_point(p, true);
        positive_quantile("quantile of chi-squared", p, true, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }
}
