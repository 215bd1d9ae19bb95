//! Several treatments compared with one control: critical values from the multivariate t distribution with product
//! correlation, and the power of such comparisons.

use super::common_factor::{CommonFactor, Sides, Statistic};
use super::scale_mixture::{
    ScaleMixture, Tail, checked_critical, checked_df, checked_probability, shifted_mean, solve,
};
use crate::numerics::distributions::Continuous;
use crate::numerics::distributions::normal::normal_upper_quantile;
use crate::numerics::distributions::student_t::StudentT;
use crate::numerics::error::{NumericsError, Result};

/// What the searches of this file are called in errors.
const WHAT: &str = "comparisons with a control";

/// Distribution of the largest of `k` t statistics whose correlations are products `ρᵢⱼ = λᵢ λⱼ`.
///
/// # Formula
///
/// With `cᵢ = sqrt(1 - λᵢ²)` and `s = sqrt(χ²_ν / ν)`:
///
/// ```text
/// one-sided   P(max Tᵢ <= c)   = E_s ∫ φ(z) Π Φ((c s - λᵢ z) / cᵢ) dz
/// two-sided   P(max |Tᵢ| <= c) = E_s ∫ φ(z) Π [Φ((c s - λᵢ z) / cᵢ) - Φ((-c s - λᵢ z) / cᵢ)] dz
/// ```
///
/// Comparisons of groups of sizes `nᵢ` with a control of size `n₀` have `λᵢ = sqrt(nᵢ / (nᵢ + n₀))`.
///
/// # Units and ranges
///
/// 1 to 1000 comparisons, `-1 < λᵢ < 1`, `ν >= 0.5` degrees of freedom (infinite: known standard deviation).
///
/// # Accuracy
///
/// Probabilities to 1e-13 absolute, quantiles to 5e-12 (`tests/reference/dunnett.csv`); both tails are integrals of
/// positive terms.
///
/// # Sources
///
/// Dunnett (1955), Journal of the American Statistical Association 50, 1096-1121; Dunnett, Sobel (1955), Biometrika
/// 42, 258-260, for the product form.
///
/// # Example
///
/// ```
/// use sufficit::numerics::multivariate::{Dunnett, Sides};
///
/// // Three treatments and a control of equal size, 20 degrees of freedom; published two-place table: 2.54.
/// let critical = Dunnett::equal(3, 0.5, Sides::Two, 20.0)?.upper_quantile(0.05)?;
/// assert!((critical - 2.54).abs() < 0.005);
/// assert!(Dunnett::equal(3, 1.5, Sides::Two, 20.0).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct Dunnett {
    statistics: CommonFactor,
    sides: Sides,
    df: f64,
}

impl Dunnett {
    /// Comparisons with the loadings `λᵢ`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when there is none or more than 1000, a loading is not inside (-1, 1), or the
    /// degrees of freedom are below 1/2.
    pub fn new(loadings: &[f64], sides: Sides, df: f64) -> Result<Self> {
        let statistics = loadings.iter().map(|&loading| unshifted(loading));
        Self::from_statistics(CommonFactor::new(statistics, sides)?, sides, df)
    }

    /// `comparisons` statistics that all correlate by `rho`, from 0 inclusive to 1 exclusive.
    ///
    /// # Errors
    ///
    /// As [`Dunnett::new`]; [`NumericsError::OutOfDomain`] when `rho` is not in range.
    pub fn equal(comparisons: usize, rho: f64, sides: Sides, df: f64) -> Result<Self> {
        if !(0.0..1.0).contains(&rho) {
            return Err(NumericsError::OutOfDomain {
                name: "rho",
                given: rho,
                allowed: "from 0 to below 1",
            });
        }
        let statistic = Statistic { loading: rho.sqrt(), own_square: 1.0 - rho, shift: 0.0 };
        // One more than allowed is enough to be refused.
        let statistics = std::iter::repeat_n(statistic, comparisons.min(1001));
        Self::from_statistics(CommonFactor::new(statistics, sides)?, sides, df)
    }

    /// Treatment groups compared with a control, from the group sizes (or any numbers proportional to them).
    ///
    /// # Errors
    ///
    /// As [`Dunnett::new`]; [`NumericsError::OutOfDomain`] when a size is not above 0 and finite.
    pub fn from_sizes(control: f64, treatments: &[f64], sides: Sides, df: f64) -> Result<Self> {
        for &size in treatments.iter().chain([&control]) {
            if !(size > 0.0 && size.is_finite()) {
                return Err(NumericsError::OutOfDomain {
                    name: "group size",
                    given: size,
                    allowed: "above 0 and finite",
                });
            }
        }
        let statistics = treatments.iter().map(|size| Statistic {
            loading: (size / (size + control)).sqrt(),
            own_square: control / (size + control),
            shift: 0.0,
        });
        Self::from_statistics(CommonFactor::new(statistics, sides)?, sides, df)
    }

    fn from_statistics(statistics: CommonFactor, sides: Sides, df: f64) -> Result<Self> {
        Ok(Dunnett { statistics, sides, df: checked_df(df)? })
    }

    /// Probability that no statistic exceeds `c` (in absolute value when two-sided).
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `c` is NaN; [`NumericsError::NoConvergence`] from the quadrature.
    pub fn cdf(&self, c: f64) -> Result<f64> {
        if self.impossible(c)? {
            return Ok(0.0);
        }
        Ok(self.mixture_at(self.lower(c.signum())?, c)?.min(1.0))
    }

    /// Probability that at least one statistic exceeds `c`, small values directly.
    ///
    /// # Errors
    ///
    /// As [`Dunnett::cdf`].
    pub fn sf(&self, c: f64) -> Result<f64> {
        if self.impossible(c)? {
            return Ok(1.0);
        }
        Ok(self.mixture_at(self.upper(c.signum())?, c)?.min(1.0))
    }

    /// The `c` with `P(largest <= c) = p`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `p` is not strictly between 0 and 1;
    /// [`NumericsError::NoBracket`] when `c` would leave the range of doubles.
    pub fn quantile(&self, p: f64) -> Result<f64> {
        let p = checked_probability(p)?;
        if p > 0.5 { self.where_upper_is(1.0 - p) } else { self.where_lower_is(p) }
    }

    /// The `c` with `P(largest > c) = p`: the critical value at familywise level `p`.
    ///
    /// # Errors
    ///
    /// As [`Dunnett::quantile`].
    pub fn upper_quantile(&self, p: f64) -> Result<f64> {
        let p = checked_probability(p)?;
        if p > 0.5 { self.where_lower_is(1.0 - p) } else { self.where_upper_is(p) }
    }

    fn impossible(&self, c: f64) -> Result<bool> {
        checked_critical(c)?;
        Ok(self.sides == Sides::Two && c <= 0.0)
    }

    fn mixture_at(&self, tail: Tail<impl Fn(f64) -> Result<f64>>, c: f64) -> Result<f64> {
        let anchor = if c.is_finite() { c } else { c.signum() };
        ScaleMixture::new(tail, self.df, anchor, 0.0).at(c)
    }

    fn where_upper_is(&self, p: f64) -> Result<f64> {
        let at_zero = self.statistics.any_exceeds(0.0)?;
        if p == at_zero {
            return Ok(0.0);
        }
        let sign = if p < at_zero { 1.0 } else { -1.0 };
        let guess = sign * self.guess(if sign > 0.0 { p } else { 0.5 })?;
        solve(WHAT, self.upper(sign)?, self.df, p, guess)
    }

    fn where_lower_is(&self, p: f64) -> Result<f64> {
        let at_zero = self.statistics.none_exceeds(0.0)?;
        if p == at_zero {
            return Ok(0.0);
        }
        let sign = if p > at_zero { 1.0 } else { -1.0 };
        solve(WHAT, self.lower(sign)?, self.df, p, sign * self.guess(0.5)?)
    }

    /// The critical value by Bonferroni's inequality, kept away from 0.
    fn guess(&self, p: f64) -> Result<f64> {
        let sides = match self.sides {
            Sides::One => 1.0,
            Sides::Two => 2.0,
        };
        let share = (p / (sides * self.statistics.count)).min(0.25);
        if self.df == f64::INFINITY {
            return normal_upper_quantile(share);
        }
        StudentT::new(self.df)?.upper_quantile(share)
    }

    fn lower(&self, sign: f64) -> Result<Tail<impl Fn(f64) -> Result<f64>>> {
        Ok(Tail {
            inner: |w| self.statistics.none_exceeds(w),
            at_zero: self.statistics.none_exceeds(0.0)?,
            at_infinity: if sign > 0.0 { 1.0 } else { 0.0 },
        })
    }

    fn upper(&self, sign: f64) -> Result<Tail<impl Fn(f64) -> Result<f64>>> {
        Ok(Tail {
            inner: |w| self.statistics.any_exceeds(w),
            at_zero: self.statistics.any_exceeds(0.0)?,
            at_infinity: if sign > 0.0 { 0.0 } else { 1.0 },
        })
    }
}

/// Power of comparisons with one control whose statistics are shifted by their true effects.
///
/// # Formula
///
/// The statistics are `Tᵢ = (λᵢ Z₀ + cᵢ Zᵢ + δᵢ) / s` with noncentralities `δᵢ`; otherwise as [`Dunnett`].
///
/// # Units and ranges
///
/// 1 to 1000 comparisons, `-1 < λᵢ < 1`, `|δᵢ| <= 10⁶`, `ν >= 0.5` degrees of freedom (infinite: known standard
/// deviation).
///
/// # Accuracy
///
/// 1e-12 absolute (`tests/reference/all_pairs_any_each.csv`).
///
/// # Sources
///
/// Dunnett (1955), Journal of the American Statistical Association 50, 1096-1121, for the distribution.
#[derive(Debug, Clone, PartialEq)]
pub struct ShiftedComparisons {
    statistics: CommonFactor,
    df: f64,
}

impl ShiftedComparisons {
    /// Comparisons with loadings `λᵢ` and noncentralities `δᵢ`, in pairs.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when an argument is outside its range.
    pub fn new(loadings_and_shifts: &[(f64, f64)], sides: Sides, df: f64) -> Result<Self> {
        let statistics = loadings_and_shifts
            .iter()
            .map(|&(loading, shift)| Statistic { shift, ..unshifted(loading) });
        Ok(ShiftedComparisons {
            statistics: CommonFactor::new(statistics, sides)?,
            df: checked_df(df)?,
        })
    }

    /// Probability that at least one statistic exceeds the critical value `c > 0`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `c` is not above 0; [`NumericsError::NoConvergence`] from the quadrature.
    pub fn any_exceeds(&self, c: f64) -> Result<f64> {
        self.mean(c, |w| self.statistics.any_exceeds(w))
    }

    /// Probability that every statistic exceeds the critical value `c > 0`.
    ///
    /// # Errors
    ///
    /// As [`ShiftedComparisons::any_exceeds`].
    pub fn all_exceed(&self, c: f64) -> Result<f64> {
        self.mean(c, |w| self.statistics.all_exceed(w))
    }

    fn mean(&self, c: f64, inner: impl Fn(f64) -> Result<f64>) -> Result<f64> {
        if checked_critical(c)? <= 0.0 {
            return Err(NumericsError::OutOfDomain {
                name: "critical value",
                given: c,
                allowed: "above 0",
            });
        }
        let tail = Tail { at_zero: inner(0.0)?, at_infinity: 0.0, inner };
        shifted_mean(tail, self.df, c, &self.statistics.shifts())
    }
}

/// A statistic with the given loading and no shift.
fn unshifted(loading: f64) -> Statistic {
    Statistic { loading, own_square: (1.0 - loading) * (1.0 + loading), shift: 0.0 }
}
