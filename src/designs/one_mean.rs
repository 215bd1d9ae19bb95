//! One group, continuous outcome, its mean against a reference value: the one-sample t test.
//!
//! `H₀: μ = μ₀` against `μ ≠ μ₀` (two-sided), or `H₀: μ ≤ μ₀` against `μ > μ₀` (one-sided, or both turned round when
//! the stated difference is negative), with `μ₀` a fixed number that is known without error. Power, textbook formula
//! and sources are those of the one-sample t test (`one_sample.rs`), with `δ` the difference from the reference value
//! and `σ` the standard deviation between units. The reference value moves no number; it says what is tested.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::inputs::{
    Assumed, DifferenceKeys, RiskKeys, SpreadKeys, read_difference, read_risk, read_spread,
};
use super::one_sample::{FurtherInput, OneSample, Setting, one_comparison};
use super::problem::{Facts, Problem, Rival, Sizes};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics;
use crate::quantities::{Assumption, Grounds, Outcome, Scale, Written};

static CARD: Card = Card {
    id: "one-mean",
    title: "one group, mean against a reference value",
    structure: "one-group",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "one-sample-t",
    sources: &["student-1908", "cohen-1988", "guenther-1981", "nist-handbook", "van-belle-2008"],
};

/// The registry entry.
#[derive(Debug)]
pub struct OneMean;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// What the group is compared with.
    design: OneGroupKeys,
    /// The difference between the mean of the group and the reference value that the study must be able to detect, in
    /// the unit of the outcome. Give either `difference` (with its `basis`), or `smallest-that-matters` and
    /// `realistic` as two values. A negative number says that the mean is below the reference; it matters for
    /// one-sided tests.
    effect: DifferenceKeys,
    /// The standard deviation between experimental units.
    spread: SpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// One group of units, compared with a value that is known beforehand.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct OneGroupKeys {
    /// The value with which the mean is compared, in the unit of the outcome: a number, or a mapping with `value`,
    /// `source` and `why`. It must be known without error; a mean of earlier data is an estimate, and then two groups
    /// are compared.
    reference: Assumed,
}

impl StudyDesign for OneMean {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn keys(&self, generator: &mut SchemaGenerator) -> Schema {
        generator.subschema_for::<Keys>()
    }

    fn read(
        &self,
        experiment: &serde_yaml::Value,
        _outcome: &Outcome,
        tables: &dyn Tables,
    ) -> Result<Box<dyn Problem>, Vec<Fault>> {
        let keys: Keys = serde_yaml::from_value(experiment.clone())
            .map_err(|error| vec![Fault::key(Path::default(), error.to_string())])?;
        let reference = read_reference(&keys.design.reference);
        let effect = read_difference(&keys.effect);
        let spread = read_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let mut faults: Vec<_> = one_comparison(&keys.risk).into_iter().collect();
        match (reference, effect, spread, risk) {
            (Ok(reference), Ok(effect), Ok(spread), Ok(risk)) if faults.is_empty() => {
                Ok(Box::new(OneSample::new(AgainstReference { reference }, effect, spread, risk)))
            }
            (reference, effect, spread, risk) => {
                faults.extend(reference.err());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// The reference value: any number that can be computed with.
fn read_reference(keys: &Assumed) -> Result<Assumption, Fault> {
    let value = keys.value();
    if value.is_finite() {
        return Ok(keys.assumption(&Grounds::default()));
    }
    let path = Path::of("design.reference").join(&Path::of(keys.step()));
    Err(Fault::value(path, format!("the reference value is {}", Written(value)))
        .help("it must be a number in the unit of the outcome"))
}

/// The mean of a group against a reference value.
#[derive(Debug, Clone)]
struct AgainstReference {
    reference: Assumption,
}

impl Setting for AgainstReference {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn own_rivals(&self, _problem: &OneSample<Self>) -> Vec<Rival> {
        Vec::new()
    }

    fn own_facts(&self, _problem: &OneSample<Self>, _sizes: &Sizes) -> numerics::Result<Facts> {
        let reference = FurtherInput { id: "reference", assumption: self.reference.clone() };
        let mut facts = Facts::new();
        facts.insert("reference".to_owned(), json!(self.reference));
        facts.insert("further_inputs".to_owned(), json!([reference]));
        Ok(facts)
    }
}
