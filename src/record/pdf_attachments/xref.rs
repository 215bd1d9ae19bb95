//! Where a PDF's objects stand: the cross-reference data, newest part first.
//!
//! # Sources
//!
//! ISO 32000-1:2008, 7.5.4 (table), 7.5.5 (trailer), 7.5.8 (streams).

use std::collections::{HashMap, HashSet};

use super::file::{Budget, Stream, read_stream};
use super::lexer::{Dict, Lexer, Object};
use crate::record::error::RecordError;
use crate::record::limits::too_many;

/// The end mark stands in so many last bytes.
const TAIL: usize = 2048;

/// Objects in one file.
const OBJECTS: usize = 1_000_000;

/// Times that a file was saved on top of itself.
const REVISIONS: usize = 256;

/// Where one object stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Entry {
    Free,
    /// At a byte of the file.
    At(usize),
    /// In an object stream, as its entry of this index.
    Inside {
        stream: u32,
        index: usize,
    },
}

/// Where all objects stand.
#[derive(Debug)]
pub(super) struct Table {
    pub(super) entries: HashMap<u32, Entry>,
    /// The newest trailer.
    pub(super) trailer: Dict,
    /// Where the newest part begins.
    pub(super) at: usize,
}

/// Reads all parts of the cross-reference data.
///
/// # Errors
///
/// * [`RecordError::Truncated`] without an end mark, [`RecordError::Encrypted`]
///   when any trailer says so, [`RecordError::Damaged`] and
///   [`RecordError::TooLarge`] for the rest.
pub(super) fn read(data: &[u8], budget: &Budget) -> Result<Table, RecordError> {
    let newest = newest_part(data)?;
    let mut table = Table { entries: HashMap::new(), trailer: Dict::new(), at: newest };
    let mut seen = HashSet::new();
    let mut next = vec![newest];
    while let Some(at) = next.pop() {
        if !seen.insert(at) {
            return Err(RecordError::Damaged {
                what: "the cross-reference data lead in a circle",
                at,
            });
        }
        if seen.len() > REVISIONS {
            return Err(too_many("the number of revisions", REVISIONS));
        }
        let trailer = read_part(data, at, &mut table.entries, budget)?;
        if trailer.contains_key(b"Encrypt".as_slice()) {
            return Err(RecordError::Encrypted);
        }
        // The last one pushed is read first: a hybrid file's stream goes before
        // the older parts.
        for key in ["Prev", "XRefStm"] {
            match trailer.get(key.as_bytes()) {
                None => {}
                Some(Object::Integer(older)) => {
                    let older = usize::try_from(*older).ok();
                    next.push(older.filter(|&o| o < data.len()).ok_or(RecordError::Damaged {
                        what: "the cross-reference data point outside the file",
                        at,
                    })?);
                }
                Some(_) => {
                    return Err(RecordError::Damaged { what: "the trailer is out of order", at });
                }
            }
        }
        if at == newest {
            table.trailer = trailer;
        }
    }
    Ok(table)
}

/// The place that `startxref` names at the end of the file.
fn newest_part(data: &[u8]) -> Result<usize, RecordError> {
    const MARK: &[u8] = b"startxref";
    let from = data.len().saturating_sub(TAIL);
    let tail = data.get(from..).unwrap_or_default();
    let found = tail.windows(MARK.len()).rposition(|word| word == MARK);
    let at = from + found.ok_or(RecordError::Truncated)? + MARK.len();
    let mut lexer = Lexer::new(data, at);
    let place = lexer.unsigned();
    let end = data.get(lexer.position()..).unwrap_or_default();
    if !end.windows(5).any(|word| word == b"%%EOF") {
        return Err(RecordError::Truncated);
    }
    place
        .and_then(|place| usize::try_from(place).ok())
        .filter(|&place| place < data.len())
        .ok_or(RecordError::Damaged { what: "the end mark points outside the file", at })
}

fn read_part(
    data: &[u8],
    at: usize,
    entries: &mut HashMap<u32, Entry>,
    budget: &Budget,
) -> Result<Dict, RecordError> {
    let mut lexer = Lexer::new(data, at);
    lexer.skip_space();
    if lexer.take(b"xref") {
        let trailer = read_table(&mut lexer, entries)?;
        budget.read(lexer.position() - at)?;
        return Ok(trailer);
    }
    if lexer.unsigned().is_none() || lexer.unsigned().is_none() {
        return Err(lexer.damaged("the cross-reference data are not where the end mark says"));
    }
    lexer.expect(b"obj", "the cross-reference data have no head")?;
    // A length in another object could not be looked up yet.
    let stream = read_stream(data, lexer, |_| Ok(Object::Other))?;
    budget.read((stream.end - at).saturating_sub(stream.raw.len()))?;
    read_entries(&stream, &budget.unpack(&stream)?, entries)?;
    Ok(stream.dict)
}

fn read_table(
    lexer: &mut Lexer<'_>,
    entries: &mut HashMap<u32, Entry>,
) -> Result<Dict, RecordError> {
    loop {
        lexer.skip_space();
        if lexer.take(b"trailer") {
            return match lexer.object()? {
                Object::Dict(trailer) => Ok(trailer),
                _ => Err(lexer.damaged("the trailer is out of order")),
            };
        }
        let head = lexer.unsigned().zip(lexer.unsigned());
        let Some((first, count)) = head else {
            return Err(lexer.damaged("the cross-reference table is out of order"));
        };
        for offset in 0..count {
            let place = lexer.unsigned().zip(lexer.unsigned());
            lexer.skip_space();
            let used = lexer.take(b"n");
            let (Some((place, _)), true) = (place, used || lexer.take(b"f")) else {
                return Err(lexer.damaged("the cross-reference table is out of order"));
            };
            let entry = if used {
                Entry::At(usize::try_from(place).unwrap_or(usize::MAX))
            } else {
                Entry::Free
            };
            add(entries, first.saturating_add(offset), entry)?;
        }
    }
}

fn read_entries(
    stream: &Stream<'_>,
    data: &[u8],
    entries: &mut HashMap<u32, Entry>,
) -> Result<(), RecordError> {
    let wrong = || RecordError::Damaged {
        what: "the cross-reference stream is out of order",
        at: stream.at,
    };
    let widths = numbers(stream.dict.get(b"W".as_slice())).ok_or_else(wrong)?;
    let &[kind_width, second_width, third_width] = widths.as_slice() else {
        return Err(wrong());
    };
    if widths.iter().any(|&width| width > 8) || second_width == 0 {
        return Err(wrong());
    }
    let size = numbers(stream.dict.get(b"Size".as_slice())).ok_or_else(wrong)?;
    let ranges = match stream.dict.get(b"Index".as_slice()) {
        None => [vec![0], size].concat(),
        index => numbers(index).ok_or_else(wrong)?,
    };
    let mut rest = data;
    for range in ranges.chunks(2) {
        let &[first, count] = range else {
            return Err(wrong());
        };
        for offset in 0..count {
            let kind = match kind_width {
                0 => 1,
                width => field(&mut rest, width).ok_or_else(wrong)?,
            };
            let second = field(&mut rest, second_width).ok_or_else(wrong)?;
            let third = field(&mut rest, third_width).ok_or_else(wrong)?;
            let entry = match kind {
                0 => Entry::Free,
                1 => Entry::At(usize::try_from(second).unwrap_or(usize::MAX)),
                2 => Entry::Inside {
                    stream: u32::try_from(second).map_err(|_| wrong())?,
                    index: usize::try_from(third).map_err(|_| wrong())?,
                },
                // The standard: other types are references to null.
                _ => Entry::Free,
            };
            add(entries, first.saturating_add(offset), entry)?;
        }
    }
    Ok(())
}

/// Newer parts are read first, so that the first entry for a number counts.
fn add(entries: &mut HashMap<u32, Entry>, number: u64, entry: Entry) -> Result<(), RecordError> {
    let number = u32::try_from(number).unwrap_or(u32::MAX);
    entries.entry(number).or_insert(entry);
    if entries.len() > OBJECTS {
        return Err(too_many("the number of objects", OBJECTS));
    }
    Ok(())
}

/// One number, or an array of numbers.
fn numbers(object: Option<&Object>) -> Option<Vec<u64>> {
    let list = match object? {
        Object::Array(items) => items.as_slice(),
        one => std::slice::from_ref(one),
    };
    list.iter()
        .map(|item| match item {
            Object::Integer(value) => u64::try_from(*value).ok(),
            _ => None,
        })
        .collect()
}

/// Takes `width` bytes off `rest` as a big-endian number.
fn field(rest: &mut &[u8], width: u64) -> Option<u64> {
    let (bytes, after) = rest.split_at_checked(usize::try_from(width).ok()?)?;
    *rest = after;
    Some(bytes.iter().fold(0, |value, &b| value << 8 | u64::from(b)))
}
