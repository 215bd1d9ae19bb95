//! `schema`: the JSON Schema of the spec.

use clap::Args;

use super::{Outcome, files};
use crate::error::Error;
use crate::render::RenderError;
use crate::spec;

#[derive(Debug, Args)]
#[command(after_help = "Example:\n  sufficit schema > sufficit.schema.json")]
pub(super) struct Arguments {}

pub(super) fn execute(_: &Arguments) -> Result<Outcome, Error> {
    let text = serde_json::to_string_pretty(&spec::json_schema()).map_err(RenderError::Plan)?;
    files::print((text + "\n").as_bytes())?;
    Ok(Outcome::Good)
}
