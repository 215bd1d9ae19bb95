//! The trapezoidal rule on the whole line, spectrally accurate for the bell-shaped integrands of this folder.

use super::exponential::{self, LANES};
use crate::numerics::scaled::Scaled;

/// Terms allowed on either side of the start, beyond which the sum is not a number; the widest integrand, at a hundredth of a degree of freedom, needs 35 000.
const TERMS: u32 = 40_000;

/// What is left out is below this share of the sum.
const NEGLIGIBLE: f64 = 2e-18;

/// Below this exponent only the logarithm has a meaning, and the largest term alone gives it to ten digits.
const BOTTOMLESS: f64 = -1e12;

/// `step Σ f(i step)` over all whole `i`, outward from 0 until the terms vanish; `f` is positive with a single peak near 0.
pub(crate) fn trapezoid(step: f64, f: impl Fn(f64) -> Scaled) -> Scaled {
    let top = f(0.0);
    let side = |sum: f64, step: f64| {
        let mut side = Side { sum, previous: 0.0 };
        for i in 1..TERMS {
            let here = f(step * f64::from(i));
            if side.ends_with(here.factor * libm::exp(here.exponent - top.exponent)) {
                return side.sum;
            }
        }
        f64::NAN
    };
    finish(step, top, side)
}

/// The same with the two sides given apart: each is called for every node, in order, with the node's offset, and
/// may carry over what it needs from one node to the next. Meant for cheap integrands, as up to three nodes a side are
/// evaluated in vain.
pub(crate) fn two_sided(
    step: f64,
    top: Scaled,
    mut right: impl FnMut(f64) -> Scaled,
    mut left: impl FnMut(f64) -> Scaled,
) -> Scaled {
    finish(step, top, |sum, step| {
        if step > 0.0 {
            batched_side(top, sum, step, &mut right)
        } else {
            batched_side(top, sum, step, &mut left)
        }
    })
}

/// Adds the right side and then the left one to the top term.
fn finish(step: f64, top: Scaled, mut side: impl FnMut(f64, f64) -> f64) -> Scaled {
    if top.exponent < BOTTOMLESS {
        return top;
    }
    let right = side(top.factor, step);
    Scaled { factor: side(right, -step) * step, exponent: top.exponent }
}

/// The sum, in units of the top term's scale, as the terms of one side are added.
struct Side {
    sum: f64,
    previous: f64,
}

impl Side {
    /// Adds a term; whether those beyond it are negligible.
    #[inline]
    fn ends_with(&mut self, term: f64) -> bool {
        self.sum += term;
        // The terms are logarithmically concave: the next one is at most this one times the last ratio.
        let ends = term * term <= NEGLIGIBLE * self.sum * self.previous && term <= self.previous;
        self.previous = term;
        ends
    }
}

/// Adds the terms of one side, several at a time, so that their exponentials are computed side by side.
#[inline]
fn batched_side(top: Scaled, sum: f64, step: f64, f: &mut impl FnMut(f64) -> Scaled) -> f64 {
    let mut side = Side { sum, previous: 0.0 };
    let mut factors = [0.0; LANES];
    let mut exponents = [0.0; LANES];
    let mut i = 0_u32;
    while i < TERMS {
        for (factor, exponent) in factors.iter_mut().zip(&mut exponents) {
            i += 1;
            let here = f(step * f64::from(i));
            (*factor, *exponent) = (here.factor, here.exponent - top.exponent);
        }
        for (factor, exponential) in factors.iter().zip(exponential::exp(exponents)) {
            if side.ends_with(factor * exponential) {
                return side.sum;
            }
        }
    }
    f64::NAN
}
