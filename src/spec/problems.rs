//! Everything that is wrong with a spec, with its places.

use super::frame;
use super::text::Text;

/// Most problems that are shown at once.
pub(super) const MOST_SHOWN: usize = 50;

/// How many problems of a file of a size are shown. To find a position takes a reading of the whole file, so a file of
/// some hundred kilobytes, which no person writes, gets fewer.
pub(super) fn most_shown(bytes: usize) -> usize {
    (READ_AT_MOST / bytes.max(1)).clamp(5, MOST_SHOWN)
}

/// Bytes that are read in search of positions.
const READ_AT_MOST: usize = 4 << 20;

/// One problem, located.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Located {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// Length of the offending text in characters, at least 1.
    pub length: usize,
    /// Path of keys, such as `experiments[0].risk.power`; empty for the file as a whole.
    pub path: String,
    /// The same place in words, such as ``experiment `warmth`, risk.power``.
    pub place: String,
    /// The offending text as it stands in the file, cut when it is long.
    pub offending: String,
    /// What is wrong, without a full stop.
    pub reason: String,
    /// The way out.
    pub help: Option<String>,
    /// A second place that belongs to the problem.
    pub also: Option<Mark>,
}

/// A second place that belongs to a problem.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Mark {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// Length in characters.
    pub length: usize,
    /// What stands there.
    pub words: String,
}

/// A remark on a spec that is no error.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Note {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// Path of keys.
    pub path: String,
    /// The remark.
    pub words: String,
}

/// All problems of a spec, in the order of the file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SpecProblems {
    name: String,
    text: Text,
    problems: Vec<Located>,
    found: usize,
    all: bool,
}

impl SpecProblems {
    /// The problems of a file; `found` counts those too that are not among them, and `all` says whether there are no more.
    pub(super) fn new(
        name: &str,
        text: Text,
        mut problems: Vec<Located>,
        found: usize,
        all: bool,
    ) -> Self {
        problems.sort_by_key(|p| (p.line, p.column));
        Self { name: name.to_owned(), text, problems, found, all }
    }

    /// The problems, at most 50 (fewer in a very large file), in the order of the file.
    pub fn problems(&self) -> &[Located] {
        &self.problems
    }

    /// A frame with the line of the file for each problem, then their number; safe to print on a terminal.
    pub fn render(&self, colour: bool) -> String {
        let mut shown = String::new();
        for problem in &self.problems {
            shown.push_str(&frame::draw(&self.name, &self.text, problem, colour));
            shown.push('\n');
        }
        shown.push_str(&self.count());
        shown.push('\n');
        shown
    }

    fn count(&self) -> String {
        let name = super::text::printable(&self.name, 200);
        let more = if self.all { "" } else { "at least " };
        match (self.found, self.problems.len()) {
            (1, _) => format!("1 problem in {name}"),
            (found, shown) if found > shown => {
                format!("{shown} of {more}{found} problems in {name}")
            }
            (found, _) => format!("{found} problems in {name}"),
        }
    }
}

impl std::fmt::Display for SpecProblems {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&self.render(false))
    }
}

impl std::error::Error for SpecProblems {}
