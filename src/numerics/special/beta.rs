//! The regularised incomplete beta function in both tails, for shapes from 1e-3 to 1e12 and beyond.

use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::gamma::{decay_length, stirling_remainder};
use crate::numerics::special::legendre;
use crate::numerics::special::logarithms::{ln_1p_minus_near_zero, ln_ratio_minus};
use crate::numerics::special::poisson_mixture::{Family, Weights};
use crate::numerics::special::student_tail::{StudentPoint, peak, upper_factor};

/// The point `x` of a beta distribution with shapes `a` and `b`, kept through the odds so that both `x` and `1 - x`,
/// and their distance from the mean, are known to full relative accuracy.
#[derive(Clone, Copy, Debug)]
pub(crate) struct BetaPoint {
    /// First shape.
    pub a: f64,
    /// Second shape.
    pub b: f64,
    /// Scaled odds `b x / (1 - x)`, which equal `a` at the mean.
    pub odds: f64,
    /// `odds - a`, free of cancellation.
    pub excess: f64,
    /// The point itself.
    pub x: f64,
    /// Its complement `1 - x`.
    pub y: f64,
}

impl BetaPoint {
    /// The point with the given scaled odds `b x / (1 - x)` and their excess over `a`.
    pub fn new(a: f64, b: f64, odds: f64, excess: f64) -> Self {
        Self { a, b, odds, excess, x: odds / (odds + b), y: b / (odds + b) }
    }

    /// The point at which an F variable with `2a` and `2b` degrees of freedom takes the value `f`.
    pub fn of_ratio(a: f64, b: f64, f: f64) -> Self {
        Self::new(a, b, a * f, a * (f - 1.0))
    }

    /// The point `x` itself, `0 < x < 1`.
    pub fn of_fraction(a: f64, b: f64, x: f64) -> Self {
        let y = 1.0 - x;
        let y_dropped = (1.0 - y) - x;
        // x b - y a in twice the working precision: at shapes of 1e12 a single rounding would cost six digits.
        let (up, down) = (x * b, y * a);
        let up_dropped = x.mul_add(b, -up);
        let down_dropped = y.mul_add(a, -down);
        let difference = (up - down) + ((up_dropped - down_dropped) - y_dropped * a);
        Self::new(a, b, up / y, difference / y)
    }

    /// The same point for the first shape `a + step`.
    pub fn raised(self, step: f64) -> Self {
        Self { a: self.a + step, excess: self.excess - step, ..self }
    }

    /// The point seen from the other end: shapes exchanged, `x` and `1 - x` exchanged.
    pub fn mirrored(self) -> Self {
        Self {
            a: self.b,
            b: self.a,
            odds: self.a * (self.b / self.odds),
            excess: -self.excess * (self.b / self.odds),
            x: self.y,
            y: self.x,
        }
    }
}

/// `x^a (1 - x)^b / (a B(a, b))`: the step between `I_x(a, b)` and `I_x(a + 1, b)`.
///
/// Both logarithms of the saddle-point form (Loader 2000) are negative, so nothing cancels:
/// `a (ln(x/x₀) - x/x₀ + 1) + b (ln(y/y₀) - y/y₀ + 1)` with the mean `x₀ = a/(a+b)`, `y₀ = b/(a+b)`.
pub(crate) fn beta_step(point: BetaPoint) -> Scaled {
    let BetaPoint { a, b, odds, excess, .. } = point;
    if odds == 0.0 {
        return Scaled::ZERO;
    }
    let total = odds + b;
    let x_part = a * ln_ratio_minus(odds / a * ((a + b) / total), excess * (b / (a * total)));
    let y_part = b * ln_ratio_minus((a + b) / total, -excess / total);
    let remainders = stirling_remainder(a + b) - stirling_remainder(a) - stirling_remainder(b);
    let factor = (b / (core::f64::consts::TAU * a * (a + b))).sqrt() * libm::exp(remainders);
    Scaled { factor, exponent: x_part + y_part }
}

/// The regularised incomplete beta function: lower tail `I_x(a, b)`, upper tail `I_{1-x}(b, a)`.
///
/// The tail on the side of the point, seen from the mean, is computed directly.
pub(crate) fn beta_tails(point: BetaPoint) -> Tails {
    let lower = |p: BetaPoint| beta_step(p).times(lower_ratio(p));
    if point.excess <= 0.0 {
        Tails::Lower(lower(point))
    } else {
        Tails::Upper(lower(point.mirrored()))
    }
}

/// With both shapes above this, the neighbourhood of the mean is integrated by quadrature.
const LARGE_SHAPE: f64 = 300.0;

/// `I_x(a, b)` over [`beta_step`].
pub(crate) fn lower_ratio(point: BetaPoint) -> f64 {
    let BetaPoint { a, b, x, .. } = point;
    let first = (a + b) / (a + 1.0) * x;
    if first < 0.6 && x < 0.6 {
        return series_ratio(point);
    }
    if a > LARGE_SHAPE && b > LARGE_SHAPE && first > 0.7 {
        return quadrature_ratio(point);
    }
    if b < 1.0 && (a + b) * point.y < 0.6 * (b + 1.0) {
        let mirrored = point.mirrored();
        // The fraction is slow here, and the tail so large that it is well known as a complement.
        let step = beta_step(point).value();
        return (1.0 - beta_step(mirrored).value() * series_ratio(mirrored)) / step;
    }
    fraction_ratio(point)
}

/// Power series with positive terms, DLMF 8.17.8: `Σ (a+b)_n / (a+1)_n x^n`.
fn series_ratio(point: BetaPoint) -> f64 {
    let BetaPoint { a, b, x, .. } = point;
    let (mut top, mut bottom) = (a + b, a + 1.0);
    let mut term = 1.0;
    let mut sum = 1.0;
    // Every ratio of terms is below the larger of x and the first one, hence below 0.6: at most a hundred terms.
    while term > 1e-17 * sum {
        term *= x * top / bottom;
        sum += term;
        top += 1.0;
        bottom += 1.0;
    }
    sum
}

/// Continued fraction of DiDonato and Morris (1992), ACM TOMS 18(3), equation 9, evaluated forward.
fn fraction_ratio(point: BetaPoint) -> f64 {
    let BetaPoint { a, b, x, y, excess, .. } = point;
    let lead = 1.0 - excess * y;
    let mut beta = a * lead / (a + 1.0);
    let (mut p0, mut q0) = (0.0, 1.0);
    let (mut p1, mut q1) = (1.0, beta);
    for k in 1..CONTINUED_FRACTION_LIMIT {
        let n = f64::from(k);
        let odd = 1.0 / (a + 2.0 * n - 1.0);
        let alpha = (a + n - 1.0) * odd * x * ((a + b + n - 1.0) * odd * x) * (n * (b - n));
        beta = n + n * (b - n) * x * odd + (a + n) * (lead + n * (2.0 - x)) / (a + 2.0 * n + 1.0);
        let p2 = beta * p1 + alpha * p0;
        let q2 = beta * q1 + alpha * q0;
        let settled = (p2 * q1 - p1 * q2).abs() <= 2e-16 * (p2 * q1).abs();
        (p0, q0, p1, q1) = (p1, q1, p2, q2);
        if settled {
            return a * p1 / q1;
        }
        if q1.abs() > 1e150 {
            (p0, q0, p1, q1) = (p0 * 1e-150, q0 * 1e-150, p1 * 1e-150, q1 * 1e-150);
        }
    }
    f64::NAN
}

/// Steps allowed to the fraction; where it is used, a random search over the whole domain met at most 170. Beyond the limit
/// the ratio is not a number, which the distributions report as a failure to converge.
const CONTINUED_FRACTION_LIMIT: u32 = 2000;

/// Quadrature of `t^(a-1) (1-t)^(b-1)` from `x` downward, relative to its value at `x`.
fn quadrature_ratio(point: BetaPoint) -> f64 {
    let BetaPoint { a, b, x, y, excess, .. } = point;
    let slope = (x - y - excess * y) / (x * y);
    let curvature = (a - 1.0) / (x * x) + (b - 1.0) / (y * y);
    let length = decay_length(slope, curvature, 1.0).min(x);
    let integral = legendre::integrate(length, |d| {
        let downward = (a - 1.0) * ln_1p_minus_near_zero(-d / x);
        let upward = (b - 1.0) * ln_1p_minus_near_zero(d / y);
        libm::exp(downward + upward - slope * d)
    });
    a / (x * y) * integral
}

/// Central beta tails with the first shape raised by `j`, as a family for Poisson mixtures.
#[derive(Clone, Copy, Debug)]
pub(crate) struct BetaFamily(pub BetaPoint);

impl Family for BetaFamily {
    fn step(&self, j: f64) -> Scaled {
        beta_step(self.0.raised(j))
    }

    fn growth(&self, j: f64) -> (f64, f64) {
        let BetaPoint { a, b, odds, .. } = self.0;
        (odds * (a + b + j), (odds + b) * (a + j + 1.0))
    }

    fn lower_ratio(&self, j: f64) -> f64 {
        lower_ratio(self.0.raised(j))
    }

    fn upper_ratio(&self, j: f64) -> f64 {
        let point = self.0.raised(j);
        point.a / point.b * lower_ratio(point.mirrored())
    }

    fn tails(&self, j: f64) -> Tails {
        beta_tails(self.0.raised(j))
    }

    fn peak(&self, weights: Weights) -> f64 {
        let BetaPoint { a, b, x, .. } = self.0;
        // The larger root of (q + j)(a + j) = w x (a + b + j - 1), where p_j D_j stops growing.
        let Weights { q, w } = weights;
        larger_root(a + q - w * x, q * a - w * x * (a + b - 1.0))
    }

    fn curvature(&self, j: f64) -> f64 {
        let BetaPoint { a, b, .. } = self.0;
        b / ((a + j) * (a + b + j))
    }

    fn shape(&self, j: f64) -> f64 {
        self.0.a + j
    }

    fn distance(&self, w: f64) -> f64 {
        let BetaPoint { a, b, excess, .. } = self.0;
        (excess - w) / (a + 2.0 * w + (a + w) * ((a + w) / b)).sqrt()
    }

    fn start(&self) -> (f64, f64) {
        led_up(self.0).unwrap_or_else(|| (self.tails(0.0).lower(), self.step(0.0).value()))
    }
}

/// Shapes up to which a tail is led up from shape 1/2 or 1.
const MANY_STEPS: f64 = 20.0;

/// `I_x(a, b)` to within a few roundings of 1 and [`beta_step`], for whole or half `a`: from shape 1, where the upper
/// tail is `y^b`, or 1/2, where it is one of Student's t.
fn led_up(point: BetaPoint) -> Option<(f64, f64)> {
    let BetaPoint { a, b, odds, x, .. } = point;
    if a > MANY_STEPS || 2.0 * a != libm::floor(2.0 * a) {
        return None;
    }
    let student = StudentPoint::of_ratio(b, odds / b);
    let fall = libm::exp(-b * student.log);
    let (mut shape, mut upper, mut step) = if a == libm::floor(a) {
        (1.0, fall, b * x * fall)
    } else {
        let peak = peak(b);
        let upper = upper_factor(student, peak)?;
        (0.5, 2.0 * upper * fall, 2.0 * (2.0 * b * x).sqrt() * peak * fall)
    };
    while shape < a {
        upper += step;
        step *= x * (shape + b) / (shape + 1.0);
        shape += 1.0;
    }
    Some((1.0 - upper, step))
}

/// The larger root of `j² + linear j + constant = 0`, or 0 where it is negative.
pub(crate) fn larger_root(linear: f64, constant: f64) -> f64 {
    let half = 0.5 * linear;
    let root = (half * half - constant).max(0.0).sqrt();
    (if half > 0.0 { -constant / (half + root) } else { root - half }).max(0.0)
}
