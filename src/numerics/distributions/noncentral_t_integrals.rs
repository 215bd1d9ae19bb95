//! Integrals over the scale or the normal variable that give tails and density of the noncentral t distribution.
//!
//! All integrands are positive and bell-shaped, so that the trapezoidal rule on the line converges faster than any power
//! of its step and no digit is lost in either tail.

use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::gamma::{gamma_tails, stirling_remainder};
use crate::numerics::special::logarithms::ln_1p_minus_near_zero;
use crate::numerics::special::normal::{INV_SQRT_TAU, mills_ratio, normal_sf};
use crate::numerics::special::trapezoid::{trapezoid, two_sided};

/// The density of `ln s`, with `s = sqrt(V / df)`, around a point: `2 sqrt(k/2π) e^-r(k) exp(k (ln s² - s² + 1))`, `k = df/2`,
/// where `r` is the Stirling remainder.
struct LogScale {
    k: f64,
    /// The point around which offsets are counted.
    s: f64,
    ln_s: f64,
}

impl LogScale {
    fn around(df: f64, s: f64) -> Self {
        Self { k: 0.5 * df, s, ln_s: libm::log(s) }
    }

    /// The exponent at `s e^offset`, given `growth = e^offset - 1`.
    #[inline]
    fn exponent(&self, offset: f64, growth: f64) -> f64 {
        // s'^2 - 1 in terms of the growth, so that nothing is rounded on the scale of s itself.
        let deviation = (self.s - 1.0) * (self.s + 1.0) + self.s * self.s * growth * (2.0 + growth);
        // Two small numbers cancel near s = 1; with few degrees of freedom the bell is so wide that it does not matter.
        let ln = if self.k > 300.0 && deviation.abs() < 0.4 {
            ln_1p_minus_near_zero(deviation)
        } else {
            2.0 * (self.ln_s + offset) - deviation
        };
        self.k * ln
    }

    fn norm(&self) -> f64 {
        2.0 * (self.k / core::f64::consts::TAU).sqrt() * libm::exp(-stirling_remainder(self.k))
    }
}

/// Second derivative of the exponent in `ln s` below which the left tail of the integrand gets too long for even steps.
const LONG_TAILED: f64 = 60.0;

/// Integrates over `ln s`: `f` gets the offset from the point of the scale and its growth `e^offset - 1`.
///
/// `curvature` is minus the second derivative of the exponent at the point. For small ones the variable is changed to
/// `w` with `ln s = w + 1 - e^-w`, in which the left tail `s^df` falls doubly exponentially. The steps keep the first
/// alias of `exp(k (2u - e^2u))`, `4k` being the second derivative, below 3e-16 for every `k`: in `ln s` it is
/// `|Γ(k + iπ/step)| / Γ(k)`, in `w` it was measured in 30-digit arithmetic.
fn over_log_scale(curvature: f64, f: impl Fn(f64, f64) -> Scaled) -> Scaled {
    let long_tailed = curvature < LONG_TAILED;
    let alias = if long_tailed { 90.0 * curvature + 900.0 } else { 21.0 * curvature + 730.0 };
    let step = core::f64::consts::PI / alias.sqrt();
    if long_tailed {
        let side = |step: f64| {
            let mut decay = Growth::new(-step);
            let f = &f;
            move |w: f64| {
                let decay = decay.next();
                let offset = w - decay;
                f(offset, libm::expm1(offset)).times(2.0 + decay)
            }
        };
        return two_sided(step, f(0.0, 0.0).times(2.0), side(step), side(-step));
    }
    let side = |step: f64| {
        let mut growth = Growth::new(step);
        let f = &f;
        move |offset: f64| f(offset, growth.next())
    };
    two_sided(step, f(0.0, 0.0), side(step), side(-step))
}

/// The sequence `e^(i step) - 1`, each from the one before: the errors stay within a few ulps over a hundred terms.
struct Growth {
    now: f64,
    first: f64,
}

impl Growth {
    fn new(step: f64) -> Self {
        Self { now: 0.0, first: libm::expm1(step) }
    }

    #[inline]
    fn next(&mut self) -> f64 {
        self.now += self.first * (1.0 + self.now);
        self.now
    }
}

/// `∫ P(Z > ±(t s - ncp)) f(s) ds` over `ln s`: the upper tail with the plus sign, the lower one with the minus sign.
pub(super) fn scale_order(df: f64, ncp: f64, t: f64, upper: bool) -> Scaled {
    let sign = if upper { 1.0 } else { -1.0 };
    let s = scale_peak(df, ncp, t, sign);
    let scale = LogScale::around(df, s);
    // Second derivative of the exponent: the chi part, and the normal part as if it were far in its tail.
    let ts = t * s;
    let curvature = 2.0 * df * s * s + 2.0 * ts * ts + (-ncp * ts).max(-ts * ts);
    let centre = t.mul_add(s, -ncp);
    let sum = over_log_scale(curvature, |offset, growth| {
        normal_tail(sign * (centre + ts * growth)).times_exp(scale.exponent(offset, growth))
    });
    sum.times(scale.norm())
}

/// Roughly where the integrand of [`scale_order`] is largest over `ln s`: within a fraction of its width.
fn scale_peak(df: f64, ncp: f64, t: f64, sign: f64) -> f64 {
    // Where the normal factor is far in its tail it is Gaussian, and the peak solves a quadratic; else it is near 1.
    let gaussian = quadratic_peak(df, t, t * ncp, 0.0);
    let mut s = if sign * (t * gaussian - ncp) > 0.0 { gaussian } else { 1.0 };
    let near = 0.1 / (2.0 * df + t * t).sqrt();
    for _ in 0..PEAK_STEPS {
        // Newton's method with the algebraic stand-in (g + sqrt(g² + 4)) / 2 for the normal hazard.
        let g = sign * (t * s - ncp);
        let root = (g * g + 4.0).sqrt();
        let hazard = if g > 0.0 { 0.5 * (g + root) } else { 2.0 / (root - g) };
        let value = df * (1.0 - s) * (1.0 + s) - sign * hazard * t * s;
        let slope = 2.0 * df * s + hazard / root * t * t * s + sign * hazard * t;
        let next = (s + value / slope.max(df * s)).max(0.1 * s);
        let moved = (next - s).abs();
        s = next;
        if moved < near {
            break;
        }
    }
    s
}

/// Steps of Newton's method towards a peak; it need not be exact.
const PEAK_STEPS: u32 = 40;

/// The positive root of `(df + x²) s² - product s = df + power`.
fn quadratic_peak(df: f64, x: f64, product: f64, power: f64) -> f64 {
    let sum = df + x * x;
    let root = (product * product + 4.0 * (df + power) * sum).sqrt();
    if product > 0.0 {
        (product + root) / (2.0 * sum)
    } else {
        2.0 * (df + power) / (root - product)
    }
}

/// Normal upper tail in scaled form.
#[inline]
fn normal_tail(g: f64) -> Scaled {
    if g < 0.0 {
        Scaled::plain(normal_sf(g))
    } else {
        Scaled { factor: INV_SQRT_TAU * mills_ratio(g), exponent: -0.5 * g * g }
    }
}

/// `∫ φ(z) P(s < (z + ncp)/t) dz` (upper tail) or with `s >` (lower tail): for `t² > 4.5 df` and large `ncp`, where the
/// scale would need too many steps and the kink at `z = -ncp` is out of sight.
pub(super) fn normal_order(df: f64, ncp: f64, t: f64, upper: bool) -> Scaled {
    let k = 0.5 * df;
    let scale = k.sqrt() / t;
    let ratio = df / (t * t);
    // Both tails of s fall like exp(k (ln s² - s² + 1)), so that the peak solves the same quadratic as over the scale.
    let peak = t * quadratic_peak(df, t, t * ncp, 0.0) - ncp;
    let integrand = |offset: f64| {
        let z = peak + offset;
        let root = (z + ncp) * scale;
        let tail = if root > 0.0 {
            one_tail(gamma_tails(k, root * root), upper)
        } else {
            Scaled::plain(if upper { 0.0 } else { 1.0 })
        };
        tail.times(INV_SQRT_TAU).times_exp(-0.5 * z * z)
    };
    trapezoid(0.5 / (1.0 + ratio).sqrt(), integrand)
}

fn one_tail(tails: Tails, lower: bool) -> Scaled {
    if lower { tails.lower_scaled() } else { tails.upper_scaled() }
}

/// `∫ s^power φ(x s - ncp) f(s) ds` for `power` 0 or 1, any sign of `x` and `ncp`.
pub(super) fn central_moment_integral(df: f64, ncp: f64, x: f64, power: f64) -> Scaled {
    let product = x * ncp;
    let s = quadratic_peak(df, x, product, power);
    let scale = LogScale::around(df, s);
    let xs = x * s;
    let curvature = 2.0 * (df + x * x) * s * s - product * s;
    let centre = x.mul_add(s, -ncp);
    let sum = over_log_scale(curvature, |offset, growth| {
        let g = centre + xs * growth;
        Scaled {
            factor: INV_SQRT_TAU,
            exponent: scale.exponent(offset, growth) - 0.5 * g * g + power * offset,
        }
    });
    sum.times(scale.norm() * if power > 0.0 { s } else { 1.0 })
}
