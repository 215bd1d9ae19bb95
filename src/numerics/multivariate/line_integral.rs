//! Integrals over the line of positive functions given by their logarithm, however small they are.

use crate::numerics::error::Result;
use crate::numerics::quadrature::trapezoid;
use libm::{ceil, exp, floor};
use std::collections::VecDeque;

/// Distance between the places where the integrand is looked at first.
const SPACING: f64 = 2.0;

/// Logarithm of the share of the largest value below which the integrand does not count.
const NEGLIGIBLE: f64 = 42.0;

/// Integrals with a smaller logarithm are below the smallest double.
const SMALLEST: f64 = -760.0;

/// A largest sample with a smaller logarithm may be far below the true peak between the samples.
const SHARP: f64 = -40.0;

/// No search goes farther out: the density of a normal variable has left the range of doubles.
const FARTHEST: f64 = 80.0;

/// Where to look for an integrand.
#[derive(Debug, Clone, Copy)]
pub(super) struct Region {
    pub(super) low: f64,
    pub(super) high: f64,
    /// The integrand is even and `low` is 0: only the positive half is looked at.
    pub(super) even: bool,
}

/// Where an integrand counts, and the largest logarithm met there.
#[derive(Debug, Clone, Copy)]
pub(super) struct Support {
    pub(super) low: f64,
    pub(super) high: f64,
    pub(super) peak: f64,
}

impl Support {
    /// Whether the integral is below the smallest double.
    pub(super) fn vanishes(&self) -> bool {
        self.peak < SMALLEST
    }
}

/// Finds where `exp(log_f)` counts: the region is widened while it does at an end, and narrowed where it does not.
pub(super) fn support(region: Region, log_f: &impl Fn(f64) -> f64) -> Support {
    let mut low = if region.even { 0.0 } else { floor(region.low / SPACING) };
    let mut high = ceil(region.high / SPACING);
    let mut samples = VecDeque::new();
    let mut peak = f64::NEG_INFINITY;
    let look = |j: f64, peak: &mut f64| {
        let value = log_f(SPACING * j);
        *peak = peak.max(value);
        value
    };
    let mut j = low;
    while j <= high {
        samples.push_back(look(j, &mut peak));
        j += 1.0;
    }
    let counts =
        |sample: Option<&f64>, peak: f64| sample.is_some_and(|&value| value > peak - NEGLIGIBLE);
    while SPACING * high < FARTHEST && counts(samples.back(), peak) {
        high += 1.0;
        samples.push_back(look(high, &mut peak));
    }
    while !region.even && SPACING * low > -FARTHEST && counts(samples.front(), peak) {
        low -= 1.0;
        samples.push_front(look(low, &mut peak));
    }
    let best = samples.iter().position(|&value| value == peak).unwrap_or(0);
    let at_best = SPACING * (low + best as f64);
    // The outermost sample kept does not count, its neighbour does.
    while samples.len() > 2 && !counts(samples.iter().rev().nth(1), peak) {
        samples.pop_back();
        high -= 1.0;
    }
    while !region.even && samples.len() > 2 && !counts(samples.get(1), peak) {
        samples.pop_front();
        low += 1.0;
    }
    if peak < SHARP && peak > f64::NEG_INFINITY {
        peak = peak.max(refined_peak(at_best, log_f));
    }
    Support { low: SPACING * low, high: SPACING * high, peak }
}

/// The largest value within one spacing of a sample, by golden section.
fn refined_peak(middle: f64, log_f: &impl Fn(f64) -> f64) -> f64 {
    const GOLDEN: f64 = 0.618_033_988_749_894_9;
    let (mut low, mut high) = (middle - SPACING, middle + SPACING);
    let mut peak = f64::NEG_INFINITY;
    for _ in 0..24 {
        let width = GOLDEN * (high - low);
        let (left, right) = (log_f(high - width), log_f(low + width));
        peak = peak.max(left).max(right);
        if left > right {
            high = low + width;
        } else {
            low = high - width;
        }
    }
    peak
}

/// `∫ exp(log_f)` over the line by the trapezoidal rule, starting with the step given.
pub(super) fn integrate_exp(
    what: &'static str,
    region: Region,
    first_step: f64,
    log_f: impl Fn(f64) -> f64,
) -> Result<f64> {
    let support = support(region, &log_f);
    if support.vanishes() {
        return Ok(0.0);
    }
    let Support { low, high, peak } = support;
    let symmetry = if region.even { 2.0 } else { 1.0 };
    let steps = ((high - low) / first_step) as usize + 1;
    let relative = trapezoid(what, low, high, steps, |z| exp(log_f(z) - peak))?;
    Ok(symmetry * relative * exp(peak))
}
