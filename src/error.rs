//! The one public error: what went wrong, and the exit code that says so to scripts.

use thiserror::Error;

use crate::record::RecordError;
use crate::render::RenderError;
use crate::solver::SolverError;
use crate::spec::SpecProblems;

/// Anything that keeps the program from doing its job.
#[derive(Debug, Error)]
pub enum Error {
    /// The spec is wrong.
    #[error("{0}")]
    Spec(SpecProblems),
    /// The study cannot be solved as it stands.
    #[error(transparent)]
    Solver(#[from] SolverError),
    /// The document cannot be made.
    #[error(transparent)]
    Render(#[from] RenderError),
    /// A document that was to be verified cannot be read.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// A file cannot be read or written.
    #[error("{path}: {reason}")]
    File {
        /// The file.
        path: String,
        /// What is in the way, and the way out.
        reason: String,
    },
    /// The command line asks for something that does not exist.
    #[error("{0}")]
    Request(String),
}

impl Error {
    /// The exit code of the program.
    ///
    /// 2 the command line is wrong, 3 the spec is wrong, 4 the study cannot be solved, 5 a file cannot be read or
    /// written, 6 the document cannot be made. (0 is success, and 1 a verification that found a disagreement.)
    pub fn exit_code(&self) -> u8 {
        match self {
            Self::Request(_) => 2,
            Self::Spec(_) => 3,
            Self::Solver(_) => 4,
            Self::File { .. } | Self::Record(_) => 5,
            Self::Render(_) => 6,
        }
    }

    /// Whether the spec is at fault.
    pub fn is_spec(&self) -> bool {
        matches!(self, Self::Spec(_))
    }

    /// Whether the wanted power is out of reach.
    pub fn is_out_of_reach(&self) -> bool {
        let Self::Solver(error) = self else { return false };
        match error {
            SolverError::OutOfReach => true,
            SolverError::InExperiment { error, .. } => **error == SolverError::OutOfReach,
            _ => false,
        }
    }

    /// A file that cannot be read or written.
    pub fn file(path: impl Into<String>, reason: impl std::fmt::Display) -> Self {
        Self::File { path: path.into(), reason: reason.to_string() }
    }
}

impl From<SpecProblems> for Error {
    fn from(problems: SpecProblems) -> Self {
        Self::Spec(problems)
    }
}
