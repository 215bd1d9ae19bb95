//! Colour: only on a terminal, never when `NO_COLOR` is set.

use std::io::IsTerminal;

fn allowed() -> bool {
    let silenced = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
    let dumb = std::env::var_os("TERM").is_some_and(|term| term == "dumb");
    !silenced && !dumb
}

pub(super) fn errors_in_colour() -> bool {
    allowed() && std::io::stderr().is_terminal()
}

pub(super) fn output_in_colour() -> bool {
    allowed() && std::io::stdout().is_terminal()
}

pub(super) fn error_word() -> &'static str {
    if errors_in_colour() { "\x1b[1;31merror:\x1b[0m" } else { "error:" }
}

/// Text whose lines that begin with `# ` are headings.
pub(super) fn headed(text: &str, colour: bool) -> String {
    let mut out = String::with_capacity(text.len());
    for line in text.lines() {
        match line.strip_prefix("# ") {
            Some(heading) if colour => out.push_str(&format!("\x1b[1;36m{heading}\x1b[0m")),
            Some(heading) => out.push_str(heading),
            None => out.push_str(line),
        }
        out.push('\n');
    }
    out
}
