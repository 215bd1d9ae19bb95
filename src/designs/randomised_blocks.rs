//! Randomised complete blocks, continuous outcome: `k` treatments, one unit of each in every block, t tests of the
//! differences between treatment means with the residual mean square of the analysis of variance by treatments and
//! blocks.
//!
//! With `b` blocks and `σ_e` the residual standard deviation, that within blocks:
//!
//! ```text
//! T = (mean_j − mean_i) / (s √(2/b)),   ν = (b − 1)(k − 1),   λ = δ / (σ_e √(2/b))
//! power = P(T(ν, λ) > t), and P(T(ν, λ) < −t) besides when two-sided
//! ```
//!
//! where `t` is the critical value of the family of comparisons as for independent groups of `b` units each, with `ν`
//! degrees of freedom (equal variances and correlations of the treatment means within blocks make the procedures of Tukey
//! and Dunnett exact). Differences between blocks cancel. For units with standard deviation `σ` and correlation `ρ` within blocks `σ_e = σ √(1 − ρ)`; the standard
//! deviation of differences is `√2 σ_e`. With two treatments the test is the paired t test.
//!
//! Sources: Cochran and Cox (1957), chapter 4; Mead (1988), chapter 2; Dunn (1961), Šidák (1967), Tukey (1953)
//! and Dunnett (1955) for the families.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::{Deserialize, Serialize};
use serde_json::json;

use super::averaged_test::AveragedTest;
use super::family::joint_sides;
use super::inputs::{
    Compare, DifferenceKeys, Multiplicity, PairedSpread, PairedSpreadKeys, Parallel, RiskKeys,
    Spread, SpreadKind, StatedRisk, read_difference, read_paired_spread, read_risk,
    read_treatments,
};
use super::pairs::{Comparison, NormalQuantiles, Rejection, TTest, as_numbers};
use super::parallel_means::contradiction;
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::multivariate::ShiftedComparisons;
use crate::numerics::{self, random::Stream};
use crate::quantities::{LARGEST_SIZE, Outcome, Risk, Scale, Sides};

static CARD: Card = Card {
    id: "randomised-blocks",
    title: "randomised complete blocks, difference between treatment means",
    structure: "randomised-blocks",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "two-way-t",
    sources: &[
        "cochran-cox-1957",
        "mead-1988",
        "dunn-1961",
        "sidak-1967",
        "tukey-1953",
        "dunnett-1955",
    ],
};

/// Most treatments; more comparisons than these make no readable report.
const MOST_TREATMENTS: usize = 20;

/// The registry entry.
#[derive(Debug)]
pub struct RandomisedBlocks;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// The treatments and the blocks.
    design: DesignKeys,
    /// The difference to detect.
    effect: DifferenceKeys,
    /// The standard deviation, and which one it is.
    spread: PairedSpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Blocks of units that are alike; in every block each treatment is given to one unit.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    /// The treatments, at least two; a control first where there is one.
    treatments: Vec<String>,
    /// What a block is.
    #[serde(default)]
    block: BlockKeys,
    /// Which treatments are compared: `all-pairs` unless stated, or `against-control` when `control` is given.
    #[serde(default)]
    compare: Option<Compare>,
    /// Name of the control treatment.
    #[serde(default)]
    control: Option<String>,
}

/// What a block is, in the author's words; `block` and `blocks` unless stated.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct BlockKeys {
    /// One of them (`litter`).
    name: String,
    /// Several of them (`litters`).
    plural: String,
}

impl Default for BlockKeys {
    fn default() -> Self {
        Self { name: "block".to_owned(), plural: "blocks".to_owned() }
    }
}

impl StudyDesign for RandomisedBlocks {
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
        let DesignKeys { treatments, block, compare, control } = keys.design;
        let treatments = read_treatments(&treatments, compare, control.as_deref(), MOST_TREATMENTS);
        let effect = read_difference(&keys.effect);
        let spread = read_paired_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let mut faults = Vec::new();
        if let (Ok(treatments), Ok(risk)) = (&treatments, &risk) {
            faults.extend(contradiction(treatments, risk, keys.risk.multiplicity.is_some()));
        }
        match (treatments, effect, spread, risk) {
            (Ok(treatments), Ok(effect), Ok(spread), Ok(risk)) if faults.is_empty() => {
                let form = Form::Blocked;
                Ok(Box::new(Blocks { treatments, block, effect, spread, risk, form }))
            }
            (treatments, effect, spread, risk) => {
                faults.extend(treatments.err().into_iter().flatten());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// How units are allocated and analysed.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Form {
    /// In blocks.
    Blocked,
    /// In blocks, with a covariate that has this correlation with the outcome within blocks.
    Adjusted(f64),
    /// Without blocks, to independent groups.
    Unblocked,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Blocks {
    treatments: Parallel,
    block: BlockKeys,
    effect: Effect,
    spread: PairedSpread,
    risk: StatedRisk,
    form: Form,
}

impl Blocks {
    fn comparisons(&self) -> usize {
        self.treatments.pairs.len()
    }

    /// Residual standard deviation in units of the given one.
    fn residual(&self) -> f64 {
        match self.form {
            Form::Blocked => self.spread.to_residual(),
            Form::Adjusted(rho) => self.spread.to_residual() * (1.0 - rho * rho).sqrt(),
            Form::Unblocked => 1.0,
        }
    }

    /// Standard error of a difference in units of the given standard deviation.
    fn factor(&self, sizes: &Sizes) -> f64 {
        self.residual() * (2.0 / sizes.step as f64).sqrt()
    }

    fn degrees_of_freedom(&self, sizes: &Sizes) -> f64 {
        let treatments = self.treatments.groups.len() as f64;
        let blocks = sizes.step as f64;
        match self.form {
            Form::Blocked => (blocks - 1.0) * (treatments - 1.0),
            Form::Adjusted(_) => (blocks - 1.0) * (treatments - 1.0) - 1.0,
            Form::Unblocked => (blocks - 1.0) * treatments,
        }
    }

    fn test(&self, sizes: &Sizes) -> numerics::Result<TTest> {
        let df = self.degrees_of_freedom(sizes);
        let critical = self.treatments.family(&self.risk).critical(df, &as_numbers(sizes))?;
        Ok(TTest { df, critical, factor: self.factor(sizes), sides: self.risk.risk.sides })
    }

    fn quantiles(&self) -> numerics::Result<NormalQuantiles> {
        self.treatments.quantiles(&self.risk)
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

impl Problem for Blocks {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn groups(&self) -> &[Group] {
        &self.treatments.groups
    }

    fn risk(&self) -> Risk {
        self.risk.risk
    }

    fn effect(&self) -> &Effect {
        &self.effect
    }

    fn spread(&self) -> Option<&Spread> {
        Some(&self.spread.spread)
    }

    fn smallest_step(&self) -> u64 {
        match self.form {
            // A covariate takes one of the residual degrees of freedom, of which two blocks of two leave one.
            Form::Adjusted(_) if self.treatments.groups.len() == 2 => 3,
            Form::Blocked | Form::Adjusted(_) | Form::Unblocked => 2,
        }
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        let treatments = self.treatments.groups.len();
        let total = step.checked_mul(treatments as u64)?;
        (step <= LARGEST_SIZE).then(|| Sizes { step, per_group: vec![step; treatments], total })
    }

    fn is_possible(&self, sizes: &Sizes) -> bool {
        sizes.step >= self.smallest_step()
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        let test = self.test(sizes)?;
        Ok(match self.form {
            Form::Adjusted(_) => Box::new(AveragedTest::new(test)?),
            Form::Blocked | Form::Unblocked => Box::new(test),
        })
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let ratio = at.nuisance * self.residual() * std::f64::consts::SQRT_2 / at.effect;
        Ok(self.quantiles()?.size(ratio, |step| {
            let step = step.max(self.smallest_step() as f64) * (1.0 - 4.0 * f64::EPSILON);
            if step > LARGEST_SIZE as f64 { None } else { self.sizes(step.ceil() as u64) }
        }))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        Ok(self.quantiles()?.power(at.effect / (at.nuisance * self.factor(sizes))))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        Ok(self.quantiles()?.detectable(nuisance * self.factor(sizes)))
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        // What units of a block have in common cancels; it is simulated all the same.
        let correlation = self.spread.correlation.as_ref().map_or(0.5, |c| c.value.max(0.0));
        let df = self.degrees_of_freedom(sizes);
        let critical = self.treatments.family(&self.risk).steps(df, &as_numbers(sizes))?;
        Ok(Box::new(BlocksTrial {
            blocks: sizes.step as usize,
            treatments: self.treatments.groups.len(),
            between: (correlation / (1.0 - correlation)).sqrt(),
            df,
            rejection: Rejection { critical, sides: self.risk.risk.sides },
            comparisons: self
                .treatments
                .simulated(sizes, at.effect / (at.nuisance * self.residual())),
            weakest: self.treatments.weakest_pair(sizes).0,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let mut rivals = Vec::new();
        if self.treatments.groups.len() == 2
            && let Some(textbook) = self.textbook(self.planned())?
        {
            let step = textbook.step + textbook.z_alpha * textbook.z_alpha / 2.0;
            if let Some(sizes) = self.treatments.rounded_up(step) {
                let answer = RivalAnswer::Formula { step, sizes };
                rivals.push(Rival { id: "guenther", source: Some("guenther-1981"), answer });
            }
        }
        if self.spread.kind == SpreadKind::Between {
            let answer = RivalAnswer::Exact(self.changed(|p| p.form = Form::Unblocked));
            rivals.push(Rival { id: "unblocked", source: None, answer });
        }
        if self.comparisons() > 1 {
            let joint = match self.treatments.compare {
                Compare::AllPairs => ("tukey", Multiplicity::Tukey),
                Compare::AgainstControl => ("dunnett", Multiplicity::Dunnett),
            };
            for (id, other) in [
                ("each-at-alpha", Multiplicity::EachAtAlpha),
                ("bonferroni", Multiplicity::Bonferroni),
                ("sidak", Multiplicity::Sidak),
                joint,
            ] {
                if other != self.risk.multiplicity {
                    let answer = RivalAnswer::Exact(self.changed(|p| p.risk.multiplicity = other));
                    rivals.push(Rival { id, source: None, answer });
                }
            }
        }
        Ok(rivals)
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        for correlation in [0.5, 0.7] {
            let problem = self.changed(|p| p.form = Form::Adjusted(correlation));
            levers.push(Lever { id: "covariate", value: Some(correlation), problem });
        }
        let problem = self.changed(|p| p.spread.spread.sd *= 0.8);
        levers.push(Lever { id: "sharper-measurement", value: Some(0.2), problem });
        let directed =
            self.comparisons() == 1 || self.treatments.compare == Compare::AgainstControl;
        if self.risk.risk.sides == Sides::Two && directed {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let test = self.test(sizes)?;
        let at = self.planned();
        let noncentrality = at.effect / (at.nuisance * test.factor);
        let power = test.power_at(noncentrality)?;
        let comparison = |&(first, second): &(usize, usize)| {
            json!({
                "first": first,
                "second": second,
                "noncentrality": noncentrality,
                "power": power,
            })
        };
        let comparisons: Vec<_> = self.treatments.pairs.iter().map(comparison).collect();
        let correlation = self.spread.correlation.iter();
        let further_inputs: Vec<_> = correlation
            .map(|c| json!({"id": "correlation", "value": c.value, "grounds": c.grounds}))
            .collect();
        let joint = self.joint_power(test)?;
        let facts = json!({
            "block": self.block,
            "compare": self.treatments.compare,
            "multiplicity": self.risk.multiplicity,
            "risk": self.risk,
            "alpha_each": self.treatments.family(&self.risk).level(),
            "rising": self.effect.planned.value > 0.0,
            "degrees_of_freedom": test.df,
            "critical": test.critical,
            "weakest": 0,
            "noncentrality": noncentrality,
            "spread_kind": self.spread.kind,
            "correlation": self.spread.correlation,
            "within_sd": at.nuisance * self.residual(),
            "standardised": at.effect / (at.nuisance * self.residual()),
            "comparisons": comparisons,
            "any_power": joint.map(|joint| joint.0),
            "all_power": joint.map(|joint| joint.1),
            "further_inputs": further_inputs,
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

impl Blocks {
    /// Power to find at least one, and all, of the differences from a control when every treatment differs from it; the
    /// single-step procedures have it in closed form. All treatments have the same number of units, so two differences
    /// from the control have the correlation 1/2.
    fn joint_power(&self, test: TTest) -> numerics::Result<Option<(f64, f64)>> {
        let single_step = self.risk.multiplicity != Multiplicity::Holm;
        let control = self.treatments.compare == Compare::AgainstControl;
        if self.comparisons() == 1 || !control || !single_step {
            return Ok(None);
        }
        let at = self.planned();
        let noncentrality = at.effect / (at.nuisance * test.factor);
        let statistics = vec![(std::f64::consts::FRAC_1_SQRT_2, noncentrality); self.comparisons()];
        let joint = ShiftedComparisons::new(&statistics, joint_sides(test.sides), test.df)?;
        Ok(Some((joint.any_exceeds(test.critical)?, joint.all_exceed(test.critical)?)))
    }
}

/// A simulated study in units of the residual standard deviation: a level for each block, a measurement for each unit,
/// the analysis of variance by treatments and blocks, and the t statistics of every comparison.
#[derive(Debug)]
struct BlocksTrial {
    blocks: usize,
    treatments: usize,
    /// Standard deviation of the blocks' levels.
    between: f64,
    df: f64,
    rejection: Rejection,
    comparisons: Vec<Comparison>,
    weakest: usize,
}

impl Trial for BlocksTrial {
    fn comparisons(&self) -> usize {
        self.comparisons.len()
    }

    fn weakest(&self) -> usize {
        self.weakest
    }

    fn differing(&self) -> Vec<bool> {
        self.comparisons.iter().map(|c| c.shift != 0.0).collect()
    }

    fn values(&self) -> usize {
        self.blocks * (self.treatments + 1)
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        let values = self.values();
        let comparisons = self.comparisons.len();
        scratch.resize(values + self.treatments + 2 * comparisons, 0.0);
        let (data, rest) = scratch.split_at_mut(values);
        let (means, rest) = rest.split_at_mut(self.treatments);
        let (with_shift, without) = rest.split_at_mut(comparisons);
        stream.fill_normal(data);
        means.fill(0.0);
        let count = self.treatments as f64;
        // Each block holds its level first and its units after it; units become deviations from their block's mean.
        for block in data.chunks_exact_mut(self.treatments + 1) {
            let Some((level, units)) = block.split_first_mut() else { continue };
            units.iter_mut().for_each(|unit| *unit += self.between * *level);
            let mean = units.iter().sum::<f64>() / count;
            for (unit, total) in units.iter_mut().zip(means.iter_mut()) {
                *unit -= mean;
                *total += *unit;
            }
        }
        means.iter_mut().for_each(|mean| *mean /= self.blocks as f64);
        let mut squares = 0.0;
        for block in data.chunks_exact(self.treatments + 1) {
            for (unit, mean) in block.iter().skip(1).zip(means.iter()) {
                squares += (unit - mean) * (unit - mean);
            }
        }
        let residual = (squares / self.df).sqrt();
        let compared = self.comparisons.iter().zip(with_shift.iter_mut().zip(without.iter_mut()));
        for (comparison, (with_shift, without)) in compared {
            let mean = |g: usize| means.get(g).copied().unwrap_or(0.0);
            let difference = mean(comparison.second) - mean(comparison.first);
            let error = residual * comparison.reciprocals.sqrt();
            *with_shift = (difference + comparison.shift) / error;
            *without = difference / error;
        }
        self.rejection.mark(with_shift, planned);
        self.rejection.mark(without, null);
    }
}
