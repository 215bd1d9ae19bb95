//! Statistics that share one normal variable: `Xᵢ = λᵢ Z₀ + cᵢ Zᵢ + δᵢ`, with the standard deviation known.

use super::interval::{log_interval, log_sf};
use super::line_integral::{Region, Support, integrate_exp, support};
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::quadrature::{Goal, integrate};
use crate::numerics::special::normal::{LN_SQRT_TAU, normal_cdf, normal_sf};
use libm::{exp, expm1, log, log1p};

/// What the quadratures of this file are called in errors.
const WHAT: &str = "comparisons with a control";

/// Beyond this distance the density of the common normal is negligible.
const REACH: f64 = 9.5;

/// Beyond this distance from the nearest shift a normal tail is below the smallest double.
const FAR: f64 = 40.0;

/// Below this a sum of tails is formed on a logarithmic scale.
const SMALLEST_SUM: f64 = 1e-280;

/// Largest loading relative to the own spread for which the trapezoidal rule is the cheaper one.
const STEEP: f64 = 12.0;

/// Whether a statistic counts in one direction or in both.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Sides {
    /// Large positive values only: `max Tᵢ`.
    One,
    /// Both directions: `max |Tᵢ|`.
    Two,
}

/// One statistic: its loading on the common normal, the square of what is its own, and its shift.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Statistic {
    pub(super) loading: f64,
    pub(super) own_square: f64,
    pub(super) shift: f64,
}

/// Statistics that are alike.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Factor {
    loading: f64,
    own: f64,
    shift: f64,
    count: f64,
}

/// Statistics that are independent given one common normal.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct CommonFactor {
    factors: Vec<Factor>,
    sides: Sides,
    pub(super) count: f64,
    /// The largest absolute shift.
    pub(super) largest_shift: f64,
}

impl CommonFactor {
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when there is none or more than 1000, a loading is not inside (-1, 1), or a
    /// shift is not finite or above 10⁶.
    pub(super) fn new(
        statistics: impl IntoIterator<Item = Statistic>,
        sides: Sides,
    ) -> Result<Self> {
        let mut factors: Vec<Factor> = Vec::new();
        let (mut count, mut largest_shift) = (0.0, 0.0);
        for statistic in statistics {
            check_statistic(statistic)?;
            let Statistic { loading, own_square, shift } = statistic;
            largest_shift = f64::max(largest_shift, shift.abs());
            count += 1.0;
            // Without a shift the sign of a two-sided statistic does not matter.
            let loading = if sides == Sides::Two && shift == 0.0 { loading.abs() } else { loading };
            let alike = |factor: &&mut Factor| factor.loading == loading && factor.shift == shift;
            match factors.iter_mut().find(alike) {
                Some(factor) => factor.count += 1.0,
                None => factors.push(Factor { loading, own: own_square.sqrt(), shift, count: 1.0 }),
            }
        }
        if !(1.0..=1000.0).contains(&count) {
            return Err(NumericsError::OutOfDomain {
                name: "comparisons",
                given: count,
                allowed: "from 1 to 1000",
            });
        }
        Ok(CommonFactor { factors, sides, count, largest_shift })
    }

    /// Probability that no statistic exceeds `w`.
    pub(super) fn none_exceeds(&self, w: f64) -> Result<f64> {
        match self.certain(w) {
            Some(exceed) => Ok(if exceed { 0.0 } else { 1.0 }),
            None => self.over_common_normal(w, |z| self.log_inside(w, z)),
        }
    }

    /// Probability that at least one statistic exceeds `w`.
    pub(super) fn any_exceeds(&self, w: f64) -> Result<f64> {
        match self.certain(w) {
            Some(exceed) => Ok(if exceed { 1.0 } else { 0.0 }),
            None => self.over_common_normal(w, |z| self.log_any_outside(w, z)),
        }
    }

    /// Probability that every statistic exceeds `w`.
    pub(super) fn all_exceed(&self, w: f64) -> Result<f64> {
        match self.certain(w) {
            Some(exceed) => Ok(if exceed { 1.0 } else { 0.0 }),
            None => self.over_common_normal(w, |z| {
                let mut log_outside = 0.0;
                for factor in &self.factors {
                    log_outside += factor.count * factor.log_outside(w, z, self.sides);
                }
                log_outside
            }),
        }
    }

    /// Logarithm of the probability that any statistic is outside, given the common normal.
    fn log_any_outside(&self, w: f64, z: f64) -> f64 {
        let mut log_inside = 0.0;
        for factor in &self.factors {
            log_inside += factor.count * log1p(-factor.outside(w, z, self.sides).min(1.0));
        }
        if log_inside < -SMALLEST_SUM {
            return log(-expm1(log_inside));
        }
        // So small that the probabilities simply add up, on their own scale.
        let logs = || {
            let scaled = |factor: &Factor| log(factor.count) + factor.log_outside(w, z, self.sides);
            self.factors.iter().map(scaled)
        };
        let largest = logs().fold(f64::NEG_INFINITY, f64::max);
        if largest == f64::NEG_INFINITY {
            return largest;
        }
        largest + log(logs().map(|value| exp(value - largest)).sum())
    }

    fn log_inside(&self, w: f64, z: f64) -> f64 {
        let mut log_inside = 0.0;
        for factor in &self.factors {
            log_inside += factor.count * factor.log_inside(w, z, self.sides);
        }
        log_inside
    }

    /// Whether all statistics exceed `w`, or none does, for certain; nothing where it is open.
    fn certain(&self, w: f64) -> Option<bool> {
        let far = FAR + self.largest_shift;
        match self.sides {
            Sides::Two if w <= 0.0 => Some(true),
            _ if w > far => Some(false),
            Sides::One if w < -far => Some(true),
            _ => None,
        }
    }

    /// Integral of a function between 0 and 1, given by its logarithm, times the density of the common normal.
    fn over_common_normal(&self, w: f64, log_f: impl Fn(f64) -> f64) -> Result<f64> {
        let loading = self.factors.iter().map(|f| f.loading.abs()).fold(0.0, f64::max);
        // One statistic alone exceeds a large w with the common normal up to λ (w - δ) away.
        let distance = self.factors.iter().map(|f| f.distance(w, self.sides)).fold(0.0, f64::max);
        let reach = REACH + if distance > 4.0 { loading * distance } else { 0.0 };
        let region =
            Region { low: if self.even() { 0.0 } else { -reach }, high: reach, even: self.even() };
        let log_integrand = |z: f64| log_f(z) - 0.5 * z * z - LN_SQRT_TAU;
        let steepest = self.steepest();
        if steepest > STEEP {
            return self.over_steep_factors(w, region, log_integrand);
        }
        let first_step = f64::min(0.75, 1.5 / (1.0 + steepest));
        integrate_exp(WHAT, region, first_step, log_integrand)
    }

    /// The shifts, without repetition of equal factors.
    pub(super) fn shifts(&self) -> Vec<f64> {
        self.factors.iter().map(|factor| factor.shift).collect()
    }

    /// Two-sided and without shifts everything is even in the common normal.
    fn even(&self) -> bool {
        self.sides == Sides::Two && self.largest_shift == 0.0
    }

    fn steepest(&self) -> f64 {
        self.factors.iter().map(Factor::steepness).fold(0.0, f64::max)
    }

    /// Panels between the places where a steep factor turns from 0 to 1.
    fn over_steep_factors(
        &self,
        w: f64,
        region: Region,
        log_integrand: impl Fn(f64) -> f64,
    ) -> Result<f64> {
        let support = support(region, &log_integrand);
        if support.vanishes() {
            return Ok(0.0);
        }
        let Support { low, high, peak } = support;
        let mut cuts = vec![low, high];
        for factor in &self.factors {
            let width = 8.0 / factor.steepness();
            for turn in [w - factor.shift, -w - factor.shift] {
                let turn = turn / factor.loading;
                cuts.extend([turn - width, turn, turn + width]);
            }
        }
        cuts.retain(|&cut| cut >= low && cut <= high);
        cuts.sort_by(f64::total_cmp);
        let goal = Goal { absolute: 1e-15, ..Goal::default() };
        let mut value = 0.0;
        for pair in cuts.windows(2) {
            if let &[from, to] = pair {
                value +=
                    integrate(WHAT, from, to, goal, |z| Ok(exp(log_integrand(z) - peak)))?.value;
            }
        }
        let symmetry = if region.even { 2.0 } else { 1.0 };
        Ok(symmetry * value * exp(peak))
    }
}

impl Factor {
    /// How fast the factor changes with the common normal.
    fn steepness(&self) -> f64 {
        self.loading.abs() / self.own
    }

    /// How far the mean is from the nearest critical value, as far as that matters to a double.
    fn distance(&self, w: f64, sides: Sides) -> f64 {
        let nearest = match sides {
            Sides::One => (w - self.shift).abs(),
            Sides::Two => (w - self.shift).abs().min((w + self.shift).abs()),
        };
        nearest.min(FAR)
    }

    /// Logarithm of the probability that one statistic stays inside, given the common normal.
    fn log_inside(&self, w: f64, z: f64, sides: Sides) -> f64 {
        let centre = self.loading * z + self.shift;
        match sides {
            Sides::One => log_sf((centre - w) / self.own),
            Sides::Two => log_interval((-w - centre) / self.own, 2.0 * w / self.own),
        }
    }

    /// Logarithm of the probability that one statistic falls outside, given the common normal.
    fn log_outside(&self, w: f64, z: f64, sides: Sides) -> f64 {
        let centre = self.loading * z + self.shift;
        let above = log_sf((w - centre) / self.own);
        if sides == Sides::One {
            return above;
        }
        let below = log_sf((w + centre) / self.own);
        let (larger, smaller) = (above.max(below), above.min(below));
        if smaller == f64::NEG_INFINITY {
            return larger;
        }
        (larger + log1p(exp(smaller - larger))).min(0.0)
    }

    /// Probability that one statistic falls outside, given the common normal.
    fn outside(&self, w: f64, z: f64, sides: Sides) -> f64 {
        let centre = self.loading * z + self.shift;
        let above = normal_sf((w - centre) / self.own);
        match sides {
            Sides::One => above,
            Sides::Two => above + normal_cdf((-w - centre) / self.own),
        }
    }
}

fn check_statistic(statistic: Statistic) -> Result<()> {
    if !(statistic.loading.abs() < 1.0 && statistic.own_square > 0.0) {
        return Err(NumericsError::OutOfDomain {
            name: "loading",
            given: statistic.loading,
            allowed: "above -1 and below 1",
        });
    }
    if statistic.shift.is_nan() || statistic.shift.abs() > 1e6 {
        return Err(NumericsError::OutOfDomain {
            name: "shift",
            given: statistic.shift,
            allowed: "from -1000000 to 1000000",
        });
    }
    Ok(())
}
