//! The theory of one study design each, behind one pair of traits, and the registry that lists them.
//!
//! A [`StudyDesign`] is an entry of the registry: it knows which structure, scale and aim it serves, which keys of
//! the spec language belong to it, and how to read them. What it reads is a [`Problem`]: the design with its numbers
//! in place, which the solver can ask for power, textbook results and simulated studies.
//!
//! May use `numerics` and `quantities`; knows nothing of YAML text, files, reports or words beyond labels.

mod averaged_test;
mod baseline_covariate;
mod correlation;
mod crossover_means;
mod family;
mod fault;
pub mod inputs;
mod omnibus_f;
mod one_mean;
mod one_sample;
mod paired_means;
mod pairs;
mod parallel_means;
mod problem;
mod randomised_blocks;
mod welch_means;

pub use fault::{Aspect, Fault, Path, Step, Tables};
pub use problem::{
    AtSizes, Effect, EffectBasis, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes,
    Textbook, Trial,
};

use schemars::{Schema, SchemaGenerator};
use serde::Serialize;

use crate::quantities::{Outcome, Scale};

/// What a design is, for the registry, the list of designs and the report.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Card {
    /// Short name, also the name of its template fragment.
    pub id: &'static str,
    /// What it compares, in a line.
    pub title: &'static str,
    /// Value of `design.structure`.
    pub structure: &'static str,
    /// Value of `outcome.scale`.
    pub scale: Scale,
    /// Value of `aim`.
    pub aim: &'static str,
    /// Value of `analysis`: the published name of the test.
    pub analysis: &'static str,
    /// Keys of the bibliography on which the method rests.
    pub sources: &'static [&'static str],
}

/// An entry of the registry.
pub trait StudyDesign: Sync {
    /// What the design is.
    fn card(&self) -> &'static Card;

    /// JSON Schema of the experiment keys that belong to this design alone (`design`, `effect`, `spread`, `risk`).
    fn keys(&self, generator: &mut SchemaGenerator) -> Schema;

    /// Reads an experiment whose keys already agree with the schema.
    ///
    /// # Errors
    ///
    /// Every fault found, each with its path below the experiment.
    fn read(
        &self,
        experiment: &serde_yaml::Value,
        outcome: &Outcome,
        tables: &dyn Tables,
    ) -> Result<Box<dyn Problem>, Vec<Fault>>;
}

/// All designs, in the order in which they are listed. The first that serves a structure, scale and aim is the
/// default analysis of that combination.
pub static REGISTRY: &[&dyn StudyDesign] = &[
    &parallel_means::ParallelMeans,
    &welch_means::WelchMeans,
    &omnibus_f::OmnibusF,
    &baseline_covariate::BaselineCovariate,
    &one_mean::OneMean,
    &correlation::Correlation,
    &paired_means::PairedMeans,
    &crossover_means::CrossoverMeans,
    &randomised_blocks::RandomisedBlocks,
];
