//! The difference to detect, with its basis: the smallest that matters, the realistic one, or both.

use schemars::JsonSchema;
use serde::Deserialize;

use super::assumed::Assumed;
use super::spread::Spread;
use crate::designs::{Effect, EffectBasis, Fault, Path};
use crate::quantities::{Assumption, DIFFERENCE, Grounds, Written};

/// What a single `difference` stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum BasisKey {
    /// The smallest difference that would matter.
    SmallestThatMatters,
    /// The difference that is realistic to expect.
    Realistic,
    /// It matters and is realistic.
    Both,
}

/// Which of two stated differences the size is computed for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum PlanFor {
    /// The smallest difference that would matter (the default).
    SmallestThatMatters,
    /// The difference that is realistic to expect.
    Realistic,
}

/// The difference between group means that the study must be able to detect, in the unit of the outcome. Give either
/// `difference` (with its `basis`), or `smallest-that-matters` and `realistic` as two values. A negative number says
/// that the later group, or the treatment, has the lower mean; it matters for one-sided tests.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct DifferenceKeys {
    /// The difference to detect.
    #[serde(default)]
    pub difference: Option<Assumed>,
    /// What `difference` stands for.
    #[serde(default)]
    pub basis: Option<BasisKey>,
    /// The smallest difference that would matter.
    #[serde(default)]
    pub smallest_that_matters: Option<Assumed>,
    /// The difference that is realistic to expect.
    #[serde(default)]
    pub realistic: Option<Assumed>,
    /// Which of the two the size is computed for; `smallest-that-matters` unless stated.
    #[serde(default)]
    pub plan_for: Option<PlanFor>,
    /// What the values rest on.
    #[serde(flatten)]
    pub grounds: Grounds,
}

/// Reads the difference; paths are relative to the mapping's own key `effect`.
///
/// # Errors
///
/// A difference of 0 or not finite, no difference at all, or two ways of stating it at once.
pub fn read_difference(keys: &DifferenceKeys) -> Result<Effect, Vec<Fault>> {
    let at = Path::of("effect");
    let mut faults = Vec::new();
    let mut checked = |key: &str, assumed: &Option<Assumed>| -> Option<Assumption> {
        let assumed = assumed.as_ref()?;
        if let Err(out) = DIFFERENCE.check(assumed.value().abs()) {
            let path = at.key(key).join(&Path::of(assumed.step()));
            faults.push(
                Fault::value(path, format!("the difference is {}", Written(assumed.value())))
                    .help(format!("it {}", out.range.advice)),
            );
        }
        Some(assumed.assumption(&keys.grounds))
    };
    let single = checked("difference", &keys.difference);
    let smallest = checked("smallest-that-matters", &keys.smallest_that_matters);
    let realistic = checked("realistic", &keys.realistic);
    contradictions(keys, &at, &mut faults);
    if !faults.is_empty() {
        return Err(faults);
    }
    choose(keys, single, smallest, realistic).ok_or_else(|| {
        vec![
            Fault::key(at, "no difference is stated")
                .help("give `difference`, or `smallest-that-matters` and `realistic`"),
        ]
    })
}

/// Most standard deviations that a difference may span.
const WIDEST: f64 = 1e6;

/// A difference so many standard deviations wide that one of the two is surely in another unit.
pub fn out_of_proportion(effect: &Effect, spread: &Spread) -> Option<Fault> {
    let ratio = effect.planned.value.abs() / spread.sd;
    (ratio > WIDEST).then(|| {
        Fault::key(
            Path::of("effect"),
            "the difference is more than a million standard deviations wide",
        )
        .help("give both in the unit of the outcome")
    })
}

fn contradictions(keys: &DifferenceKeys, at: &Path, faults: &mut Vec<Fault>) {
    let pair = keys.smallest_that_matters.is_some() || keys.realistic.is_some();
    if keys.difference.is_some() && pair {
        faults.push(Fault::key(at.key("difference"), "the difference is stated in two ways").help(
            "keep either `difference` with its `basis`, or `smallest-that-matters` and `realistic`",
        ));
    }
    if keys.difference.is_none() && keys.basis.is_some() {
        faults.push(
            Fault::key(at.key("basis"), "`basis` says what `difference` stands for, but there is no `difference`")
                .help("`smallest-that-matters` and `realistic` carry their basis in their names; drop `basis`"),
        );
    }
    if let (Some(a), Some(b)) = (&keys.smallest_that_matters, &keys.realistic)
        && a.value() * b.value() < 0.0
    {
        faults.push(
            Fault::value(
                at.key("realistic").join(&Path::of(b.step())),
                "the realistic difference has the other sign than the smallest that matters",
            )
            .help("both must point in the same direction"),
        );
    }
    if keys.plan_for == Some(PlanFor::Realistic) && keys.realistic.is_none() {
        faults.push(
            Fault::value(at.key("plan-for"), "no realistic difference is stated")
                .help("give `realistic`, or drop `plan-for`"),
        );
    }
    if keys.plan_for == Some(PlanFor::SmallestThatMatters) && keys.smallest_that_matters.is_none() {
        faults.push(
            Fault::value(at.key("plan-for"), "no smallest difference that matters is stated")
                .help("give `smallest-that-matters`, or drop `plan-for`"),
        );
    }
}

fn choose(
    keys: &DifferenceKeys,
    single: Option<Assumption>,
    smallest: Option<Assumption>,
    realistic: Option<Assumption>,
) -> Option<Effect> {
    if let Some(planned) = single {
        let basis = match keys.basis {
            Some(BasisKey::SmallestThatMatters) => EffectBasis::SmallestThatMatters,
            Some(BasisKey::Realistic) => EffectBasis::Realistic,
            Some(BasisKey::Both) => EffectBasis::Both,
            None => EffectBasis::Unstated,
        };
        return Some(Effect { planned, basis, other: None });
    }
    let smallest = smallest.map(|a| (EffectBasis::SmallestThatMatters, a));
    let realistic = realistic.map(|a| (EffectBasis::Realistic, a));
    let (first, second) = match keys.plan_for {
        Some(PlanFor::Realistic) => (realistic, smallest),
        _ => (smallest, realistic),
    };
    match (first, second) {
        (Some((basis, planned)), other) => Some(Effect { planned, basis, other }),
        (None, Some((basis, planned))) => Some(Effect { planned, basis, other: None }),
        (None, None) => None,
    }
}
