//! The standard normal distribution.

use super::{Continuous, number, probability};
use crate::numerics::error::Result;
use crate::numerics::special::normal::{
    LN_SQRT_TAU, mills_ratio, normal_cdf, normal_ln_sf, normal_sf,
};

/// The normal distribution with mean 0 and standard deviation 1.
///
/// # Formula
///
/// ```text
/// F(x) = Φ(x) = ½ erfc(-x / √2)
/// ```
///
/// # Units and ranges
///
/// `x` any number.
///
/// # Accuracy
///
/// Tails: relative 2e-15, at 1e-300 still 1e-13; quantiles: relative 1e-15 (`tests/reference/quantiles.csv`).
///
/// # Sources
///
/// Tail: own Chebyshev fit of the Mills ratio. Quantile: Wichura (1988), Applied Statistics 37(3), 477-484, AS 241,
/// with one Newton step on the logarithm of the tail beyond 5 standard deviations.
///
/// # Example
///
/// ```
/// use sufficit::numerics::{Continuous, Normal};
///
/// assert!((Normal.upper_quantile(0.025)? - 1.959964).abs() < 1e-6);
/// assert!(Normal.quantile(1.5).is_err());
/// # Ok::<(), sufficit::numerics::NumericsError>(())
/// ```
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

/// The standard normal point whose lower tail is `p`; see [`Normal`] for accuracy and source.
///
/// # Errors
///
/// [`NumericsError::OutOfDomain`](crate::numerics::NumericsError::OutOfDomain) when `p` is not between 0 and 1.
pub fn normal_quantile(p: f64) -> Result<f64> {
    Ok(-normal_upper_quantile(p)?)
}

/// The standard normal point whose upper tail is `p`; `p = 1e-300` works.
///
/// # Errors
///
/// As [`normal_quantile`].
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
    2509.0809287301227,
    33430.57558358813,
    67265.7709270087,
    45921.95393154987,
    13731.69376550946,
    1971.5909503065513,
    133.14166789178438,
    3.3871328727963665,
];
const CENTRE_BOTTOM: [f64; 7] = [
    5226.495278852854,
    28729.085735721943,
    39307.89580009271,
    21213.794301586597,
    5394.196021424751,
    687.1870074920579,
    42.31333070160091,
];
const MIDDLE_TOP: [f64; 8] = [
    0.0007745450142783414,
    0.022723844989269184,
    0.2417807251774506,
    1.2704582524523684,
    3.6478483247632045,
    5.769497221460691,
    4.630337846156546,
    1.4234371107496835,
];
const MIDDLE_BOTTOM: [f64; 7] = [
    1.0507500716444169e-9,
    0.0005475938084995345,
    0.015198666563616457,
    0.14810397642748008,
    0.6897673349851,
    1.6763848301838038,
    2.053191626637759,
];
const FAR_TOP: [f64; 8] = [
    2.0103343992922881e-7,
    2.7115555687434876e-5,
    0.0012426609473880784,
    0.026532189526576124,
    0.29656057182850487,
    1.7848265399172913,
    5.463784911164114,
    6.657904643501103,
];
const FAR_BOTTOM: [f64; 7] = [
    2.0442631033899397e-15,
    1.421511758316446e-7,
    1.8463183175100548e-5,
    0.0007868691311456133,
    0.014875361290850615,
    0.1369298809227358,
    0.599832206555888,
];
