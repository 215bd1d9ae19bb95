//! The standard normal tail functions used inside other distributions.

/// `ln sqrt(2π)`.
pub(crate) const LN_SQRT_TAU: f64 = 0.9189385332046728;

/// `1 / sqrt(2π)`.
pub(crate) const INV_SQRT_TAU: f64 = 0.3989422804014327;

/// Coefficients of `(x + 1) M(x)` for the Mills ratio `M`, on eight pieces of equal length in `8 x / (x + 5)`; even and
/// odd powers of the position within the piece, which runs from -1 to 1, in pairs, highest first.
///
/// Chebyshev fits in 40-digit arithmetic, absolute error below 1e-18; the function lies between 1 and 1.32.
const MILLS: [[(f64, f64); 6]; 8] = [
    [
        (-6.530865008844584e-13, 1.6920966306091753e-14),
        (6.184926896558569e-10, -1.2323497167501413e-11),
        (-6.205948301321501e-7, 2.5222881093253114e-9),
        (-0.0003116839958800633, 1.866597629838175e-5),
        (-0.019673174383988686, 0.0032574822042720974),
        (1.305273836855338, 0.02869807049242651),
    ],
    [
        (-9.769198172338958e-14, 3.0019233892525736e-14),
        (3.0739780145096115e-10, -2.0355956537868836e-11),
        (-5.261954906192137e-7, 1.0124626202157876e-8),
        (-0.00016091864354711503, 1.1678252196722579e-5),
        (-0.00626162219826457, 0.0014137994316865863),
        (1.3056082614215923, -0.01950287277805078),
    ],
    [
        (4.67470708228196e-13, 1.712624846273168e-14),
        (-3.844039515043463e-11, -1.6144382899065957e-11),
        (-3.6359237376512933e-7, 1.217283371820697e-8),
        (-7.26107989651567e-5, 6.3111425354173664e-6),
        (-0.0008256392727672561, 0.0005155000680276011),
        (1.2506331159731472, -0.03189513079792433),
    ],
    [
        (5.597686408000654e-13, -8.1086778560314e-15),
        (-2.3021889946615699e-10, -4.862967950594771e-12),
        (-2.0655571994490615e-7, 9.748129475787752e-9),
        (-2.8007758768339007e-5, 2.9249764926935665e-6),
        (0.0009503738861262008, 0.00013555353513828916),
        (1.1866827522241752, -0.030894771529148678),
    ],
    [
        (2.4165673447524696e-13, -1.6791021573937234e-14),
        (-2.326600871795045e-10, 3.491175004022427e-12),
        (-9.740936722720832e-8, 5.8430520429100065e-9),
        (-8.692200859478771e-6, 1.1564245654722479e-6),
        (0.001282055605564347, 4.700664869756041e-7),
        (1.129412575422775, -0.026164419443779282),
    ],
    [
        (-4.1745429874777325e-14, -7.63866580681098e-15),
        (-1.465573011856069e-10, 5.117948459052578e-12),
        (-3.874345342724895e-8, 2.772021227158894e-9),
        (-1.5804080446915163e-6, 3.8260442919665545e-7),
        (0.0011489269110692552, -3.551908843501149e-5),
        (1.0821081060127762, -0.021232506746871223),
    ],
    [
        (-1.0633715388812641e-13, 5.744669409042907e-16),
        (-6.884918353130012e-11, 3.3129553168752957e-12),
        (-1.3141514163767211e-8, 1.0935744819414887e-9),
        (5.528433520531955e-7, 9.466570223329744e-8),
        (0.000920815585592422, -3.774084391011901e-5),
        (1.0439394445506935, -0.017089328321514673),
    ],
    [
        (-6.798247427063445e-14, 2.1243437683896275e-15),
        (-2.6642140494936817e-11, 1.5123700268035693e-12),
        (-3.6579628467826894e-9, 3.731056607698238e-10),
        (9.520659168619479e-7, 3.833434133839342e-9),
        (0.0007126836230228734, -3.112887472151365e-5),
        (1.0131532811789001, -0.013835788516499616),
    ],
];

/// Mills ratio `(1 - Φ(x)) / φ(x)` for `x >= 0`; relative error below 1e-15.
#[inline]
pub(crate) fn mills_ratio(x: f64) -> f64 {
    let position = 8.0 * x / (x + 5.0);
    let [.., last] = &MILLS;
    let index = position as u32;
    let piece = MILLS.get(index as usize).unwrap_or(last);
    let v = if index < 8 { 2.0 * (position - f64::from(index)) - 1.0 } else { 1.0 };
    let v2 = v * v;
    let (even, odd) =
        piece.iter().fold((0.0, 0.0), |(even, odd), pair| (even * v2 + pair.0, odd * v2 + pair.1));
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
