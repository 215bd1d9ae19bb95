//! Exact decimals. A fraction such as 0.1 is meant as one tenth, which binary floating point cannot hold;
//! rounding a size up through it would now and then ask for one unit too many (9/(1 - 0.1) is 10, not 10.000000000000002).

/// A non-negative decimal number `mantissa / 10^places`, exact.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Decimal {
    mantissa: u128,
    scale: u128,
}

impl Decimal {
    /// The decimal that a reader would write for this double: its shortest representation that reads back.
    ///
    /// `None` when the number is negative, not finite, at least 1e6 or has more than 20 decimal places.
    pub fn from_written(value: f64) -> Option<Self> {
        if !(0.0..1e6).contains(&value) {
            return None;
        }
        let text = format!("{value}");
        let (whole, part) = text.split_once('.').unwrap_or((&text, ""));
        if part.len() > 20 {
            return None;
        }
        let mantissa = format!("{whole}{part}").parse().ok()?;
        let scale = 10u128.checked_pow(u32::try_from(part.len()).ok()?)?;
        Some(Self { mantissa, scale })
    }

    /// `1 - self`, or `None` when that is negative.
    pub fn complement(self) -> Option<Self> {
        Some(Self { mantissa: self.scale.checked_sub(self.mantissa)?, scale: self.scale })
    }

    /// The smallest whole number not below `n * self / divisor`; `None` on overflow or division by nought.
    pub fn times_over_ceil(self, n: u64, divisor: Self) -> Option<u64> {
        let top = u128::from(n).checked_mul(self.mantissa)?.checked_mul(divisor.scale)?;
        let bottom = self.scale.checked_mul(divisor.mantissa)?;
        if bottom == 0 {
            return None;
        }
        u64::try_from(top.div_ceil(bottom)).ok()
    }

    /// The smallest whole number not below `n / self`; `None` on overflow or division by nought.
    pub fn divide_ceil(self, n: u64) -> Option<u64> {
        Self { mantissa: 1, scale: 1 }.times_over_ceil(n, self)
    }

    /// The largest whole number not above `n * self`; `None` on overflow.
    pub fn times_floor(self, n: u64) -> Option<u64> {
        u64::try_from(u128::from(n).checked_mul(self.mantissa)? / self.scale).ok()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tenths_are_exact() {
        let kept = Decimal::from_written(0.1).and_then(Decimal::complement);
        assert_eq!(kept.and_then(|k| k.divide_ceil(9)), Some(10));
        assert_eq!(kept.and_then(|k| k.divide_ceil(10)), Some(12));
        assert_eq!(kept.and_then(|k| k.times_floor(10)), Some(9));
        let ratio = Decimal::from_written(1.1);
        let one = Decimal::from_written(1.0);
        assert_eq!(ratio.zip(one).and_then(|(r, o)| r.times_over_ceil(10, o)), Some(11));
    }

    #[test]
    fn what_cannot_be_held_is_refused() {
        assert_eq!(Decimal::from_written(f64::NAN), None);
        assert_eq!(Decimal::from_written(-0.1), None);
        assert_eq!(Decimal::from_written(1e7), None);
        let nought = Decimal::from_written(0.0);
        assert_eq!(nought.and_then(|d| d.divide_ceil(3)), None);
    }
}
