//! Special functions under the distributions: each returns small tails directly and in scaled form.

pub(crate) mod beta;
pub(crate) mod exponential;
pub mod gamma;
pub(crate) mod legendre;
pub(crate) mod logarithms;
pub mod normal;
pub(crate) mod poisson_mixture;
pub(crate) mod student_tail;
pub(crate) mod trapezoid;

pub use gamma::log_gamma;
