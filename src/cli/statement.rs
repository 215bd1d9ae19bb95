//! `statement`: the paragraph to paste.

use std::path::PathBuf;

use clap::Args;

use super::progress::Bar;
use super::{Outcome, files, report};
use crate::error::Error;
use crate::record::documents;

#[derive(Debug, Args)]
#[command(after_help = "Example:\n  sufficit statement study.yaml")]
pub(super) struct Arguments {
    /// The spec, or `-` for standard input.
    spec: PathBuf,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let mut loaded = files::load(&arguments.spec)?;
    // A statement quotes no simulated number.
    loaded.study.replicates = 0;
    let plan = documents::solve(&loaded, &Bar::new())?;
    let press = documents::press(&loaded, &plan)?;
    files::print(report::statements(&press).as_bytes())?;
    Ok(Outcome::Good)
}
