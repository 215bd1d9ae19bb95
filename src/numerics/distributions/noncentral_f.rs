//! The noncentral F distribution.

use super::fisher_f::{FisherF, f_tails, far_ratio, paulson};
use super::invert::{noncentrality, positive_quantile};
use super::{
    Continuous, degrees_of_freedom, ln_density_at_zero, noncentrality_parameter, number, positive,
    settled,
};
use crate::numerics::error::Result;
use crate::numerics::scaled::Tails;
use crate::numerics::special::beta::{BetaFamily, BetaPoint, beta_tails};
use crate::numerics::special::normal::normal_quantile_guess;
use crate::numerics::special::poisson_mixture::{Weights, density_sum, mixture_tails, slope_sum};

/// Distribution of `(X / df1) / (Y / df2)` with `X` noncentral chi-squared and `Y` an independent central one.
///
/// # Formula
///
/// ```text
/// F(f) = Σ p_j I_x(ν₁/2 + j, ν₂/2),   x = ν₁ f / (ν₁ f + ν₂),   p_j = e^-w w^j / j!,   w = λ/2
/// ```
///
/// # Units and ranges
///
/// `ν₁` = `df1`, `ν₂` = `df2`: degrees of freedom, above 0 and at most 1e18. `λ` = `ncp`: noncentrality, 0 to 1e12.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12 up to `λ` = 1e6, both tails down to 1e-290 (`tests/reference/noncentral_f_cdf.csv`,
/// `noncentral_tails.tsv`, `densities.tsv`); beyond, as the argument's own rounding allows.
///
/// # Sources
///
/// Patnaik (1949), Biometrika 36, 202-232, for the mixture and for the start of the quantile. Summed as in
/// [`NoncentralChiSquared`](super::noncentral_chi_squared::NoncentralChiSquared).
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, NoncentralF};
///
/// let power = NoncentralF::new(3.0, 36.0, 12.0)?.sf(2.866)?;
/// assert!(power > 0.79 && power < 0.80);
/// assert!(NoncentralF::new(3.0, 36.0, f64::INFINITY).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoncentralF {
    df1: f64,
    df2: f64,
    ncp: f64,
}

impl NoncentralF {
    /// The distribution with `df1` and `df2` degrees of freedom and noncentrality `ncp`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless the degrees of freedom are
    /// above 0 and at most 1e18 and `0 <= ncp <= 1e12`.
    pub fn new(df1: f64, df2: f64, ncp: f64) -> Result<Self> {
        Ok(Self {
            df1: degrees_of_freedom("df1", df1)?,
            df2: degrees_of_freedom("df2", df2)?,
            ncp: noncentrality_parameter(ncp)?,
        })
    }

    /// The noncentrality at which `P(F > x) = p`; relative error of the tail reached: 1e-12.
    ///
    /// # Errors
    ///
    /// * [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) when an argument is outside its
    ///   range, or no noncentrality gives the tail `p`: an upper tail below that of the central distribution, say.
    /// * [`NumericsError::NoBracket`](crate::numerics::NumericsError::NoBracket) when the noncentrality would have to be
    ///   beyond its largest value.
    pub fn ncp_for_sf(df1: f64, df2: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(df1, df2, x, p, true)
    }

    /// The noncentrality at which `P(F <= x) = p`; accuracy and errors as [`Self::ncp_for_sf`].
    pub fn ncp_for_cdf(df1: f64, df2: f64, x: f64, p: f64) -> Result<f64> {
        Self::solve_ncp(df1, df2, x, p, false)
    }

    fn solve_ncp(df1: f64, df2: f64, x: f64, p: f64, upper: bool) -> Result<f64> {
        let (a, b) = (0.5 * degrees_of_freedom("df1", df1)?, 0.5 * degrees_of_freedom("df2", df2)?);
        let x = positive("x", x)?;
        ratio_noncentrality("noncentrality of F", a, b, p, upper, x)
    }

    fn tails(&self, f: f64) -> Tails {
        ratio_tails(0.5 * self.df1, 0.5 * self.df2, 0.5 * self.ncp, f)
    }

    fn ln_density_inside(&self, f: f64) -> f64 {
        ln_ratio_density(0.5 * self.df1, 0.5 * self.df2, 0.5 * self.ncp, f) - libm::log(f)
    }
}

/// Tails of the noncentral F variable with `2a`, `2b` degrees of freedom and noncentrality `2w`.
pub(crate) fn ratio_tails(a: f64, b: f64, w: f64, f: f64) -> Tails {
    f_tails(a, b, w, f, |point| point_tails(point, w))
}

/// Tails of the noncentral beta variable at a point.
pub(crate) fn point_tails(point: BetaPoint, w: f64) -> Tails {
    if w == 0.0 {
        return beta_tails(point);
    }
    mixture_tails(BetaFamily(point), w, point.excess < w)
}

/// Logarithm of the density of the ratio times the ratio.
pub(crate) fn ln_ratio_density(a: f64, b: f64, w: f64, f: f64) -> f64 {
    let far = far_ratio(a, b, w);
    if f > far {
        return ln_ratio_density(a, b, w, far) + b * (libm::log(far) - libm::log(f));
    }
    density_sum(BetaFamily(BetaPoint::of_ratio(a, b, f)), Weights { q: 0.0, w }).ln()
}

/// A first guess at the quantile: a scaled central F whose numerator has the same first two moments (Patnaik 1949).
pub(crate) fn ratio_start(a: f64, b: f64, w: f64, p: f64, upper: bool) -> f64 {
    let (mean, spread) = (a + w, a + 2.0 * w);
    let z = if upper { -normal_quantile_guess(p) } else { normal_quantile_guess(p) };
    mean / a * paulson(mean * mean / spread, b, z)
}

/// The noncentrality at which the tail of the ratio at `f` is `p`.
pub(crate) fn ratio_noncentrality(
    what: &'static str,
    a: f64,
    b: f64,
    p: f64,
    upper: bool,
    f: f64,
) -> Result<f64> {
    let f = f.min(far_ratio(a, b, 0.0));
    let point = BetaPoint::of_ratio(a, b, f);
    let spread = |w: f64| (a + 2.0 * w + (a + w) * (a + w) / b).sqrt();
    noncentrality(what, p, upper, point.excess, spread, |w| {
        let slope = slope_sum(BetaFamily(point), Weights { q: 0.0, w });
        (point_tails(point, w), slope)
    })
}

impl Continuous for NoncentralF {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        if self.ncp == 0.0 {
            return FisherF::new(self.df1, self.df2)?.ln_density(x);
        }
        if x == 0.0 {
            return Ok(ln_density_at_zero(0.5 * self.df1, -0.5 * self.ncp));
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
            return FisherF::new(self.df1, self.df2)?.quantile(p);
        }
        let start = ratio_start(0.5 * self.df1, 0.5 * self.df2, 0.5 * self.ncp, p, false);
        positive_quantile("quantile of noncentral F", p, false, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        if self.ncp == 0.0 {
            return FisherF::new(self.df1, self.df2)?.upper_quantile(p);
        }
        let start = ratio_start(0.5 * self.df1, 0.5 * self.df2, 0.5 * self.ncp, p, true);
        positive_quantile("quantile of noncentral F", p, true, start, |x| {
            (self.tails(x), self.ln_density_inside(x))
        })
    }
}
