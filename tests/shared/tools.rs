//! Programs of the machine that look at our output.

use std::process::Command;

/// Whether a program is there. Where it is missing the check is left out with a message, unless
/// SUFFICIT_TOOLS=required, as it is in `.ci/run`.
pub fn available(name: &str) -> bool {
    let there = Command::new(name).arg("--version").output().is_ok();
    if !there {
        let required = std::env::var("SUFFICIT_TOOLS").is_ok_and(|v| v == "required");
        assert!(!required, "{name} is not installed");
        eprintln!("left out: {name} is not installed");
    }
    there
}
