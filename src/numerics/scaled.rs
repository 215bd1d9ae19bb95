//! Positive numbers beyond the range of `f64`, kept as a factor and the logarithm of a scale.

/// The number `factor · exp(exponent)`, so that a tail of 1e-2000 still has a logarithm.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Scaled {
    /// What multiplies the scale.
    pub factor: f64,
    /// Natural logarithm of the scale.
    pub exponent: f64,
}

impl Scaled {
    /// Zero.
    pub const ZERO: Self = Self { factor: 0.0, exponent: 0.0 };

    /// An ordinary number.
    pub fn plain(value: f64) -> Self {
        Self { factor: value, exponent: 0.0 }
    }

    /// The number itself; zero when it is below the range of `f64`.
    pub fn value(self) -> f64 {
        if self.exponent == 0.0 {
            self.factor
        } else if self.exponent > -700.0 {
            self.factor * libm::exp(self.exponent)
        } else {
            // The scale alone may be below the normal numbers while the product is not: apply it in two halves.
            let half = libm::exp(0.5 * self.exponent);
            self.factor * half * half
        }
    }

    /// Natural logarithm; minus infinity for zero.
    pub fn ln(self) -> f64 {
        if self.factor > 0.0 { self.exponent + libm::log(self.factor) } else { f64::NEG_INFINITY }
    }

    /// The sum of two such numbers, on the larger scale.
    pub fn plus(self, other: Self) -> Self {
        let (large, small) =
            if self.exponent >= other.exponent { (self, other) } else { (other, self) };
        let shifted = small.factor * libm::exp(small.exponent - large.exponent);
        Self { factor: large.factor + shifted, exponent: large.exponent }
    }

    /// The same number times `e^exponent`.
    pub fn times_exp(self, exponent: f64) -> Self {
        Self { factor: self.factor, exponent: self.exponent + exponent }
    }

    /// The product of two such numbers.
    pub fn product(self, other: Self) -> Self {
        Self { factor: self.factor * other.factor, exponent: self.exponent + other.exponent }
    }

    /// The same number times an ordinary one.
    pub fn times(self, multiplier: f64) -> Self {
        Self { factor: self.factor * multiplier, exponent: self.exponent }
    }
}

/// The value, or the bound that rounding carried it past; not a number stays what it is.
fn clipped(value: f64, low: f64, high: f64) -> f64 {
    if value > high {
        high
    } else if value < low {
        low
    } else {
        value
    }
}

/// The two tails of a probability, of which one was computed directly and the other is its complement.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Tails {
    /// The lower tail was computed.
    Lower(Scaled),
    /// The upper tail was computed.
    Upper(Scaled),
}

impl Tails {
    /// Probability of the lower tail.
    pub fn lower(self) -> f64 {
        match self {
            Self::Lower(tail) => clipped(tail.value(), 0.0, 1.0),
            Self::Upper(tail) => clipped(1.0 - tail.value(), 0.0, 1.0),
        }
    }

    /// Probability of the upper tail.
    pub fn upper(self) -> f64 {
        self.swapped().lower()
    }

    /// The lower tail in scaled form.
    pub fn lower_scaled(self) -> Scaled {
        match self {
            Self::Lower(tail) => tail,
            Self::Upper(_) => Scaled::plain(self.lower()),
        }
    }

    /// The upper tail in scaled form.
    pub fn upper_scaled(self) -> Scaled {
        self.swapped().lower_scaled()
    }

    /// Logarithm of the lower tail.
    pub fn ln_lower(self) -> f64 {
        match self {
            Self::Lower(tail) => clipped(tail.ln(), f64::NEG_INFINITY, 0.0),
            Self::Upper(tail) => libm::log1p(-clipped(tail.value(), 0.0, 1.0)),
        }
    }

    /// Logarithm of the upper tail.
    pub fn ln_upper(self) -> f64 {
        self.swapped().ln_lower()
    }

    /// The same tails seen from the other side.
    pub fn swapped(self) -> Self {
        match self {
            Self::Lower(tail) => Self::Upper(tail),
            Self::Upper(tail) => Self::Lower(tail),
        }
    }
}
