//! Special functions under the distributions: each returns small tails directly and in scaled form.

pub(crate) mod beta;
pub mod gamma;
pub(crate) mod legendre;
pub(crate) mod logarithms;
pub mod normal;
pub(crate) mod poisson_mixture;
pub(crate) mod trapezoid;

pub use gamma::log_gamma;
