//! What may be written: the keys that every spec and every experiment share. Their comments are the words of the
//! schema and of an editor's hover text. Fields with an underscore are checked as keys, or read earlier to choose the
//! design; here they only lend their types and comments to the schema.

use schemars::JsonSchema;
use serde::Deserialize;

use crate::quantities::{Grounds, Outcome, Unit};
use crate::study::{FurtherPurpose, Purpose, Safeguards};

/// A study specification: what is planned, in the words of a protocol.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct StudyFile {
    /// Version of this format: 1.
    #[schemars(range(min = 1, max = 1))]
    #[serde(rename = "sufficit")]
    _version: u64,
    /// Title of the study.
    pub title: String,
    /// Authors of the plan, at least one.
    #[schemars(length(min = 1, max = 100))]
    pub authors: Vec<String>,
    /// Date that is printed, as year-month-day (`2031-03-14`); it is never taken from the clock.
    #[schemars(regex(pattern = r"^[0-9]{4}-[0-9]{2}-[0-9]{2}$"))]
    pub date: String,
    /// What the document is for; it selects title, order and wording.
    pub purpose: Purpose,
    /// Language of the document; `en` unless stated.
    #[serde(default)]
    pub language: Option<Language>,
    /// File beside the spec with the author's own sources, in Hayagriva's YAML format.
    #[serde(default)]
    pub references: Option<String>,
    /// Who gave statistical advice.
    #[serde(default)]
    pub advice: Option<String>,
    /// The independent check by simulation.
    #[serde(default)]
    pub simulation: Option<Simulation>,
    /// The experiments; the document totals the units over all of them.
    #[schemars(length(min = 1, max = 200))]
    pub experiments: Vec<CommonExperiment>,
}

/// Languages of the document.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) enum Language {
    /// British English.
    En,
}

impl Language {
    /// The folder of its templates.
    pub fn code(self) -> &'static str {
        match self {
            Self::En => "en",
        }
    }
}

/// The independent check by simulation.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct Simulation {
    /// How many studies are simulated: 1000 to 10000000, or 0 for none; 100000 unless stated.
    #[schemars(range(min = 0, max = 10_000_000))]
    pub replicates: u64,
}

/// One experiment: one question, answered by one outcome in one design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct CommonExperiment {
    /// Short name, unique in the file: letters, digits and hyphens.
    #[schemars(length(min = 1, max = 40), regex(pattern = r"^[A-Za-z0-9][A-Za-z0-9-]*$"))]
    pub id: String,
    /// The question that the experiment answers.
    pub question: String,
    /// The experimental unit: the smallest entity that is independently allocated to a treatment.
    pub unit: Unit,
    /// The primary outcome.
    pub outcome: Outcome,
    /// The structure of the experiment and what belongs to it.
    #[serde(rename = "design")]
    _design: DesignKeys,
    /// What the experiment is to achieve.
    #[serde(rename = "aim")]
    _aim: String,
    /// The analysis; the usual one for structure, outcome and aim unless stated.
    #[serde(default, rename = "analysis")]
    _analysis: Option<String>,
    /// Share of units that will be lost before the analysis, a bare number or with what it rests on.
    #[serde(default)]
    pub losses: Option<LossesKeys>,
    /// Most units that can be had; give `per-group` or `total`.
    #[serde(default)]
    pub ceiling: Option<CeilingKeys>,
    /// Units beyond the groups of the experiment, each with its reason.
    #[serde(default)]
    pub further_units: Vec<FurtherUnitsKeys>,
    /// Safeguards against bias.
    #[serde(default)]
    pub safeguards: Safeguards,
}

/// The structure of an experiment.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct DesignKeys {
    /// The structure of the experiment.
    #[serde(rename = "structure")]
    _structure: String,
}

/// Share of units that will be lost.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(untagged)]
pub(super) enum LossesKeys {
    /// The fraction alone.
    Bare(f64),
    /// The fraction with what it rests on.
    Told(LossesTold),
}

/// Share of units that will be lost, with what it rests on.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct LossesTold {
    /// The fraction lost, the same in every group: 0.1 for ten in a hundred.
    pub fraction: f64,
    /// What it rests on.
    #[serde(flatten)]
    pub grounds: Grounds,
}

/// Most units that can be had, counted before losses.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct CeilingKeys {
    /// Most units in each group.
    #[serde(default)]
    #[schemars(range(min = 1, max = 1_000_000_000))]
    pub per_group: Option<u64>,
    /// Most units in all groups together.
    #[serde(default)]
    #[schemars(range(min = 1, max = 1_000_000_000))]
    pub total: Option<u64>,
    /// What it rests on.
    #[serde(flatten)]
    pub grounds: Grounds,
}

/// Units that are needed beyond the groups.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) struct FurtherUnitsKeys {
    /// What they are for.
    pub purpose: FurtherPurpose,
    /// How many.
    #[schemars(range(min = 1, max = 1_000_000_000))]
    pub count: u64,
    /// Whether `count` counts experimental units or the individuals that a unit holds; `units` unless stated.
    #[serde(default)]
    pub count_of: Option<CountOf>,
    /// Why they are needed.
    pub why: String,
}

/// What a count counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub(super) enum CountOf {
    /// Experimental units.
    Units,
    /// The individuals that an experimental unit holds.
    Individuals,
}
