//! Running the program and the tools that look at its output.

use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

#[path = "../shared/tools.rs"]
mod tools;

/// The program, ready to be given arguments.
pub fn sufficit() -> Command {
    Command::new(env!("CARGO_BIN_EXE_sufficit"))
}

/// A path below the repository.
pub fn repository(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// A folder that vanishes.
pub fn folder() -> tempfile::TempDir {
    tempfile::tempdir().expect("a temporary folder can be made")
}

/// Runs a command and returns its output, whatever its exit code.
pub fn run(command: &mut Command) -> Output {
    command.stdin(Stdio::null()).output().unwrap_or_else(|e| panic!("{command:?}: {e}"))
}

/// Runs a command that must succeed; its standard output.
pub fn succeed(command: &mut Command) -> String {
    let output = run(command);
    assert!(output.status.success(), "{command:?}\n{}", text(&output.stderr));
    text(&output.stdout)
}

/// Runs a command that must fail with an exit code; its standard error.
pub fn fail(command: &mut Command, code: i32) -> String {
    let output = run(command);
    let stderr = text(&output.stderr);
    assert_eq!(output.status.code(), Some(code), "{command:?}\n{}\n{stderr}", text(&output.stdout));
    stderr
}

/// Bytes as text.
pub fn text(bytes: &[u8]) -> String {
    String::from_utf8_lossy(bytes).into_owned()
}

/// A program of the machine that looks at our output, where it is there.
pub fn tool(name: &str) -> Option<Command> {
    tools::available(name).then(|| Command::new(name))
}

/// All shipped specs.
pub fn examples() -> Vec<PathBuf> {
    let mut found = vec![repository("examples/two-experiments/study.yaml")];
    for entry in std::fs::read_dir(repository("examples")).expect("the folder exists") {
        let path = entry.expect("readable").path();
        if path.extension().is_some_and(|e| e == "yaml") {
            found.push(path);
        }
    }
    found.sort();
    assert!(found.len() >= 4);
    found
}

/// A small valid spec whose parts can be replaced.
pub fn small_spec() -> String {
    "sufficit: 1\n\
     title: A small study\n\
     authors: [A. Example]\n\
     date: 2031-01-02\n\
     purpose: grant\n\
     experiments:\n\
     \x20 - id: one\n\
     \x20   question: Does it differ?\n\
     \x20   unit: {name: plot, plural: plots, kind: plot}\n\
     \x20   outcome: {name: yield, unit: kg, scale: continuous}\n\
     \x20   design: {structure: parallel-groups, groups: [a, b]}\n\
     \x20   aim: detect-difference\n\
     \x20   effect: {difference: 0.5}\n\
     \x20   spread: 0.39\n\
     \x20   risk: {alpha: 0.05, sides: two, power: 0.8}\n"
        .to_owned()
}

/// Writes a spec into a folder and returns its path.
pub fn write(folder: &Path, name: &str, content: &str) -> PathBuf {
    let path = folder.join(name);
    std::fs::write(&path, content).expect("the file can be written");
    path
}
