//! Independent groups, continuous outcome, difference between means adjusted for a baseline covariate: the analysis of
//! covariance with one covariate and a common slope.
//!
//! For groups `i` and `j` of sizes `n_i`, `n_j` out of `N` units in `k` groups, with common standard deviation `σ` and
//! correlation `ρ` between covariate and outcome within groups:
//!
//! ```text
//! T = (adjusted mean_j − adjusted mean_i) / (s √(1/n_i + 1/n_j + (x_j − x_i)²/S)),   ν = N − k − 1
//! ```
//!
//! with `x` the means of the covariate, `S` its sum of squares within groups and `s²` the residual mean square, which
//! estimates `σ²(1 − ρ²)` (Cochran and Cox 1957, section 3.8). Given the covariate, `T` is noncentral t. Over a normal
//! covariate, `(x_j − x_i)² / ((1/n_i + 1/n_j) S)` is the ratio of a chi-squared variable on 1 to one on `N − k`
//! degrees of freedom, so that
//!
//! ```text
//! power = E[ P(|T(ν, λ √B)| > t) ],   λ = δ / (σ √(1 − ρ²) √(1/n_i + 1/n_j)),   B ~ Beta((N − k)/2, 1/2)
//! ```
//!
//! and with `B = cos²θ` it is the mean of the noncentral t power over angles of density `∝ cos^ν θ`. The plain formula
//! sets `B = 1`, as if chance never left the groups with different baselines; it is shown beside as another method.
//!
//! Sources: Cochran and Cox (1957); Frison and Pocock (1992) for the factor `1 − ρ²`; Borm, Fransen and Lemmens (2007)
//! for its use with the t test; the mean over `B` follows from the normal covariate as above.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::averaged_test::AveragedTest;
use super::inputs::{
    Assumed, DifferenceKeys, Multiplicity, Parallel, ParallelKeys, RiskKeys, Spread, SpreadKeys,
    StatedRisk, read_correlation, read_difference, read_parallel, read_risk, read_spread,
};
use super::pairs::{Comparison, NormalQuantiles, Rejection, TTest, as_numbers};
use super::parallel_means::contradiction;
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::{self, integer_search, random::Stream};
use crate::quantities::{Assumption, LARGEST_SIZE, Outcome, Risk, Scale, Sides};

static CARD: Card = Card {
    id: "baseline-covariate",
    title: "independent groups, difference between means adjusted for a baseline covariate",
    structure: "parallel-groups",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "ancova",
    sources: &["cochran-cox-1957", "frison-pocock-1992", "borm-2007"],
};

/// The registry entry.
#[derive(Debug)]
pub struct BaselineCovariate;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// How units are divided into groups, which groups are compared, and the baseline.
    design: DesignKeys,
    /// The difference to detect.
    effect: DifferenceKeys,
    /// The standard deviation of the outcome between experimental units within a group, not adjusted for the baseline.
    spread: SpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Independent groups with a baseline covariate.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    #[serde(flatten)]
    parallel: ParallelKeys,
    /// The covariate, measured before allocation.
    baseline: BaselineKeys,
}

/// A covariate that is measured before units are allocated to groups.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct BaselineKeys {
    /// What is measured, when it is not the outcome itself.
    #[serde(default)]
    name: Option<String>,
    /// Correlation between baseline and outcome within groups.
    correlation: Assumed,
}

impl StudyDesign for BaselineCovariate {
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
        let parallel = read_parallel(&keys.design.parallel);
        let baseline = &keys.design.baseline;
        let correlation =
            read_correlation(&baseline.correlation, &Path::of("design.baseline.correlation"));
        let effect = read_difference(&keys.effect);
        let spread = read_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let mut faults = Vec::new();
        if let (Ok(parallel), Ok(risk)) = (&parallel, &risk) {
            faults.extend(contradiction(parallel, risk, keys.risk.multiplicity.is_some()));
            faults.extend(joint_procedure(parallel, risk));
        }
        match (parallel, correlation, effect, spread, risk) {
            (Ok(parallel), Ok(correlation), Ok(effect), Ok(spread), Ok(risk))
                if faults.is_empty() =>
            {
                let baseline = baseline.name.clone();
                let method = Method::Averaged;
                Ok(Box::new(Adjusted {
                    parallel,
                    correlation,
                    baseline,
                    effect,
                    spread,
                    risk,
                    method,
                }))
            }
            (parallel, correlation, effect, spread, risk) => {
                faults.extend(parallel.err().into_iter().flatten());
                faults.extend(correlation.err());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// The procedures of Tukey and Dunnett do not hold exactly here: adjusted differences correlate in a way that depends on
/// the covariate.
fn joint_procedure(parallel: &Parallel, risk: &StatedRisk) -> Option<Fault> {
    let joint = matches!(risk.multiplicity, Multiplicity::Tukey | Multiplicity::Dunnett);
    (joint && parallel.pairs.len() > 1).then(|| {
        Fault::value(
            Path::of("risk.multiplicity"),
            "this procedure is not exact for adjusted means, whose correlations depend on the covariate",
        )
        .help("choose `bonferroni`, `sidak` or `holm`")
    })
}

/// What is done with the baseline, and how its power is found.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Method {
    /// Analysis of covariance, its power averaged over the chance differences of a normal covariate.
    Averaged,
    /// Analysis of covariance, its power without these differences.
    Plain,
    /// The baseline is not used.
    Unadjusted,
    /// The change from the baseline is the outcome.
    Change,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Adjusted {
    parallel: Parallel,
    correlation: Assumption,
    baseline: Option<String>,
    effect: Effect,
    spread: Spread,
    risk: StatedRisk,
    method: Method,
}

impl Adjusted {
    fn comparisons(&self) -> usize {
        self.parallel.pairs.len()
    }

    /// Residual standard deviation in units of that of the outcome.
    fn residual(&self) -> f64 {
        let rho = self.correlation.value;
        match self.method {
            Method::Averaged | Method::Plain => ((1.0 - rho) * (1.0 + rho)).sqrt(),
            Method::Unadjusted => 1.0,
            Method::Change => (2.0 * (1.0 - rho)).sqrt(),
        }
    }

    fn degrees_of_freedom(&self, sizes: &Sizes) -> f64 {
        let covariates = u64::from(matches!(self.method, Method::Averaged | Method::Plain));
        sizes.total.saturating_sub(self.parallel.groups.len() as u64 + covariates) as f64
    }

    /// The t test of a pair, the standard deviation of the outcome as its nuisance value.
    fn test(&self, sizes: &Sizes, factor: f64) -> numerics::Result<TTest> {
        let df = self.degrees_of_freedom(sizes);
        let critical = self.parallel.family(&self.risk).critical(df, &as_numbers(sizes))?;
        let factor = factor * self.residual();
        Ok(TTest { df, critical, factor, sides: self.risk.risk.sides })
    }

    fn quantiles(&self) -> numerics::Result<NormalQuantiles> {
        self.parallel.quantiles(&self.risk)
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }

    /// The exact size of the two-sample t test without the baseline, times `1 − ρ²`.
    fn shrunk_t(&self) -> numerics::Result<Option<f64>> {
        let mut unadjusted = self.clone();
        unadjusted.method = Method::Unadjusted;
        let at = self.planned();
        let Some(textbook) = unadjusted.textbook(at)? else { return Ok(None) };
        let out = |largest| numerics::NumericsError::TargetOutOfReach { largest, best: f64::NAN };
        let power = |step| match unadjusted.sizes(step) {
            Some(sizes) => unadjusted.power(&sizes, at),
            None => Err(out(step)),
        };
        let target = self.risk.risk.power.get();
        let (low, hint) = (unadjusted.smallest_step(), Some(textbook.step as u64 + 1));
        match integer_search::smallest_rising(low, LARGEST_SIZE, hint, target, power) {
            Ok(found) => {
                let rho = self.correlation.value;
                Ok(Some(found.n as f64 * (1.0 - rho) * (1.0 + rho)))
            }
            Err(numerics::NumericsError::TargetOutOfReach { .. }) => Ok(None),
            Err(other) => Err(other),
        }
    }
}

impl Problem for Adjusted {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn groups(&self) -> &[Group] {
        &self.parallel.groups
    }

    fn risk(&self) -> Risk {
        self.risk.risk
    }

    fn effect(&self) -> &Effect {
        &self.effect
    }

    fn spread(&self) -> Option<&Spread> {
        Some(&self.spread)
    }

    fn smallest_step(&self) -> u64 {
        self.parallel.smallest_step()
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        self.parallel.sizes(step)
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        let (_, factor) = self.parallel.weakest_pair(sizes);
        let test = self.test(sizes, factor)?;
        Ok(match self.method {
            Method::Averaged => Box::new(AveragedTest::new(test)?),
            Method::Plain | Method::Unadjusted | Method::Change => Box::new(test),
        })
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let factor = self.parallel.relative_factor() * self.residual();
        let ratio = at.nuisance * factor / at.effect;
        Ok(self.quantiles()?.size(ratio, |step| self.parallel.rounded_up(step)))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let factor = self.parallel.weakest_pair(sizes).1 * self.residual();
        Ok(self.quantiles()?.power(at.effect / (at.nuisance * factor)))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        let factor = self.parallel.weakest_pair(sizes).1 * self.residual();
        Ok(self.quantiles()?.detectable(nuisance * factor))
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let (weakest, _) = self.parallel.weakest_pair(sizes);
        let df = self.degrees_of_freedom(sizes);
        let critical = self.parallel.family(&self.risk).steps(df, &as_numbers(sizes))?;
        Ok(Box::new(AdjustedTrial {
            sizes: sizes.per_group.iter().map(|n| *n as usize).collect(),
            df,
            rejection: Rejection { critical, sides: self.risk.risk.sides },
            correlation: self.correlation.value,
            comparisons: self.parallel.simulated(sizes, at.effect / at.nuisance),
            weakest,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let exact = |id, source, method| {
            let problem = self.changed(|p| p.method = method);
            Rival { id, source, answer: RivalAnswer::Exact(problem) }
        };
        let mut rivals = vec![exact("plain", Some("cochran-cox-1957"), Method::Plain)];
        if let Some(step) = self.shrunk_t()?
            && let Some(sizes) = self.parallel.rounded_up(step)
        {
            let answer = RivalAnswer::Formula { step, sizes };
            rivals.push(Rival { id: "shrunk-t", source: Some("borm-2007"), answer });
        }
        rivals.push(exact("unadjusted", None, Method::Unadjusted));
        if self.baseline.is_none() {
            rivals.push(exact("change", Some("frison-pocock-1992"), Method::Change));
        }
        if self.comparisons() > 1 {
            for (id, other) in [
                ("each-at-alpha", Multiplicity::EachAtAlpha),
                ("bonferroni", Multiplicity::Bonferroni),
                ("sidak", Multiplicity::Sidak),
            ] {
                if other != self.risk.multiplicity {
                    let problem = self.changed(|p| p.risk.multiplicity = other);
                    let answer = RivalAnswer::Exact(problem);
                    rivals.push(Rival { id, source: None, answer });
                }
            }
        }
        Ok(rivals)
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        let rho = self.correlation.value;
        if self.baseline.is_none() && rho > 0.0 {
            // Means of two measurements under compound symmetry (Frison and Pocock 1992): the mean of two has the
            // variance (1 + ρ)/2 and the same covariance with the other measurement.
            let share = ((1.0 + rho) / 2.0).sqrt();
            let problem = self.changed(|p| p.correlation.value = rho / share);
            levers.push(Lever { id: "second-baseline", value: None, problem });
            let problem = self.changed(|p| {
                p.spread.sd *= share;
                p.correlation.value = rho / share;
            });
            levers.push(Lever { id: "second-outcome", value: None, problem });
        }
        let problem = self.changed(|p| p.spread.sd *= 0.8);
        levers.push(Lever { id: "sharper-measurement", value: Some(0.2), problem });
        if !self.parallel.is_balanced() {
            let even = self.changed(|p| p.parallel.groups.iter_mut().for_each(|g| g.weight = 1.0));
            levers.push(Lever { id: "equal-groups", value: None, problem: even });
        }
        let directed = self.comparisons() == 1
            || self.parallel.compare == super::inputs::Compare::AgainstControl;
        if self.risk.risk.sides == Sides::Two && directed {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let at = self.planned();
        let mut comparisons = Vec::new();
        for &pair in &self.parallel.pairs {
            let test = self.test(sizes, self.parallel.pair_factor(sizes, pair))?;
            let noncentrality = at.effect / (at.nuisance * test.factor);
            comparisons.push(json!({
                "first": pair.0,
                "second": pair.1,
                "noncentrality": noncentrality,
                "power": AveragedTest::new(test)?.power_at(noncentrality)?,
            }));
        }
        let (weakest, factor) = self.parallel.weakest_pair(sizes);
        let test = self.test(sizes, factor)?;
        let noncentrality = at.effect / (at.nuisance * test.factor);
        let factor = self.parallel.relative_factor();
        let facts = json!({
            "compare": self.parallel.compare,
            "allocation_why": self.parallel.allocation_why,
            "balanced": self.parallel.is_balanced(),
            "multiplicity": self.risk.multiplicity,
            "risk": self.risk,
            "alpha_each": self.parallel.family(&self.risk).level(),
            "rising": self.effect.planned.value > 0.0,
            "degrees_of_freedom": test.df,
            "critical": test.critical,
            "standardised": at.effect / at.nuisance,
            "weakest": weakest,
            "noncentrality": noncentrality,
            "plain_power": test.power_at(noncentrality)?,
            "relative_factor_squared": factor * factor,
            "comparisons": comparisons,
            "any_power": null,
            "all_power": null,
            "baseline": self.baseline,
            "correlation": self.correlation,
            "variance_factor": self.residual() * self.residual(),
            "residual_sd": at.nuisance * self.residual(),
            "further_inputs": [{"id": "correlation", "value": self.correlation.value, "grounds": self.correlation.grounds}],
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

/// A simulated study: a normal covariate and an outcome that correlates with it, the t statistics of the adjusted
/// differences.
#[derive(Debug)]
struct AdjustedTrial {
    sizes: Vec<usize>,
    df: f64,
    rejection: Rejection,
    correlation: f64,
    comparisons: Vec<Comparison>,
    weakest: usize,
}

/// Sums of squares and products within groups.
#[derive(Debug, Clone, Copy, Default)]
struct Within {
    xx: f64,
    xy: f64,
    yy: f64,
}

impl Trial for AdjustedTrial {
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
        2 * self.sizes.iter().sum::<usize>()
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        let values = self.values();
        let (groups, comparisons) = (self.sizes.len(), self.comparisons.len());
        scratch.resize(values + 2 * groups + 2 * comparisons, 0.0);
        let (data, rest) = scratch.split_at_mut(values);
        let (mean_x, rest) = rest.split_at_mut(groups);
        let (mean_y, rest) = rest.split_at_mut(groups);
        let (with_shift, without) = rest.split_at_mut(comparisons);
        stream.fill_normal(data);
        let rest_of_outcome = ((1.0 - self.correlation) * (1.0 + self.correlation)).sqrt();
        let mut within = Within::default();
        let mut rest: &[f64] = data;
        for ((size, mean_x), mean_y) in
            self.sizes.iter().zip(mean_x.iter_mut()).zip(mean_y.iter_mut())
        {
            let (own, others) = rest.split_at(2 * *size);
            rest = others;
            let (covariate, errors) = own.split_at(*size);
            let pairs = || {
                covariate
                    .iter()
                    .zip(errors)
                    .map(|(x, e)| (*x, self.correlation * x + rest_of_outcome * e))
            };
            let (sum_x, sum_y) = pairs().fold((0.0, 0.0), |(a, b), (x, y)| (a + x, b + y));
            (*mean_x, *mean_y) = (sum_x / *size as f64, sum_y / *size as f64);
            for (x, y) in pairs() {
                let (x, y) = (x - *mean_x, y - *mean_y);
                within.xx += x * x;
                within.xy += x * y;
                within.yy += y * y;
            }
        }
        let slope = within.xy / within.xx;
        let residual = (within.yy - slope * within.xy).max(0.0) / self.df;
        let compared = self.comparisons.iter().zip(with_shift.iter_mut().zip(without.iter_mut()));
        for (comparison, (with_shift, without)) in compared {
            let apart = |means: &[f64]| {
                let mean = |g: usize| means.get(g).copied().unwrap_or(0.0);
                mean(comparison.second) - mean(comparison.first)
            };
            let apart_x = apart(mean_x);
            let difference = apart(mean_y) - slope * apart_x;
            let variance = residual * (comparison.reciprocals + apart_x * apart_x / within.xx);
            *with_shift = (difference + comparison.shift) / variance.sqrt();
            *without = difference / variance.sqrt();
        }
        self.rejection.mark(with_shift, planned);
        self.rejection.mark(without, null);
    }
}
