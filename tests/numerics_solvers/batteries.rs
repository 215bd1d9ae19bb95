//! What every distribution of a real statistic must do, and proof that the battery notices when one does not.

use sufficit::numerics::Result;

/// A distribution seen through its two tails and two quantiles.
pub struct Unit<'a> {
    pub cdf: &'a dyn Fn(f64) -> Result<f64>,
    pub sf: &'a dyn Fn(f64) -> Result<f64>,
    pub quantile: &'a dyn Fn(f64) -> Result<f64>,
    pub upper_quantile: &'a dyn Fn(f64) -> Result<f64>,
}

/// Tails add up to 1, rise and fall, and stay probabilities, at the points given (in rising order).
pub fn check_tails(unit: &Unit, points: &[f64]) -> std::result::Result<(), String> {
    let mut last: Option<(f64, f64)> = None;
    for &x in points {
        let lower = (unit.cdf)(x).map_err(|e| format!("cdf({x:e}): {e}"))?;
        let upper = (unit.sf)(x).map_err(|e| format!("sf({x:e}): {e}"))?;
        let probabilities = (0.0..=1.0).contains(&lower) && (0.0..=1.0).contains(&upper);
        if !probabilities {
            return Err(format!("tails at {x:e} are {lower:e} and {upper:e}"));
        }
        if (lower + upper - 1.0).abs() > 1e-12 {
            return Err(format!("tails at {x:e} add up to {:e}", lower + upper));
        }
        if let Some((before_lower, before_upper)) = last {
            let slack = 1.0 + 1e-11;
            if lower * slack < before_lower || upper > before_upper * slack {
                return Err(format!("not monotone at {x:e}"));
            }
        }
        last = Some((lower, upper));
    }
    Ok(())
}

/// Quantiles are inverted by the tails, relative to the probability asked for.
pub fn check_round_trips(
    unit: &Unit,
    probabilities: &[f64],
    tolerance: f64,
) -> std::result::Result<(), String> {
    for &p in probabilities {
        let low = (unit.quantile)(p).map_err(|e| format!("quantile({p:e}): {e}"))?;
        let high = (unit.upper_quantile)(p).map_err(|e| format!("upper quantile({p:e}): {e}"))?;
        let back_low = (unit.cdf)(low).map_err(|e| e.to_string())?;
        let back_high = (unit.sf)(high).map_err(|e| e.to_string())?;
        for (name, back) in [("lower", back_low), ("upper", back_high)] {
            let error = (back / p - 1.0).abs();
            if error.is_nan() || error > tolerance {
                return Err(format!("{name} tail at the quantile of {p:e} is {back:e}"));
            }
        }
    }
    Ok(())
}

#[test]
fn the_batteries_catch_wrong_units() {
    // The standard logistic distribution: everything in closed form.
    let cdf = |x: f64| Ok(1.0 / (1.0 + (-x).exp()));
    let sf = |x: f64| Ok(1.0 / (1.0 + x.exp()));
    let quantile = |p: f64| Ok((p / (1.0 - p)).ln());
    let upper_quantile = |p: f64| Ok(((1.0 - p) / p).ln());
    let right = Unit { cdf: &cdf, sf: &sf, quantile: &quantile, upper_quantile: &upper_quantile };
    let points: Vec<f64> = (-20..=20).map(|i| 1.5 * f64::from(i)).collect();
    let probabilities = [1e-12, 1e-6, 0.05, 0.5, 0.95];
    assert_eq!(check_tails(&right, &points), Ok(()));
    assert_eq!(check_round_trips(&right, &probabilities, 1e-12), Ok(()));

    let off_in_the_middle =
        |x: f64| Ok(1.0 / (1.0 + (-x).exp()) + if x == 0.0 { 1e-9 } else { 0.0 });
    let falling = |x: f64| Ok(1.0 / (1.0 + x.exp()));
    let not_a_number = |_: f64| Ok(f64::NAN);
    for wrong in [&off_in_the_middle as &dyn Fn(f64) -> Result<f64>, &falling, &not_a_number] {
        let unit = Unit { cdf: wrong, ..right };
        assert!(check_tails(&unit, &points).is_err());
    }
    let shifted = |p: f64| Ok(((1.0 - p) / p).ln() + 1e-10);
    let unit = Unit { upper_quantile: &shifted, ..right };
    assert!(check_round_trips(&unit, &probabilities, 1e-12).is_err());
}
