//! Why a study could not be solved.

use thiserror::Error;

use crate::numerics::NumericsError;
use crate::quantities::{Grouped, LARGEST_SIZE};

/// A failure of the solver.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum SolverError {
    /// No legal size reaches the wanted power.
    #[error(
        "the wanted power is not reached with up to {} units per group; look for a larger difference, a \
         smaller standard deviation, a lower power or a higher significance level",
        Grouped(LARGEST_SIZE)
    )]
    OutOfReach,
    /// A number of units is too large to count.
    #[error(
        "the number of units exceeds {} per group once losses and further units are added",
        Grouped(LARGEST_SIZE)
    )]
    TooMany,
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
