//! An assumption and its grounds: the value never travels without the place it came from.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// What an assumption rests on. An assumption with neither source nor reason is printed as an open point.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct Grounds {
    /// Where the value comes from, in words: the study, the data set, the person.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub source: Option<String>,
    /// Why this value is right for this study.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub why: Option<String>,
    /// Keys of the entries in the author's `references` file (or of the program's own bibliography) that support it.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub cite: Vec<String>,
}

impl Grounds {
    /// Whether nothing at all supports the value.
    pub fn is_open(&self) -> bool {
        self.source.is_none() && self.why.is_none() && self.cite.is_empty()
    }

    /// These grounds, completed by others where they say nothing.
    #[must_use]
    pub fn or(mut self, other: &Self) -> Self {
        self.source = self.source.or_else(|| other.source.clone());
        self.why = self.why.or_else(|| other.why.clone());
        if self.cite.is_empty() {
            self.cite.clone_from(&other.cite);
        }
        self
    }
}

/// A number and its grounds.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Assumption {
    /// The number.
    pub value: f64,
    /// What it rests on.
    pub grounds: Grounds,
    /// Whether the number is the program's default because the author gave none.
    pub defaulted: bool,
}
