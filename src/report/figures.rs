//! What the figures of a report show: numbers and finished labels, no drawing.
//!
//! Labels arrive in the report's language with their numbers written by its locale; the drawing only places,
//! wraps and, where there is no room, shortens them.

use serde::Serialize;

/// A mark on an axis with the text beside it.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Tick {
    /// Where it stands, in the units of the axis.
    pub position: f64,
    /// What stands beside it.
    pub text: String,
}

/// An axis: what it measures, the range shown and its ticks.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Axis {
    /// What is measured, with its unit.
    pub title: String,
    /// Lower end of the range shown.
    pub from: f64,
    /// Upper end of the range shown, above `from`.
    pub to: f64,
    /// Ticks inside the range, rising.
    pub ticks: Vec<Tick>,
}

/// Ticks that an axis is given, about.
const TICKS: usize = 6;

impl Axis {
    /// An axis of real numbers with round ticks; `write` sets a number with so many decimals.
    pub fn real(
        title: impl Into<String>,
        (from, to): (f64, f64),
        write: impl Fn(f64, usize) -> String,
    ) -> Self {
        let ticks = ticks((from, to), TICKS, f64::MIN_POSITIVE, write);
        Self { title: title.into(), from, to, ticks }
    }

    /// An axis of counts: as [`real`](Self::real), with ticks at whole numbers only.
    pub fn counts(
        title: impl Into<String>,
        (from, to): (f64, f64),
        write: impl Fn(f64, usize) -> String,
    ) -> Self {
        let ticks = ticks((from, to), TICKS, 1.0, write);
        Self { title: title.into(), from, to, ticks }
    }

    /// An axis of probabilities from 0 to 1 with a tick at each 0.2.
    pub fn probability(title: impl Into<String>, write: impl Fn(f64, usize) -> String) -> Self {
        let ticks = ticks((0.0, 1.0), 5, f64::MIN_POSITIVE, write);
        Self { title: title.into(), from: 0.0, to: 1.0, ticks }
    }
}

/// A straight line across the figure at one value, with its label.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Rule {
    /// The value, in the units of the axis it crosses.
    pub at: f64,
    /// Its label.
    pub label: String,
}

/// A point of interest with its label.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Mark {
    /// Horizontal position.
    pub x: f64,
    /// Vertical position.
    pub y: f64,
    /// Its label.
    pub label: String,
}

/// Which spread a power curve supposes; it decides colour and dash.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Assumed {
    /// The planning value.
    Planned,
    /// The plausible low value.
    Low,
    /// The plausible high value.
    High,
}

/// Power at rising sizes.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Curve {
    /// The spread supposed.
    pub assumed: Assumed,
    /// Label at the end of the curve.
    pub label: String,
    /// Size and power, by rising size.
    pub points: Vec<(f64, f64)>,
}

/// Power against the number of units in a group.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct PowerCurve {
    /// What the figure shows, for those who do not see it.
    pub description: String,
    /// Units in a group.
    pub x: Axis,
    /// Power.
    pub y: Axis,
    /// One to three curves.
    pub curves: Vec<Curve>,
    /// The power asked for.
    pub target: Rule,
    /// The size chosen and its power.
    pub chosen: Mark,
    /// The largest size that can be had, if there is a limit.
    pub ceiling: Option<Rule>,
}

/// A line along which one size is needed.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Level {
    /// The size, for the order of the shades.
    pub size: f64,
    /// The size as it is written on the line.
    pub label: String,
    /// Whether this is the size of the ceiling.
    pub ceiling: bool,
    /// Difference and spread along the line, by rising spread.
    pub points: Vec<(f64, f64)>,
}

/// Plausible limits of the spread.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct SpreadLimits {
    /// Lower limit.
    pub low: f64,
    /// Upper limit.
    pub high: f64,
    /// What kind of limits they are.
    pub label: String,
}

/// Units in a group over the difference to detect and the spread.
#[derive(Clone, Debug, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct SizeContour {
    /// What the figure shows, for those who do not see it.
    pub description: String,
    /// What the numbers on the lines count.
    pub title: String,
    /// The difference to detect; the axis does not cross zero.
    pub x: Axis,
    /// The standard deviation.
    pub y: Axis,
    /// Lines of equal size, by rising size.
    pub levels: Vec<Level>,
    /// The planned difference and standard deviation.
    pub plan: Mark,
    /// Plausible limits of the standard deviation, drawn through the plan.
    pub limits: Option<SpreadLimits>,
}

/// Round ticks inside a range: steps of 1, 2 or 5 times a power of ten, about `about` of them (four or more), none
/// closer than `least`.
///
/// `write` is given each value and the number of decimals that tell neighbours apart. A range that is empty,
/// reversed or not finite has no ticks.
pub fn ticks(
    (from, to): (f64, f64),
    about: usize,
    least: f64,
    write: impl Fn(f64, usize) -> String,
) -> Vec<Tick> {
    let span = to - from;
    if !(span.is_finite() && span > 0.0) {
        return Vec::new();
    }
    let step = Step::at_least((span / about.max(1) as f64).max(least));
    // A tick that misses the range by a rounding error belongs to it.
    let slack = 1e-9;
    let first = (from / step.value() - slack).ceil();
    let last = (to / step.value() + slack).floor();
    let mut out = Vec::new();
    let mut count = first;
    while count <= last && out.len() <= 4 * about {
        let position = step.times(count);
        out.push(Tick { position, text: write(position, step.decimals()) });
        count += 1.0;
    }
    out
}

/// A step of 1, 2 or 5 times a power of ten.
#[derive(Clone, Copy, Debug)]
struct Step {
    digit: f64,
    exponent: i32,
}

impl Step {
    /// The smallest such step that is not below `wanted`, a positive number.
    fn at_least(wanted: f64) -> Self {
        let exponent = libm::floor(libm::log10(wanted)) as i32;
        for exponent in [exponent - 1, exponent, exponent + 1] {
            for digit in [1.0, 2.0, 5.0] {
                let step = Self { digit, exponent };
                if step.value() >= wanted * (1.0 - 1e-12) {
                    return step;
                }
            }
        }
        Self { digit: 1.0, exponent: exponent + 2 }
    }

    fn value(self) -> f64 {
        self.times(1.0)
    }

    /// `count` steps; dividing by a power of ten gives the decimal number's nearest double.
    fn times(self, count: f64) -> f64 {
        let power = libm::exp10(f64::from(self.exponent.abs()));
        let units = count * self.digit;
        // The sum turns a negative zero into zero.
        0.0 + if self.exponent < 0 { units / power } else { units * power }
    }

    fn decimals(self) -> usize {
        usize::try_from(-self.exponent).unwrap_or(0)
    }
}

/// Round sizes from `from` to `to`, inclusive: 2, 3, 5, 7 and 10 times powers of ten, at most `most` of them.
///
/// When there are more, the coarser series 2, 5, 10 and then 10 alone is taken.
pub fn round_sizes(from: u64, to: u64, most: usize) -> Vec<u64> {
    let series: [&[u64]; 4] = [&[1, 2, 3, 4, 5, 6, 7, 8, 9], &[1, 2, 3, 5, 7], &[1, 2, 5], &[1]];
    let mut sizes = Vec::new();
    for digits in series {
        sizes = between(digits, from, to);
        if sizes.len() <= most {
            return sizes;
        }
    }
    sizes.truncate(most);
    sizes
}

fn between(digits: &[u64], from: u64, to: u64) -> Vec<u64> {
    let mut out = Vec::new();
    let mut power: u64 = 1;
    loop {
        for digit in digits {
            match digit.checked_mul(power) {
                Some(size) if size > to => return out,
                Some(size) if size >= from => out.push(size),
                Some(_) => {}
                None => return out,
            }
        }
        match power.checked_mul(10) {
            Some(next) => power = next,
            None => return out,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plain(value: f64, decimals: usize) -> String {
        format!("{value:.decimals$}").replace('-', "\u{2212}")
    }

    fn texts(range: (f64, f64), about: usize, least: f64) -> Vec<String> {
        ticks(range, about, least, plain).into_iter().map(|tick| tick.text).collect()
    }

    #[test]
    fn ticks_are_round_and_inside_the_range() {
        assert_eq!(texts((0.0, 1.0), 5, 0.0), ["0.0", "0.2", "0.4", "0.6", "0.8", "1.0"]);
        assert_eq!(texts((2.0, 23.0), 6, 1.0), ["5", "10", "15", "20"]);
        assert_eq!(texts((2.0, 5.0), 6, 1.0), ["2", "3", "4", "5"]);
        assert_eq!(texts((-0.31, 0.12), 5, 0.0), ["−0.3", "−0.2", "−0.1", "0.0", "0.1"]);
        assert_eq!(
            texts((0.0, 9_000_000.0), 6, 1.0),
            ["0", "2000000", "4000000", "6000000", "8000000"]
        );
        assert_eq!(texts((1.1e-7, 2.9e-7), 4, 0.0), ["0.00000015", "0.00000020", "0.00000025"]);
        assert_eq!(
            texts((3e12, 5e12), 2, 0.0),
            ["3000000000000", "4000000000000", "5000000000000"]
        );
    }

    #[test]
    fn every_step_is_1_2_or_5_times_a_power_of_ten() {
        let mut span = 1e-12;
        while span < 1e15 {
            for about in 4..9 {
                let found = ticks((0.0, span), about, 0.0, plain);
                assert!(
                    found.len() >= 2 && found.len() <= about + 2,
                    "{span} {about} {}",
                    found.len()
                );
                let step = found[1].position - found[0].position;
                let lead = step / libm::exp10(libm::floor(libm::log10(step * 1.000_001)));
                assert!(
                    [1.0, 2.0, 5.0].iter().any(|d| (lead - d).abs() < 1e-6),
                    "{span} {about} {lead}"
                );
                assert!(found.iter().all(|tick| tick.position <= span * (1.0 + 1e-8)));
            }
            span *= 1.37;
        }
    }

    #[test]
    fn an_empty_reversed_or_endless_range_has_no_ticks() {
        for range in [(1.0, 1.0), (2.0, 1.0), (f64::NAN, 1.0), (0.0, f64::INFINITY)] {
            assert!(ticks(range, 5, 0.0, plain).is_empty());
        }
    }

    #[test]
    fn round_sizes_thin_out_when_there_are_too_many() {
        assert_eq!(round_sizes(4, 40, 8), [5, 7, 10, 20, 30]);
        assert_eq!(round_sizes(3, 12, 9), [3, 4, 5, 6, 7, 8, 9, 10]);
        assert_eq!(round_sizes(2, 5_000_000, 20).first(), Some(&2));
        assert!(round_sizes(2, 5_000_000, 7).len() <= 7);
        assert!(round_sizes(5, 4, 7).is_empty());
        assert_eq!(round_sizes(1, u64::MAX, 30).len(), 20);
    }
}
