//! A number that is an assumption: bare, or with its source and reason.

use schemars::JsonSchema;
use serde::Deserialize;

use crate::quantities::{Assumption, Grounds};

/// A number, bare or as a mapping with `value`, `source`, `why` and `cite`.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum Assumed {
    /// The number alone.
    Bare(f64),
    /// The number with what it rests on.
    Told(Told),
}

/// A number with what it rests on.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct Told {
    /// The number.
    pub value: f64,
    /// What it rests on.
    #[serde(flatten)]
    pub grounds: Grounds,
}

impl Assumed {
    /// The number.
    pub fn value(&self) -> f64 {
        match self {
            Self::Bare(value) => *value,
            Self::Told(told) => told.value,
        }
    }

    /// The assumption, completed by the grounds of the mapping that holds it.
    pub fn assumption(&self, around: &Grounds) -> Assumption {
        let own = match self {
            Self::Bare(_) => Grounds::default(),
            Self::Told(told) => told.grounds.clone(),
        };
        Assumption { value: self.value(), grounds: own.or(around), defaulted: false }
    }

    /// The last step to the number itself, for the position of a fault.
    pub fn step(&self) -> &'static str {
        match self {
            Self::Bare(_) => "",
            Self::Told(_) => "value",
        }
    }
}
