//! Exact power of Welch's test: the mean over the ratio of the two estimated variances.

use crate::designs::problem::{AtSizes, Point};
use crate::numerics::{self, Continuous, NoncentralT, StudentT, normal_upper_quantile, roots};
use crate::quantities::Sides;

/// The two groups at given sizes, in units of the larger standard deviation.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pair {
    /// Degrees of freedom of the two variances.
    pub(super) df: [f64; 2],
    /// Variances of the two means.
    pub(super) variances: [f64; 2],
}

impl Pair {
    /// Standard error of the difference between the means.
    pub(super) fn standard_error(&self) -> f64 {
        self.variances.iter().sum::<f64>().sqrt()
    }

    /// Welch's degrees of freedom when the two estimated variances are these multiples of the true ones.
    pub(super) fn welch_df(&self, multiples: [f64; 2]) -> f64 {
        let [a, b] = [self.variances[0] * multiples[0], self.variances[1] * multiples[1]];
        (a + b) * (a + b) / (a * a / self.df[0] + b * b / self.df[1])
    }
}

/// A value of the ratio of the two estimated variances: its probability and the limit of noncentral t beyond which the
/// test rejects.
#[derive(Debug, Clone, Copy)]
pub(super) struct Node {
    pub(super) weight: f64,
    pub(super) limit: f64,
}

/// Where the density of the ratio has fallen by `exp(-41)`, 1.6e-18, it ends.
const CUT: f64 = -41.0;

/// Nodes of the trapezoidal sum over `v`.
///
/// In `v` the integrand is analytic up to `±i π/2`, where the denominator of `f` has its zeros, which a step of 1/4
/// turns into an error of `exp(-4 π²)`; for a narrow density three quarters of its standard deviation give `exp(-35)`.
pub(super) fn nodes(pair: &Pair, tail: f64) -> numerics::Result<Vec<Node>> {
    let total = pair.df[0] + pair.df[1];
    let share = pair.df[0] / total;
    let step = (0.75 * (2.0 / pair.df[0] + 2.0 / pair.df[1]).sqrt()).min(0.25);
    let error = pair.standard_error();
    let mut nodes = Vec::new();
    let mut sum = 0.0;
    let mut at = |v: f64| -> numerics::Result<bool> {
        let rest = libm::log1p(share * libm::expm1(v));
        let exponent = 0.5 * (pair.df[0] * v - total * rest);
        if exponent < CUT {
            return Ok(false);
        }
        let multiples = [libm::exp(v - rest), libm::exp(-rest)];
        let spread: f64 = pair.variances.iter().zip(multiples).map(|(v, m)| v * m).sum();
        let critical = StudentT::new(pair.welch_df(multiples))?.upper_quantile(tail)?;
        let weight = libm::exp(exponent);
        sum += weight;
        nodes.push(Node { weight, limit: critical * spread.sqrt() / error });
        Ok(true)
    };
    at(0.0)?;
    for direction in [-step, step] {
        let mut count = 1.0;
        while at(direction * count)? {
            count += 1.0;
        }
    }
    nodes.iter_mut().for_each(|node| node.weight /= sum);
    Ok(nodes)
}

/// Welch's test at fixed sizes.
#[derive(Debug, Clone)]
pub(super) struct WelchAtSizes {
    pub(super) df: f64,
    /// Standard error of the difference, in units of the larger standard deviation.
    pub(super) error: f64,
    pub(super) nodes: Vec<Node>,
    pub(super) sides: Sides,
}

impl WelchAtSizes {
    /// The smaller of the power and its complement is summed, so that neither loses its digits.
    pub(super) fn power_at(&self, noncentrality: f64) -> numerics::Result<f64> {
        let t = NoncentralT::new(self.df, noncentrality)?;
        let mean = |of: &dyn Fn(f64) -> numerics::Result<f64>| {
            self.nodes.iter().try_fold(0.0, |sum, node| Ok(sum + node.weight * of(node.limit)?))
        };
        let both = self.sides == Sides::Two;
        let wrong = |limit: f64| if both { t.cdf(-limit) } else { Ok(0.0) };
        let likely = self.nodes.first().map_or(Ok(0.0), |node| t.sf(node.limit))? > 0.5;
        if likely {
            Ok(1.0 - mean(&|limit| Ok(t.cdf(limit)? - wrong(limit)?))?)
        } else {
            mean(&|limit| Ok(t.sf(limit)? + wrong(limit)?))
        }
    }

    fn noncentrality_for(&self, power: f64) -> numerics::Result<f64> {
        let gap = |noncentrality: f64| Ok(self.power_at(noncentrality)? - power);
        let what = "detectable difference";
        let limit: f64 = self.nodes.iter().map(|node| node.weight * node.limit).sum();
        let start = limit + normal_upper_quantile(1.0 - power)?.max(0.0);
        let bracket = roots::bracket_around(what, start, 0.5, (0.0, 1e8), gap)?;
        Ok(roots::refine(what, bracket, roots::Tolerance::default(), gap)?.at)
    }
}

impl AtSizes for WelchAtSizes {
    fn power(&self, at: Point) -> numerics::Result<f64> {
        self.power_at(at.effect / (at.nuisance * self.error))
    }

    /// Both standard deviations are scaled together, so one root serves every scale.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>> {
        let noncentrality = self.noncentrality_for(power)?;
        Ok(nuisances.iter().map(|nuisance| noncentrality * nuisance * self.error).collect())
    }
}
