//! The command line: thin, on top of everything.

mod check;
mod files;
mod progress;
mod report;
mod schema;
mod solve;
mod statement;
mod style;
mod targets;
mod verify;

use std::io::Write;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

use crate::error::Error;

/// Sample-size justification reports that anyone can recompute.
///
/// A study is written down in a YAML file; the report says how many units are needed, why, and how firm the number is.
#[derive(Debug, Parser)]
#[command(
    name = "sufficit",
    version,
    max_term_width = 100,
    after_help = "Exit codes: 0 success; 1 a verification found a disagreement; 2 the command line is wrong; 3 the \
                  spec is wrong; 4 the study cannot be solved as it stands; 5 a file cannot be read or written; 6 the \
                  document cannot be made.\n\nExample:\n  sufficit report study.yaml"
)]
pub struct Cli {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Make the report: PDF, Markdown, and other formats.
    Report(report::Arguments),
    /// Show the result in the terminal.
    Solve(solve::Arguments),
    /// Check a spec without solving it.
    Check(check::Arguments),
    /// Print the paragraph to paste.
    Statement(statement::Arguments),
    /// Check that a document is what its spec gives: hashes, plan, bytes, figures.
    Verify(verify::Arguments),
    /// Print the JSON Schema of the spec.
    Schema(schema::Arguments),
}

/// Whether everything asked for was found in order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    /// It was.
    Good,
    /// A verification found a disagreement.
    Disagreement,
}

/// Parses the command line, runs it, and turns errors into text and an exit code.
pub fn main() -> ExitCode {
    let cli = Cli::parse();
    match run(cli) {
        Ok(Outcome::Good) => ExitCode::SUCCESS,
        Ok(Outcome::Disagreement) => ExitCode::from(1),
        Err(error) => {
            let text = match &error {
                Error::Spec(problems) => problems.render(style::errors_in_colour()),
                other => format!("{} {other}\n", style::error_word()),
            };
            // Nothing is left to tell when standard error itself is gone.
            let _ = std::io::stderr().write_all(text.as_bytes());
            ExitCode::from(error.exit_code())
        }
    }
}

fn run(cli: Cli) -> Result<Outcome, Error> {
    match cli.command {
        Command::Report(arguments) => report::execute(&arguments),
        Command::Solve(arguments) => solve::execute(&arguments),
        Command::Check(arguments) => check::execute(&arguments),
        Command::Statement(arguments) => statement::execute(&arguments),
        Command::Verify(arguments) => verify::execute(&arguments),
        Command::Schema(arguments) => schema::execute(&arguments),
    }
}

#[cfg(test)]
mod tests {
    use clap::CommandFactory;

    #[test]
    fn the_definition_is_sound() {
        super::Cli::command().debug_assert();
    }
}
