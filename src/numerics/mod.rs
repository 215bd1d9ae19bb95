//! Probability distributions, the special functions under them, and solvers: pure mathematics, no knowledge of studies.
//!
//! | module | contents |
//! |---|---|
//! | [`distributions`] | normal, t, chi-squared, F, beta, and their noncentral forms, behind [`Continuous`] |
//! | [`special`] | log-gamma, the normal tail; inside the crate the incomplete gamma and beta functions |
//! | [`multivariate`] | bivariate normal, Owen's Q, studentised range, comparisons with a control |
//! | [`discrete`] | binomial, Poisson, hypergeometric, tests of two proportions |
//! | [`roots`], [`integer_search`], [`quadrature`], [`random`] | solvers, integrals, random numbers |
//!
//! # Accuracy policy
//!
//! * **Relative accuracy in both tails.** `cdf` and `sf` are computed from sums and integrals whose terms are all
//!   positive. The tail on the side of the argument is the direct one, the other its complement, so that a small
//!   probability is never one minus a large one; where a probability underflows, its logarithm is still there.
//! * **Measured.** Tails and densities agree with tables of 50-digit arithmetic to a relative 1e-12 everywhere in
//!   the domain: 0.5 to 1e12 degrees of freedom, noncentrality 0 to 1e6, both tails down to 1e-290; quantiles to
//!   1e-13 (`tests/numerics/tables.rs`). The largest error met is 6e-13, at probabilities near 1e-250, where the
//!   rounding of an exponent near -600 alone costs 1e-13; above 1e-15 errors are mostly below 1e-14.
//! * **Where it is worse.** With fewer than half a degree of freedom the complement of a tail near one loses digits:
//!   the relative error grows to about 1e-16 over the degrees of freedom. With a noncentrality beyond 1e6, or degrees of
//!   freedom beyond 1e12, probabilities move by more than 1e-12 when the argument moves by one unit in its last place;
//!   results there are right for some argument within a few such units.
//! * **No silent failure.** Arguments outside the domain, NaN included, give [`NumericsError::OutOfDomain`]; no finite
//!   input panics, hangs or returns NaN (`tests/numerics/battery.rs`). Quantiles beyond the range of `f64` are 0 or
//!   infinite.
//! * **The same bits everywhere.** Transcendental functions come from the `libm` crate, never from the platform.
//!
//! # Why not a library for the central distributions
//!
//! `statrs` 0.19 was held against the same tables (`tests/reference/central_tails.tsv`, 416 rows, and the lower
//! quantiles of `quantiles.csv` above 1e-20); `tests/numerics/library.rs` counts the rows again. Only its normal quantile
//! reaches the accuracy above, and it is no faster than the one here. Even that is computed here: whether its logarithm
//! is that of `libm` or the platform's depends on the features of `num-traits` that other crates of the build turn on,
//! and the result must be the same bits everywhere.
//!
//! | function | rows worse than 1e-12 | largest relative error |
//! |---|---|---|
//! | t tails | 7 of 22 | 2e-3 (`df` = 1e12) |
//! | chi-squared tails | 10 of 23 | 1e-3 (`df` = 1e12) |
//! | F tails | 123 of 229 | 1 (the upper tail at 1e9, 1 degrees of freedom is 0) |
//! | beta tails | 65 of 142 | 0.6 (shapes 1e7, 1e9) |
//! | normal tails | - | 9e-12 at -30 |
//! | t quantile | 14 of 58 | 1 (`df` = 1, p = 1 - 1.1e-16) |
//! | chi-squared quantile | 13 of 47 | 592 (`df` = 1, p = 1e-6) |

pub mod discrete;
pub mod distributions;
pub mod error;
pub mod integer_search;
pub mod multivariate;
pub mod quadrature;
pub mod random;
pub mod roots;
pub(crate) mod scaled;
pub mod special;

pub use distributions::Continuous;
pub use distributions::beta::Beta;
pub use distributions::chi_squared::ChiSquared;
pub use distributions::fisher_f::FisherF;
pub use distributions::noncentral_beta::NoncentralBeta;
pub use distributions::noncentral_chi_squared::NoncentralChiSquared;
pub use distributions::noncentral_f::NoncentralF;
pub use distributions::noncentral_t::NoncentralT;
pub use distributions::normal::{Normal, normal_quantile, normal_upper_quantile};
pub use distributions::student_t::StudentT;
pub use error::{NumericsError, Result};
pub use special::normal::{normal_cdf, normal_sf};
