//! Exact machinery for counts: binomial, Poisson and hypergeometric probabilities, and tests of two proportions
//! by full enumeration.

mod binomial;
mod binomial_test;
mod conditional;
mod ends;
mod exact;
mod hypergeometric;
mod large_sample;
mod poisson;
mod two_binomials;
mod unconditional;

pub use binomial::Binomial;
pub use binomial_test::{BinomialRegion, BinomialRule};
pub use hypergeometric::Hypergeometric;
pub use poisson::Poisson;
pub use two_binomials::{Alternative, ProportionTest, TwoBinomialRegion};
