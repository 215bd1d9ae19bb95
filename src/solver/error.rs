//! Why a study could not be solved.

use thiserror::Error;

use crate::numerics::NumericsError;
use crate::quantities::LARGEST_SIZE;

/// A failure of the solver.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum SolverError {
    /// No legal size reaches the wanted power.
    #[error(
        "the wanted power is not reached with up to {LARGEST_SIZE} units per group; look for a larger difference, a \
         smaller standard deviation, a lower power or a higher significance level"
    )]
    OutOfReach,
    /// A number of units is too large to count.
    #[error(
        "the number of units exceeds {LARGEST_SIZE} per group once losses and further units are added"
    )]
    TooMany,
    /// A ceiling that leaves too few units after losses to run the analysis at all.
    #[error(
        "the ceiling leaves {remain} units in the smallest group after losses, but the analysis needs at least \
         {needed}; raise the ceiling"
    )]
    CeilingTooLow {
        /// Units that would remain.
        remain: u64,
        /// Units that the analysis needs.
        needed: u64,
    },
    /// A numerical routine failed.
    #[error("a numerical routine failed: {0}; please report it together with the spec")]
    Numerics(#[from] NumericsError),
    /// One of the above, in one experiment.
    #[error("experiment `{id}`: {error}")]
    InExperiment {
        /// The experiment.
        id: String,
        /// What went wrong there.
        error: Box<SolverError>,
    },
}

impl SolverError {
    pub(crate) fn in_experiment(id: &str, error: Self) -> Self {
        Self::InExperiment { id: id.to_owned(), error: Box::new(error) }
    }
}
