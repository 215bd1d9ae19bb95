//! From sizes in the analysis to units to ask for, and sums over experiments.

use super::error::SolverError;
use crate::designs::Sizes;
use crate::plan::{ExperimentPlan, Request, Total};
use crate::study::Experiment;

/// Units to ask for: each group enlarged so that enough remain after losses, then further units.
pub(super) fn request(experiment: &Experiment, sizes: &Sizes) -> Result<Request, SolverError> {
    let per_group = sizes
        .per_group
        .iter()
        .map(|n| experiment.losses.ask_for(*n).ok_or(SolverError::TooMany))
        .collect::<Result<Vec<_>, _>>()?;
    let groups_total = sum(per_group.iter().copied())?;
    let further = |individuals: bool| {
        let of_kind = experiment.further_units.iter().filter(|f| f.individuals == individuals);
        sum(of_kind.map(|f| f.count))
    };
    let (further_units, further_individuals) = (further(false)?, further(true)?);
    let units = sum([groups_total, further_units].into_iter())?;
    let held = |units: u64| match &experiment.unit.holds {
        None => Ok(None),
        Some(holds) => units.checked_mul(holds.each).map(Some).ok_or(SolverError::TooMany),
    };
    let individuals = match held(units)? {
        None => None,
        Some(held) => Some(sum([held, further_individuals].into_iter())?),
    };
    Ok(Request {
        per_group,
        groups_total,
        further: experiment.further_units.clone(),
        further_units,
        further_individuals,
        held_in_groups: held(groups_total)?,
        units,
        individuals,
    })
}

fn sum(mut numbers: impl Iterator<Item = u64>) -> Result<u64, SolverError> {
    numbers.try_fold(0u64, u64::checked_add).ok_or(SolverError::TooMany)
}

/// Sums over experiments: what has the same name and kind is added up, in order of first appearance.
pub(super) fn totals(experiments: &[ExperimentPlan]) -> Vec<Total> {
    let mut totals: Vec<Total> = Vec::new();
    let mut add = |total: Total| {
        let same = |t: &&mut Total| t.name == total.name && t.kind == total.kind;
        match totals.iter_mut().find(same) {
            Some(known) => known.count = known.count.saturating_add(total.count),
            None => totals.push(total),
        }
    };
    for experiment in experiments {
        let unit = &experiment.unit;
        add(Total {
            name: unit.name.clone(),
            plural: unit.plural.clone(),
            kind: unit.kind,
            held: false,
            count: experiment.request.units,
        });
        if let (Some(holds), Some(count)) = (&unit.holds, experiment.request.individuals) {
            add(Total {
                name: holds.name.clone(),
                plural: holds.plural.clone(),
                kind: holds.kind,
                held: true,
                count,
            });
        }
    }
    totals
}
