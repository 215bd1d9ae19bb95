//! Means compared in pairs: factors of the standard error, the t test at fixed sizes, and the textbook formula, for
//! the designs that end in such tests.

use super::family::Family;
use super::inputs::{Compare, Parallel, StatedRisk};
use super::parallel_means::trial::reject;
use super::problem::{AtSizes, Point, Sizes, Textbook};
use crate::numerics::{self, Continuous, NoncentralT, normal_cdf, normal_upper_quantile, roots};
use crate::quantities::Sides;

impl Parallel {
    /// The comparisons with what protects them.
    pub(super) fn family(&self, risk: &StatedRisk) -> Family<'_> {
        Family {
            multiplicity: risk.multiplicity,
            alpha: risk.risk.alpha.get(),
            sides: risk.risk.sides,
            groups: self.groups.len(),
            pairs: &self.pairs,
        }
    }

    /// The normal quantiles of the textbook formula for the comparisons.
    pub(super) fn quantiles(&self, risk: &StatedRisk) -> numerics::Result<NormalQuantiles> {
        let weights: Vec<f64> = self.groups.iter().map(|g| g.weight).collect();
        let beta = normal_upper_quantile(1.0 - risk.risk.power.get())?;
        let alpha = self.family(risk).critical(f64::INFINITY, &weights)?;
        Ok(NormalQuantiles { alpha, beta })
    }

    /// `√(1/n_i + 1/n_j)` of a pair.
    pub(super) fn pair_factor(&self, sizes: &Sizes, (i, j): (usize, usize)) -> f64 {
        let reciprocal =
            |g: usize| sizes.per_group.get(g).map_or(f64::INFINITY, |n| 1.0 / *n as f64);
        (reciprocal(i) + reciprocal(j)).sqrt()
    }

    /// Position and factor of the comparison with the least power: the one between the smallest groups, the first of
    /// equals.
    pub(super) fn weakest_pair(&self, sizes: &Sizes) -> (usize, f64) {
        let mut weakest = (0, 0.0);
        for (position, pair) in self.pairs.iter().enumerate() {
            let factor = self.pair_factor(sizes, *pair);
            if factor > weakest.1 {
                weakest = (position, factor);
            }
        }
        weakest
    }

    /// The largest factor for sizes relative to the largest group, as a textbook formula takes it.
    pub(super) fn relative_factor(&self) -> f64 {
        let largest = self.largest_weight();
        let share = |g: usize| self.groups.get(g).map_or(1.0, |g| g.weight / largest);
        let of_pair = |&(i, j): &(usize, usize)| (1.0 / share(i) + 1.0 / share(j)).sqrt();
        self.pairs.iter().map(of_pair).fold(0.0, f64::max)
    }
}

/// A t test at fixed sizes: it rejects when `estimate / (s factor)` lies beyond the critical value, where `s` is the
/// estimated standard deviation on `df` degrees of freedom.
#[derive(Debug, Clone, Copy)]
pub(super) struct TTest {
    /// Degrees of freedom.
    pub df: f64,
    /// Critical value on the scale of t.
    pub critical: f64,
    /// Standard error of the estimate in units of the nuisance value.
    pub factor: f64,
    /// Whether one tail rejects or both.
    pub sides: Sides,
}

impl TTest {
    /// Power at a noncentrality; both tails count when both reject.
    pub fn power_at(&self, noncentrality: f64) -> numerics::Result<f64> {
        let t = NoncentralT::new(self.df, noncentrality)?;
        let upper = t.sf(self.critical)?;
        Ok(match self.sides {
            Sides::One => upper,
            Sides::Two => upper + t.cdf(-self.critical)?,
        })
    }
}

impl AtSizes for TTest {
    fn power(&self, at: Point) -> numerics::Result<f64> {
        self.power_at(at.effect / (at.nuisance * self.factor))
    }

    /// The far rejection region needs a look only where it can decide: it has no more than `Φ(−λ)`, since a negative
    /// statistic takes a negative numerator.
    fn reaches(&self, at: Point, target: f64) -> numerics::Result<bool> {
        let noncentrality = at.effect / (at.nuisance * self.factor);
        let near = NoncentralT::new(self.df, noncentrality)?.sf(self.critical)?;
        if near >= target || self.sides == Sides::One {
            return Ok(near >= target);
        }
        if near + normal_cdf(-noncentrality) < target {
            return Ok(false);
        }
        Ok(self.power_at(noncentrality)? >= target)
    }

    /// The power depends on the ratio of effect to spread alone, so one root serves every spread.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>> {
        let found = noncentrality_for(self.critical, power, |n| self.power_at(n))?;
        Ok(nuisances.iter().map(|nuisance| found * nuisance * self.factor).collect())
    }
}

/// The noncentrality at which a rising power function has a given value.
pub(super) fn noncentrality_for(
    critical: f64,
    power: f64,
    power_at: impl Fn(f64) -> numerics::Result<f64>,
) -> numerics::Result<f64> {
    let gap = |noncentrality: f64| Ok(power_at(noncentrality)? - power);
    let what = "detectable difference";
    let start = critical + normal_upper_quantile(1.0 - power)?.max(0.0);
    let bracket = roots::bracket_around(what, start, 0.5, (0.0, 1e12), gap)?;
    Ok(roots::refine(what, bracket, roots::Tolerance::default(), gap)?.at)
}

/// The normal quantiles of the textbook formula: the test statistic taken as normal, its standard deviation as known.
#[derive(Debug, Clone, Copy)]
pub(super) struct NormalQuantiles {
    /// Critical value of one comparison when the standard deviation is known.
    pub alpha: f64,
    /// Upper quantile of the type II error.
    pub beta: f64,
}

impl NormalQuantiles {
    /// The textbook size `(z_alpha + z_beta)² ratio²`, where `ratio² / n` is the squared ratio of standard error to
    /// effect at size `n`; `None` when `round` finds no legal sizes.
    pub fn size(&self, ratio: f64, round: impl Fn(f64) -> Option<Sizes>) -> Option<Textbook> {
        let hundredths = |z: f64| (z * 100.0).round() / 100.0;
        let size = |a: f64, b: f64| ((a + b) * ratio) * ((a + b) * ratio);
        let step = size(self.alpha, self.beta);
        round(step).map(|sizes| Textbook {
            step,
            step_with_table_quantiles: size(hundredths(self.alpha), hundredths(self.beta)),
            z_alpha: self.alpha,
            z_beta: self.beta,
            sizes,
        })
    }

    /// Power at a ratio of effect to standard error.
    pub fn power(&self, ratio: f64) -> f64 {
        normal_cdf(ratio - self.alpha)
    }

    /// The effect detectable with a standard error.
    pub fn detectable(&self, standard_error: f64) -> f64 {
        (self.alpha + self.beta) * standard_error
    }
}

/// One comparison of a simulated study, in units of the nuisance value.
#[derive(Debug, Clone, Copy)]
pub(super) struct Comparison {
    /// Position of the first group.
    pub first: usize,
    /// Position of the second, whose mean minus that of the first is the difference.
    pub second: usize,
    /// `1/n_i + 1/n_j`.
    pub reciprocals: f64,
    /// The planned difference.
    pub shift: f64,
}

impl Parallel {
    /// The comparisons of a simulated study in which the groups differ as planned: every treated group from the
    /// control, or the second group of the weakest pair from all others.
    pub(super) fn simulated(&self, sizes: &Sizes, shift: f64) -> Vec<Comparison> {
        let (weakest, _) = self.weakest_pair(sizes);
        let apart = self.pairs.get(weakest).map_or(0, |pair| pair.1);
        let all_apart = self.compare == Compare::AgainstControl;
        let control = |g: usize| self.groups.get(g).is_some_and(|g| g.control);
        let raised = |g: usize| if all_apart { !control(g) } else { g == apart };
        let comparison = |&(first, second): &(usize, usize)| {
            let factor = self.pair_factor(sizes, (first, second));
            Comparison {
                first,
                second,
                reciprocals: factor * factor,
                shift: shift * (f64::from(raised(second)) - f64::from(raised(first))),
            }
        };
        self.pairs.iter().map(comparison).collect()
    }
}

/// The critical values of a simulated study: one for all comparisons, or those of a step-down procedure, the strictest
/// first.
#[derive(Debug, Clone)]
pub(super) struct Rejection {
    /// The critical values on the scale of t.
    pub critical: Vec<f64>,
    /// Whether one tail rejects or both.
    pub sides: Sides,
}

impl Rejection {
    /// Marks the rejected comparisons; `statistics` are turned into their sizes when both tails reject.
    pub fn mark(&self, statistics: &mut [f64], rejected: &mut [bool]) {
        if self.sides == Sides::Two {
            statistics.iter_mut().for_each(|t| *t = t.abs());
        }
        reject(&self.critical, statistics, rejected);
    }
}

/// Sizes of the groups as numbers.
pub(super) fn as_numbers(sizes: &Sizes) -> Vec<f64> {
    sizes.per_group.iter().map(|n| *n as f64).collect()
}
