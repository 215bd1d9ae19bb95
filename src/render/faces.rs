//! The one door through which text enters a document: what is data stays data in every output format.

use std::fmt::Write;

/// Kind of output that a template produces.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Face {
    /// Typst source.
    Typst,
    /// Markdown as CommonMark and pandoc read it.
    Markdown,
    /// Plain text.
    Text,
}

impl Face {
    /// Name of the folder with the face's templates, and of the auto-escaping mode.
    pub fn name(self) -> &'static str {
        match self {
            Self::Typst => "typst",
            Self::Markdown => "markdown",
            Self::Text => "text",
        }
    }

    /// Text that this face shows literally, whatever characters it holds.
    pub fn escape(self, text: &str) -> String {
        match self {
            Self::Typst => format!("#{};", typst_string(&breakable(text))),
            Self::Markdown => markdown(text),
            Self::Text => text.to_owned(),
        }
    }

    /// A formatted number as it stands in a formula: TeX in Markdown, Typst's own mathematics in Typst.
    pub fn in_formula(self, number: &str) -> String {
        let mut text = String::new();
        let mut power = false;
        for character in number.chars() {
            let raised = "⁰¹²³⁴⁵⁶⁷⁸⁹".chars().position(|c| c == character);
            match (character, raised) {
                (_, Some(digit)) => {
                    let _ = write!(text, "{digit}");
                }
                ('⁻', _) => text.push('-'),
                ('\u{2212}', _) => text.push('-'),
                ('\u{202f}', _) => {
                    text.push_str(if self == Self::Typst { " thin " } else { r"\," })
                }
                ('×', _) => text.push_str(if self == Self::Typst { "times" } else { r"\times" }),
                ('>', _) => text.push('>'),
                (other, _) => text.push(other),
            }
            let starts_power = matches!(character, '⁻') || raised.is_some();
            if starts_power && !power {
                let at = text.len() - 1;
                text.insert_str(at, if self == Self::Typst { "^(" } else { "^{" });
                power = true;
            }
        }
        if power {
            text.push(if self == Self::Typst { ')' } else { '}' });
        }
        text
    }
}

/// Longest run without a space that a column of a table can be counted on to hold.
const LONGEST_RUN: usize = 40;

/// The same text with invisible places to break in runs that no line could hold.
fn breakable(text: &str) -> std::borrow::Cow<'_, str> {
    if text.split(char::is_whitespace).all(|run| run.chars().count() <= LONGEST_RUN) {
        return text.into();
    }
    let mut broken = String::with_capacity(text.len() + 16);
    let mut run = 0;
    for character in text.chars() {
        run = if character.is_whitespace() { 0 } else { run + 1 };
        if run > LONGEST_RUN / 2 {
            broken.push('\u{200b}');
            run = 1;
        }
        broken.push(character);
    }
    broken.into()
}

/// A string literal of Typst code.
pub fn typst_string(text: &str) -> String {
    let mut literal = String::with_capacity(text.len() + 2);
    literal.push('"');
    for character in text.chars() {
        match character {
            '"' => literal.push_str("\\\""),
            '\\' => literal.push_str("\\\\"),
            '\n' | '\r' | '\t' => literal.push(' '),
            other => literal.push(other),
        }
    }
    literal.push('"');
    literal
}

/// Escapes what CommonMark, its common extensions or pandoc would read as markup.
fn markdown(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len() + 8);
    let mut previous = None;
    let mut short_first_word = true;
    let mut characters = text.chars().peekable();
    while let Some(character) = characters.next() {
        let next = characters.peek().copied();
        let first = previous.is_none();
        let escape = match character {
            '\\' | '`' | '*' | '_' | '{' | '}' | '[' | ']' | '<' | '>' | '#' | '$' | '@' | '^'
            | '~' | '|' | '&' | '"' => true,
            '\'' => !(within_word(previous) && within_word(next)),
            '+' | ':' | '=' | '%' if first => true,
            ':' => short_first_word || next == Some('/'),
            '-' => first || previous == Some('-') || next == Some('-'),
            '!' => next == Some('['),
            '(' => first || previous == Some(']'),
            // A short first word before a dot or a bracket would open a list.
            '.' | ')' if short_first_word && !first && next.is_none_or(char::is_whitespace) => true,
            '.' => previous == Some('.') || next == Some('.') || previous == Some('w'),
            _ => false,
        };
        if escape {
            escaped.push('\\');
        }
        escaped.push(if matches!(character, '\n' | '\r' | '\t') { ' ' } else { character });
        short_first_word &= character.is_alphanumeric() || (first && character == '(');
        previous = Some(character);
    }
    escaped
}

fn within_word(neighbour: Option<char>) -> bool {
    neighbour.is_some_and(char::is_alphanumeric)
}

#[cfg(test)]
mod tests {
    use super::*;

    const HOSTILE: &str = r##"#read("/etc/passwd") *x* $y$ @z <a> [b](c) {{ 7*7 }} \"##;

    #[test]
    fn typst_gets_a_string_literal() {
        assert_eq!(
            Face::Typst.escape(HOSTILE),
            r##"#"#read(\"/etc/passwd\") *x* $y$ @z <a> [b](c) {{ 7*7 }} \\";"##
        );
    }

    #[test]
    fn markdown_escapes_each_mark() {
        assert_eq!(
            Face::Markdown.escape(HOSTILE),
            r##"\#read(\"/etc/passwd\") \*x\* \$y\$ \@z \<a\> \[b\]\(c) \{\{ 7\*7 \}\} \\"##
        );
        assert_eq!(Face::Markdown.escape("1986. A year"), "1986\\. A year");
        assert_eq!(Face::Markdown.escape("- item"), "\\- item");
        assert_eq!(Face::Markdown.escape("(1) Does it?"), "\\(1\\) Does it?");
        assert_eq!(Face::Markdown.escape("a) one"), "a\\) one");
        assert_eq!(Face::Markdown.escape("Table: x"), "Table\\: x");
        assert_eq!(Face::Markdown.escape("0.5 mm"), "0.5 mm");
    }

    #[test]
    fn powers_of_ten_stay_powers() {
        assert_eq!(
            Face::Typst.in_formula("2.5\u{202f}×\u{202f}10⁻⁹"),
            "2.5 thin times thin 10^(-9)"
        );
        assert_eq!(Face::Markdown.in_formula("2.5\u{202f}×\u{202f}10⁻⁹"), r"2.5\,\times\,10^{-9}");
    }
}
