//! The theory of every design against values from outside the project, and a battery that every design inherits.

mod baseline_covariate;
mod battery;
mod correlation;
mod crossover_means;
mod omnibus_f;
mod one_mean;
mod paired_means;
mod parallel_means;
mod randomised_blocks;
mod support;
mod welch_means;
