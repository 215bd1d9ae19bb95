//! The program's own bibliography: an index of its text, parsed only where it is cited.

use std::ops::Range;
use std::sync::OnceLock;

use hayagriva::{Library, io};

use super::{BibliographyError, names};

/// The file in Hayagriva's format; every line without indentation opens an entry or is a comment.
const TEXT: &str = include_str!("../../report_templates/bibliography.yaml");

/// Where each entry stands in [`TEXT`].
struct Index {
    entries: Vec<(&'static str, Range<usize>)>,
}

/// The index, made once: reading the whole file as YAML would take longer than a report's reference list.
fn index() -> &'static Index {
    static INDEX: OnceLock<Index> = OnceLock::new();
    INDEX.get_or_init(|| {
        let mut entries: Vec<(&'static str, Range<usize>)> = Vec::new();
        let mut start = 0;
        for line in TEXT.split_inclusive('\n') {
            let end = start + line.len();
            match line.chars().next() {
                Some('#' | '\n') | None => {}
                Some(' ') => {
                    if let Some((_, range)) = entries.last_mut() {
                        range.end = end;
                    }
                }
                Some(_) => {
                    let key = line.split(':').next().unwrap_or_default();
                    entries.push((key, start..end));
                }
            }
            start = end;
        }
        Index { entries }
    })
}

/// Whether the program has a reference of this key.
pub(super) fn contains(key: &str) -> bool {
    keys().any(|own| own == key)
}

/// The program's keys in the order of its file.
pub(super) fn keys() -> impl Iterator<Item = &'static str> {
    index().entries.iter().map(|(key, _)| *key)
}

/// The entries of those keys that are the program's own.
pub(super) fn entries<'a>(
    wanted: impl Iterator<Item = &'a str>,
) -> Result<Library, BibliographyError> {
    let mut text = String::new();
    for key in wanted {
        let found = index().entries.iter().find(|(own, _)| *own == key);
        if let Some(block) = found.and_then(|(_, range)| TEXT.get(range.clone())) {
            text.push_str(block);
        }
    }
    if text.is_empty() {
        return Ok(Library::new());
    }
    let library = io::from_yaml_str(&text).map_err(|error| {
        BibliographyError::plain(format!("the program's own bibliography is damaged: {error}"))
    })?;
    Ok(library
        .into_iter()
        .map(|mut entry| {
            names::join_particles(&mut entry);
            entry
        })
        .collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_index_agrees_with_a_full_reading_of_the_file() -> Result<(), Box<dyn std::error::Error>>
    {
        let whole = io::from_yaml_str(TEXT)?;
        let full: Vec<&str> = whole.keys().collect();
        let indexed: Vec<&str> = keys().collect();
        assert_eq!(full, indexed);
        for (part, entry) in entries(keys())?.iter().zip(&whole) {
            assert_eq!(part.title(), entry.title());
            assert_eq!(part.serial_number(), entry.serial_number());
        }
        Ok(())
    }

    #[test]
    fn no_key_of_the_file_stands_twice() {
        let mut sorted: Vec<&str> = keys().collect();
        let count = sorted.len();
        sorted.sort_unstable();
        sorted.dedup();
        assert_eq!(sorted.len(), count);
    }

    #[test]
    fn every_entry_has_author_title_and_date() -> Result<(), Box<dyn std::error::Error>> {
        for entry in &io::from_yaml_str(TEXT)? {
            assert!(entry.title().is_some(), "{} has no title", entry.key());
            assert!(entry.authors().is_some(), "{} has no author", entry.key());
            assert!(entry.date().is_some(), "{} has no date", entry.key());
        }
        Ok(())
    }
}
