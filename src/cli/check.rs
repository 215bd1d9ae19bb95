//! `check`: whether a spec is valid.

use std::path::PathBuf;

use clap::Args;

use super::{Outcome, files};
use crate::error::Error;

#[derive(Debug, Args)]
#[command(after_help = "Example:\n  sufficit check study.yaml")]
pub(super) struct Arguments {
    /// The spec, or `-` for standard input.
    spec: PathBuf,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let loaded = files::load(&arguments.spec)?;
    let count = loaded.study.experiments.len();
    let several = if count == 1 { "" } else { "s" };
    let text = format!("{}: valid, {count} experiment{several}\n", loaded.inputs.spec.name);
    files::print(text.as_bytes())?;
    Ok(Outcome::Good)
}
