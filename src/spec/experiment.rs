//! The meaning of one experiment: what every design shares; the rest is read by the design itself.

use super::choose::Choice;
use super::finding::{Finding, RestsOn};
use super::raw::{CeilingKeys, CommonExperiment, CountOf, LossesKeys};
use crate::designs::{Fault, Path, Problem, Tables};
use crate::quantities::{Losses, OutOfRange, Written};
use crate::study::{Ceiling, CeilingLimit, Experiment, FurtherUnits};

/// Reads an experiment; `Ok(None)` when its design is not known, which is reported elsewhere.
///
/// # Errors
///
/// Every finding, with its path below the experiment.
pub(super) fn read(
    keys: &CommonExperiment,
    value: &serde_yaml::Value,
    choice: Option<Choice>,
    tables: &dyn Tables,
) -> Result<Option<Experiment>, Vec<Finding>> {
    let mut findings: Vec<Finding> = Vec::new();
    let of_part = |fault| Finding::from(fault).resting_on(RestsOn::Part);
    let problem = choice.and_then(|choice| {
        let read = choice.design.read(value, &keys.outcome, tables);
        read.map_err(|faults| findings.extend(faults.into_iter().map(of_part))).ok()
    });
    let losses = losses(keys.losses.as_ref()).map_err(|fault| findings.push(fault.into())).ok();
    let ceiling = keys.ceiling.as_ref().map(|ceiling| read_ceiling(ceiling, problem.as_deref()));
    let ceiling = ceiling.transpose().map_err(|fault| findings.push(fault.into())).ok().flatten();
    let further_units = further_units(keys, &mut findings);
    if !findings.is_empty() {
        return Err(findings);
    }
    let (Some(choice), Some(problem), Some(losses)) = (choice, problem, losses) else {
        return Ok(None);
    };
    Ok(Some(Experiment {
        id: keys.id.clone(),
        question: keys.question.clone(),
        unit: keys.unit.clone(),
        outcome: keys.outcome.clone(),
        design: choice.design,
        analysis_defaulted: choice.analysis_defaulted,
        problem,
        losses,
        ceiling,
        further_units,
        safeguards: keys.safeguards.clone(),
    }))
}

fn losses(keys: Option<&LossesKeys>) -> Result<Losses, Fault> {
    let refuse = |at: &'static str| {
        move |out: OutOfRange| {
            Fault::value(Path::of(at), format!("{} is {}", out.range.name, Written(out.given)))
                .help(format!("it {}", out.range.advice))
        }
    };
    match keys {
        None => Losses::unstated().map_err(refuse("losses")),
        Some(LossesKeys::Bare(fraction)) => {
            Losses::stated(*fraction, crate::quantities::Grounds::default())
                .map_err(refuse("losses"))
        }
        Some(LossesKeys::Told(told)) => {
            Losses::stated(told.fraction, told.grounds.clone()).map_err(refuse("losses.fraction"))
        }
    }
}

fn read_ceiling(keys: &CeilingKeys, problem: Option<&dyn Problem>) -> Result<Ceiling, Fault> {
    let at = Path::of("ceiling");
    let (limit, key, least) = match (keys.per_group, keys.total) {
        (Some(units), None) => (CeilingLimit::PerGroup(units), "per-group", 2),
        (None, Some(units)) => {
            let groups = problem.map_or(1, |problem| problem.groups().len() as u64);
            (CeilingLimit::Total(units), "total", 2 * groups)
        }
        (Some(_), Some(_)) => {
            return Err(Fault::key(
                at.key("total"),
                "the ceiling is given both per group and in total",
            )
            .help("keep `per-group` or `total`; the other follows from the allocation"));
        }
        (None, None) => {
            return Err(
                Fault::key(at, "the ceiling gives no number").help("add `per-group:` or `total:`")
            );
        }
    };
    let (CeilingLimit::PerGroup(given) | CeilingLimit::Total(given)) = limit;
    if given < least {
        let noun = if given == 1 { "unit" } else { "units" };
        return Err(Fault::value(
            at.key(key),
            format!("a ceiling of {given} {noun} leaves no study to plan"),
        )
        .help(format!("with 2 units in each group it is at least {least}")));
    }
    Ok(Ceiling { limit, grounds: keys.grounds.clone() })
}

fn further_units(keys: &CommonExperiment, findings: &mut Vec<Finding>) -> Vec<FurtherUnits> {
    let mut read = Vec::new();
    for (index, item) in keys.further_units.iter().enumerate() {
        let individuals = item.count_of == Some(CountOf::Individuals);
        if individuals && keys.unit.holds.is_none() {
            let at = Path::of("further-units").item(index).key("count-of");
            let fault = Fault::value(at, "individuals are counted, but the unit holds none")
                .help("drop `count-of`, or say under `unit.holds` which animals or participants a unit holds");
            let holds = RestsOn::Values(vec![Path::of("unit.holds")]);
            findings.push(Finding::from(fault).resting_on(holds));
        }
        read.push(FurtherUnits {
            purpose: item.purpose,
            count: item.count,
            individuals,
            why: item.why.clone(),
        });
    }
    read
}
