//! Means over an estimated standard deviation of functions that turn sharply, or up to a limit only.

use crate::numerics::error::Result;
use crate::numerics::quadrature::{Goal, integrate};
use crate::numerics::special::gamma::stirling_remainder;
use crate::numerics::special::logarithms::ln_1p_minus;
use libm::{exp, expm1, log, log1p};

/// What these quadratures are called in errors.
const WHAT: &str = "mean over the estimated standard deviation";

/// The tails of the spread that are left out hold less than `2 exp(-41)`, 3e-18.
const TAIL: f64 = 41.0;

/// From these degrees of freedom on the spread is so near to 1 that its logarithm is the better variable.
const NARROW_FROM: f64 = 200.0;

/// The distribution of `s = sqrt(χ²_ν / ν)`.
pub(super) struct Spread {
    df: f64,
    peak: f64,
}

impl Spread {
    /// For degrees of freedom of at least 1/2; the density of infinitely many is of no use.
    pub(super) fn new(df: f64) -> Self {
        Spread { df, peak: (df / std::f64::consts::PI).sqrt() * exp(-stirling_remainder(0.5 * df)) }
    }

    /// Density of `u = ln s`: `sqrt(ν/π) exp(-σ(ν/2)) exp(ν/2 (ln(1+x) - x))`, `x = e^2u - 1`, `σ` Stirling's remainder.
    pub(super) fn density_of_log(&self, u: f64) -> f64 {
        let x = expm1(2.0 * u);
        // Where nothing cancels, the logarithm is 2 u itself.
        let exponent = if x > -0.4 && x < 0.5 { ln_1p_minus(x) } else { 2.0 * u - x };
        self.peak * exp(0.5 * self.df * exponent)
    }

    /// `E[f(s); s <= limit]` for a bounded `f` that turns near the places named; 1e-15 absolute for smooth `f`.
    pub(super) fn mean_up_to(
        &self,
        limit: f64,
        turns: &[f64],
        f: impl Fn(f64) -> Result<f64>,
    ) -> Result<f64> {
        if self.df >= NARROW_FROM {
            self.over_logarithm(limit, turns, f)
        } else {
            self.over_root(limit, turns, f)
        }
    }

    /// Over `u = ln s`, in which the deviations from 1 keep all their digits.
    fn over_logarithm(
        &self,
        limit: f64,
        turns: &[f64],
        f: impl Fn(f64) -> Result<f64>,
    ) -> Result<f64> {
        let share = TAIL / self.df;
        let low = 0.5 * log1p(-2.0 * share.sqrt());
        let high = (0.5 * log1p(2.0 * share.sqrt() + 2.0 * share)).min(log(limit));
        let turns: Vec<f64> = turns.iter().map(|&turn| log(turn)).chain([0.0]).collect();
        panels(low, high, &turns, |u| Ok(self.density_of_log(u) * f(exp(u))?))
    }

    /// Over `y = sqrt(s)`, which makes the power `s^(ν-1)` at 0 a smooth one for half degrees of freedom too.
    fn over_root(&self, limit: f64, turns: &[f64], f: impl Fn(f64) -> Result<f64>) -> Result<f64> {
        let share = TAIL / self.df;
        let low = (1.0 - 2.0 * share.sqrt()).max(0.0).sqrt();
        let high = (1.0 + 2.0 * share.sqrt() + 2.0 * share).sqrt().min(limit);
        let turns: Vec<f64> = turns.iter().map(|turn| turn.sqrt()).chain([1.0]).collect();
        panels(low.sqrt(), high.sqrt(), &turns, |y| {
            let square = y * y * y * y;
            let x = square - 1.0;
            let exponent = if x > -0.4 && x < 0.5 { ln_1p_minus(x) } else { log(square) - x };
            // Twice the density of ln s, over y.
            let density = self.peak * exp(0.5 * self.df * exponent) * 2.0 / y;
            Ok(density * f(y * y)?)
        })
    }
}

/// The integral from `low` to `high`, cut where the integrand turns.
fn panels(low: f64, high: f64, turns: &[f64], f: impl Fn(f64) -> Result<f64>) -> Result<f64> {
    let mut cuts = vec![low, high];
    cuts.extend(turns.iter().filter(|&&turn| turn > low && turn < high));
    cuts.sort_by(f64::total_cmp);
    let goal = Goal { absolute: 1e-16, ..Goal::default() };
    let mut sum = 0.0;
    if low < high {
        for pair in cuts.windows(2) {
            if let &[from, to] = pair {
                sum += integrate(WHAT, from, to, goal, &f)?.value;
            }
        }
    }
    Ok(sum)
}
