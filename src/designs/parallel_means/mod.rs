//! Independent groups, continuous outcome, difference between means, equal variances: the two-sample t test, and its
//! pairwise form with the standard deviation pooled over all groups.
//!
//! For groups `i` and `j` of sizes `n_i`, `n_j` out of `N` units in `k` groups, with common standard deviation `σ`:
//!
//! ```text
//! T = (mean_j − mean_i) / (s √(1/n_i + 1/n_j)),   s² pooled over all groups on ν = N − k degrees of freedom
//! power, one-sided = P(T(ν, λ) > t)
//! power, two-sided = P(T(ν, λ) > t) + P(T(ν, λ) < −t),   λ = δ / (σ √(1/n_i + 1/n_j))
//! ```
//!
//! where `t` is the upper `α'/sides` quantile of Student's t with `ν` degrees of freedom and `α'` the level of one
//! comparison: `α`, `α/m` (Bonferroni, and the first step of Holm) or `1 − (1 − α)^(1/m)` (Šidák) for `m`
//! comparisons; or the critical value of the studentised range over `√2` (Tukey, all pairs), or of Dunnett's joint
//! distribution (against a control). Both rejection regions count, as they do when the test is run.
//!
//! Sources: Cohen (1988), chapter 2; Guenther (1981); Šidák (1967); Dunn (1961); Holm (1979); Tukey (1953); Kramer
//! (1956); Hayter (1984); Dunnett (1955).

pub(super) mod trial;

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::averaged_test::AveragedTest;
use super::family::joint_sides;
use super::inputs::{
    Compare, DifferenceKeys, Multiplicity, Parallel, ParallelKeys, RiskKeys, Spread, SpreadKeys,
    StatedRisk, out_of_proportion, read_difference, read_parallel, read_risk, read_spread,
};
use super::pairs::TTest;
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics;
use crate::numerics::multivariate::ShiftedComparisons;
use crate::quantities::{Outcome, Risk, Scale, Sides};
use trial::{Comparison, MeansTrial};

static CARD: Card = Card {
    id: "parallel-means",
    title: "independent groups, difference between means",
    structure: "parallel-groups",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "two-sample-t",
    sources: &[
        "cohen-1988",
        "guenther-1981",
        "sidak-1967",
        "dunn-1961",
        "holm-1979",
        "tukey-1953",
        "hayter-1984",
        "dunnett-1955",
    ],
};

/// The registry entry.
#[derive(Debug)]
pub struct ParallelMeans;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// How units are divided into groups and which groups are compared.
    design: ParallelKeys,
    /// The difference to detect.
    effect: DifferenceKeys,
    /// The standard deviation between experimental units within a group.
    spread: SpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

impl StudyDesign for ParallelMeans {
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
        let parallel = read_parallel(&keys.design);
        let effect = read_difference(&keys.effect);
        let spread = read_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let mut faults = Vec::new();
        if let (Ok(parallel), Ok(risk)) = (&parallel, &risk) {
            faults.extend(contradiction(parallel, risk, keys.risk.multiplicity.is_some()));
        }
        if let (Ok(effect), Ok(spread)) = (&effect, &spread) {
            faults.extend(out_of_proportion(effect, spread));
        }
        match (parallel, effect, spread, risk) {
            (Ok(parallel), Ok(effect), Ok(spread), Ok(risk)) if faults.is_empty() => {
                Ok(Box::new(Means { parallel, effect, spread, risk, covariates: 0 }))
            }
            (parallel, effect, spread, risk) => {
                faults.extend(parallel.err().into_iter().flatten());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spread.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

/// All pairs of groups by t tests at the Bonferroni level, for a design that tests the groups as a whole.
pub(super) fn bonferroni_pairs(
    parallel: &Parallel,
    effect: &Effect,
    spread: &Spread,
    risk: &StatedRisk,
) -> Box<dyn Problem> {
    let risk = StatedRisk { multiplicity: Multiplicity::Bonferroni, ..risk.clone() };
    let (parallel, effect, spread) = (parallel.clone(), effect.clone(), spread.clone());
    Box::new(Means { parallel, effect, spread, risk, covariates: 0 })
}

/// What cannot stand together: a multiplicity without several comparisons, and one-sided tests of all pairs, which have
/// no common direction (and for which Šidák's inequality is not proved, since some statistics correlate negatively).
pub(super) fn contradiction(parallel: &Parallel, risk: &StatedRisk, stated: bool) -> Option<Fault> {
    if parallel.pairs.len() == 1 {
        return stated.then(|| {
            Fault::key(
                Path::of("risk.multiplicity"),
                "there is one comparison, so there is no multiplicity to protect against",
            )
            .help("drop `multiplicity`")
        });
    }
    let misplaced = match (risk.multiplicity, parallel.compare) {
        (Multiplicity::Tukey, Compare::AgainstControl) => Some((
            "Tukey’s procedure is made for all pairs, but each group is compared with a control",
            "choose `dunnett`, or `compare: all-pairs`",
        )),
        (Multiplicity::Dunnett, Compare::AllPairs) => Some((
            "Dunnett’s procedure is made for comparisons with a control, but all pairs are compared",
            "choose `tukey`, or name the `control` and `compare: against-control`",
        )),
        _ => None,
    };
    if let Some((reason, help)) = misplaced {
        return Some(Fault::value(Path::of("risk.multiplicity"), reason).help(help));
    }
    let undirected = risk.risk.sides == Sides::One && parallel.compare == Compare::AllPairs;
    undirected.then(|| {
        Fault::value(
            Path::of("risk.sides"),
            "a one-sided test needs one direction, but all pairs of several groups are compared",
        )
        .help("test two-sided, or compare each group with a control (`compare: against-control`)")
    })
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Means {
    parallel: Parallel,
    effect: Effect,
    spread: Spread,
    risk: StatedRisk,
    /// Baseline covariates in the model; each costs a degree of freedom.
    covariates: u64,
}

impl Means {
    /// Number of comparisons.
    fn comparisons(&self) -> usize {
        self.parallel.pairs.len()
    }

    fn degrees_of_freedom(&self, sizes: &Sizes) -> f64 {
        let parameters = self.parallel.groups.len() as u64 + self.covariates;
        sizes.total.saturating_sub(parameters) as f64
    }

    fn critical(&self, sizes: &Sizes) -> numerics::Result<f64> {
        self.parallel
            .family(&self.risk)
            .critical(self.degrees_of_freedom(sizes), &as_numbers(sizes))
    }

    fn fixed(&self, sizes: &Sizes) -> numerics::Result<TTest> {
        Ok(TTest {
            df: self.degrees_of_freedom(sizes),
            critical: self.critical(sizes)?,
            factor: self.parallel.weakest_pair(sizes).1,
            sides: self.risk.risk.sides,
        })
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

/// Two equal groups with one comparison: the neighbour without pairing of designs that pair.
pub(super) fn two_equal_groups(
    names: &[String; 2],
    effect: Effect,
    spread: Spread,
    risk: StatedRisk,
) -> Box<dyn Problem> {
    let group = |name: &String| Group { name: name.clone(), weight: 1.0, control: false };
    let groups = names.iter().map(group).collect();
    let (compare, pairs) = (Compare::AllPairs, vec![(0, 1)]);
    let parallel = Parallel { groups, compare, pairs, allocation_why: None };
    Box::new(Means { parallel, effect, spread, risk, covariates: 0 })
}

impl Problem for Means {
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
        let fixed = self.fixed(sizes)?;
        if self.covariates == 0 {
            return Ok(Box::new(fixed));
        }
        Ok(Box::new(AveragedTest::new(fixed)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let ratio = at.nuisance * self.parallel.relative_factor() / at.effect;
        let quantiles = self.parallel.quantiles(&self.risk)?;
        Ok(quantiles.size(ratio, |step| self.parallel.rounded_up(step)))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let standard_error = at.nuisance * self.parallel.weakest_pair(sizes).1;
        Ok(self.parallel.quantiles(&self.risk)?.power(at.effect / standard_error))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        let standard_error = nuisance * self.parallel.weakest_pair(sizes).1;
        Ok(self.parallel.quantiles(&self.risk)?.detectable(standard_error))
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let (weakest, _) = self.parallel.weakest_pair(sizes);
        let apart = self.parallel.pairs.get(weakest).map_or(0, |pair| pair.1);
        let all_apart = self.parallel.compare == Compare::AgainstControl;
        let control = |g: usize| self.parallel.groups.get(g).is_some_and(|g| g.control);
        let raised = |g: usize| if all_apart { !control(g) } else { g == apart };
        let shift = at.effect / at.nuisance;
        let comparisons = self.parallel.pairs.iter().map(|&(i, j)| Comparison {
            first: i,
            second: j,
            factor: self.parallel.pair_factor(sizes, (i, j)),
            shift: shift * (f64::from(raised(j)) - f64::from(raised(i))),
        });
        Ok(Box::new(MeansTrial {
            sizes: sizes.per_group.iter().map(|n| *n as usize).collect(),
            df: self.degrees_of_freedom(sizes),
            critical: self
                .parallel
                .family(&self.risk)
                .steps(self.degrees_of_freedom(sizes), &as_numbers(sizes))?,
            two_sided: self.risk.risk.sides == Sides::Two,
            comparisons: comparisons.collect::<Vec<_>>().into(),
            weakest,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let mut rivals = Vec::new();
        let risk = self.risk.risk;
        if self.comparisons() == 1
            && self.parallel.is_balanced()
            && let Some(textbook) = self.textbook(self.planned())?
        {
            let step = textbook.step + textbook.z_alpha * textbook.z_alpha / 4.0;
            rivals.extend(self.formula("guenther", "guenther-1981", step));
            let conventional = risk.sides == Sides::Two && risk.alpha.get() == 0.05;
            let at = self.planned();
            let multiplier = match risk.power.get() {
                0.8 => Some(16.0),
                0.9 => Some(21.0),
                _ => None,
            };
            if let (true, Some(multiplier)) = (conventional, multiplier) {
                let ratio = at.nuisance / at.effect;
                rivals.extend(self.formula("lehr", "lehr-1992", multiplier * ratio * ratio));
            }
        }
        if self.comparisons() > 1 {
            let joint = match self.parallel.compare {
                Compare::AllPairs => ("tukey", Multiplicity::Tukey),
                Compare::AgainstControl => ("dunnett", Multiplicity::Dunnett),
            };
            for (id, other) in [
                ("each-at-alpha", Multiplicity::EachAtAlpha),
                ("bonferroni", Multiplicity::Bonferroni),
                ("sidak", Multiplicity::Sidak),
                joint,
            ] {
                let mut problem = self.clone();
                problem.risk.multiplicity = other;
                if other != self.risk.multiplicity {
                    let answer = RivalAnswer::Exact(Box::new(problem));
                    rivals.push(Rival { id, source: None, answer });
                }
            }
        }
        Ok(rivals)
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        for correlation in [0.5_f64, 0.7] {
            let problem = self.changed(|p| {
                p.covariates += 1;
                p.spread.sd *= (1.0 - correlation * correlation).sqrt();
            });
            levers.push(Lever { id: "covariate", value: Some(correlation), problem });
        }
        let problem = self.changed(|p| p.spread.sd *= 0.8);
        levers.push(Lever { id: "sharper-measurement", value: Some(0.2), problem });
        if !self.parallel.is_balanced() {
            let even = self.changed(|p| p.parallel.groups.iter_mut().for_each(|g| g.weight = 1.0));
            levers.push(Lever { id: "equal-groups", value: None, problem: even });
        } else if self.parallel.compare == Compare::AgainstControl && self.comparisons() > 1 {
            let root = (self.comparisons() as f64).sqrt();
            let weight = (root * 10.0).round() / 10.0;
            let problem = self.changed(|p| {
                p.parallel.groups.iter_mut().filter(|g| g.control).for_each(|g| g.weight = weight);
            });
            levers.push(Lever { id: "larger-control", value: Some(weight), problem });
        }
        let directed = self.comparisons() == 1 || self.parallel.compare == Compare::AgainstControl;
        if self.risk.risk.sides == Sides::Two && directed {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let fixed = self.fixed(sizes)?;
        let at = self.planned();
        let mut comparisons = Vec::new();
        for &(i, j) in &self.parallel.pairs {
            let factor = self.parallel.pair_factor(sizes, (i, j));
            let noncentrality = at.effect / (at.nuisance * factor);
            comparisons.push(json!({
                "first": i,
                "second": j,
                "noncentrality": noncentrality,
                "power": fixed.power_at(noncentrality)?,
            }));
        }
        let (weakest, _) = self.parallel.weakest_pair(sizes);
        let joint = self.joint_power(sizes, fixed.critical)?;
        let facts = json!({
            "compare": self.parallel.compare,
            "allocation_why": self.parallel.allocation_why,
            "balanced": self.parallel.is_balanced(),
            "multiplicity": self.risk.multiplicity,
            "risk": self.risk,
            "alpha_each": self.parallel.family(&self.risk).level(),
            "rising": self.effect.planned.value > 0.0,
            "degrees_of_freedom": fixed.df,
            "critical": fixed.critical,
            "standardised": at.effect / at.nuisance,
            "weakest": weakest,
            "noncentrality": at.effect / (at.nuisance * self.parallel.weakest_pair(sizes).1),
            "relative_factor_squared": self.parallel.relative_factor() * self.parallel.relative_factor(),
            "comparisons": comparisons,
            "any_power": joint.map(|joint| joint.0),
            "all_power": joint.map(|joint| joint.1),
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

/// Sizes of the groups as numbers.
fn as_numbers(sizes: &Sizes) -> Vec<f64> {
    sizes.per_group.iter().map(|n| *n as f64).collect()
}

impl Means {
    /// Power to find at least one, and all, of the differences from a control when every group differs from it; the
    /// single-step procedures have it in closed form.
    fn joint_power(&self, sizes: &Sizes, critical: f64) -> numerics::Result<Option<(f64, f64)>> {
        let single_step = self.risk.multiplicity != Multiplicity::Holm;
        let control = self.parallel.compare == Compare::AgainstControl;
        if self.comparisons() == 1 || !control || !single_step {
            return Ok(None);
        }
        let at = self.planned();
        let size = |g: usize| sizes.per_group.get(g).map_or(f64::NAN, |n| *n as f64);
        let statistics: Vec<(f64, f64)> = self
            .parallel
            .pairs
            .iter()
            .map(|&(c, i)| {
                let loading = (size(i) / (size(i) + size(c))).sqrt();
                (loading, at.effect / (at.nuisance * self.parallel.pair_factor(sizes, (c, i))))
            })
            .collect();
        let sides = joint_sides(self.risk.risk.sides);
        let joint = ShiftedComparisons::new(&statistics, sides, self.degrees_of_freedom(sizes))?;
        Ok(Some((joint.any_exceeds(critical)?, joint.all_exceed(critical)?)))
    }

    fn formula(&self, id: &'static str, source: &'static str, step: f64) -> Option<Rival> {
        let sizes = self.parallel.rounded_up(step)?;
        Some(Rival { id, source: Some(source), answer: RivalAnswer::Formula { step, sizes } })
    }
}
