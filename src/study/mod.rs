//! The checked study: what the spec says, with every number legal and every design chosen. Knows no YAML and no files.

use serde::Serialize;

use crate::designs::{Problem, StudyDesign};
use crate::quantities::{Grounds, Losses, Outcome, Unit};

/// What the document is for; it selects title, order and wording.
#[derive(
    Debug, Clone, Copy, PartialEq, Eq, Serialize, serde::Deserialize, schemars::JsonSchema,
)]
#[serde(rename_all = "kebab-case")]
pub enum Purpose {
    /// An appendix to a grant application.
    Grant,
    /// A formal statement for a committee on animal experiments.
    AnimalEthics,
    /// A formal statement for a research ethics committee.
    HumanEthics,
    /// A record for the laboratory.
    Record,
}

/// A whole study.
#[derive(Debug)]
pub struct Study {
    /// Title in the author's words.
    pub title: String,
    /// Authors.
    pub authors: Vec<String>,
    /// The date printed, as year, month, day.
    pub date: Date,
    /// What the document is for.
    pub purpose: Purpose,
    /// Language of the report (a folder of the templates).
    pub language: String,
    /// Who gave statistical advice.
    pub advice: Option<String>,
    /// How many studies the independent check simulates.
    pub replicates: u64,
    /// The experiments in the author's order.
    pub experiments: Vec<Experiment>,
}

/// A calendar day.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub struct Date {
    /// Year.
    pub year: u16,
    /// Month, 1 to 12.
    pub month: u8,
    /// Day, 1 to 31.
    pub day: u8,
}

/// One experiment.
#[derive(Debug)]
pub struct Experiment {
    /// Short name, unique in the file.
    pub id: String,
    /// The question it answers.
    pub question: String,
    /// The experimental unit.
    pub unit: Unit,
    /// The primary outcome.
    pub outcome: Outcome,
    /// The design that was chosen.
    pub design: &'static dyn StudyDesign,
    /// Whether the analysis was chosen by the program because the author named none.
    pub analysis_defaulted: bool,
    /// The design with its numbers.
    pub problem: Box<dyn Problem>,
    /// Units lost on the way.
    pub losses: Losses,
    /// Most units that can be had.
    pub ceiling: Option<Ceiling>,
    /// Units beyond the groups.
    pub further_units: Vec<FurtherUnits>,
    /// Safeguards against bias.
    pub safeguards: Safeguards,
}

impl std::fmt::Debug for &'static dyn StudyDesign {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.card().id)
    }
}

/// Most units that can be had, counted before losses.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Ceiling {
    /// The number.
    pub limit: CeilingLimit,
    /// What it rests on.
    pub grounds: Grounds,
}

/// What a ceiling counts.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum CeilingLimit {
    /// Units in each group.
    PerGroup(u64),
    /// Units in all groups together.
    Total(u64),
}

/// Units that are needed beyond the groups of the experiment.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct FurtherUnits {
    /// What they are for.
    pub purpose: FurtherPurpose,
    /// How many.
    pub count: u64,
    /// Whether `count` counts the individuals that a unit holds, not the units.
    pub individuals: bool,
    /// Why they are needed.
    pub why: String,
}

/// What further units are for.
#[derive(
    Debug, Clone, Copy, PartialEq, Eq, Serialize, serde::Deserialize, schemars::JsonSchema,
)]
#[serde(rename_all = "kebab-case")]
pub enum FurtherPurpose {
    /// Training of staff, or of the animals.
    Training,
    /// Breeding stock, or animals of the wrong genotype or sex.
    Breeding,
    /// Satellite groups, for example for kinetics.
    Satellite,
    /// Spare units.
    Spare,
    /// A pilot that belongs to the same application.
    Pilot,
    /// Anything else, explained by the reason.
    Other,
}

/// Safeguards against bias, each in the author's words; what is missing is printed as an open point.
#[derive(
    Debug, Clone, Default, PartialEq, Eq, Serialize, serde::Deserialize, schemars::JsonSchema,
)]
#[serde(rename_all = "kebab-case")]
pub struct Safeguards {
    /// How units are allocated to the groups at random.
    #[serde(default)]
    pub randomisation: Option<String>,
    /// Who does not know the allocation, at which stage.
    #[serde(default)]
    pub blinding: Option<String>,
    /// Which units will be left out of the analysis, set beforehand.
    #[serde(default)]
    pub exclusions: Option<String>,
    /// What is done about missing values.
    #[serde(default)]
    pub missing_data: Option<String>,
    /// When collection stops, if not at the planned number.
    #[serde(default)]
    pub stopping: Option<String>,
}
