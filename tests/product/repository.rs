//! Promises that the repository makes about itself.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use sufficit::designs::REGISTRY;

use crate::support::{folder, repository, run, succeed, sufficit, text};

/// Which room may use which; a room may always use itself.
fn rooms() -> BTreeMap<&'static str, Vec<&'static str>> {
    let mut rooms = BTreeMap::new();
    rooms.insert("numerics", vec![]);
    rooms.insert("bibliography", vec![]);
    rooms.insert("quantities", vec!["numerics"]);
    rooms.insert("designs", vec!["numerics", "quantities"]);
    rooms.insert("study", vec!["quantities", "designs"]);
    rooms.insert("plan", vec!["quantities", "designs", "study"]);
    rooms.insert("spec", vec!["quantities", "designs", "study", "bibliography"]);
    rooms.insert("solver", vec!["numerics", "quantities", "designs", "study", "plan"]);
    rooms.insert("report", vec!["quantities", "designs", "study", "plan"]);
    rooms.insert("render", vec!["plan", "bibliography", "report"]);
    rooms.insert("record", vec!["spec", "plan", "solver", "report", "render", "error"]);
    rooms.insert("cli", vec!["spec", "solver", "render", "record", "error"]);
    rooms
}

fn rust_files(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    let mut folders = vec![folder.to_path_buf()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("readable") {
            let path = entry.expect("readable").path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "rs") {
                found.push(path);
            }
        }
    }
    found.sort();
    found
}

/// Names of rooms that a source mentions after `crate::`, nested lists included, its tests left out.
fn mentioned(source: &str) -> Vec<String> {
    let source = source.split("#[cfg(test)]").next().unwrap_or_default();
    let code: String = source
        .lines()
        .filter(|line| !line.trim_start().starts_with("//"))
        .collect::<Vec<_>>()
        .join("\n");
    let mut found = Vec::new();
    for rest in code.split("crate::").skip(1) {
        let names: Vec<&str> = match rest.strip_prefix('{') {
            Some(list) => list.split('}').next().unwrap_or_default().split(',').collect(),
            None => vec![rest],
        };
        for name in names {
            let name: String = name
                .trim()
                .chars()
                .take_while(|c| c.is_ascii_alphanumeric() || *c == '_')
                .collect();
            found.push(name);
        }
    }
    found
}

#[test]
fn every_room_has_its_rule() {
    for entry in std::fs::read_dir(repository("src")).expect("readable") {
        let path = entry.expect("readable").path();
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        assert!(path.is_file() || rooms().contains_key(name.as_str()), "{name} has no rule");
    }
}

#[test]
fn dependencies_point_one_way() {
    for (room, allowed) in rooms() {
        let files = rust_files(&repository("src").join(room));
        assert!(!files.is_empty(), "{room} is empty");
        for file in files {
            let source = std::fs::read_to_string(&file).expect("readable");
            for name in mentioned(&source) {
                let own = name == room || name == "Error" || name.is_empty();
                assert!(
                    own || allowed.contains(&name.as_str()),
                    "{} uses `{name}`, which {room} may not",
                    file.display()
                );
            }
        }
    }
}

#[test]
fn the_check_of_dependencies_can_fail() {
    assert_eq!(
        mentioned("use crate::{plan::Plan, cli};\nfn f() { crate::spec::load(); }"),
        ["plan", "cli", "spec"]
    );
}

#[test]
fn the_schema_in_the_repository_is_current() {
    let file = repository("sufficit.schema.json");
    let made = succeed(sufficit().arg("schema"));
    if std::env::var("SUFFICIT_REWRITE").is_ok_and(|v| v == "1") {
        std::fs::write(&file, &made).expect("written");
    }
    let kept = std::fs::read_to_string(file).expect("readable");
    assert!(
        kept == made,
        "sufficit.schema.json is out of date: run `sufficit schema > sufficit.schema.json`"
    );
}

#[test]
fn every_design_has_its_fragment_and_its_sources() {
    let bibliography = sufficit::bibliography::Bibliography::with_author(None).expect("sound");
    for design in REGISTRY {
        let card = design.card();
        let fragment = repository("report_templates/en/designs").join(format!("{}.j2", card.id));
        let source = std::fs::read_to_string(&fragment);
        let source = source.unwrap_or_else(|_| panic!("{} is missing", fragment.display()));
        for part in
            ["statement", "design", "calculation", "why_they_differ", "lever", "assumptions"]
        {
            assert!(source.contains(&format!("macro {part}(")), "{}: no `{part}`", card.id);
        }
        for key in card.sources {
            assert!(bibliography.contains(key), "{}: `{key}` is not in the bibliography", card.id);
        }
    }
}

/// Prose is shared by all faces, so outside of tags it may hold nothing that any face reads as markup.
#[test]
fn prose_holds_no_markup() {
    let mut folders = vec![repository("report_templates/en")];
    let mut looked_at = 0;
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("readable") {
            let path = entry.expect("readable").path();
            if path.is_dir() {
                folders.push(path);
                continue;
            }
            let source = std::fs::read_to_string(&path).expect("readable");
            let prose = without_tags(&without_formulas(&source));
            // Labels and the terminal's summary are plain text, never typeset.
            let name = path.file_name().expect("a name").to_string_lossy().into_owned();
            if !matches!(name.as_str(), "summary.j2" | "figures.j2") {
                let wrong = prose.chars().find(|c| "#*_$@<>~`\\[]{}|^&\"".contains(*c));
                assert!(wrong.is_none(), "{}: {wrong:?} in prose", path.display());
            }
            looked_at += 1;
        }
    }
    assert!(looked_at > 15);
}

/// Formulas are written twice, once for each face, in blocks named `typst` and `tex`.
fn without_formulas(source: &str) -> String {
    let mut rest = source.to_owned();
    for name in ["typst", "tex"] {
        let open = format!("{{% set {name} %}}");
        while let Some(start) = rest.find(&open) {
            let end = rest[start..].find("{% endset %}").expect("the block ends") + start;
            rest.replace_range(start..end, "");
        }
    }
    rest
}

fn without_tags(source: &str) -> String {
    let mut prose = String::new();
    let mut rest = source;
    while let Some(start) = rest.find('{') {
        prose.push_str(&rest[..start]);
        let close = match rest[start..].get(..2) {
            Some("{{") => "}}",
            Some("{%") => "%}",
            Some("{#") => "#}",
            _ => panic!("a lone brace: {}", &rest[start..rest.len().min(start + 40)]),
        };
        // A dictionary inside a tag may close with braces of its own.
        let end = rest[start..].find(close).expect("the tag ends");
        rest = &rest[start + end + 2..];
    }
    prose + rest
}

/// The commands of the README, one line each from its `console` blocks, run as they stand, with the built program in
/// place of `cargo run`.
#[test]
fn every_command_of_the_readme_works() {
    let readme = std::fs::read_to_string(repository("README.md")).expect("readable");
    let place = folder();
    copy(&repository("examples"), &place.path().join("examples"));
    let mut ran = 0;
    for block in readme.split("```console\n").skip(1) {
        for line in block.split("```").next().unwrap_or_default().lines() {
            let line = line.trim_start_matches("$ ").trim();
            let command = if let Some(rest) = line.strip_prefix("cargo run --release -- ") {
                rest
            } else if let Some(rest) = line.strip_prefix("sufficit ") {
                rest
            } else {
                let known = ["cargo test", "cargo install --path ."];
                assert!(known.contains(&line), "`{line}` is run by no test");
                continue;
            };
            let words: Vec<&str> = command.split_whitespace().collect();
            let (arguments, target) = match words.iter().position(|w| *w == ">") {
                Some(at) => (&words[..at], words.get(at + 1)),
                None => (&words[..], None),
            };
            let output = run(sufficit().args(arguments).current_dir(place.path()));
            assert!(output.status.success(), "{line}: {}", text(&output.stderr));
            if let Some(target) = target {
                std::fs::write(place.path().join(target), &output.stdout).expect("written");
            }
            ran += 1;
        }
    }
    assert!(ran >= 5, "only {ran} commands were found");
}

fn copy(from: &Path, to: &Path) {
    std::fs::create_dir_all(to).expect("made");
    for entry in std::fs::read_dir(from).expect("readable") {
        let path = entry.expect("readable").path();
        let target = to.join(path.file_name().expect("a name"));
        if path.is_dir() {
            copy(&path, &target);
        } else {
            std::fs::copy(&path, &target).expect("copied");
        }
    }
}
