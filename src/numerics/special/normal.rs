//! The standard normal tail functions used inside other distributions.

/// `ln sqrt(2π)`.
pub(crate) const LN_SQRT_TAU: f64 = 0.9189385332046728;

/// `1 / sqrt(2π)`.
pub(crate) const INV_SQRT_TAU: f64 = 0.3989422804014327;

/// Coefficients, lowest power first, of `(x + 1) M(x)` in `v = (x - 5) / (x + 5)` for the Mills ratio `M`.
///
/// Chebyshev fit over `x >= 0` in 50-digit arithmetic, absolute error 1.2e-17; the function lies between 1 and 1.26.
const MILLS: [f64; 25] = [
    1.1568486282918946,
    -0.22948753825211318,
    0.07778159886873558,
    0.02507217930163978,
    -0.06617760077899582,
    0.061505045840161206,
    -0.03802659218771832,
    0.016348231281331425,
    -0.004201290311078416,
    1.9530636365484052e-5,
    0.0004570438205116078,
    -0.0001343742704194541,
    -2.480546663097941e-5,
    2.270959149359291e-5,
    -1.7721527238693407e-7,
    -3.277251365803869e-6,
    3.2194150125726834e-7,
    4.919558007942764e-7,
    -6.735246707235844e-8,
    -7.75568928231968e-8,
    1.006273629203417e-8,
    1.1020770424653193e-8,
    -1.0770966817866684e-9,
    -9.545215884456964e-10,
    6.16304719865297e-11,
];

/// Mills ratio `(1 - Φ(x)) / φ(x)` for `x >= 0`; relative error below 1e-15.
#[inline]
pub(crate) fn mills_ratio(x: f64) -> f64 {
    let v = (x - 5.0) / (x + 5.0);
    let v2 = v * v;
    let even = MILLS.iter().step_by(2).rev().fold(0.0, |sum, c| sum * v2 + c);
    let odd = MILLS.iter().skip(1).step_by(2).rev().fold(0.0, |sum, c| sum * v2 + c);
    (even + v * odd) / (x + 1.0)
}

/// `exp(-x²/2)`, with the rounding error of the square put back: at `x = 38` it would cost three digits.
fn gaussian(x: f64) -> f64 {
    let square = x * x;
    // Dekker's exact product: the part of the square that rounding dropped.
    let split = 134_217_729.0 * x;
    let high = split - (split - x);
    let low = x - high;
    let dropped = ((high * high - square) + 2.0 * high * low) + low * low;
    libm::exp(-0.5 * square) * (1.0 - 0.5 * dropped)
}

/// Beyond this the tail is below the smallest positive `f64`.
const UNDERFLOW: f64 = 39.0;

/// Standard normal density.
pub fn normal_density(x: f64) -> f64 {
    if x.abs() > UNDERFLOW { 0.0 } else { gaussian(x) * INV_SQRT_TAU }
}

/// Standard normal lower tail `Φ(x)`, small tails directly; relative error below 2e-15. NaN gives NaN.
pub fn normal_cdf(x: f64) -> f64 {
    normal_sf(-x)
}

/// Standard normal upper tail `1 - Φ(x)`, small tails directly; relative error below 2e-15. NaN gives NaN.
pub fn normal_sf(x: f64) -> f64 {
    if x < 0.0 {
        return 1.0 - normal_sf(-x);
    }
    if x > UNDERFLOW {
        return 0.0;
    }
    gaussian(x) * INV_SQRT_TAU * mills_ratio(x)
}

/// Logarithm of the upper tail, without underflow.
pub fn normal_ln_sf(x: f64) -> f64 {
    if x < -1.0 {
        libm::log1p(-normal_sf(-x))
    } else if x < 5.0 {
        libm::log(normal_sf(x))
    } else if x < 1e150 {
        libm::log(mills_ratio(x)) - 0.5 * x * x - LN_SQRT_TAU
    } else {
        f64::NEG_INFINITY
    }
}

/// A rough normal quantile, absolute error below 5e-4 for `p` in [1e-300, 1/2]: Hastings (1955), sheet 68.
pub(crate) fn normal_quantile_guess(p: f64) -> f64 {
    if p > 0.5 {
        return -normal_quantile_guess(1.0 - p);
    }
    let t = (-2.0 * libm::log(p.max(f64::MIN_POSITIVE))).sqrt();
    let top = 2.515517 + t * (0.802853 + t * 0.010328);
    let bottom = 1.0 + t * (1.432788 + t * (0.189269 + t * 0.001308));
    top / bottom - t
}
