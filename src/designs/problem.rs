//! A design with its numbers in place: what the solver can ask of it.

use std::fmt::Debug;

use serde::Serialize;

use super::Card;
use super::inputs::Spread;
use crate::numerics::{self, random::Stream};
use crate::quantities::{Assumption, Risk};

/// A group of units that is treated alike.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Group {
    /// Its name in the author's words.
    pub name: String,
    /// Its weight in the allocation, as the author wrote it.
    pub weight: f64,
    /// Whether the others are compared with it.
    pub control: bool,
}

/// Sizes of the groups in the analysis.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Sizes {
    /// Size of the group with the largest weight, the number that a search raises by one at a time.
    pub step: u64,
    /// Size of each group.
    pub per_group: Vec<u64>,
    /// Sum over the groups.
    pub total: u64,
}

/// A point in the space of assumptions.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Point {
    /// The effect, in the unit of the outcome where it has one.
    pub effect: f64,
    /// The nuisance value: a standard deviation, a control proportion, a rate; 1 where the design has none.
    pub nuisance: f64,
}

/// What the wanted effect stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum EffectBasis {
    /// The smallest effect that would matter.
    SmallestThatMatters,
    /// The effect that is realistic to expect.
    Realistic,
    /// Both at once: one value that matters and is realistic.
    Both,
    /// The author does not say; the report marks an open point.
    Unstated,
}

/// The wanted effect.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Effect {
    /// The effect that the size is computed for.
    pub planned: Assumption,
    /// What it stands for.
    pub basis: EffectBasis,
    /// The other of the two values, where the author gave both.
    pub other: Option<(EffectBasis, Assumption)>,
}

/// Result of a formula that can be redone on paper.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Textbook {
    /// The unrounded size of the group with the largest weight.
    pub step: f64,
    /// The same with the quantiles rounded to two decimals, as a printed table gives them.
    pub step_with_table_quantiles: f64,
    /// Upper normal quantile that belongs to the significance level.
    pub z_alpha: f64,
    /// Upper normal quantile that belongs to the type II error.
    pub z_beta: f64,
    /// Each group rounded up.
    pub sizes: Sizes,
}

/// Another method of the literature for the same plan.
#[derive(Debug)]
pub struct Rival {
    /// Names the sentence in the design's fragments that says why it differs.
    pub id: &'static str,
    /// Where the method is published.
    pub source: Option<&'static str>,
    /// What it gives.
    pub answer: RivalAnswer,
}

/// What another method gives, or what must be solved to know it.
#[derive(Debug)]
pub enum RivalAnswer {
    /// A closed formula: the unrounded size of the group with the largest weight, and the sizes rounded up.
    Formula {
        /// Unrounded.
        step: f64,
        /// Rounded up.
        sizes: Sizes,
    },
    /// A changed problem, solved exactly.
    Exact(Box<dyn Problem>),
}

/// A change of the design that would lower the number.
#[derive(Debug)]
pub struct Lever {
    /// Names the sentence in the design's fragments that says what must be true.
    pub id: &'static str,
    /// The value that characterises the change (a correlation, a fraction), where there is one.
    pub value: Option<f64>,
    /// The changed problem.
    pub problem: Box<dyn Problem>,
}

/// The numbers that a design's own fragments print, as a mapping.
pub type Facts = serde_json::Map<String, serde_json::Value>;

/// One simulated study, prepared so that it can be run many times.
pub trait Trial: Send + Sync {
    /// How many comparisons the analysis makes.
    fn comparisons(&self) -> usize;

    /// Position of the comparison whose power the plan is about.
    fn weakest(&self) -> usize;

    /// Whether each comparison has a true difference under the simulated truth.
    fn differing(&self) -> Vec<bool>;

    /// How many random values one study takes.
    fn values(&self) -> usize;

    /// Draws raw data, runs the analysis and notes which comparisons are rejected under the planned truth and,
    /// from the same draws, under no difference at all. `scratch` keeps its capacity between runs.
    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    );
}

/// A design at fixed sizes: what depends on the sizes alone (degrees of freedom, critical value) is computed once, so
/// that grids and curves over the assumptions reuse it.
pub trait AtSizes: Send + Sync {
    /// Exact power of the weakest comparison.
    ///
    /// # Errors
    ///
    /// A numerical failure, none for legal values inside the documented range.
    fn power(&self, at: Point) -> numerics::Result<f64>;

    /// Whether the exact power reaches a target; a design overrides it where the answer needs less than the number.
    ///
    /// # Errors
    ///
    /// As [`Self::power`].
    fn reaches(&self, at: Point, target: f64) -> numerics::Result<bool> {
        Ok(self.power(at)? >= target)
    }

    /// The effect at which the exact power equals `power`, for each nuisance value.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn detectable(&self, nuisances: &[f64], power: f64) -> numerics::Result<Vec<f64>>;
}

/// A design with its numbers in place.
///
/// Effects are handled by size: [`Point::effect`] is positive, its direction only words.
pub trait Problem: Debug + Send + Sync {
    /// The design it belongs to.
    fn card(&self) -> &'static Card;

    /// The groups in the author's order.
    fn groups(&self) -> &[Group];

    /// Error rates.
    fn risk(&self) -> Risk;

    /// The wanted effect.
    fn effect(&self) -> &Effect;

    /// The nuisance value and its evidence, where the design has one.
    fn spread(&self) -> Option<&Spread>;

    /// The planned point.
    fn planned(&self) -> Point {
        let nuisance = self.spread().map_or(1.0, |spread| spread.sd);
        Point { effect: self.effect().planned.value.abs(), nuisance }
    }

    /// The smallest step for which the analysis exists.
    fn smallest_step(&self) -> u64;

    /// Sizes of all groups when the group with the largest weight has `step` units; no group shrinks as it grows. `None` when a size would exceed [`crate::quantities::LARGEST_SIZE`].
    fn sizes(&self, step: u64) -> Option<Sizes>;

    /// The step from which on a power that has reached the target is not lost again as the step grows. A search tries
    /// every step below it, where the power may fall back, as it can when a step adds units to one group alone.
    fn rising_from(&self) -> u64 {
        self.smallest_step()
    }

    /// Effects lie below this limit: 1 for a correlation, none for a difference.
    fn effect_limit(&self) -> f64 {
        f64::INFINITY
    }

    /// Whether the analysis exists at sizes that need not belong to a step, such as those left after losses.
    fn is_possible(&self, sizes: &Sizes) -> bool {
        sizes.per_group.iter().all(|n| *n >= 2)
    }

    /// The analysis at fixed sizes.
    ///
    /// # Errors
    ///
    /// A numerical failure, none for sizes of at least [`Self::smallest_step`].
    fn at_sizes(&self, sizes: &Sizes) -> numerics::Result<Box<dyn AtSizes>>;

    /// Exact power of the weakest comparison.
    ///
    /// # Errors
    ///
    /// As [`Self::at_sizes`] and [`AtSizes::power`].
    fn power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64> {
        self.at_sizes(sizes)?.power(at)
    }

    /// The effect at which the exact power of the weakest comparison equals `power`.
    ///
    /// # Errors
    ///
    /// As [`Self::at_sizes`] and [`AtSizes::detectable`].
    fn detectable(&self, sizes: &Sizes, nuisance: f64, power: f64) -> numerics::Result<f64> {
        let found = self.at_sizes(sizes)?.detectable(&[nuisance], power)?;
        Ok(found.first().copied().unwrap_or(f64::NAN))
    }

    /// The textbook formula at a point; `None` when its result exceeds the largest size.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn textbook(&self, at: Point) -> numerics::Result<Option<Textbook>>;

    /// The textbook formula turned round: power at given sizes.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn textbook_power(&self, sizes: &Sizes, at: Point) -> numerics::Result<f64>;

    /// The textbook formula turned round: the effect detectable at given sizes.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn textbook_detectable(&self, sizes: &Sizes, nuisance: f64) -> numerics::Result<f64>;

    /// A simulated study at given sizes.
    ///
    /// # Errors
    ///
    /// A numerical failure in preparing its critical value.
    fn trial(&self, sizes: &Sizes, at: Point) -> numerics::Result<Box<dyn Trial>>;

    /// What other methods of the literature give.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn rivals(&self) -> numerics::Result<Vec<Rival>>;

    /// Changes of the design that would lower the number.
    fn levers(&self) -> Vec<Lever>;

    /// The numbers that the design's own fragments print, at the chosen sizes.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    fn facts(&self, sizes: &Sizes) -> numerics::Result<Facts>;
}
