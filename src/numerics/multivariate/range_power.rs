//! The studentised range of means that differ: power to find at least one difference among all pairs.

use super::interval::{log_sf, normal_interval};
use super::scale_mixture::{Tail, checked_critical, checked_df, shifted_mean};
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::quadrature::trapezoid;
use crate::numerics::special::normal::{normal_density, normal_sf};
use libm::{exp, expm1, log, log1p};

/// Beyond this distance a normal density is negligible.
const REACH: f64 = 9.5;

/// Beyond this distance a normal tail is below the smallest double.
const FAR: f64 = 40.0;

/// Distribution of `(max Xᵢ - min Xᵢ) / s` for independent normals `Xᵢ` of variance 1 with means `μᵢ`.
///
/// With group means of `n` values each, `μᵢ` is the true mean in units of `σ / sqrt(n)`, and the probability of
/// exceeding a critical value of the studentised range is the power to find at least one pair different.
///
/// # Formula
///
/// ```text
/// P(Q > q) = E[R(q s)]   R(w) = Σᵢ ∫ φ(z - μᵢ) { Π Φ(μⱼ - z) - Π [Φ(μⱼ - z) - Φ(μⱼ - z - w)] } dz   (j ≠ i)
/// ```
///
/// # Units and ranges
///
/// 2 to 1000 means, `|μᵢ| <= 10⁶`, `ν >= 0.5` degrees of freedom (infinite: known standard deviation).
///
/// # Accuracy
///
/// 1e-12 absolute (`tests/reference/all_pairs_any_each.csv`).
///
/// # Sources
///
/// Hartley (1942), Biometrika 32, 334-348, for the range of a sample, here with different means.
#[derive(Debug, Clone, PartialEq)]
pub struct ShiftedRange {
    /// Different means with how often each occurs, the smallest being 0.
    means: Vec<(f64, f64)>,
    df: f64,
}

impl ShiftedRange {
    /// The range of normals with these means.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when an argument is outside its range.
    pub fn new(means: &[f64], df: f64) -> Result<Self> {
        if !(2..=1000).contains(&means.len()) {
            return Err(NumericsError::OutOfDomain {
                name: "means",
                given: means.len() as f64,
                allowed: "from 2 to 1000",
            });
        }
        for &given in means {
            if given.is_nan() || given.abs() > 1e6 {
                return Err(NumericsError::OutOfDomain {
                    name: "mean",
                    given,
                    allowed: "from -1000000 to 1000000",
                });
            }
        }
        let smallest = means.iter().copied().fold(f64::INFINITY, f64::min);
        let mut counted: Vec<(f64, f64)> = Vec::new();
        for mean in means.iter().map(|mean| mean - smallest) {
            match counted.iter_mut().find(|(known, _)| *known == mean) {
                Some((_, count)) => *count += 1.0,
                None => counted.push((mean, 1.0)),
            }
        }
        Ok(ShiftedRange { means: counted, df: checked_df(df)? })
    }

    /// `P(Q > q)` for `q > 0`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `q` is not above 0; [`NumericsError::NoConvergence`] from the quadrature.
    pub fn sf(&self, q: f64) -> Result<f64> {
        if checked_critical(q)? <= 0.0 {
            return Err(NumericsError::OutOfDomain {
                name: "critical value",
                given: q,
                allowed: "above 0",
            });
        }
        let tail = Tail { inner: |w| self.known_spread_sf(w), at_zero: 1.0, at_infinity: 0.0 };
        shifted_mean(tail, self.df, q, &[self.spread()])
    }

    /// Distance between the largest and the smallest mean.
    fn spread(&self) -> f64 {
        self.means.iter().map(|&(mean, _)| mean).fold(0.0, f64::max)
    }

    /// Upper tail when the standard deviation is known; `z` is the smallest value.
    fn known_spread_sf(&self, w: f64) -> Result<f64> {
        let spread = self.spread();
        if w <= 0.0 || spread > w + 2.0 * FAR {
            return Ok(1.0);
        }
        if w > spread + 2.0 * FAR {
            return Ok(0.0);
        }
        // A range beyond the distance of the means is reached from both ends alike.
        let (low, high) = (-0.5 * (w - spread).max(0.0) - REACH, REACH);
        let steps = ((high - low) / 0.5) as usize + 1;
        trapezoid("range of normals", low, high, steps, |z| self.smallest_at(z, w))
    }

    /// Density of the smallest value at `z`, together with a largest value more than `w` away.
    fn smallest_at(&self, z: f64, w: f64) -> f64 {
        let mut log_above = 0.0;
        let mut log_near = 0.0;
        for &(mean, count) in &self.means {
            let above = normal_sf(z - mean);
            log_above += count * log_sf(z - mean);
            log_near += count * log_share_near(z - mean, w, above);
        }
        let mut sum = 0.0;
        for &(mean, count) in &self.means {
            let above = normal_sf(z - mean);
            if above == 0.0 {
                continue;
            }
            let others_near = log_near - log_share_near(z - mean, w, above);
            let others_above = exp(log_above - log_sf(z - mean));
            sum += count * normal_density(z - mean) * others_above * -expm1(others_near.min(0.0));
        }
        sum
    }
}

/// Logarithm of the probability that a value above `z` is not more than `w` above it.
fn log_share_near(z: f64, w: f64, above: f64) -> f64 {
    if above == 0.0 {
        return 0.0;
    }
    let beyond = normal_sf(z + w) / above;
    if beyond < 0.5 { log1p(-beyond) } else { log(normal_interval(z, w) / above) }
}
