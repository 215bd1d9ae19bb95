//! Safeguarded Newton iteration for a monotone function: the solver behind quantiles.

use super::{LARGEST_NONCENTRALITY, probability};
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::scaled::{Scaled, Tails};
use crate::numerics::special::normal::normal_quantile_guess;

/// Evaluations allowed to one inversion; the bracket alone needs about 110 halvings in the worst case.
const LIMIT: usize = 300;

/// How near to zero the function has to be for one more Newton step to finish.
const SETTLED: f64 = 3e-9;

/// The scale on which the unknown is moved.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Scale {
    /// Steps are added.
    Linear,
    /// Steps multiply by their exponential: for positive unknowns of any size.
    Logarithmic,
}

impl Scale {
    fn advance(self, x: f64, step: f64) -> f64 {
        match self {
            Self::Linear => x + step,
            Self::Logarithmic => x * libm::exp(step),
        }
    }

    fn middle(self, low: f64, high: f64) -> f64 {
        match self {
            Self::Linear => low + 0.5 * (high - low),
            Self::Logarithmic => low.sqrt() * high.sqrt(),
        }
    }
}

/// The root of a monotone function inside `range`, from a starting point.
///
/// `f` returns its value, the difference of two logarithms, and its slope on the given scale (in `ln x` for the logarithmic one). Newton steps are taken
/// while they stay inside the bracket of the signs seen so far; otherwise the bracket is halved, or, while one end is
/// still open, left behind by doubling steps.
///
/// # Errors
///
/// * [`NumericsError::NoBracket`] when there is no sign change inside `range`; the end in question stands twice.
/// * [`NumericsError::NoConvergence`] when the evaluations are used up.
pub(crate) fn monotone_root(
    what: &'static str,
    scale: Scale,
    start: f64,
    range: (f64, f64),
    mut f: impl FnMut(f64) -> Result<(f64, f64)>,
) -> Result<f64> {
    let (mut low, mut high) = range;
    let (mut low_seen, mut high_seen) = (false, false);
    let mut stride = 0.5_f64;
    let mut x = start.clamp(low, high);
    for _ in 0..LIMIT {
        let (value, slope) = f(x)?;
        if value == 0.0 {
            return Ok(x);
        }
        if (value > 0.0) == (slope >= 0.0) {
            (high, high_seen) = (x, true);
        } else {
            (low, low_seen) = (x, true);
        }
        if low >= high {
            return if low_seen && high_seen {
                Ok(x)
            } else {
                Err(NumericsError::NoBracket { what, low: x, high: x })
            };
        }
        let step = -value / slope;
        let newton = scale.advance(x, step);
        // The values are logarithms of tails, whose curvature is of the order of their squared slope: after a step
        // from so near, the error in the logarithm is of the order of the square, below 1e-16.
        if newton == x || (value.abs() <= SETTLED && step.abs() <= 1e-2 * x.abs().max(1.0)) {
            return Ok(newton.clamp(range.0, range.1));
        }
        x = if newton > low && newton < high && step.abs() <= 64.0 * stride {
            newton
        } else if !high_seen {
            stride *= 2.0;
            scale.advance(x, stride).min(high)
        } else if !low_seen {
            stride *= 2.0;
            scale.advance(x, -stride).max(low)
        } else {
            let middle = scale.middle(low, high);
            if middle <= low || middle >= high {
                return Ok(x);
            }
            middle
        };
    }
    Err(NumericsError::NoConvergence { what, low, high, evaluations: LIMIT })
}

/// The quantile of a distribution on the positive half-line.
///
/// `p` belongs to the upper tail if `upper`, else to the lower one; `evaluate` gives both tails and the logarithm of
/// the density. The equation is solved for the logarithm of the smaller tail over the logarithm of the argument,
/// where it is concave: Newton's method cannot overshoot twice. Results beyond the range of `f64` become 0 or infinity.
pub(crate) fn positive_quantile(
    what: &'static str,
    p: f64,
    upper: bool,
    start: f64,
    evaluate: impl Fn(f64) -> (Tails, f64),
) -> Result<f64> {
    let p = probability(p)?;
    if p == 0.0 || p == 1.0 {
        return Ok(if (p == 0.0) == upper { f64::INFINITY } else { 0.0 });
    }
    // Of the two tails, the one whose target is at most one half; 1 - p is exact there.
    let (target, upper) = if p > 0.5 { (libm::log1p(-p), !upper) } else { (libm::log(p), upper) };
    let found = monotone_root(what, Scale::Logarithmic, start, POSITIVE_RANGE, |x| {
        let (tails, ln_density) = evaluate(x);
        let (ln_tail, sign) =
            if upper { (tails.ln_upper(), -1.0) } else { (tails.ln_lower(), 1.0) };
        Ok((ln_tail - target, sign * libm::exp(ln_density + libm::log(x) - ln_tail)))
    });
    beyond_range(found)
}

/// Turns a root outside [`POSITIVE_RANGE`] into the limit that an `f64` can hold.
pub(crate) fn beyond_range(found: Result<f64>) -> Result<f64> {
    match found {
        Err(NumericsError::NoBracket { low, .. }) if low <= POSITIVE_RANGE.0 => Ok(0.0),
        Err(NumericsError::NoBracket { .. }) => Ok(f64::INFINITY),
        other => other,
    }
}

/// The smallest and the largest argument that a quantile search tries.
pub(crate) const POSITIVE_RANGE: (f64, f64) = (1e-307, 1e308);

/// The noncentrality `2w` at which a tail at a fixed point is `p`.
///
/// `excess` is the distance of the point from the mean at `w = 0`, `spread` the standard deviation as a function of `w`,
/// both in units of `w`; `evaluate` gives the tails at `w` and the slope of the upper tail in `w`. The square root of
/// `w` is the unknown: in it the problem is nearly that of a normal mean.
pub(crate) fn noncentrality(
    what: &'static str,
    p: f64,
    upper: bool,
    excess: f64,
    spread: impl Fn(f64) -> f64,
    evaluate: impl Fn(f64) -> (Tails, Scaled),
) -> Result<f64> {
    let given = probability(p)?;
    let (p, upper) = if p > 0.5 { (1.0 - p, !upper) } else { (p, upper) };
    let ln_tail = |tails: Tails| if upper { tails.ln_upper() } else { tails.ln_lower() };
    let target = libm::log(p);
    let central = ln_tail(evaluate(0.0).0);
    if central == target {
        return Ok(0.0);
    }
    if p == 0.0 || (target < central) == upper {
        let allowed = "between the tail at noncentrality 0 and the limit (0 or 1) that larger noncentralities approach";
        return Err(NumericsError::OutOfDomain { name: "p", given, allowed });
    }
    let z = if upper { normal_quantile_guess(p) } else { -normal_quantile_guess(p) };
    let guess = (excess + z * spread(excess.max(0.0))).max(0.25);
    let range = (0.0, (0.5 * LARGEST_NONCENTRALITY).sqrt());
    let root = monotone_root(what, Scale::Linear, guess.sqrt(), range, |v| {
        let (tails, slope) = evaluate(v * v);
        let ln = ln_tail(tails);
        let size = 2.0 * v * libm::exp(slope.ln() - ln);
        Ok((ln - target, if upper { size } else { -size }))
    })?;
    Ok(2.0 * root * root)
}
