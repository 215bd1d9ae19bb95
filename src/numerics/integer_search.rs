//! The smallest whole number that meets a target, for functions that rise and for functions that saw-tooth.
//!
//! Exact tests of discrete data have a power that falls back each time the critical value jumps. "The smallest n"
//! is then two questions: the first n that reaches the target, and the n from which the target is never missed
//! again. Each result says which one it answers.

use super::error::{NumericsError, Result};

/// Which question about a size was answered.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Question {
    /// The function was taken to rise: `n` meets the target, `n - 1` does not (or `n` is the lower limit).
    Monotone,
    /// Every size below was looked at: `n` is the first to reach the target; a larger one may miss it again.
    FirstReaching,
    /// Every size from `n` up to `scanned_to` reaches the target, and `n - 1` does not (or `n` is the lower limit).
    NeverBelowFrom {
        /// The largest size looked at; nothing is said about sizes above it.
        scanned_to: u64,
    },
}

/// A smallest size with its evidence.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Smallest {
    /// The size.
    pub n: u64,
    /// The question it answers.
    pub question: Question,
    /// The function value at `n` (1 where the question was yes or no).
    pub value: f64,
    /// The function value at `n - 1`; absent when `n` is the lower limit.
    pub value_before: Option<f64>,
    /// How many times the function was evaluated.
    pub evaluations: usize,
}

/// The smallest `n` from `lo` to `hi` for which `meets` is true, where `meets` once true stays true.
///
/// # Method
///
/// From the hint (or from `lo`) outward in steps that double, until one size that meets the target and one that
/// does not enclose the answer, then halving. At most about `2 log2(hi - lo)` evaluations, and two for an exact hint.
///
/// # Accuracy
///
/// Both `n` and `n - 1` have been evaluated when it returns (`tests/numerics_solvers/integer_search.rs`).
///
/// # Errors
///
/// * [`NumericsError::TargetOutOfReach`] when `hi` does not meet it (best value 0: a yes-or-no question has no other).
/// * [`NumericsError::OutOfDomain`] when `lo` exceeds `hi`.
/// * Whatever `meets` itself returns.
pub fn smallest_monotone(
    lo: u64,
    hi: u64,
    hint: Option<u64>,
    mut meets: impl FnMut(u64) -> Result<bool>,
) -> Result<Smallest> {
    smallest_rising(lo, hi, hint, 1.0, |n| Ok(if meets(n)? { 1.0 } else { 0.0 }))
}

/// The smallest `n` from `lo` to `hi` with `value(n) >= target`, where `value` rises with `n`.
///
/// Method, accuracy and errors as [`smallest_monotone`]; the error carries the value at `hi` as the best one.
///
/// # Errors
///
/// See [`smallest_monotone`]; [`NumericsError::OutOfDomain`] also when `value` gives NaN.
pub fn smallest_rising(
    lo: u64,
    hi: u64,
    hint: Option<u64>,
    target: f64,
    value: impl FnMut(u64) -> Result<f64>,
) -> Result<Smallest> {
    let mut probe = Probe::new(lo, hi, target, value)?;
    let start = hint.unwrap_or(lo).clamp(lo, hi);
    let first = probe.at(start)?;
    let (below, above) = if probe.reaches(first) {
        match probe.gallop_down(start, first)? {
            (Some(below), above) => (below, above),
            (None, (n, value)) => {
                return Ok(probe.answer(n, Question::Monotone, value, None));
            }
        }
    } else {
        probe.gallop_up(start, first)?
    };
    probe.halve(below, above)
}

/// The first `n` from `lo` to `hi` with `value(n) >= target`, for a function that need not rise: every size is tried.
///
/// # Errors
///
/// * [`NumericsError::TargetOutOfReach`] with the best value met when none reaches the target.
/// * [`NumericsError::OutOfDomain`] when `lo` exceeds `hi` or `value` gives NaN.
/// * Whatever `value` itself returns.
pub fn first_reaching(
    lo: u64,
    hi: u64,
    target: f64,
    value: impl FnMut(u64) -> Result<f64>,
) -> Result<Smallest> {
    let mut probe = Probe::new(lo, hi, target, value)?;
    let mut before = None;
    for n in lo..=hi {
        let here = probe.at(n)?;
        if probe.reaches(here) {
            return Ok(probe.answer(n, Question::FirstReaching, here, before));
        }
        before = Some(here);
    }
    Err(probe.out_of_reach())
}

/// The smallest `n` from which every size up to `scan_to` has `value(n) >= target`.
///
/// Scans downward from `scan_to`, so it costs no more than the sizes that hold, plus one. The caller chooses
/// `scan_to` far enough above the answer of [`first_reaching`] that the teeth have become smaller than the margin.
///
/// # Errors
///
/// * [`NumericsError::TargetOutOfReach`] when `scan_to` itself misses the target.
/// * [`NumericsError::OutOfDomain`] when `lo` exceeds `scan_to` or `value` gives NaN.
/// * Whatever `value` itself returns.
pub fn never_below_from(
    lo: u64,
    scan_to: u64,
    target: f64,
    value: impl FnMut(u64) -> Result<f64>,
) -> Result<Smallest> {
    let mut probe = Probe::new(lo, scan_to, target, value)?;
    let question = Question::NeverBelowFrom { scanned_to: scan_to };
    let mut holding = None;
    for n in (lo..=scan_to).rev() {
        let here = probe.at(n)?;
        if probe.reaches(here) {
            holding = Some((n, here));
            continue;
        }
        return match holding {
            Some((n, value)) => Ok(probe.answer(n, question, value, Some(here))),
            None => Err(probe.out_of_reach()),
        };
    }
    match holding {
        Some((n, value)) => Ok(probe.answer(n, question, value, None)),
        None => Err(probe.out_of_reach()),
    }
}

/// A size and its value.
type Tried = (u64, f64);

/// The function under search, its limits, and what has been seen of it.
struct Probe<F> {
    lo: u64,
    hi: u64,
    target: f64,
    value: F,
    evaluations: usize,
    largest: u64,
    best: f64,
}

impl<F: FnMut(u64) -> Result<f64>> Probe<F> {
    fn new(lo: u64, hi: u64, target: f64, value: F) -> Result<Self> {
        if lo > hi {
            return Err(NumericsError::OutOfDomain {
                name: "lo",
                given: lo as f64,
                allowed: "no more than the largest size allowed",
            });
        }
        if target.is_nan() {
            return Err(NumericsError::OutOfDomain {
                name: "target",
                given: target,
                allowed: "a number",
            });
        }
        Ok(Probe { lo, hi, target, value, evaluations: 0, largest: lo, best: f64::NEG_INFINITY })
    }

    fn at(&mut self, n: u64) -> Result<f64> {
        let here = (self.value)(n)?;
        self.evaluations += 1;
        if here.is_nan() {
            return Err(NumericsError::OutOfDomain {
                name: "function value",
                given: here,
                allowed: "a number",
            });
        }
        self.largest = self.largest.max(n);
        self.best = self.best.max(here);
        Ok(here)
    }

    fn reaches(&self, value: f64) -> bool {
        value >= self.target
    }

    fn out_of_reach(&self) -> NumericsError {
        NumericsError::TargetOutOfReach { largest: self.largest, best: self.best }
    }

    fn answer(
        &self,
        n: u64,
        question: Question,
        value: f64,
        value_before: Option<f64>,
    ) -> Smallest {
        Smallest { n, question, value, value_before, evaluations: self.evaluations }
    }

    /// Steps down from a size that reaches the target until one misses it, or to the lower limit.
    fn gallop_down(&mut self, start: u64, value: f64) -> Result<(Option<Tried>, Tried)> {
        let mut above = (start, value);
        let mut step = 1;
        while above.0 > self.lo {
            let n = above.0.saturating_sub(step).max(self.lo);
            let here = self.at(n)?;
            if !self.reaches(here) {
                return Ok((Some((n, here)), above));
            }
            above = (n, here);
            step = u64::saturating_mul(step, 2);
        }
        Ok((None, above))
    }

    /// Steps up from a size that misses the target until one reaches it.
    fn gallop_up(&mut self, start: u64, value: f64) -> Result<(Tried, Tried)> {
        let mut below = (start, value);
        let mut step = 1;
        while below.0 < self.hi {
            let n = below.0.saturating_add(step).min(self.hi);
            let here = self.at(n)?;
            if self.reaches(here) {
                return Ok((below, (n, here)));
            }
            below = (n, here);
            step = u64::saturating_mul(step, 2);
        }
        Err(self.out_of_reach())
    }

    /// Halves the gap between a size that misses the target and one that reaches it.
    fn halve(&mut self, mut below: Tried, mut above: Tried) -> Result<Smallest> {
        while above.0 - below.0 > 1 {
            let n = below.0 + (above.0 - below.0) / 2;
            let here = self.at(n)?;
            if self.reaches(here) {
                above = (n, here);
            } else {
                below = (n, here);
            }
        }
        Ok(self.answer(above.0, Question::Monotone, above.1, Some(below.1)))
    }
}
