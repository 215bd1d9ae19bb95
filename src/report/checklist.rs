//! The reporting checklist: which item of which guideline the document answers, and which stays open.
//!
//! Only item numbers, topics and states are decided here; what an item asks stands in the templates.
//! Items after Percie du Sert et al. (2020) for ARRIVE 2.0, Hopewell et al. (2025) for CONSORT, Chan et al. (2025) for
//! SPIRIT, Cook et al. (2018) for DELTA2 and ICH E9 (1998), section 3.5.

use serde::Serialize;

use crate::designs::EffectBasis;
use crate::plan::{ExperimentPlan, Plan};
use crate::quantities::Kind;
use crate::study::Purpose;

/// One row of the checklist.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct ChecklistRow {
    /// The guideline.
    pub guideline: &'static str,
    /// Number of the item there.
    pub item: &'static str,
    /// What it is about; names the text in the templates.
    pub topic: Topic,
    /// Section of this document that answers it; names the heading in the templates.
    pub section: &'static str,
    /// Ids of the experiments for which it is open; empty when answered.
    pub open: Vec<String>,
}

/// What an item is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Topic {
    /// Groups and control.
    Groups,
    /// Experimental unit.
    Unit,
    /// Numbers per group and in all.
    Numbers,
    /// How the size was decided.
    Calculation,
    /// Exclusions.
    Exclusions,
    /// Randomisation.
    Randomisation,
    /// Blinding.
    Blinding,
    /// Primary outcome.
    Outcome,
    /// Planned analysis.
    Analysis,
    /// Error rates.
    ErrorRates,
    /// Target difference in natural units.
    Target,
    /// Basis of the target difference.
    Basis,
    /// Source of the standard deviation.
    SpreadSource,
    /// Allocation ratio.
    Allocation,
    /// Losses and other adjustments.
    Adjustments,
    /// Reduction of the number of animals.
    Reduction,
    /// Robustness to departures from the assumptions.
    Sensitivity,
    /// All assumptions behind the size.
    Assumptions,
    /// Missing data.
    MissingData,
}

type Item = (&'static str, &'static str, Topic, &'static str);

const ARRIVE: [Item; 9] = [
    ("ARRIVE 2.0", "1a", Topic::Groups, "design"),
    ("ARRIVE 2.0", "1b", Topic::Unit, "question"),
    ("ARRIVE 2.0", "2a", Topic::Numbers, "answer"),
    ("ARRIVE 2.0", "2b", Topic::Calculation, "calculation"),
    ("ARRIVE 2.0", "3a", Topic::Exclusions, "inputs"),
    ("ARRIVE 2.0", "4a", Topic::Randomisation, "inputs"),
    ("ARRIVE 2.0", "5", Topic::Blinding, "inputs"),
    ("ARRIVE 2.0", "6b", Topic::Outcome, "question"),
    ("ARRIVE 2.0", "7a", Topic::Analysis, "design"),
];

const REDUCTION: [Item; 2] = [
    ("Directive 2010/63/EU", "Art. 4", Topic::Reduction, "lower"),
    ("Directive 2010/63/EU", "Annex VI", Topic::Numbers, "answer"),
];

const DELTA2: [Item; 7] = [
    ("DELTA2", "1", Topic::Outcome, "question"),
    ("DELTA2", "2", Topic::ErrorRates, "design"),
    ("DELTA2", "3b", Topic::Target, "calculation"),
    ("DELTA2", "4", Topic::Allocation, "design"),
    ("DELTA2", "5", Topic::Adjustments, "calculation"),
    ("DELTA2", "6", Topic::Basis, "inputs"),
    ("DELTA2", "7", Topic::SpreadSource, "inputs"),
];

const TRIALS: [Item; 4] = [
    ("SPIRIT 2025", "19", Topic::Assumptions, "inputs"),
    ("CONSORT 2025", "16a", Topic::Calculation, "calculation"),
    ("ICH E9", "3.5", Topic::Sensitivity, "firm"),
    ("ICH E9", "3.5", Topic::MissingData, "inputs"),
];

/// The checklist of a plan, chosen by its purpose and by what its units are.
pub fn checklist(plan: &Plan) -> Vec<ChecklistRow> {
    let holds = |kind: Kind| {
        plan.experiments.iter().any(|e| {
            e.unit.kind == kind || e.unit.holds.as_ref().is_some_and(|holds| holds.kind == kind)
        })
    };
    let animals = plan.purpose == Purpose::AnimalEthics || holds(Kind::Animal);
    let people = plan.purpose == Purpose::HumanEthics || holds(Kind::Participant);
    let mut items: Vec<Item> = Vec::new();
    if animals {
        items.extend(ARRIVE);
    }
    if plan.purpose == Purpose::AnimalEthics {
        items.extend(REDUCTION);
    }
    if people || !animals || plan.purpose == Purpose::Grant {
        items.extend(DELTA2);
    }
    if people {
        items.extend(TRIALS);
    }
    items
        .into_iter()
        .map(|(guideline, item, topic, section)| {
            let open = plan.experiments.iter().filter(|e| is_open(e, topic));
            ChecklistRow {
                guideline,
                item,
                topic,
                section,
                open: open.map(|e| e.id.clone()).collect(),
            }
        })
        .collect()
}

fn is_open(experiment: &ExperimentPlan, topic: Topic) -> bool {
    let basis = experiment.effect.basis == EffectBasis::Unstated
        || experiment.effect.planned.grounds.is_open();
    let spread = experiment.spread.as_ref().is_some_and(|spread| spread.grounds.is_open());
    let fact = |key: &str| experiment.analysis.get(key);
    let further = fact("further_inputs").and_then(serde_json::Value::as_array);
    let unsupported = |input: &serde_json::Value| {
        input
            .pointer("/grounds")
            .and_then(serde_json::Value::as_object)
            .is_none_or(|g| g.is_empty())
    };
    let spread = spread || further.is_some_and(|inputs| inputs.iter().any(unsupported));
    let unequal = fact("balanced").is_some_and(|balanced| balanced == false);
    let losses = !experiment.losses.stated;
    let safeguards = &experiment.safeguards;
    match topic {
        Topic::Basis => basis,
        Topic::SpreadSource => basis || spread,
        Topic::Adjustments => losses,
        Topic::Calculation | Topic::Assumptions => basis || spread || losses,
        Topic::Allocation => {
            unequal && fact("allocation_why").is_none_or(serde_json::Value::is_null)
        }
        Topic::Exclusions => safeguards.exclusions.is_none(),
        Topic::Randomisation => safeguards.randomisation.is_none(),
        Topic::Blinding => safeguards.blinding.is_none(),
        Topic::MissingData => safeguards.missing_data.is_none(),
        Topic::Groups
        | Topic::Unit
        | Topic::Numbers
        | Topic::Outcome
        | Topic::Analysis
        | Topic::ErrorRates
        | Topic::Target
        | Topic::Reduction
        | Topic::Sensitivity => false,
    }
}
