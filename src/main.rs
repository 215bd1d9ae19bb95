//! Command line of Sufficit.

use std::process::ExitCode;

fn main() -> ExitCode {
    sufficit::cli::main()
}
