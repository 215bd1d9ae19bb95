//! Three or more independent groups, continuous outcome, equal variances: the omnibus F test of a one-way analysis of
//! variance.
//!
//! For `k` groups of sizes `n_i`, `N` in all, means `μ_i` and common standard deviation `σ`:
//!
//! ```text
//! H0: all means are equal;  H1: at least one differs
//! F = [Σ n_i (mean_i − mean)² / (k − 1)] / s²,   s² pooled on N − k degrees of freedom
//! λ = Σ n_i (μ_i − μ̄)² / σ²,   μ̄ = Σ n_i μ_i / N
//! power = P(F(k − 1, N − k, λ) > F_α),   F_α the upper α quantile of F with k − 1 and N − k degrees of freedom
//! ```
//!
//! The pattern of the means is kept and scaled as a whole: the effect is their range `R = max μ − min μ`, so that
//! `λ = (R/σ)² Σ n_i (m_i − m̄)²` with `m_i = (μ_i − min μ)/R`.
//!
//! Textbook formula: with `σ` known the test statistic is chi-squared with `k − 1` degrees of freedom; `λ*` is the
//! noncentrality at which it exceeds its critical value with the wanted power, and the largest group needs
//! `n = λ* σ² / (R² Σ w_i (m_i − m̄)²)`, `w_i` the sizes relative to it.
//!
//! Sources: Cohen (1988), chapter 8; Patnaik (1949), for the noncentral distributions.

use std::sync::Arc;

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::inputs::{
    BasisKey, GroupKeys, Parallel, ParallelKeys, RiskKeys, Spread, SpreadKeys, StatedRisk,
    read_parallel, read_risk, read_spread,
};
use super::parallel_means::bonferroni_pairs;
use super::problem::{
    AtSizes, Effect, EffectBasis, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes,
    Textbook, Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::{
    self, ChiSquared, Continuous, FisherF, NoncentralChiSquared, NoncentralF,
    normal_upper_quantile, random::Stream,
};
use crate::quantities::{Assumption, DIFFERENCE, Grounds, Outcome, Risk, Scale, Sides, Written};

static CARD: Card = Card {
    id: "omnibus-f",
    title: "three or more independent groups, any difference among their means",
    structure: "parallel-groups",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "one-way-anova",
    sources: &["cohen-1988", "patnaik-1949"],
};

/// The registry entry.
#[derive(Debug)]
pub struct OmnibusF;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// How units are divided into groups.
    design: DesignKeys,
    /// The means to be told apart.
    effect: MeansKeys,
    /// The standard deviation between experimental units within a group.
    spread: SpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Three or more groups.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    /// The groups, at least three.
    groups: Vec<GroupKeys>,
    /// Why units are allocated unequally.
    #[serde(default)]
    allocation_why: Option<String>,
}

/// The means that the study must be able to tell apart, one for each group, in the unit of the outcome. Only their
/// differences count; the detectable effect is reported as their range, the pattern kept.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct MeansKeys {
    /// The mean of each group, in the order of the groups.
    means: Vec<f64>,
    /// What the means stand for.
    #[serde(default)]
    basis: Option<BasisKey>,
    /// What the means rest on.
    #[serde(flatten)]
    grounds: Grounds,
}

impl StudyDesign for OmnibusF {
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
        let parallel = read_groups(&keys.design);
        let effect = read_means(&keys.effect, keys.design.groups.len());
        let spread = read_spread(&keys.spread, tables);
        let risk = read_risk(&keys.risk);
        let mut faults = strangers(&keys.risk);
        match (parallel, effect, spread, risk) {
            (Ok(parallel), Ok((effect, pattern)), Ok(spread), Ok(risk)) if faults.is_empty() => {
                let (means, model) = (keys.effect.means, Model::Omnibus);
                let covariates = 0;
                Ok(Box::new(Anova {
                    parallel,
                    effect,
                    means,
                    pattern,
                    spread,
                    risk,
                    model,
                    covariates,
                }))
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

/// What an F test cannot have: one side, and a multiplicity.
fn strangers(keys: &RiskKeys) -> Vec<Fault> {
    let mut faults = Vec::new();
    if keys.sides == Some(Sides::One) {
        faults.push(
            Fault::value(
                Path::of("risk.sides"),
                "the F test of several means has no direction, so it cannot be one-sided",
            )
            .help("drop `sides`, or compare the groups by `two-sample-t` against a control"),
        );
    }
    if keys.multiplicity.is_some() {
        faults.push(
            Fault::key(
                Path::of("risk.multiplicity"),
                "the omnibus test is a single test, so there is no multiplicity to protect against",
            )
            .help("drop `multiplicity`, or compare the groups in pairs by `two-sample-t`"),
        );
    }
    faults
}

fn read_groups(keys: &DesignKeys) -> Result<Parallel, Vec<Fault>> {
    let parallel = read_parallel(&ParallelKeys {
        groups: keys.groups.clone(),
        compare: None,
        control: None,
        allocation_why: keys.allocation_why.clone(),
    })?;
    if parallel.groups.len() > 2 {
        return Ok(parallel);
    }
    Err(vec![
        Fault::key(Path::of("design.groups"), "only 2 groups are named")
            .help("an omnibus test needs 3 or more; two groups are compared by `two-sample-t`"),
    ])
}

/// The effect, its value the range of the means, and their pattern from 0 to 1.
fn read_means(keys: &MeansKeys, groups: usize) -> Result<(Effect, Vec<f64>), Vec<Fault>> {
    let at = Path::of("effect.means");
    if keys.means.len() != groups {
        let reason = format!("{} means are given for {groups} groups", keys.means.len());
        return Err(vec![
            Fault::key(at, reason).help("give one mean for each group, in the order of `groups`"),
        ]);
    }
    if let Some(position) = keys.means.iter().position(|mean| !mean.is_finite()) {
        let mean = keys.means.get(position).copied().unwrap_or(f64::NAN);
        let reason = format!("the mean is {}", Written(mean));
        return Err(vec![Fault::value(at.item(position), reason).help("it must be a number")]);
    }
    let low = keys.means.iter().copied().fold(f64::INFINITY, f64::min);
    let high = keys.means.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let range = high - low;
    if DIFFERENCE.check(range).is_err() {
        return Err(vec![
            Fault::value(at, format!("the means span a range of {}", Written(range)))
                .help("at least two of them must differ, by a number that can be computed with"),
        ]);
    }
    let basis = match keys.basis {
        Some(BasisKey::SmallestThatMatters) => EffectBasis::SmallestThatMatters,
        Some(BasisKey::Realistic) => EffectBasis::Realistic,
        Some(BasisKey::Both) => EffectBasis::Both,
        None => EffectBasis::Unstated,
    };
    // A difference of two written decimals is written with twelve digits, not with its binary rounding.
    let written = format!("{range:.12e}").parse().unwrap_or(range);
    let planned = Assumption { value: written, grounds: keys.grounds.clone(), defaulted: false };
    let pattern = keys.means.iter().map(|mean| (mean - low) / range).collect();
    Ok((Effect { planned, basis, other: None }, pattern))
}

/// Which hypothesis is tested with the within-group variance.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Model {
    /// That all means are equal.
    Omnibus,
    /// That the contrast in the pattern of the planned means is 0.
    Contrast,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Anova {
    parallel: Parallel,
    effect: Effect,
    means: Vec<f64>,
    /// The means from 0 (lowest) to 1 (highest).
    pattern: Vec<f64>,
    spread: Spread,
    risk: StatedRisk,
    model: Model,
    /// Baseline covariates in the model; each costs a degree of freedom.
    covariates: u64,
}

impl Anova {
    fn alpha(&self) -> f64 {
        self.risk.risk.alpha.get()
    }

    fn numerator(&self) -> f64 {
        match self.model {
            Model::Omnibus => self.parallel.groups.len() as f64 - 1.0,
            Model::Contrast => 1.0,
        }
    }

    /// `Σ w_i (m_i − m̄)²`, the mean weighted: the noncentrality for a range of one standard deviation.
    fn dispersion(&self, weights: impl Iterator<Item = f64> + Clone) -> f64 {
        let total: f64 = weights.clone().sum();
        let sum: f64 = weights.clone().zip(&self.pattern).map(|(w, m)| w * m).sum();
        let mean = sum / total;
        weights.zip(&self.pattern).map(|(w, m)| w * (m - mean) * (m - mean)).sum()
    }

    fn fixed(&self, sizes: &Sizes) -> numerics::Result<AnovaAtSizes> {
        let lost = self.parallel.groups.len() as u64 + self.covariates;
        let (df1, df2) = (self.numerator(), sizes.total.saturating_sub(lost) as f64);
        Ok(AnovaAtSizes {
            df1,
            df2,
            critical: FisherF::new(df1, df2)?.upper_quantile(self.alpha())?,
            dispersion: self.dispersion(sizes.per_group.iter().map(|n| *n as f64)),
        })
    }

    /// `Σ w_i (m_i − m̄)²` for the sizes relative to the largest group.
    fn relative_dispersion(&self) -> f64 {
        let largest = self.parallel.largest_weight();
        self.dispersion(self.parallel.groups.iter().map(|g| g.weight / largest))
    }

    /// The critical value of the chi-squared approximation and the noncentrality that it takes.
    fn chi_squared(&self) -> numerics::Result<(f64, f64)> {
        let df = self.numerator();
        let critical = ChiSquared::new(df)?.upper_quantile(self.alpha())?;
        let noncentrality =
            NoncentralChiSquared::ncp_for_sf(df, critical, self.risk.risk.power.get())?;
        Ok((critical, noncentrality))
    }

    /// Normal quantiles of the error rates, one-sided; no part of the formula, which has its own distribution.
    fn normal_quantiles(&self) -> numerics::Result<(f64, f64)> {
        let z_beta = normal_upper_quantile(1.0 - self.risk.risk.power.get())?;
        Ok((normal_upper_quantile(self.alpha())?, z_beta))
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

/// The F test at fixed sizes.
#[derive(Debug, Clone, Copy)]
struct AnovaAtSizes {
    df1: f64,
    df2: f64,
    critical: f64,
    /// Noncentrality for a range of one standard deviation.
    dispersion: f64,
}

impl AtSizes for AnovaAtSizes {
    fn power(&self, at: Point) -> numerics::Result<f64> {
        let ratio = at.effect / at.nuisance;
        NoncentralF::new(self.df1, self.df2, ratio * ratio * self.dispersion)?.sf(self.critical)
    }

    /// The power depends on the ratio of range to spread alone, so one root serves every spread.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>> {
        let found = NoncentralF::ncp_for_sf(self.df1, self.df2, self.critical, power)?;
        let ratio = (found / self.dispersion).sqrt();
        Ok(nuisances.iter().map(|nuisance| ratio * nuisance).collect())
    }
}

impl Problem for Anova {
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
        Ok(Box::new(self.fixed(sizes)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let (_, noncentrality) = self.chi_squared()?;
        let ratio = at.nuisance / at.effect;
        let factor = ratio * ratio / self.relative_dispersion();
        let step = noncentrality * factor;
        let sizes = self.parallel.rounded_up(step);
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        Ok(sizes.map(|sizes| Textbook {
            step,
            step_with_table_quantiles: (noncentrality * 100.0).round() / 100.0 * factor,
            z_alpha,
            z_beta,
            sizes,
        }))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let (critical, _) = self.chi_squared()?;
        let ratio = at.effect / at.nuisance;
        let noncentrality = ratio * ratio * self.fixed(sizes)?.dispersion;
        NoncentralChiSquared::new(self.numerator(), noncentrality)?.sf(critical)
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        let (_, noncentrality) = self.chi_squared()?;
        Ok(nuisance * (noncentrality / self.fixed(sizes)?.dispersion).sqrt())
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let fixed = self.fixed(sizes)?;
        let shift = at.effect / at.nuisance;
        Ok(Box::new(AnovaTrial {
            sizes: sizes.per_group.iter().map(|n| *n as usize).collect(),
            shifts: self.pattern.iter().map(|m| m * shift).collect(),
            limit: fixed.critical * fixed.df1 / fixed.df2,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let pairs = bonferroni_pairs(&self.parallel, &self.effect, &self.spread, &self.risk);
        let answer = RivalAnswer::Exact(pairs);
        Ok(vec![Rival { id: "all-pairs", source: Some("dunn-1961"), answer }])
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        let problem = self.changed(|p| p.model = Model::Contrast);
        levers.push(Lever { id: "planned-contrast", value: None, problem });
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
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let fixed = self.fixed(sizes)?;
        let at = self.planned();
        let ratio = at.effect / at.nuisance;
        let noncentrality = ratio * ratio * fixed.dispersion;
        let (chi_squared_critical, chi_squared_noncentrality) = self.chi_squared()?;
        let grounds = &self.effect.planned.grounds;
        let means: Vec<_> = (0..self.means.len())
            .map(|group| json!({ "id": "mean", "group": group, "grounds": grounds }))
            .collect();
        let facts = json!({
            "allocation_why": self.parallel.allocation_why,
            "balanced": self.parallel.is_balanced(),
            "risk": self.risk,
            "directionless": true,
            "means": self.means,
            "further_inputs": means,
            "comparisons": [{}],
            "numerator_df": fixed.df1,
            "denominator_df": fixed.df2,
            "critical": fixed.critical,
            "noncentrality": noncentrality,
            "cohens_f": (noncentrality / sizes.total as f64).sqrt(),
            "relative_dispersion": self.relative_dispersion(),
            "chi_squared_critical": chi_squared_critical,
            "chi_squared_noncentrality": chi_squared_noncentrality,
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

/// A simulated study: standard normal raw data, the F statistic.
#[derive(Debug)]
struct AnovaTrial {
    sizes: Vec<usize>,
    /// Mean of each group, in units of the standard deviation.
    shifts: Arc<[f64]>,
    /// What the ratio of the sums of squares must exceed.
    limit: f64,
}

impl Trial for AnovaTrial {
    fn comparisons(&self) -> usize {
        1
    }

    fn weakest(&self) -> usize {
        0
    }

    fn differing(&self) -> Vec<bool> {
        vec![self.shifts.iter().any(|shift| *shift != 0.0)]
    }

    fn values(&self) -> usize {
        self.sizes.iter().sum()
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        let values = self.values();
        scratch.resize(values, 0.0);
        stream.fill_normal(scratch);
        let mut rest: &[f64] = scratch;
        let mut within = 0.0;
        // Weighted sums of the means and of their squares, with and without the planned shifts.
        let mut with = (0.0, 0.0);
        let mut without = (0.0, 0.0);
        for (size, shift) in self.sizes.iter().zip(self.shifts.iter()) {
            let (own, others) = rest.split_at(*size);
            rest = others;
            let (mut sum, mut squares) = (0.0, 0.0);
            for value in own {
                sum += value;
                squares += value * value;
            }
            let n = *size as f64;
            let mean = sum / n;
            within += squares - sum * mean;
            without = (without.0 + sum, without.1 + sum * mean);
            let moved = mean + shift;
            with = (with.0 + n * moved, with.1 + n * moved * moved);
        }
        let total = values as f64;
        let rejects =
            |(sum, squares): (f64, f64)| squares - sum * sum / total > self.limit * within;
        planned.fill(rejects(with));
        null.fill(rejects(without));
    }
}
