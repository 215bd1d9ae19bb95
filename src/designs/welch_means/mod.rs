//! Two independent groups, continuous outcome, difference between means, each group with its own standard deviation:
//! Welch's t test.
//!
//! ```text
//! H0: μ_1 = μ_2 (one-sided: the difference does not point in the stated direction)
//! T = (mean_2 − mean_1) / √(s_1²/n_1 + s_2²/n_2),   rejected beyond the t quantile with f degrees of freedom,
//! f = (s_1²/n_1 + s_2²/n_2)² / (s_1⁴/(n_1² ν_1) + s_2⁴/(n_2² ν_2)),   ν_i = n_i − 1, not rounded
//! ```
//!
//! Exact power. With `a = σ_1²/n_1`, `b = σ_2²/n_2` and `χ_i²` the chi-squared variables of the two variances, the share
//! `B = χ_1²/(χ_1² + χ_2²)` is Beta(ν_1/2, ν_2/2) and independent of the sum. Given `B`, the degrees of freedom `f` and
//! `w(B) = (a B/B_0 + b (1−B)/(1−B_0)) / (a + b)`, `B_0 = ν_1/(ν_1 + ν_2)`, are fixed, and `T √w` is noncentral t with
//! `ν_1 + ν_2` degrees of freedom and noncentrality `λ = δ/√(a + b)`. Hence
//!
//! ```text
//! power, one-sided = E_B[ P(T(ν_1 + ν_2, λ) > t_f(B) √w(B)) ];   two-sided: both rejection regions
//! ```
//!
//! The mean over `B` is a trapezoidal sum in `v = ln(B/B_0) − ln((1−B)/(1−B_0))`, in which the density is analytic and
//! falls off exponentially; `tests/designs/welch_means.rs` holds it to 1e-9 against two-dimensional quadrature.
//!
//! Textbook formula: `n_1 = (z_α + z_β)² (σ_1² + σ_2²/r) / δ²` with `r = n_2/n_1`. The fewest units in all come with
//! `n_2/n_1 = σ_2/σ_1`, the lowest cost with `σ_2/√c_2 : σ_1/√c_1` for costs `c_i` of a unit.
//!
//! Sources: Welch (1938, 1947); Satterthwaite (1946); Neyman (1934) and Cochran (1977, section 5.5) for the allocation.

mod power;
mod trial;

use std::collections::BTreeMap;

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::Deserialize;
use serde_json::json;

use super::inputs::{
    DifferenceKeys, GroupSpreadKeys, GroupSpreads, Parallel, ParallelKeys, RiskKeys, Spread,
    StatedRisk, read_difference, read_group_spreads, read_parallel, read_risk,
};
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::{self, Continuous, StudentT, normal_cdf, normal_upper_quantile};
use crate::quantities::{COST, Outcome, Risk, Scale, Sides};
use power::{Node, Pair, WelchAtSizes, nodes};
use trial::WelchTrial;

static CARD: Card = Card {
    id: "welch-means",
    title: "two independent groups, difference between means, a standard deviation for each group",
    structure: "parallel-groups",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "welch-t",
    sources: &["welch-1938", "welch-1947", "satterthwaite-1946", "neyman-1934", "cochran-1977"],
};

/// The registry entry.
#[derive(Debug)]
pub struct WelchMeans;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// The two groups and what a unit costs in each.
    design: DesignKeys,
    /// The difference to detect.
    effect: DifferenceKeys,
    /// The standard deviations between experimental units within each group.
    spread: GroupSpreadKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// Two groups.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    /// The groups and their allocation.
    #[serde(flatten)]
    parallel: ParallelKeys,
    /// What one unit costs in each group, by the group's name, in any currency; the report then shows the cheapest
    /// allocation beside the smallest.
    #[serde(default)]
    costs: BTreeMap<String, f64>,
}

impl StudyDesign for WelchMeans {
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
        let effect = read_difference(&keys.effect);
        let risk = read_risk(&keys.risk);
        let mut faults = Vec::new();
        if keys.risk.multiplicity.is_some() {
            faults.push(
                Fault::key(
                    Path::of("risk.multiplicity"),
                    "there is one comparison, so there is no multiplicity to protect against",
                )
                .help("drop `multiplicity`"),
            );
        }
        let parallel = read_two_groups(&keys.design.parallel);
        let groups = parallel.as_ref().map_or(&[][..], |parallel| &parallel.groups);
        let costs = read_costs(&keys.design.costs, groups);
        let spreads = match &parallel {
            Ok(parallel) => read_group_spreads(&keys.spread, &parallel.groups, tables).map(Some),
            Err(_) => Ok(None),
        };
        match (parallel, effect, spreads, risk, costs) {
            (Ok(parallel), Ok(effect), Ok(Some(spreads)), Ok(risk), Ok(costs))
                if faults.is_empty() =>
            {
                let joint = spreads.joint();
                let joint =
                    joint.ok_or_else(|| vec![Fault::key(Path::of("spread"), "no group")])?;
                let method = Method::Exact;
                Ok(Box::new(Means { parallel, effect, spreads, joint, risk, costs, method }))
            }
            (parallel, effect, spreads, risk, costs) => {
                faults.extend(parallel.err().into_iter().flatten());
                faults.extend(effect.err().into_iter().flatten());
                faults.extend(spreads.err().into_iter().flatten());
                faults.extend(risk.err().into_iter().flatten());
                faults.extend(costs.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

fn read_two_groups(keys: &ParallelKeys) -> Result<Parallel, Vec<Fault>> {
    let parallel = read_parallel(keys)?;
    if parallel.groups.len() == 2 {
        return Ok(parallel);
    }
    let reason =
        format!("{} groups are named, but Welch's test compares two", parallel.groups.len());
    Err(vec![
        Fault::key(Path::of("design.groups"), reason)
            .help("name two groups, or choose an analysis for several, such as `two-sample-t`"),
    ])
}

/// The cost of a unit in each group; nothing where the author gives none.
fn read_costs(
    keys: &BTreeMap<String, f64>,
    groups: &[Group],
) -> Result<Option<Vec<f64>>, Vec<Fault>> {
    if keys.is_empty() || groups.is_empty() {
        return Ok(None);
    }
    let at = Path::of("design.costs");
    let mut faults = Vec::new();
    for (name, cost) in keys {
        let path = at.key(name);
        if !groups.iter().any(|group| group.name == *name) {
            let names: Vec<_> = groups.iter().map(|group| format!("`{}`", group.name)).collect();
            faults.push(
                Fault::key(path, format!("`{name}` is none of the groups"))
                    .help(format!("the groups are {}", names.join(", "))),
            );
        } else if let Err(out) = COST.check(*cost) {
            faults.push(
                Fault::value(path, format!("the cost is {cost}"))
                    .help(format!("it {}", out.range.advice)),
            );
        }
    }
    for group in groups.iter().filter(|group| !keys.contains_key(&group.name)) {
        faults.push(
            Fault::key(at.clone(), format!("`{}` has no cost", group.name))
                .help("give the cost of a unit in each group, or drop `costs`"),
        );
    }
    let costs = groups.iter().filter_map(|group| keys.get(&group.name).copied()).collect();
    if faults.is_empty() { Ok(Some(costs)) } else { Err(faults) }
}

/// How the power is computed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Method {
    /// By integration, exact.
    Exact,
    /// Noncentral t with the degrees of freedom that belong to the true variances.
    Satterthwaite,
    /// The t test with pooled variance, its standard deviation the root mean square of the two.
    Pooled,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Means {
    parallel: Parallel,
    effect: Effect,
    spreads: GroupSpreads,
    joint: Spread,
    risk: StatedRisk,
    costs: Option<Vec<f64>>,
    method: Method,
}

impl Means {
    fn tail(&self) -> f64 {
        self.risk.risk.alpha.get() / self.risk.risk.sides.count()
    }

    fn pair(&self, sizes: &Sizes) -> Pair {
        let relative = self.spreads.relative();
        let of = |group: usize| {
            let n = sizes.per_group.get(group).map_or(f64::NAN, |n| *n as f64);
            let sd = relative.get(group).copied().unwrap_or(f64::NAN);
            (n - 1.0, sd * sd / n)
        };
        let (first, second) = (of(0), of(1));
        Pair { df: [first.0, second.0], variances: [first.1, second.1] }
    }

    /// `σ_1²/w_1 + σ_2²/w_2` in units of the larger variance, for weights relative to the larger.
    fn relative_variance(&self) -> f64 {
        let largest = self.parallel.largest_weight();
        let terms = self.spreads.relative().into_iter().zip(&self.parallel.groups);
        terms.map(|(sd, group)| sd * sd / (group.weight / largest)).sum()
    }

    fn fixed(&self, sizes: &Sizes) -> numerics::Result<WelchAtSizes> {
        let pair = self.pair(sizes);
        let (tail, sides) = (self.tail(), self.risk.risk.sides);
        let total = pair.df[0] + pair.df[1];
        match self.method {
            Method::Exact => {
                let nodes = nodes(&pair, tail)?;
                Ok(WelchAtSizes { df: total, error: pair.standard_error(), nodes, sides })
            }
            Method::Satterthwaite => {
                let df = pair.welch_df([1.0, 1.0]);
                let nodes =
                    vec![Node { weight: 1.0, limit: StudentT::new(df)?.upper_quantile(tail)? }];
                Ok(WelchAtSizes { df, error: pair.standard_error(), nodes, sides })
            }
            Method::Pooled => {
                let limit = StudentT::new(total)?.upper_quantile(tail)?;
                let squares: f64 = self.spreads.relative().iter().map(|sd| sd * sd).sum();
                let reciprocals: f64 = sizes.per_group.iter().map(|n| 1.0 / *n as f64).sum();
                let error = (0.5 * squares * reciprocals).sqrt();
                let nodes = vec![Node { weight: 1.0, limit }];
                Ok(WelchAtSizes { df: total, error, nodes, sides })
            }
        }
    }

    fn normal_quantiles(&self) -> numerics::Result<(f64, f64)> {
        let z_alpha = normal_upper_quantile(self.tail())?;
        let z_beta = normal_upper_quantile(1.0 - self.risk.risk.power.get())?;
        Ok((z_alpha, z_beta))
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }

    /// A lever to the allocation in proportion to `share`, unless it is the present one to within a hundredth.
    fn allocation(&self, id: &'static str, share: impl Fn(usize, f64) -> f64) -> Option<Lever> {
        let shares: Vec<_> =
            self.spreads.relative().iter().enumerate().map(|(g, sd)| share(g, *sd)).collect();
        let least = shares.iter().copied().fold(f64::INFINITY, f64::min);
        let weights: Vec<_> =
            shares.iter().map(|share| (share / least * 100.0).round() / 100.0).collect();
        let ratio = weights.iter().copied().fold(0.0, f64::max);
        let smallest = self.parallel.groups.iter().map(|g| g.weight).fold(f64::INFINITY, f64::min);
        let present = |(weight, group): (&f64, &Group)| {
            (group.weight / smallest - weight).abs() <= 0.01 * weight
        };
        if ratio > 1000.0 || weights.iter().zip(&self.parallel.groups).all(present) {
            return None;
        }
        let problem = self.changed(|p| {
            p.parallel.groups.iter_mut().zip(&weights).for_each(|(g, weight)| g.weight = *weight);
        });
        Some(Lever { id, value: Some(ratio), problem })
    }
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
        Some(&self.joint)
    }

    fn smallest_step(&self) -> u64 {
        self.parallel.smallest_step()
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        self.parallel.sizes(step)
    }

    /// Units added to one group alone make the standard error smaller but may take degrees of freedom away. To the
    /// first order of Fisher's expansion `t_f = z + (z³ + z)/(4f)`, the gain prevails once the other group has more
    /// than `(z³ + z)/λ` degrees of freedom, and `λ` is about `z_α + z_β` where the power reaches its target; half as
    /// many again, and one, are taken. A normal quantile that fails leaves the whole range to be tried.
    fn rising_from(&self) -> u64 {
        let first = self.smallest_step();
        if self.parallel.is_balanced() {
            return first;
        }
        let Ok((z, z_beta)) = self.normal_quantiles() else { return u64::MAX };
        let enough = 1.5 * (z * z * z + z) / (z + z_beta).max(1.0) + 1.0;
        let smallest = self.parallel.groups.iter().map(|g| g.weight).fold(f64::INFINITY, f64::min);
        let ratio = self.parallel.largest_weight() / smallest;
        first.max(((enough + 1.0) * ratio).ceil() as u64)
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        Ok(Box::new(self.fixed(sizes)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        let hundredths = |z: f64| (z * 100.0).round() / 100.0;
        let ratio = at.nuisance / at.effect;
        let factor = self.relative_variance() * ratio * ratio;
        let size = |a: f64, b: f64| (a + b) * (a + b) * factor;
        let step = size(z_alpha, z_beta);
        Ok(self.parallel.rounded_up(step).map(|sizes| Textbook {
            step,
            step_with_table_quantiles: size(hundredths(z_alpha), hundredths(z_beta)),
            z_alpha,
            z_beta,
            sizes,
        }))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let (z_alpha, _) = self.normal_quantiles()?;
        Ok(normal_cdf(at.effect / (at.nuisance * self.pair(sizes).standard_error()) - z_alpha))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        Ok((z_alpha + z_beta) * nuisance * self.pair(sizes).standard_error())
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let pair = self.pair(sizes);
        let tail = self.tail();
        let surely = StudentT::new(pair.df[0].min(pair.df[1]))?.upper_quantile(tail)?;
        let never = StudentT::new(pair.df[0] + pair.df[1])?.upper_quantile(tail)?;
        Ok(Box::new(WelchTrial {
            sizes: sizes.per_group.iter().map(|n| *n as usize).collect(),
            sds: self.spreads.relative().into(),
            pair,
            tail,
            two_sided: self.risk.risk.sides == Sides::Two,
            shift: at.effect / at.nuisance,
            surely,
            never,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let exact = |method| RivalAnswer::Exact(self.changed(|p| p.method = method));
        Ok(vec![
            Rival {
                id: "satterthwaite",
                source: Some("satterthwaite-1946"),
                answer: exact(Method::Satterthwaite),
            },
            Rival { id: "pooled", source: None, answer: exact(Method::Pooled) },
        ])
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        levers.extend(self.allocation("optimal-allocation", |_, sd| sd));
        if let Some(costs) = &self.costs {
            let of = |group: usize| costs.get(group).copied().unwrap_or(1.0).sqrt();
            levers.extend(self.allocation("cheapest-allocation", |group, sd| sd / of(group)));
        }
        let problem = self.changed(|p| p.joint.sd *= 0.8);
        levers.push(Lever { id: "sharper-measurement", value: Some(0.2), problem });
        if self.risk.risk.sides == Sides::Two {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let pair = self.pair(sizes);
        let at = self.planned();
        let noncentrality = at.effect / (at.nuisance * pair.standard_error());
        let exact = self.fixed(sizes)?;
        let mut equal = self.clone();
        let largest = self.joint.clone();
        equal.spreads.each.iter_mut().for_each(|spread| spread.sd = largest.sd);
        let rough = Means { method: Method::Satterthwaite, ..self.clone() }.fixed(sizes)?;
        let stated = if self.spreads.common { &[][..] } else { &self.spreads.each[..] };
        let inputs: Vec<_> = stated
            .iter()
            .enumerate()
            .map(|(group, spread)| json!({ "id": "spread", "group": group, "grounds": spread.grounds }))
            .collect();
        let (first, second) = self.parallel.pairs.first().copied().unwrap_or((0, 1));
        let facts = json!({
            "allocation_why": self.parallel.allocation_why,
            "balanced": self.parallel.is_balanced(),
            "risk": self.risk,
            "rising": self.effect.planned.value > 0.0,
            "comparisons": [{ "first": first, "second": second }],
            "spreads": self.spreads.each,
            "largest_spread": self.spreads.largest,
            "common_spread": self.spreads.common,
            "costs": self.costs,
            "satterthwaite_df": rough.df,
            "satterthwaite_power": rough.power_at(noncentrality)?,
            "noncentrality": noncentrality,
            "size": exact.power_at(0.0)?,
            "power_if_equal": equal.power(sizes, at)?,
            "further_inputs": inputs,
            "standard_error": at.nuisance * pair.standard_error(),
            "shares": self.parallel.groups.iter()
                .map(|g| g.weight / self.parallel.largest_weight()).collect::<Vec<_>>(),
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}
