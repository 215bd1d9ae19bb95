//! The chi-squared distribution.

use super::invert::positive_quantile;
use super::{Continuous, degrees_of_freedom, ln_density_at_zero, number};
use crate::numerics::error::Result;
use crate::numerics::scaled::Tails;
use crate::numerics::special::gamma::{gamma_tails, log_gamma, poisson_density};
use crate::numerics::special::normal::normal_quantile_guess;

/// The chi-squared distribution with real degrees of freedom above 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ChiSquared {
    df: f64,
}

impl ChiSquared {
    /// The distribution with `df` degrees of freedom, `0 < df < infinity`.
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
        Ok(self.tails(number("x", x)?).lower())
    }

    fn sf(&self, x: f64) -> Result<f64> {
        Ok(self.tails(number("x", x)?).upper())
    }

    fn ln_cdf(&self, x: f64) -> Result<f64> {
        Ok(self.tails(number("x", x)?).ln_lower())
    }

    fn ln_sf(&self, x: f64) -> Result<f64> {
        Ok(self.tails(number("x", x)?).ln_upper())
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
