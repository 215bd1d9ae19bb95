//! Owen's Q function and the exact power of two one-sided t tests.

use super::interval::normal_interval;
use super::spread::Spread;
use crate::numerics::distributions::Continuous;
use crate::numerics::distributions::student_t::StudentT;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::special::normal::normal_cdf;

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
/// `b` in `tests/numerics_solvers/equivalence.rs`).
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
    let spread = checked_spread(df)?;
    for (name, given) in [("t", t), ("delta", delta)] {
        if !given.is_finite() {
            return Err(NumericsError::OutOfDomain { name, given, allowed: "finite" });
        }
    }
    if b.is_nan() || b < 0.0 {
        return Err(NumericsError::OutOfDomain { name: "b", given: b, allowed: "0 or more" });
    }
    spread.mean_up_to(b / df.sqrt(), &[delta / t], |s| Ok(normal_cdf(t * s - delta)))
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
    let spread = checked_spread(df)?;
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
        Ok(if lower_distance == f64::NEG_INFINITY {
            normal_cdf(upper_distance - t * s)
        } else {
            normal_interval(lower_distance + t * s, width - 2.0 * t * s)
        })
    })?;
    Ok(power.clamp(0.0, 1.0))
}

fn checked_spread(df: f64) -> Result<Spread> {
    if (0.5..=1e12).contains(&df) {
        return Ok(Spread::new(df));
    }
    Err(NumericsError::OutOfDomain {
        name: "degrees of freedom",
        given: df,
        allowed: "from 0.5 to 1e12",
    })
}
