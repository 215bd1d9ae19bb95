//! Turns a checked study into a plan: smallest sizes, reverse questions, sensitivity, and the independent check.
//!
//! Every number is reached through [`Problem`], so a new design needs nothing here.

mod error;
mod firmness;
mod grid;
mod monte_carlo;
mod sample_size;
mod smaller;
mod totals;

pub use error::SolverError;
pub use grid::size_grid;
pub use monte_carlo::{Progress, Silent, seed_from};
pub use sample_size::smallest_sizes;

use crate::designs::Problem;
use crate::designs::{Point, RivalAnswer, Sizes};
use crate::plan::{
    Exact, ExperimentPlan, FORMAT, Fingerprints, LeverPlan, OtherEffect, Plan, RivalPlan,
};
use crate::study::{Experiment, Study};

/// Solves a study. The seed of the simulation derives from the hash of the spec; `progress` hears of finished
/// simulated studies.
///
/// # Errors
///
/// [`SolverError`] when a target is out of reach or a numerical routine fails; the first experiment that fails.
pub fn solve(
    study: &Study,
    fingerprints: Fingerprints,
    progress: &dyn Progress,
) -> Result<Plan, SolverError> {
    let experiments = study
        .experiments
        .iter()
        .map(|experiment| {
            let seed = seed_from(&fingerprints.spec.sha256, &experiment.id);
            solve_experiment(experiment, study.replicates, seed, progress)
        })
        .collect::<Result<Vec<_>, _>>()?;
    Ok(Plan {
        plan_format: FORMAT,
        program_version: env!("CARGO_PKG_VERSION"),
        totals: totals::totals(&experiments),
        fingerprints,
        title: study.title.clone(),
        authors: study.authors.clone(),
        date: study.date,
        purpose: study.purpose,
        language: study.language.clone(),
        advice: study.advice.clone(),
        experiments,
    })
}

fn solve_experiment(
    experiment: &Experiment,
    replicates: u64,
    seed: [u8; 32],
    progress: &dyn Progress,
) -> Result<ExperimentPlan, SolverError> {
    let problem = experiment.problem.as_ref();
    let within = |error| SolverError::in_experiment(&experiment.id, error);
    let exact = exact(problem).map_err(within)?;
    let ceiling = smaller::ceiling(experiment, &exact.sizes).map_err(within)?;
    Ok(ExperimentPlan {
        id: experiment.id.clone(),
        question: experiment.question.clone(),
        unit: experiment.unit.clone(),
        outcome: experiment.outcome.clone(),
        design: *problem.card(),
        analysis_defaulted: experiment.analysis_defaulted,
        groups: problem.groups().to_vec(),
        risk: problem.risk(),
        effect: problem.effect().clone(),
        spread: problem.spread().cloned(),
        planned: problem.planned(),
        analysis: problem.facts(&exact.sizes).map_err(|e| within(e.into()))?,
        textbook: problem.textbook(problem.planned()).map_err(|e| within(e.into()))?,
        request: totals::request(experiment, &exact.sizes).map_err(within)?,
        losses: experiment.losses.clone(),
        other_effect: other_effect(problem, &exact.sizes).map_err(within)?,
        firmness: firmness::firmness(problem, &exact.sizes, ceiling.as_ref()).map_err(within)?,
        smaller: smaller::smaller(problem, &exact.sizes).map_err(within)?,
        rivals: rivals(problem).map_err(within)?,
        levers: levers(problem, &exact.sizes).map_err(within)?,
        check: monte_carlo::check(problem, &exact, replicates, seed, progress).map_err(within)?,
        safeguards: experiment.safeguards.clone(),
        ceiling,
        exact,
    })
}

fn exact(problem: &dyn Problem) -> Result<Exact, SolverError> {
    let at = problem.planned();
    let target = problem.risk().power.get();
    let found = smallest_sizes(problem, at)?;
    let sizes = found.sizes;
    let textbook = problem.textbook(at)?;
    Ok(Exact {
        power: found.power,
        power_one_fewer: found.power_one_fewer,
        detectable: problem.detectable(&sizes, at.nuisance, target)?,
        textbook_power: problem.textbook_power(&sizes, at)?,
        power_at_textbook: textbook.map(|t| problem.power(&t.sizes, at)).transpose()?,
        sizes,
    })
}

fn other_effect(problem: &dyn Problem, sizes: &Sizes) -> Result<Option<OtherEffect>, SolverError> {
    let Some((_, other)) = &problem.effect().other else { return Ok(None) };
    let at = Point { effect: other.value.abs(), ..problem.planned() };
    let power = problem.power(sizes, at)?;
    let sizes = sample_size::within_reach(smallest_sizes(problem, at))?.map(|found| found.sizes);
    Ok(Some(OtherEffect { sizes, power }))
}

fn rivals(problem: &dyn Problem) -> Result<Vec<RivalPlan>, SolverError> {
    problem
        .rivals()?
        .into_iter()
        .map(|rival| {
            let (unrounded, sizes) = match rival.answer {
                RivalAnswer::Formula { step, sizes } => (Some(step), Some(sizes)),
                RivalAnswer::Exact(other) => {
                    let found = smallest_sizes(other.as_ref(), other.planned());
                    (None, sample_size::within_reach(found)?.map(|found| found.sizes))
                }
            };
            Ok(RivalPlan { id: rival.id, source: rival.source, unrounded, sizes })
        })
        .collect()
}

fn levers(problem: &dyn Problem, sizes: &Sizes) -> Result<Vec<LeverPlan>, SolverError> {
    let mut plans = Vec::new();
    for lever in problem.levers() {
        let found = smallest_sizes(lever.problem.as_ref(), lever.problem.planned());
        if let Some(found) = sample_size::within_reach(found)? {
            let saved = sizes.total as i64 - found.sizes.total as i64;
            plans.push(LeverPlan { id: lever.id, value: lever.value, sizes: found.sizes, saved });
        }
    }
    Ok(plans)
}
