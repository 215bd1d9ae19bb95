//! Continuous distributions, one file each, behind one trait.

pub mod beta;
pub mod chi_squared;
pub mod fisher_f;
pub(crate) mod invert;
pub mod noncentral_beta;
pub mod noncentral_chi_squared;
pub mod noncentral_f;
pub mod noncentral_t;
mod noncentral_t_integrals;
pub mod normal;
pub mod student_t;

use crate::numerics::error::{NumericsError, Result};

/// A continuous distribution on the line, with both tails computed directly.
///
/// Every method refuses NaN with [`NumericsError::OutOfDomain`] and accepts plus and minus infinity as limits.
pub trait Continuous {
    /// Probability density at `x`.
    fn density(&self, x: f64) -> Result<f64> {
        Ok(libm::exp(self.ln_density(x)?))
    }

    /// Natural logarithm of the density, minus infinity outside the support.
    fn ln_density(&self, x: f64) -> Result<f64>;

    /// Lower tail `P(X <= x)`; a small value is computed directly, never as one minus the other tail.
    fn cdf(&self, x: f64) -> Result<f64>;

    /// Upper tail `P(X > x)`; a small value is computed directly, never as one minus the other tail.
    fn sf(&self, x: f64) -> Result<f64>;

    /// Natural logarithm of the lower tail, finite where the tail itself underflows.
    fn ln_cdf(&self, x: f64) -> Result<f64>;

    /// Natural logarithm of the upper tail, finite where the tail itself underflows.
    fn ln_sf(&self, x: f64) -> Result<f64>;

    /// The point whose lower tail is `p`, for `0 <= p <= 1`.
    fn quantile(&self, p: f64) -> Result<f64>;

    /// The point whose upper tail is `p`, for `0 <= p <= 1`.
    fn upper_quantile(&self, p: f64) -> Result<f64>;
}

/// Refuses NaN as an argument.
pub(crate) fn number(name: &'static str, x: f64) -> Result<f64> {
    if x.is_nan() {
        Err(NumericsError::OutOfDomain { name, given: x, allowed: "a number" })
    } else {
        Ok(x)
    }
}

/// Refuses a result that is not a number: some series or integral used up its terms.
pub(crate) fn settled(value: f64) -> Result<f64> {
    if value.is_nan() {
        let what = "a tail probability";
        Err(NumericsError::NoConvergence { what, low: f64::NAN, high: f64::NAN, evaluations: 0 })
    } else {
        Ok(value)
    }
}

/// Refuses what is not a probability.
pub(crate) fn probability(p: f64) -> Result<f64> {
    if (0.0..=1.0).contains(&p) {
        Ok(p)
    } else {
        Err(NumericsError::OutOfDomain { name: "p", given: p, allowed: "between 0 and 1" })
    }
}

/// Largest degrees of freedom and shapes: far beyond, every family has become its normal or power limit.
pub const LARGEST_DEGREES_OF_FREEDOM: f64 = 1e18;

/// Refuses what are not degrees of freedom.
pub(crate) fn degrees_of_freedom(name: &'static str, df: f64) -> Result<f64> {
    if df > 0.0 && df <= LARGEST_DEGREES_OF_FREEDOM {
        Ok(df)
    } else {
        Err(NumericsError::OutOfDomain { name, given: df, allowed: "above 0 and at most 1e18" })
    }
}

/// Refuses what is not a finite positive parameter.
pub(crate) fn positive(name: &'static str, value: f64) -> Result<f64> {
    if value > 0.0 && value < f64::INFINITY {
        Ok(value)
    } else {
        Err(NumericsError::OutOfDomain { name, given: value, allowed: "finite and above 0" })
    }
}

/// Logarithm of a density at the lower end of its support, where it behaves like `x^(a - 1)`; `ln_value` is its value for `a = 1`.
pub(crate) fn ln_density_at_zero(a: f64, ln_value: f64) -> f64 {
    if a < 1.0 {
        f64::INFINITY
    } else if a == 1.0 {
        ln_value
    } else {
        f64::NEG_INFINITY
    }
}

/// Largest noncentrality of the chi-squared, F and beta families: beyond it, neighbouring `f64` values of the argument
/// lie too far apart for a tail probability to mean anything.
pub const LARGEST_NONCENTRALITY: f64 = 1e12;

/// Refuses what is not a noncentrality of the chi-squared, F and beta families.
pub(crate) fn noncentrality_parameter(ncp: f64) -> Result<f64> {
    if (0.0..=LARGEST_NONCENTRALITY).contains(&ncp) {
        Ok(ncp)
    } else {
        Err(NumericsError::OutOfDomain { name: "ncp", given: ncp, allowed: "between 0 and 1e12" })
    }
}
