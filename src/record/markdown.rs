//! How input files stand inside a Markdown document, and how they come out again.
//!
//! Each file is one fenced code block, which readers, GitHub and pandoc show as
//! code; the opening line says what it is:
//!
//! ````text
//! ``` {.yaml .sufficit-input file="study.yaml" holds="spec" encoding="text"}
//! sufficit: 1
//! ```
//! ````
//!
//! The language stands inside the braces, since pandoc before 3.0 takes a word in
//! front of them for running text.
//!
//! Text that survives editors and version control as it is stands there as it is;
//! anything else stands there in base64.
//!
//! # Sources
//!
//! CommonMark 0.31.2, section 4.5 (fenced code blocks); pandoc's
//! `fenced_code_attributes`; RFC 4648, section 4 (base64).

use std::collections::HashSet;
use std::fmt::Write as _;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;

use super::Attachment;
use super::error::{RecordError, shown};
use super::limits::{ATTACHMENT, ATTACHMENTS, DOCUMENT, NAME, UNPACKED, too_large, too_many};

/// The class that marks our blocks.
const CLASS: &str = ".sufficit-input";

/// Characters in a line of base64, as in RFC 2045.
const BASE64_LINE: usize = 76;

/// The code block that holds `bytes` under the name `file` in the part `role`
/// (such as `spec` or `data`).
///
/// The block begins and ends with its fences, each on a line of its own; put it at
/// the beginning of a line. [`extract`] gives the same name, role and bytes back,
/// whatever they hold.
pub fn embed(file: &str, role: &str, bytes: &[u8]) -> String {
    let name = escape(file);
    let role = escape(role);
    match plain_text(bytes) {
        Some(text) => {
            let fence = "`".repeat(longest_run(text).max(2) + 1);
            let word = language(file);
            format!(
                "{fence} {{.{word} {CLASS} file=\"{name}\" holds=\"{role}\" encoding=\"text\"}}\n\
                 {text}{fence}\n"
            )
        }
        None => {
            let mut block = format!(
                "``` {{.text {CLASS} file=\"{name}\" holds=\"{role}\" encoding=\"base64\"}}\n"
            );
            // 57 bytes fill a line of 76 characters.
            for piece in bytes.chunks(BASE64_LINE / 4 * 3) {
                STANDARD.encode_string(piece, &mut block);
                block.push('\n');
            }
            block.push_str("```\n");
            block
        }
    }
}

/// The files that a Markdown document holds, in their order.
///
/// Blocks inside other code blocks do not count. Line ends written as CR LF are
/// read as LF: no text block ever holds a CR. Names are data of unknown origin and
/// must never be used as paths.
///
/// # Errors
///
/// * [`RecordError::Markdown`] for a block that [`embed`] would not have written
///   or that is not closed.
/// * [`RecordError::SameNameTwice`], [`RecordError::TooLarge`].
pub fn extract(markdown: &str) -> Result<Vec<Attachment>, RecordError> {
    if markdown.len() > DOCUMENT {
        return Err(too_large("the Markdown", DOCUMENT));
    }
    let mut found: Vec<Attachment> = Vec::new();
    let mut names = HashSet::new();
    let mut total = 0_usize;
    let mut lines = markdown.split('\n').enumerate();
    while let Some((index, line)) = lines.next() {
        let line = line.strip_suffix('\r').unwrap_or(line);
        let Some(fence) = Fence::opening(line) else {
            continue;
        };
        let head = Head::read(line, &fence, index + 1)?;
        let mut content = String::new();
        let mut closed = false;
        for (_, inner) in lines.by_ref() {
            let inner = inner.strip_suffix('\r').unwrap_or(inner);
            if fence.is_closed_by(inner) {
                closed = true;
                break;
            }
            if head.is_some() {
                content.push_str(inner);
                content.push('\n');
            }
        }
        let Some(head) = head else {
            continue;
        };
        if !closed {
            return Err(head.wrong("the block of an input file is not closed"));
        }
        let attachment = head.attachment(content)?;
        total += attachment.bytes.len();
        if attachment.bytes.len() > ATTACHMENT {
            return Err(too_large("a file in the Markdown", ATTACHMENT));
        }
        if total > UNPACKED {
            return Err(too_large("the files in the Markdown together", UNPACKED));
        }
        if found.len() >= ATTACHMENTS {
            return Err(too_many("the number of files in the Markdown", ATTACHMENTS));
        }
        if !names.insert(attachment.name.clone()) {
            return Err(RecordError::SameNameTwice { name: shown(&attachment.name) });
        }
        found.push(attachment);
    }
    Ok(found)
}

/// The bytes as text that can stand in a code block and come out unchanged.
fn plain_text(bytes: &[u8]) -> Option<&str> {
    let text = std::str::from_utf8(bytes).ok()?;
    let odd = |c: char| {
        (c.is_control() && !matches!(c, '\n' | '\t'))
            || matches!(c, '\u{FEFF}' | '\u{2028}' | '\u{2029}')
    };
    (text.ends_with('\n') && !text.contains(odd)).then_some(text)
}

fn longest_run(text: &str) -> usize {
    let mut longest = 0;
    let mut run = 0;
    for byte in text.bytes() {
        run = if byte == b'`' { run + 1 } else { 0 };
        longest = longest.max(run);
    }
    longest
}

/// The class by which readers colour the block.
fn language(file: &str) -> &'static str {
    let ending = file.rsplit_once('.').map(|(_, ending)| ending);
    match ending.map(str::to_ascii_lowercase).as_deref() {
        Some("yaml" | "yml") => "yaml",
        Some("csv") => "csv",
        Some("json") => "json",
        _ => "text",
    }
}

/// Letters, digits and `.-_` stand for themselves, all else as the percent-escaped
/// bytes of its UTF-8 (RFC 3986, section 2.1), so that no name can end the line,
/// the quotes or the fence.
fn escape(name: &str) -> String {
    let mut escaped = String::new();
    for c in name.chars() {
        if c.is_alphanumeric() || matches!(c, '.' | '-' | '_') {
            escaped.push(c);
        } else {
            for byte in c.encode_utf8(&mut [0; 4]).bytes() {
                // Writing to a string cannot fail.
                let _ = write!(escaped, "%{byte:02X}");
            }
        }
    }
    escaped
}

/// The inverse of [`escape`]; `None` for anything that it does not write.
fn unescape(escaped: &str) -> Option<String> {
    let mut bytes = Vec::new();
    let mut rest = escaped;
    while let Some(c) = rest.chars().next() {
        let length = if c == '%' { 3 } else { c.len_utf8() };
        let (piece, after) = rest.split_at_checked(length)?;
        match piece.strip_prefix('%') {
            Some(digits) => bytes.push(u8::from_str_radix(digits, 16).ok()?),
            None => bytes.extend_from_slice(piece.as_bytes()),
        }
        rest = after;
    }
    let name = String::from_utf8(bytes).ok()?;
    (escape(&name) == escaped).then_some(name)
}

/// The fence that opens a code block.
struct Fence {
    mark: u8,
    length: usize,
}

impl Fence {
    fn opening(line: &str) -> Option<Self> {
        let (mark, length) = Self::run(line)?;
        let info = line.trim_start_matches(' ').get(length..)?;
        let valid = length >= 3 && !(mark == b'`' && info.contains('`'));
        valid.then_some(Self { mark, length })
    }

    fn is_closed_by(&self, line: &str) -> bool {
        Self::run(line).is_some_and(|(mark, length)| {
            let after = line.trim_start_matches(' ').get(length..);
            mark == self.mark
                && length >= self.length
                && after.is_some_and(|after| after.trim_matches([' ', '\t']).is_empty())
        })
    }

    /// The run of backticks or tildes at the beginning of a line that is indented
    /// by at most three spaces.
    fn run(line: &str) -> Option<(u8, usize)> {
        let text = line.trim_start_matches(' ');
        let mark = text.bytes().next().filter(|b| matches!(b, b'`' | b'~'))?;
        let indent = line.len() - text.len();
        let length = text.bytes().take_while(|&b| b == mark).count();
        (indent <= 3).then_some((mark, length))
    }
}

/// What the opening line of one of our blocks says.
struct Head {
    line: usize,
    name: String,
    role: String,
    base64: bool,
}

impl Head {
    /// Reads an opening line; `None` for the block of somebody else.
    fn read(line: &str, fence: &Fence, number: usize) -> Result<Option<Self>, RecordError> {
        if !line.contains(CLASS) {
            return Ok(None);
        }
        let wrong = RecordError::Markdown {
            line: number,
            what: "the opening line of an input file has been changed",
        };
        let head = line
            .get(fence.length..)
            .filter(|_| fence.mark == b'`' && line.starts_with('`'))
            .and_then(|info| Self::parse(info, number));
        head.map(Some).ok_or(wrong)
    }

    fn parse(info: &str, line: usize) -> Option<Self> {
        let (word, rest) = info.strip_prefix(" {.")?.split_once(' ')?;
        let rest = rest.strip_prefix(CLASS)?.strip_prefix(" file=\"")?;
        let (name, rest) = rest.split_once('"')?;
        let (role, rest) = rest.strip_prefix(" holds=\"")?.split_once('"')?;
        let base64 = match rest {
            " encoding=\"text\"}" => false,
            " encoding=\"base64\"}" => true,
            _ => return None,
        };
        let word_is_plain = word.bytes().all(|b| b.is_ascii_lowercase());
        (word_is_plain && name.len() <= 3 * NAME && role.len() <= NAME).then_some(())?;
        Some(Self { line, name: unescape(name)?, role: unescape(role)?, base64 })
    }

    fn wrong(&self, what: &'static str) -> RecordError {
        RecordError::Markdown { line: self.line, what }
    }

    fn attachment(self, content: String) -> Result<Attachment, RecordError> {
        let bytes = if self.base64 {
            let digits: Vec<u8> = content.bytes().filter(|&b| b != b'\n').collect();
            STANDARD
                .decode(digits)
                .map_err(|_| self.wrong("the base64 of an input file is damaged"))?
        } else if content.is_empty() {
            return Err(self.wrong("the text of an input file is missing"));
        } else {
            content.into_bytes()
        };
        Ok(Attachment { name: self.name, role: self.role, bytes })
    }
}
