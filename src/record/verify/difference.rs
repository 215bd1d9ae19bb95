//! Where a Markdown and its figures differ from what is rendered again, in words that are safe to print on a terminal.

use std::path::{Component, Path};

use super::Beside;
use crate::spec::printable;

/// Characters of a line that are shown before the place where it differs, and in all.
const SHOWN_BEFORE: usize = 24;
const SHOWN: usize = 72;

/// What a Markdown differs in from what it should be; `None` when every byte agrees.
pub(super) fn of_markdown(document: &str, again: &str) -> Option<String> {
    if document == again {
        return None;
    }
    if !document.contains("\r\n") {
        return Some(first_line(document, again));
    }
    let unix = document.replace("\r\n", "\n");
    Some(if unix == again {
        "the line ends were changed; every other byte agrees".to_owned()
    } else {
        format!("the line ends were changed, and {}", first_line(&unix, again))
    })
}

/// The number of the first line that differs, with both of its versions.
fn first_line(document: &str, again: &str) -> String {
    let mut here = document.split('\n');
    let mut there = again.split('\n');
    let mut number = 1;
    loop {
        let (given, made) = (here.next(), there.next());
        if given == made && given.is_some() {
            number += 1;
            continue;
        }
        let (one, other) = (given.unwrap_or(""), made.unwrap_or(""));
        let same = one.chars().zip(other.chars()).take_while(|(a, b)| a == b).count();
        let shown = |line: Option<&str>| line.map_or("(it has ended)".into(), |l| excerpt(l, same));
        return format!(
            "it differs from line {number}, column {} on\nthe document  {}\nmade again    {}",
            same + 1,
            shown(given),
            shown(made)
        );
    }
}

/// The part of a line around a character.
fn excerpt(line: &str, around: usize) -> String {
    let start = around.saturating_sub(SHOWN_BEFORE);
    let rest: String = line.chars().skip(start).collect();
    let part = printable(&rest, SHOWN);
    if start > 0 { format!("…{part}") } else { part }
}

/// What is wrong with the files of the figures; nothing when every byte of each agrees.
///
/// Only files that the fresh rendering names are looked at, and only in a folder directly beside the document.
pub(super) fn of_figures(
    folder: &str,
    made: &[(String, Vec<u8>)],
    beside: &Beside<'_>,
) -> Vec<String> {
    if !is_plain(folder) {
        return vec![format!("`{folder}` is no name of a folder beside the document")];
    }
    made.iter().filter_map(|(path, bytes)| of_figure(path, bytes, beside)).collect()
}

fn of_figure(path: &str, made: &[u8], beside: &Beside<'_>) -> Option<String> {
    match beside(path) {
        Ok(found) if found == made => None,
        Ok(found) if without_returns(&found) == made => {
            Some(format!("the line ends of {path} were changed"))
        }
        Ok(_) => Some(format!("{path} was altered")),
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => {
            Some(format!("{path} is missing"))
        }
        Err(error) => Some(format!("{path} cannot be read ({error})")),
    }
}

fn without_returns(bytes: &[u8]) -> Vec<u8> {
    let next = bytes.iter().skip(1).map(Some).chain([None]);
    let kept =
        bytes.iter().zip(next).filter(|(byte, next)| **byte != b'\r' || *next != Some(&b'\n'));
    kept.map(|(byte, _)| *byte).collect()
}

/// Whether a name is a single step down, on this system, so that nothing elsewhere is read.
fn is_plain(folder: &str) -> bool {
    let mut steps = Path::new(folder).components();
    let first = steps.next();
    matches!(first, Some(Component::Normal(name)) if name == folder) && steps.next().is_none()
}

#[cfg(test)]
mod tests {
    use std::io::{Error, ErrorKind};

    use super::*;

    #[test]
    fn the_first_differing_line_is_shown_with_both_versions() {
        assert_eq!(of_markdown("a\nb\n", "a\nb\n"), None);
        let said = of_markdown("a\nbat\nc\n", "a\nbar\nd\n");
        let expected = "it differs from line 2, column 3 on\nthe document  bat\nmade again    bar";
        assert_eq!(said.as_deref(), Some(expected));
        let said = of_markdown("a\n", "a\nb\n").unwrap_or_default();
        assert!(said.contains("line 2, column 1") && said.ends_with("made again    b"), "{said}");
        let said = of_markdown("a", "a\n").unwrap_or_default();
        assert!(said.contains("line 2") && said.contains("(it has ended)"), "{said}");
    }

    #[test]
    fn long_lines_are_cut_and_control_characters_are_not_printed() {
        let long = "x".repeat(500);
        let said = of_markdown(&format!("{long}\u{1b}[31m{long}"), &format!("{long}y{long}"));
        let said = said.unwrap_or_default();
        assert!(said.contains("column 501") && !said.contains('\u{1b}'), "{said}");
        assert!(said.lines().all(|line| line.chars().count() < 90), "{said}");
        assert!(said.contains("…xxx") && said.contains("xy"), "{said}");
    }

    #[test]
    fn changed_line_ends_are_told_from_other_changes() {
        let said = of_markdown("a\r\nb\r\n", "a\nb\n").unwrap_or_default();
        assert_eq!(said, "the line ends were changed; every other byte agrees");
        let said = of_markdown("a\r\nb\n", "a\nc\n").unwrap_or_default();
        assert!(
            said.starts_with("the line ends were changed, and it differs from line 2"),
            "{said}"
        );
    }

    #[test]
    fn figures_are_looked_for_directly_beside_the_document() {
        let made = vec![("f/1.svg".to_owned(), b"<a>\n".to_vec()), ("f/2.svg".into(), b"b".into())];
        let find = |path: &str| match path {
            "f/1.svg" => Ok(b"<a>\r\n".to_vec()),
            _ => Err(Error::from(ErrorKind::NotFound)),
        };
        let wrong = of_figures("f", &made, &find);
        assert_eq!(wrong, ["the line ends of f/1.svg were changed", "f/2.svg is missing"]);
        let panics = |path: &str| panic!("{path} is read");
        for folder in ["..", ".", "", "/etc", "a/b", "../f", "f/"] {
            assert_eq!(of_figures(folder, &made, &panics).len(), 1, "{folder}");
        }
    }
}
