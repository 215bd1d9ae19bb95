//! Streams out of their packing, under a limit.

use flate2::{Decompress, FlushDecompress, Status};

use super::lexer::{Dict, Object};
use crate::record::error::{RecordError, shown};
use crate::record::limits::too_large;

/// How a stream is packed, as far as it is read here.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Packing {
    Plain,
    Flate,
}

/// The packing that a stream's dictionary names.
///
/// # Errors
///
/// * [`RecordError::Filter`] for any filter but FlateDecode alone.
pub(super) fn packing(dict: &Dict) -> Result<Packing, RecordError> {
    let names: &[Object] = match dict.get(b"Filter".as_slice()) {
        None | Some(Object::Other) => &[],
        Some(Object::Array(names)) => names,
        Some(one) => std::slice::from_ref(one),
    };
    match names {
        [] => Ok(Packing::Plain),
        [Object::Name(name)] if name == b"FlateDecode" => Ok(Packing::Flate),
        other => Err(RecordError::Filter {
            name: other.iter().map(filter_name).collect::<Vec<_>>().join(", "),
        }),
    }
}

fn filter_name(object: &Object) -> String {
    match object {
        Object::Name(name) => shown(&String::from_utf8_lossy(name)),
        _ => "an unnamed filter".to_owned(),
    }
}

/// Room for the first unpacked bytes; it doubles as they come.
const FIRST_ROOM: usize = 64 * 1024;

/// Unpacks `raw` into at most `limit` bytes; never holds much more than that.
pub(super) fn unpack(
    raw: &[u8],
    packing: Packing,
    limit: usize,
    at: usize,
) -> Result<Vec<u8>, RecordError> {
    match packing {
        Packing::Plain if raw.len() > limit => Err(too_large(UNPACKED_FILE, limit)),
        Packing::Plain => Ok(raw.to_vec()),
        // Common writers leave out even the packing's own head and checksum.
        Packing::Flate if raw.is_empty() => Ok(Vec::new()),
        Packing::Flate => inflate(raw, limit, at),
    }
}

const UNPACKED_FILE: &str = "an unpacked file in the PDF";

/// A stream counts only when its end mark and checksum are reached: one that
/// stops early would otherwise pass for a shorter file.
fn inflate(raw: &[u8], limit: usize, at: usize) -> Result<Vec<u8>, RecordError> {
    let damaged = || RecordError::Damaged { what: "a compressed stream cannot be unpacked", at };
    let mut inflater = Decompress::new(true);
    let mut unpacked = Vec::new();
    loop {
        if unpacked.len() > limit {
            return Err(too_large(UNPACKED_FILE, limit));
        }
        if unpacked.len() == unpacked.capacity() {
            let room = unpacked.capacity().max(FIRST_ROOM);
            unpacked.reserve_exact(room.min(limit + 1 - unpacked.len()));
        }
        let before = (inflater.total_in(), unpacked.len());
        let used = usize::try_from(before.0).map_err(|_| damaged())?;
        let rest = raw.get(used..).unwrap_or_default();
        let status = inflater
            .decompress_vec(rest, &mut unpacked, FlushDecompress::None)
            .map_err(|_| damaged())?;
        match status {
            Status::StreamEnd if unpacked.len() <= limit => return Ok(unpacked),
            Status::StreamEnd => return Err(too_large(UNPACKED_FILE, limit)),
            Status::Ok | Status::BufError => {
                if before == (inflater.total_in(), unpacked.len()) {
                    return Err(damaged());
                }
            }
        }
    }
}

/// Undoes the row-wise prediction that cross-reference streams commonly use.
///
/// # Sources
///
/// ISO 32000-1:2008, 7.4.4.4; filter types of PNG (ISO/IEC 15948), section 9.
pub(super) fn undo_prediction(
    data: Vec<u8>,
    parameters: Option<&Object>,
    at: usize,
) -> Result<Vec<u8>, RecordError> {
    let Some(Object::Dict(parameters)) = parameters else {
        return Ok(data);
    };
    let number = |key: &str, default: i64| match parameters.get(key.as_bytes()) {
        Some(Object::Integer(value)) => *value,
        _ => default,
    };
    let damaged = |what| RecordError::Damaged { what, at };
    match number("Predictor", 1) {
        1 => return Ok(data),
        10..=15 => {}
        _ => return Err(damaged("a stream names an unknown prediction")),
    }
    if number("Colors", 1) != 1 || number("BitsPerComponent", 8) != 8 {
        return Err(damaged("a stream names an unusual prediction"));
    }
    let columns = usize::try_from(number("Columns", 1)).unwrap_or(0);
    if columns == 0 || columns > data.len() {
        return Err(damaged("a stream names an impossible row length"));
    }
    let mut rows = Vec::with_capacity(data.len());
    let mut above = vec![0_u8; columns];
    for packed in data.chunks(columns + 1) {
        let Some((&kind, packed)) = packed.split_first() else {
            continue;
        };
        let mut row = Vec::with_capacity(columns);
        for (column, &byte) in packed.iter().enumerate() {
            let before = |row: &[u8]| column.checked_sub(1).and_then(|c| row.get(c)).copied();
            let left = before(&row).unwrap_or(0);
            let up = above.get(column).copied().unwrap_or(0);
            let corner = before(&above).unwrap_or(0);
            let predicted = match kind {
                0 => 0,
                1 => left,
                2 => up,
                3 => ((u16::from(left) + u16::from(up)) / 2) as u8,
                4 => paeth(left, up, corner),
                _ => return Err(damaged("a stream has a wrong row type")),
            };
            row.push(byte.wrapping_add(predicted));
        }
        rows.extend_from_slice(&row);
        above = row;
    }
    Ok(rows)
}

/// Of left, up and corner the one nearest to `left + up - corner`.
fn paeth(left: u8, up: u8, corner: u8) -> u8 {
    let estimate = i16::from(left) + i16::from(up) - i16::from(corner);
    let distance = |value: u8| (estimate - i16::from(value)).abs();
    if distance(left) <= distance(up) && distance(left) <= distance(corner) {
        left
    } else if distance(up) <= distance(corner) {
        up
    } else {
        corner
    }
}
