//! Probability of an interval under the standard normal distribution.

use crate::numerics::special::normal::{
    LN_SQRT_TAU, normal_cdf, normal_density, normal_ln_sf, normal_sf,
};
use libm::{expm1, log, log1p};

/// Intervals with a smaller half-width and a smaller product of half-width and middle are flat enough for a series.
const NARROW: f64 = 0.02;

/// See [`NARROW`].
const FLAT: f64 = 0.05;

/// Over narrower intervals the density is constant to rounding.
const POINT: f64 = 1e-8;

/// From here on tails are handled by their logarithm.
const FAR: f64 = 36.0;

/// `P(low < Z < low + width)`, accurate to about 1e-14 of its size also for narrow and far intervals; 0 for a
/// negative width. The width is asked for because the ends of a narrow interval do not hold it to many digits.
pub(super) fn normal_interval(low: f64, width: f64) -> f64 {
    // Wider or farther out, the two tails differ by enough to be subtracted.
    let half = 0.5 * width;
    let middle = low + half;
    let high = low + width;
    if half <= 0.0 {
        0.0
    } else if half < NARROW && half * middle.abs() < FLAT {
        narrow_interval(middle, half)
    } else if low >= 0.0 {
        normal_sf(low) - normal_sf(high)
    } else if high <= 0.0 {
        normal_cdf(high) - normal_cdf(low)
    } else {
        1.0 - normal_cdf(low) - normal_sf(high)
    }
}

/// Taylor series about the middle: `φ(m) 2h (1 + He₂(m) h²/3! + He₄(m) h⁴/5! + He₆(m) h⁶/7!)`.
fn narrow_interval(middle: f64, half: f64) -> f64 {
    let m = middle * middle;
    let h = half * half;
    let he2 = m - 1.0;
    let he4 = (m - 6.0) * m + 3.0;
    let he6 = ((m - 15.0) * m + 45.0) * m - 15.0;
    let series = 1.0 + h * (he2 / 6.0 + h * (he4 / 120.0 + h * he6 / 5040.0));
    normal_density(middle) * 2.0 * half * series
}

/// Logarithm of [`normal_interval`], also where the probability is next to 1 (it may be multiplied by thousands) and
/// where it is below the smallest double.
pub(super) fn log_interval(low: f64, width: f64) -> f64 {
    let middle = low + 0.5 * width;
    if width > 0.0 && width < POINT && width * middle.abs() < POINT {
        return log(width) - 0.5 * middle * middle - LN_SQRT_TAU;
    }
    let outside = normal_cdf(low) + normal_sf(low + width);
    if outside < 0.9 {
        return log1p(-outside);
    }
    if middle.abs() - 0.5 * width < FAR {
        return log(normal_interval(low, width));
    }
    let near = middle.abs() - 0.5 * width;
    if near * width < FLAT {
        return log(width) - 0.5 * middle * middle - LN_SQRT_TAU;
    }
    let (log_near, log_far) = (normal_ln_sf(near), normal_ln_sf(near + width));
    log_near + log(-expm1(log_far - log_near))
}

/// Logarithm of the upper normal tail, also where it is next to 1 and where it is below the smallest double.
pub(super) fn log_sf(x: f64) -> f64 {
    if x < 0.0 {
        log1p(-normal_cdf(x))
    } else if x < FAR {
        log(normal_sf(x))
    } else {
        normal_ln_sf(x)
    }
}
