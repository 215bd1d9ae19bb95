//! The smallest sizes that reach a wanted power.

use super::error::SolverError;
use crate::designs::{Point, Problem, Sizes};
use crate::numerics::NumericsError;
use crate::numerics::integer_search::{self, Smallest};
use crate::quantities::LARGEST_SIZE;

/// Smallest sizes with their proof.
#[derive(Debug, Clone, PartialEq)]
pub struct Found {
    /// The sizes.
    pub sizes: Sizes,
    /// Power there; at least the target.
    pub power: f64,
    /// Power with one step fewer, below the target; `None` at the smallest step for which the analysis exists.
    pub power_one_fewer: Option<f64>,
}

/// The smallest step whose power reaches the target of the problem, at a point.
///
/// The size of every other group follows from the step, that of the largest group, by rounding up. "Smallest" means:
/// with one unit fewer in the largest group, and the others rounded up accordingly, the target is missed.
///
/// # Errors
///
/// [`SolverError::OutOfReach`] when the largest size does not suffice.
pub fn smallest_sizes(problem: &dyn Problem, at: Point) -> Result<Found, SolverError> {
    smallest_for(problem, at, problem.risk().power.get())
}

/// The same for another power to aim for.
pub(super) fn smallest_for(
    problem: &dyn Problem,
    at: Point,
    target: f64,
) -> Result<Found, SolverError> {
    let Some(textbook) = problem.textbook(at)? else { return Err(SolverError::OutOfReach) };
    let hint = Some(textbook.step as u64 + 1);
    let largest = largest_step(problem);
    let power = |step: u64| match problem.sizes(step) {
        Some(sizes) => problem.power(&sizes, at),
        None => Err(NumericsError::TargetOutOfReach { largest: step, best: f64::NAN }),
    };
    let found =
        first_to_reach(problem, largest, hint, target, power).map_err(|error| match error {
            NumericsError::TargetOutOfReach { .. } => SolverError::OutOfReach,
            other => other.into(),
        })?;
    let sizes = problem.sizes(found.n).ok_or(SolverError::TooMany)?;
    Ok(Found { sizes, power: found.value, power_one_fewer: found.value_before })
}

/// The first step up to `largest` at which `value` reaches the target: every step below [`Problem::rising_from`] is
/// tried, above it the value is taken to stay above the target once it is.
pub(super) fn first_to_reach(
    problem: &dyn Problem,
    largest: u64,
    hint: Option<u64>,
    target: f64,
    mut value: impl FnMut(u64) -> Result<f64, NumericsError>,
) -> Result<Smallest, NumericsError> {
    let lowest = problem.smallest_step();
    let last_tried = problem.rising_from().min(largest).saturating_sub(1);
    if last_tried < lowest {
        return integer_search::smallest_rising(lowest, largest, hint, target, value);
    }
    match integer_search::first_reaching(lowest, last_tried, target, &mut value) {
        Err(NumericsError::TargetOutOfReach { .. }) => {
            integer_search::smallest_rising(last_tried, largest, hint, target, value)
        }
        found => found,
    }
}

/// The largest step for which no group exceeds the largest size.
pub(super) fn largest_step(problem: &dyn Problem) -> u64 {
    let (mut low, mut high) = (problem.smallest_step(), LARGEST_SIZE + 1);
    while high - low > 1 {
        let middle = low + (high - low) / 2;
        if problem.sizes(middle).is_some() {
            low = middle;
        } else {
            high = middle;
        }
    }
    low
}

/// Out of reach is an answer where a table or a comparison is filled; other failures stay failures.
pub(super) fn within_reach<T>(result: Result<T, SolverError>) -> Result<Option<T>, SolverError> {
    match result {
        Ok(value) => Ok(Some(value)),
        Err(SolverError::OutOfReach) => Ok(None),
        Err(other) => Err(other),
    }
}
