//! A simulated study: raw data of two groups, each with its own standard deviation, and Welch's test.

use std::sync::Arc;

use super::power::Pair;
use crate::designs::problem::Trial;
use crate::numerics::{self, Continuous, StudentT, random::Stream};

/// A simulated study: normal raw data in units of the larger standard deviation, Welch's test.
#[derive(Debug)]
pub(super) struct WelchTrial {
    pub(super) sizes: Vec<usize>,
    pub(super) sds: Arc<[f64]>,
    pub(super) pair: Pair,
    pub(super) tail: f64,
    pub(super) two_sided: bool,
    pub(super) shift: f64,
    /// The quantile at the fewest degrees of freedom that can be estimated: beyond it every study rejects.
    pub(super) surely: f64,
    /// The quantile at the most: below it none does.
    pub(super) never: f64,
}

impl WelchTrial {
    fn rejects(&self, difference: f64, error: f64, df: f64) -> bool {
        let t = if self.two_sided { difference.abs() / error } else { difference / error };
        let beyond =
            || -> numerics::Result<bool> { Ok(t > StudentT::new(df)?.upper_quantile(self.tail)?) };
        // A failed quantile counts as no rejection, which the comparison with the exact power would bring to light.
        t > self.never && (t > self.surely || beyond().unwrap_or(false))
    }
}

impl Trial for WelchTrial {
    fn comparisons(&self) -> usize {
        1
    }

    fn weakest(&self) -> usize {
        0
    }

    fn differing(&self) -> Vec<bool> {
        vec![self.shift != 0.0]
    }

    fn values(&self) -> usize {
        self.sizes.iter().sum()
    }

    fn run(
        &self,
        stream: &mut Stream,
        scratch: &mut Vec<f64>,
        planned: &mut [bool],
        null: &mut [bool],
    ) {
        scratch.resize(self.values(), 0.0);
        stream.fill_normal(scratch);
        let mut rest: &[f64] = scratch;
        let (mut difference, mut variance, mut squares) = (0.0, 0.0, 0.0);
        for (group, ((size, sd), df)) in
            self.sizes.iter().zip(self.sds.iter()).zip(self.pair.df).enumerate()
        {
            let (own, others) = rest.split_at(*size);
            rest = others;
            let (mut sum, mut own_squares) = (0.0, 0.0);
            for value in own {
                sum += value;
                own_squares += value * value;
            }
            let n = *size as f64;
            let of_mean = sd * sd * (own_squares - sum * sum / n) / (df * n);
            difference += if group == 0 { -sd * sum / n } else { sd * sum / n };
            variance += of_mean;
            squares += of_mean * of_mean / df;
        }
        let (error, df) = (variance.sqrt(), variance * variance / squares);
        planned.fill(self.rejects(difference + self.shift, error, df));
        null.fill(self.rejects(difference, error, df));
    }
}
