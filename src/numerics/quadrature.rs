//! Numerical integration with an error estimate: adaptive on any range, by fixed rules, and on the whole line.

use super::error::{NumericsError, Result};
use libm::cos;
use std::cmp::Ordering;
use std::collections::BinaryHeap;

/// Positive nodes of the 15-point Kronrod rule with their weights and those of the 7-point Gauss rule inside it.
///
/// From the defining orthogonality conditions in 50-digit arithmetic.
const KRONROD: [(f64, f64, f64); 7] = [
    (0.2077849550078985, 0.2044329400752989, 0.0),
    (0.4058451513773972, 0.19035057806478542, 0.3818300505051189),
    (0.5860872354676911, 0.169_004_726_639_267_9, 0.0),
    (0.7415311855993944, 0.1406532597155259, 0.27970539148927664),
    (0.8648644233597691, 0.10479001032225019, 0.0),
    (0.9491079123427585, 0.06309209262997856, 0.1294849661688697),
    (0.9914553711208126, 0.022935322010529224, 0.0),
];

/// Weights of the middle node in the two rules.
const MIDDLE: (f64, f64) = (0.20948214108472782, 0.4179591836734694);

/// Nodes of one application of the rule.
const PANEL_EVALUATIONS: usize = 15;

/// Rounding error of a panel sum, relative to the sum of absolute values.
const ROUNDING: f64 = 8.0 * f64::EPSILON;

/// An integral with its evidence.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Integral {
    /// The value.
    pub value: f64,
    /// The estimated absolute error.
    pub error: f64,
    /// How many times the integrand was evaluated.
    pub evaluations: usize,
}

/// How accurate an integral has to be, and what it may cost.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Goal {
    /// Absolute error that is small enough.
    pub absolute: f64,
    /// Relative error that is small enough.
    pub relative: f64,
    /// The largest number of evaluations.
    pub max_evaluations: usize,
}

impl Default for Goal {
    /// Close to full precision, with room for several hundred panels.
    fn default() -> Self {
        Goal { absolute: 0.0, relative: 1e-13, max_evaluations: 15_000 }
    }
}

/// Integrates `f` from `low` to `high`; either may be infinite.
///
/// # Method
///
/// The panel with the largest estimated error is halved until the goal is met (15-point Kronrod rule, its error
/// judged by the 7-point Gauss rule inside it). Infinite ranges are mapped by `x = a + t / (1 - t)` and
/// `x = t / (1 - t²)`. A panel whose two rules agree to rounding is not split again, so a goal below rounding ends
/// with an honest error estimate instead of endless work.
///
/// # Accuracy
///
/// The error estimate bounds the true error for all integrands in `tests/numerics_solvers/quadrature.rs`. Like any
/// rule that samples, it can miss a spike narrower than a few hundredths of the range: split the range there.
///
/// # Errors
///
/// * [`NumericsError::OutOfDomain`] when an end or a value of `f` is NaN or a value is infinite.
/// * [`NumericsError::NoConvergence`] when the evaluations are used up.
/// * Whatever `f` itself returns.
///
/// # Sources
///
/// Piessens, de Doncker-Kapenga, Überhuber, Kahaner (1983), QUADPACK, section 2.2.2, for the error estimate.
pub fn integrate(
    what: &'static str,
    low: f64,
    high: f64,
    goal: Goal,
    mut f: impl FnMut(f64) -> Result<f64>,
) -> Result<Integral> {
    for (name, given) in [("low", low), ("high", high)] {
        if given.is_nan() {
            return Err(NumericsError::OutOfDomain { name, given, allowed: "a number" });
        }
    }
    if low == high {
        return Ok(Integral { value: 0.0, error: 0.0, evaluations: 0 });
    }
    if low > high {
        let reversed = integrate(what, high, low, goal, f)?;
        return Ok(Integral { value: -reversed.value, ..reversed });
    }
    match (low.is_finite(), high.is_finite()) {
        (true, true) => adapt(what, low, high, goal, f),
        (true, false) if high > 0.0 => {
            adapt(what, 0.0, 1.0, goal, |t| half_line(t, low, 1.0, &mut f))
        }
        (false, true) if low < 0.0 => {
            adapt(what, 0.0, 1.0, goal, |t| half_line(t, high, -1.0, &mut f))
        }
        (false, false) if low < high => adapt(what, -1.0, 1.0, goal, |t| whole_line(t, &mut f)),
        _ => Ok(Integral { value: 0.0, error: 0.0, evaluations: 0 }),
    }
}

/// Integral of a smooth function that is negligible outside `low..high` and at both ends, by the trapezoidal rule.
///
/// # Method
///
/// The step is halved until two sums agree to `1e-10` of the value. For an analytic function the error of the
/// trapezoidal rule falls as `exp(-c / step)`, so that halving squares it: the sum returned is then accurate to
/// rounding (Trefethen, Weideman 2014, SIAM Review 56(3), 385-458, theorem 5.1).
///
/// # Errors
///
/// [`NumericsError::NoConvergence`] when 2¹⁴ times the first number of steps does not settle it, or a value is NaN.
pub fn trapezoid(
    what: &'static str,
    low: f64,
    high: f64,
    first_steps: usize,
    mut f: impl FnMut(f64) -> f64,
) -> Result<f64> {
    const AGREEMENT: f64 = 1e-10;
    const HALVINGS: usize = 14;
    let mut steps = first_steps.max(2);
    let mut step = (high - low) / steps as f64;
    let mut sum = 0.5 * (f(low) + f(high));
    for i in 1..steps {
        sum += f(low + step * i as f64);
    }
    for _ in 0..HALVINGS {
        let mut between = 0.0;
        for i in 0..steps {
            between += f(low + step * (i as f64 + 0.5));
        }
        // Values below the normal doubles are rounded to steps of their own size.
        let rounding = f64::MIN_POSITIVE * steps as f64;
        let settled = (between - sum).abs() <= AGREEMENT * (between + sum).abs() + rounding;
        sum += between;
        steps *= 2;
        step *= 0.5;
        if settled {
            return Ok(sum * step);
        }
    }
    Err(NumericsError::NoConvergence { what, low, high, evaluations: steps })
}

/// A Gauss-Legendre rule on [-1, 1].
#[derive(Debug, Clone, PartialEq)]
pub struct GaussLegendre {
    /// Nodes in rising order with their weights.
    nodes: Vec<(f64, f64)>,
}

impl GaussLegendre {
    /// The rule with `count` nodes, exact for polynomials up to degree `2 count - 1`.
    ///
    /// Newton's method on the three-term recurrence; nodes and weights are accurate to a few units in the last place
    /// for up to a few hundred nodes (`tests/numerics_solvers/quadrature.rs`).
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `count` is 0 or above 4096.
    pub fn new(count: usize) -> Result<Self> {
        if !(1..=4096).contains(&count) {
            return Err(NumericsError::OutOfDomain {
                name: "count",
                given: count as f64,
                allowed: "from 1 to 4096",
            });
        }
        let mut nodes = Vec::with_capacity(count);
        for i in 0..count {
            // Tricomi's approximation lands in the basin of every root.
            let angle = std::f64::consts::PI * ((count - i) as f64 - 0.25) / (count as f64 + 0.5);
            let mut x = cos(angle);
            for _ in 0..8 {
                let (value, slope) = legendre(count, x);
                let step = value / slope;
                x -= step;
                if step.abs() <= f64::EPSILON {
                    break;
                }
            }
            let (_, slope) = legendre(count, x);
            nodes.push((x, 2.0 / ((1.0 - x) * (1.0 + x) * slope * slope)));
        }
        Ok(GaussLegendre { nodes })
    }

    /// Nodes in rising order with their weights, on [-1, 1].
    pub fn nodes(&self) -> &[(f64, f64)] {
        &self.nodes
    }

    /// The rule applied to `f` from `low` to `high`.
    pub fn integrate(&self, low: f64, high: f64, mut f: impl FnMut(f64) -> f64) -> f64 {
        let half = 0.5 * (high - low);
        let middle = 0.5 * (low + high);
        let sum: f64 = self.nodes.iter().map(|&(x, weight)| weight * f(middle + half * x)).sum();
        sum * half
    }
}

/// Legendre polynomial of degree `n` and its derivative at `x` inside (-1, 1).
fn legendre(n: usize, x: f64) -> (f64, f64) {
    let (mut before, mut here) = (1.0, x);
    for k in 2..=n {
        let k = k as f64;
        (before, here) = (here, ((2.0 * k - 1.0) * x * here - (k - 1.0) * before) / k);
    }
    let slope = n as f64 * (before - x * here) / ((1.0 - x) * (1.0 + x));
    (here, slope)
}

fn half_line(
    t: f64,
    end: f64,
    direction: f64,
    f: &mut impl FnMut(f64) -> Result<f64>,
) -> Result<f64> {
    let rest = 1.0 - t;
    let value = f(end + direction * t / rest)?;
    Ok(scaled(value, 1.0 / (rest * rest)))
}

fn whole_line(t: f64, f: &mut impl FnMut(f64) -> Result<f64>) -> Result<f64> {
    let rest = (1.0 - t) * (1.0 + t);
    let value = f(t / rest)?;
    Ok(scaled(value, (1.0 + t * t) / (rest * rest)))
}

/// A product in which zero wins over an overflowing factor.
fn scaled(value: f64, factor: f64) -> f64 {
    if value == 0.0 { 0.0 } else { value * factor }
}

/// One interval with the results of both rules.
struct Panel {
    low: f64,
    high: f64,
    value: f64,
    error: f64,
    /// The error cannot be told from rounding, so halving would not help.
    at_rounding: bool,
}

impl Panel {
    fn new(low: f64, high: f64, f: &mut impl FnMut(f64) -> Result<f64>) -> Result<Self> {
        let half = 0.5 * (high - low);
        let middle = 0.5 * (low + high);
        let centre = finite(middle, f)?;
        let mut pairs = [(0.0, 0.0); 7];
        let (mut kronrod, mut gauss) = (MIDDLE.0 * centre, MIDDLE.1 * centre);
        let mut size = MIDDLE.0 * centre.abs();
        for (pair, &(node, weight, gauss_weight)) in pairs.iter_mut().zip(&KRONROD) {
            let below = finite(middle - half * node, f)?;
            let above = finite(middle + half * node, f)?;
            *pair = (below, above);
            kronrod += weight * (below + above);
            gauss += gauss_weight * (below + above);
            size += weight * (below.abs() + above.abs());
        }
        let mean = 0.5 * kronrod;
        let mut spread = MIDDLE.0 * (centre - mean).abs();
        for (&(below, above), &(_, weight, _)) in pairs.iter().zip(&KRONROD) {
            spread += weight * ((below - mean).abs() + (above - mean).abs());
        }
        let difference = (kronrod - gauss).abs();
        let rounding = ROUNDING * size * half;
        let estimate = judged_error(difference * half, spread * half);
        Ok(Panel {
            low,
            high,
            value: kronrod * half,
            error: estimate.max(rounding),
            at_rounding: estimate <= rounding || middle <= low || middle >= high,
        })
    }
}

/// The rule's error from the difference of the two rules, scaled by how much the integrand varies.
fn judged_error(difference: f64, spread: f64) -> f64 {
    if spread == 0.0 || difference == 0.0 {
        return difference;
    }
    let ratio = 200.0 * difference / spread;
    spread * (ratio * ratio.sqrt()).min(1.0)
}

impl PartialEq for Panel {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Panel {}

impl PartialOrd for Panel {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Panel {
    /// By error; the position settles ties, so that the order of work never depends on chance.
    fn cmp(&self, other: &Self) -> Ordering {
        self.error.total_cmp(&other.error).then(other.low.total_cmp(&self.low))
    }
}

fn adapt(
    what: &'static str,
    low: f64,
    high: f64,
    goal: Goal,
    mut f: impl FnMut(f64) -> Result<f64>,
) -> Result<Integral> {
    let first = Panel::new(low, high, &mut f)?;
    let mut evaluations = PANEL_EVALUATIONS;
    let mut open = BinaryHeap::new();
    let mut closed: Vec<Panel> = Vec::new();
    let (mut value, mut error) = (first.value, first.error);
    open.push(first);
    while error > goal.absolute.max(goal.relative * value.abs()) {
        let Some(worst) = open.pop() else {
            break;
        };
        if worst.at_rounding {
            closed.push(worst);
            continue;
        }
        if evaluations + 2 * PANEL_EVALUATIONS > goal.max_evaluations {
            return Err(NumericsError::NoConvergence {
                what,
                low: worst.low,
                high: worst.high,
                evaluations,
            });
        }
        let middle = 0.5 * (worst.low + worst.high);
        open.push(Panel::new(worst.low, middle, &mut f)?);
        open.push(Panel::new(middle, worst.high, &mut f)?);
        evaluations += 2 * PANEL_EVALUATIONS;
        // Summed anew each time: running differences would keep the rounding of large panels.
        value = open.iter().chain(&closed).map(|panel| panel.value).sum();
        error = open.iter().chain(&closed).map(|panel| panel.error).sum();
    }
    Ok(Integral { value, error, evaluations })
}

fn finite(x: f64, f: &mut impl FnMut(f64) -> Result<f64>) -> Result<f64> {
    let value = f(x)?;
    if value.is_finite() {
        return Ok(value);
    }
    Err(NumericsError::OutOfDomain { name: "integrand", given: value, allowed: "finite" })
}
