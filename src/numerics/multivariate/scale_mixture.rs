//! Statistics divided by an independent estimate of the standard deviation.
//!
//! If `H(w)` is a probability when the standard deviation is known, then with `s = sqrt(χ²_ν / ν)` estimated it is
//! `E[H(c s)]`. This file evaluates that mean, and inverts it in `c`.

use super::spread::Spread;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::roots::{Tolerance, bracket_around, refine};
use libm::{exp, expm1, log, log1p};
use std::collections::BTreeMap;

/// What is left out on either side of the sum, relative to it.
const NEGLIGIBLE: f64 = 1e-17;

/// From these degrees of freedom on the grid is laid around the root for a known standard deviation, which is so near
/// that rounding of `ln c` stays out of the sums.
const FINE_GRID_FROM: f64 = 1e4;

/// Largest shift for which the even grid of this file is the cheaper way.
const LARGEST_SHIFT: f64 = 30.0;

/// Mean of a tail at one positive critical value `c`, where the tail turns at each of the `shifts` and near 0.
pub(super) fn shifted_mean<F: Fn(f64) -> Result<f64>>(
    tail: Tail<F>,
    df: f64,
    c: f64,
    shifts: &[f64],
) -> Result<f64> {
    let largest = shifts.iter().map(|shift| shift.abs()).fold(0.0, f64::max);
    let value = if largest <= LARGEST_SHIFT || df == f64::INFINITY {
        ScaleMixture::new(tail, df, c, largest).at(c)?
    } else if c == f64::INFINITY {
        tail.at_infinity
    } else {
        let turns: Vec<f64> = shifts.iter().map(|shift| shift.abs() / c).collect();
        Spread::new(df).mean_up_to(f64::INFINITY, &turns, |s| (tail.inner)(c * s))?
    };
    Ok(value.clamp(0.0, 1.0))
}

/// One tail of a statistic with known standard deviation, as a function of the critical value.
///
/// `inner` is monotone on each side of 0 and accurate relative to its own size.
pub(super) struct Tail<F> {
    pub(super) inner: F,
    /// The tail at critical value 0.
    pub(super) at_zero: f64,
    /// The tail at an infinite critical value of the sign in question.
    pub(super) at_infinity: f64,
}

/// Mean of a tail over the estimated standard deviation, on a grid of critical values that later calls reuse.
///
/// # Method
///
/// Trapezoidal rule in `u = ln s`, where the density of `u` decays exponentially to the left and doubly exponentially
/// to the right, with the step halved until two sums agree: halving squares the error of this rule, so that the last
/// sum is accurate to rounding. The grid is fixed in `ln(c s)`, so that a search in `c` evaluates the tail only once a
/// grid point.
pub(super) struct ScaleMixture<F> {
    tail: Tail<F>,
    df: f64,
    first_step: f64,
    spread: Spread,
    anchor: f64,
    /// The tail at `anchor * exp(key * finest step)`.
    seen: BTreeMap<i64, f64>,
}

impl<F: Fn(f64) -> Result<f64>> ScaleMixture<F> {
    /// Halvings of the first step at most.
    const LEVELS: u32 = 10;

    /// Relative agreement of two sums, of which the finer one is then far more accurate.
    const AGREEMENT: f64 = 1e-10;

    /// Relative agreement that is accepted once halving the step no longer betters it.
    const ROUNDED: f64 = 1e-7;

    /// `anchor` is a critical value of the sign and rough size of those to come, not 0; `shift` is the largest
    /// critical value around which the tail turns, other than those near 0.
    pub(super) fn new(tail: Tail<F>, df: f64, anchor: f64, shift: f64) -> Self {
        // The first bound resolves the double exponential, the second the bell of width 1 / sqrt(2 ν) and a turn
        // of width 1 / δ.
        let first_step = f64::min(0.13, 0.65 / (df + 0.5 * shift * shift).sqrt());
        ScaleMixture {
            tail,
            df,
            first_step,
            spread: Spread::new(df),
            anchor,
            seen: BTreeMap::new(),
        }
    }

    /// The mean of the tail at the critical value `c`, which has the sign of the anchor.
    pub(super) fn at(&mut self, c: f64) -> Result<f64> {
        if c == 0.0 {
            return Ok(self.tail.at_zero);
        }
        if self.df == f64::INFINITY {
            return (self.tail.inner)(c);
        }
        if c.is_infinite() {
            return Ok(self.tail.at_infinity);
        }
        let ratio = c / self.anchor;
        let shift = if ratio > 0.5 && ratio < 2.0 {
            log1p((c - self.anchor) / self.anchor)
        } else {
            log(c.abs()) - log(self.anchor.abs())
        };
        let mut sum = self.sum(Grid::whole(self.first_step, Self::LEVELS), shift)?;
        let mut step = self.first_step;
        let mut last_difference = f64::INFINITY;
        for level in (0..Self::LEVELS).rev() {
            step *= 0.5;
            let between = self.sum(Grid::odd(step, level), shift)?;
            let difference = (between - sum).abs() / (between + sum + f64::MIN_POSITIVE / step);
            // Far out in a tail of thousands of means rounding keeps the sums from agreeing any better.
            let rounded = difference < Self::ROUNDED && difference > 0.25 * last_difference;
            sum += between;
            if difference <= Self::AGREEMENT || rounded {
                return Ok(sum * step);
            }
            last_difference = difference;
        }
        Err(NumericsError::NoConvergence {
            what: "mean over the estimated standard deviation",
            low: c,
            high: c,
            evaluations: self.seen.len(),
        })
    }

    fn sum(&mut self, grid: Grid, shift: f64) -> Result<f64> {
        let start = grid.nearest(shift);
        let mut sum = 0.0;
        self.add_to_the_right(&grid, start, shift, &mut sum)?;
        self.add_to_the_left(&grid, start - grid.stride, shift, &mut sum)?;
        Ok(sum)
    }

    fn add_to_the_right(
        &mut self,
        grid: &Grid,
        from: f64,
        shift: f64,
        sum: &mut f64,
    ) -> Result<()> {
        let spacing = grid.step * grid.stride;
        let mut j = from;
        loop {
            let u = j * grid.step - shift;
            let weight = self.spread.density_of_log(u);
            let here = self.tail_at(grid, j)?;
            *sum += weight * here;
            // Beyond u the density falls at least as fast as at rate ν (e^2u - 1) and the tail is monotone.
            let rate = self.df * expm1(2.0 * u);
            let bound = weight * here.max(self.tail.at_infinity);
            if weight == 0.0 || (u > 0.0 && bound <= NEGLIGIBLE * *sum * rate * spacing) {
                return Ok(());
            }
            j += grid.stride;
        }
    }

    fn add_to_the_left(&mut self, grid: &Grid, from: f64, shift: f64, sum: &mut f64) -> Result<()> {
        let spacing = grid.step * grid.stride;
        let mut j = from;
        let mut at_limit = false;
        loop {
            let weight = self.spread.density_of_log(j * grid.step - shift);
            let here = if at_limit { self.tail.at_zero } else { self.tail_at(grid, j)? };
            *sum += weight * here;
            // Being monotone, the tail stays where it is once it has met its limit at 0.
            at_limit |= (here - self.tail.at_zero).abs() <= NEGLIGIBLE * self.tail.at_zero;
            let bound = weight * here.max(self.tail.at_zero);
            if weight == 0.0 || bound <= NEGLIGIBLE * *sum * self.df * spacing {
                return Ok(());
            }
            j -= grid.stride;
        }
    }

    fn tail_at(&mut self, grid: &Grid, j: f64) -> Result<f64> {
        let key = (j as i64) << grid.level;
        if let Some(&known) = self.seen.get(&key) {
            return Ok(known);
        }
        let value = (self.tail.inner)(self.anchor * exp(j * grid.step))?;
        self.seen.insert(key, value);
        Ok(value)
    }
}

/// The points `j * step` with every `j`, or with odd ones only.
struct Grid {
    step: f64,
    stride: f64,
    /// How many halvings are left to the finest step.
    level: u32,
}

impl Grid {
    fn whole(step: f64, level: u32) -> Self {
        Grid { step, stride: 1.0, level }
    }

    fn odd(step: f64, level: u32) -> Self {
        Grid { step, stride: 2.0, level }
    }

    /// The `j` of the grid nearest to `u`.
    fn nearest(&self, u: f64) -> f64 {
        let first = self.stride - 1.0;
        first + self.stride * libm::round((u / self.step - first) / self.stride)
    }
}

/// The critical value at which the mean of `tail` equals `p`, on the side of `guess`.
///
/// Solved in `ln |c|` for `ln(tail / p)`, which is nearly a straight line far out.
pub(super) fn solve<F: Fn(f64) -> Result<f64>>(
    what: &'static str,
    tail: Tail<F>,
    df: f64,
    p: f64,
    guess: f64,
) -> Result<f64> {
    // The logarithms of the normal doubles.
    const LIMITS: (f64, f64) = (-708.0, 709.0);
    let sign = guess.signum();
    let solve_from =
        |start: f64, step: f64, precision: f64, value: &mut dyn FnMut(f64) -> Result<f64>| {
            let mut distance = |x: f64| Ok(log(value(sign * exp(x))? / p));
            let bracket = bracket_around(what, start, step, LIMITS, &mut distance)?;
            let tolerance =
                Tolerance { absolute: precision, relative: 0.0, ..Tolerance::default() };
            Ok::<f64, NumericsError>(refine(what, bracket, tolerance, &mut distance)?.at)
        };
    let mut start = log(guess.abs()).clamp(LIMITS.0, LIMITS.1);
    let mut step = 0.125;
    if df >= FINE_GRID_FROM {
        start = solve_from(start, step, 1e-9, &mut |c| (tail.inner)(c))?;
        let c = exp(start);
        step = ((1.0 + c * c) / df).clamp(1e-13, step);
    }
    let mut mixture = ScaleMixture::new(tail, df, sign * exp(start), 0.0);
    let root = solve_from(start, step, 1e-15, &mut |c| mixture.at(c))?;
    Ok(sign * exp(root))
}

/// Degrees of freedom of at least 1/2, infinity meaning a known standard deviation.
///
/// Below, the density of `ln s` has so long a lower tail that the sums would grow without bound.
pub(super) fn checked_df(df: f64) -> Result<f64> {
    if df >= 0.5 {
        return Ok(df);
    }
    Err(NumericsError::OutOfDomain {
        name: "degrees of freedom",
        given: df,
        allowed: "at least 0.5 (infinity: known standard deviation)",
    })
}

/// A probability strictly between 0 and 1.
pub(super) fn checked_probability(p: f64) -> Result<f64> {
    if p > 0.0 && p < 1.0 {
        return Ok(p);
    }
    Err(NumericsError::OutOfDomain {
        name: "probability",
        given: p,
        allowed: "above 0 and below 1",
    })
}

/// A critical value that is a number.
pub(super) fn checked_critical(c: f64) -> Result<f64> {
    if c.is_nan() {
        return Err(NumericsError::OutOfDomain {
            name: "critical value",
            given: c,
            allowed: "a number",
        });
    }
    Ok(c)
}
