//! The simulated study: standard normal raw data, and the t statistics of every comparison.

use std::sync::Arc;

use crate::designs::Trial;
use crate::numerics::random::Stream;

/// One comparison of a simulated study, in units of the standard deviation.
#[derive(Debug, Clone, Copy)]
pub(super) struct Comparison {
    /// Group that is subtracted.
    pub(super) first: usize,
    /// Group from which it is subtracted.
    pub(super) second: usize,
    /// `√(1/n_i + 1/n_j)`.
    pub(super) factor: f64,
    /// True difference.
    pub(super) shift: f64,
}

/// A simulated study.
#[derive(Debug)]
pub(super) struct MeansTrial {
    /// Sizes of the groups.
    pub(super) sizes: Vec<usize>,
    /// Degrees of freedom of the pooled standard deviation.
    pub(super) df: f64,
    /// Critical values: one for all comparisons, or those of a step-down procedure, the strictest first.
    pub(super) critical: Vec<f64>,
    /// Whether both directions count.
    pub(super) two_sided: bool,
    /// The comparisons.
    pub(super) comparisons: Arc<[Comparison]>,
    /// Position of the comparison that the plan is about.
    pub(super) weakest: usize,
}

/// Marks the statistics that are rejected: each against the critical value of its step, from the largest down, until
/// one is not rejected; with a single critical value all steps have the same.
pub(in crate::designs) fn reject(critical: &[f64], statistics: &[f64], rejected: &mut [bool]) {
    if let [critical] = critical {
        for (statistic, rejected) in statistics.iter().zip(rejected) {
            *rejected = *statistic > *critical;
        }
        return;
    }
    let mut order: Vec<usize> = (0..statistics.len()).collect();
    let statistic = |i: &usize| statistics.get(*i).copied().unwrap_or(f64::NEG_INFINITY);
    order.sort_by(|a, b| statistic(b).total_cmp(&statistic(a)));
    rejected.fill(false);
    for (position, critical) in order.iter().zip(critical) {
        if statistic(position) <= *critical {
            break;
        }
        if let Some(rejected) = rejected.get_mut(*position) {
            *rejected = true;
        }
    }
}

impl Trial for MeansTrial {
    fn comparisons(&self) -> usize {
        self.comparisons.len()
    }

    fn weakest(&self) -> usize {
        self.weakest
    }

    fn differing(&self) -> Vec<bool> {
        self.comparisons.iter().map(|c| c.shift != 0.0).collect()
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
        let values = self.values();
        let (groups, comparisons) = (self.sizes.len(), self.comparisons.len());
        scratch.resize(values + groups + 2 * comparisons, 0.0);
        let (data, rest) = scratch.split_at_mut(values);
        let (means, rest) = rest.split_at_mut(groups);
        let (with_shift, without) = rest.split_at_mut(comparisons);
        stream.fill_normal(data);
        let mut squares = 0.0;
        let mut rest: &[f64] = data;
        for (size, mean) in self.sizes.iter().zip(means.iter_mut()) {
            let (own, others) = rest.split_at(*size);
            rest = others;
            let (mut sum, mut own_squares) = (0.0, 0.0);
            for value in own {
                sum += value;
                own_squares += value * value;
            }
            *mean = sum / *size as f64;
            squares += own_squares - sum * *mean;
        }
        let pooled = (squares / self.df).sqrt();
        for ((comparison, with_shift), without) in
            self.comparisons.iter().zip(with_shift.iter_mut()).zip(without.iter_mut())
        {
            let mean = |g: usize| means.get(g).copied().unwrap_or(0.0);
            let difference = mean(comparison.second) - mean(comparison.first);
            let statistic = |d: f64| {
                let t = d / (pooled * comparison.factor);
                if self.two_sided { t.abs() } else { t }
            };
            *with_shift = statistic(difference + comparison.shift);
            *without = statistic(difference);
        }
        reject(&self.critical, with_shift, planned);
        reject(&self.critical, without, null);
    }
}
