//! The figures of an experiment: labels read from the templates, numbers taken from the plan.

use std::collections::BTreeMap;

use super::error::RenderError;
use super::figures;
use crate::plan::{Bounds, Contours, ExperimentPlan};
use crate::report::FigureView;
use crate::report::figures::{
    Assumed, Axis, Curve, Level, Mark, PowerCurve, Rule, SizeContour, SpreadLimits,
};
use crate::report::locale::Locale;

/// Differences shown in the contour figure, relative to the planned one.
const DIFFERENCES: (f64, f64) = (0.45, 1.7);

/// The labels of one experiment, by name.
pub(super) struct Labels(BTreeMap<String, String>);

impl Labels {
    /// Reads lines of the form `name = text`.
    pub(super) fn read(lines: &str) -> Self {
        let pairs = lines.lines().filter_map(|line| line.split_once(" = "));
        Self(pairs.map(|(k, v)| (k.trim().to_owned(), v.trim().to_owned())).collect())
    }

    fn text(&self, name: &'static str) -> Result<String, RenderError> {
        self.0.get(name).cloned().ok_or(RenderError::Label(name))
    }
}

/// Draws the figures of an experiment; their paths are left to the caller.
pub(super) fn draw(
    plan: &ExperimentPlan,
    labels: &Labels,
    locale: &Locale,
) -> Result<Vec<FigureView>, RenderError> {
    let write = |value: f64, decimals: usize| locale.fixed(value, decimals);
    let sentence = labels.text("power_sentence")?;
    let power = power_curve(plan, labels, &sentence, &write)?;
    let power = FigureView {
        kind: "power",
        path: String::new(),
        sentence,
        svg: figures::power_curve(&power)?,
    };
    let mut drawn = vec![power];
    if let (Some(contours), Some(bounds)) = (&plan.firmness.contours, &plan.firmness.bounds) {
        let sentence = labels.text("contour_sentence")?;
        let contour = size_contour(plan, (contours, bounds), labels, &sentence, locale)?;
        drawn.push(FigureView {
            kind: "contour",
            path: String::new(),
            sentence,
            svg: figures::size_contour(&contour)?,
        });
    }
    Ok(drawn)
}

fn power_curve(
    plan: &ExperimentPlan,
    labels: &Labels,
    sentence: &str,
    write: &dyn Fn(f64, usize) -> String,
) -> Result<PowerCurve, RenderError> {
    let data = &plan.firmness.curves;
    let curve = |assumed, name, powers: &[f64]| -> Result<Curve, RenderError> {
        let points = data.steps.iter().zip(powers).map(|(n, power)| (*n as f64, *power));
        Ok(Curve { assumed, label: labels.text(name)?, points: points.collect() })
    };
    let first = data.steps.first().map_or(0.0, |n| *n as f64);
    let last = data.steps.last().map_or(1.0, |n| *n as f64);
    let ceiling = match &plan.ceiling {
        Some(ceiling)
            if ceiling.outlook.is_some()
                && (first..=last).contains(&(ceiling.remain.step as f64)) =>
        {
            Some(Rule { at: ceiling.remain.step as f64, label: labels.text("ceiling")? })
        }
        _ => None,
    };
    let mut curves = vec![curve(Assumed::Planned, "planned", &data.planned)?];
    if plan.firmness.bounds.is_some() {
        curves.insert(0, curve(Assumed::Low, "low", &data.low)?);
        curves.push(curve(Assumed::High, "high", &data.high)?);
    }
    Ok(PowerCurve {
        description: sentence.to_owned(),
        x: Axis::counts(labels.text("power_x")?, (first, last), write),
        y: Axis::probability(labels.text("power_y")?, write),
        curves,
        target: Rule { at: plan.risk.power.get(), label: labels.text("target")? },
        chosen: Mark {
            x: plan.exact.sizes.step as f64,
            y: plan.exact.power,
            label: labels.text("chosen")?,
        },
        ceiling,
    })
}

fn size_contour(
    plan: &ExperimentPlan,
    (contours, bounds): (&Contours, &Bounds),
    labels: &Labels,
    sentence: &str,
    locale: &Locale,
) -> Result<SizeContour, RenderError> {
    let write = |value: f64, decimals: usize| locale.fixed(value, decimals);
    let ceiling_label = labels.text("ceiling_level")?;
    let levels = contours.lines.iter().map(|line| Level {
        size: line.step as f64,
        label: if line.ceiling { ceiling_label.clone() } else { locale.whole(line.step) },
        ceiling: line.ceiling,
        points: line.effects.iter().copied().zip(contours.spreads.iter().copied()).collect(),
    });
    let planned = plan.planned;
    let across = (planned.effect * DIFFERENCES.0, planned.effect * DIFFERENCES.1);
    let up = (
        contours.spreads.first().copied().unwrap_or(0.0),
        contours.spreads.last().copied().unwrap_or(1.0),
    );
    Ok(SizeContour {
        description: sentence.to_owned(),
        title: labels.text("contour_title")?,
        x: Axis::real(labels.text("contour_x")?, across, write),
        y: Axis::real(labels.text("contour_y")?, up, write),
        levels: levels.collect(),
        plan: Mark { x: planned.effect, y: planned.nuisance, label: labels.text("plan")? },
        limits: Some(SpreadLimits {
            low: bounds.low.spread,
            high: bounds.high.spread,
            label: labels.text("limits")?,
        }),
    })
}
