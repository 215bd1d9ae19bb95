//! Gamma function: logarithm, Stirling remainder, and the regularised incomplete gamma function in both tails.

use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::larger_root;
use crate::numerics::special::legendre;
use crate::numerics::special::logarithms::{ln_1p_minus_near_zero, ln_ratio_minus};
use crate::numerics::special::poisson_mixture::{Family, Weights};

/// Natural logarithm of the gamma function of a positive argument.
///
/// Relative error below 1e-15 away from the zeros at 1 and 2, where the absolute error is below 1e-16.
pub fn log_gamma(x: f64) -> f64 {
    libm::lgamma_r(x).0
}

/// Stirling remainders of 1/2, 1, 3/2, …, 8: whole and half degrees of freedom are the common case.
///
/// From the definition in 60-digit arithmetic.
const HALF_INTEGER_REMAINDERS: [f64; 16] = [
    0.15342640972002734529,
    0.08106146679532725822,
    0.054814121051917653896,
    0.041340695955409294094,
    0.033162873519936287485,
    0.027677925684998339149,
    0.023746163656297495971,
    0.020790672103765093112,
    0.018488450532673185231,
    0.016644691189821192163,
    0.015134973221917378874,
    0.013876128823070747999,
    0.012810465242920226924,
    0.011896709945891770095,
    0.011104559758206917327,
    0.010411265261972096497,
];

/// Coefficients in powers of `1/a` on [1, 5/2], highest first; Chebyshev fit in 60 digits, absolute error 2.3e-17.
const REMAINDER_NEAR_ONE: [f64; 14] = [
    -5.6976531317849976183e-6,
    0.000058635902203476521651,
    -0.00027780675372175925857,
    0.00079687781998365246084,
    -0.0015185158020837990265,
    0.0019435703941586750416,
    -0.0014938442366326455514,
    0.00022610796702769992782,
    0.00079085728462923699974,
    -0.000021351129002684060064,
    -0.0027690887569836616982,
    -1.8070232901880867809e-6,
    0.083333538987038424121,
    -1.0204867402205493046e-8,
];

/// Coefficients in powers of `1/a` on [5/2, 8], highest first; Chebyshev fit in 60 digits, absolute error 1.1e-17.
const REMAINDER_MIDDLE: [f64; 12] = [
    0.00015016245903821987233,
    -0.00028857496981046688878,
    -0.00010199934755695885648,
    0.00085016075280278823202,
    -0.00099171559856435637994,
    0.00012108290442853185058,
    0.00076787911929496382585,
    3.8717565969459439624e-6,
    -0.0027781816817312350151,
    2.7886534998438821013e-8,
    0.083333332186901656936,
    2.1245255866253807159e-11,
];

/// Coefficients of the asymptotic series in odd powers of `1/a`, highest first: `B_2k / (2k (2k - 1))`.
const REMAINDER_SERIES: [f64; 8] = [
    -3617.0 / 122_400.0,
    1.0 / 156.0,
    -691.0 / 360_360.0,
    1.0 / 1188.0,
    -1.0 / 1680.0,
    1.0 / 1260.0,
    -1.0 / 360.0,
    1.0 / 12.0,
];

fn polynomial(coefficients: &[f64], x: f64) -> f64 {
    coefficients.iter().fold(0.0, |sum, c| sum * x + c)
}

/// Stirling remainder `ln Γ(a + 1) - (a + 1/2) ln a + a - ln(2π)/2` for `a > 0`; absolute error below 1e-15.
pub(crate) fn stirling_remainder(a: f64) -> f64 {
    let doubled = 2.0 * a;
    if doubled <= 16.0 && doubled >= 1.0 && doubled == libm::floor(doubled) {
        if let Some(&value) = HALF_INTEGER_REMAINDERS.get(doubled as usize - 1) {
            return value;
        }
    }
    let inverse = 1.0 / a;
    if a >= 8.0 {
        inverse * polynomial(&REMAINDER_SERIES, inverse * inverse)
    } else if a >= 2.5 {
        polynomial(&REMAINDER_MIDDLE, inverse)
    } else if a >= 1.0 {
        polynomial(&REMAINDER_NEAR_ONE, inverse)
    } else {
        let above = polynomial(&REMAINDER_NEAR_ONE, 1.0 / (a + 1.0));
        above + (a + 0.5) * (libm::log1p(a) - libm::log(a)) - 1.0
    }
}

/// `x^a e^-x / Γ(a + 1)`: the Poisson probability of `a` events when `x` are expected, for real `a >= 0`.
///
/// Saddle-point form of Loader (2000), "Fast and accurate computation of binomial probabilities":
/// `exp(a (ln(x/a) - x/a + 1) - s(a)) / sqrt(2πa)` with the Stirling remainder `s`.
pub(crate) fn poisson_density(a: f64, x: f64) -> Scaled {
    if a < 1.0 {
        if x == 0.0 {
            return Scaled::plain(if a == 0.0 { 1.0 } else { 0.0 });
        }
        return Scaled { factor: 1.0 / libm::tgamma(a + 1.0), exponent: a * libm::log(x) - x };
    }
    if x == 0.0 {
        return Scaled::ZERO;
    }
    let exponent = a * ln_ratio_minus(x / a, (x - a) / a);
    let factor = libm::exp(-stirling_remainder(a)) / (core::f64::consts::TAU * a).sqrt();
    Scaled { factor, exponent }
}

/// From this shape on, both tails near the centre come by quadrature of the density; the expansions would need too many terms.
const LARGE_SHAPE: f64 = 200.0;

/// The regularised incomplete gamma function: lower tail `P(a, x)`, upper tail `Q(a, x)`, for `a > 0`, `x >= 0`.
///
/// The tail on the side of `x` is computed directly: power series below `a + 1` (DLMF 8.11.4), continued fraction
/// above (DLMF 8.9.2), and Gauss-Legendre quadrature from `x` outward for shapes of 200 and more.
pub(crate) fn gamma_tails(a: f64, x: f64) -> Tails {
    if x <= 0.0 {
        return Tails::Lower(Scaled::ZERO);
    }
    if x == f64::INFINITY {
        return Tails::Upper(Scaled::ZERO);
    }
    let density = poisson_density(a, x);
    if x < a + 1.0 {
        Tails::Lower(density.times(lower_ratio(a, x)))
    } else {
        Tails::Upper(density.times(upper_ratio(a, x)))
    }
}

/// `P(a, x) / D` with `D = x^a e^-x / Γ(a + 1)`, for `x` below or near `a`.
pub(crate) fn lower_ratio(a: f64, x: f64) -> f64 {
    if a > LARGE_SHAPE && x > 0.6 * a {
        return quadrature_ratio(a, x, -1.0);
    }
    let mut term = 1.0;
    let mut sum = 1.0;
    let mut shape = a + 1.0;
    // The ratio of successive terms is below x / shape: with x <= a + 1 a thousand terms always suffice below LARGE_SHAPE.
    while term > 1e-17 * sum {
        term *= x / shape;
        sum += term;
        shape += 1.0;
    }
    sum
}

/// `Q(a, x) / D` with `D = x^a e^-x / Γ(a + 1)`, for `x` above or near `a`.
pub(crate) fn upper_ratio(a: f64, x: f64) -> f64 {
    if a > LARGE_SHAPE && x < 1.6 * a {
        return quadrature_ratio(a, x, 1.0);
    }
    if x < a + 1.0 {
        // The fraction is slow here, and the tail so large that it is well known as a complement.
        let density = poisson_density(a, x).value();
        return (1.0 - density * lower_ratio(a, x)) / density;
    }
    // Γ(a, x) = e^-x x^a / (x + 1 - a - 1(1 - a) / (x + 3 - a - 2(2 - a) / …)), evaluated forward.
    let mut beta = x + 1.0 - a;
    let (mut p0, mut q0) = (0.0, 1.0);
    let (mut p1, mut q1) = (1.0, beta);
    for k in 1..CONTINUED_FRACTION_LIMIT {
        let n = f64::from(k);
        let alpha = n * (a - n);
        beta += 2.0;
        let p2 = beta * p1 + alpha * p0;
        let q2 = beta * q1 + alpha * q0;
        let settled = (p2 * q1 - p1 * q2).abs() <= 2e-16 * (p2 * q1).abs();
        (p0, q0, p1, q1) = (p1, q1, p2, q2);
        if settled {
            break;
        }
        if q1.abs() > 1e200 {
            (p0, q0, p1, q1) = (p0 * 1e-200, q0 * 1e-200, p1 * 1e-200, q1 * 1e-200);
        }
    }
    a * p1 / q1
}

/// Far more steps than the fraction ever needs where it is used.
const CONTINUED_FRACTION_LIMIT: u32 = 5000;

/// Tail from `x` outward (`direction` -1 downward, +1 upward) over `D`, by quadrature of `t^(a-1) e^-t` relative to its value at `x`.
fn quadrature_ratio(a: f64, x: f64, direction: f64) -> f64 {
    let slope = direction * ((x - a) + 1.0) / x;
    let curvature = (a - 1.0) / (x * x);
    let length = decay_length(slope, curvature, direction);
    let length = if direction < 0.0 { length.min(x) } else { length };
    let integral = legendre::integrate(length, |d| {
        libm::exp((a - 1.0) * ln_1p_minus_near_zero(direction * d / x) - slope * d)
    });
    a / x * integral
}

/// Distance over which `exp(-slope d - curvature d²/2)` falls below 1e-17, with room for the skewness of large shapes upward.
pub(crate) fn decay_length(slope: f64, curvature: f64, direction: f64) -> f64 {
    let decades = if direction > 0.0 { 52.0 } else { 42.0 };
    2.0 * decades / (slope + (slope * slope + 2.0 * decades * curvature).sqrt())
}

/// Central gamma tails at `x` with the shape raised by `j`, as a family for Poisson mixtures.
#[derive(Clone, Copy, Debug)]
pub(crate) struct GammaFamily {
    /// Shape at `j = 0`.
    pub a: f64,
    /// The point.
    pub x: f64,
}

impl Family for GammaFamily {
    fn step(&self, j: f64) -> Scaled {
        poisson_density(self.a + j, self.x)
    }

    fn growth(&self, j: f64) -> (f64, f64) {
        (self.x, self.a + j + 1.0)
    }

    fn lower_ratio(&self, j: f64) -> f64 {
        lower_ratio(self.a + j, self.x)
    }

    fn upper_ratio(&self, j: f64) -> f64 {
        upper_ratio(self.a + j, self.x)
    }

    fn tails(&self, j: f64) -> Tails {
        gamma_tails(self.a + j, self.x)
    }

    fn peak(&self, weights: Weights) -> f64 {
        // The larger root of (q + j)(a + j) = w x, where p_j D_j stops growing.
        let Weights { q, w } = weights;
        larger_root(self.a + q, q * self.a - w * self.x)
    }

    fn curvature(&self, j: f64) -> f64 {
        1.0 / (self.a + j)
    }

    fn shape(&self, j: f64) -> f64 {
        self.a + j
    }
}
