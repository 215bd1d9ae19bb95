//! Whole-number arithmetic for the comparisons that rounding must not decide: ties between tables, and p-values
//! that equal the significance level.

use std::cmp::Ordering;

/// Relative distance within which two probabilities are compared in whole numbers.
pub(super) const CLOSE: f64 = 1e-9;

/// Up to this many units the whole numbers stay short enough to be compared in a moment.
pub(super) const LARGEST_EXACT: u64 = 20_000;

/// A whole number of any size, in limbs of 64 bits, the lowest first, without leading zeros.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Natural(Vec<u64>);

impl Natural {
    pub(super) fn one() -> Self {
        Natural(vec![1])
    }

    pub(super) fn zero() -> Self {
        Natural(Vec::new())
    }

    /// Multiplies by a machine word.
    pub(super) fn multiply(&mut self, factor: u64) {
        if factor == 0 {
            self.0.clear();
            return;
        }
        let mut carry = 0u128;
        for limb in &mut self.0 {
            let wide = u128::from(*limb) * u128::from(factor) + carry;
            *limb = wide as u64;
            carry = wide >> 64;
        }
        if carry > 0 {
            self.0.push(carry as u64);
        }
    }

    /// Divides by a machine word, for divisions known to leave no rest; a divisor of 0 leaves the number as it is.
    pub(super) fn divide(&mut self, divisor: u64) {
        if divisor == 0 {
            return;
        }
        let mut rest = 0u128;
        for limb in self.0.iter_mut().rev() {
            let wide = rest << 64 | u128::from(*limb);
            *limb = (wide / u128::from(divisor)) as u64;
            rest = wide % u128::from(divisor);
        }
        while self.0.last() == Some(&0) {
            self.0.pop();
        }
    }

    pub(super) fn add(&mut self, other: &Natural) {
        let mut carry = false;
        for i in 0..self.0.len().max(other.0.len()) {
            if i == self.0.len() {
                self.0.push(0);
            }
            if let Some(limb) = self.0.get_mut(i) {
                let (sum, over) = limb.overflowing_add(other.0.get(i).copied().unwrap_or(0));
                let (sum, over_again) = sum.overflowing_add(u64::from(carry));
                *limb = sum;
                carry = over || over_again;
            }
        }
        if carry {
            self.0.push(1);
        }
    }

    /// The product of two numbers.
    pub(super) fn times(&self, other: &Natural) -> Natural {
        let mut product = Natural::zero();
        for (i, &limb) in other.0.iter().enumerate() {
            let mut part = self.clone();
            part.multiply(limb);
            part.0.splice(0..0, std::iter::repeat_n(0, i));
            if limb != 0 {
                product.add(&part);
            }
        }
        product
    }

    pub(super) fn compare(&self, other: &Natural) -> Ordering {
        self.0.len().cmp(&other.0.len()).then_with(|| self.0.iter().rev().cmp(other.0.iter().rev()))
    }
}

/// A decimal fraction `digits / 10^places`, read from the shortest text that names a double.
///
/// A level written 0.05 means one twentieth, not the double next to it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Decimal {
    pub(super) digits: u64,
    pub(super) places: u32,
}

impl Decimal {
    /// The fraction named by a double from 0 to 1; `None` for others.
    pub(super) fn new(value: f64) -> Option<Self> {
        if !(0.0..=1.0).contains(&value) {
            return None;
        }
        let text = format!("{value:e}");
        let (mantissa, exponent) = text.split_once('e')?;
        let exponent: i32 = exponent.parse().ok()?;
        let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
        let digits = format!("{whole}{fraction}").parse().ok()?;
        let places = (fraction.len() as i32 - exponent).max(0) as u32;
        Some(Decimal { digits, places })
    }

    /// Half the fraction.
    pub(super) fn halved(self) -> Self {
        Decimal { digits: self.digits * 5, places: self.places + 1 }
    }

    /// The odds `a : b` of a probability `a / (a + b)` in lowest terms, when both fit into machine words.
    pub(super) fn odds(self) -> Option<(u64, u64)> {
        let whole = 10u64.checked_pow(self.places)?;
        let rest = whole.checked_sub(self.digits)?;
        let divisor = greatest_common_divisor(self.digits, rest).max(1);
        Some((self.digits / divisor, rest / divisor))
    }
}

fn greatest_common_divisor(mut a: u64, mut b: u64) -> u64 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

/// Compares `part / whole` with a decimal fraction.
pub(super) fn compare_share(part: &Natural, whole: &Natural, fraction: Decimal) -> Ordering {
    let mut left = part.clone();
    for _ in 0..fraction.places {
        left.multiply(10);
    }
    let mut right = whole.clone();
    right.multiply(fraction.digits);
    left.compare(&right)
}

/// `C(n, k)`.
pub(super) fn choose(n: u64, k: u64) -> Natural {
    let mut product = Natural::one();
    if k > n {
        return Natural::zero();
    }
    for i in 0..k.min(n - k) {
        product.multiply(n - i);
        product.divide(i + 1);
    }
    product
}

#[cfg(test)]
mod tests {
    use super::*;

    fn number(value: u128) -> Natural {
        let mut limbs = vec![value as u64, (value >> 64) as u64];
        while limbs.last() == Some(&0) {
            limbs.pop();
        }
        Natural(limbs)
    }

    #[test]
    fn binomial_coefficients_obey_pascals_rule_beyond_one_limb() {
        for n in 1..200 {
            for k in 1..n {
                let mut sum = choose(n - 1, k - 1);
                sum.add(&choose(n - 1, k));
                assert_eq!(sum, choose(n, k), "C({n}, {k})");
            }
        }
        // 100 choose 50, as listed in the Online Encyclopedia of Integer Sequences, A000984 (from memory).
        assert_eq!(choose(100, 50), number(100_891_344_545_564_193_334_812_497_256));
    }

    #[test]
    fn decimals_are_read_as_written() {
        let cases = [
            (0.05, 5, 2),
            (0.025, 25, 3),
            (1e-7, 1, 7),
            (0.1, 1, 1),
            (1.0, 1, 0),
            (0.0, 0, 0),
            (0.123_456_789_012_345_6, 1_234_567_890_123_456, 16),
        ];
        for (value, digits, places) in cases {
            assert_eq!(Decimal::new(value), Some(Decimal { digits, places }), "{value}");
        }
        assert_eq!(Decimal::new(-0.1), None);
    }

    #[test]
    fn shares_are_compared_without_rounding() {
        let level = Decimal { digits: 5, places: 2 };
        assert_eq!(compare_share(&number(1), &number(20), level), Ordering::Equal);
        let whole = number(20 * 10u128.pow(36));
        assert_eq!(compare_share(&number(10u128.pow(36) + 1), &whole, level), Ordering::Greater);
        assert_eq!(compare_share(&number(10u128.pow(36) - 1), &whole, level), Ordering::Less);
    }
}
