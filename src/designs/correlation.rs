//! One group, two continuous variables measured on each unit: the t test of a correlation of 0.
//!
//! ```text
//! H0: ρ = 0;  H1: ρ ≠ 0 (one-sided: of the stated sign)
//! T = r √(n − 2) / √(1 − r²), rejected beyond the t quantile with n − 2 degrees of freedom
//! ```
//!
//! Exact power when both variables vary (bivariate normal). Given the values `x` of one of them, `T` is noncentral t
//! with noncentrality `θ √W`, `θ = ρ/√(1 − ρ²)`, `W = Σ (x − x̄)²/σ_x²`; over studies `W` is chi-squared with `n − 1`
//! degrees of freedom:
//!
//! ```text
//! power, one-sided = E_W[ P(T(n − 2, θ √W) > t) ];   two-sided: both rejection regions
//! ```
//!
//! The mean over `W` is a trapezoidal sum in `v = ln(W/(n − 1))`, in which the density is analytic and falls off at
//! least exponentially; `tests/designs/correlation.rs` holds it to 1e-12 against quadrature of the density of `r`.
//!
//! Textbook formula, by Fisher's transformation: `n = ((z_α + z_β)/artanh ρ)² + 3`.
//!
//! Sources: Fisher (1921); Hotelling (1953), for the exact distribution; Gatsonis and Sampson (1989), for the power when
//! the other variable is random.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::{Deserialize, Serialize};
use serde_json::json;

use super::inputs::{Assumed, BasisKey, RiskKeys, Spread, StatedRisk, read_risk};
use super::problem::{
    AtSizes, Effect, EffectBasis, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes,
    Textbook, Trial,
};
use super::{Card, Fault, Path, StudyDesign, Tables};
use crate::numerics::{
    self, Continuous, NoncentralT, StudentT, normal_cdf, normal_upper_quantile, random::Stream,
    roots,
};
use crate::quantities::{
    CORRELATION_SIZE, Grounds, LARGEST_SIZE, Outcome, Risk, Scale, Sides, Written,
};

static CARD: Card = Card {
    id: "correlation",
    title: "one group, correlation between two variables",
    structure: "one-group",
    scale: Scale::Continuous,
    aim: "detect-difference",
    analysis: "correlation",
    sources: &["fisher-1921", "hotelling-1953", "gatsonis-sampson-1989"],
};

/// The registry entry.
#[derive(Debug)]
pub struct Correlation;

/// The spec keys of this design.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct Keys {
    /// What is measured beside the outcome.
    design: DesignKeys,
    /// The correlation to detect.
    effect: CorrelationKeys,
    /// Error rates.
    #[serde(default)]
    risk: RiskKeys,
}

/// One group.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct DesignKeys {
    /// The variable that is correlated with the outcome, measured on the same units.
    with: SecondVariable,
}

/// A measured variable.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct SecondVariable {
    /// What is measured, and when.
    name: String,
    /// Its unit of measurement; leave out for a pure number.
    #[serde(default)]
    unit: Option<String>,
}

/// The correlation that the study must be able to detect. A negative number says that one variable falls as the other
/// rises; it matters for one-sided tests.
#[derive(Debug, Clone, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
struct CorrelationKeys {
    /// The correlation to detect, between -1 and 1.
    correlation: Assumed,
    /// What it stands for.
    #[serde(default)]
    basis: Option<BasisKey>,
    /// What it rests on.
    #[serde(flatten)]
    grounds: Grounds,
}

impl StudyDesign for Correlation {
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
        _tables: &dyn Tables,
    ) -> Result<Box<dyn Problem>, Vec<Fault>> {
        let keys: Keys = serde_yaml::from_value(experiment.clone())
            .map_err(|error| vec![Fault::key(Path::default(), error.to_string())])?;
        let mut faults = Vec::new();
        if keys.risk.multiplicity.is_some() {
            faults.push(
                Fault::key(
                    Path::of("risk.multiplicity"),
                    "there is one correlation, so there is no multiplicity to protect against",
                )
                .help("drop `multiplicity`"),
            );
        }
        match (read_correlation(&keys.effect), read_risk(&keys.risk)) {
            (Ok(effect), Ok(risk)) if faults.is_empty() => {
                let groups = [Group { name: "all".to_owned(), weight: 1.0, control: false }];
                let with = keys.design.with;
                Ok(Box::new(Pairs { groups, with, effect, risk, method: Method::BothRandom }))
            }
            (effect, risk) => {
                faults.extend(effect.err());
                faults.extend(risk.err().into_iter().flatten());
                Err(faults)
            }
        }
    }
}

fn read_correlation(keys: &CorrelationKeys) -> Result<Effect, Fault> {
    let value = keys.correlation.value();
    if let Err(out) = CORRELATION_SIZE.check(value.abs()) {
        let path = Path::of("effect.correlation").join(&Path::of(keys.correlation.step()));
        return Err(Fault::value(path, format!("the correlation is {}", Written(value)))
            .help(format!("its size {}", out.range.advice)));
    }
    let basis = match keys.basis {
        Some(BasisKey::SmallestThatMatters) => EffectBasis::SmallestThatMatters,
        Some(BasisKey::Realistic) => EffectBasis::Realistic,
        Some(BasisKey::Both) => EffectBasis::Both,
        None => EffectBasis::Unstated,
    };
    Ok(Effect { planned: keys.correlation.assumption(&keys.grounds), basis, other: None })
}

/// What is taken to vary from study to study.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Method {
    /// Both variables, as they do where both are measured.
    BothRandom,
    /// The outcome alone: the other variable takes chosen values of the planned spread.
    OneFixed,
}

/// The design with its numbers.
#[derive(Debug, Clone)]
struct Pairs {
    groups: [Group; 1],
    with: SecondVariable,
    effect: Effect,
    risk: StatedRisk,
    method: Method,
}

/// Fewest units that leave a degree of freedom.
const FEWEST: u64 = 3;

/// `ρ/√(1 − ρ²)`.
fn slope(correlation: f64) -> f64 {
    correlation / ((1.0 - correlation) * (1.0 + correlation)).sqrt()
}

impl Pairs {
    fn tail(&self) -> f64 {
        self.risk.risk.alpha.get() / self.risk.risk.sides.count()
    }

    fn fixed(&self, sizes: &Sizes) -> numerics::Result<CorrelationAtSizes> {
        let n = sizes.total as f64;
        let roots = match self.method {
            Method::BothRandom => nodes(n - 1.0),
            Method::OneFixed => vec![Node { weight: 1.0, root: n.sqrt() }],
        };
        let df = n - 2.0;
        let critical = StudentT::new(df)?.upper_quantile(self.tail())?;
        Ok(CorrelationAtSizes { df, critical, nodes: roots, sides: self.risk.risk.sides })
    }

    fn normal_quantiles(&self) -> numerics::Result<(f64, f64)> {
        let z_alpha = normal_upper_quantile(self.tail())?;
        let z_beta = normal_upper_quantile(1.0 - self.risk.risk.power.get())?;
        Ok((z_alpha, z_beta))
    }

    fn rounded_up(&self, step: f64) -> Option<Sizes> {
        if step > LARGEST_SIZE as f64 {
            return None;
        }
        self.sizes((step * (1.0 - 4.0 * f64::EPSILON)).ceil().max(FEWEST as f64) as u64)
    }

    /// The size by Fisher's formula with the bias of his transformation, `ρ/(2(n − 1))`, added to `artanh ρ`: less than
    /// that without it.
    fn with_bias(&self, at: Point) -> numerics::Result<f64> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        let sum = z_alpha + z_beta;
        let formula = |shift: f64| {
            let ratio = sum / (libm::atanh(at.effect) + shift);
            ratio * ratio + 3.0
        };
        let gap = |n: f64| Ok(formula(at.effect / (2.0 * (n - 1.0))) - n);
        let what = "size by Fisher's formula with bias";
        let found = roots::find_root_within(
            what,
            FEWEST as f64,
            formula(0.0).max(FEWEST as f64),
            roots::Tolerance::default(),
            gap,
        )?;
        Ok(found.at)
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

/// A value of `√W` and its probability.
#[derive(Debug, Clone, Copy)]
struct Node {
    weight: f64,
    root: f64,
}

/// Nodes of the trapezoidal sum over `v = ln(W/ν)`, where the density has not fallen by `exp(-41)`, 1.6e-18.
///
/// Its logarithm is `ν/2 (v + 1 − e^v)`; half a standard deviation as step leaves an error of `exp(-8 π²)` for a normal
/// shape, and a quarter at most is small beside the width of the power as a function of `v`.
fn nodes(df: f64) -> Vec<Node> {
    let step = (0.5 * (2.0 / df).sqrt()).min(0.25);
    let weight = |v: f64| {
        let exponent = 0.5 * df * (v - libm::expm1(v));
        (exponent >= -41.0).then(|| libm::exp(exponent))
    };
    let mut nodes = vec![Node { weight: 1.0, root: df.sqrt() }];
    for direction in [-step, step] {
        let mut count = 1.0;
        while let Some(weight) = weight(direction * count) {
            let root = df.sqrt() * libm::exp(0.5 * direction * count);
            nodes.push(Node { weight, root });
            count += 1.0;
        }
    }
    let sum: f64 = nodes.iter().map(|node| node.weight).sum();
    nodes.iter_mut().for_each(|node| node.weight /= sum);
    nodes
}

/// Where the noncentrality is cut: no critical value comes near it.
const LARGEST_NONCENTRALITY: f64 = 1e8;

/// Fisher's transform of the largest correlation that is looked at, `1 − 2e-13`.
const LARGEST_TRANSFORM: f64 = 15.0;

/// The t test at a fixed size.
#[derive(Debug, Clone)]
struct CorrelationAtSizes {
    df: f64,
    critical: f64,
    nodes: Vec<Node>,
    sides: Sides,
}

impl CorrelationAtSizes {
    /// The smaller of the power and its complement is summed, so that neither loses its digits.
    fn power_at(&self, slope: f64) -> numerics::Result<f64> {
        let at = |root: f64| NoncentralT::new(self.df, (slope * root).min(LARGEST_NONCENTRALITY));
        let both = self.sides == Sides::Two;
        let likely = self.nodes.first().map_or(Ok(0.0), |n| at(n.root)?.sf(self.critical))? > 0.5;
        let mut sum = 0.0;
        for node in &self.nodes {
            let t = at(node.root)?;
            let wrong = if both { t.cdf(-self.critical)? } else { 0.0 };
            sum += node.weight
                * if likely { t.cdf(self.critical)? - wrong } else { t.sf(self.critical)? + wrong };
        }
        Ok(if likely { 1.0 - sum } else { sum })
    }
}

impl AtSizes for CorrelationAtSizes {
    fn power(&self, at: Point) -> numerics::Result<f64> {
        if at.effect >= 1.0 { Ok(1.0) } else { self.power_at(slope(at.effect)) }
    }

    /// Found in Fisher's transform; 1 where no correlation short of it is detectable.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>> {
        let gap = |transform: f64| Ok(self.power_at(libm::sinh(transform))? - power);
        let what = "detectable correlation";
        if gap(LARGEST_TRANSFORM)? < 0.0 {
            return Ok(vec![1.0; nuisances.len()]);
        }
        let wanted = self.critical + normal_upper_quantile(1.0 - power)?.max(0.0);
        let start = (wanted / (self.df + 1.0).sqrt()).clamp(1e-6, 5.0);
        let limits = (0.0, LARGEST_TRANSFORM);
        let bracket = roots::bracket_around(what, start, 0.3 * start, limits, gap)?;
        let found = roots::refine(what, bracket, roots::Tolerance::default(), gap)?.at;
        Ok(vec![libm::tanh(found); nuisances.len()])
    }
}

impl Problem for Pairs {
    fn card(&self) -> &'static Card {
        &CARD
    }

    fn groups(&self) -> &[Group] {
        &self.groups
    }

    fn risk(&self) -> Risk {
        self.risk.risk
    }

    fn effect(&self) -> &Effect {
        &self.effect
    }

    fn spread(&self) -> Option<&Spread> {
        None
    }

    fn smallest_step(&self) -> u64 {
        FEWEST
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        let within = step <= LARGEST_SIZE;
        within.then(|| Sizes { step, per_group: vec![step], total: step })
    }

    fn effect_limit(&self) -> f64 {
        1.0
    }

    fn is_possible(&self, sizes: &Sizes) -> bool {
        sizes.total >= FEWEST
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        Ok(Box::new(self.fixed(sizes)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        let hundredths = |z: f64| (z * 100.0).round() / 100.0;
        let transform = libm::atanh(at.effect);
        let size = |a: f64, b: f64| ((a + b) / transform) * ((a + b) / transform) + 3.0;
        let step = size(z_alpha, z_beta);
        Ok(self.rounded_up(step).map(|sizes| Textbook {
            step,
            step_with_table_quantiles: size(hundredths(z_alpha), hundredths(z_beta)),
            z_alpha,
            z_beta,
            sizes,
        }))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let (z_alpha, _) = self.normal_quantiles()?;
        let root = (sizes.total as f64 - 3.0).max(0.0).sqrt();
        Ok(normal_cdf(root * libm::atanh(at.effect) - z_alpha))
    }

    fn textbook_detectable(&self, sizes: &Sizes, _nuisance: f64) -> numerics::Result<f64> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        Ok(libm::tanh((z_alpha + z_beta) / (sizes.total as f64 - 3.0).max(0.0).sqrt()))
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        let fixed = self.fixed(sizes)?;
        let square = fixed.critical * fixed.critical;
        Ok(Box::new(CorrelationTrial {
            n: sizes.total as usize,
            correlation: at.effect,
            critical: fixed.critical / (fixed.df + square).sqrt(),
            two_sided: self.risk.risk.sides == Sides::Two,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let step = self.with_bias(self.planned())?;
        let biased = self.rounded_up(step).map(|sizes| Rival {
            id: "fisher-with-bias",
            source: Some("fisher-1921"),
            answer: RivalAnswer::Formula { step, sizes },
        });
        let answer = RivalAnswer::Exact(self.changed(|p| p.method = Method::OneFixed));
        Ok(biased.into_iter().chain([Rival { id: "one-fixed", source: None, answer }]).collect())
    }

    fn levers(&self) -> Vec<Lever> {
        let mut levers = Vec::new();
        let clearer = self.effect.planned.value * 1.1;
        if CORRELATION_SIZE.check(clearer.abs()).is_ok() {
            let problem = self.changed(|p| p.effect.planned.value = clearer);
            levers.push(Lever { id: "sharper-measurement", value: Some(0.1), problem });
        }
        if self.risk.risk.sides == Sides::Two {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let fixed = self.fixed(sizes)?;
        let at = self.planned();
        let square = fixed.critical * fixed.critical;
        let facts = json!({
            "with": self.with,
            "risk": self.risk,
            "rising": self.effect.planned.value > 0.0,
            "comparisons": [{}],
            "degrees_of_freedom": fixed.df,
            "critical": fixed.critical,
            "critical_correlation": fixed.critical / (fixed.df + square).sqrt(),
            "transform": libm::atanh(at.effect),
            "slope": slope(at.effect),
        });
        Ok(match facts {
            serde_json::Value::Object(map) => map,
            _ => Facts::new(),
        })
    }
}

/// A simulated study: bivariate normal raw data, the correlation coefficient.
#[derive(Debug)]
struct CorrelationTrial {
    n: usize,
    correlation: f64,
    /// What the coefficient must exceed.
    critical: f64,
    two_sided: bool,
}

impl Trial for CorrelationTrial {
    fn comparisons(&self) -> usize {
        1
    }

    fn weakest(&self) -> usize {
        0
    }

    fn differing(&self) -> Vec<bool> {
        vec![self.correlation != 0.0]
    }

    fn values(&self) -> usize {
        2 * self.n
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
        let (first, second) = scratch.split_at(self.n);
        let rest = ((1.0 - self.correlation) * (1.0 + self.correlation)).sqrt();
        let rejects =
            |r: f64| if self.two_sided { r.abs() > self.critical } else { r > self.critical };
        let correlated = |(x, e): (&f64, &f64)| (*x, self.correlation * x + rest * e);
        planned.fill(rejects(coefficient(first.iter().zip(second).map(correlated))));
        null.fill(rejects(coefficient(first.iter().zip(second).map(|(x, e)| (*x, *e)))));
    }
}

/// The correlation coefficient of pairs that lie around 0.
fn coefficient(pairs: impl Iterator<Item = (f64, f64)>) -> f64 {
    let (mut n, mut x_sum, mut y_sum) = (0.0, 0.0, 0.0);
    let (mut xx, mut yy, mut xy) = (0.0, 0.0, 0.0);
    for (x, y) in pairs {
        n += 1.0;
        x_sum += x;
        y_sum += y;
        xx += x * x;
        yy += y * y;
        xy += x * y;
    }
    let covariance = xy - x_sum * y_sum / n;
    covariance / ((xx - x_sum * x_sum / n) * (yy - y_sum * y_sum / n)).sqrt()
}
