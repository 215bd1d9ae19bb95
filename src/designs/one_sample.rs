//! The one-sample t test, which a group compared with a reference value and the differences within pairs share.
//!
//! For `n` independent values with mean `μ`, standard deviation `σ` and a value `μ₀` under the null hypothesis (the
//! reference value; 0 for differences within pairs), with `δ` the size of `μ − μ₀`:
//!
//! ```text
//! T = (mean − μ₀) / (s / √n),   s on ν = n − 1 degrees of freedom
//! power, one-sided = P(T(ν, λ) > t)
//! power, two-sided = P(T(ν, λ) > t) + P(T(ν, λ) < −t),   λ = δ √n / σ
//! ```
//!
//! where `t` is the upper `α/sides` quantile of Student's t with `ν` degrees of freedom. The textbook formula takes
//! `σ` as known: `n = (z_{1−α/sides} + z_{1−β})² σ² / δ²`.
//!
//! Sources: Student (1908); Cohen (1988), section 2.3 (cases 3 and 4, one sample and matched pairs); Guenther (1981)
//! for the correction `z²/2`; NIST/SEMATECH e-Handbook, section 7.2.2.2, for the iteration with quantiles of t; van
//! Belle (2008), section 2.1, for the multipliers 8 and 11 (the sections from memory).

use std::fmt::Debug;

use serde::Serialize;
use serde_json::json;

use super::inputs::{RiskKeys, Spread, StatedRisk};
use super::pairs::TTest;
use super::problem::{
    AtSizes, Effect, Facts, Group, Lever, Point, Problem, Rival, RivalAnswer, Sizes, Textbook,
    Trial,
};
use super::{Card, Fault, Path};
use crate::numerics::{
    self, Continuous, NumericsError, StudentT, integer_search, normal_cdf, normal_upper_quantile,
    random::Stream,
};
use crate::quantities::{Assumption, LARGEST_SIZE, Risk, Sides};

/// The smallest number of values that have a standard deviation.
const FEWEST: u64 = 2;

/// What the values of the test are: the part in which its designs differ.
pub(super) trait Setting: Debug + Clone + Send + Sync + 'static {
    /// The design.
    fn card(&self) -> &'static Card;

    /// Methods that only this design has as neighbours.
    fn own_rivals(&self, problem: &OneSample<Self>) -> Vec<Rival>;

    /// Numbers that only this design prints.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn own_facts(&self, problem: &OneSample<Self>, sizes: &Sizes) -> numerics::Result<Facts>;
}

/// An assumption of a design besides effect, spread and error rates, for the table of inputs.
#[derive(Debug, Clone, Serialize)]
pub(super) struct FurtherInput {
    /// Names its words in the design's fragments.
    pub(super) id: &'static str,
    /// The assumption.
    #[serde(flatten)]
    pub(super) assumption: Assumption,
}

/// A one-sample t test with its numbers in place.
#[derive(Debug, Clone)]
pub(super) struct OneSample<S> {
    pub(super) setting: S,
    pub(super) effect: Effect,
    pub(super) spread: Spread,
    pub(super) risk: StatedRisk,
    /// The one group; it needs no name, since nothing is compared with it.
    group: [Group; 1],
}

/// A fault where something is said about several comparisons although there is one.
pub(super) fn one_comparison(keys: &RiskKeys) -> Option<Fault> {
    keys.multiplicity.map(|_| {
        Fault::key(
            Path::of("risk.multiplicity"),
            "there is one comparison, so there is no multiplicity to protect against",
        )
        .help("drop `multiplicity`")
    })
}

/// The sizes of one group.
fn alone(n: u64) -> Sizes {
    Sizes { step: n, per_group: vec![n], total: n }
}

impl<S: Setting> OneSample<S> {
    pub(super) fn new(setting: S, effect: Effect, spread: Spread, risk: StatedRisk) -> Self {
        let group = [Group { name: String::new(), weight: 1.0, control: false }];
        Self { setting, effect, spread, risk, group }
    }

    fn tail(&self) -> f64 {
        self.risk.risk.alpha.get() / self.risk.risk.sides.count()
    }

    fn fixed(&self, n: u64) -> numerics::Result<TTest> {
        let df = n.saturating_sub(1) as f64;
        Ok(TTest {
            df,
            critical: StudentT::new(df)?.upper_quantile(self.tail())?,
            factor: 1.0 / (n as f64).sqrt(),
            sides: self.risk.risk.sides,
        })
    }

    fn normal_quantiles(&self) -> numerics::Result<(f64, f64)> {
        let z_alpha = normal_upper_quantile(self.tail())?;
        let z_beta = normal_upper_quantile(1.0 - self.risk.risk.power.get())?;
        Ok((z_alpha, z_beta))
    }

    /// The size that belongs to an unrounded one; a whole number blurred by rounding stays what it is.
    fn rounded_up(step: f64) -> Option<Sizes> {
        let step = (step * (1.0 - 4.0 * f64::EPSILON)).ceil().max(FEWEST as f64);
        (step <= LARGEST_SIZE as f64).then(|| alone(step as u64))
    }

    /// The smallest size whose exact power reaches the target at a point; `None` beyond the largest size.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    pub(super) fn smallest(&self, at: Point) -> numerics::Result<Option<u64>> {
        let hint = self.textbook(at)?.map(|textbook| textbook.sizes.step);
        let power = |n| self.fixed(n)?.power(at);
        let target = self.risk.risk.power.get();
        within_reach(integer_search::smallest_rising(FEWEST, LARGEST_SIZE, hint, target, power))
    }

    /// The formula with quantiles of t in place of normal ones, repeated until the size agrees with its degrees of
    /// freedom: the unrounded result at that size, and the size.
    fn with_t_quantiles(&self) -> numerics::Result<Option<(f64, u64)>> {
        let at = self.planned();
        let ratio = at.nuisance / at.effect;
        let beta = 1.0 - self.risk.risk.power.get();
        let formula = |n: u64| -> numerics::Result<f64> {
            let t = StudentT::new(n.saturating_sub(1) as f64)?;
            let root = (t.upper_quantile(self.tail())? + t.upper_quantile(beta)?) * ratio;
            Ok(root * root)
        };
        let hint = self.textbook(at)?.map(|textbook| textbook.sizes.step);
        let agrees = |n| Ok(n as f64 >= formula(n)?);
        let found = integer_search::smallest_monotone(FEWEST, LARGEST_SIZE, hint, agrees);
        within_reach(found)?.map(|n| Ok((formula(n)?, n))).transpose()
    }

    fn formula(&self, id: &'static str, source: &'static str, step: f64) -> Option<Rival> {
        let sizes = Self::rounded_up(step)?;
        Some(Rival { id, source: Some(source), answer: RivalAnswer::Formula { step, sizes } })
    }

    /// The multiplier of the rule of thumb, which knows two-sided tests at 5 % and two powers.
    fn multiplier(&self) -> Option<f64> {
        let risk = self.risk.risk;
        match risk.power.get() {
            _ if risk.sides == Sides::One || risk.alpha.get() != 0.05 => None,
            0.8 => Some(8.0),
            0.9 => Some(11.0),
            _ => None,
        }
    }

    fn changed(&self, change: impl FnOnce(&mut Self)) -> Box<dyn Problem> {
        let mut other = self.clone();
        change(&mut other);
        Box::new(other)
    }
}

/// Out of reach is an answer where a neighbouring number is looked for.
fn within_reach(
    found: numerics::Result<integer_search::Smallest>,
) -> numerics::Result<Option<u64>> {
    match found {
        Ok(found) => Ok(Some(found.n)),
        Err(NumericsError::TargetOutOfReach { .. }) => Ok(None),
        Err(other) => Err(other),
    }
}

impl<S: Setting> Problem for OneSample<S> {
    fn card(&self) -> &'static Card {
        self.setting.card()
    }

    fn groups(&self) -> &[Group] {
        &self.group
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
        FEWEST
    }

    fn sizes(&self, step: u64) -> Option<Sizes> {
        (step <= LARGEST_SIZE).then(|| alone(step))
    }

    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>> {
        Ok(Box::new(self.fixed(sizes.total)?))
    }

    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        let hundredths = |z: f64| (z * 100.0).round() / 100.0;
        let ratio = at.nuisance / at.effect;
        let size = |a: f64, b: f64| ((a + b) * ratio) * ((a + b) * ratio);
        let step = size(z_alpha, z_beta);
        Ok(Self::rounded_up(step).map(|sizes| Textbook {
            step,
            step_with_table_quantiles: size(hundredths(z_alpha), hundredths(z_beta)),
            z_alpha,
            z_beta,
            sizes,
        }))
    }

    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        let (z_alpha, _) = self.normal_quantiles()?;
        Ok(normal_cdf(at.effect * (sizes.total as f64).sqrt() / at.nuisance - z_alpha))
    }

    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64> {
        let (z_alpha, z_beta) = self.normal_quantiles()?;
        Ok((z_alpha + z_beta) * nuisance / (sizes.total as f64).sqrt())
    }

    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>> {
        Ok(Box::new(OneSampleTrial {
            size: sizes.total as usize,
            critical: self.fixed(sizes.total)?.critical,
            two_sided: self.risk.risk.sides == Sides::Two,
            shift: at.effect / at.nuisance,
        }))
    }

    fn rivals(&self) -> numerics::Result<Vec<Rival>> {
        let at = self.planned();
        let mut rivals = Vec::new();
        if let Some(textbook) = self.textbook(at)? {
            let step = textbook.step + textbook.z_alpha * textbook.z_alpha / 2.0;
            rivals.extend(self.formula("guenther", "guenther-1981", step));
        }
        if let Some((step, n)) = self.with_t_quantiles()? {
            let answer = RivalAnswer::Formula { step, sizes: alone(n) };
            rivals.push(Rival { id: "t-quantiles", source: Some("nist-handbook"), answer });
        }
        if let Some(multiplier) = self.multiplier() {
            let ratio = at.nuisance / at.effect;
            let step = multiplier * ratio * ratio;
            rivals.extend(self.formula("rule-of-thumb", "van-belle-2008", step));
        }
        rivals.extend(self.setting.own_rivals(self));
        Ok(rivals)
    }

    fn levers(&self) -> Vec<Lever> {
        let problem = self.changed(|p| p.spread.sd *= 0.8);
        let mut levers = vec![Lever { id: "sharper-measurement", value: Some(0.2), problem }];
        if self.risk.risk.sides == Sides::Two {
            let problem = self.changed(|p| p.risk.risk.sides = Sides::One);
            levers.push(Lever { id: "one-sided", value: None, problem });
        }
        levers
    }

    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts> {
        let fixed = self.fixed(sizes.total)?;
        let at = self.planned();
        let noncentrality = at.effect / (at.nuisance * fixed.factor);
        let power = fixed.power_at(noncentrality)?;
        let shared = json!({
            "comparisons": [{"noncentrality": noncentrality, "power": power}],
            "weakest": 0,
            "balanced": true,
            "risk": self.risk,
            "rising": self.effect.planned.value > 0.0,
            "degrees_of_freedom": fixed.df,
            "critical": fixed.critical,
            "standardised": at.effect / at.nuisance,
            "noncentrality": noncentrality,
        });
        let mut facts = self.setting.own_facts(self, sizes)?;
        if let serde_json::Value::Object(shared) = shared {
            facts.extend(shared);
        }
        Ok(facts)
    }
}

/// A simulated study: standard normal raw values and their t statistic.
#[derive(Debug)]
struct OneSampleTrial {
    size: usize,
    critical: f64,
    two_sided: bool,
    /// The planned difference in units of the standard deviation.
    shift: f64,
}

impl Trial for OneSampleTrial {
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
        self.size
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        scratch.resize(self.size, 0.0);
        stream.fill_normal(scratch);
        let (mut sum, mut squares) = (0.0, 0.0);
        for value in scratch.iter() {
            sum += value;
            squares += value * value;
        }
        let count = self.size as f64;
        let mean = sum / count;
        let variance = (squares - sum * mean) / (count - 1.0);
        let limit = self.critical * (variance / count).sqrt();
        let rejects = |mean: f64| if self.two_sided { mean.abs() > limit } else { mean > limit };
        planned.fill(rejects(mean + self.shift));
        null.fill(rejects(mean));
    }
}
