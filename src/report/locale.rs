//! How numbers, dates and lists are written: the only place where a number is rounded.

use crate::study::Date;

/// Narrow space that does not break, between a number and its unit and between groups of digits.
pub const THIN: char = '\u{202f}';
/// The minus sign, which is not a hyphen.
const MINUS: char = '\u{2212}';

/// Rules of a language.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Locale {
    /// Language tag, also the folder of the templates.
    pub tag: &'static str,
    decimal: char,
    months: [&'static str; 12],
    and: &'static str,
}

/// The languages that the program speaks.
static LOCALES: [Locale; 1] = [Locale {
    tag: "en",
    decimal: '.',
    months: [
        "January",
        "February",
        "March",
        "April",
        "May",
        "June",
        "July",
        "August",
        "September",
        "October",
        "November",
        "December",
    ],
    and: "and",
}];

impl Locale {
    /// The locale of a language tag.
    pub fn of(tag: &str) -> Option<&'static Self> {
        LOCALES.iter().find(|locale| locale.tag == tag)
    }

    /// A number with a fixed count of decimals, rounded to the nearest.
    pub fn fixed(&self, value: f64, decimals: usize) -> String {
        let text = format!("{:.decimals$}", value.abs());
        let nought = text.bytes().all(|b| matches!(b, b'0' | b'.'));
        self.dressed(&text, value < 0.0 && !nought)
    }

    /// A number as its author wrote it: the shortest decimal that reads back, or a power of ten far from 1.
    pub fn as_written(&self, value: f64) -> String {
        if value != 0.0 && !(1e-4..1e7).contains(&value.abs()) {
            return self.scientific(value, None);
        }
        self.dressed(&format!("{}", value.abs()), value < 0.0)
    }

    /// A computed number with so many significant digits.
    pub fn significant(&self, value: f64, digits: usize) -> String {
        if value == 0.0 || !value.is_finite() {
            return self.fixed(value, 0);
        }
        if !(1e-4..1e7).contains(&value.abs()) {
            return self.scientific(value, Some(digits));
        }
        self.fixed(value, decimals_for(value, digits))
    }

    /// A whole number with its digits in threes from five digits on.
    pub fn whole(&self, value: u64) -> String {
        self.dressed(&value.to_string(), false)
    }

    /// A stated fraction in percent, with all the digits that its author wrote: 5 %, 2.5 %, 1.25 %.
    pub fn percent(&self, value: f64) -> String {
        // The shortest decimal of the fraction, its point moved by two places; 0.07 * 100 is not 7 in binary.
        let places = format!("{value}").split_once('.').map_or(0, |(_, part)| part.len());
        let text = format!("{:.*}", places.saturating_sub(2), value * 100.0);
        format!("{}{THIN}%", self.dressed(&text, false))
    }

    /// A computed fraction in percent with three significant digits.
    pub fn share(&self, value: f64) -> String {
        format!("{}{THIN}%", self.significant(value * 100.0, 3))
    }

    /// A computed power in percent with one decimal, rounded with the caution of [`Self::probability`].
    pub fn power(&self, value: f64) -> String {
        format!("{}{THIN}%", self.cautious(value, 100.0, 1))
    }

    /// A computed probability as a decimal fraction with three decimals, rounded to the nearest. Where rounding up would
    /// land on a multiple of 0.05, as targets are, the number is written as what it is: 0.79996 is `< 0.800`, so that a
    /// missed target never looks met. Certainty is never claimed.
    pub fn probability(&self, value: f64) -> String {
        if value < 0.001 && value > 0.0 {
            return self.significant(value, 2);
        }
        self.cautious(value, 1.0, 3)
    }

    /// One minus a probability as [`Self::probability`] prints it, so that the two add up on paper.
    pub fn complement(&self, value: f64) -> String {
        let printed = (value * 1000.0).round() / 1000.0;
        if printed >= 1.0 {
            return format!("<{THIN}0{}001", self.decimal);
        }
        if printed <= 0.0 {
            return format!(">{THIN}0{}999", self.decimal);
        }
        self.fixed(1.0 - printed, 3)
    }

    fn cautious(&self, value: f64, scale: f64, decimals: usize) -> String {
        let nearest = (value * 1000.0).round();
        if nearest >= 1000.0 {
            return format!(">{THIN}{}", self.fixed(0.999 * scale, decimals));
        }
        let flattering = nearest > value * 1000.0 * (1.0 + 1e-12) && nearest % 50.0 == 0.0;
        let text = self.fixed(nearest / 1000.0 * scale, decimals);
        if flattering { format!("<{THIN}{text}") } else { text }
    }

    /// A day of the calendar.
    pub fn date(&self, date: Date) -> String {
        let month = usize::from(date.month).checked_sub(1).and_then(|m| self.months.get(m));
        format!("{}\u{a0}{} {}", date.day, month.unwrap_or(&""), date.year)
    }

    /// A list of words joined with commas and a conjunction.
    pub fn list(&self, words: &[String]) -> String {
        match words {
            [] => String::new(),
            [one] => one.clone(),
            [first @ .., last] => format!("{} {} {last}", first.join(", "), self.and),
        }
    }

    fn scientific(&self, value: f64, digits: Option<usize>) -> String {
        let text = match digits {
            Some(digits) => format!("{:.*e}", digits.saturating_sub(1), value.abs()),
            None => format!("{:e}", value.abs()),
        };
        let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, "0"));
        let raised: String = exponent.chars().map(superscript).collect();
        format!("{}{THIN}×{THIN}10{raised}", self.dressed(mantissa, value < 0.0))
    }

    /// Digits in threes, the language's decimal sign, a real minus.
    fn dressed(&self, digits: &str, negative: bool) -> String {
        let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
        let mut text = String::new();
        if negative {
            text.push(MINUS);
        }
        for (position, digit) in whole.chars().enumerate() {
            let left = whole.len() - position;
            if position > 0 && left % 3 == 0 && whole.len() > 4 {
                text.push(THIN);
            }
            text.push(digit);
        }
        if !part.is_empty() {
            text.push(self.decimal);
            text.push_str(part);
        }
        text
    }
}

/// Decimals that show so many significant digits of a value.
pub fn decimals_for(value: f64, digits: usize) -> usize {
    let magnitude = libm::log10(value.abs()).floor();
    let decimals = digits as f64 - 1.0 - magnitude;
    decimals.clamp(0.0, 12.0) as usize
}

/// A digit or a minus sign raised, for powers of ten.
pub(super) fn superscript(digit: char) -> char {
    match digit {
        '-' => '⁻',
        '0' => '⁰',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '4' => '⁴',
        '5' => '⁵',
        '6' => '⁶',
        '7' => '⁷',
        '8' => '⁸',
        _ => '⁹',
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn en() -> Locale {
        LOCALES[0]
    }

    #[test]
    fn numbers_are_dressed() {
        assert_eq!(en().fixed(-0.5, 2), "−0.50");
        assert_eq!(en().fixed(-0.001, 2), "0.00");
        assert_eq!(en().whole(1234), "1234");
        assert_eq!(en().whole(1_234_567), "1\u{202f}234\u{202f}567");
        assert_eq!(en().as_written(0.39), "0.39");
        assert_eq!(en().as_written(2.5e-9), "2.5\u{202f}×\u{202f}10⁻⁹");
        assert_eq!(en().significant(0.630_712, 3), "0.631");
    }

    #[test]
    fn a_missed_target_never_looks_met() {
        assert_eq!(en().probability(0.799_96), "<\u{202f}0.800");
        assert_eq!(en().probability(0.799_4), "0.799");
        assert_eq!(en().probability(0.8), "0.800");
        assert_eq!(en().power(0.999_999), ">\u{202f}99.9\u{202f}%");
        assert_eq!(en().power(0.799_96), "<\u{202f}80.0\u{202f}%");
        assert_eq!(en().complement(0.830_35), "0.170");
        assert_eq!(en().power(1.0), ">\u{202f}99.9\u{202f}%");
        for (value, text) in [
            (0.05, "5"),
            (0.0, "0"),
            (0.07, "7"),
            (0.0125, "1.25"),
            (0.001, "0.1"),
            (0.0333, "3.33"),
            (0.875, "87.5"),
            (0.00001, "0.001"),
        ] {
            assert_eq!(en().percent(value), format!("{text}\u{202f}%"));
        }
        assert_eq!(en().power(0.9104), "91.0\u{202f}%");
    }
}
