//! What a figure must fulfil before it is drawn.

use super::FigureError;
use crate::report::figures::{Axis, Mark, PowerCurve, SizeContour};

/// Most points of a line.
const POINTS: usize = 20_000;
/// Most lines of equal size.
const LEVELS: usize = 14;

pub(super) fn power_curve(data: &PowerCurve) -> Result<(), FigureError> {
    axis("horizontal", &data.x)?;
    axis("vertical", &data.y)?;
    if data.curves.is_empty() || data.curves.len() > 3 {
        return Err(FigureError::Count {
            what: "curves",
            given: data.curves.len(),
            least: 1,
            most: 3,
        });
    }
    for curve in &data.curves {
        line("curve", &curve.points, |point| point.0)?;
        if !curve.points.iter().any(|(x, _)| *x >= data.x.from && *x <= data.x.to) {
            return Err(FigureError::Outside { what: "curve" });
        }
    }
    inside("target power", data.target.at, &data.y)?;
    mark("chosen size", &data.chosen, &data.x, &data.y)?;
    match &data.ceiling {
        Some(ceiling) => inside("ceiling", ceiling.at, &data.x),
        None => Ok(()),
    }
}

pub(super) fn size_contour(data: &SizeContour) -> Result<(), FigureError> {
    axis("horizontal", &data.x)?;
    axis("vertical", &data.y)?;
    if data.x.from < 0.0 && data.x.to > 0.0 {
        return Err(FigureError::CrossesZero);
    }
    if data.levels.is_empty() || data.levels.len() > LEVELS {
        let given = data.levels.len();
        return Err(FigureError::Count {
            what: "lines of equal size",
            given,
            least: 1,
            most: LEVELS,
        });
    }
    for level in &data.levels {
        line("line of equal size", &level.points, |point| point.1)?;
        finite("size", level.size)?;
    }
    let sizes = data.levels.iter().map(|level| level.size);
    if sizes.clone().zip(sizes.skip(1)).any(|(a, b)| a >= b) {
        return Err(FigureError::NotRising { what: "lines of equal size" });
    }
    mark("plan", &data.plan, &data.x, &data.y)?;
    if let Some(limits) = &data.limits {
        finite("lower limit", limits.low)?;
        finite("upper limit", limits.high)?;
        if limits.low > limits.high {
            return Err(FigureError::NotRising { what: "limits of the spread" });
        }
    }
    Ok(())
}

fn axis(what: &'static str, axis: &Axis) -> Result<(), FigureError> {
    finite("end of an axis", axis.from)?;
    finite("end of an axis", axis.to)?;
    let span = axis.to - axis.from;
    if !(span.is_finite() && span > 0.0) {
        return Err(FigureError::EmptyAxis { axis: what });
    }
    axis.ticks.iter().try_for_each(|tick| inside("tick", tick.position, axis))
}

fn line(
    what: &'static str,
    points: &[(f64, f64)],
    rising: impl Fn(&(f64, f64)) -> f64,
) -> Result<(), FigureError> {
    if points.len() < 2 || points.len() > POINTS {
        return Err(FigureError::Count {
            what: "points of a line",
            given: points.len(),
            least: 2,
            most: POINTS,
        });
    }
    for (x, y) in points {
        finite(what, *x)?;
        finite(what, *y)?;
    }
    let falls = |(a, b): (&(f64, f64), &(f64, f64))| rising(a) >= rising(b);
    match points.iter().zip(points.iter().skip(1)).any(falls) {
        true => Err(FigureError::NotRising { what }),
        false => Ok(()),
    }
}

fn mark(what: &'static str, mark: &Mark, x: &Axis, y: &Axis) -> Result<(), FigureError> {
    inside(what, mark.x, x)?;
    inside(what, mark.y, y)
}

/// Inside the axis, or off it by a rounding error.
fn inside(what: &'static str, value: f64, axis: &Axis) -> Result<(), FigureError> {
    finite(what, value)?;
    let slack = 1e-6 * (axis.to - axis.from);
    match value >= axis.from - slack && value <= axis.to + slack {
        true => Ok(()),
        false => Err(FigureError::Outside { what }),
    }
}

fn finite(what: &'static str, value: f64) -> Result<(), FigureError> {
    if value.is_finite() { Ok(()) } else { Err(FigureError::NotFinite { what }) }
}
