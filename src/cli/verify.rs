//! `verify`: whether a document is what its spec gives.

use std::path::PathBuf;

use clap::Args;

use super::progress::Bar;
use super::{Outcome, files, report};
use crate::error::Error;
use crate::record::verify::{Finding, verify};

/// Largest document that is looked at.
const DOCUMENT_LIMIT: u64 = 64 << 20;

#[derive(Debug, Args)]
#[command(after_help = "Example:\n  sufficit verify study.pdf")]
pub(super) struct Arguments {
    /// A PDF or Markdown that Sufficit made.
    file: PathBuf,
    /// Folder with the fonts that the document was made with, if any were added.
    #[arg(long, value_name = "FOLDER")]
    fonts: Option<PathBuf>,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let bytes = files::read_document(&arguments.file, DOCUMENT_LIMIT)?;
    let fonts = report::font_set(arguments.fonts.as_deref())?;
    let findings = verify(&bytes, &fonts, &Bar::new())?;
    let mut text = String::new();
    for finding in &findings {
        let mark = if finding.is_good() { "agrees  " } else { "DIFFERS " };
        text.push_str(&format!("{mark}  {:<22}{}\n", finding.what, finding.detail));
    }
    let good = findings.iter().all(Finding::is_good);
    let verdict = if good { "verified" } else { "not verified" };
    text.push_str(&format!("{}: {verdict}\n", arguments.file.display()));
    files::print(text.as_bytes())?;
    Ok(if good { Outcome::Good } else { Outcome::Disagreement })
}
