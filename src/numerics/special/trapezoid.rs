//! The trapezoidal rule on the whole line, spectrally accurate for the bell-shaped integrands of this folder.

use crate::numerics::scaled::Scaled;

/// Terms on either side of the start; the widest integrand, at a hundredth of a degree of freedom, needs 35 000.
const TERMS: u32 = 40_000;

/// Terms below this share of the sum are left out.
const NEGLIGIBLE: f64 = 2e-18;

/// Below this exponent only the logarithm has a meaning, and the largest term alone gives it to ten digits.
const BOTTOMLESS: f64 = -1e12;

/// `step Σ f(i step)` over all whole `i`, outward from 0 until the terms vanish; `f` is positive with a single peak near 0.
pub(crate) fn trapezoid(step: f64, f: impl Fn(f64) -> Scaled) -> Scaled {
    let top = f(0.0);
    if top.exponent < BOTTOMLESS {
        return top;
    }
    let mut sum = top.factor;
    for direction in [step, -step] {
        let mut previous = 0.0;
        for i in 1..TERMS {
            let here = f(direction * f64::from(i));
            let term = here.factor * libm::exp(here.exponent - top.exponent);
            sum += term;
            if term <= NEGLIGIBLE * sum && term <= previous {
                break;
            }
            previous = term;
        }
    }
    Scaled { factor: sum * step, exponent: top.exponent }
}
