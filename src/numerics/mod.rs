//! Probability distributions and the special functions under them: pure mathematics, no knowledge of studies.

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
