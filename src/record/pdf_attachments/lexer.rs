//! PDF objects out of bytes, with bounds on depth, number and length.
//!
//! # Sources
//!
//! ISO 32000-1:2008, section 7.2 (lexical conventions) and 7.3 (objects).

use std::collections::BTreeMap;

use crate::record::error::RecordError;
use crate::record::limits::{too_large, too_many};

/// Arrays and dictionaries inside each other.
const DEPTH: usize = 32;

/// Values inside one object.
const VALUES: usize = 100_000;

/// Bytes of one name or string.
const TOKEN: usize = 64 * 1024;

/// The entries of a dictionary.
pub(super) type Dict = BTreeMap<Vec<u8>, Object>;

/// A PDF value.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Object {
    /// `null`, and what no reader of attachments needs: booleans, real numbers.
    Other,
    Integer(i64),
    Name(Vec<u8>),
    Text(Vec<u8>),
    Array(Vec<Object>),
    Dict(Dict),
    Reference(u32),
}

/// A position in bytes, moving forward.
#[derive(Debug, Clone)]
pub(super) struct Lexer<'a> {
    data: &'a [u8],
    at: usize,
    values: usize,
}

impl<'a> Lexer<'a> {
    pub(super) fn new(data: &'a [u8], at: usize) -> Self {
        Self { data, at, values: 0 }
    }

    pub(super) fn position(&self) -> usize {
        self.at
    }

    pub(super) fn damaged(&self, what: &'static str) -> RecordError {
        RecordError::Damaged { what, at: self.at }
    }

    fn peek(&self) -> Option<u8> {
        self.data.get(self.at).copied()
    }

    fn rest(&self) -> &'a [u8] {
        self.data.get(self.at..).unwrap_or_default()
    }

    /// Passes white space and comments.
    pub(super) fn skip_space(&mut self) {
        while let Some(byte) = self.peek() {
            if byte == b'%' {
                let line = self.rest().iter();
                self.at += line.take_while(|&&b| b != b'\n' && b != b'\r').count();
            } else if is_space(byte) {
                self.at += 1;
            } else {
                break;
            }
        }
    }

    /// Passes `word` when it stands here.
    pub(super) fn take(&mut self, word: &[u8]) -> bool {
        let there = self.rest().starts_with(word);
        if there {
            self.at += word.len();
        }
        there
    }

    /// Passes white space and then `word`, which must be there.
    pub(super) fn expect(&mut self, word: &[u8], missing: &'static str) -> Result<(), RecordError> {
        self.skip_space();
        if self.take(word) { Ok(()) } else { Err(self.damaged(missing)) }
    }

    /// Passes white space and an unsigned whole number.
    pub(super) fn unsigned(&mut self) -> Option<u64> {
        self.skip_space();
        let digits = self.rest().iter().take_while(|b| b.is_ascii_digit());
        let count = digits.count();
        let text = self.rest().get(..count)?;
        let value = std::str::from_utf8(text).ok()?.parse().ok()?;
        self.at += count;
        Some(value)
    }

    /// Reads one value.
    pub(super) fn object(&mut self) -> Result<Object, RecordError> {
        self.values = 0;
        self.nested(0)
    }

    fn nested(&mut self, depth: usize) -> Result<Object, RecordError> {
        self.values += 1;
        if depth > DEPTH {
            return Err(too_many("the nesting of a PDF object", DEPTH));
        }
        if self.values > VALUES {
            return Err(too_many("the number of values in a PDF object", VALUES));
        }
        self.skip_space();
        match self.peek() {
            Some(b'/') => Ok(Object::Name(self.name()?)),
            Some(b'(') => Ok(Object::Text(self.literal_string()?)),
            Some(b'[') => self.array(depth),
            Some(b'<') if self.take(b"<<") => Ok(Object::Dict(self.dict(depth)?)),
            Some(b'<') => Ok(Object::Text(self.hex_string()?)),
            Some(b'0'..=b'9' | b'+' | b'-' | b'.') => self.number_or_reference(),
            Some(byte) if byte.is_ascii_alphabetic() => {
                let word = self.rest().iter().take_while(|b| b.is_ascii_alphabetic());
                self.at += word.count();
                Ok(Object::Other)
            }
            _ => Err(self.damaged("a value is missing")),
        }
    }

    fn array(&mut self, depth: usize) -> Result<Object, RecordError> {
        self.at += 1;
        let mut items = Vec::new();
        loop {
            self.skip_space();
            if self.take(b"]") {
                return Ok(Object::Array(items));
            }
            items.push(self.nested(depth + 1)?);
        }
    }

    /// Reads entries up to `>>`. Of two entries with one key the first counts.
    fn dict(&mut self, depth: usize) -> Result<Dict, RecordError> {
        let mut entries = Dict::new();
        loop {
            self.skip_space();
            if self.take(b">>") {
                return Ok(entries);
            }
            if self.peek() != Some(b'/') {
                return Err(self.damaged("a dictionary is not closed"));
            }
            let key = self.name()?;
            let value = self.nested(depth + 1)?;
            entries.entry(key).or_insert(value);
        }
    }

    fn name(&mut self) -> Result<Vec<u8>, RecordError> {
        self.at += 1;
        let mut name = Vec::new();
        while let Some(byte) = self.peek().filter(|&b| !is_space(b) && !is_delimiter(b)) {
            let escaped = (byte == b'#')
                .then(|| self.data.get(self.at + 1..self.at + 3))
                .flatten()
                .and_then(|pair| match pair {
                    [high, low] => Some(hex(*high)? << 4 | hex(*low)?),
                    _ => None,
                });
            self.at += if escaped.is_some() { 3 } else { 1 };
            push(&mut name, escaped.unwrap_or(byte))?;
        }
        Ok(name)
    }

    fn literal_string(&mut self) -> Result<Vec<u8>, RecordError> {
        self.at += 1;
        let mut text = Vec::new();
        let mut open = 1_usize;
        loop {
            let Some(byte) = self.peek() else {
                return Err(self.damaged("a string is not closed"));
            };
            self.at += 1;
            match byte {
                b'(' => open += 1,
                b')' => {
                    open -= 1;
                    if open == 0 {
                        return Ok(text);
                    }
                }
                b'\\' => {
                    if let Some(escaped) = self.string_escape() {
                        push(&mut text, escaped)?;
                    }
                    continue;
                }
                _ => {}
            }
            push(&mut text, byte)?;
        }
    }

    /// The byte that an escape stands for; none for a continued line.
    fn string_escape(&mut self) -> Option<u8> {
        let byte = self.peek()?;
        self.at += 1;
        match byte {
            b'n' => Some(b'\n'),
            b'r' => Some(b'\r'),
            b't' => Some(b'\t'),
            b'b' => Some(8),
            b'f' => Some(12),
            b'\n' => None,
            b'\r' => {
                self.take(b"\n");
                None
            }
            b'0'..=b'7' => {
                let mut value = byte - b'0';
                for _ in 0..2 {
                    let Some(digit @ b'0'..=b'7') = self.peek() else {
                        break;
                    };
                    self.at += 1;
                    value = value.wrapping_mul(8).wrapping_add(digit - b'0');
                }
                Some(value)
            }
            other => Some(other),
        }
    }

    fn hex_string(&mut self) -> Result<Vec<u8>, RecordError> {
        self.at += 1;
        let mut text = Vec::new();
        let mut half = None;
        loop {
            let Some(byte) = self.peek() else {
                return Err(self.damaged("a string is not closed"));
            };
            self.at += 1;
            if byte == b'>' {
                if let Some(high) = half {
                    push(&mut text, high << 4)?;
                }
                return Ok(text);
            }
            match (hex(byte), half) {
                (Some(digit), None) => half = Some(digit),
                (Some(digit), Some(high)) => {
                    push(&mut text, high << 4 | digit)?;
                    half = None;
                }
                (None, _) if is_space(byte) => {}
                (None, _) => return Err(self.damaged("a string has a wrong digit")),
            }
        }
    }

    /// A number, or the three words of a reference such as `12 0 R`.
    fn number_or_reference(&mut self) -> Result<Object, RecordError> {
        let mut ahead = self.clone();
        if let (Some(number), Some(_)) = (ahead.unsigned(), ahead.unsigned()) {
            ahead.skip_space();
            if ahead.take(b"R") {
                self.at = ahead.at;
                return match u32::try_from(number) {
                    Ok(number) => Ok(Object::Reference(number)),
                    Err(_) => Err(self.damaged("an object number is out of range")),
                };
            }
        }
        let word = self.rest().iter();
        let count =
            word.take_while(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b'.')).count();
        let text = self.rest().get(..count).unwrap_or_default();
        let whole = std::str::from_utf8(text).ok().and_then(|t| t.parse().ok());
        self.at += count;
        Ok(whole.map_or(Object::Other, Object::Integer))
    }
}

fn push(text: &mut Vec<u8>, byte: u8) -> Result<(), RecordError> {
    if text.len() >= TOKEN {
        return Err(too_large("a name or string in the PDF", TOKEN));
    }
    text.push(byte);
    Ok(())
}

fn hex(byte: u8) -> Option<u8> {
    match byte {
        b'0'..=b'9' => Some(byte - b'0'),
        b'a'..=b'f' => Some(byte - b'a' + 10),
        b'A'..=b'F' => Some(byte - b'A' + 10),
        _ => None,
    }
}

fn is_space(byte: u8) -> bool {
    matches!(byte, 0 | b'\t' | b'\n' | 12 | b'\r' | b' ')
}

fn is_delimiter(byte: u8) -> bool {
    matches!(byte, b'(' | b')' | b'<' | b'>' | b'[' | b']' | b'{' | b'}' | b'/' | b'%')
}
