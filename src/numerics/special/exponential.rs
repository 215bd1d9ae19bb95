//! The exponential function of several arguments at once, in plain arithmetic that compilers turn into vector code.

/// Arguments in a batch.
pub(crate) const LANES: usize = 4;

/// Beyond this size arguments count as this size: the results, 1e-304 and its reciprocal, are ordinary numbers.
const LIMIT: f64 = 700.0;

/// `1.5 · 2^52`: adding it rounds to a whole number, which then stands in the lowest bits.
const ROUNDER: f64 = 6_755_399_441_055_744.0;

/// `ln 2` in two parts, the first with 21 trailing zero bits, so that its product with an exponent is exact.
const LN_2_HIGH: f64 = f64::from_bits(0x3fe6_2e42_fee0_0000);
const LN_2_LOW: f64 = 1.908_214_929_270_587_7e-10;

/// Coefficients of `(e^r - 1 - r) / r²` for `|r| <= ln(2)/2`, highest first.
///
/// Chebyshev fit in 40-digit arithmetic; the error of the exponential is below 2e-19.
const COEFFICIENTS: [f64; 11] = [
    2.0914686968086876e-9,
    2.5105217004720745e-8,
    2.75572736431103e-7,
    2.7557255400206422e-6,
    2.4801587325547743e-5,
    0.00019841269874820627,
    0.0013888888888883748,
    0.008333333333326136,
    0.04166666666666667,
    0.1666666666666667,
    0.5,
];

/// `e^x` for every `x`, relative error below 3e-16; not a number stays what it is.
#[inline]
pub(crate) fn exp(batch: [f64; LANES]) -> [f64; LANES] {
    batch.map(|x| {
        let x = if x < -LIMIT { -LIMIT } else { x };
        let x = if x > LIMIT { LIMIT } else { x };
        let shifted = x * core::f64::consts::LOG2_E + ROUNDER;
        let whole = shifted - ROUNDER;
        let r = (x - whole * LN_2_HIGH) - whole * LN_2_LOW;
        let rest = COEFFICIENTS.iter().fold(0.0, |sum, c| sum * r + c);
        // The whole number, moved into the exponent's bits, multiplies by that power of two.
        let fraction = 1.0 + (r + r * r * rest);
        let power = f64::from_bits((shifted.to_bits() << 52).wrapping_add(1.0_f64.to_bits()));
        fraction * power
    })
}
