//! What can go wrong in pure mathematics: an argument outside the domain, or a search that does not settle.

use thiserror::Error;

/// Result of a numerical routine.
pub type Result<T> = std::result::Result<T, NumericsError>;

/// A failure of a numerical routine. None of them carries a value: a caller can never mistake it for a result.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum NumericsError {
    /// An argument lies where the function is not defined.
    #[error("{name} is {given}, but must be {allowed}")]
    OutOfDomain {
        /// The argument's name in the function's documentation.
        name: &'static str,
        /// The value that was given.
        given: f64,
        /// The legal range in words.
        allowed: &'static str,
    },
    /// An iteration used up its allowance before it settled.
    #[error(
        "{what} did not settle within {evaluations} evaluations (last bracket {low} to {high})"
    )]
    NoConvergence {
        /// The routine that gave up.
        what: &'static str,
        /// The lower end of the last bracket.
        low: f64,
        /// The upper end of the last bracket.
        high: f64,
        /// How many evaluations were spent.
        evaluations: usize,
    },
    /// The function has the same sign at both ends, so the bracket holds no guaranteed root.
    #[error("{what}: no sign change between {low} and {high}")]
    NoBracket {
        /// The routine that was asked.
        what: &'static str,
        /// The lower end.
        low: f64,
        /// The upper end.
        high: f64,
    },
    /// A whole-number search reached its upper limit.
    #[error("no size up to {largest} meets the target (best value {best})")]
    TargetOutOfReach {
        /// The largest size that was tried.
        largest: u64,
        /// The best value met on the way.
        best: f64,
    },
}
