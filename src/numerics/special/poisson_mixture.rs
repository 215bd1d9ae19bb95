//! Poisson mixtures of incomplete beta or gamma functions: the common core of the noncentral distributions.
//!
//! With Poisson weights `p_j` and central tails `L_j` (lower) and `U_j = 1 - L_j` that differ by the positive step
//! `D_j = L_j - L_{j+1}`, both sums `Σ p_j L_j` and `Σ p_j U_j` have positive terms only. Each is summed in the
//! direction in which its tails grow, so that no subtraction ever occurs: the lower one from large `j` downward, the
//! upper one from small `j` upward. What is carried along is the product `g_j = p_j D_j` and the ratio of tail to step,
//! which stay of moderate size where the tail itself is as small as 1e-300.
//!
//! Where the largest term lies beyond [`WIDE`], the terms are so smooth in `j` that the sum equals the integral over
//! real `j` to full precision, and the trapezoidal rule with a step of many `j` takes its place.

use super::trapezoid::trapezoid;
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::gamma::poisson_density;

/// A family of central tails indexed by `j`.
pub(crate) trait Family: Copy {
    /// The step `D_j`.
    fn step(&self, j: f64) -> Scaled;

    /// Numerator and denominator of `D_{j+1} / D_j`.
    fn growth(&self, j: f64) -> (f64, f64);

    /// `L_j / D_j`, wanted where the lower tail is the smaller one.
    fn lower_ratio(&self, j: f64) -> f64;

    /// `U_j / D_j`, wanted where the upper tail is the smaller one.
    fn upper_ratio(&self, j: f64) -> f64;

    /// Both tails at any real `j`.
    fn tails(&self, j: f64) -> Tails;

    /// Where `p_j D_j` is largest as a real number, given the shift `q` and mean `w` of the weights.
    fn peak(&self, weights: Weights) -> f64;

    /// `-d² ln D_j / dj²`.
    fn curvature(&self, j: f64) -> f64;

    /// The first shape at `j`, by which `D_j` is multiplied in the density.
    fn shape(&self, j: f64) -> f64;
}

/// Weights `p_j = e^-w w^(q+j) / Γ(q + j + 1)`, `j = 0, 1, …`; `q = 0` gives Poisson probabilities.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Weights {
    /// Shift of the index.
    pub q: f64,
    /// Mean, above 0.
    pub w: f64,
}

/// Terms below this share of the sum are left out.
const NEGLIGIBLE: f64 = 4e-18;

/// Largest position of the peak for which the terms are summed one by one.
const WIDE: f64 = 3000.0;

/// Both tails of the mixture, of which the lower one is computed directly if `below_mean`.
pub(crate) fn mixture_tails(family: impl Family, weights: Weights, below_mean: bool) -> Tails {
    if below_mean {
        Tails::Lower(lower_sum(family, weights))
    } else {
        Tails::Upper(upper_sum(family, weights))
    }
}

/// Up to this position of the peak the ends of the sums are found step by step.
const NARROW: f64 = 40.0;

/// `Σ p_j L_j`.
pub(crate) fn lower_sum(family: impl Family, weights: Weights) -> Scaled {
    let Weights { q, w } = weights;
    let peak = family.peak(weights);
    if peak > WIDE {
        return smooth_sum(family, weights, peak, |j| family.tails(j).lower_scaled());
    }
    let (anchor, mut g, mut j) = upper_edge(family, weights, peak);
    let mut ratio = family.lower_ratio(j);
    let mut sum = g * ratio;
    let mut previous = sum;
    while j >= 1.0 {
        let (top, bottom) = family.growth(j - 1.0);
        let index = q + j;
        let inverse = 1.0 / (w * top * bottom);
        ratio = 1.0 + ratio * (top * top * inverse * w);
        g *= index * (bottom * bottom * inverse);
        j -= 1.0;
        let term = g * ratio;
        sum += term;
        if term < previous && term <= NEGLIGIBLE * sum {
            break;
        }
        previous = term;
    }
    at_anchor(family, weights, anchor).times(sum)
}

/// An index above which the terms of the lower sum are negligible, after an anchor and the size of the product there
/// over its size at the anchor.
fn upper_edge(family: impl Family, weights: Weights, peak: f64) -> (f64, f64, f64) {
    let Weights { q, w } = weights;
    if peak > NARROW {
        // They fall off like Poisson probabilities at most: P(J > peak + t) <= exp(-t² / (2 (v + t/3))).
        let edge = libm::ceil(peak + 13.3 + (177.0 + 80.0 * variance(family, q, peak)).sqrt());
        return (edge, 1.0, edge);
    }
    // Near 0 the anchor is 0 itself, where the weight costs no logarithm.
    let (mut g, mut j, mut largest) = (1.0_f64, 0.0, 1.0_f64);
    loop {
        let (top, bottom) = family.growth(j);
        let next = g * (w * top / (bottom * (q + j + 1.0)));
        if next.is_nan() || next <= NEGLIGIBLE * largest {
            return (0.0, g, j);
        }
        g = next;
        largest = largest.max(g);
        j += 1.0;
    }
}

/// Variance of the bell that `p_j D_j` forms around its peak.
fn variance(family: impl Family, q: f64, peak: f64) -> f64 {
    if peak > 0.0 { 1.0 / (1.0 / (q + peak) + family.curvature(peak)) } else { 0.0 }
}

/// `Σ p_j U_j`.
pub(crate) fn upper_sum(family: impl Family, weights: Weights) -> Scaled {
    let Weights { q, w } = weights;
    let peak = family.peak(weights);
    if peak > WIDE {
        return smooth_sum(family, weights, peak, |j| family.tails(j).upper_scaled());
    }
    // The terms fall off downward at least like a Gaussian curve.
    let reach = if peak > NARROW { 9.0 * variance(family, q, peak).sqrt() + 3.0 } else { peak };
    let start = libm::floor((peak - reach).max(0.0));
    let mut g = 1.0;
    let mut j = start;
    let mut ratio = family.upper_ratio(j);
    let mut sum = g * ratio;
    let mut previous = sum;
    loop {
        let (top, bottom) = family.growth(j);
        let index = q + j + 1.0;
        let inverse = 1.0 / (top * bottom * index);
        ratio = (ratio + 1.0) * (bottom * bottom * index * inverse);
        g *= w * (top * top * inverse);
        j += 1.0;
        let term = g * ratio;
        sum += term;
        // Negated, so that a term that is not a number ends the loop as well.
        if !(term >= previous || term > NEGLIGIBLE * sum) {
            break;
        }
        previous = term;
    }
    at_anchor(family, weights, start).times(sum)
}

/// `Σ p_j (a + j) D_j`: the density of the mixture times its argument.
pub(crate) fn density_sum(family: impl Family, weights: Weights) -> Scaled {
    product_sum(family, weights, |j| family.shape(j))
}

/// `Σ p_j D_j`: twice the slope of the upper tail in the noncentrality `2w`.
pub(crate) fn slope_sum(family: impl Family, weights: Weights) -> Scaled {
    product_sum(family, weights, |_| 1.0)
}

fn product_sum(family: impl Family, weights: Weights, factor: impl Fn(f64) -> f64) -> Scaled {
    let Weights { q, w } = weights;
    let peak = family.peak(weights);
    if peak > WIDE {
        return smooth_sum(family, weights, peak, |j| family.step(j).times(factor(j)));
    }
    let anchor = libm::floor(peak);
    let mut sum = factor(anchor);
    let mut g = 1.0;
    let mut j = anchor;
    while g > NEGLIGIBLE {
        let (top, bottom) = family.growth(j);
        g *= w * top / (bottom * (q + j + 1.0));
        j += 1.0;
        sum += g * factor(j);
    }
    (g, j) = (1.0, anchor);
    while j >= 1.0 && g > NEGLIGIBLE {
        let (top, bottom) = family.growth(j - 1.0);
        g *= (q + j) * bottom / (w * top);
        j -= 1.0;
        sum += g * factor(j);
    }
    at_anchor(family, weights, anchor).times(sum)
}

/// Size of the product `p_j D_j` at the anchor.
fn at_anchor(family: impl Family, weights: Weights, anchor: f64) -> Scaled {
    poisson_density(weights.q + anchor, weights.w).product(family.step(anchor))
}

/// `Σ p_j v_j` as an integral over real `j`.
fn smooth_sum(
    family: impl Family,
    weights: Weights,
    peak: f64,
    value: impl Fn(f64) -> Scaled,
) -> Scaled {
    let Weights { q, w } = weights;
    let step = 0.68 / (1.0 / (q + peak) + family.curvature(peak)).sqrt();
    trapezoid(step, |offset| {
        let j = peak + offset;
        if j < 0.0 { Scaled::ZERO } else { poisson_density(q + j, w).product(value(j)) }
    })
}
