//! A fault with its path, before its position in the file is known.

use crate::designs::{Aspect, Fault, Path};

/// What a finding was concluded from; when that had to be repaired, the finding is no finding.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum RestsOn {
    /// The value at its path alone.
    Value,
    /// The value at its path and those at other paths.
    Values(Vec<Path>),
    /// Any value of the same part of its experiment, or of the part `design`.
    Part,
}

/// What is wrong at a path of the file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Finding {
    pub fault: Fault,
    /// Which repetition of the last key is meant.
    pub occurrence: usize,
    pub rests_on: RestsOn,
    /// A second place that belongs to it: its path, aspect and what stands there.
    pub also: Option<(Path, Aspect, &'static str)>,
}

impl From<Fault> for Finding {
    fn from(fault: Fault) -> Self {
        Self { fault, occurrence: 0, rests_on: RestsOn::Value, also: None }
    }
}

impl Finding {
    /// The same finding, concluded from more than the value at its path.
    pub fn resting_on(mut self, rests_on: RestsOn) -> Self {
        self.rests_on = rests_on;
        self
    }

    /// The same finding with a second place.
    pub fn also(mut self, path: Path, aspect: Aspect, words: &'static str) -> Self {
        self.also = Some((path, aspect, words));
        self
    }

    /// The same finding seen from a mapping that holds its paths.
    pub fn below(mut self, parent: &Path) -> Self {
        self.fault = self.fault.below(parent);
        if let RestsOn::Values(paths) = &mut self.rests_on {
            paths.iter_mut().for_each(|path| *path = parent.join(path));
        }
        self
    }

    /// The same finding at a repetition of its key.
    pub fn repeated(mut self, occurrence: usize) -> Self {
        self.occurrence = occurrence;
        self
    }
}
