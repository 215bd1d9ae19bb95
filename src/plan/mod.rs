//! The plan: the solved study, all numbers, no prose. It is what the solver returns, what a report is made of and what
//! `.json` holds. Fields are additive between versions of the program; [`FORMAT`] changes when one is renamed or dropped.

use serde::Serialize;

use crate::designs::inputs::Spread;
use crate::designs::{Card, Effect, Facts, Group, Point, Sizes, Textbook};
use crate::quantities::{Losses, Outcome, Risk, Unit};
use crate::study::{Ceiling, Date, FurtherUnits, Purpose, Safeguards};

/// Version of the plan's own format.
pub const FORMAT: u32 = 1;

/// A solved study.
#[derive(Debug, Serialize)]
pub struct Plan {
    /// Version of this format.
    pub plan_format: u32,
    /// Version of the program that solved it.
    pub program_version: &'static str,
    /// Hashes of the inputs.
    pub fingerprints: Fingerprints,
    /// Title.
    pub title: String,
    /// Authors.
    pub authors: Vec<String>,
    /// Date of the plan, from the spec.
    pub date: Date,
    /// What the document is for.
    pub purpose: Purpose,
    /// Language of the report.
    pub language: String,
    /// Who gave statistical advice.
    pub advice: Option<String>,
    /// The experiments in the author's order.
    pub experiments: Vec<ExperimentPlan>,
    /// Sums over the experiments, one row for each kind of unit or individual.
    pub totals: Vec<Total>,
}

/// Hashes of everything that was read.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Fingerprints {
    /// The spec.
    pub spec: Fingerprint,
    /// Data and reference files, by name.
    pub files: Vec<Fingerprint>,
}

/// Hash of one input.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Fingerprint {
    /// Name of the file.
    pub name: String,
    /// SHA-256 of its raw bytes, in hexadecimal digits.
    pub sha256: String,
}

/// A solved experiment.
#[derive(Debug, Serialize)]
pub struct ExperimentPlan {
    /// Short name.
    pub id: String,
    /// The question.
    pub question: String,
    /// The experimental unit.
    pub unit: Unit,
    /// The outcome.
    pub outcome: Outcome,
    /// The design.
    pub design: Card,
    /// Whether the program chose the analysis.
    pub analysis_defaulted: bool,
    /// The groups.
    pub groups: Vec<Group>,
    /// Error rates.
    pub risk: Risk,
    /// The wanted effect.
    pub effect: Effect,
    /// The nuisance value and its evidence, where the design has one.
    pub spread: Option<Spread>,
    /// The planned point.
    pub planned: Point,
    /// What the design's own fragments print.
    pub analysis: Facts,
    /// The textbook formula; absent when its result is beyond the largest size.
    pub textbook: Option<Textbook>,
    /// The exact answer: the smallest sizes that reach the target.
    pub exact: Exact,
    /// Units to ask for.
    pub request: Request,
    /// Losses.
    pub losses: Losses,
    /// The size for the other of two stated effects.
    pub other_effect: Option<OtherEffect>,
    /// What can be done with the units that can be had.
    pub ceiling: Option<CeilingPlan>,
    /// How firm the number is.
    pub firmness: Firmness,
    /// What smaller studies can do.
    pub smaller: Vec<Smaller>,
    /// What other methods give.
    pub rivals: Vec<RivalPlan>,
    /// What would lower the number.
    pub levers: Vec<LeverPlan>,
    /// The independent check, or why there is none.
    pub check: CheckOutcome,
    /// Safeguards against bias.
    pub safeguards: Safeguards,
}

/// Sizes that reach the target, with their proof.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Exact {
    /// Sizes in the analysis.
    pub sizes: Sizes,
    /// Power at these sizes.
    pub power: f64,
    /// Power with the step lowered by one; absent when it is already the smallest possible.
    pub power_one_fewer: Option<f64>,
    /// The effect detectable with these sizes at the wanted power.
    pub detectable: f64,
    /// What the textbook formula takes the power to be at these sizes.
    pub textbook_power: f64,
    /// Exact power at the sizes of the textbook formula.
    pub power_at_textbook: Option<f64>,
}

/// Units to ask for, after losses and with further units.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Request {
    /// Units in each group at the start.
    pub per_group: Vec<u64>,
    /// Their sum.
    pub groups_total: u64,
    /// Further units, as the author lists them.
    pub further: Vec<FurtherUnits>,
    /// Units beyond the groups.
    pub further_units: u64,
    /// Individuals beyond the groups that are counted one by one, not by the unit.
    pub further_individuals: u64,
    /// Individuals that the units in the groups hold; absent when a unit is one of them.
    pub held_in_groups: Option<u64>,
    /// All units.
    pub units: u64,
    /// All animals, participants or other individuals that the units hold; absent when a unit is one of them.
    pub individuals: Option<u64>,
}

/// The size for the other of two stated effects.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OtherEffect {
    /// Sizes that reach the target for it; absent when out of reach.
    pub sizes: Option<Sizes>,
    /// Power for it at the chosen sizes.
    pub power: f64,
}

/// What can be done with the units that can be had.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CeilingPlan {
    /// The ceiling.
    pub ceiling: Ceiling,
    /// Sizes at the start under the ceiling.
    pub start: Sizes,
    /// Sizes expected to remain after losses, which the numbers below rest on.
    pub remain: Sizes,
    /// Whether the request fits under the ceiling.
    pub fits: bool,
    /// What that study can do; absent when so few units remain that the analysis does not exist.
    pub outlook: Option<Outlook>,
    /// The smallest step for which the analysis exists.
    pub smallest_step: u64,
}

/// What a study under a ceiling can do.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Outlook {
    /// Exact power at the wanted effect.
    pub power: f64,
    /// Exact power if nothing is lost.
    pub power_without_losses: f64,
    /// Effect detectable at the wanted power.
    pub detectable: f64,
    /// The same by the textbook formula.
    pub textbook_detectable: f64,
    /// Power by the textbook formula.
    pub textbook_power: f64,
    /// Exact power at the other of two stated effects.
    pub other_power: Option<f64>,
}

/// How firm the number is.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Firmness {
    /// What a kinder and a harsher nuisance value would mean, where the design has one.
    pub bounds: Option<Bounds>,
    /// Effects of the table's rows.
    pub table_effects: Vec<f64>,
    /// What the table's columns are: nuisance values, or powers where the design has no nuisance value.
    pub table_columns: Columns,
    /// Step of the sizes for each effect (row) and column; absent when out of reach.
    pub table: Vec<Vec<Option<u64>>>,
    /// Power against size.
    pub curves: Curves,
    /// Lines of equal size over effect and nuisance value, where the design has one.
    pub contours: Option<Contours>,
}

/// Columns of the table of sizes.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Columns {
    /// Nuisance values: low, planned, high.
    Spreads(Vec<f64>),
    /// Powers to aim for.
    Powers(Vec<f64>),
}

/// A kinder and a harsher nuisance value.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Bounds {
    /// The kinder one.
    pub low: Bound,
    /// The harsher one.
    pub high: Bound,
    /// Level of the confidence limits; absent when the bounds are a conventional span.
    pub limits_level: Option<f64>,
}

/// A bound of the spread and what follows from it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Bound {
    /// The spread.
    pub spread: f64,
    /// Sizes that would then be needed; absent when out of reach.
    pub sizes: Option<Sizes>,
    /// Power that the chosen sizes would then have.
    pub power: f64,
}

/// Power against the step of the sizes, for three spreads.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Curves {
    /// Steps.
    pub steps: Vec<u64>,
    /// Power at the planned spread.
    pub planned: Vec<f64>,
    /// Power at the low spread; empty where the design has none.
    pub low: Vec<f64>,
    /// Power at the high spread; empty where the design has none.
    pub high: Vec<f64>,
}

/// Lines of equal size.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Contours {
    /// The spreads at which the effect is given.
    pub spreads: Vec<f64>,
    /// A line for each size.
    pub lines: Vec<ContourLine>,
}

/// One line of equal size.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ContourLine {
    /// Step of the sizes.
    pub step: u64,
    /// Whether it is the line of the ceiling.
    pub ceiling: bool,
    /// The effect detectable at each spread.
    pub effects: Vec<f64>,
}

/// What a smaller study can do.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Smaller {
    /// Its sizes.
    pub sizes: Sizes,
    /// Exact power at the wanted effect.
    pub power: f64,
    /// Effect detectable at the wanted power.
    pub detectable: f64,
}

/// What another method gives.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RivalPlan {
    /// Names its sentence in the fragments.
    pub id: &'static str,
    /// Where it is published.
    pub source: Option<&'static str>,
    /// Unrounded, for a formula.
    pub unrounded: Option<f64>,
    /// Sizes; absent when out of reach.
    pub sizes: Option<Sizes>,
}

/// What a change of the design would do.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LeverPlan {
    /// Names its sentence in the fragments.
    pub id: &'static str,
    /// The value that characterises it.
    pub value: Option<f64>,
    /// Sizes that would then be needed.
    pub sizes: Sizes,
    /// Units saved in the analysis (negative when it costs units).
    pub saved: i64,
}

/// The independent check, or why there is none.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "snake_case", tag = "outcome")]
pub enum CheckOutcome {
    /// It was run.
    Run(Check),
    /// The spec asks for no simulated studies.
    SwitchedOff,
    /// A single study draws so many values that a useful number of studies is out of proportion.
    TooLarge,
}

/// The independent check by simulation.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Check {
    /// Simulated studies.
    pub replicates: u64,
    /// How many were asked for; more than were simulated when the study is large.
    pub asked: u64,
    /// Seed in hexadecimal digits.
    pub seed: String,
    /// Power of the comparison that the plan is about.
    pub power: Estimate,
    /// Chance that at least one comparison with a true difference is found.
    pub any: Estimate,
    /// Chance that all comparisons with a true difference are found.
    pub all: Estimate,
    /// How many comparisons have a true difference.
    pub differing: u64,
    /// Chance of at least one false finding when nothing differs.
    pub false_alarm: Estimate,
    /// Distance of the simulated from the exact power in standard errors.
    pub distance: f64,
}

/// A simulated probability.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Estimate {
    /// The share of simulated studies.
    pub value: f64,
    /// Its Monte Carlo standard error.
    pub standard_error: f64,
}

/// A sum over the experiments.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Total {
    /// One of them.
    pub name: String,
    /// Several of them.
    pub plural: String,
    /// What kind of thing it is.
    pub kind: crate::quantities::Kind,
    /// Whether it counts individuals that live in units.
    pub held: bool,
    /// How many.
    pub count: u64,
}
