//! Values from the distributions that simulations of studies need, built on uniform and normal values.

use super::Stream;
use crate::numerics::discrete::{Binomial, Poisson};
use crate::numerics::error::{NumericsError, Result};
use libm::{exp, floor, log, log1p, pow};

/// Mean from which the transformed rejection methods are used; below it the distribution function is walked.
const REJECTION_FROM: f64 = 10.0;

impl Stream {
    /// An exponential value with mean 1, by inversion.
    #[inline]
    pub fn exponential(&mut self) -> f64 {
        -log(self.uniform())
    }

    /// A gamma value with the given shape and scale 1.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when the shape is not above 0 and finite.
    ///
    /// # Sources
    ///
    /// Marsaglia, Tsang (2000), ACM Transactions on Mathematical Software 26(3), 363-372.
    pub fn gamma(&mut self, shape: f64) -> Result<f64> {
        if !(shape > 0.0 && shape.is_finite()) {
            return Err(NumericsError::OutOfDomain {
                name: "shape",
                given: shape,
                allowed: "above 0 and finite",
            });
        }
        if shape < 1.0 {
            let power = pow(self.uniform(), 1.0 / shape);
            return Ok(self.gamma_from_one(shape + 1.0) * power);
        }
        Ok(self.gamma_from_one(shape))
    }

    /// A chi-squared value.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when the degrees of freedom are not above 0 and finite.
    pub fn chi_squared(&mut self, df: f64) -> Result<f64> {
        Ok(2.0 * self.gamma(0.5 * df)?)
    }

    /// For shapes of at least 1.
    fn gamma_from_one(&mut self, shape: f64) -> f64 {
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let x = self.normal();
            let root = 1.0 + c * x;
            if root <= 0.0 {
                continue;
            }
            let v = root * root * root;
            let u = self.uniform();
            let square = x * x;
            // The squeeze spares the logarithms in all but a few of a hundred cases.
            if u < 1.0 - 0.0331 * square * square || log(u) < 0.5 * square + d * (1.0 - v + log(v))
            {
                return d * v;
            }
        }
    }

    /// A binomial count of successes in `trials`.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when the probability is not in 0..=1 or there are more than 2⁵³ trials.
    ///
    /// # Sources
    ///
    /// Hörmann (1993), Journal of Statistical Computation and Simulation 46, 101-110, algorithm BTRS; inversion
    /// where the mean of the rarer outcome is below 10.
    pub fn binomial(&mut self, trials: u64, probability: f64) -> Result<u64> {
        // The constructor checks both arguments.
        Binomial::new(trials, probability)?;
        let rarer = probability.min(1.0 - probability);
        let count = if rarer == 0.0 || trials == 0 {
            0
        } else if trials as f64 * rarer < REJECTION_FROM {
            self.binomial_by_walk(trials, rarer)
        } else {
            self.binomial_by_rejection(trials, rarer)?
        };
        Ok(if probability > 0.5 { trials - count } else { count })
    }

    fn binomial_by_walk(&mut self, trials: u64, probability: f64) -> u64 {
        let odds = probability / (1.0 - probability);
        let none = exp(trials as f64 * log1p(-probability));
        loop {
            let mut left = self.uniform();
            let mut mass = none;
            for count in 0..=trials {
                if left <= mass {
                    return count;
                }
                left -= mass;
                mass *= odds * (trials - count) as f64 / (count + 1) as f64;
                // Beyond all mass that doubles can tell apart: rounding left a rest, so draw anew.
                if mass == 0.0 {
                    break;
                }
            }
        }
    }

    fn binomial_by_rejection(&mut self, trials: u64, p: f64) -> Result<u64> {
        let distribution = Binomial::new(trials, p)?;
        let trials = trials as f64;
        let spread = (trials * p * (1.0 - p)).sqrt();
        let b = 1.15 + 2.53 * spread;
        let a = -0.0873 + 0.0248 * b + 0.01 * p;
        let c = trials * p + 0.5;
        let inner = 0.92 - 4.2 / b;
        let alpha = (2.83 + 5.1 / b) * spread;
        let at_mode = distribution.ln_pmf(floor((trials + 1.0) * p) as u64);
        loop {
            let u = self.uniform() - 0.5;
            let v = self.uniform();
            let near = 0.5 - u.abs();
            let k = floor((2.0 * a / near + b) * u + c);
            if near >= 0.07 && v <= inner {
                return Ok(k as u64);
            }
            if k < 0.0 || k > trials {
                continue;
            }
            let hat = log(v * alpha / (a / (near * near) + b));
            if hat <= distribution.ln_pmf(k as u64) - at_mode {
                return Ok(k as u64);
            }
        }
    }

    /// A Poisson count.
    ///
    /// # Errors
    ///
    /// [`NumericsError::OutOfDomain`] when the mean is negative, not finite or above 2⁵².
    ///
    /// # Sources
    ///
    /// Hörmann (1993), Insurance: Mathematics and Economics 12, 39-45, algorithm PTRS; inversion for means below 10.
    pub fn poisson(&mut self, mean: f64) -> Result<u64> {
        let distribution = Poisson::new(mean)?;
        Ok(if mean < REJECTION_FROM {
            self.poisson_by_walk(mean)
        } else {
            self.poisson_by_rejection(mean, distribution)
        })
    }

    fn poisson_by_walk(&mut self, mean: f64) -> u64 {
        loop {
            let mut left = self.uniform();
            let mut mass = exp(-mean);
            let mut count = 0;
            while mass > 0.0 {
                if left <= mass {
                    return count;
                }
                left -= mass;
                count += 1;
                mass *= mean / count as f64;
            }
        }
    }

    fn poisson_by_rejection(&mut self, mean: f64, distribution: Poisson) -> u64 {
        let b = 0.931 + 2.53 * mean.sqrt();
        let a = -0.059 + 0.02483 * b;
        let log_inverse_alpha = log(1.1239 + 1.1328 / (b - 3.4));
        let inner = 0.9277 - 3.6224 / (b - 2.0);
        loop {
            let u = self.uniform() - 0.5;
            let v = self.uniform();
            let near = 0.5 - u.abs();
            let k = floor((2.0 * a / near + b) * u + mean + 0.43);
            if near >= 0.07 && v <= inner {
                return k as u64;
            }
            if k < 0.0 || (near < 0.013 && v > near) {
                continue;
            }
            let hat = log(v) + log_inverse_alpha - log(a / (near * near) + b);
            if hat <= distribution.ln_pmf(k as u64) {
                return k as u64;
            }
        }
    }
}
