//! Holds the numerics against tables of one's own: a stream of function calls in, the same lines with values out.
//!
//! Every line of standard input is `function,arg1,arg2,…`; it is written back with the value appended at 17 significant
//! digits, or with the name of what went wrong. Empty lines and lines that begin with `#` pass unchanged.
//!
//! ```text
//! $ printf 't_quantile,10,0.975\nnoncentral_t_sf,38,2.5,2.02\n' | cargo run --release --example tabulate
//! ```
//!
//! With `--list` it prints each function with its arguments instead.

use std::io::{self, BufRead, BufWriter, Write};
use std::process::ExitCode;

#[path = "tabulate/functions.rs"]
mod functions;

/// The value for one line.
fn evaluate(line: &str) -> Result<f64, &'static str> {
    let mut fields = line.split(',');
    functions::evaluate(fields.next().unwrap_or_default().trim(), fields)
}

/// Copies standard input to standard output, line by line, with the values.
fn tabulate(mut input: impl BufRead, mut output: impl Write) -> io::Result<()> {
    let mut line = String::new();
    while input.read_line(&mut line)? > 0 {
        let text = line.trim_end_matches(['\n', '\r']);
        if text.trim().is_empty() || text.starts_with('#') {
            writeln!(output, "{text}")?;
        } else {
            match evaluate(text) {
                Ok(value) => writeln!(output, "{text},{value:.16e}")?,
                Err(name) => writeln!(output, "{text},{name}")?,
            }
        }
        line.clear();
    }
    output.flush()
}

fn list(mut output: impl Write) -> io::Result<()> {
    for entry in functions::entries() {
        writeln!(output, "{},{}", entry.name, entry.arguments.join(","))?;
    }
    output.flush()
}

fn main() -> ExitCode {
    let output = BufWriter::new(io::stdout().lock());
    let done = match std::env::args().nth(1).as_deref() {
        None => tabulate(io::stdin().lock(), output),
        Some("--list") => list(output),
        Some(other) => {
            eprintln!(
                "unknown argument {other}: lines come from standard input, --list names the functions"
            );
            return ExitCode::from(2);
        }
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        // The reader has had enough: nothing to report.
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("{error}");
            ExitCode::FAILURE
        }
    }
}
