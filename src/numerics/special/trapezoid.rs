//! The trapezoidal rule on the whole line, spectrally accurate for the bell-shaped integrands of this folder.

use crate::numerics::scaled::Scaled;

/// Terms allowed on either side of the start, beyond which the sum is not a number; the widest integrand, at a hundredth of a degree of freedom, needs 35 000.
const TERMS: u32 = 40_000;

/// Terms below this share of the sum are left out.
const NEGLIGIBLE: f64 = 2e-18;

/// Below this exponent only the logarithm has a meaning, and the largest term alone gives it to ten digits.
const BOTTOMLESS: f64 = -1e12;

/// `step Σ f(i step)` over all whole `i`, outward from 0 until the terms vanish; `f` is positive with a single peak near 0.
pub(crate) fn trapezoid(step: f64, f: impl Fn(f64) -> Scaled) -> Scaled {
    two_sided(step, f(0.0), &f, &f)
}

/// The same with the two sides given apart: each is called once for every node, in order, with the node's offset, and
/// may carry over what it needs from one node to the next.
pub(crate) fn two_sided(
    step: f64,
    top: Scaled,
    right: impl FnMut(f64) -> Scaled,
    left: impl FnMut(f64) -> Scaled,
) -> Scaled {
    if top.exponent < BOTTOMLESS {
        return top;
    }
    let sum = one_side(top, top.factor, step, right);
    Scaled { factor: one_side(top, sum, -step, left) * step, exponent: top.exponent }
}

/// Adds the terms of one side to the sum, which is in units of the top term's scale.
fn one_side(top: Scaled, sum: f64, step: f64, mut f: impl FnMut(f64) -> Scaled) -> f64 {
    let mut sum = sum;
    let mut previous = 0.0;
    for i in 1..TERMS {
        let here = f(step * f64::from(i));
        let term = here.factor * libm::exp(here.exponent - top.exponent);
        sum += term;
        if term <= NEGLIGIBLE * sum && term <= previous {
            return sum;
        }
        previous = term;
    }
    f64::NAN
}
