//! What is studied, in the author's words: the experimental unit and the outcome.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// The kind of thing an experimental unit is; it selects cautions and wording.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Kind {
    /// A living animal.
    Animal,
    /// A human participant.
    Participant,
    /// A sample of material.
    Sample,
    /// A plot of land, or another place.
    Plot,
    /// A group that is allocated as one: a cage, a litter, a ward, a school.
    Group,
    /// Anything else.
    Other,
}

/// The experimental unit: the smallest entity that is independently allocated to a treatment.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct Unit {
    /// One of them, in the author's words (`cage`).
    pub name: String,
    /// Several of them (`cages`).
    pub plural: String,
    /// What kind of thing it is.
    pub kind: Kind,
    /// Who lives in it, where one unit holds several animals or participants.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub holds: Option<UnitHolds>,
}

/// The animals or participants that one experimental unit holds.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct UnitHolds {
    /// One of them (`mouse`).
    pub name: String,
    /// Several of them (`mice`).
    pub plural: String,
    /// What kind of thing it is.
    pub kind: Kind,
    /// How many of them one unit holds.
    #[schemars(range(min = 1, max = 1_000_000))]
    pub each: u64,
}

/// The scale on which the outcome is measured.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Scale {
    /// A measurement on a continuous scale.
    Continuous,
}

/// The primary outcome.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct Outcome {
    /// What is measured, and when (`blastema area on day 14`).
    pub name: String,
    /// The unit of measurement (`mm²`); leave out for a pure number.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub unit: Option<String>,
    /// The scale of measurement.
    pub scale: Scale,
}
