//! `ln(1 + x) - x` without cancellation: the building block of saddle-point densities.

/// `ln(1 + x) - x` for `x > -1`, relative error below 1e-15.
///
/// # Formula
///
/// With `r = x / (2 + x)` the logarithm is `2 (r + r³/3 + r⁵/5 + …)` and `r x = 2 r² / (1 - r)`, hence
///
/// ```text
/// ln(1 + x) - x = r (2 r² (1/3 + r²/5 + r⁴/7 + …) - x)
/// ```
///
/// for `-0.4 < x < 0.5`; elsewhere the subtraction itself is harmless.
pub(crate) fn ln_1p_minus(x: f64) -> f64 {
    if x > -0.4 && x < 0.5 { ln_1p_minus_near_zero(x) } else { libm::log1p(x) - x }
}

/// `ln(1 + deviation) - deviation` where `1 + deviation` is also known as a ratio of its own: near -1 the ratio keeps the digits.
pub(crate) fn ln_ratio_minus(ratio: f64, deviation: f64) -> f64 {
    if deviation > -0.4 && deviation < 0.5 {
        ln_1p_minus_near_zero(deviation)
    } else {
        libm::log(ratio) - deviation
    }
}

/// The series of [`ln_1p_minus`], valid for `-0.4 < x < 0.5` only.
#[inline]
pub(crate) fn ln_1p_minus_near_zero(x: f64) -> f64 {
    let r = x / (2.0 + x);
    let y = r * r;
    // |r| <= 1/4, so that fourteen terms reach 1e-18.
    // Two interleaved polynomials in the square shorten the chain of dependent operations.
    let square = y * y;
    let sum = RECIPROCALS
        .iter()
        .fold((0.0, 0.0), |(even, odd), pair| (even * square + pair.0, odd * square + pair.1));
    r * (2.0 * y * (sum.0 + y * sum.1) - x)
}

/// `1/(4k + 3)` and `1/(4k + 5)` for `k` from 6 down to 0.
const RECIPROCALS: [(f64, f64); 7] = [
    (1.0 / 27.0, 1.0 / 29.0),
    (1.0 / 23.0, 1.0 / 25.0),
    (1.0 / 19.0, 1.0 / 21.0),
    (1.0 / 15.0, 1.0 / 17.0),
    (1.0 / 11.0, 1.0 / 13.0),
    (1.0 / 7.0, 1.0 / 9.0),
    (1.0 / 3.0, 1.0 / 5.0),
];
