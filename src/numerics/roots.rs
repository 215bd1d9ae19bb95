//! Guaranteed root finding without derivatives: a sign change goes in, a root with its evidence comes out.

use super::error::{NumericsError, Result};

/// Evaluations after which interpolation is given up and the doubles in the bracket are halved by count.
const PATIENCE: usize = 60;

/// Evaluations allowed when nothing else is asked: patience, plus 64 halvings of all doubles, plus the two ends.
const MAX_EVALUATIONS: usize = 128;

/// A root together with what proves it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Root {
    /// The argument with the smallest absolute function value met in the last bracket.
    pub at: f64,
    /// The function value there.
    pub residual: f64,
    /// The last bracket: the function changes sign (or is zero) inside it.
    pub bracket: (f64, f64),
    /// How many times the function was evaluated.
    pub evaluations: usize,
}

/// Two arguments between which a function changes sign, with the values found there.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bracket {
    /// The lower argument.
    pub low: f64,
    /// The upper argument.
    pub high: f64,
    /// The function value at the lower argument.
    pub at_low: f64,
    /// The function value at the upper argument.
    pub at_high: f64,
    /// How many evaluations the bracket has cost so far.
    pub evaluations: usize,
}

/// When a search may stop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Bracket width that is narrow enough whatever the root's size.
    pub absolute: f64,
    /// Bracket width that is narrow enough, relative to the root.
    pub relative: f64,
    /// The largest number of function evaluations.
    pub max_evaluations: usize,
}

impl Default for Tolerance {
    /// Full precision: a bracket of a few units in the last place.
    fn default() -> Self {
        Tolerance { absolute: 0.0, relative: 4.0 * f64::EPSILON, max_evaluations: MAX_EVALUATIONS }
    }
}

/// Finds a root of `f` between `low` and `high` to full double precision.
///
/// # Errors
///
/// As [`find_root_within`], which explains the method.
pub fn find_root(
    what: &'static str,
    low: f64,
    high: f64,
    f: impl FnMut(f64) -> Result<f64>,
) -> Result<Root> {
    find_root_within(what, low, high, Tolerance::default(), f)
}

/// Finds a root of `f` between `low` and `high`, to the tolerance asked for.
///
/// # Method
///
/// Inverse quadratic interpolation where Chandrupatla's criterion trusts it, else halving; for ends of one sign that
/// differ by orders of magnitude the halving is geometric. After 60 evaluations the search halves the *number of
/// doubles* in the bracket, which ends after at most 64 more, so a root of any size is found from any bracket.
///
/// # Units and ranges
///
/// Finite ends, in either order. The values of `f` may be infinite (only their sign is used then), never NaN.
///
/// # Accuracy
///
/// The bracket returned is no wider than `max(absolute, relative * |root|)` and holds a sign change, or a double at
/// which `f` is exactly zero (`tests/numerics_solvers/roots.rs`).
///
/// # Errors
///
/// * [`NumericsError::NoBracket`] when both ends have the same sign.
/// * [`NumericsError::OutOfDomain`] when an end is not finite or `f` gives NaN.
/// * [`NumericsError::NoConvergence`] when the evaluations are used up.
/// * Whatever `f` itself returns.
///
/// # Sources
///
/// Chandrupatla (1997), Advances in Engineering Software 28(3), 145-149, for the criterion of interpolation.
/// Deviation: the two halvings just named.
pub fn find_root_within(
    what: &'static str,
    low: f64,
    high: f64,
    tolerance: Tolerance,
    mut f: impl FnMut(f64) -> Result<f64>,
) -> Result<Root> {
    let (low, high) = if low <= high { (low, high) } else { (high, low) };
    let at_low = checked_value(low, &mut f)?;
    let at_high = checked_value(high, &mut f)?;
    let bracket = Bracket { low, high, at_low, at_high, evaluations: 2 };
    refine(what, bracket, tolerance, f)
}

/// Finds a root inside a bracket whose end values are known already.
///
/// # Errors
///
/// As [`find_root_within`].
pub fn refine(
    what: &'static str,
    bracket: Bracket,
    tolerance: Tolerance,
    mut f: impl FnMut(f64) -> Result<f64>,
) -> Result<Root> {
    let mut search = Search::new(what, bracket)?;
    while !search.settled(tolerance) {
        if search.evaluations >= tolerance.max_evaluations {
            let (low, high) = search.ends();
            return Err(NumericsError::NoConvergence {
                what,
                low,
                high,
                evaluations: search.evaluations,
            });
        }
        let x = search.next_argument(tolerance);
        let value = checked_value(x, &mut f)?;
        search.narrow(x, value);
    }
    Ok(search.root())
}

/// Widens `start ± step` until `f` changes sign, doubling the step and never leaving `limits`.
///
/// The end with the smaller absolute value is moved, which for a monotone function is the right one.
///
/// # Errors
///
/// * [`NumericsError::NoBracket`] when both limits are reached without a change of sign.
/// * [`NumericsError::OutOfDomain`] when `start` is not inside the limits, `step` is not above 0, or `f` gives NaN.
/// * Whatever `f` itself returns.
pub fn bracket_around(
    what: &'static str,
    start: f64,
    step: f64,
    limits: (f64, f64),
    mut f: impl FnMut(f64) -> Result<f64>,
) -> Result<Bracket> {
    check_start(start, step, limits)?;
    let mut low = Visited::at((start - step).max(limits.0), &mut f)?;
    let mut high = Visited::at((start + step).min(limits.1), &mut f)?;
    let mut evaluations = 2;
    let (mut down, mut up) = (step, step);
    if !same_sign(low.value, high.value) {
        return Ok(Visited::bracket(low, high, evaluations));
    }
    loop {
        let down_open = low.at > limits.0;
        let up_open = high.at < limits.1;
        if !down_open && !up_open {
            return Err(NumericsError::NoBracket { what, low: low.at, high: high.at });
        }
        evaluations += 1;
        // Everything visited so far has one sign, so a new sign is bracketed by the nearest neighbour.
        if down_open && (low.value.abs() <= high.value.abs() || !up_open) {
            down *= 2.0;
            let further = Visited::at((low.at - down).max(limits.0), &mut f)?;
            if !same_sign(further.value, low.value) {
                return Ok(Visited::bracket(further, low, evaluations));
            }
            low = further;
        } else {
            up *= 2.0;
            let further = Visited::at((high.at + up).min(limits.1), &mut f)?;
            if !same_sign(further.value, high.value) {
                return Ok(Visited::bracket(high, further, evaluations));
            }
            high = further;
        }
    }
}

/// An argument and the value found there.
#[derive(Clone, Copy)]
struct Visited {
    at: f64,
    value: f64,
}

impl Visited {
    fn at(at: f64, f: &mut impl FnMut(f64) -> Result<f64>) -> Result<Self> {
        let value = checked_value(at, f)?;
        Ok(Visited { at, value })
    }

    fn bracket(low: Visited, high: Visited, evaluations: usize) -> Bracket {
        Bracket { low: low.at, high: high.at, at_low: low.value, at_high: high.value, evaluations }
    }
}

/// State of the search: `newest` and `opposite` enclose the root, `previous` feeds the interpolation.
struct Search {
    newest: Visited,
    opposite: Visited,
    previous: Visited,
    /// Where in the bracket to look next, as a share of the way from `newest` to `opposite`; `None` halves.
    share: Option<f64>,
    evaluations: usize,
}

impl Search {
    fn new(what: &'static str, bracket: Bracket) -> Result<Self> {
        let newest = Visited { at: bracket.low, value: bracket.at_low };
        let opposite = Visited { at: bracket.high, value: bracket.at_high };
        for (name, end) in [("low", newest), ("high", opposite)] {
            check_finite(name, end.at)?;
            check_not_nan(end.value)?;
        }
        if same_sign(newest.value, opposite.value) {
            return Err(NumericsError::NoBracket { what, low: bracket.low, high: bracket.high });
        }
        // A straight line through the ends is the natural first guess.
        let line = newest.value / (newest.value - opposite.value);
        Ok(Search {
            newest,
            opposite,
            previous: newest,
            share: line.is_finite().then_some(line),
            evaluations: bracket.evaluations,
        })
    }

    fn best(&self) -> Visited {
        if self.newest.value.abs() <= self.opposite.value.abs() {
            self.newest
        } else {
            self.opposite
        }
    }

    fn ends(&self) -> (f64, f64) {
        let (a, b) = (self.newest.at, self.opposite.at);
        (a.min(b), a.max(b))
    }

    fn root(&self) -> Root {
        let best = self.best();
        Root {
            at: best.at,
            residual: best.value,
            bracket: self.ends(),
            evaluations: self.evaluations,
        }
    }

    fn settled(&self, tolerance: Tolerance) -> bool {
        let best = self.best();
        let (low, high) = self.ends();
        let narrow = tolerance.absolute.max(tolerance.relative * best.at.abs());
        best.value == 0.0 || high - low <= narrow || next_up(low) >= high
    }

    /// The next argument, always strictly inside the bracket.
    fn next_argument(&self, tolerance: Tolerance) -> f64 {
        let (low, high) = self.ends();
        let x = if self.evaluations >= PATIENCE {
            middle_double(low, high)
        } else {
            match self.share {
                Some(share) => self.interpolated(share, tolerance),
                None => middle(low, high),
            }
        };
        if x > low && x < high { x } else { middle_double(low, high) }
    }

    /// Keeps half a tolerance away from both ends, so that the bracket really closes from both sides.
    fn interpolated(&self, share: f64, tolerance: Tolerance) -> f64 {
        let width = self.opposite.at - self.newest.at;
        let narrow = tolerance.absolute.max(tolerance.relative * self.best().at.abs());
        let margin = (0.5 * narrow / width.abs()).min(0.5);
        self.newest.at + share.clamp(margin, 1.0 - margin) * width
    }

    /// Takes in a new value and decides how the next argument is chosen.
    fn narrow(&mut self, x: f64, value: f64) {
        self.evaluations += 1;
        let old = self.newest;
        if same_sign(value, old.value) {
            self.previous = old;
        } else {
            self.previous = self.opposite;
            self.opposite = old;
        }
        self.newest = Visited { at: x, value };
        self.share = self.trusted_interpolation();
    }

    /// Inverse quadratic interpolation where the three values are monotone enough for it, else nothing.
    fn trusted_interpolation(&self) -> Option<f64> {
        let (a, b, c) = (self.newest, self.opposite, self.previous);
        let xi = (a.at - b.at) / (c.at - b.at);
        let phi = (a.value - b.value) / (c.value - b.value);
        let trusted = phi * phi < xi && (1.0 - phi) * (1.0 - phi) < 1.0 - xi;
        if !trusted {
            return None;
        }
        let share = a.value / (b.value - a.value) * c.value / (b.value - c.value)
            + (c.at - a.at) / (b.at - a.at) * a.value / (c.value - a.value) * b.value
                / (c.value - b.value);
        share.is_finite().then_some(share)
    }
}

/// Halfway: on the logarithmic scale where the ends have one sign and differ by more than a factor of 16.
fn middle(low: f64, high: f64) -> f64 {
    let (near, far) = (low.abs().min(high.abs()), low.abs().max(high.abs()));
    if low.signum() == high.signum() && near > 0.0 && far / near > 16.0 {
        return low.signum() * near.sqrt() * far.sqrt();
    }
    0.5 * low + 0.5 * high
}

/// The double in the middle when all doubles from `low` to `high` are counted.
fn middle_double(low: f64, high: f64) -> f64 {
    let (a, b) = (rank(low), rank(high));
    from_rank(a + (b.wrapping_sub(a) as u64 / 2) as i64)
}

/// The next larger double, found by its rank.
fn next_up(x: f64) -> f64 {
    from_rank(rank(x) + 1)
}

/// Position of a finite double among all doubles, zero at 0.
fn rank(x: f64) -> i64 {
    let magnitude = (x.abs().to_bits()) as i64;
    if x.is_sign_negative() { -magnitude } else { magnitude }
}

fn from_rank(rank: i64) -> f64 {
    let magnitude = f64::from_bits(rank.unsigned_abs());
    if rank < 0 { -magnitude } else { magnitude }
}

fn same_sign(a: f64, b: f64) -> bool {
    (a > 0.0 && b > 0.0) || (a < 0.0 && b < 0.0)
}

fn checked_value(x: f64, f: &mut impl FnMut(f64) -> Result<f64>) -> Result<f64> {
    let value = f(x)?;
    check_not_nan(value)?;
    Ok(value)
}

fn check_not_nan(value: f64) -> Result<()> {
    if value.is_nan() {
        return Err(NumericsError::OutOfDomain {
            name: "function value",
            given: value,
            allowed: "a number",
        });
    }
    Ok(())
}

fn check_finite(name: &'static str, given: f64) -> Result<()> {
    if given.is_finite() {
        return Ok(());
    }
    Err(NumericsError::OutOfDomain { name, given, allowed: "finite" })
}

fn check_start(start: f64, step: f64, limits: (f64, f64)) -> Result<()> {
    check_finite("lower limit", limits.0)?;
    check_finite("upper limit", limits.1)?;
    if !(start >= limits.0 && start <= limits.1) {
        return Err(NumericsError::OutOfDomain {
            name: "start",
            given: start,
            allowed: "within the limits",
        });
    }
    if !(step > 0.0 && step.is_finite()) {
        return Err(NumericsError::OutOfDomain {
            name: "step",
            given: step,
            allowed: "above 0 and finite",
        });
    }
    Ok(())
}
