//! Student's t distribution.

use super::invert::{POSITIVE_RANGE, Scale, beyond_range, monotone_root};
use super::normal::normal_upper_quantile;
use super::{Continuous, degrees_of_freedom, number, probability, settled};
use crate::numerics::error::Result;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::{BetaPoint, beta_tails};
use crate::numerics::special::student_tail::{StudentPoint, peak, upper_factor};

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
/// Johnson, Kotz, Balakrishnan (1995), Continuous Univariate Distributions 2, chapter 28. Quantile: Hill (1970)
/// and one step of fourth order; elsewhere Newton's method on the logarithm of the tail, or of the mass between 0 and t.
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
    /// Density at 0.
    peak: f64,
}

/// Where `t² / df` exceeds this, the tail is its leading power to full precision.
const POWER_TAIL: f64 = 1e18;

/// Above this tail a quantile is solved for through the mass between 0 and it.
const CENTRAL: f64 = 0.3;

/// Largest step, relative to the quantile and to the tail's own scale, whose fifth power is negligible.
const EXPANDABLE: f64 = 1e-3;

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
        Ok(Self { df, peak: peak(0.5 * df) })
    }

    /// Degrees of freedom.
    pub fn df(&self) -> f64 {
        self.df
    }

    /// Density at 0.
    pub(crate) fn peak(&self) -> f64 {
        self.peak
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
            let exponent = self.df * (0.5 * libm::log(self.df) - libm::log(t));
            return Tails::Upper(Scaled { factor: self.peak / self.df.sqrt(), exponent });
        }
        let point = StudentPoint::of_ratio(0.5 * self.df, t * (t / self.df));
        if let Some(factor) = upper_factor(point, self.peak) {
            return Tails::Upper(Scaled { factor, exponent: -point.b * point.log });
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
        let normal = normal_upper_quantile(p)?;
        if let Some(quantile) = self.expanded_quantile(p, normal) {
            return Ok(quantile);
        }
        let start = self.starting_point(p, normal);
        let what = "quantile of Student's t";
        // Above this tail the mass between 0 and t keeps the relative accuracy that the tail loses there.
        let central = p > CENTRAL;
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

    /// The positive quantile by one step of fourth order from [`Self::stretched`]; none where that is too far off.
    fn expanded_quantile(&self, p: f64, normal: f64) -> Option<f64> {
        let df = self.df;
        let log = self.stretched(normal)?;
        let ratio = libm::expm1(log);
        let y = 1.0 / (1.0 + ratio);
        let point = StudentPoint { b: 0.5 * df, log, x: ratio * y, y };
        let root = (df * ratio).sqrt();
        // All in units of the density at the start, peak · y^(b + 1/2).
        let slope = self.peak * y.sqrt();
        let scale = slope * libm::exp(-point.b * log);
        let u = if p > CENTRAL {
            // Near the centre the mass between 0 and t keeps the relative accuracy that the tail loses there.
            (0.5 - p) / scale - root * centre_series(point)
        } else {
            upper_factor(point, self.peak)? / slope - p / scale
        };
        // Reversion of the tail's Taylor series by g = -f'/f and its derivatives.
        let c = (df + 1.0) / df * y;
        let g = c * root;
        if (u * g).abs() > EXPANDABLE || u.abs() > EXPANDABLE * root {
            return None;
        }
        let g1 = c * (y - point.x);
        let g2 = -2.0 * g * (3.0 * y - point.x) * y / df;
        let third = (g1 + 2.0 * g * g) / 6.0;
        let fourth = (g2 + 7.0 * g * g1 + 6.0 * g * g * g) / 24.0;
        Some(root + u * (1.0 + u * (0.5 * g + u * (third + u * fourth))))
    }

    /// `ln(1 + t²/df)` at nearly the quantile whose normal counterpart is `z`; none where the expansion does not serve.
    ///
    /// Hill (1970), Communications of the ACM 13(10), 617-620: `z² ≈ (df - ½) ln(1 + t²/df)` with two corrections.
    fn stretched(&self, z: f64) -> Option<f64> {
        let (a, z2) = (self.df - 0.5, z * z);
        let v = 1.0 / (48.0 * a * a);
        let second = ((0.4 * z2 + 6.3) * z2 + 36.0) * z2 + 94.5;
        let w = z * (1.0 - v * (z2 + 3.0 - v * second));
        (a > 2.0 && z2 < a).then(|| w * w / a)
    }

    /// A first guess elsewhere: the leading power of the tail, or the normal quantile stretched, whichever is smaller.
    fn starting_point(&self, p: f64, normal: f64) -> f64 {
        let ln_root = 0.5 * libm::log(self.df);
        let ln_power = ln_root + (libm::log(self.peak) - ln_root - libm::log(p)) / self.df;
        let power = libm::exp(ln_power.min(700.0));
        let stretched =
            self.stretched(normal).map_or(f64::MAX, |log| (self.df * libm::expm1(log)).sqrt());
        stretched.min(power).max(1e-300)
    }
}

/// `Σ (b + ½)_n / (3/2)_n x^n`: the mass between 0 and `t` over `t f(t)`.
fn centre_series(point: StudentPoint) -> f64 {
    let (mut top, mut bottom) = (point.b + 0.5, 1.5);
    let (mut term, mut sum) = (1.0, 1.0);
    // Used for t < 1 and at least 2.5 degrees of freedom, where every ratio of terms is below 0.6.
    while term > 1e-17 * sum {
        term *= point.x * top / bottom;
        sum += term;
        top += 1.0;
        bottom += 1.0;
    }
    sum
}

impl Continuous for StudentT {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?.abs();
        let growth = if x < SQUARABLE {
            libm::log1p(x * x / self.df)
        } else {
            2.0 * libm::log(x) - libm::log(self.df)
        };
        Ok(libm::log(self.peak) - 0.5 * (self.df + 1.0) * growth)
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
