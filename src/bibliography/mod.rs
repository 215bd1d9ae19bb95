//! The works that a report cites, and their list in Vancouver style.
//!
//! One bibliography serves every output: the program's own file (`report_templates/bibliography.yaml`,
//! Hayagriva's format) and, beside it, the author's references. Both are cited by key; the numbered list comes
//! from the `hayagriva` crate with the style of the US National Library of Medicine (*Citing Medicine*, 2nd ed.,
//! citation sequence), the base of Vancouver style. Uses no other layer of the crate.

mod author;
mod builtin;
mod error;
mod names;
mod runs;
mod vancouver;

use std::collections::BTreeMap;

use hayagriva::Entry;
use serde::Serialize;

pub use author::MAX_BYTES as MAX_AUTHOR_BYTES;
pub use error::BibliographyError;
pub use runs::Run;

/// The program's own references together with the author's.
///
/// ```
/// use sufficit::bibliography::Bibliography;
///
/// let author = "pilot-2030:\n  type: report\n  title: Pilot on regrowth\n  author: Example, A.\n  date: 2030\n";
/// let bibliography = Bibliography::with_author(Some(author))?;
/// let list = bibliography.vancouver(&["lenth-1989".to_owned(), "pilot-2030".to_owned()])?;
/// assert_eq!(list[1].number, 2);
/// assert_eq!(list[1].text(), "Example A. Pilot on regrowth. 2030.");
/// # Ok::<(), sufficit::bibliography::BibliographyError>(())
/// ```
#[derive(Clone, Debug, Default)]
pub struct Bibliography {
    author: BTreeMap<String, Entry>,
}

/// One line of the reference list.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Reference {
    /// Its number in the text, from 1 in the order of first citation.
    pub number: usize,
    /// The key it is cited by.
    pub key: String,
    /// The text in pieces of one style each; the number is not part of it.
    pub runs: Vec<Run>,
}

impl Reference {
    /// The reference without any styling.
    pub fn text(&self) -> String {
        self.runs.iter().map(|run| run.text.as_str()).collect()
    }
}

impl Bibliography {
    /// The program's references and, if given, those in the author's YAML text.
    ///
    /// # Errors
    ///
    /// [`BibliographyError`] with the line where one is known: text too large, characters that do not belong in
    /// text, a field that references do not have, a key given twice or taken by the program, no title, a link
    /// that is not `http` or `https`, or YAML that cannot be read.
    pub fn with_author(yaml: Option<&str>) -> Result<Self, BibliographyError> {
        let author = match yaml {
            Some(text) => author::read(text)?,
            None => BTreeMap::new(),
        };
        Ok(Self { author })
    }

    /// Whether a work of this key can be cited.
    pub fn contains(&self, key: &str) -> bool {
        self.author.contains_key(key) || builtin::contains(key)
    }

    /// All keys: the program's in the order of its file, then the author's in alphabetical order.
    pub fn keys(&self) -> impl Iterator<Item = &str> {
        builtin::keys().map(|key| -> &str { key }).chain(self.author_keys())
    }

    /// The keys of the author's own references, in alphabetical order.
    pub fn author_keys(&self) -> impl Iterator<Item = &str> {
        self.author.keys().map(String::as_str)
    }

    /// The reference list of the works cited, numbered from 1 in the given order.
    ///
    /// A key given more than once is listed at its first place only.
    ///
    /// # Errors
    ///
    /// [`BibliographyError`] for a key that is in neither file.
    pub fn vancouver(
        &self,
        cited_in_order: &[String],
    ) -> Result<Vec<Reference>, BibliographyError> {
        let mut keys: Vec<&str> = Vec::with_capacity(cited_in_order.len());
        for key in cited_in_order {
            if !self.contains(key) {
                return Err(BibliographyError::plain(format!(
                    "no reference has the key `{key}`; add it to the file named under `references`"
                )));
            }
            if !keys.contains(&key.as_str()) {
                keys.push(key);
            }
        }
        let own = builtin::entries(keys.iter().copied())?;
        let entries: Vec<&Entry> =
            keys.iter().filter_map(|key| self.author.get(*key).or_else(|| own.get(key))).collect();
        vancouver::list(&entries)
    }
}
