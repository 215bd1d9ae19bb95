//! `verify`: whether a document is what its spec gives.

use std::path::PathBuf;

use clap::Args;

use super::progress::Bar;
use super::{Outcome, files, report};
use crate::error::Error;
use crate::record::verify::{Finding, verify};

/// Largest document, and largest figure beside it, that is looked at.
const LIMIT: u64 = 64 << 20;

#[derive(Debug, Args)]
#[command(
    after_help = "Examples:\n  sufficit verify study.pdf\n  cat study.md | sufficit verify -"
)]
pub(super) struct Arguments {
    /// A PDF or Markdown that Sufficit made, or `-` for standard input. The figures of a Markdown are looked for beside
    /// it; when it comes from standard input, in the current folder.
    file: PathBuf,
    /// Folder with the fonts that the document was made with, if any were added.
    #[arg(long, value_name = "FOLDER")]
    fonts: Option<PathBuf>,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let bytes = files::read_document(&arguments.file, LIMIT)?;
    let beside = |name: &str| files::read_beside(&arguments.file, name, LIMIT);
    let fonts = report::font_set(arguments.fonts.as_deref())?;
    let findings = verify(&bytes, &beside, &fonts, &Bar::new())?;
    let good = findings.iter().all(Finding::is_good);
    let verdict = if good { "verified" } else { "not verified" };
    let text = table(&findings) + &format!("{}: {verdict}\n", files::shown(&arguments.file));
    files::print(text.as_bytes())?;
    Ok(if good { Outcome::Good } else { Outcome::Disagreement })
}

/// A line for each finding; further lines of a detail begin below its first.
fn table(findings: &[Finding]) -> String {
    let width = findings.iter().map(|finding| finding.what.len()).max().unwrap_or(0);
    let mut text = String::new();
    for finding in findings {
        let mark = if finding.is_good() { "agrees" } else { "DIFFERS" };
        let mut lines = finding.detail.lines();
        let first = lines.next().unwrap_or_default();
        let row = format!("{mark:<7}   {:<width$}   {first}", finding.what);
        text.push_str(row.trim_end());
        text.push('\n');
        for line in lines {
            let row = format!("{:<7}   {:<width$}   {line}", "", "");
            text.push_str(row.trim_end());
            text.push('\n');
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::record::verify::Verdict;

    #[test]
    fn details_stand_below_each_other() {
        let finding =
            |what, verdict, detail: &str| Finding { what, verdict, detail: detail.into() };
        let findings = [
            finding("plan", Verdict::Agrees, "equal"),
            finding("document", Verdict::Differs, "line 2\nand more"),
        ];
        let expected = "agrees    plan       equal\n\
                        DIFFERS   document   line 2\n                     and more\n";
        assert_eq!(table(&findings), expected);
    }
}
