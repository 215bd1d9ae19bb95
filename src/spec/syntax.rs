//! What the parser of YAML says, in plain words.

use super::node::{NoTree, Refusal};
use super::suspects;
use super::text::{Position, Text, printable};

/// Most brackets that open in one file; the parser needs time in proportion to their square when they are nested.
const MOST_BRACKETS: usize = 5_000;

/// A fault of the file as text, where no tree of keys exists.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct TextFault {
    pub at: Position,
    pub reason: String,
    pub help: Option<String>,
}

impl TextFault {
    pub fn new(at: Position, reason: impl Into<String>, help: &str) -> Self {
        Self { at, reason: reason.into(), help: Some(help.to_owned()) }
    }
}

/// Refuses a file whose brackets would keep the parser busy.
pub(super) fn brackets(text: &Text) -> Option<TextFault> {
    let opening = text.as_str().match_indices(['[', '{']).nth(MOST_BRACKETS)?;
    let reason = format!("the file opens more than {MOST_BRACKETS} brackets and braces");
    Some(TextFault::new(
        text.position(opening.0),
        reason,
        "put measurements into a CSV file beside the spec",
    ))
}

/// The fault of a file that gave no tree.
pub(super) fn explain(error: &NoTree, text: &Text) -> TextFault {
    match error {
        NoTree::Refused(refusal, error) => refused(*refusal, position(error, text)),
        NoTree::Syntax(error) => broken(error, text),
    }
}

fn position(error: &serde_yaml::Error, text: &Text) -> Position {
    let location = error.location().map(|l| Position { line: l.line(), column: l.column() });
    let at = location.unwrap_or(Position { line: 1, column: 1 });
    // The parser puts what is missing at the end on a line of its own.
    let last = text.lines();
    if at.line > last || (at.line == last && last > 1 && text.line(last).is_empty()) {
        let line = (1..last).rev().find(|line| !text.line(*line).trim().is_empty()).unwrap_or(1);
        return Position { line, column: text.line(line).chars().count() + 1 };
    }
    at
}

fn refused(refusal: Refusal, at: Position) -> TextFault {
    match refusal {
        Refusal::TooManyValues => TextFault::new(
            at,
            "the file holds more than 200000 values",
            "put measurements into a CSV file beside the spec, and write out what stands behind an alias (`*`)",
        ),
        Refusal::Repetition => TextFault::new(
            at,
            "the file repeats its own text many times through aliases (`*`)",
            "write out what stands behind each alias",
        ),
        Refusal::Tag => TextFault::new(
            at,
            "a tag (a word that begins with `!`) stands before the value",
            "drop the tag, or put the text in quotes when it begins with `!`",
        ),
        Refusal::KeyOfManyParts => TextFault::new(
            at,
            "a list or a mapping stands where a key is needed",
            "write a word before the colon",
        ),
    }
}

/// A message of the parser, and what it means.
struct Saying {
    part: &'static str,
    reason: &'static str,
    help: &'static str,
}

const SAYINGS: &[Saying] = &[
    Saying {
        part: "tab character",
        reason: "a tab indents this line",
        help: "indent with spaces; two for each level are usual",
    },
    Saying {
        part: "mapping values are not allowed",
        reason: "a second colon makes this line ambiguous, or the line above does not end where it should",
        help: "put text that holds a colon and a space in quotes, and line up keys of the same level",
    },
    Saying {
        part: "could not find expected ':'",
        reason: "a key without a colon, or a text that goes on where a key should begin",
        help: "write `key: value` with a colon and a space after the key; put text of several lines in quotes",
    },
    Saying {
        part: "did not find expected key",
        reason: "this line does not line up with the keys above it",
        help: "start every key of a level in the same column, and close every quote; put text with quotes inside in other quotes",
    },
    Saying {
        part: "did not find expected '-' indicator",
        reason: "this line does not line up with the items of the list above it",
        help: "start every item of a list with a hyphen in the same column",
    },
    Saying {
        part: "block sequence entries are not allowed",
        reason: "a list begins where no list can begin",
        help: "begin a list on the line below its key, with a hyphen and a space before each item",
    },
    Saying {
        part: "mapping keys are not allowed",
        reason: "a key begins where no key can begin",
        help: "begin the first key on the line below, indented by two spaces",
    },
    Saying {
        part: "did not find expected ',' or ']'",
        reason: "a list in square brackets is not closed, or lacks a comma",
        help: "separate the items with commas and end the list with `]`",
    },
    Saying {
        part: "did not find expected ',' or '}'",
        reason: "a mapping in braces is not closed, or lacks a comma",
        help: "separate the entries with commas and end the mapping with `}`; put text that holds a comma in quotes",
    },
    Saying {
        part: "while scanning a quoted scalar",
        reason: "a quote is opened and not closed",
        help: "close the quote; inside double quotes write `\\\"` for a quote, inside single quotes write two of them",
    },
    Saying {
        part: "unknown escape character",
        reason: "a backslash inside double quotes is followed by a character that has no such meaning",
        help: "use single quotes, or write two backslashes",
    },
    Saying {
        part: "escape code",
        reason: "the character code after the backslash does not exist",
        help: "use single quotes, or write two backslashes",
    },
    Saying {
        part: "hexadecimal",
        reason: "the character code after the backslash is not complete",
        help: "use single quotes, or write two backslashes",
    },
    Saying {
        part: "alphabetic or numeric character",
        reason: "text that begins with `&` or `*` is read as an anchor or an alias",
        help: "put the text in quotes",
    },
    Saying {
        part: "unknown anchor",
        reason: "an alias (`*`) refers to an anchor that does not exist",
        help: "put text that begins with `*` in quotes",
    },
    Saying {
        part: "did not find expected <document start>",
        reason: "the spec has ended before this line, or this line does not line up with the keys above it",
        help: "begin every key of the file in the first column",
    },
    Saying {
        part: "did not find expected node content",
        reason: "a value is needed here",
        help: "write a value, or drop the comma or the bracket before it",
    },
    Saying {
        part: "did not find expected comment or line break",
        reason: "text follows the mark of a block of text on the same line",
        help: "begin the text on the line below `|` or `>`, or put it in quotes",
    },
    Saying {
        part: "while scanning a block scalar",
        reason: "a block of text is not indented as it should be",
        help: "indent every line of the block by the same number of spaces",
    },
    Saying {
        part: "tag",
        reason: "text that begins with `!` is read as a tag",
        help: "put the text in quotes",
    },
    Saying {
        part: "directive",
        reason: "a line that begins with `%` is read as an instruction to the parser",
        help: "put the text in quotes",
    },
    Saying {
        part: "more than one document",
        reason: "the file holds more than one document, parted by `---`",
        help: "keep one spec in a file",
    },
    Saying {
        part: "recursion limit",
        reason: "lists and mappings are nested too deeply",
        help: "a spec needs no more than six levels",
    },
    Saying {
        part: "repetition limit",
        reason: "the file repeats its own text many times through aliases (`*`)",
        help: "write out what stands behind each alias",
    },
    Saying {
        part: "unexpected end of stream",
        reason: "the file ends in the middle of a value",
        help: "close the quote, bracket or brace that is open",
    },
];

fn broken(error: &serde_yaml::Error, text: &Text) -> TextFault {
    let said = error.to_string();
    let mut at = position(error, text);
    if said.contains("more than one document") {
        at = second_document(text).unwrap_or(at);
    }
    if let Some(fault) = suspects::find(text, at, &said) {
        return fault;
    }
    let quote = said.contains("while scanning a quoted scalar")
        && said.contains("unexpected end of stream");
    if quote && let Some(opened) = suspects::context(&said) {
        at = opened;
    }
    if said.contains("cannot start any token") {
        let mark: String = text.rest_of_line(at).chars().take(1).collect();
        let reason = match mark.as_str() {
            "`" => "text cannot begin with a backtick".to_owned(),
            mark => format!("text cannot begin with `{mark}`"),
        };
        return TextFault::new(at, reason, "put the text in quotes");
    }
    match SAYINGS.iter().find(|saying| said.contains(saying.part)) {
        Some(saying) => TextFault::new(at, saying.reason, saying.help),
        None => TextFault::new(
            at,
            format!(
                "this is not YAML: {}",
                printable(said.split(" at line").next().unwrap_or(&said), 200)
            ),
            "write `key: value` lines, with two spaces before the keys of each deeper level",
        ),
    }
}

fn second_document(text: &Text) -> Option<Position> {
    let marks = (1..=text.lines()).filter(|line| text.line(*line).trim_end() == "---");
    let first_counts = (1..=text.lines()).find(|line| {
        let line = text.line(*line).trim();
        !line.is_empty() && !line.starts_with('#')
    });
    let line = marks.into_iter().find(|line| Some(*line) != first_counts)?;
    Some(Position { line, column: 1 })
}
