//! The standard normal distribution.

use super::{Continuous, number, probability};
use crate::numerics::error::Result;
use crate::numerics::special::normal::{
    LN_SQRT_TAU, mills_ratio, normal_cdf, normal_ln_sf, normal_sf,
};

/// The normal distribution with mean 0 and standard deviation 1.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Normal;

impl Continuous for Normal {
    fn ln_density(&self, x: f64) -> Result<f64> {
        let x = number("x", x)?;
        Ok(-0.5 * x * x - LN_SQRT_TAU)
    }

    fn cdf(&self, x: f64) -> Result<f64> {
        Ok(normal_cdf(number("x", x)?))
    }

    fn sf(&self, x: f64) -> Result<f64> {
        Ok(normal_sf(number("x", x)?))
    }

    fn ln_cdf(&self, x: f64) -> Result<f64> {
        Ok(normal_ln_sf(-number("x", x)?))
    }

    fn ln_sf(&self, x: f64) -> Result<f64> {
        Ok(normal_ln_sf(number("x", x)?))
    }

    fn quantile(&self, p: f64) -> Result<f64> {
        normal_quantile(p)
    }

    fn upper_quantile(&self, p: f64) -> Result<f64> {
        normal_upper_quantile(p)
    }
}

/// The standard normal point whose lower tail is `p`.
pub fn normal_quantile(p: f64) -> Result<f64> {
    Ok(-normal_upper_quantile(p)?)
}

/// The standard normal point whose upper tail is `p`.
pub fn normal_upper_quantile(p: f64) -> Result<f64> {
    let p = probability(p)?;
    if p > 0.5 { Ok(-upper_half_quantile(1.0 - p)) } else { Ok(upper_half_quantile(p)) }
}

fn rational(top: &[f64; 8], bottom: &[f64; 7], x: f64) -> f64 {
    let numerator = top.iter().fold(0.0, |sum, c| sum * x + c);
    let denominator = bottom.iter().fold(0.0, |sum, c| sum * x + c);
    numerator / (denominator * x + 1.0)
}

/// Quantile for an upper tail of at most one half: Wichura (1988), Applied Statistics 37(3), algorithm AS 241, then
/// one Newton step on the logarithm of the tail.
fn upper_half_quantile(p: f64) -> f64 {
    if p == 0.0 {
        return f64::INFINITY;
    }
    let q = 0.5 - p;
    if q <= 0.425 {
        return q * rational(&CENTRE_TOP, &CENTRE_BOTTOM, 0.180625 - q * q);
    }
    let r = (-libm::log(p)).sqrt();
    let start = if r <= 5.0 {
        rational(&MIDDLE_TOP, &MIDDLE_BOTTOM, r - 1.6)
    } else {
        rational(&FAR_TOP, &FAR_BOTTOM, r - 5.0)
    };
    if start < 5.0 {
        return start;
    }
    // Newton on ln P: the slope is minus the density over the tail.
    let mills = mills_ratio(start);
    let excess = libm::log(mills) - 0.5 * start * start - LN_SQRT_TAU - libm::log(p);
    start + excess * mills
}

const CENTRE_TOP: [f64; 8] = [
    2.5090809287301226727e3,
    3.3430575583588128105e4,
    6.7265770927008700853e4,
    4.5921953931549871457e4,
    1.3731693765509461125e4,
    1.9715909503065514427e3,
    1.3314166789178437745e2,
    3.3871328727963666080,
];
const CENTRE_BOTTOM: [f64; 7] = [
    5.2264952788528545610e3,
    2.8729085735721942674e4,
    3.9307895800092710610e4,
    2.1213794301586595867e4,
    5.3941960214247511077e3,
    6.8718700749205790830e2,
    4.2313330701600911252e1,
];
const MIDDLE_TOP: [f64; 8] = [
    7.74545014278341407640e-4,
    2.27238449892691845833e-2,
    2.41780725177450611770e-1,
    1.27045825245236838258,
    3.64784832476320460504,
    5.76949722146069140550,
    4.63033784615654529590,
    1.42343711074968357734,
];
const MIDDLE_BOTTOM: [f64; 7] = [
    1.05075007164441684324e-9,
    5.47593808499534494600e-4,
    1.51986665636164571966e-2,
    1.48103976427480074590e-1,
    6.89767334985100004550e-1,
    1.67638483018380384940,
    2.05319162663775882187,
];
const FAR_TOP: [f64; 8] = [
    2.01033439929228813265e-7,
    2.71155556874348757815e-5,
    1.24266094738807843860e-3,
    2.65321895265761230930e-2,
    2.96560571828504891230e-1,
    1.78482653991729133580,
    5.46378491116411436990,
    6.65790464350110377720,
];
const FAR_BOTTOM: [f64; 7] = [
    2.04426310338993978564e-15,
    1.42151175831644588870e-7,
    1.84631831751005468180e-5,
    7.86869131145613259100e-4,
    1.48753612908506148525e-2,
    1.36929880922735805310e-1,
    5.99832206555887937690e-1,
];
