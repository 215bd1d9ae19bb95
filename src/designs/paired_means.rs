//! Two measurements on the same unit or on matched pairs, continuous outcome, mean difference: the paired t test.
//!
//! `H₀: μ_d = 0` against `μ_d ≠ 0` (two-sided), or `H₀: μ_d ≤ 0` against `μ_d > 0` (one-sided, or both turned round
//! when the stated difference is negative), with `μ_d` the mean of the differences, second condition minus first. Power,
//! textbook formula and sources are those of the one-sample t test on the `n` differences (`one_sample.rs`), with `σ`
//! the standard deviation of the differences. Where that is not known, it follows from the standard deviations `σ₁`,
//! `σ₂` of the single measurements and the correlation `ρ` between the two measurements of a pair:
//!
//! ```text
//! σ² = σ₁² + σ₂² − 2 ρ σ₁ σ₂ = (σ₁ − σ₂)² + 2 (1 − ρ) σ₁ σ₂
//! ```
//!
//! the second form loses no digits when the two are nearly equal and `ρ` is close to 1. The correlation is the weak
//! point of such a plan, so the number is shown for a small range of correlations, and beside the number that the same
//! outcome takes without pairing.
//!
//! Sources: Student (1908); Cohen (1988), section 2.3.4, also for the variance of a difference (the section from
//! memory).

use std::collections::BTreeMap;

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::{Deserialize, Serialize};
use serde_json::json;

use super::inputs::{
    Assumed, Cell, DifferenceKeys, RiskKeys, Spread, SpreadKeys, SpreadOrigin, SpreadTold,
    read_difference, read_risk, read_spread,
};
use super::one_sample::{FurtherInput, OneSample, Setting, one_comparison};
use super::parallel_means::two_equal_groups;
use super::problem::{Facts, Point, Problem, Rival, RivalAnswer, Sizes};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics;
use crate::quantities::{Assumption, CORRELATION, Grounds, Outcome, SPREAD, Scale, Written};

static CARD: Card = Card {
    id: "paired-means",
    title: "two measurements on the same unit or on matched pairs, mean difference",
    structure: "paired",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "paired-t",
    sources: &[
        "student-1908",
        "cohen-1988",
        "guenther-1981",
        "altman-1991",
        "nist-handbook",
        "van-belle-2008",
    ],
};

/// Correlations around the stated one for which the number is shown.
const CORRELATION_STEPS: [f64; 4] = [-0.2, -0.1, 0.0, 0.1];

/// The registry entry.
#[derive(Debug)]
pub struct PairedMeans;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// What is compared within pairs, and what makes the pairs.
    design: PairedKeys,
    /// The mean difference within pairs, second condition minus first, that the study must be able to detect, in the
    /// unit of the outcome. Give either `difference` (with its `basis`), or `smallest-that-matters` and `realistic` as
    /// two values. A negative number says that the second condition has the lower mean; it matters for one-sided tests.
    effect: DifferenceKeys,
    /// The standard deviation of the differences within pairs, or that of single measurements with their correlation.
    spread: PairedSpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Two conditions, both measured in every pair.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct PairedKeys {
    /// Names of the two conditions; the difference is the second minus the first.
    conditions: [String; 2],
    /// What makes the pairs; `same-unit` unless stated.
    #[serde(default)]
    pairing: Option<Pairing>,
}

/// What makes the pairs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
enum Pairing {
    /// Each unit is measured under both conditions, at once or in an order drawn at random.
    SameUnit,
    /// Each unit is measured twice in a fixed order, before and after something.
    BeforeAfter,
    /// Each unit is a pair of two matched individuals, one under each condition; `unit.holds` says of whom it
    /// consists, with `each: 2`.
    MatchedPairs,
}

/// The standard deviation of the differences within pairs: a bare number, or a mapping.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
enum PairedSpreadKeys {
    /// The standard deviation of the differences alone.
    Bare(f64),
    /// The standard deviation with its evidence.
    Told(Box<PairedSpreadTold>),
}

/// Exactly one of `sd`, `values` or `file` with `column`; `sd` alone, or with `correlation`.
#[derive(Debug, Clone, Default, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct PairedSpreadTold {
    /// Standard deviation of the differences within pairs, in the unit of the outcome. With `correlation` it is that of
    /// a single measurement instead: one number for both conditions, or a list of two.
    #[serde(default)]
    sd: Option<SdKeys>,
    /// Correlation between the two measurements of a pair; it says that `sd` is that of a single measurement.
    #[serde(default)]
    correlation: Option<Assumed>,
    /// Degrees of freedom of `sd`.
    #[serde(default)]
    df: Option<f64>,
    /// Number of pairs from which `sd` (and `correlation`) was estimated; gives `n - 1` degrees of freedom.
    #[serde(default)]
    n: Option<u64>,
    /// Raw differences, second condition minus first, one per pair.
    #[serde(default)]
    values: Option<Vec<f64>>,
    /// CSV file beside the spec.
    #[serde(default)]
    file: Option<String>,
    /// Column of the CSV file that holds the differences, one row per pair.
    #[serde(default)]
    column: Option<String>,
    /// Rows to keep: a column and the text it must hold.
    #[serde(default, rename = "where")]
    filter: BTreeMap<String, Cell>,
    /// What the value rests on.
    #[serde(flatten)]
    grounds: Grounds,
}

/// One standard deviation, or one for each condition.
#[derive(Debug, Clone, Copy, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
enum SdKeys {
    /// One number.
    One(f64),
    /// One for each condition, in the order of `conditions`.
    Each([f64; 2]),
}

impl StudyDesign for PairedMeans {
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
        let mut faults = unfit_pairs(&keys.design, experiment);
        faults.extend(one_comparison(&keys.risk));
        let effect = read_difference(&keys.effect);
        let spread = read_paired_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        match (effect, spread, risk) {
            (Ok(effect), Ok((spread, single)), Ok(risk)) if faults.is_empty() => {
                let conditions = keys.design.conditions;
                let pairs = Pairs { conditions, pairing: keys.design.pairing, single };
                Ok(Box::new(OneSample::new(pairs, effect, spread, risk)))
            }
            (effect, spread, risk) => {
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// Conditions that cannot be told apart, and matched pairs whose unit is no pair: the individuals would not be counted.
fn unfit_pairs(keys: &PairedKeys, experiment: &serde_yaml::Value) -> Vec<Fault> {
    let mut faults = Vec::new();
    let [first, second] = &keys.conditions;
    if first == second {
        let at = Path::of("design.conditions").item(1);
        faults.push(
            Fault::value(at, format!("both conditions have the name `{second}`"))
                .help("give each condition a name of its own"),
        );
    }
    let held = ["unit", "holds", "each"].iter().try_fold(experiment, |at, key| at.get(key));
    let is_pair = held.and_then(serde_yaml::Value::as_u64) == Some(2);
    if keys.pairing == Some(Pairing::MatchedPairs) && !is_pair {
        faults.push(
            Fault::value(Path::of("design.pairing"), "the pairs are matched, but the unit is no pair")
                .help("make the pair the unit, and say under `unit.holds` of whom it consists, with `each: 2`"),
        );
    }
    faults
}

/// Reads the standard deviation of the differences, and the single measurements it was computed from.
fn read_paired_spread(
    keys: &PairedSpreadKeys,
    tables: &dyn Tables,
) -> Result<(Spread, Option<Single>), Vec<Fault>> {
    let told = match keys {
        PairedSpreadKeys::Bare(sd) => {
            return Ok((read_spread(&SpreadKeys::Bare(*sd), tables)?, None));
        }
        PairedSpreadKeys::Told(told) => told,
    };
    if let Some(correlation) = &told.correlation {
        return read_single(told, correlation, tables);
    }
    let sd = match told.sd {
        Some(SdKeys::Each(_)) => {
            let reason = "two standard deviations are given, but no correlation between the two measurements";
            return Err(vec![
                Fault::value(Path::of("spread.sd"), reason)
                    .help("add `correlation`, or give the standard deviation of the differences as one number"),
            ]);
        }
        Some(SdKeys::One(sd)) => Some(sd),
        None => None,
    };
    Ok((read_spread(&told.with(sd), tables)?, None))
}

/// The single measurements: their standard deviations and the correlation that makes one out of the two.
fn read_single(
    told: &PairedSpreadTold,
    correlation: &Assumed,
    tables: &dyn Tables,
) -> Result<(Spread, Option<Single>), Vec<Fault>> {
    let at = Path::of("spread");
    let (sds, steps) = match told.sd {
        Some(SdKeys::One(sd)) => ([sd, sd], vec![(sd, at.key("sd"))]),
        Some(SdKeys::Each([first, second])) => {
            let path = |index| at.key("sd").item(index);
            ([first, second], vec![(first, path(0)), (second, path(1))])
        }
        None => {
            let reason = match () {
                () if told.values.is_some() => {
                    "`correlation` has no meaning beside `values`, which are differences"
                }
                () if told.file.is_some() => {
                    "`correlation` has no meaning beside `file`, whose column holds differences"
                }
                () => "`correlation` has no meaning without `sd`",
            };
            return Err(vec![
                Fault::key(at.key("correlation"), reason)
                    .help("give the standard deviation of a single measurement as `sd`, or drop `correlation`"),
            ]);
        }
    };
    let mut faults = Vec::new();
    for (sd, path) in steps {
        if let Err(out) = SPREAD.check(sd) {
            faults.push(
                Fault::value(path, format!("the standard deviation is {}", Written(sd)))
                    .help(format!("it {}", out.range.advice)),
            );
        }
    }
    if let Err(out) = CORRELATION.check(correlation.value()) {
        let path = at.key("correlation").join(&Path::of(correlation.step()));
        faults.push(
            Fault::value(path, format!("the correlation is {}", Written(correlation.value())))
                .help(format!("it {}", out.range.advice)),
        );
    }
    if !faults.is_empty() {
        return Err(faults);
    }
    let single = Single {
        sds,
        equal: matches!(told.sd, Some(SdKeys::One(_))),
        correlation: correlation.assumption(&told.grounds),
    };
    let stated =
        read_spread(&told.with(Some(single.sd_of_differences(correlation.value()))), tables)?;
    let origin = SpreadOrigin::Derived { n: told.n };
    Ok((Spread { origin, ..stated }, Some(single)))
}

impl PairedSpreadTold {
    /// The same keys with one standard deviation, as every design reads them.
    fn with(&self, sd: Option<f64>) -> SpreadKeys {
        SpreadKeys::Told(Box::new(SpreadTold {
            sd,
            df: self.df,
            n: self.n,
            values: self.values.clone(),
            file: self.file.clone(),
            column: self.column.clone(),
            filter: self.filter.clone(),
            grounds: self.grounds.clone(),
        }))
    }
}

/// Standard deviations of single measurements and the correlation between the two of a pair.
#[derive(Debug, Clone, Serialize)]
struct Single {
    /// One for each condition.
    sds: [f64; 2],
    /// Whether one number was stated for both.
    equal: bool,
    correlation: Assumption,
}

impl Single {
    /// The standard deviation of the differences at a correlation.
    fn sd_of_differences(&self, correlation: f64) -> f64 {
        let [first, second] = self.sds;
        let apart = first - second;
        (apart * apart + 2.0 * (1.0 - correlation) * first * second).sqrt()
    }

    /// The root mean square of the two: what a comparison without pairing has, with equal groups.
    fn pooled(&self) -> f64 {
        let [first, second] = self.sds;
        ((first * first + second * second) / 2.0).sqrt()
    }

    /// No correlation at all, and some around the stated one, rising.
    fn correlations(&self) -> Vec<(f64, bool)> {
        let stated = self.correlation.value;
        let around = CORRELATION_STEPS.iter().map(|step| (stated + step, *step == 0.0));
        let mut shown: Vec<_> = around.filter(|(r, _)| CORRELATION.check(*r).is_ok()).collect();
        if shown.iter().all(|(r, _)| *r > 0.05) {
            shown.insert(0, (0.0, false));
        }
        shown
    }
}

/// The differences within pairs.
#[derive(Debug, Clone)]
struct Pairs {
    conditions: [String; 2],
    /// What makes the pairs, where the author says so.
    pairing: Option<Pairing>,
    /// Where the spread was computed from single measurements.
    single: Option<Single>,
}

impl Setting for Pairs {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn own_rivals(&self, problem: &OneSample<Self>) -> Vec<Rival> {
        let unpaired = |single: &Single| {
            let spread = Spread { sd: single.pooled(), ..problem.spread.clone() };
            let effect = problem.effect.clone();
            let groups = two_equal_groups(&self.conditions, effect, spread, problem.risk.clone());
            Rival { id: "unpaired", source: None, answer: RivalAnswer::Exact(groups) }
        };
        self.single.iter().map(unpaired).collect()
    }

    fn own_facts(&self, problem: &OneSample<Self>, sizes: &Sizes) -> numerics::Result<Facts> {
        let mut inputs = Vec::new();
        let mut correlations = Vec::new();
        if let Some(single) = &self.single {
            let grounds = &problem.spread.grounds;
            let told = |value| Assumption { value, grounds: grounds.clone(), defaulted: false };
            let [first, second] = single.sds;
            if single.equal {
                inputs.push(FurtherInput { id: "single-sd", assumption: told(first) });
            } else {
                inputs.push(FurtherInput { id: "first-sd", assumption: told(first) });
                inputs.push(FurtherInput { id: "second-sd", assumption: told(second) });
            }
            let correlation = single.correlation.clone();
            inputs.push(FurtherInput { id: "correlation", assumption: correlation });
            let fixed = problem.at_sizes(sizes)?;
            for (correlation, stated) in single.correlations() {
                let spread = single.sd_of_differences(correlation);
                let at = Point { nuisance: spread, ..problem.planned() };
                correlations.push(json!({
                    "correlation": correlation,
                    "stated": stated,
                    "spread": spread,
                    "power": fixed.power(at)?,
                    "size": problem.smallest(at)?,
                }));
            }
        }
        let mut facts = Facts::new();
        facts.insert("conditions".to_owned(), json!(self.conditions));
        facts.insert("pairing".to_owned(), json!(self.pairing.unwrap_or(Pairing::SameUnit)));
        let matched = self.pairing == Some(Pairing::MatchedPairs);
        facts.insert("matched".to_owned(), json!(matched));
        facts.insert("pairing_defaulted".to_owned(), json!(self.pairing.is_none()));
        facts.insert("single".to_owned(), json!(self.single));
        facts.insert("single_pooled".to_owned(), json!(self.single.as_ref().map(Single::pooled)));
        facts.insert("correlations".to_owned(), json!(correlations));
        facts.insert("further_inputs".to_owned(), json!(inputs));
        Ok(facts)
    }
}
