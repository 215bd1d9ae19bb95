//! Poisson mixtures of incomplete beta or gamma functions: the common core of the noncentral distributions.
//!
//! With Poisson weights `p_j` and central tails `L_j` (lower) and `U_j = 1 - L_j` that differ by the positive step
//! `D_j = L_j - L_{j+1}`, both sums `Σ p_j L_j` and `Σ p_j U_j` have positive terms only. Each is summed in the
//! direction in which its tails grow, so that no subtraction ever occurs: the lower one from large `j` downward, the
//! upper one from small `j` upward. What is carried along is the product `g_j = p_j D_j` and the ratio of tail to step,
//! which stay of moderate size where the tail itself is as small as 1e-300.
//!
//! Where the terms form a bell away from 0 they are so smooth in `j` that the sum equals the integral over real `j` to
//! full precision, and so does the trapezoidal rule with a stride of many `j`, over which ratio and product are led by
//! products of the recurrences' factors; beyond [`WIDE`] its nodes are computed each on its own. Where neither tail is
//! small, the lower one is summed upward from `j = 0` by subtraction: that is shorter.

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

    /// Distance of the point from the mean of the mixture with Poisson weights of mean `w`, in standard deviations.
    fn distance(&self, w: f64) -> f64;

    /// `L_0` to within a few roundings of 1, and `D_0` to full relative accuracy.
    fn start(&self) -> (f64, f64) {
        (self.tails(0.0).lower(), self.step(0.0).value())
    }
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

/// Both tails of the mixture with Poisson weights of mean `w`, of which the lower one is computed directly if
/// `below_mean`, unless neither is small.
pub(crate) fn mixture_tails(family: impl Family, w: f64, below_mean: bool) -> Tails {
    if w < FEW && family.distance(w).abs() < CENTRAL {
        let lower = central_sum(family, w);
        if lower > SMALL && lower < 1.0 - SMALL {
            return Tails::Lower(Scaled::plain(lower));
        }
    }
    let weights = Weights { q: 0.0, w };
    if below_mean {
        Tails::Lower(lower_sum(family, weights))
    } else {
        Tails::Upper(upper_sum(family, weights))
    }
}

/// Below this mean of the weights their sum may begin at 0.
const FEW: f64 = 60.0;

/// Within this many standard deviations of the mean neither tail is likely to be small.
const CENTRAL: f64 = 1.7;

/// A tail below this is summed by itself, from terms that are all positive.
const SMALL: f64 = 0.05;

/// `Σ p_j L_j` from 0 upward with `L_{j+1} = L_j - D_j`: a few roundings of 1 are lost, which only a small tail would feel.
fn central_sum(family: impl Family, w: f64) -> f64 {
    let (mut tail, mut step) = family.start();
    let mut weight = libm::exp(-w);
    let mut sum = weight * tail;
    let mut previous = sum;
    let mut j = 0.0;
    loop {
        let (top, bottom) = family.growth(j);
        tail -= step;
        j += 1.0;
        let inverse = 1.0 / (bottom * j);
        weight *= w * (bottom * inverse);
        step *= top * (j * inverse);
        let term = weight * tail;
        sum += term;
        // Rounding may leave a vanishing tail below 0. Negated, so that not a number ends the loop as well.
        if !(term > 0.0 && (term > previous || term > NEGLIGIBLE * sum)) {
            return sum;
        }
        previous = term;
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
    let stride = stride(family, weights, peak);
    if stride > 1.0 {
        return lower_strides(family, weights, peak, stride);
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
    let stride = stride(family, weights, peak);
    if stride > 1.0 {
        return upper_strides(family, weights, peak, stride);
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

/// How many indices a step of the trapezoidal rule may skip where the terms form a smooth bell away from 0.
fn stride(family: impl Family, weights: Weights, peak: f64) -> f64 {
    let spread = variance(family, weights.q, peak).sqrt();
    let widest = libm::floor(SMOOTH * spread);
    if peak <= NARROW || peak < DOWNWARD * spread + widest + 1.0 {
        return 1.0;
    }
    // The products over one stride have to stay within the range of f64.
    let (top, bottom) = family.growth(2.0 * peak);
    let largest = top.max(bottom).max(weights.w).max(2.0 * peak);
    widest.min(libm::floor(300.0 / libm::log(largest)))
}

/// Step, in standard deviations of the bell, at which the trapezoidal rule is exact to 1e-18.
const SMOOTH: f64 = 0.68;

/// Standard deviations below the peak where the terms begin to matter; they fall off at least like a Gaussian curve.
const DOWNWARD: f64 = 8.5;

/// What one stride from `j` upward does: over its steps, the products of the numerators and denominators of the growth
/// of `D`, of the growth of `p`, and the numerator of the sum of the steps passed, over the last one.
struct Passage {
    top: f64,
    bottom: f64,
    weight: f64,
    index: f64,
    steps: f64,
}

fn passage(family: impl Family, weights: Weights, j: f64, stride: f64) -> Passage {
    let mut passed = Passage { top: 1.0, bottom: 1.0, weight: 1.0, index: 1.0, steps: 0.0 };
    let end = j + stride;
    let mut j = j;
    while j < end {
        let (top, bottom) = family.growth(j);
        j += 1.0;
        passed.steps = (passed.steps + passed.top) * bottom;
        passed.top *= top;
        passed.bottom *= bottom;
        passed.weight *= weights.w;
        passed.index *= weights.q + j;
    }
    passed
}

/// `Σ p_j U_j` by the trapezoidal rule; the tail is led from node to node.
fn upper_strides(family: impl Family, weights: Weights, peak: f64, stride: f64) -> Scaled {
    let spread = variance(family, weights.q, peak).sqrt();
    let start = libm::floor(peak - DOWNWARD * spread);
    let (mut g, mut j) = (1.0, start);
    let mut ratio = family.upper_ratio(j);
    let mut sum = g * ratio;
    let mut previous = sum;
    loop {
        let passed = passage(family, weights, j, stride);
        ratio = (ratio * passed.bottom + passed.steps) / passed.top;
        g *= passed.weight / passed.bottom * (passed.top / passed.index);
        j += stride;
        let term = g * ratio;
        sum += term;
        if !(term >= previous || term * term > NEGLIGIBLE * sum * previous) {
            break;
        }
        previous = term;
    }
    at_anchor(family, weights, start).times(sum * stride)
}

/// `Σ p_j L_j` likewise, from large `j` downward.
fn lower_strides(family: impl Family, weights: Weights, peak: f64, stride: f64) -> Scaled {
    let (start, mut g, mut j) = upper_edge(family, weights, peak);
    let mut ratio = family.lower_ratio(j);
    let mut sum = g * ratio;
    let mut previous = sum;
    while j >= stride {
        j -= stride;
        let passed = passage(family, weights, j, stride);
        ratio = (ratio * passed.top + passed.steps) / passed.bottom;
        g *= passed.bottom / passed.weight * (passed.index / passed.top);
        let term = g * ratio;
        sum += term;
        if !(term >= previous || term * term > NEGLIGIBLE * sum * previous) {
            break;
        }
        previous = term;
    }
    at_anchor(family, weights, start).times(sum * stride)
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
