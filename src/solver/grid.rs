//! Smallest sizes over a grid of effects and spreads.

use std::collections::BTreeMap;

use super::error::SolverError;
use super::sample_size::{first_to_reach, largest_step, within_reach};
use crate::designs::{AtSizes, Point, Problem};
use crate::numerics::NumericsError;

/// The smallest step that reaches the target for each effect (row) and spread (column); `None` where none does.
///
/// Each cell is searched from the answer of its neighbour, and what belongs to a size (its critical value) is computed
/// once for the whole grid. Every answer is proved as a single search proves it: it reaches the target, and one step
/// fewer does not.
///
/// # Errors
///
/// A numerical failure.
pub fn size_grid(
    problem: &dyn Problem,
    effects: &[f64],
    spreads: &[f64],
) -> Result<Vec<Vec<Option<u64>>>, SolverError> {
    let mut fixed = Fixed { problem, known: BTreeMap::new() };
    let largest = largest_step(problem);
    let mut above: Vec<Option<u64>> = Vec::new();
    let mut grid = Vec::with_capacity(effects.len());
    for effect in effects {
        let mut row: Vec<Option<u64>> = Vec::with_capacity(spreads.len());
        for (column, nuisance) in spreads.iter().enumerate() {
            let at = Point { effect: *effect, nuisance: *nuisance };
            let left = row.last().copied().flatten();
            let hint = above.get(column).copied().flatten().or(left);
            let hint = match hint {
                Some(step) => Some(step),
                None => problem.textbook(at)?.map(|textbook| textbook.step as u64 + 1),
            };
            row.push(within_reach(fixed.smallest(at, hint, largest))?);
        }
        above.clone_from(&row);
        grid.push(row);
    }
    Ok(grid)
}

/// Analyses at fixed sizes, by step.
struct Fixed<'a> {
    problem: &'a dyn Problem,
    known: BTreeMap<u64, Box<dyn AtSizes>>,
}

impl Fixed<'_> {
    fn reaches(&mut self, step: u64, at: Point, target: f64) -> Result<bool, NumericsError> {
        if let Some(known) = self.known.get(&step) {
            return known.reaches(at, target);
        }
        let out = NumericsError::TargetOutOfReach { largest: step, best: f64::NAN };
        let fixed = self.problem.at_sizes(&self.problem.sizes(step).ok_or(out)?)?;
        let reached = fixed.reaches(at, target);
        self.known.insert(step, fixed);
        reached
    }

    fn smallest(&mut self, at: Point, hint: Option<u64>, largest: u64) -> Result<u64, SolverError> {
        let target = self.problem.risk().power.get();
        let problem = self.problem;
        let reached = |step| Ok(f64::from(self.reaches(step, at, target)?));
        first_to_reach(problem, largest, hint, 1.0, reached).map(|found| found.n).map_err(|error| {
            match error {
                NumericsError::TargetOutOfReach { .. } => SolverError::OutOfReach,
                other => other.into(),
            }
        })
    }
}
