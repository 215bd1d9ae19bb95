//! From a plan to the document model.

use super::checklist::checklist;
use super::locale::{Locale, decimals_for};
use super::{AttachmentView, ExperimentView, InputsView, Report};
use crate::plan::{ExperimentPlan, Plan};

/// Dresses a plan. The attachments are the inputs, the spec first.
pub fn build<'a>(plan: &'a Plan, locale: &Locale, attachments: Vec<AttachmentView>) -> Report<'a> {
    let spec = attachments.first().map(|spec| String::from_utf8_lossy(&spec.bytes).into_owned());
    let spec = spec.unwrap_or_default();
    let spec_lines = spec.trim_start_matches('\u{feff}').lines().map(str::to_owned).collect();
    Report {
        plan,
        purpose: plan.purpose,
        date: locale.date(plan.date),
        experiments: plan.experiments.iter().enumerate().map(view).collect(),
        checklist: checklist(plan),
        inputs: InputsView {
            fingerprints: &plan.fingerprints,
            short_hash: plan.fingerprints.spec.sha256.chars().take(12).collect(),
            spec_lines,
            spec_name: plan.fingerprints.spec.name.clone(),
            attachments,
        },
        version: plan.program_version,
    }
}

fn view((position, plan): (usize, &ExperimentPlan)) -> ExperimentView<'_> {
    let all_equal = |sizes: &[u64]| sizes.windows(2).all(|pair| pair.first() == pair.last());
    let smallest = match &plan.spread {
        Some(spread) => plan.planned.effect.min(spread.sd),
        None => plan.planned.effect,
    };
    let decimals = decimals_for(smallest, 3);
    ExperimentView {
        plan,
        number: position + 1,
        decimals,
        table_decimals: table_decimals(&plan.firmness.table_effects, decimals),
        even: all_equal(&plan.exact.sizes.per_group),
        even_start: all_equal(&plan.request.per_group),
        figures: Vec::new(),
        statement: String::new(),
        statement_characters: 0,
        statement_words: 0,
    }
}

/// The fewest decimals that show every value as it is, up to two more than usual.
fn table_decimals(values: &[f64], usual: usize) -> usize {
    let shown = |decimals: &usize| {
        values.iter().all(|value| {
            let text = format!("{value:.*}", *decimals);
            text.parse::<f64>().is_ok_and(|back| (back - value).abs() <= 1e-9 * value.abs())
        })
    };
    (0..=usual + 2).find(shown).unwrap_or(usual)
}
