//! The usual slips of the hand in a line of YAML. The parser often trips only a line later, or far from the slip, so its
//! own message says little; here the lines around the place are looked at as a colleague would.

use super::locate::{flow_length, quoted_length};
use super::syntax::TextFault;
use super::text::{Position, Text, printable};

/// The slip that explains why the parser failed at a place, if it is a usual one; `said` is what the parser says.
pub(super) fn find(text: &Text, at: Position, said: &str) -> Option<TextFault> {
    let before = (1..at.line).rev().find(|line| !is_idle(text.line(*line)));
    let lines: Vec<usize> = before.into_iter().chain([at.line]).collect();
    let on = |look: fn(&Line<'_>) -> Option<TextFault>| {
        lines.iter().find_map(|number| look(&Line::new(text, *number)))
    };
    on(tab)
        .or_else(|| on(no_space_after_colon))
        .or_else(|| on(no_space_after_hyphen))
        .or_else(|| unclosed_bracket(text, at, said))
        .or_else(|| on(text_after_the_end))
        .or_else(|| no_colon(text, at, said))
        .or_else(|| item_among_keys(&Line::new(text, at.line), said))
        .or_else(|| too_deep(before.map(|line| Line::new(text, line)), &Line::new(text, at.line)))
}

fn is_idle(line: &str) -> bool {
    line.trim().is_empty() || line.trim_start().starts_with('#')
}

/// A line taken apart: where its content begins, after hyphens of lists; its key and what follows the colon.
struct Line<'t> {
    number: usize,
    whole: &'t str,
    /// Characters before the content.
    indent: usize,
    content: &'t str,
}

impl<'t> Line<'t> {
    fn new(text: &'t Text, number: usize) -> Self {
        let whole = text.line(number);
        let mut content = whole.trim_start();
        while let Some(rest) = content.strip_prefix("- ") {
            content = rest.trim_start();
        }
        let indent = whole.chars().count() - content.chars().count();
        Self { number, whole, indent, content }
    }

    fn key(&self) -> Option<(&'t str, &'t str)> {
        let (key, value) = self.content.split_once(':')?;
        let word = |c: char| c.is_ascii_alphanumeric() || matches!(c, '-' | '_');
        (!key.is_empty() && key.chars().all(word)).then_some((key, value))
    }

    fn at(&self, column: usize) -> Position {
        Position { line: self.number, column }
    }
}

fn tab(line: &Line<'_>) -> Option<TextFault> {
    let indent = line.whole.chars().take_while(|c| c.is_whitespace());
    let column = indent.into_iter().position(|c| c == '\t')? + 1;
    let help = "indent with spaces; two for each level are usual";
    Some(TextFault::new(line.at(column), "a tab indents this line", help))
}

/// `key:value`, which is read as one word.
fn no_space_after_colon(line: &Line<'_>) -> Option<TextFault> {
    let (key, value) = line.key()?;
    let joined = value.starts_with(|c: char| !c.is_whitespace() && !matches!(c, '/' | ':'));
    (joined && !value.contains(": ")).then(|| {
        let reason = format!("`{key}:` needs a space after the colon");
        let help = format!("write `{key}: {}`", printable(value.trim(), 60));
        TextFault::new(line.at(line.indent + 1), reason, &help)
    })
}

/// `-item`, which is read as text.
fn no_space_after_hyphen(line: &Line<'_>) -> Option<TextFault> {
    let rest = line.content.strip_prefix('-')?;
    let joined = rest.starts_with(char::is_alphabetic) && rest.contains(':');
    joined.then(|| {
        let help = format!("write `- {}`", printable(rest, 60));
        let reason = "the hyphen of a list item needs a space after it";
        TextFault::new(line.at(line.indent + 1), reason, &help)
    })
}

/// A bracket or brace that is still open when the parser gives up on a later line.
fn unclosed_bracket(text: &Text, at: Position, said: &str) -> Option<TextFault> {
    let opened = said.contains("while parsing a flow").then(|| context(said))??;
    let rest = text.rest_of_line(opened);
    let mark = rest.chars().next()?;
    let close = match mark {
        '[' => ']',
        '{' => '}',
        _ => return None,
    };
    let still_open = !rest.chars().take(flow_length(rest)).collect::<String>().ends_with(close);
    (at.line > opened.line && still_open).then(|| {
        let reason =
            format!("`{mark}` is not closed, or a comma is missing before line {}", at.line);
        let help = format!("separate the items with commas, and end with `{close}`");
        TextFault::new(opened, reason, &help)
    })
}

/// The second place that the parser names, where what it was reading began.
pub(super) fn context(said: &str) -> Option<Position> {
    let rest = said.rsplit_once("at line ")?.1;
    let (line, column) = rest.split_once(" column ")?;
    let digits: String = column.chars().take_while(char::is_ascii_digit).collect();
    Some(Position { line: line.parse().ok()?, column: digits.parse().ok()? })
}

/// `"word" and more`, `[word] and more`: the text begins with a mark that ends too early.
fn text_after_the_end(line: &Line<'_>) -> Option<TextFault> {
    let (_, value) = line.key()?;
    let value = value.trim_start();
    let mark = value.chars().next()?;
    let length = match mark {
        '"' | '\'' => quoted_length(value, mark),
        '[' | '{' => flow_length(value),
        _ => return None,
    };
    let rest: String = value.chars().skip(length).collect();
    let more = rest.trim_start();
    if more.is_empty() || (more.starts_with('#') && rest.starts_with(char::is_whitespace)) {
        return None;
    }
    let column = line.whole.chars().count() - more.chars().count() + 1;
    let (reason, help) = match mark {
        '\'' => (
            "text goes on after the single quote that ends it",
            "write an apostrophe inside single quotes twice, or put the text in double quotes",
        ),
        '"' => (
            "text goes on after the double quote that ends it",
            "put the whole text in single quotes",
        ),
        _ => (
            "text goes on after the bracket that ends the list or mapping",
            "put text that begins with a bracket or a brace in quotes",
        ),
    };
    Some(TextFault::new(line.at(column), reason, help))
}

/// A line that is neither key nor item nor the continuation of a text.
fn no_colon(text: &Text, at: Position, said: &str) -> Option<TextFault> {
    said.contains("could not find expected ':'").then_some(())?;
    let number = (1..=at.line).rev().find(|number| {
        let line = text.line(*number);
        !is_idle(line) && !line.contains(':') && !line.trim_start().starts_with("- ")
    })?;
    let line = Line::new(text, number);
    let words = line.content.split_once(' ');
    let help = match words.filter(|(word, _)| is_key_of_the_file(word)) {
        Some((word, rest)) => format!("write `{word}: {}`", printable(rest.trim(), 60)),
        None => "write `key: value`; a line that continues a text is indented more than its key"
            .to_owned(),
    };
    let reason = "this line has no colon, so it is no key with a value";
    Some(TextFault::new(line.at(line.indent + 1), reason, &help))
}

fn is_key_of_the_file(word: &str) -> bool {
    super::language::Language::get().study.get(word).is_some()
}

fn item_among_keys(line: &Line<'_>, said: &str) -> Option<TextFault> {
    let item =
        said.contains("did not find expected key") && line.whole.trim_start().starts_with("- ");
    item.then(|| {
        let column = line.whole.chars().take_while(|c| *c == ' ').count() + 1;
        let help = "put the list below a key of its own, indented more than the key";
        TextFault::new(line.at(column), "an item of a list stands where a key is needed", help)
    })
}

/// A key that is indented below one that has its value already.
fn too_deep(above: Option<Line<'_>>, line: &Line<'_>) -> Option<TextFault> {
    let above = above?;
    let (name, value) = above.key()?;
    let value = value.trim();
    let has_value = !value.is_empty() && !value.starts_with(['#', '|', '>', '&']);
    (line.key().is_some() && has_value && line.indent > above.indent).then(|| {
        let reason = format!(
            "this key is indented more than `{name}` above it, which has its value already"
        );
        let help = format!("begin it in column {}, as `{name}` does", above.indent + 1);
        TextFault::new(line.at(line.indent + 1), reason, &help)
    })
}
