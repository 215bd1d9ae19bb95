//! Two correlated standard normals: orthants, the joint distribution function and rectangles.

use super::interval::normal_interval;
use crate::numerics::error::{NumericsError, Result};
use crate::numerics::quadrature::{Goal, integrate};
use crate::numerics::special::normal::normal_sf;
use libm::{atan2, cos, exp, sin};
use std::f64::consts::{FRAC_PI_2, TAU};

/// Beyond this distance a normal tail is below the smallest double.
const FAR: f64 = 39.0;

/// Two standard normals with a given correlation.
///
/// # Formula
///
/// With `X`, `Y` of correlation `ρ` and the difference to independence, or to full dependence, as one integral:
///
/// ```text
/// P(X > h, Y > k) = Φ(-h) Φ(-k) + (1/2π) ∫₀^asin(ρ) exp(-(h² + k² - 2 h k sin θ) / (2 cos² θ)) dθ      ρ >= 0
///                 = P(h < X < -k) + (1/2π) ∫ of the same form with -k, from full dependence to |ρ|       ρ < 0
/// ```
///
/// Every term is positive, so that small orthants keep their digits.
///
/// # Units and ranges
///
/// `ρ` from -1 to 1 inclusive; limits may be infinite.
///
/// # Accuracy
///
/// Orthants to 1e-12 of their own size down to 1e-200, rectangles to 1e-14 absolute, for every correlation
/// (`tests/reference/bivariate_normal.csv`, `tests/numerics_solvers/bivariate.rs`).
///
/// # Sources
///
/// Drezner, Wesolowsky (1990), Journal of Statistical Computation and Simulation 35, 101-107; Genz (2004), Statistics
/// and Computing 14, 251-260. Deviation: adaptive quadrature over the complement of the angle,
/// which keeps correlations next to 1 exact.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BivariateNormal {
    rho: f64,
}

impl BivariateNormal {
    /// The pair with correlation `rho`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when `rho` is not from -1 to 1.
    pub fn new(rho: f64) -> Result<Self> {
        if !(-1.0..=1.0).contains(&rho) {
            return Err(NumericsError::OutOfDomain {
                name: "rho",
                given: rho,
                allowed: "from -1 to 1",
            });
        }
        Ok(BivariateNormal { rho })
    }

    /// `P(X <= x, Y <= y)`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when a limit is NaN; [`NumericsError::NoConvergence`] from the quadrature.
    pub fn cdf(&self, x: f64, y: f64) -> Result<f64> {
        self.upper_orthant(-x, -y)
    }

    /// `P(X > h, Y > k)`, small values directly.
    ///
    /// # Errors
    ///
    /// As [`BivariateNormal::cdf`].
    pub fn upper_orthant(&self, h: f64, k: f64) -> Result<f64> {
        for (name, given) in [("h", h), ("k", k)] {
            if given.is_nan() {
                return Err(NumericsError::OutOfDomain { name, given, allowed: "a number" });
            }
        }
        if h > FAR || k > FAR {
            return Ok(0.0);
        }
        if h < -FAR {
            return Ok(normal_sf(k));
        }
        if k < -FAR {
            return Ok(normal_sf(h));
        }
        let angle = atan2(self.own_spread(), self.rho.abs());
        let value = if self.rho >= 0.0 {
            normal_sf(h) * normal_sf(k) + angular_integral(h, k, angle, FRAC_PI_2)?
        } else {
            // Fully opposed, X > h and -X > k leave the interval from h to -k.
            normal_interval(h, -k - h) + angular_integral(h, -k, 0.0, angle)?
        };
        Ok(value.clamp(0.0, 1.0))
    }

    /// `P(a < X <= b, c < Y <= d)` for `x = (a, b)` and `y = (c, d)`; 0 where a limit pair is reversed.
    ///
    /// # Errors
    ///
    /// As [`BivariateNormal::cdf`].
    pub fn rectangle(&self, x: (f64, f64), y: (f64, f64)) -> Result<f64> {
        if x.0 >= x.1 || y.0 >= y.1 {
            return Ok(0.0);
        }
        // Turned so that the corner nearest to the rectangle's inside is the smallest orthant.
        let (x, turned_x) = if x.0 + x.1 >= 0.0 { (x, false) } else { ((-x.1, -x.0), true) };
        let (y, turned_y) = if y.0 + y.1 >= 0.0 { (y, false) } else { ((-y.1, -y.0), true) };
        let turned =
            BivariateNormal { rho: if turned_x == turned_y { self.rho } else { -self.rho } };
        let near = turned.upper_orthant(x.0, y.0)? - turned.upper_orthant(x.1, y.0)?;
        let far = turned.upper_orthant(x.0, y.1)? - turned.upper_orthant(x.1, y.1)?;
        Ok((near - far).clamp(0.0, 1.0))
    }

    /// `sqrt(1 - ρ²)` without cancellation.
    fn own_spread(&self) -> f64 {
        ((1.0 - self.rho) * (1.0 + self.rho)).sqrt()
    }
}

/// `(1/2π) ∫ exp(-(h² + k² - 2 h k cos a) / (2 sin² a)) da`: what separates two positive correlations `cos a`.
fn angular_integral(h: f64, k: f64, from: f64, to: f64) -> Result<f64> {
    let goal = Goal { absolute: f64::MIN_POSITIVE, ..Goal::default() };
    // The exponent as a sum of two terms that cannot cancel.
    let integral = integrate("bivariate normal", from, to, goal, |a| {
        let gap = (h - k) / sin(a);
        Ok(exp(-0.5 * gap * gap - h * k / (1.0 + cos(a))))
    })?;
    Ok(integral.value / TAU)
}
