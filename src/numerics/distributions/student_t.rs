//! Student's t distribution.

use super::invert::{POSITIVE_RANGE, Scale, beyond_range, monotone_root};
use super::normal::normal_upper_quantile;
use super::{Continuous, degrees_of_freedom, number, probability, settled};
use crate::numerics::error::Result;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::{BetaPoint, beta_tails};
use crate::numerics::special::gamma::stirling_remainder;
use crate::numerics::special::logarithms::ln_1p_minus;
use crate::numerics::special::normal::LN_SQRT_TAU;

/// Student's t distribution.
///
/// # Formula
///
/// ```text
/// P(T > t) = ½ I_y(ν/2, ½),   y = ν / (ν + t²),   t >= 0
/// f(t) = Γ((ν+1)/2) / (Γ(ν/2) √(νπ)) · (1 + t²/ν)^(-(ν+1)/2)
/// ```
///
/// # Units and ranges
///
/// `ν` = `df`: degrees of freedom, above 0 and at most 1e18, need not be whole. `I` is the regularised incomplete beta
/// function.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12, both tails down to 1e-290 (`tests/reference/central_tails.tsv`); quantiles: relative
/// 1e-13 (`tests/reference/quantiles.csv`).
///
/// # Sources
///
/// Johnson, Kotz, Balakrishnan (1995), Continuous Univariate Distributions 2, chapter 28. Quantile: Newton's method on
/// the logarithm of the tail, or of the mass between 0 and t near the centre.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, StudentT};
///
/// let critical = StudentT::new(10.0)?.upper_quantile(0.025)?;
/// assert!((critical - 2.228139).abs() < 1e-6);
/// assert!(StudentT::new(-1.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StudentT {
    df: f64,
    ln_peak: f64,
}

/// Where `t² / df` exceeds this, the tail is its leading power to full precision.
const POWER_TAIL: f64 = 1e18;

/// Below this the square of `t` is finite.
const SQUARABLE: f64 = 1e120;

impl StudentT {
    /// The distribution with `df` degrees of freedom.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) unless `0 < df <= 1e18`.
    pub fn new(df: f64) -> Result<Self> {
        let df = degrees_of_freedom("df", df)?;
        let b = 0.5 * df;
        // Γ(b + 1/2) / (Γ(b) sqrt(2πb)), the density at 0, by Stirling remainders.
        let ratio = b * ln_1p_minus(1.0 / df) + stirling_remainder(b + 0.5) - stirling_remainder(b);
        Ok(Self { df, ln_peak: ratio - LN_SQRT_TAU })
    }

    /// Degrees of freedom.
    pub fn df(&self) -> f64 {
        self.df
    }

    /// Density at 0.
    pub(crate) fn peak(&self) -> f64 {
        libm::exp(self.ln_peak)
    }

    /// Both tails at `t >= 0` or, mirrored, below.
    pub(crate) fn tails(&self, t: f64) -> Tails {
        if t < 0.0 {
            return self.tails(-t).swapped();
        }
        if t == f64::INFINITY {
            return Tails::Upper(Scaled::ZERO);
        }
        if t / self.df.sqrt() > POWER_TAIL.sqrt() {
            let exponent = self.df * (0.5 * libm::log(self.df) - libm::log(t)) + self.ln_peak;
            return Tails::Upper(Scaled { factor: 1.0 / self.df.sqrt(), exponent });
        }
        match self.central_mass(t) {
            Tails::Lower(centre) => Tails::Upper(Scaled::plain(0.5 - 0.5 * centre.value())),
            Tails::Upper(tail) => Tails::Upper(tail.times(0.5)),
        }
    }

    /// The tails of `|T|` at `t >= 0`.
    fn central_mass(&self, t: f64) -> Tails {
        let (odds, excess) = (0.5 * t * t, 0.5 * (t - 1.0) * (t + 1.0));
        beta_tails(BetaPoint::new(0.5, 0.5 * self.df, odds, excess))
    }

    /// Positive point whose upper tail is `p <= 1/2`.
    fn upper_half_quantile(&self, p: f64) -> Result<f64> {
        if p == 0.5 {
            return Ok(0.0);
        }
        if p == 0.0 {
            return Ok(f64::INFINITY);
        }
        let start = self.starting_point(p)?;
        let what = "quantile of Student's t";
        // Above a tail of 0.2 the mass between 0 and t keeps the relative accuracy that the tail loses there.
        let central = p > 0.2;
        let target = libm::log(if central { 0.5 - p } else { p });
        beyond_range(monotone_root(what, Scale::Logarithmic, start, POSITIVE_RANGE, |t| {
            let (ln, sign) = if central && t < SQUARABLE {
                (self.central_mass(t).lower_scaled().times(0.5).ln(), 1.0)
            } else if central {
                (libm::log(0.5 - self.tails(t).upper()), 1.0)
            } else {
                (self.tails(t).ln_upper(), -1.0)
            };
            Ok((ln - target, sign * libm::exp(self.ln_density(t)? + libm::log(t) - ln)))
        }))
    }

    /// A first guess: the leading power of the tail, or the normal quantile stretched, whichever is smaller.
    fn starting_point(&self, p: f64) -> Result<f64> {
        let normal = normal_upper_quantile(p)?;
        let ln_power = 0.5 * libm::log(self.df)
            + (self.ln_peak - 0.5 * libm::log(self.df) - libm::log(p)) / self.df;
        let z2 = normal * normal;
        let stretched = if z2 < self.df { normal * self.stretch(z2) } else { f64::MAX };
        Ok(stretched.min(libm::exp(ln_power.min(700.0))).max(1e-300))
    }
}

impl StudentT {
    /// Quantile of t over that of the normal with the square `z2`: Fisher, Cornish (1960), Technometrics 2, 209-225, in
    /// the form of Abramowitz, Stegun (1964), 26.7.5.
    fn stretch(&self, z2: f64) -> f64 {
        let v = 1.0 / self.df;
        let second = ((5.0 * z2 + 16.0) * z2 + 3.0) / 96.0;
        let third = (((3.0 * z2 + 19.0) * z2 + 17.0) * z2 - 15.0) / 384.0;
        let fourth = ((((79.0 * z2 + 776.0) * z2 + 1482.0) * z2 - 1920.0) * z2 - 945.0) / 92160.0;
        1.0 + v * ((z2 + 1.0) / 4.0 + v * (second + v * (third + v * fourth)))
    }
}

impl Continuous for StudentT {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?.abs();
        let growth = if x < SQUARABLE {
            libm::log1p(x * x / self.df)
        } else {
            2.0 * libm::log(x) - libm::log(self.df)
        };
        Ok(self.ln_peak - 0.5 * (self.df + 1.0) * growth)
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
        Ok(-self.upper_quantile(p)?)
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        let p = probability(p)?;
        if p > 0.5 { Ok(-self.upper_half_quantile(1.0 - p)?) } else { self.upper_half_quantile(p) }
    }
}
