//! The t test of a difference adjusted for a normal covariate: its power averaged over what chance does to the covariate
//! (derived in the documentation of the design with a baseline covariate).

use std::f64::consts::FRAC_PI_2;

use super::pairs::{TTest, noncentrality_for};
use super::problem::{AtSizes, Point};
use crate::numerics::{self, quadrature::GaussLegendre};

/// Nodes of the mean over the angle: with 40 the mean agrees with one over 200 to rounding
/// (`tests/designs/baseline_covariate.rs` holds it against independent calculations).
const NODES: usize = 40;

/// Logarithm of the smallest density of the angle that is looked at, relative to the largest.
const CUT: f64 = -40.0;

/// A t test of an adjusted difference: its power is the mean over the chance differences of a normal covariate.
#[derive(Debug, Clone)]
pub(super) struct AveragedTest {
    test: TTest,
    /// Cosine of the angle, by which the noncentrality shrinks, and its probability.
    shrinkage: Vec<(f64, f64)>,
}

impl AveragedTest {
    /// The mean for a test whose degrees of freedom no longer count the one that the covariate takes.
    pub fn new(test: TTest) -> numerics::Result<Self> {
        // cos^ν of the last angle is exp(CUT), unless the right angle comes first.
        let last = libm::asin((-libm::expm1(2.0 * CUT / test.df)).sqrt()).min(FRAC_PI_2);
        let rule = GaussLegendre::new(NODES)?;
        let density = |&(x, weight): &(f64, f64)| {
            let cosine = libm::cos(0.5 * last * (1.0 + x));
            (cosine, weight * libm::exp(test.df * libm::log(cosine)))
        };
        let mut shrinkage: Vec<_> = rule.nodes().iter().map(density).collect();
        let total: f64 = shrinkage.iter().map(|(_, weight)| weight).sum();
        shrinkage.iter_mut().for_each(|(_, weight)| *weight /= total);
        Ok(Self { test, shrinkage })
    }

    /// Power at a noncentrality without chance differences. What they cost is subtracted, so that a power near 1 keeps
    /// its accuracy.
    pub fn power_at(&self, noncentrality: f64) -> numerics::Result<f64> {
        let plain = self.test.power_at(noncentrality)?;
        let mut cost = 0.0;
        for (cosine, weight) in &self.shrinkage {
            cost += weight * (plain - self.test.power_at(noncentrality * cosine)?);
        }
        Ok(plain - cost)
    }
}

impl AtSizes for AveragedTest {
    fn power(&self, at: Point) -> numerics::Result<f64> {
        self.power_at(at.effect / (at.nuisance * self.test.factor))
    }

    /// The power depends on the ratio of effect to spread alone, so one root serves every spread.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>> {
        let found = noncentrality_for(self.test.critical, power, |n| self.power_at(n))?;
        Ok(nuisances.iter().map(|nuisance| found * nuisance * self.test.factor).collect())
    }
}
