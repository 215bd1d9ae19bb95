//! Fisher's F distribution.

use super::invert::positive_quantile;
use super::{Continuous, degrees_of_freedom, ln_density_at_zero, number, settled};
use crate::numerics::error::Result;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::{BetaPoint, beta_step, beta_tails};
use crate::numerics::special::normal::normal_quantile_guess;

/// Fisher's F distribution: the ratio of two independent chi-squared variables, each over its degrees of freedom.
///
/// # Formula
///
/// ```text
/// F(f) = I_x(ν₁/2, ν₂/2),   x = ν₁ f / (ν₁ f + ν₂)
/// ```
///
/// # Units and ranges
///
/// `ν₁` = `df1`, `ν₂` = `df2`: degrees of freedom, above 0 and at most 1e18, need not be whole.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12, both tails down to 1e-290 (`tests/reference/central_tails.tsv`); quantiles: relative
/// 1e-13 (`tests/reference/quantiles.csv`).
///
/// # Sources
///
/// Continued fraction: DiDonato, Morris (1992), ACM TOMS 18(3), 360-373. Start of the quantile: Paulson (1942), Annals of
/// Mathematical Statistics 13, 233-235.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, FisherF};
///
/// let critical = FisherF::new(3.0, 20.0)?.upper_quantile(0.05)?;
/// assert!((critical - 3.098391).abs() < 1e-6);
/// assert!(FisherF::new(3.0, f64::NAN).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FisherF {
    a: f64,
    b: f64,
}

impl FisherF {
    /// The distribution with `df1` numerator and `df2` denominator degrees of freedom.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless both are above 0 and at most
    /// 1e18.
    pub fn new(df1: f64, df2: f64) -> Result<Self> {
        Ok(Self {
            a: 0.5 * degrees_of_freedom("df1", df1)?,
            b: 0.5 * degrees_of_freedom("df2", df2)?,
        })
    }

    fn tails(&self, f: f64) -> Tails {
        f_tails(self.a, self.b, 0.0, f, beta_tails)
    }

    fn ln_density_inside(&self, f: f64) -> f64 {
        ln_central_ratio_density(self.a, self.b, f) - libm::log(f)
    }

    fn starting_point(&self, p: f64, upper: bool) -> f64 {
        let z = if upper { -normal_quantile_guess(p) } else { normal_quantile_guess(p) };
        paulson(self.a, self.b, z)
    }
}

/// Paulson (1942): the cube root of F is nearly a ratio of normals; inverted for the normal point `z`.
pub(crate) fn paulson(a: f64, b: f64, z: f64) -> f64 {
    let (u, v) = (1.0 / (9.0 * a), 1.0 / (9.0 * b));
    let (p, q) = (1.0 - u, 1.0 - v);
    let denominator = q * q - z * z * v;
    if denominator < 0.1 {
        return if z > 0.0 { 4.0 } else { 0.25 };
    }
    let discriminant = (p * p * v + q * q * u - z * z * u * v).max(0.0);
    let root = (p * q + z * discriminant.sqrt()) / denominator;
    if root < 0.1 { 1e-3 } else { root * root * root }
}

/// Tails of an F-type variable at `f`, with `central` evaluating them at an ordinary point.
///
/// Beyond a ratio where the tail has become its leading power `f^-b`, the tail is continued by that power: the odds
/// would overflow.
pub(crate) fn f_tails(
    a: f64,
    b: f64,
    w: f64,
    f: f64,
    central: impl Fn(BetaPoint) -> Tails,
) -> Tails {
    if f <= 0.0 {
        return Tails::Lower(Scaled::ZERO);
    }
    if f == f64::INFINITY {
        return Tails::Upper(Scaled::ZERO);
    }
    let far = far_ratio(a, b, w);
    if f <= far {
        return central(BetaPoint::of_ratio(a, b, f));
    }
    let tail = central(BetaPoint::of_ratio(a, b, far)).upper_scaled();
    Tails::Upper(tail.times_exp(b * (libm::log(far) - libm::log(f))))
}

/// The ratio beyond which the upper tail is its leading power.
pub(crate) fn far_ratio(a: f64, b: f64, w: f64) -> f64 {
    POWER_TAIL * (1.0 + (1.0 + w) / a) * (1.0 + b)
}

/// Logarithm of the density of a central F variable with `2a` and `2b` degrees of freedom, times the variable.
pub(crate) fn ln_central_ratio_density(a: f64, b: f64, f: f64) -> f64 {
    let far = far_ratio(a, b, 0.0);
    if f > far {
        return ln_central_ratio_density(a, b, far) + b * (libm::log(far) - libm::log(f));
    }
    beta_step(BetaPoint::of_ratio(a, b, f)).times(a).ln()
}

/// Ratio, scaled by the shapes, beyond which the upper tail is its leading power to full precision.
const POWER_TAIL: f64 = 1e18;

impl Continuous for FisherF {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        if x == 0.0 {
            return Ok(ln_density_at_zero(self.a, 0.0));
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
        positive_quantile("quantile of F", p, false, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        let start = self.starting_point(p, true);
        positive_quantile("quantile of F", p, true, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }
}
