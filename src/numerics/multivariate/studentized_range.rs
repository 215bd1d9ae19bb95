//! The studentised range: the largest difference among `k` means in units of an estimated standard deviation.

use super::interval::{log_interval, log_sf};
use super::line_integral::{Region, integrate_exp};
use super::scale_mixture::{
    ScaleMixture, Tail, checked_critical, checked_df, checked_probability, solve,
};
use crate::numerics::distributions::Continuous;
use crate::numerics::distributions::normal::normal_upper_quantile;
use crate::numerics::distributions::student_t::StudentT;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::special::normal::LN_SQRT_TAU;
use libm::{erf, erfc, exp, expm1, log, log1p};

/// What the searches and quadratures of this file are called in errors.
const WHAT: &str = "studentised range";

/// Below this logarithm a probability that one of several events happens is their sum.
const SIMPLE: f64 = -60.0;

/// Beyond this distance from its middle every integrand here is negligible relative to the integral.
const REACH: f64 = 9.5;

/// From here on the upper tail is below the smallest double: the normal tail at `FAR / sqrt(2)`.
const FAR: f64 = 56.0;

/// Distribution of `(max Zᵢ - min Zᵢ) / s` for `k` independent standard normals and an independent
/// `s = sqrt(χ²_ν / ν)`.
///
/// # Formula
///
/// ```text
/// P(Q <= q) = E[R(q s)]     R(w) = k ∫ φ(z) [Φ(z + w) - Φ(z)]^(k-1) dz
/// 1 - R(w)  = k ∫ φ(z) Φ(-z)^(k-1) (1 - [1 - Φ(-z - w) / Φ(-z)]^(k-1)) dz
/// ```
///
/// Both tails are integrals of positive terms; neither is one minus the other.
///
/// # Units and ranges
///
/// `k` from 2 to 1000 means, `ν >= 0.5` degrees of freedom (infinite: known standard deviation), `q >= 0`.
///
/// # Accuracy
///
/// `cdf` and `sf` to 2e-14 absolute, both tails to 1e-11 of their own size down to 1e-290, quantiles to 1e-12 relative
/// (`tests/reference/studentized_range.csv`, `tests/reference/studentized_range_critical.csv`).
///
/// # Sources
///
/// Hartley (1942), Biometrika 32, 334-348, for `R`.
///
/// # Example
///
/// ```
/// use sufficit::numerics::multivariate::StudentizedRange;
///
/// let range = StudentizedRange::new(3, 10.0)?;
/// let critical = range.upper_quantile(0.05)?;
/// assert!((critical - 3.877).abs() < 0.001);
/// assert!(StudentizedRange::new(1, 10.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StudentizedRange {
    means: f64,
    df: f64,
}

impl StudentizedRange {
    /// The range of `means` means with `df` degrees of freedom for the standard deviation.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] for fewer than 2 or more than 1000 means, or fewer than 1/2 degrees
    /// of freedom.
    pub fn new(means: u64, df: f64) -> Result<Self> {
        if !(2..=1000).contains(&means) {
            return Err(NumericsError::OutOfDomain {
                name: "means",
                given: means as f64,
                allowed: "from 2 to 1000",
            });
        }
        Ok(StudentizedRange { means: means as f64, df: checked_df(df)? })
    }

    /// `P(Q <= q)`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `q` is NaN; [`NumericsError::NoConvergence`] from the quadrature.
    pub fn cdf(&self, q: f64) -> Result<f64> {
        if checked_critical(q)? <= 0.0 {
            return Ok(0.0);
        }
        let value = ScaleMixture::new(self.lower(), self.df, q, 0.0).at(q)?;
        Ok(value.min(1.0))
    }

    /// `P(Q > q)`, small values directly.
    ///
    /// # Errors
    ///
    /// As [`StudentizedRange::cdf`].
    pub fn sf(&self, q: f64) -> Result<f64> {
        if checked_critical(q)? <= 0.0 {
            return Ok(1.0);
        }
        let value = ScaleMixture::new(self.upper(), self.df, q, 0.0).at(q)?;
        Ok(value.min(1.0))
    }

    /// The `q` with `P(Q <= q) = p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not strictly between 0 and 1;
    /// [`NumericsError::NoBracket`] when `q` would leave the range of doubles.
    pub fn quantile(&self, p: f64) -> Result<f64> {
        let p = checked_probability(p)?;
        if p > 0.5 {
            return self.where_upper_is(1.0 - p);
        }
        self.where_lower_is(p)
    }

    /// The `q` with `P(Q > q) = p`: the critical value at significance level `p`.
    ///
    /// # Errors
    ///
    /// As [`StudentizedRange::quantile`].
    pub fn upper_quantile(&self, p: f64) -> Result<f64> {
        let p = checked_probability(p)?;
        if p > 0.5 {
            return self.where_lower_is(1.0 - p);
        }
        self.where_upper_is(p)
    }

    fn where_upper_is(&self, p: f64) -> Result<f64> {
        solve(WHAT, self.upper(), self.df, p, self.guess(p)?)
    }

    fn where_lower_is(&self, p: f64) -> Result<f64> {
        solve(WHAT, self.lower(), self.df, p, self.guess(0.5)?)
    }

    /// The critical value by Bonferroni's inequality over all pairs.
    fn guess(&self, p: f64) -> Result<f64> {
        let share = p / (self.means * (self.means - 1.0));
        let critical = if self.df == f64::INFINITY {
            normal_upper_quantile(share)?
        } else {
            StudentT::new(self.df)?.upper_quantile(share)?
        };
        Ok(critical * std::f64::consts::SQRT_2)
    }

    fn lower(&self) -> Tail<impl Fn(f64) -> Result<f64>> {
        let means = self.means;
        Tail { inner: move |w| range_cdf(means, w), at_zero: 0.0, at_infinity: 1.0 }
    }

    fn upper(&self) -> Tail<impl Fn(f64) -> Result<f64>> {
        let means = self.means;
        Tail { inner: move |w| range_sf(means, w), at_zero: 1.0, at_infinity: 0.0 }
    }
}

/// Lower tail of the range of `means` independent standard normals.
fn range_cdf(means: f64, w: f64) -> Result<f64> {
    if means == 2.0 {
        return Ok(erf(0.5 * w));
    }
    if w >= FAR {
        return Ok(1.0);
    }
    let others = means - 1.0;
    let region = Region { low: -REACH, high: REACH, even: false };
    let value = integrate_exp(WHAT, region, first_step(means), |z| {
        others * log_interval(z, w) - 0.5 * z * z - LN_SQRT_TAU
    })?;
    Ok(means * value)
}

/// Upper tail of the range of `means` independent standard normals.
fn range_sf(means: f64, w: f64) -> Result<f64> {
    if means == 2.0 {
        return Ok(erfc(0.5 * w));
    }
    if w >= FAR {
        return Ok(0.0);
    }
    let others = means - 1.0;
    let region = Region { low: -0.5 * w - REACH, high: REACH - 0.5 * w, even: false };
    let value = integrate_exp(WHAT, region, first_step(means), |z| {
        let log_above = log_sf(z);
        let log_beyond = log_sf(z + w) - log_above;
        let log_missed = if log_beyond < SIMPLE {
            log(others) + log_beyond
        } else {
            log(-expm1(others * log1p(-exp(log_beyond).min(1.0))))
        };
        others * log_above + log_missed - 0.5 * z * z - LN_SQRT_TAU
    })?;
    Ok(means * value)
}

/// The first step of the trapezoidal rule: the more means, the narrower the integrand.
fn first_step(means: f64) -> f64 {
    f64::min(0.75, 2.0 / log(means))
}
