//! Sufficit: reproducible sample-size justification reports from a YAML study specification.

pub mod bibliography;
pub mod cli;
pub mod designs;
mod error;
pub mod numerics;
pub mod plan;
pub mod quantities;
pub mod record;
pub mod render;
pub mod report;
pub mod solver;
pub mod spec;
pub mod study;

pub use error::Error;
