//! The noncentral t distribution.

use core::f64::consts::{FRAC_1_SQRT_2, FRAC_2_SQRT_PI};

use super::invert::{POSITIVE_RANGE, Scale, beyond_range, monotone_root};
use super::noncentral_t_integrals::{central_moment_integral, normal_order, scale_order};
use super::student_t::StudentT;
use super::{Continuous, degrees_of_freedom, number, probability, settled};
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::{BetaFamily, BetaPoint};
use crate::numerics::special::normal::{normal_cdf, normal_ln_sf, normal_quantile_guess};
use crate::numerics::special::poisson_mixture::{Family, Weights, lower_sum, upper_sum};

/// Distribution of `(Z + ncp) / sqrt(V / df)` with `Z` standard normal and `V` an independent chi-squared with `df`
/// degrees of freedom.
///
/// # Formula
///
/// ```text
/// P(T > t) = ½ Σ [p_j I_y(ν/2, j + ½) + q_j I_y(ν/2, j + 1)],   t > 0, δ > 0
/// p_j = e^-w w^j / j!,   q_j = e^-w w^(j+½) / Γ(j + 3/2),   w = δ²/2,   y = ν / (ν + t²)
///
/// P(T > t) = ∫ Φ(δ - t s) f(s) ds,   f the density of s = √(V/ν)
/// ```
///
/// # Units and ranges
///
/// `ν` = `df`: degrees of freedom, 0.01 to 1e18, need not be whole. `δ` = `ncp`: noncentrality, -1e8 to 1e8.
///
/// The series serves up to `δ` = 12, where all its terms are positive; the integral, whose integrand is positive
/// everywhere, serves a larger `δ` and the tail away from it (`t` and `δ` of opposite sign), where the series would cancel.
///
/// # Accuracy
///
/// Tails and density: relative 1e-12 for `|δ|` up to 1e3, both tails down to 1e-290 (`tests/reference/noncentral_t_cdf.csv`,
/// `noncentral_tails.tsv`, `densities.tsv`); for larger `|δ|` as the rounding of `t` allows, 1e-16 `|δ|` standard deviations.
///
/// # Sources
///
/// Series: Lenth (1989), Applied Statistics 38(1), 185-189, as an upper tail. Integral: Johnson, Kotz, Balakrishnan (1995),
/// Continuous Univariate Distributions 2, chapter 31; trapezoidal rule in `ln s`.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, NoncentralT};
///
/// // Power of a two-sided 5 % t test with 64 per group and a difference of half a standard deviation, upper tail.
/// let power = NoncentralT::new(126.0, 0.5 * 32.0_f64.sqrt())?.sf(1.978971)?;
/// assert!((power - 0.8015).abs() < 1e-4);
/// assert!(NoncentralT::new(126.0, f64::NAN).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoncentralT {
    df: f64,
    ncp: f64,
    central: StudentT,
}

/// Largest size of the noncentrality; the argument of the distribution is known to 1e-8 of a standard deviation there.
pub const LARGEST_T_NONCENTRALITY: f64 = 1e8;

/// Below this the scale `s` spreads over so many powers of ten that its integrals become too long.
pub const LEAST_DEGREES_OF_FREEDOM: f64 = 0.01;

/// Above this noncentrality the tails come by quadrature instead of series.
const SERIES_LIMIT: f64 = 12.0;

/// Beyond this multiple of the noncentrality, scaled by the degrees of freedom, the upper tail is its leading power.
const POWER_TAIL: f64 = 1e9;

/// Exponent up to which `y^b` and its reciprocal are ordinary numbers.
const REPRESENTABLE: f64 = 500.0;

/// Standardised distance below which the lower tail is certainly the one to compute.
const CLEARLY_BELOW: f64 = -2.2;

/// An upper tail above this leaves too few digits to the lower one.
const NEARLY_ALL: f64 = 0.98;

/// Terms below this share of the sum are left out.
const NEGLIGIBLE: f64 = 4e-18;

impl NoncentralT {
    /// The distribution with `df` degrees of freedom and noncentrality `ncp` of either sign.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] unless `0.01 <= df <= 1e18` and `-1e8 <= ncp <= 1e8`.
    pub fn new(df: f64, ncp: f64) -> Result<Self> {
        let df = degrees_of_freedom("df", df)?;
        if df < LEAST_DEGREES_OF_FREEDOM {
            return Err(NumericsError::OutOfDomain {
                name: "df",
                given: df,
                allowed: "between 0.01 and 1e18",
            });
        }
        if ncp.is_nan() || ncp.abs() > LARGEST_T_NONCENTRALITY {
            return Err(NumericsError::OutOfDomain {
                name: "ncp",
                given: ncp,
                allowed: "between -1e8 and 1e8",
            });
        }
        Ok(Self { df, ncp, central: StudentT::new(df)? })
    }

    /// The noncentrality, of either sign, at which `P(T > x) = p`; relative error of the tail reached: 1e-12.
    ///
    /// # Errors
    ///
    /// * [`NumericsError::OutOfDomain`] when `df` or `x` is outside its range, or `p` is not inside (0, 1).
    /// * [`NumericsError::NoBracket`] when the noncentrality would have to be beyond its largest value.
    pub fn ncp_for_sf(df: f64, x: f64, p: f64) -> Result<f64> {
        let p = probability(p)?;
        if p > 0.5 {
            Self::solve_ncp(df, x, 1.0 - p, false, p)
        } else {
            Self::solve_ncp(df, x, p, true, p)
        }
    }

    /// The noncentrality at which `P(T <= x) = p`; accuracy and errors as [`Self::ncp_for_sf`].
    pub fn ncp_for_cdf(df: f64, x: f64, p: f64) -> Result<f64> {
        let p = probability(p)?;
        if p > 0.5 {
            Self::solve_ncp(df, x, 1.0 - p, true, p)
        } else {
            Self::solve_ncp(df, x, p, false, p)
        }
    }

    /// The noncentrality at which the named tail at `x` is `p <= 1/2`.
    fn solve_ncp(df: f64, x: f64, p: f64, upper: bool, given: f64) -> Result<f64> {
        let df = degrees_of_freedom("df", df)?;
        if !x.is_finite() {
            return Err(NumericsError::OutOfDomain { name: "x", given: x, allowed: "finite" });
        }
        if p == 0.0 {
            return Err(NumericsError::OutOfDomain {
                name: "p",
                given,
                allowed: "above 0 and below 1",
            });
        }
        let target = libm::log(p);
        let z = normal_quantile_guess(p);
        let spread = (1.0 + x * (x / (2.0 * df))).sqrt();
        let guess = if upper { x + z * spread } else { x - z * spread };
        let limit = LARGEST_T_NONCENTRALITY;
        monotone_root(
            "noncentrality of t",
            Scale::Linear,
            guess.clamp(-limit, limit),
            (-limit, limit),
            |ncp| {
                let distribution = Self::new(df, ncp)?;
                let tails = distribution.tails(x);
                let (ln, sign) =
                    if upper { (tails.ln_upper(), 1.0) } else { (tails.ln_lower(), -1.0) };
                Ok((ln - target, sign * libm::exp(distribution.ln_integral(x, 0.0) - ln)))
            },
        )
    }

    /// Both tails at `t`, the smaller one directly.
    pub(crate) fn tails(&self, t: f64) -> Tails {
        if t < 0.0 {
            return self.mirrored().tails(-t).swapped();
        }
        if t == f64::INFINITY {
            return Tails::Upper(Scaled::ZERO);
        }
        if self.ncp == 0.0 {
            return self.central.tails(t);
        }
        if t == 0.0 {
            let (exponent, upper) = (normal_ln_sf(self.ncp.abs()), self.ncp < 0.0);
            let tail = Scaled { factor: 1.0, exponent };
            return if upper { Tails::Upper(tail) } else { Tails::Lower(tail) };
        }
        let far = self.far();
        if t > far {
            let tail = self.tails(far).upper_scaled();
            return Tails::Upper(tail.times_exp(self.df * (libm::log(far) - libm::log(t))));
        }
        if self.ncp > 0.0 && self.ncp <= SERIES_LIMIT {
            return self.series(t);
        }
        self.integral(t, t > self.ncp)
    }

    fn mirrored(&self) -> Self {
        Self { ncp: -self.ncp, ..*self }
    }

    /// Where the upper tail has become its leading power `t^-df`.
    fn far(&self) -> f64 {
        POWER_TAIL * (self.ncp.abs() + 10.0) * (1.0 + self.df)
    }

    /// Mixture of incomplete beta functions, all terms positive: `t > 0`, `0 < ncp <= SERIES_LIMIT`.
    fn series(&self, t: f64) -> Tails {
        let ratio = t * (t / self.df);
        let fall = 0.5 * self.df * libm::log1p(ratio);
        // The upper tail is the cheaper one; it serves unless the lower one is so small that its digits would be lost.
        let z = (t - self.ncp) / (1.0 + 0.5 * ratio).sqrt();
        if fall < REPRESENTABLE && z > CLEARLY_BELOW {
            let upper = self.upper_series(t, ratio, fall);
            if upper.value() < NEARLY_ALL {
                return Tails::Upper(upper);
            }
        }
        let w = 0.5 * self.ncp * self.ncp;
        let odds = 0.5 * t * t;
        let even = BetaFamily(BetaPoint::new(0.5, 0.5 * self.df, odds, odds - 0.5));
        let odd = BetaFamily(BetaPoint::new(1.0, 0.5 * self.df, odds, odds - 1.0));
        let (even_weights, odd_weights) = (Weights { q: 0.0, w }, Weights { q: 0.5, w });
        if odds < 0.5 + w {
            let sum = lower_sum(even, even_weights).plus(lower_sum(odd, odd_weights)).times(0.5);
            Tails::Lower(sum.plus(Scaled { factor: 1.0, exponent: normal_ln_sf(self.ncp) }))
        } else {
            let sum = upper_sum(even, even_weights).plus(upper_sum(odd, odd_weights));
            Tails::Upper(sum.times(0.5))
        }
    }

    /// The upper tail from the first term on, both parities side by side, in units of `y^b e^-w`.
    ///
    /// With `x = t²/(t² + df)`, `y = 1 - x`, `b = df/2`, `w = ncp²/2` the tail is `½ Σ (p_j U_j + q_j V_j)`, where
    /// `U_0 = I_y(b, ½)` and `V_0 = I_y(b, 1) = y^b`.
    fn upper_series(&self, t: f64, ratio: f64, fall: f64) -> Scaled {
        let (b, w) = (0.5 * self.df, 0.5 * self.ncp * self.ncp);
        let x = ratio / (1.0 + ratio);
        let mut even_step = 2.0 * (self.df * x).sqrt() * self.central.peak();
        let mut odd_step = b * x;
        let point = BetaPoint::new(0.5, b, 0.5 * t * t, 0.5 * (t - 1.0) * (t + 1.0));
        let mut even = even_step * BetaFamily(point).upper_ratio(0.0);
        let mut odd = 1.0;
        let (mut p, mut q) = (1.0, self.ncp * FRAC_2_SQRT_PI * FRAC_1_SQRT_2);
        let mut sum = p * even + q * odd;
        let mut previous = sum;
        let mut j = 0.0;
        loop {
            even += even_step;
            odd += odd_step;
            // One division serves the four ratios of a step.
            let inverse = 1.0 / ((j + 1.0) * (j + 1.5) * (j + 2.0));
            let by_half = inverse * (j + 1.0) * (j + 2.0);
            p *= w * (inverse * (j + 1.5) * (j + 2.0));
            q *= w * by_half;
            even_step *= x * (j + 0.5 + b) * by_half;
            odd_step *= x * (j + 1.0 + b) * (inverse * (j + 1.0) * (j + 1.5));
            let term = p * even + q * odd;
            sum += term;
            j += 1.0;
            // Negated, so that a term that is not a number ends the loop as well.
            if !(term >= previous || term > NEGLIGIBLE * sum) {
                break;
            }
            previous = term;
        }
        Scaled { factor: 0.5 * sum, exponent: -fall - w }
    }

    /// One tail as an integral whose integrand is positive everywhere: for any noncentrality, `t > 0`.
    fn integral(&self, t: f64, upper: bool) -> Tails {
        let narrow = t * t > 4.5 * self.df;
        let tail = if self.ncp > SERIES_LIMIT && narrow {
            normal_order(self.df, self.ncp, t, upper)
        } else {
            scale_order(self.df, self.ncp, t, upper)
        };
        if upper { Tails::Upper(tail) } else { Tails::Lower(tail) }
    }

    /// `ln ∫ s^power φ(x s - ncp) f(s) ds`: the density for `power` 1, the slope of the upper tail in `ncp` for 0.
    fn ln_integral(&self, x: f64, power: f64) -> f64 {
        let far = self.far();
        if x.abs() > far {
            let rest = (self.df + power) * (libm::log(far) - libm::log(x.abs()));
            return self.ln_integral(far.copysign(x), power) + rest;
        }
        central_moment_integral(self.df, self.ncp, x, power).ln()
    }

    /// The point whose named tail is `p <= 1/2`.
    fn solve(&self, p: f64, upper: bool) -> Result<f64> {
        if p == 0.0 {
            return Ok(if upper { f64::INFINITY } else { f64::NEG_INFINITY });
        }
        let at_zero = if upper { normal_cdf(self.ncp) } else { normal_cdf(-self.ncp) };
        if p == at_zero {
            return Ok(0.0);
        }
        // The point is positive where the upper tail has to shrink from its value at 0, or the lower one to grow.
        if (p < at_zero) == upper {
            self.solve_positive(p, upper)
        } else {
            Ok(-self.mirrored().solve_positive(p, !upper)?)
        }
    }

    fn solve_positive(&self, p: f64, upper: bool) -> Result<f64> {
        let target = libm::log(p);
        let z = if upper { -normal_quantile_guess(p) } else { normal_quantile_guess(p) };
        let half = z * z / (2.0 * self.df);
        let spread = (1.0 + self.ncp * self.ncp / (2.0 * self.df) - half).max(0.0).sqrt();
        let guess =
            if half < 0.8 { (self.ncp + z * spread) / (1.0 - half) } else { self.ncp.abs() + 10.0 };
        let what = "quantile of noncentral t";
        beyond_range(monotone_root(
            what,
            Scale::Logarithmic,
            guess.max(1e-3),
            POSITIVE_RANGE,
            |x| {
                let tails = self.tails(x);
                let (ln, sign) =
                    if upper { (tails.ln_upper(), -1.0) } else { (tails.ln_lower(), 1.0) };
                Ok((ln - target, sign * libm::exp(self.ln_integral(x, 1.0) + libm::log(x) - ln)))
            },
        ))
    }
}

impl Continuous for NoncentralT {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        if self.ncp == 0.0 {
            return self.central.ln_density(x);
        }
        Ok(if x.is_finite() { self.ln_integral(x, 1.0) } else { f64::NEG_INFINITY })
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
        let p = probability(p)?;
        if self.ncp == 0.0 {
            return self.central.quantile(p);
        }
        if p > 0.5 { self.solve(1.0 - p, true) } else { self.solve(p, false) }
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        let p = probability(p)?;
        if self.ncp == 0.0 {
            return self.central.upper_quantile(p);
        }
        if p > 0.5 { self.solve(1.0 - p, false) } else { self.solve(p, true) }
    }
}
