//! Owen's Q function and the exact power of two one-sided t tests.

use super::interval::normal_interval;
use super::scale_mixture::checked_df;
use crate::numerics::distributions::Continuous;
use crate::numerics::distributions::student_t::StudentT;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::quadrature::{Goal, integrate};
use crate::numerics::special::gamma::stirling_remainder;
use crate::numerics::special::logarithms::ln_1p_minus;
use crate::numerics::special::normal::normal_cdf;
use libm::{exp, log};

/// Owen's Q function `Q_ν(t, δ; 0, b)`.
///
/// # Formula
///
/// ```text
/// Q_ν(t, δ; 0, b) = sqrt(2π) / (Γ(ν/2) 2^((ν-2)/2)) ∫₀ᵇ Φ(t x / sqrt(ν) - δ) x^(ν-1) φ(x) dx
/// ```
///
/// As `b` grows it becomes the distribution function of the noncentral t with `ν` degrees of freedom at `t`.
///
/// # Units and ranges
///
/// `ν >= 0.5` and at most 1e12, `t` and `δ` finite, `b >= 0`, possibly infinite.
///
/// # Accuracy
///
/// 1e-14 absolute (`tests/reference/owen_q.csv` through [`two_one_sided_power`]; against the noncentral t at infinite
/// `b` in `tests/numerics_solvers/multivariate.rs`).
///
/// # Errors
///
/// * [`NumericsError::OutOfDomain`] when an argument is outside its range.
/// * [`NumericsError::NoConvergence`] from the quadrature.
///
/// # Sources
///
/// Owen (1965), Biometrika 52, 437-446.
pub fn owen_q(df: f64, t: f64, delta: f64, b: f64) -> Result<f64> {
    let spread = Spread::new(df)?;
    for (name, given) in [("t", t), ("delta", delta)] {
        if !given.is_finite() {
            return Err(NumericsError::OutOfDomain { name, given, allowed: "finite" });
        }
    }
    if b.is_nan() || b < 0.0 {
        return Err(NumericsError::OutOfDomain { name: "b", given: b, allowed: "0 or more" });
    }
    spread.mean_up_to(b / df.sqrt(), &[delta / t], |s| normal_cdf(t * s - delta))
}

/// Exact power of two one-sided t tests for equivalence.
///
/// Equivalence is concluded when both one-sided tests at level `alpha` reject, that is when
/// `estimate - t se >= lower` and `estimate + t se <= upper`.
///
/// # Formula
///
/// With `t` the upper `alpha` quantile of the t distribution, `a = (lower - θ) / se`, `b = (upper - θ) / se`:
///
/// ```text
/// power = E_s [Φ(b - t s) - Φ(a + t s)]   over s = sqrt(χ²_ν / ν) up to (b - a) / (2 t)
/// ```
///
/// which is the difference of two values of Owen's Q, here integrated as one so that nothing cancels.
///
/// # Units and ranges
///
/// `lower_distance = a` and `upper_distance = b` in standard errors (`a < b`, either may be infinite), `ν >= 0.5`,
/// `alpha` above 0 and below 0.5.
///
/// # Accuracy
///
/// 1e-14 absolute (`tests/reference/owen_q.csv`).
///
/// # Errors
///
/// As [`owen_q`].
///
/// # Sources
///
/// Schuirmann (1987), Journal of Pharmacokinetics and Biopharmaceutics 15, 657-680, for the test; Owen (1965),
/// Biometrika 52, 437-446, for the probability.
pub fn two_one_sided_power(
    lower_distance: f64,
    upper_distance: f64,
    df: f64,
    alpha: f64,
) -> Result<f64> {
    let spread = Spread::new(df)?;
    if lower_distance.is_nan() || upper_distance.is_nan() || lower_distance >= upper_distance {
        return Err(NumericsError::OutOfDomain {
            name: "lower distance",
            given: lower_distance,
            allowed: "below the upper distance",
        });
    }
    if !(alpha > 0.0 && alpha < 0.5) {
        return Err(NumericsError::OutOfDomain {
            name: "alpha",
            given: alpha,
            allowed: "above 0 and below 0.5",
        });
    }
    let t = StudentT::new(df)?.upper_quantile(alpha)?;
    let width = upper_distance - lower_distance;
    let limit = width / (2.0 * t);
    let turns = [upper_distance / t, -lower_distance / t];
    let power = spread.mean_up_to(limit, &turns, |s| {
        normal_interval(lower_distance + t * s, width - 2.0 * t * s)
    })?;
    Ok(power.clamp(0.0, 1.0))
}

/// The distribution of `s = sqrt(χ²_ν / ν)`.
struct Spread {
    df: f64,
    peak: f64,
}

impl Spread {
    fn new(df: f64) -> Result<Self> {
        if !(0.5..=1e12).contains(&checked_df(df)?) {
            return Err(NumericsError::OutOfDomain {
                name: "degrees of freedom",
                given: df,
                allowed: "from 0.5 to 1e12",
            });
        }
        Ok(Spread {
            df,
            peak: (df / std::f64::consts::PI).sqrt() * exp(-stirling_remainder(0.5 * df)),
        })
    }

    /// `E[f(s); s <= limit]` for a bounded `f` that turns near the places named.
    ///
    /// Integrated over `y = sqrt(s)`, which turns the power `s^(ν-1)` at 0 into a smooth one for half degrees of
    /// freedom too.
    fn mean_up_to(&self, limit: f64, turns: &[f64], f: impl Fn(f64) -> f64) -> Result<f64> {
        const WHAT: &str = "mean over the estimated standard deviation";
        let (low, high) = self.support();
        let high = high.min(limit);
        let mut cuts = vec![low, high, 1.0];
        cuts.extend(turns);
        cuts.retain(|&s| s >= low && s <= high);
        cuts.sort_by(f64::total_cmp);
        let goal = Goal { absolute: 1e-16, ..Goal::default() };
        let mut sum = 0.0;
        for pair in cuts.windows(2) {
            if let &[from, to] = pair {
                let part = integrate(WHAT, from.sqrt(), to.sqrt(), goal, |y| {
                    Ok(self.density_of_root(y) * f(y * y))
                })?;
                sum += part.value;
            }
        }
        Ok(sum)
    }

    /// Where `s` lies but for 2e-18 (Laurent, Massart 2000, Annals of Statistics 28(5), 1302-1338, lemma 1).
    fn support(&self) -> (f64, f64) {
        const TAIL: f64 = 41.0;
        let share = TAIL / self.df;
        let low = (1.0 - 2.0 * share.sqrt()).max(0.0);
        let high = 1.0 + 2.0 * share.sqrt() + 2.0 * share;
        (low.sqrt(), high.sqrt())
    }

    /// Density of `y = sqrt(s)`: twice that of `ln s`, over `y`.
    fn density_of_root(&self, y: f64) -> f64 {
        let square = y * y * y * y;
        let x = square - 1.0;
        let exponent = if x > -0.4 && x < 0.5 { ln_1p_minus(x) } else { log(square) - x };
        self.peak * exp(0.5 * self.df * exponent) * 2.0 / y
    }
}
