//! Wrong specs and the whole text of their problems: `wrong/NAME.yaml` and `wrong/NAME.txt`.
//!
//! With `SUFFICIT_REWRITE=1` in the environment the texts are written anew; read them before they are kept.

use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};

use sufficit::spec::{InputFile, SpecProblems, load};

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/spec/wrong")
}

fn names(extension: &str) -> BTreeSet<String> {
    let entries = fs::read_dir(folder()).expect("the folder of wrong specs");
    let paths = entries.map(|entry| entry.expect("an entry").path()).filter(|path| path.is_file());
    let of_kind = paths.filter(|path| path.extension().is_some_and(|e| e == extension));
    of_kind.map(|path| path.file_stem().expect("a name").to_string_lossy().into_owned()).collect()
}

fn problems(name: &str) -> SpecProblems {
    let path = folder().join(format!("{name}.yaml"));
    let (spec, beside) = InputFile::open_spec(&path).expect("a spec");
    match load(spec, &beside) {
        Ok(_) => panic!("{name}.yaml has no problem"),
        Err(problems) => problems,
    }
}

#[test]
fn every_wrong_spec_says_what_its_text_says() {
    let rewrite = std::env::var_os("SUFFICIT_REWRITE").is_some_and(|value| value == "1");
    let mut differing = Vec::new();
    for name in names("yaml") {
        let said = problems(&name).to_string();
        let path = folder().join(format!("{name}.txt"));
        if rewrite {
            fs::write(&path, &said).expect("the text is written");
        }
        let expected = fs::read_to_string(&path).unwrap_or_default();
        if said != expected {
            differing.push(format!("{name}: expected\n{expected}\nbut it says\n{said}"));
        }
    }
    assert!(differing.is_empty(), "{}", differing.join("\n"));
}

#[test]
fn texts_and_specs_belong_together() {
    assert_eq!(names("yaml"), names("txt"));
    assert!(names("yaml").len() >= 35);
}

#[test]
fn every_file_beside_them_is_used() {
    let specs: String = names("yaml")
        .iter()
        .map(|name| fs::read(folder().join(format!("{name}.yaml"))).expect("a spec"))
        .map(|bytes| String::from_utf8_lossy(&bytes).into_owned())
        .collect();
    for entry in fs::read_dir(folder().join("files")).expect("the folder of files") {
        let name = entry.expect("an entry").file_name().to_string_lossy().into_owned();
        assert!(specs.contains(&format!("files/{name}")), "no spec names files/{name}");
    }
}

/// Sentences of a message start small, end without a full stop, and speak of the study, not of the parser.
#[test]
fn messages_keep_their_style() {
    const PARSER: &[&str] = &[
        "invalid type",
        "expected a",
        "unit value",
        "sequence",
        "map,",
        "f64",
        "u64",
        "i64",
        "usize",
        "variant",
        "untagged",
        "serde",
        "deserial",
        "struct ",
        "scalar",
        "token",
        "null",
        "Some(",
        "EOF",
        "panicked",
    ];
    for name in names("yaml") {
        for problem in problems(&name).problems() {
            let help = problem.help.as_deref().unwrap_or_else(|| panic!("{name}: no way out"));
            for sentence in std::iter::once(problem.reason.as_str()).chain(help.lines()) {
                let first = sentence.chars().next().expect("a sentence");
                let abbreviation = sentence.starts_with("U+");
                let month = sentence.starts_with("February");
                assert!(!first.is_uppercase() || abbreviation || month, "{name}: {sentence}");
                assert!(!sentence.ends_with(['.', ' ', ':', ',']), "{name}: {sentence}");
                assert!(!sentence.contains("  "), "{name}: {sentence}");
                let leak = PARSER.iter().find(|word| sentence.contains(**word));
                assert_eq!(leak, None, "{name}: {sentence}");
            }
        }
    }
}

/// What is said to stand at a place stands there.
#[test]
fn every_position_holds_the_offending_text() {
    for name in names("yaml") {
        let bytes = fs::read(folder().join(format!("{name}.yaml"))).expect("a spec");
        let text = String::from_utf8_lossy(&bytes).replace('\u{FEFF}', "");
        let lines: Vec<&str> = text.lines().collect();
        for problem in problems(&name).problems() {
            let line = lines.get(problem.line - 1).copied().unwrap_or("");
            let there: String =
                line.chars().skip(problem.column - 1).take(problem.length).collect();
            let printable =
                |c: char| if c.is_control() || c == '\u{202E}' { '\u{FFFD}' } else { c };
            let there: String = there.chars().map(printable).collect();
            let offending: String = problem.offending.chars().map(printable).collect();
            let shown = offending.trim_end_matches('…');
            assert!(there.starts_with(shown), "{name}: {there:?} against {:?}", problem.offending);
        }
    }
}
