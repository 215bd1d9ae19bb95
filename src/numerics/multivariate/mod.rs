//! Probabilities of several statistics at once: bivariate normal, studentised range, comparisons with a control,
//! and Owen's Q for two one-sided tests.

mod bivariate_normal;
mod common_factor;
mod dunnett;
mod interval;
mod line_integral;
mod owen_q;
mod range_power;
mod scale_mixture;
mod spread;
mod studentized_range;

pub use bivariate_normal::BivariateNormal;
pub use common_factor::Sides;
pub use dunnett::{Dunnett, ShiftedComparisons};
pub use owen_q::{owen_q, two_one_sided_power};
pub use range_power::ShiftedRange;
pub use studentized_range::StudentizedRange;
