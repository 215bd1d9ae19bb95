//! Two treatments, two periods, two sequences (AB and BA), continuous outcome: the t test of the treatment difference
//! that allows for a period effect.
//!
//! With `d` the second minus the first measurement of a unit, `n₁` and `n₂` units in the sequences and `σ_w` the
//! standard deviation within units:
//!
//! ```text
//! estimate = (mean d of AB − mean d of BA) / 2,   standard error = σ_w √((1/n₁ + 1/n₂)/2)
//! T = estimate / estimated standard error,   ν = n₁ + n₂ − 2,   λ = δ / standard error
//! power = P(T(ν, λ) > t), and P(T(ν, λ) < −t) besides when two-sided
//! ```
//!
//! Differences between units and between periods cancel. The standard deviation of the differences is `√2 σ_w`, and
//! for units with standard deviation `σ` and correlation `ρ` between periods `σ_w = σ √(1 − ρ)`.
//!
//! Sources: Senn (2002), chapter 3; Guenther (1981) for the corrected normal approximation.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::inputs::{
    DifferenceKeys, PairedSpread, PairedSpreadKeys, Parallel, RiskKeys, Spread, SpreadKind,
    StatedRisk, read_difference, read_paired_spread, read_risk, read_treatments,
};
use super::pairs::{NormalQuantiles, TTest, as_numbers};
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::{self, random::Stream};
use crate::quantities::{LARGEST_SIZE, Outcome, Risk, Scale, Sides};

static CARD: Card = Card {
    id: "crossover-means",
    title: "two treatments in two periods (AB and BA), difference between means",
    structure: "crossover",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "crossover-t",
    sources: &["senn-2002", "guenther-1981"],
};

/// The registry entry.
#[derive(Debug)]
pub struct CrossoverMeans;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// The treatments that every unit receives.
    design: DesignKeys,
    /// The difference to detect.
    effect: DifferenceKeys,
    /// The standard deviation, and which one it is.
    spread: PairedSpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Each unit receives both treatments, one in each of two periods; half of the units in the one order, half in the other.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    /// The two treatments, the control first; the difference is the second minus the first.
    treatments: Vec<String>,
    /// How long the wash-out between the periods is, and why no effect of the first treatment is left after it.
    #[serde(default)]
    wash_out: Option<String>,
}

impl StudyDesign for CrossoverMeans {
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
        let treatments = read_treatments(&keys.design.treatments, None, None, 2);
        let effect = read_difference(&keys.effect);
        let spread = read_paired_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let stated = keys.risk.multiplicity.map(|_| {
            Fault::key(
                Path::of("risk.multiplicity"),
                "there is one comparison, so there is no multiplicity to protect against",
            )
            .help("drop `multiplicity`")
        });
        match (treatments, effect, spread, risk, stated) {
            (Ok(treatments), Ok(effect), Ok(spread), Ok(risk), None) => {
                let wash_out = keys.design.wash_out.clone();
                let form = Form::TwoPeriods;
                let sequences = sequences(&treatments);
                Ok(Box::new(Crossover {
                    treatments,
                    sequences,
                    wash_out,
                    effect,
                    spread,
                    risk,
                    form,
                }))
            }
            (treatments, effect, spread, risk, stated) => {
                let mut faults: Vec<_> = stated.into_iter().collect();
                faults.extend(treatments.err().into_iter().flatten());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// The two orders of the treatments, as the groups that units are allocated to.
fn sequences(treatments: &Parallel) -> Vec<Group> {
    let names: Vec<_> = treatments.groups.iter().map(|g| g.name.as_str()).collect();
    let order = |names: Vec<&str>| Group { name: names.join(" → "), weight: 1.0, control: false };
    vec![order(names.clone()), order(names.into_iter().rev().collect())]
}

/// What is done with the units.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Form {
    /// Both treatments, period effect allowed for.
    TwoPeriods,
    /// Both treatments, the period effect taken as absent: the paired t test.
    Paired,
    /// Both treatments twice, in the orders ABAB and BABA.
    FourPeriods,
    /// One treatment for each unit.
    Parallel,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Crossover {
    treatments: Parallel,
    sequences: Vec<Group>,
    wash_out: Option<String>,
    effect: Effect,
    spread: PairedSpread,
    risk: StatedRisk,
    form: Form,
}

impl Crossover {
    /// Standard error in units of the given standard deviation, times the root of the size of a sequence.
    fn scale(&self) -> f64 {
        let within = self.spread.to_residual();
        match self.form {
            Form::TwoPeriods | Form::Paired => within,
            // The difference of two means of two has half the variance.
            Form::FourPeriods => within * std::f64::consts::FRAC_1_SQRT_2,
            // Two independent groups: √(2/n) times the standard deviation between units.
            Form::Parallel => std::f64::consts::SQRT_2,
        }
    }

    /// Standard error in units of the given standard deviation.
    fn factor(&self, sizes: &Sizes) -> f64 {
        let reciprocals: f64 = sizes.per_group.iter().map(|n| 1.0 / *n as f64).sum();
        self.scale() * (reciprocals / 2.0).sqrt()
    }

    fn test(&self, sizes: &Sizes) -> numerics::Result<TTest> {
        let lost = if self.form == Form::Paired { 1 } else { 2 };
        let df = sizes.total.saturating_sub(lost) as f64;
        let critical = self.treatments.family(&self.risk).critical(df, &as_numbers(sizes))?;
        Ok(TTest { df, critical, factor: self.factor(sizes), sides: self.risk.risk.sides })
    }

    fn quantiles(&self) -> numerics::Result<NormalQuantiles> {
        self.treatments.quantiles(&self.risk)
    }

    fn rounded_up(&self, step: f64) -> Option<Sizes> {
        self.treatments.rounded_up(step)
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

impl Problem for Crossover {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn groups(&self) -> &[Group] {
        &self.sequences
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
        2
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        (step <= LARGEST_SIZE).then(|| Sizes { step, per_group: vec![step; 2], total: 2 * step })
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        Ok(Box::new(self.test(sizes)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let ratio = at.nuisance * self.scale() / at.effect;
        Ok(self.quantiles()?.size(ratio, |step| self.rounded_up(step)))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        Ok(self.quantiles()?.power(at.effect / (at.nuisance * self.factor(sizes))))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        Ok(self.quantiles()?.detectable(nuisance * self.factor(sizes)))
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let [first, second] = [0, 1].map(|g| sizes.per_group.get(g).copied().unwrap_or(0) as usize);
        // What units have in common with themselves cancels; it is simulated all the same.
        let correlation = self.spread.correlation.as_ref().map_or(0.5, |c| c.value.max(0.0));
        let between = (correlation / (1.0 - correlation)).sqrt();
        let within = at.nuisance * self.spread.to_residual();
        let mut test = self.test(sizes)?;
        test.factor /= self.spread.to_residual();
        Ok(Box::new(CrossoverTrial { first, second, between, shift: at.effect / within, test }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let mut rivals = Vec::new();
        if let Some(textbook) = self.textbook(self.planned())? {
            let step = textbook.step + textbook.z_alpha * textbook.z_alpha / 4.0;
            if let Some(sizes) = self.rounded_up(step) {
                let answer = RivalAnswer::Formula { step, sizes };
                rivals.push(Rival { id: "guenther", source: Some("guenther-1981"), answer });
            }
        }
        let exact = |id, source, form| {
            let problem = self.changed(|p| p.form = form);
            Rival { id, source, answer: RivalAnswer::Exact(problem) }
        };
        rivals.push(exact("paired", Some("student-1908"), Form::Paired));
        if self.spread.kind == SpreadKind::Between {
            rivals.push(exact("parallel", None, Form::Parallel));
        }
        Ok(rivals)
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        let problem = self.changed(|p| p.form = Form::FourPeriods);
        levers.push(Lever { id: "four-periods", value: None, problem });
        let problem = self.changed(|p| p.spread.spread.sd *= 0.8);
        levers.push(Lever { id: "sharper-measurement", value: Some(0.2), problem });
        if self.risk.risk.sides == Sides::Two {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let test = self.test(sizes)?;
        let at = self.planned();
        let noncentrality = at.effect / (at.nuisance * test.factor);
        let correlation = self.spread.correlation.iter();
        let further_inputs: Vec<_> = correlation
            .map(|c| json!({"id": "correlation", "value": c.value, "grounds": c.grounds}))
            .collect();
        let names: Vec<_> = self.treatments.groups.iter().map(|g| &g.name).collect();
        let facts = json!({
            "treatments": names,
            "wash_out": self.wash_out,
            "multiplicity": self.risk.multiplicity,
            "risk": self.risk,
            "alpha_each": self.risk.risk.alpha.get(),
            "any_power": null,
            "all_power": null,
            "rising": self.effect.planned.value > 0.0,
            "degrees_of_freedom": test.df,
            "critical": test.critical,
            "weakest": 0,
            "noncentrality": noncentrality,
            "spread_kind": self.spread.kind,
            "correlation": self.spread.correlation,
            "within_sd": at.nuisance * self.spread.to_residual(),
            "standardised": at.effect / (at.nuisance * self.spread.to_residual()),
            "comparisons": [{
                "first": 0,
                "second": 1,
                "noncentrality": noncentrality,
                "power": test.power_at(noncentrality)?,
            }],
            "further_inputs": further_inputs,
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

/// What the second period adds to every measurement of a simulated study, in standard deviations within units.
const PERIOD_EFFECT: f64 = 0.5;

/// A simulated study in units of the standard deviation within units: for each unit its own level and two measurements
/// with a period effect, the t test of the treatment difference between the sequences.
#[derive(Debug)]
struct CrossoverTrial {
    first: usize,
    second: usize,
    /// Standard deviation of the units' own levels.
    between: f64,
    shift: f64,
    test: TTest,
}

impl Trial for CrossoverTrial {
    fn comparisons(&self) -> usize {
        1
    }

    fn weakest(&self) -> usize {
        0
    }

    fn differing(&self) -> Vec<bool> {
        vec![self.shift != 0.0]
    }

    fn values(&self) -> usize {
        3 * (self.first + self.second)
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        scratch.resize(self.values(), 0.0);
        stream.fill_normal(scratch);
        // Mean and sum of squares of the period differences of one sequence, without a treatment difference.
        let summary = |values: &[f64], count: usize| {
            let (mut sum, mut squares) = (0.0, 0.0);
            for unit in values.chunks_exact(3) {
                let &[level, first, second] = unit else { continue };
                let level = self.between * level;
                let difference = (level + PERIOD_EFFECT + second) - (level + first);
                sum += difference;
                squares += difference * difference;
            }
            let mean = sum / count as f64;
            (mean, squares - sum * mean)
        };
        let (ab, ba) = scratch.split_at(3 * self.first);
        let (mean_ab, squares_ab) = summary(ab, self.first);
        let (mean_ba, squares_ba) = summary(ba, self.second);
        // The variance of a difference is twice that within units.
        let within = ((squares_ab + squares_ba) / (2.0 * self.test.df)).sqrt();
        let estimate = (mean_ab - mean_ba) / 2.0;
        let limit = self.test.critical * within * self.test.factor;
        let rejects = |d: f64| match self.test.sides {
            Sides::Two => d.abs() > limit,
            Sides::One => d > limit,
        };
        planned.iter_mut().for_each(|hit| *hit = rejects(estimate + self.shift));
        null.iter_mut().for_each(|hit| *hit = rejects(estimate));
    }
}
