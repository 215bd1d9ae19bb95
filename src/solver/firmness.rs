//! How firm the number is: bounds of the spread, a table of sizes, and the data of the figures.

use super::error::SolverError;
use super::grid::size_grid;
use super::sample_size::{smallest_for, smallest_sizes, within_reach};
use crate::designs::{Point, Problem, Sizes};
use crate::plan::{Bound, Bounds, CeilingPlan, Columns, ContourLine, Contours, Curves, Firmness};

/// Level of the confidence limits that serve as plausible bounds of the spread.
const LIMITS_LEVEL: f64 = 0.8;

/// Bounds of a spread of unknown precision, relative to it (common practice, not a confidence statement).
const CONVENTIONAL_SPAN: (f64, f64) = (0.8, 1.25);

/// Effects of the table, relative to the planned one.
const TABLE_EFFECTS: [f64; 5] = [0.7, 0.85, 1.0, 1.15, 1.3];

/// A ceiling farther off than so many times the chosen size is left out of the figures, which would show little else.
const FARTHEST_CEILING: u64 = 3;

/// Points of a power curve.
const CURVE_POINTS: u64 = 48;

/// Spreads at which a contour line is computed.
const CONTOUR_POINTS: usize = 21;

pub(super) fn firmness(
    problem: &dyn Problem,
    sizes: &Sizes,
    ceiling: Option<&CeilingPlan>,
) -> Result<Firmness, SolverError> {
    let planned = problem.planned();
    let mut table_effects: Vec<_> = TABLE_EFFECTS.iter().map(|f| f * planned.effect).collect();
    table_effects.retain(|effect| *effect < problem.effect_limit());
    let Some(spread) = problem.spread() else {
        return without_spread(problem, sizes, ceiling, table_effects);
    };
    let limits = spread.limits(LIMITS_LEVEL)?;
    let (low, high) = limits.unwrap_or((
        planned.nuisance * CONVENTIONAL_SPAN.0,
        planned.nuisance * CONVENTIONAL_SPAN.1,
    ));
    let spreads = vec![low, planned.nuisance, high];
    Ok(Firmness {
        bounds: Some(Bounds {
            low: bound(problem, sizes, low)?,
            high: bound(problem, sizes, high)?,
            limits_level: limits.map(|_| LIMITS_LEVEL),
        }),
        table: size_grid(problem, &table_effects, &spreads)?,
        table_effects,
        curves: curves(problem, sizes, &[planned.nuisance, low, high], ceiling)?,
        contours: Some(contours(problem, sizes, (low, high), ceiling)?),
        table_columns: Columns::Spreads(spreads),
    })
}

/// Where nothing but the effect is assumed, the table looks at powers to aim for.
fn without_spread(
    problem: &dyn Problem,
    sizes: &Sizes,
    ceiling: Option<&CeilingPlan>,
    table_effects: Vec<f64>,
) -> Result<Firmness, SolverError> {
    let mut powers = vec![0.8, 0.9, 0.95, problem.risk().power.get()];
    powers.sort_by(f64::total_cmp);
    powers.dedup();
    let cell = |effect: f64, power: f64| {
        let at = Point { effect, ..problem.planned() };
        let found = within_reach(smallest_for(problem, at, power))?;
        Ok(found.map(|found| found.sizes.step))
    };
    let row = |effect: &f64| powers.iter().map(|power| cell(*effect, *power)).collect();
    let table = table_effects.iter().map(row).collect::<Result<Vec<_>, SolverError>>()?;
    Ok(Firmness {
        bounds: None,
        table,
        table_effects,
        curves: curves(problem, sizes, &[problem.planned().nuisance], ceiling)?,
        contours: None,
        table_columns: Columns::Powers(powers),
    })
}

fn bound(problem: &dyn Problem, sizes: &Sizes, spread: f64) -> Result<Bound, SolverError> {
    let at = Point { nuisance: spread, ..problem.planned() };
    let power = problem.power(sizes, at)?;
    let sizes = within_reach(smallest_sizes(problem, at))?.map(|found| found.sizes);
    Ok(Bound { spread, sizes, power })
}

fn curves(
    problem: &dyn Problem,
    sizes: &Sizes,
    spreads: &[f64],
    ceiling: Option<&CeilingPlan>,
) -> Result<Curves, SolverError> {
    let first = problem.smallest_step();
    let roomy = sizes.step.saturating_mul(FARTHEST_CEILING);
    let limit = ceiling.map(|c| c.remain.step).filter(|step| *step <= roomy);
    let shown = sizes.step.max(limit.unwrap_or(0)).max(first + 4);
    let last = shown.saturating_mul(2);
    let stride = (last - first).div_ceil(CURVE_POINTS).max(1);
    let mut steps: Vec<u64> =
        (first..=last).step_by(usize::try_from(stride).unwrap_or(usize::MAX)).collect();
    steps.push(sizes.step);
    steps.sort_unstable();
    steps.dedup();
    steps.retain(|step| problem.sizes(*step).is_some());
    let mut powers: [Vec<f64>; 3] = Default::default();
    for sizes in steps.iter().filter_map(|step| problem.sizes(*step)) {
        let fixed = problem.at_sizes(&sizes)?;
        for (nuisance, powers) in spreads.iter().zip(&mut powers) {
            powers.push(fixed.power(Point { nuisance: *nuisance, ..problem.planned() })?);
        }
    }
    let [planned, low, high] = powers;
    Ok(Curves { steps, planned, low, high })
}

/// Lines of equal size, found from the effect that each size detects: a few root searches a line instead of a size
/// search for every point of a grid.
fn contours(
    problem: &dyn Problem,
    sizes: &Sizes,
    (low, high): (f64, f64),
    ceiling: Option<&CeilingPlan>,
) -> Result<Contours, SolverError> {
    let planned = problem.planned().nuisance;
    let (from, to) = (low.min(planned) * 0.8, high.max(planned) * 1.15);
    let width = (to - from) / (CONTOUR_POINTS - 1) as f64;
    let spreads: Vec<_> = (0..CONTOUR_POINTS).map(|i| from + width * i as f64).collect();
    let target = problem.risk().power.get();
    let mut steps: Vec<(u64, bool)> = ladder(problem.smallest_step(), sizes.step);
    if let Some(ceiling) = ceiling {
        let step = ceiling.remain.step;
        let shown =
            ceiling.outlook.is_some() && step <= sizes.step.saturating_mul(FARTHEST_CEILING);
        steps.retain(|(other, _)| !shown || *other != step);
        steps.extend(shown.then_some((step, true)));
    }
    steps.sort_unstable();
    let mut lines = Vec::new();
    for (step, is_ceiling) in steps {
        let Some(sizes) = problem.sizes(step) else { continue };
        let effects = problem.at_sizes(&sizes)?.detectable(&spreads, target)?;
        lines.push(ContourLine { step, ceiling: is_ceiling, effects });
    }
    Ok(Contours { spreads, lines })
}

/// Sizes around the chosen one, each about 1.5 times the one before.
fn ladder(smallest: u64, chosen: u64) -> Vec<(u64, bool)> {
    let mut steps: Vec<u64> = [(4, 9), (2, 3), (1, 1), (3, 2), (9, 4), (27, 8)]
        .iter()
        .map(|(top, bottom)| (chosen.saturating_mul(*top) + bottom / 2) / bottom)
        .filter(|step| *step >= smallest)
        .collect();
    steps.dedup();
    steps.into_iter().map(|step| (step, false)).collect()
}
