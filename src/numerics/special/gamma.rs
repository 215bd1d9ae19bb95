//! Gamma function: logarithm, Stirling remainder, and the regularised incomplete gamma function in both tails.

use core::f64::consts::{FRAC_2_SQRT_PI, SQRT_2};

use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::beta::larger_root;
use crate::numerics::special::legendre;
use crate::numerics::special::logarithms::{ln_1p_minus_near_zero, ln_ratio_minus};
use crate::numerics::special::normal::{INV_SQRT_TAU, mills_ratio};
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
    0.15342640972002736,
    0.08106146679532726,
    0.05481412105191765,
    0.0413406959554093,
    0.03316287351993629,
    0.02767792568499834,
    0.023746163656297496,
    0.020790672103765093,
    0.018488450532673187,
    0.016644691189821193,
    0.015134973221917378,
    0.013876128823070748,
    0.012810465242920227,
    0.01189670994589177,
    0.011104559758206917,
    0.010411265261972096,
];

/// Coefficients in powers of `1/a` on [1, 5/2], highest first; Chebyshev fit in 60 digits, absolute error 2.3e-17.
const REMAINDER_NEAR_ONE: [f64; 14] = [
    -5.697653131784998e-6,
    5.863590220347652e-5,
    -0.0002778067537217593,
    0.0007968778199836525,
    -0.0015185158020837991,
    0.001943570394158675,
    -0.0014938442366326456,
    0.00022610796702769994,
    0.000790857284629237,
    -2.135112900268406e-5,
    -0.002769088756983662,
    -1.8070232901880869e-6,
    0.08333353898703842,
    -1.0204867402205494e-8,
];

/// Coefficients in powers of `1/a` on [5/2, 8], highest first; Chebyshev fit in 60 digits, absolute error 1.1e-17.
const REMAINDER_MIDDLE: [f64; 12] = [
    0.00015016245903821986,
    -0.0002885749698104669,
    -0.00010199934755695885,
    0.0008501607528027882,
    -0.0009917155985643563,
    0.00012108290442853185,
    0.0007678791192949638,
    3.871756596945944e-6,
    -0.002778181681731235,
    2.788653499843882e-8,
    0.08333333218690166,
    2.1245255866253806e-11,
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
    if (1.0..=16.0).contains(&doubled)
        && doubled == libm::floor(doubled)
        && let Some(&value) = HALF_INTEGER_REMAINDERS.get(doubled as usize - 1)
    {
        return value;
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
    if a == 0.0 {
        return Scaled { factor: 1.0, exponent: -x };
    }
    if a < 1.0 {
        if x == 0.0 {
            return Scaled::ZERO;
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
    if x > 1e17 * (a + 1.0) {
        return a / x;
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
            return a * p1 / q1;
        }
        if q1.abs() > 1e200 {
            (p0, q0, p1, q1) = (p0 * 1e-200, q0 * 1e-200, p1 * 1e-200, q1 * 1e-200);
        }
    }
    f64::NAN
}

/// Steps allowed to the fraction; where it is used, a random search over the whole domain met at most 120. Beyond the limit
/// the ratio is not a number, which the distributions report as a failure to converge.
const CONTINUED_FRACTION_LIMIT: u32 = 2000;

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

    fn distance(&self, w: f64) -> f64 {
        (self.x - self.a - w) / (self.a + 2.0 * w).sqrt()
    }

    fn start(&self) -> (f64, f64) {
        let Self { a, x } = *self;
        if a > MANY_STEPS || 2.0 * a != libm::floor(2.0 * a) || x > 600.0 {
            return (self.tails(0.0).lower(), self.step(0.0).value());
        }
        // From shape 1, where the tail is e^-x, or 1/2, where it is a normal tail.
        let fall = libm::exp(-x);
        let whole = a == libm::floor(a);
        let (mut shape, mut upper, mut step) = if whole {
            (1.0, fall, x * fall)
        } else {
            let root = x.sqrt();
            let normal = 2.0 * INV_SQRT_TAU * fall * mills_ratio(SQRT_2 * root);
            (0.5, normal, FRAC_2_SQRT_PI * root * fall)
        };
        while shape < a {
            upper += step;
            shape += 1.0;
            step *= x / shape;
        }
        (1.0 - upper, step)
    }
}

/// Shapes up to which a tail is led up from shape 1/2 or 1.
const MANY_STEPS: f64 = 20.0;
