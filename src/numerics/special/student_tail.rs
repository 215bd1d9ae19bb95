//! The incomplete beta function with a second shape of one half: the tail of Student's t.
//!
//! Source: DiDonato, Morris (1992), ACM TOMS 18(3), 360-373, the expansion of `I_x(a, b)` for large `a` (their `BGRAT`),
//! with the coefficients for `b = 1/2` as constants; smaller `a` are raised by recurrence. All terms are positive but for
//! the alternation of the expansion, whose first term dominates.

use super::normal::{INV_SQRT_TAU, mills_ratio};

/// A point `t >= 0` of Student's t distribution with `2b` degrees of freedom.
#[derive(Clone, Copy, Debug)]
pub(crate) struct StudentPoint {
    /// Half the degrees of freedom.
    pub b: f64,
    /// `ln(1 + t²/2b)`.
    pub log: f64,
    /// `t² / (t² + 2b)`.
    pub x: f64,
    /// `2b / (t² + 2b)`.
    pub y: f64,
}

impl StudentPoint {
    /// The point with the given `t² / 2b`.
    pub fn of_ratio(b: f64, ratio: f64) -> Self {
        let y = 1.0 / (1.0 + ratio);
        Self { b, log: libm::log1p(ratio), x: ratio * y, y }
    }
}

/// From this shape on the expansion serves; the recurrence leads smaller ones up to it.
const LARGE: f64 = 8.0;

/// Up to this `ln(1 + t²/2b)` the expansion reaches full precision from [`LARGE`] on.
const NEAR: f64 = 0.6;

/// The same for shapes of 12 and more.
const FAR: f64 = 1.0;

/// Coefficients of `(sinh z / z)^(-1/2)` in powers of `z²`.
const EXPANSION: [f64; 12] = [
    -0.08333333333333333,
    0.00625,
    -0.0005042989417989418,
    4.343722442680776e-5,
    -3.896385732323232e-6,
    3.5833354634507906e-7,
    -3.349747072060578e-8,
    3.1675854343161146e-9,
    -3.0210368517370963e-10,
    2.900415787669253e-11,
    -2.799396748375269e-12,
    2.713639320017204e-13,
];

/// Coefficients of `Γ(T + ¾) / (Γ(T + ¼) sqrt(T))` in powers of `1/T²`, highest first, without the leading 1.
///
/// Chebyshev fit for `T >= 7.75` in 60-digit arithmetic, absolute error 4e-18.
const GAMMA_RATIO: [f64; 6] = [
    -0.0055390489862270085,
    0.002365406681152289,
    -0.0012985929665263504,
    0.00120353633246747,
    -0.0023193359365710187,
    0.015624999999999785,
];

/// Terms below this share of the sum are left out.
const NEGLIGIBLE: f64 = 2e-17;

/// The upper tail `½ I_y(b, ½)` over `y^b`, given the density of Student's t at 0; none where `t` is so far out that the
/// continued fraction is short.
///
/// Relative error below 2e-15.
pub(crate) fn upper_factor(point: StudentPoint, peak: f64) -> Option<f64> {
    let StudentPoint { b, log, x, y } = point;
    if log > FAR || (log > NEAR && b < 12.0) {
        return None;
    }
    if b >= LARGE {
        return Some(expansion(b, log));
    }
    let (mut shape, mut sum, mut rise) = (b, 0.0, 1.0);
    let mut step = peak * (x / (2.0 * b)).sqrt();
    while shape < LARGE {
        sum += step;
        step *= y * (shape + 0.5) / (shape + 1.0);
        shape += 1.0;
        rise *= y;
    }
    Some(sum + rise * expansion(shape, log))
}

/// [`upper_factor`] for a large shape.
fn expansion(b: f64, log: f64) -> f64 {
    let large = b - 0.25;
    let u = large * log;
    let g = (2.0 * u).sqrt();
    let quarter = 0.25 / (large * large);
    let square = 0.25 * log * log;
    let mut power = 0.5 * g * quarter;
    let mut integral = mills_ratio(g);
    let mut sum = integral;
    let mut n = 0.5;
    for coefficient in EXPANSION {
        integral = integral * (quarter * (n * (n + 1.0))) + power * (u + n + 1.0);
        let term = coefficient * integral;
        sum += term;
        if term.abs() <= NEGLIGIBLE * sum {
            break;
        }
        power *= square;
        n += 2.0;
    }
    INV_SQRT_TAU * gamma_ratio(large) * libm::exp(0.25 * log) * sum
}

/// The density of Student's t with `2b` degrees of freedom at 0: `Γ(b + ½) / (Γ(b) sqrt(2πb))`; relative error below 2e-15.
pub(crate) fn peak(b: f64) -> f64 {
    let (mut shape, mut top, mut bottom) = (b, 1.0, 1.0);
    while shape < LARGE {
        top *= shape;
        bottom *= shape + 0.5;
        shape += 1.0;
    }
    let large = shape - 0.25;
    INV_SQRT_TAU * gamma_ratio(large) * (large / b).sqrt() * (top / bottom)
}

fn gamma_ratio(large: f64) -> f64 {
    let square = 1.0 / (large * large);
    1.0 + square * GAMMA_RATIO.iter().fold(0.0, |sum, c| sum * square + c)
}
