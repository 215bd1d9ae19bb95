//! Tests of the solvers, quadratures, random numbers, and the multivariate and discrete distributions.

mod batteries;
mod binomials;
mod bivariate;
mod comparisons;
mod equivalence;
mod integer_search;
mod proportions;
mod quadrature;
mod random;
mod ranges;
mod roots;
mod tables;
