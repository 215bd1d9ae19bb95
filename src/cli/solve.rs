//! `solve`: the result in the terminal.

use std::path::PathBuf;

use clap::Args;

use super::progress::Bar;
use super::{Outcome, files, style};
use crate::error::Error;
use crate::record::documents;
use crate::render::RenderError;

#[derive(Debug, Args)]
#[command(after_help = "Example:\n  sufficit solve study.yaml")]
pub(super) struct Arguments {
    /// The spec, or `-` for standard input.
    spec: PathBuf,
    /// Print the plan as JSON instead.
    #[arg(long)]
    json: bool,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let loaded = files::load(&arguments.spec)?;
    let plan = documents::solve(&loaded, &Bar::new())?;
    let text = if arguments.json {
        documents::plan_json(&plan).map_err(RenderError::Plan)?
    } else {
        let summary = documents::press(&loaded, &plan)?.summary()?;
        style::headed(summary.trim_end(), style::output_in_colour())
    };
    files::print(text.as_bytes())?;
    Ok(Outcome::Good)
}
