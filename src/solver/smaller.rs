//! If fewer units are to be had: the ceiling, and a ladder of smaller studies.

use super::error::SolverError;
use crate::designs::{Point, Problem, Sizes};
use crate::plan::{CeilingPlan, Outlook, Smaller};
use crate::study::{CeilingLimit, Experiment};

/// What the ceiling allows; `None` when there is none.
pub(super) fn ceiling(
    experiment: &Experiment,
    needed: &Sizes,
) -> Result<Option<CeilingPlan>, SolverError> {
    let Some(ceiling) = &experiment.ceiling else { return Ok(None) };
    let problem = experiment.problem.as_ref();
    let asked = needed
        .per_group
        .iter()
        .map(|n| experiment.losses.ask_for(*n).ok_or(SolverError::TooMany))
        .collect::<Result<Vec<_>, _>>()?;
    let fits = match ceiling.limit {
        CeilingLimit::PerGroup(limit) => asked.iter().all(|n| *n <= limit),
        CeilingLimit::Total(limit) => asked.iter().sum::<u64>() <= limit,
    };
    let mut start = start_under(problem, ceiling.limit);
    let asked_total = asked.iter().sum::<u64>();
    if fits && start.total < asked_total {
        // Losses are rounded up group by group, so what is asked for need not lie in the allocation itself.
        let step = asked.iter().copied().max().unwrap_or(0);
        start = Sizes { step, per_group: asked, total: asked_total };
    }
    let remain = remaining(experiment, &start)?;
    let smallest_step = problem.smallest_step();
    let outlook = match remain.step >= smallest_step && problem.is_possible(&remain) {
        true => Some(outlook(problem, &start, &remain)?),
        false => None,
    };
    Ok(Some(CeilingPlan { ceiling: ceiling.clone(), start, remain, fits, outlook, smallest_step }))
}

fn outlook(problem: &dyn Problem, start: &Sizes, remain: &Sizes) -> Result<Outlook, SolverError> {
    let (at, target) = (problem.planned(), problem.risk().power.get());
    let other = problem.effect().other.as_ref().map(|(_, other)| other.value.abs());
    let other = other.map(|effect| problem.power(remain, Point { effect, ..at })).transpose()?;
    Ok(Outlook {
        power: problem.power(remain, at)?,
        power_without_losses: problem.power(start, at)?,
        detectable: problem.detectable(remain, at.nuisance, target)?,
        textbook_detectable: problem.textbook_detectable(remain, at.nuisance)?,
        textbook_power: problem.textbook_power(remain, at)?,
        other_power: other,
    })
}

/// The largest sizes in the wanted allocation that stay under the limit.
fn start_under(problem: &dyn Problem, limit: CeilingLimit) -> Sizes {
    let under = |sizes: &Sizes| match limit {
        CeilingLimit::PerGroup(most) => sizes.per_group.iter().all(|n| *n <= most),
        CeilingLimit::Total(most) => sizes.total <= most,
    };
    let most = match limit {
        CeilingLimit::PerGroup(most) | CeilingLimit::Total(most) => most,
    };
    let (mut low, mut high) = (0, most.saturating_add(1));
    while high - low > 1 {
        let middle = low + (high - low) / 2;
        if problem.sizes(middle).is_some_and(|sizes| under(&sizes)) {
            low = middle;
        } else {
            high = middle;
        }
    }
    let none = || {
        let per_group = vec![0; problem.groups().len()];
        Sizes { step: 0, per_group, total: 0 }
    };
    problem.sizes(low).filter(|_| low > 0).unwrap_or_else(none)
}

fn remaining(experiment: &Experiment, start: &Sizes) -> Result<Sizes, SolverError> {
    let per_group = start
        .per_group
        .iter()
        .map(|n| experiment.losses.remain(*n).ok_or(SolverError::TooMany))
        .collect::<Result<Vec<_>, _>>()?;
    let total = per_group.iter().sum();
    let step = per_group.iter().copied().max().unwrap_or(0);
    Ok(Sizes { step, per_group, total })
}

/// Studies of about one, two, three and four fifths of the size, and of the size itself.
pub(super) fn smaller(problem: &dyn Problem, needed: &Sizes) -> Result<Vec<Smaller>, SolverError> {
    let (at, target) = (problem.planned(), problem.risk().power.get());
    let mut steps: Vec<u64> =
        [2, 4, 6, 8, 10].iter().map(|tenths| (needed.step * tenths).div_ceil(10)).collect();
    steps.retain(|step| *step >= problem.smallest_step());
    steps.dedup();
    steps
        .into_iter()
        .filter_map(|step| problem.sizes(step))
        .map(|sizes| {
            Ok(Smaller {
                power: problem.power(&sizes, at)?,
                detectable: problem.detectable(&sizes, at.nuisance, target)?,
                sizes,
            })
        })
        .collect()
}
