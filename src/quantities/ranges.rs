//! The single table of legal ranges, with the name that a message uses and the reason for an odd limit.

use std::fmt;

/// A legal range of a number, ends included or not.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    /// What a message calls the number.
    pub name: &'static str,
    /// Lower end.
    pub low: f64,
    /// Whether the lower end itself is legal.
    pub low_included: bool,
    /// Upper end.
    pub high: f64,
    /// Whether the upper end itself is legal.
    pub high_included: bool,
    /// The range in words, and the way out.
    pub advice: &'static str,
}

/// Significance level: above 0.4 a "test" would reject four true hypotheses in ten.
pub const ALPHA: Range = Range {
    name: "the significance level",
    low: 1e-12,
    low_included: true,
    high: 0.4,
    high_included: true,
    advice: "must lie above 0 and at most at 0.4; 0.05 is usual, written as a fraction, not in percent",
};

/// Power to aim for: 1 would need infinitely many units.
pub const POWER: Range = Range {
    name: "the power",
    low: 0.0,
    low_included: false,
    high: 0.999_999,
    high_included: true,
    advice: "must lie above the significance level and below 1 (no finite study has a power of 1); 0.8 or 0.9 is usual",
};

/// Share of units that will be lost.
pub const LOSS_FRACTION: Range = Range {
    name: "the fraction lost",
    low: 0.0,
    low_included: true,
    high: 0.95,
    high_included: true,
    advice: "must lie between 0 and 0.95, written as a fraction (0.1 for ten in a hundred)",
};

/// A standard deviation.
pub const SPREAD: Range = Range {
    name: "the standard deviation",
    low: 1e-100,
    low_included: true,
    high: 1e100,
    high_included: true,
    advice: "must be a positive number in the unit of the outcome, from 1e-100 to 1e100; values that never vary need no study",
};

/// A difference to detect, by its size.
pub const DIFFERENCE: Range = Range {
    name: "the size of the difference",
    low: 1e-100,
    low_included: true,
    high: 1e100,
    high_included: true,
    advice: "must not be 0, and from 1e-100 to 1e100 in size: a study cannot be sized to detect no difference",
};

/// A correlation.
pub const CORRELATION: Range = Range {
    name: "the correlation",
    low: -1.0,
    low_included: false,
    high: 1.0,
    high_included: false,
    advice: "must lie between -1 and 1, both excluded",
};

/// Weight of a group in the allocation.
pub const WEIGHT: Range = Range {
    name: "the allocation weight",
    low: 0.001,
    low_included: true,
    high: 1000.0,
    high_included: true,
    advice: "must lie between 0.001 and 1000; 1 for every group means equal groups",
};

/// A correlation to detect, by its size.
pub const CORRELATION_SIZE: Range = Range {
    name: "the size of the correlation",
    low: 1e-6,
    low_included: true,
    high: 0.9999,
    high_included: true,
    advice: "must lie between 0 and 1, both excluded (from 0.000001 to 0.9999)",
};

/// Cost of a unit, in whatever currency; only ratios count.
pub const COST: Range = Range {
    name: "the cost of a unit",
    low: 1e-6,
    low_included: true,
    high: 1e12,
    high_included: true,
    advice: "must be above 0 and at most 1e12, in the same currency for each group",
};

impl Range {
    /// The value if it is legal.
    ///
    /// # Errors
    ///
    /// [`OutOfRange`] when the value is not finite or lies outside.
    pub fn check(&'static self, value: f64) -> Result<f64, OutOfRange> {
        let above = value > self.low || (self.low_included && value == self.low);
        let below = value < self.high || (self.high_included && value == self.high);
        if value.is_finite() && above && below {
            Ok(value)
        } else {
            Err(OutOfRange { range: self, given: value })
        }
    }
}

/// A number outside its range.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OutOfRange {
    /// The range that was missed.
    pub range: &'static Range,
    /// The number that was given.
    pub given: f64,
}

impl fmt::Display for OutOfRange {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let given = Written(self.given);
        write!(f, "{} is {given}; it {}", self.range.name, self.range.advice)
    }
}

impl std::error::Error for OutOfRange {}

/// A number as a message shows it: with all its digits, but in scientific form where most of them would be zeros
/// (below 1e-5 or from 1e16 on).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Written(pub f64);

impl fmt::Display for Written {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let size = self.0.abs();
        if size == 0.0 || (1e-5..1e16).contains(&size) || !self.0.is_finite() {
            write!(f, "{}", self.0)
        } else {
            write!(f, "{:e}", self.0)
        }
    }
}

/// A whole number as a message shows it: its digits in threes, parted by spaces.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Grouped(pub u64);

impl fmt::Display for Grouped {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let digits = self.0.to_string();
        for (position, digit) in digits.chars().enumerate() {
            if position > 0 && (digits.len() - position).is_multiple_of(3) {
                f.write_str(" ")?;
            }
            write!(f, "{digit}")?;
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_written_without_rows_of_zeros() {
        let shown = |value: f64| Written(value).to_string();
        assert_eq!([0.0, 0.05, -2.0, 1e6].map(shown), ["0", "0.05", "-2", "1000000"]);
        assert_eq!([1e-300, -1e-300, 2.5e200].map(shown), ["1e-300", "-1e-300", "2.5e200"]);
        assert_eq!([f64::NAN, f64::INFINITY].map(shown), ["NaN", "inf"]);
        let out = SPREAD.check(1e-300).map_err(|out| out.to_string());
        assert!(out.is_err_and(|said| said.starts_with("the standard deviation is 1e-300; it ")));
    }

    #[test]
    fn digits_stand_in_threes() {
        let shown = |value: u64| Grouped(value).to_string();
        assert_eq!(
            [7, 100, 1234, 1_000_000_000].map(shown),
            ["7", "100", "1 234", "1 000 000 000"]
        );
    }
}
