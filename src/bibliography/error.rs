//! What can be wrong with a reference file or a citation.

/// A reference file that cannot be used, or a citation of a work that is not in it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct BibliographyError {
    /// Line of the author's reference file, counted from 1, where one is known.
    pub line: Option<usize>,
    /// What is wrong and what to do, lower-case first letter and no full stop.
    pub reason: String,
}

impl BibliographyError {
    /// An error at a line of the author's file.
    pub(super) fn at(line: Option<usize>, reason: impl Into<String>) -> Self {
        Self { line, reason: reason.into() }
    }

    /// An error that belongs to no line.
    pub(super) fn plain(reason: impl Into<String>) -> Self {
        Self::at(None, reason)
    }
}

impl std::fmt::Display for BibliographyError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.line {
            Some(line) => write!(f, "line {line}: {}", self.reason),
            None => f.write_str(&self.reason),
        }
    }
}

impl std::error::Error for BibliographyError {}
