//! What was probably meant by text that should have been a number.

use crate::quantities::Written;

/// The way out when text stands where a number is needed.
pub(super) fn for_number(text: &str) -> String {
    let text = text.trim();
    let plain: String =
        text.chars().map(|c| if matches!(c, '\u{2212}' | '\u{2013}') { '-' } else { c }).collect();
    minus(text, &plain)
        .or_else(|| percent(&plain))
        .or_else(|| other_base(&plain).map(|(_, value)| decimal(&value)))
        .or_else(|| zeros_in_front(&plain))
        .or_else(|| quoted(&plain))
        .or_else(|| separated(&plain))
        .or_else(|| fraction(&plain))
        .or_else(|| with_unit(&plain))
        .unwrap_or_else(|| {
            "write a number such as 0.8, with a point before the decimals and without a unit"
                .to_owned()
        })
}

fn finite(text: &str) -> Option<f64> {
    let digits = text.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '-' | '+' | '.'));
    text.parse().ok().filter(|value: &f64| digits && value.is_finite())
}

fn minus(given: &str, plain: &str) -> Option<String> {
    (given != plain).then_some(())?;
    finite(plain).map(|_| format!("write the minus sign as a hyphen: {plain}"))
}

fn percent(text: &str) -> Option<String> {
    let body = text
        .strip_suffix('%')
        .or_else(|| text.strip_suffix("percent"))
        .or_else(|| text.strip_suffix("per cent"))?;
    let body = body.trim().replace(',', ".");
    finite(&body)?;
    Some(format!("write it as a fraction, not in percent: {}", hundredth(&body)))
}

/// A decimal number divided by a hundred, by moving its point, so that no digit changes.
fn hundredth(number: &str) -> String {
    let (sign, digits) = match number.strip_prefix('-') {
        Some(rest) => ("-", rest),
        None => ("", number.trim_start_matches('+')),
    };
    if digits.contains(['e', 'E']) {
        return finite(number).map_or_else(String::new, |value| Written(value / 100.0).to_string());
    }
    let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
    let padded = format!("{whole:0>3}");
    let (kept, moved) = padded.split_at(padded.len() - 2);
    let kept = kept.trim_start_matches('0');
    let tail = format!("{moved}{part}");
    let tail = tail.trim_end_matches('0');
    let kept = if kept.is_empty() { "0" } else { kept };
    if tail.is_empty() { format!("{sign}{kept}") } else { format!("{sign}{kept}.{tail}") }
}

/// The way out for a number that is not written with decimal digits.
pub(super) fn decimal(value: &str) -> String {
    format!("write it with decimal digits: {value}")
}

/// The notation of a number that is not written with decimal digits, and its value in them.
pub(super) fn other_base(text: &str) -> Option<(&'static str, String)> {
    let (sign, body) = match text.strip_prefix('-') {
        Some(body) => ("-", body),
        None => ("", text.trim_start_matches('+')),
    };
    let (prefix, digits) = body.split_at_checked(2)?;
    let (name, base) = match prefix {
        "0x" | "0X" => ("hexadecimal", 16),
        "0o" | "0O" => ("octal", 8),
        "0b" | "0B" => ("binary", 2),
        _ => return None,
    };
    let value = u128::from_str_radix(digits, base).ok()?;
    Some((name, format!("{sign}{value}")))
}

fn zeros_in_front(text: &str) -> Option<String> {
    let (sign, digits) = match text.strip_prefix('-') {
        Some(digits) => ("-", digits),
        None => ("", text),
    };
    let value = digits.trim_start_matches('0');
    let whole = digits.chars().all(|c| c.is_ascii_digit()) && digits.starts_with('0');
    (whole && !value.is_empty()).then(|| format!("write it without zeros in front: {sign}{value}"))
}

fn quoted(text: &str) -> Option<String> {
    if finite(text).is_some() {
        return Some(format!("write it without quotes: {text}"));
    }
    let overflow = text.parse::<f64>().is_ok_and(f64::is_infinite)
        && text.contains(|c: char| c.is_ascii_digit());
    overflow.then(|| "it is larger than any number that can be computed with".to_owned())
}

fn separated(text: &str) -> Option<String> {
    let body = text.trim_start_matches(['-', '+']);
    let separators: Vec<char> = body
        .chars()
        .filter(|c| matches!(c, ',' | ' ' | '\'' | '_' | '\u{a0}' | '\u{2009}' | '\u{202f}'))
        .collect();
    let first = separators.first()?;
    let groups: Vec<&str> = body.split(*first).collect();
    let digits_only = |part: &&str| !part.is_empty() && part.chars().all(|c| c.is_ascii_digit());
    let thousands =
        groups.iter().skip(1).all(|part| part.split('.').next().is_some_and(|p| p.len() == 3));
    if groups.len() == 2 && *first == ',' && groups.iter().all(digits_only) {
        let decimal = text.replace(',', ".");
        if !thousands || groups.first().is_some_and(|whole| *whole == "0") {
            return Some(format!("write the decimals after a point: {decimal}"));
        }
        return Some(format!(
            "write {decimal} if the comma marks decimals, or {} if it marks thousands",
            text.replace(',', "")
        ));
    }
    let joined: String = text.chars().filter(|c| c != first).collect();
    (thousands && finite(&joined).is_some())
        .then(|| format!("write it without separators: {joined}"))
}

fn fraction(text: &str) -> Option<String> {
    let (top, bottom) = text.split_once('/')?;
    let value = finite(top.trim())? / finite(bottom.trim())?;
    let shown = match value.abs() {
        size if (0.001..1e9).contains(&size) => format!("{value:.4}"),
        _ => Written(value).to_string(),
    };
    value.is_finite().then(|| format!("write the quotient as a decimal number, about {shown}"))
}

fn with_unit(text: &str) -> Option<String> {
    let end = text.find(|c: char| !c.is_ascii_digit() && !matches!(c, '.' | ',' | '-' | '+'))?;
    let (number, unit) = text.split_at_checked(end)?;
    let number = number.replace(',', ".");
    finite(&number)?;
    let unit = unit.trim();
    unit.starts_with(|c: char| c.is_alphabetic() || matches!(c, '°' | '$' | '€')).then_some(())?;
    Some(format!(
        "write the number alone: {number}; a unit of measurement belongs under `outcome.unit`"
    ))
}

#[cfg(test)]
mod tests {
    use super::for_number;

    #[test]
    fn what_was_meant_is_told() {
        let cases = [
            ("5 %", "write it as a fraction, not in percent: 0.05"),
            ("80%", "write it as a fraction, not in percent: 0.8"),
            ("2,5 %", "write it as a fraction, not in percent: 0.025"),
            ("100 percent", "write it as a fraction, not in percent: 1"),
            ("120%", "write it as a fraction, not in percent: 1.2"),
            ("-0.5%", "write it as a fraction, not in percent: -0.005"),
            ("0,5", "write the decimals after a point: 0.5"),
            ("12,25", "write the decimals after a point: 12.25"),
            ("1,250", "write 1.250 if the comma marks decimals, or 1250 if it marks thousands"),
            ("1,250,000", "write it without separators: 1250000"),
            ("12 500", "write it without separators: 12500"),
            ("0.8", "write it without quotes: 0.8"),
            ("\u{2212}0.8", "write the minus sign as a hyphen: -0.8"),
            ("1/4", "write the quotient as a decimal number, about 0.2500"),
            ("1/1e300", "write the quotient as a decimal number, about 1e-300"),
            ("1e-300 %", "write it as a fraction, not in percent: 1e-302"),
            ("0X1F", "write it with decimal digits: 31"),
            ("010", "write it without zeros in front: 10"),
            ("0", "write it without quotes: 0"),
            (
                "0.4 mm",
                "write the number alone: 0.4; a unit of measurement belongs under `outcome.unit`",
            ),
            ("1e999", "it is larger than any number that can be computed with"),
        ];
        for (given, expected) in cases {
            assert_eq!(for_number(given), expected, "{given}");
        }
        for given in ["", "small", "nan", "-", "%", "1/0", "é", "0.4.2"] {
            assert!(
                for_number(given).starts_with("write a number such as"),
                "{given}: {}",
                for_number(given)
            );
        }
    }
}
