//! The theory of every design against values from outside the project, and a battery that every design inherits.

mod battery;
mod correlation;
mod omnibus_f;
mod one_mean;
mod paired_means;
mod parallel_means;
mod support;
mod welch_means;
