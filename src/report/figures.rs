//! What the figures of a report show: numbers and finished labels, no drawing.
//!
//! Labels arrive in the report's language with their numbers written by its locale; the drawing only places,
//! wraps and, where there is no room, shortens them.

use serde::Serialize;

use super::locale::superscript;

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
/// Most decimals of a tick on an axis without a power of ten.
const DECIMALS: usize = 4;
/// Largest tick on an axis without a power of ten.
const LARGEST: f64 = 1e6;

impl Axis {
    /// An axis of real numbers with round ticks; `write` sets a number with so many decimals.
    ///
    /// Ticks above a million or of more than four decimals are divided by a power of ten, which joins the unit at
    /// the end of the title: "mass (g)" becomes "mass (× 10⁻⁹ g)", a title without a unit gets the power alone.
    pub fn real(
        title: impl Into<String>,
        range: (f64, f64),
        write: impl Fn(f64, usize) -> String,
    ) -> Self {
        Self::with_ticks(title.into(), range, f64::MIN_POSITIVE, write)
    }

    /// An axis of counts: as [`real`](Self::real), with ticks at whole numbers only.
    pub fn counts(
        title: impl Into<String>,
        range: (f64, f64),
        write: impl Fn(f64, usize) -> String,
    ) -> Self {
        Self::with_ticks(title.into(), range, 1.0, write)
    }

    /// An axis of probabilities from 0 to 1 with a tick at each 0.2.
    pub fn probability(title: impl Into<String>, write: impl Fn(f64, usize) -> String) -> Self {
        let (ticks, _) = ticks((0.0, 1.0), 5, f64::MIN_POSITIVE, write);
        Self { title: title.into(), from: 0.0, to: 1.0, ticks }
    }

    fn with_ticks(
        title: String,
        (from, to): (f64, f64),
        least: f64,
        write: impl Fn(f64, usize) -> String,
    ) -> Self {
        let (ticks, exponent) = ticks((from, to), TICKS, least, write);
        Self { title: with_power(title, exponent), from, to, ticks }
    }
}

/// The title with a power of ten before its unit, which stands in brackets at its end; a tick and the brackets read
/// on as one quantity.
fn with_power(title: String, exponent: i32) -> String {
    if exponent == 0 {
        return title;
    }
    let raised: String = exponent.to_string().chars().map(superscript).collect();
    let power = format!("×\u{202f}10{raised}");
    let Some((name, unit)) = split_unit(&title) else { return format!("{title} ({power})") };
    // A unit that starts with a figure, such as 10⁹ cells, is multiplied.
    let joint = if unit.starts_with(|c: char| c.is_numeric()) { "\u{202f}×\u{202f}" } else { " " };
    format!("{name} ({power}{joint}{unit})")
}

/// What stands before the brackets at the end of a title, and what they hold; the unit may hold brackets itself.
fn split_unit(title: &str) -> Option<(&str, &str)> {
    let inner = title.strip_suffix(')')?;
    let mut depth = 1;
    for (at, character) in inner.char_indices().rev() {
        match character {
            ')' => depth += 1,
            '(' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            let (name, rest) = inner.split_at_checked(at)?;
            return Some((name.strip_suffix(' ')?, rest.strip_prefix('(')?));
        }
    }
    None
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
/// closer than `least`; and the exponent of the power of ten that their texts leave out, usually 0.
///
/// `write` is given each value, without that power, and the number of decimals that tell neighbours apart. A range
/// that is empty, reversed or not finite has no ticks.
fn ticks(
    (from, to): (f64, f64),
    about: usize,
    least: f64,
    write: impl Fn(f64, usize) -> String,
) -> (Vec<Tick>, i32) {
    let span = to - from;
    if !(span.is_finite() && span > 0.0) {
        return (Vec::new(), 0);
    }
    let step = Step::at_least((span / about.max(1) as f64).max(least));
    // A tick that misses the range by a rounding error belongs to it.
    let slack = 1e-9;
    let first = (from / step.value() - slack).ceil();
    let last = (to / step.value() + slack).floor();
    let exponent = step.left_out(first.abs().max(last.abs()));
    let written = step.divided(exponent);
    let mut out = Vec::new();
    let mut count = first;
    while count <= last && out.len() <= 4 * about {
        let text = write(written.times(count), written.decimals());
        out.push(Tick { position: step.times(count), text });
        count += 1.0;
    }
    (out, exponent)
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

    /// This step divided by a power of ten.
    fn divided(self, exponent: i32) -> Self {
        Self { exponent: self.exponent - exponent, ..self }
    }

    /// The exponent of the power of ten to leave out where ticks reach up to `count` steps.
    fn left_out(self, count: f64) -> i32 {
        let mut exponent = self.exponent;
        let mut lead = count * self.digit;
        if !lead.is_finite() {
            return 0;
        }
        // Division by ten tells whole powers of ten exactly, which a logarithm may miss.
        while lead >= 10.0 {
            lead /= 10.0;
            exponent += 1;
        }
        let large = self.times(count) > LARGEST;
        // A tenth and more would lose but its zero.
        let small = self.decimals() > DECIMALS && exponent < -1;
        if large || small { exponent } else { 0 }
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
        ticks(range, about, least, plain).0.into_iter().map(|tick| tick.text).collect()
    }

    #[test]
    fn ticks_are_round_and_inside_the_range() {
        assert_eq!(texts((0.0, 1.0), 5, 0.0), ["0.0", "0.2", "0.4", "0.6", "0.8", "1.0"]);
        assert_eq!(texts((2.0, 23.0), 6, 1.0), ["5", "10", "15", "20"]);
        assert_eq!(texts((2.0, 5.0), 6, 1.0), ["2", "3", "4", "5"]);
        assert_eq!(texts((-0.31, 0.12), 5, 0.0), ["−0.3", "−0.2", "−0.1", "0.0", "0.1"]);
        assert_eq!(
            texts((0.000_2, 0.000_6), 4, 0.0),
            ["0.0002", "0.0003", "0.0004", "0.0005", "0.0006"]
        );
        assert_eq!(texts((0.900_01, 0.900_03), 2, 0.0), ["0.90001", "0.90002", "0.90003"]);
        assert_eq!(
            texts((0.0, 1e6), 5, 1.0),
            ["0", "200000", "400000", "600000", "800000", "1000000"]
        );
    }

    #[test]
    fn long_ticks_leave_out_a_power_of_ten() {
        let axis = |range| {
            let axis = Axis::real("mass (g)", range, plain);
            let texts: Vec<String> = axis.ticks.iter().map(|tick| tick.text.clone()).collect();
            (texts.join(" "), axis.title)
        };
        let (texts, title) = axis((0.86e-9, 3.35e-9));
        assert_eq!(texts, "1.0 1.5 2.0 2.5 3.0");
        assert_eq!(title, "mass (×\u{202f}10⁻⁹ g)");
        assert_eq!(axis((1.1e-7, 2.9e-7)).0, "1.5 2.0 2.5");
        assert_eq!(axis((-1.7e-9, -0.45e-9)).0, "−1.5 −1.0 −0.5");
        assert_eq!(axis((0.45e12, 1.7e12)).1, "mass (×\u{202f}10¹² g)");
        // Whole powers of ten at the end, which a logarithm might put one too low.
        for exponent in [-300, -23, -15, -9, -5, 7, 9, 15, 22, 23, 300] {
            let end: f64 = format!("1e{exponent}").parse().unwrap_or(f64::NAN);
            assert_eq!(axis((0.0, end)).0, "0.0 0.2 0.4 0.6 0.8 1.0", "{end}");
        }
        let counts = Axis::counts("units per group", (2.0, 9_000_000.0), plain);
        assert_eq!(counts.title, "units per group (×\u{202f}10⁶)");
        assert_eq!(counts.ticks[0], Tick { position: 2e6, text: "2".to_owned() });
    }

    #[test]
    fn the_power_of_ten_joins_the_unit() {
        let title = |title: &str| with_power(title.to_owned(), -12).replace('\u{202f}', " ");
        assert_eq!(title("flow (g/(m² d))"), "flow (× 10⁻¹² g/(m² d))");
        assert_eq!(title("flow (of air)s"), "flow (of air)s (× 10⁻¹²)");
        assert_eq!(title("leucocytes (10⁹/l)"), "leucocytes (× 10⁻¹² × 10⁹/l)");
        assert_eq!(title("x)"), "x) (× 10⁻¹²)");
        assert_eq!(title("(g)"), "(g) (× 10⁻¹²)");
        assert_eq!(with_power("mass (g)".to_owned(), 0), "mass (g)");
    }

    #[test]
    fn every_step_is_1_2_or_5_times_a_power_of_ten() {
        let mut span = 1e-12;
        while span < 1e15 {
            for about in 4..9 {
                let (found, _) = ticks((0.0, span), about, 0.0, plain);
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
            assert!(ticks(range, 5, 0.0, plain).0.is_empty());
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
