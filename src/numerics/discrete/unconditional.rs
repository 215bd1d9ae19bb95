//! Unconditional tests of two proportions: tables ordered by a statistic, the p-value maximised over the common
//! proportion.

use super::conditional::Margin;
use super::ends::{Ends, Extreme, Ladder, Weights};
use super::exact::{CLOSE, Decimal};
use super::two_binomials::Alternative;
use crate::numerics::error::{NumericsError, Result};
use libm::{asin, sin};
use std::cmp::Ordering;
use std::f64::consts::FRAC_PI_2;

/// Both groups together: all tables are listed, and their probabilities must stay in the range of doubles.
const LARGEST_TOTAL: u64 = 1000;

/// Maxima above the level by less than this share are rounding.
const SLACK: f64 = 1e-12;

/// The order in which tables enter the rejection region.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Ordered {
    /// By the pooled z statistic, two-sided by its absolute value.
    ByPooledStatistic(Alternative),
    /// By Fisher's p-value.
    ByFisher(Extreme),
}

/// A table with what decides its place in the order.
#[derive(Clone, Copy)]
struct Table {
    x1: u64,
    successes: u64,
    /// Fisher's p-value, or the sign-carrying square of the pooled statistic with its sign turned.
    key: f64,
    ends: Ends,
    /// Probability given the margin.
    share: f64,
}

/// The splits that reject, for each number of successes in both groups together.
pub(super) fn unconditional_ends(
    first: u64,
    second: u64,
    alpha: f64,
    ordered: Ordered,
) -> Result<Vec<Ends>> {
    if first + second > LARGEST_TOTAL {
        return Err(NumericsError::OutOfDomain {
            name: "units in both groups",
            given: (first + second) as f64,
            allowed: "at most 1000 for an unconditional test",
        });
    }
    let order = Order { first, second, ordered };
    let mut tables = order.tables();
    tables.sort_by(|a, b| order.compare(a, b));
    let groups = order.groups(&tables);
    let fits = |count: usize| {
        let end = count.checked_sub(1).and_then(|last| groups.get(last)).copied().unwrap_or(0);
        order.within_level(tables.get(..end).unwrap_or_default(), alpha)
    };
    // Adding tables only raises the maximum, so the largest number of groups that fits can be bisected.
    let (mut low, mut high) = (0, groups.len());
    while low < high {
        let middle = low + (high - low).div_ceil(2);
        if fits(middle) {
            low = middle;
        } else {
            high = middle - 1;
        }
    }
    let end = low.checked_sub(1).and_then(|last| groups.get(last)).copied().unwrap_or(0);
    Ok(order.ends_of(tables.get(..end).unwrap_or_default()))
}

/// Two groups and an order of their tables.
struct Order {
    first: u64,
    second: u64,
    ordered: Ordered,
}

impl Order {
    fn margin(&self, successes: u64) -> Margin {
        Margin {
            first: self.first,
            second: self.second,
            successes,
            level: Decimal { digits: 1, places: 0 },
        }
    }

    fn tables(&self) -> Vec<Table> {
        let extreme = match self.ordered {
            Ordered::ByFisher(extreme) => extreme,
            Ordered::ByPooledStatistic(_) => Extreme::Large,
        };
        let mut weights = Weights::default();
        let mut tables = Vec::new();
        for successes in 0..=self.first + self.second {
            let margin = self.margin(successes);
            // A level next to 0 keeps every split in the list.
            weights.fill(&margin, 0.0);
            for (x1, ends, p) in weights.p_values(&margin, extreme) {
                let key = match self.ordered {
                    Ordered::ByFisher(_) => p,
                    Ordered::ByPooledStatistic(_) => -self.pooled_square(x1, successes),
                };
                tables.push(Table { x1, successes, key, ends, share: weights.probability(x1) });
            }
        }
        tables
    }

    /// `n₁ n₂ (p̂₁ - p̂₂)`, a whole number.
    fn difference(&self, x1: u64, successes: u64) -> i128 {
        i128::from(x1) * i128::from(self.second)
            - i128::from(successes - x1) * i128::from(self.first)
    }

    /// The square of the pooled statistic but for a constant, negative for a negative difference when one-sided.
    fn pooled_square(&self, x1: u64, successes: u64) -> f64 {
        let (numerator, denominator) = self.pooled_ratio(x1, successes);
        if denominator == 0 { 0.0 } else { numerator as f64 / denominator as f64 }
    }

    fn pooled_ratio(&self, x1: u64, successes: u64) -> (i128, i128) {
        let difference = self.difference(x1, successes);
        let square = difference * difference;
        let two_sided = self.ordered == Ordered::ByPooledStatistic(Alternative::TwoSided);
        let signed = if difference < 0 && !two_sided { -square } else { square };
        let failures = self.first + self.second - successes;
        (signed, i128::from(successes) * i128::from(failures))
    }

    /// The more extreme table first; equality is decided in whole numbers.
    fn compare(&self, a: &Table, b: &Table) -> Ordering {
        if (a.key - b.key).abs() > CLOSE * b.key.abs() {
            return a.key.total_cmp(&b.key);
        }
        match self.ordered {
            Ordered::ByPooledStatistic(_) => self.compare_statistics(a, b),
            Ordered::ByFisher(_) => self.compare_p_values(a, b),
        }
    }

    fn compare_statistics(&self, a: &Table, b: &Table) -> Ordering {
        let (p, q) = self.pooled_ratio(a.x1, a.successes);
        let (r, s) = self.pooled_ratio(b.x1, b.successes);
        // 0/0 is 0: any positive denominator will do.
        (r * q.max(1)).cmp(&(p * s.max(1)))
    }

    fn compare_p_values(&self, a: &Table, b: &Table) -> Ordering {
        if a.successes == b.successes && a.ends == b.ends {
            return Ordering::Equal;
        }
        let total = self.first + self.second;
        let turned = self.first == self.second
            && a.successes + b.successes == total
            && a.x1 + b.successes == self.first + b.x1;
        if turned {
            return Ordering::Equal;
        }
        let (margin_a, margin_b) = (self.margin(a.successes), self.margin(b.successes));
        let left = margin_a.tables_at(a.ends).times(&margin_b.all_tables());
        let right = margin_b.tables_at(b.ends).times(&margin_a.all_tables());
        left.compare(&right)
    }

    /// Where each group of tied tables ends.
    fn groups(&self, tables: &[Table]) -> Vec<usize> {
        let mut ends = Vec::new();
        for (i, pair) in tables.windows(2).enumerate() {
            if let [a, b] = pair
                && self.compare(a, b) != Ordering::Equal
            {
                ends.push(i + 1);
            }
        }
        ends.push(tables.len());
        ends
    }

    /// Whether the tables' probability stays within `alpha` for every common proportion.
    ///
    /// With `π = sin² θ` the information about `θ` is `4 N`, so `asin sqrt(P)` changes by at most `sqrt(N)` a unit of
    /// `θ`: an interval whose ends are low enough needs no look inside.
    fn within_level(&self, tables: &[Table], alpha: f64) -> bool {
        let total = self.first + self.second;
        let mut shares = vec![0.0; total as usize + 1];
        for table in tables {
            if let Some(share) = shares.get_mut(table.successes as usize) {
                *share += table.share;
            }
        }
        const FINEST: f64 = 1e-10;
        let slope = (total as f64).sqrt();
        let limit = asin((alpha * (1.0 + SLACK)).min(1.0).sqrt());
        let height = |theta: f64| asin(probability(&shares, theta).min(1.0).sqrt());
        let pieces = 2 * total;
        let width = FRAC_PI_2 / pieces as f64;
        let mut open = Vec::new();
        let mut left = height(0.0);
        for i in 0..pieces {
            let start = i as f64 * width;
            let right = height(start + width);
            open.push((start, width, left, right));
            left = right;
        }
        while let Some((start, width, left, right)) = open.pop() {
            if left.max(right) > limit {
                return false;
            }
            if 0.5 * (left + right + slope * width) <= limit || width < FINEST {
                continue;
            }
            let half = 0.5 * width;
            let middle = height(start + half);
            open.push((start, half, left, middle));
            open.push((start + half, half, middle, right));
        }
        true
    }

    /// The region in terms of the two ends of each margin.
    fn ends_of(&self, tables: &[Table]) -> Vec<Ends> {
        let total = self.first + self.second;
        let mut kept: Vec<Option<(u64, u64)>> = Vec::new();
        let mut rejected: Vec<Vec<u64>> = vec![Vec::new(); total as usize + 1];
        for table in tables {
            if let Some(splits) = rejected.get_mut(table.successes as usize) {
                splits.push(table.x1);
            }
        }
        for (successes, splits) in (0..=total).zip(&mut rejected) {
            splits.sort_unstable();
            let margin = self.margin(successes);
            let mut inside =
                (margin.lowest()..=margin.highest()).filter(|x| splits.binary_search(x).is_err());
            let first = inside.next();
            kept.push(first.map(|first| (first, inside.next_back().unwrap_or(first))));
        }
        kept.into_iter()
            .map(|inside| match inside {
                Some((first, last)) => Ends { below: first, from: last + 1 },
                None => Ends { below: 0, from: 0 },
            })
            .collect()
    }
}

/// `Σ shares[m] C(N, m) π^m (1-π)^(N-m)` for `π = sin² θ`, from the most probable margin outward.
fn probability(shares: &[f64], theta: f64) -> f64 {
    let total = shares.len() - 1;
    let n = total as f64;
    let sine = sin(theta);
    let p = sine * sine;
    if p <= 0.0 {
        return shares.first().copied().unwrap_or(0.0);
    }
    if p >= 1.0 {
        return shares.last().copied().unwrap_or(0.0);
    }
    let odds = p / (1.0 - p);
    let mode = ((n + 1.0) * p) as usize;
    let mode = mode.min(total);
    let (mut weight, mut all, mut sum) = (1.0, 0.0, 0.0);
    for (m, share) in shares.iter().enumerate().skip(mode) {
        all += weight;
        sum += weight * share;
        weight *= odds * (n - m as f64) / (m as f64 + 1.0);
    }
    weight = 1.0;
    for (m, share) in shares.iter().enumerate().take(mode).rev() {
        weight *= (m as f64 + 1.0) / (odds * (n - m as f64));
        all += weight;
        sum += weight * share;
    }
    sum / all
}
