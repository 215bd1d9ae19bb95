//! Bytes to text: encoding, line ends, and the characters that no spec may hold.

/// Text with the places of its lines, without a byte order mark.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Text {
    text: String,
    /// Where each line begins, in bytes.
    starts: Vec<usize>,
}

/// A place in a text, both numbers from 1, the column in characters.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Position {
    pub line: usize,
    pub column: usize,
}

/// Why bytes are no text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct NotText {
    /// Where the first wrong byte stands.
    pub at: Position,
    /// What is wrong.
    pub reason: String,
    /// The way out.
    pub help: &'static str,
}

impl Text {
    /// A text from what a file holds; wrong bytes become replacement characters, and are named.
    pub fn decode(bytes: &[u8]) -> (Self, Option<NotText>) {
        let body = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
        let mark = bytes.len() - body.len();
        match std::str::from_utf8(body) {
            Ok(text) => (Self::new(text.to_owned()), None),
            Err(error) => {
                let text = Self::new(String::from_utf8_lossy(body).into_owned());
                let offset = error.valid_up_to();
                let at = text.position(offset);
                (text, Some(not_text(bytes, offset + mark, at)))
            }
        }
    }

    fn new(text: String) -> Self {
        let mut starts = vec![0];
        let bytes = text.as_bytes();
        for (offset, byte) in bytes.iter().enumerate() {
            let ends = *byte == b'\n' || (*byte == b'\r' && bytes.get(offset + 1) != Some(&b'\n'));
            if ends {
                starts.push(offset + 1);
            }
        }
        Self { text, starts }
    }

    /// The whole text.
    pub fn as_str(&self) -> &str {
        &self.text
    }

    /// Where a byte stands.
    pub fn position(&self, offset: usize) -> Position {
        let line = self.starts.partition_point(|start| *start <= offset).max(1);
        let start = self.starts.get(line - 1).copied().unwrap_or(0);
        let before = self.text.get(start..offset).unwrap_or("");
        Position { line, column: before.chars().count() + 1 }
    }

    /// A line without its end; empty when there is no such line.
    pub fn line(&self, number: usize) -> &str {
        let from = number.checked_sub(1).and_then(|n| self.starts.get(n));
        let to = self.starts.get(number).copied().unwrap_or(self.text.len());
        let line = from.and_then(|from| self.text.get(*from..to)).unwrap_or("");
        line.trim_end_matches(['\n', '\r'])
    }

    /// How many lines there are.
    pub fn lines(&self) -> usize {
        self.starts.len()
    }

    /// What follows a place on its line.
    pub fn rest_of_line(&self, at: Position) -> &str {
        let line = self.line(at.line);
        let skip = line
            .char_indices()
            .nth(at.column.saturating_sub(1))
            .map_or(line.len(), |(offset, _)| offset);
        line.get(skip..).unwrap_or("")
    }

    /// Where characters stand that no spec may hold, with the reason; at most `limit` of them.
    pub fn refused(&self, limit: usize) -> Vec<(Position, String)> {
        self.text
            .char_indices()
            .filter(|(_, c)| !matches!(c, '\n' | '\r' | '\t') && is_refused(*c))
            .take(limit)
            .map(|(offset, c)| (self.position(offset), refusal(c)))
            .collect()
    }
}

fn not_text(bytes: &[u8], offset: usize, at: Position) -> NotText {
    let utf16 = bytes.starts_with(b"\xFF\xFE") || bytes.starts_with(b"\xFE\xFF");
    let byte = bytes.get(offset).copied().unwrap_or(0);
    NotText {
        at,
        reason: if utf16 {
            "the file is stored as UTF-16, not as UTF-8".to_owned()
        } else {
            format!("byte {byte:#04x} at offset {offset} is not UTF-8 text")
        },
        help: "save the file again with the encoding UTF-8",
    }
}

/// Whether no text of a spec may hold a character: it would be invisible, or make a line read differently from what
/// it holds (control characters but tab and line ends, bidirectional overrides and isolates, foreign line ends).
pub(super) fn is_refused(c: char) -> bool {
    matches!(c, '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}' | '\u{2028}' | '\u{2029}' | '\u{FEFF}')
        || matches!(c, '\u{FDD0}'..='\u{FDEF}' | '\u{FFFE}' | '\u{FFFF}')
        || (c.is_control() && !matches!(c, '\n' | '\r' | '\t'))
}

/// The reason why a character is refused.
pub(super) fn refusal(c: char) -> String {
    let what = match c {
        '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}' => {
            "bidirectional control character, which makes text read differently from what it holds"
        }
        '\u{2028}' | '\u{2029}' => "line separator that many programs do not show",
        '\u{FEFF}' => "byte order mark inside the text",
        '\0' => "NUL character; the file may be stored as UTF-16 or be no text at all",
        _ => "control character",
    };
    format!("U+{:04X} is a {what}", u32::from(c))
}

/// Text that is safe to print on a terminal, on one line, cut to a number of characters.
pub(crate) fn printable(text: &str, most: usize) -> String {
    let mut shown: String = text.chars().map(visible).take(most).collect();
    if text.chars().nth(most).is_some() {
        shown.pop();
        shown.push('…');
    }
    shown
}

/// The character itself, or one of the same width that a terminal does not obey.
pub(super) fn visible(c: char) -> char {
    match c {
        '\t' | '\n' | '\r' => ' ',
        c if is_refused(c) => '\u{FFFD}',
        c => c,
    }
}

/// Text with every run of white space as one space, and none at its ends.
pub(super) fn collapse(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_count_characters_and_every_kind_of_line_end() {
        let (text, wrong) = Text::decode("\u{FEFF}a: µm\r\nb: 1\rc: x\n".as_bytes());
        assert_eq!(wrong, None);
        assert_eq!(text.as_str().get(..1), Some("a"));
        assert_eq!(
            [text.line(1), text.line(2), text.line(3), text.line(9)],
            ["a: µm", "b: 1", "c: x", ""]
        );
        let m = text.as_str().find('m').unwrap_or(0);
        assert_eq!(text.position(m), Position { line: 1, column: 5 });
        assert_eq!(text.rest_of_line(Position { line: 3, column: 4 }), "x");
        assert_eq!(text.lines(), 4);
    }

    #[test]
    fn the_first_wrong_byte_is_named() {
        let (_, wrong) = Text::decode(b"title: x\nname: M\xFCller\n");
        let wrong = wrong.map(|w| (w.at, w.reason));
        let reason = "byte 0xfc at offset 16 is not UTF-8 text".to_owned();
        assert_eq!(wrong, Some((Position { line: 2, column: 8 }, reason)));
        let (_, wrong) = Text::decode(b"\xFF\xFEt\0i\0");
        assert!(wrong.is_some_and(|w| w.reason.contains("UTF-16")));
    }

    #[test]
    fn hidden_characters_are_found_and_never_printed() {
        let (text, _) = Text::decode("a: \u{202E}x\nb: \u{1b}[31m\n".as_bytes());
        let found: Vec<_> =
            text.refused(9).into_iter().map(|(at, _)| (at.line, at.column)).collect();
        assert_eq!(found, [(1, 4), (2, 4)]);
        assert_eq!(printable("a\u{1b}[31m\tb", 99), "a\u{FFFD}[31m b");
        assert_eq!(printable("abcdef", 4), "abc…");
        assert_eq!(collapse("  a \n\t b\u{a0}c "), "a b c");
    }
}
