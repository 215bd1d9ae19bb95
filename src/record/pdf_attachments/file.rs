//! A PDF's objects by their numbers.

use std::cell::{Cell, RefCell};
use std::collections::{HashMap, HashSet};
use std::rc::Rc;

use super::lexer::{Dict, Lexer, Object};
use super::unpack::{packing, undo_prediction, unpack};
use super::xref::{self, Entry, Table};
use crate::record::error::RecordError;
use crate::record::limits::{ATTACHMENT, DOCUMENT, UNPACKED, too_large, too_many};

/// References that lead to references.
const HOPS: usize = 16;

/// Object streams and stream lengths that need each other.
const RECURSION: usize = 8;

/// Objects read in all, so that no web of references costs more than a moment.
const READS: usize = 20_000;

/// Bytes parsed in all, as a multiple of the largest document.
const PARSED: usize = 4 * DOCUMENT;

/// A PDF file whose objects can be looked up.
pub(super) struct File<'a> {
    data: &'a [u8],
    table: Table,
    unpacked: RefCell<HashMap<u32, Rc<Vec<u8>>>>,
    budget: Budget,
    depth: Cell<usize>,
}

/// What may still be spent on one file.
pub(super) struct Budget {
    bytes_unpacked: Cell<usize>,
    bytes_parsed: Cell<usize>,
    reads: Cell<usize>,
}

impl Budget {
    pub(super) fn new() -> Self {
        Self {
            bytes_unpacked: Cell::new(UNPACKED),
            bytes_parsed: Cell::new(PARSED),
            reads: Cell::new(READS),
        }
    }

    /// Books one object of `bytes` parsed bytes, or refuses it.
    pub(super) fn read(&self, bytes: usize) -> Result<(), RecordError> {
        let reads = self.reads.get().checked_sub(1);
        self.reads.set(reads.ok_or_else(|| too_many("the number of objects read", READS))?);
        let left = self.bytes_parsed.get().checked_sub(bytes);
        self.bytes_parsed
            .set(left.ok_or_else(|| too_large("the work of reading the PDF", PARSED))?);
        Ok(())
    }

    /// Unpacks a stream within what is left.
    pub(super) fn unpack(&self, stream: &Stream<'_>) -> Result<Vec<u8>, RecordError> {
        self.read(stream.raw.len())?;
        let left = self.bytes_unpacked.get();
        let data = unpack(stream.raw, packing(&stream.dict)?, left.min(ATTACHMENT), stream.at)?;
        self.bytes_unpacked.set(left.saturating_sub(data.len()));
        undo_prediction(data, stream.dict.get(b"DecodeParms".as_slice()), stream.at)
    }
}

/// A stream as it stands in the file.
pub(super) struct Stream<'a> {
    pub(super) dict: Dict,
    pub(super) raw: &'a [u8],
    pub(super) at: usize,
    /// Where the mark after the content ends.
    pub(super) end: usize,
}

impl<'a> File<'a> {
    /// Reads the cross-reference data.
    pub(super) fn open(data: &'a [u8]) -> Result<Self, RecordError> {
        let budget = Budget::new();
        let table = xref::read(data, &budget)?;
        Ok(Self {
            data,
            table,
            unpacked: RefCell::new(HashMap::new()),
            budget,
            depth: Cell::new(0),
        })
    }

    /// The document catalogue.
    pub(super) fn catalogue(&self) -> Result<Dict, RecordError> {
        let root = self.table.trailer.get(b"Root".as_slice());
        match root.map(|root| self.resolve(root)).transpose()? {
            Some(Object::Dict(dict)) => Ok(dict),
            _ => Err(self.damaged("the document catalogue is missing")),
        }
    }

    pub(super) fn damaged(&self, what: &'static str) -> RecordError {
        RecordError::Damaged { what, at: self.table.at }
    }

    /// Follows references to a value; an object that is absent is null, as the
    /// standard says.
    pub(super) fn resolve(&self, object: &Object) -> Result<Object, RecordError> {
        let mut object = object.clone();
        let mut seen = HashSet::new();
        while let Object::Reference(number) = object {
            if !seen.insert(number) || seen.len() > HOPS {
                return Err(self.damaged("references lead in a circle"));
            }
            object = self.guarded(|| self.lookup(number))?;
        }
        Ok(object)
    }

    fn guarded<T>(&self, inner: impl FnOnce() -> Result<T, RecordError>) -> Result<T, RecordError> {
        if self.depth.get() >= RECURSION {
            return Err(self.damaged("objects need each other"));
        }
        self.depth.set(self.depth.get() + 1);
        let result = inner();
        self.depth.set(self.depth.get() - 1);
        result
    }

    fn lookup(&self, number: u32) -> Result<Object, RecordError> {
        match self.table.entries.get(&number) {
            None | Some(Entry::Free) => Ok(Object::Other),
            Some(&Entry::At(at)) => {
                let mut lexer = object_head(self.data, at, number)?;
                let object = lexer.object()?;
                self.budget.read(lexer.position() - at)?;
                Ok(object)
            }
            Some(&Entry::Inside { stream, index }) => self.lookup_inside(stream, index, number),
        }
    }

    fn lookup_inside(&self, holder: u32, index: usize, number: u32) -> Result<Object, RecordError> {
        let stream = self.stream(holder)?;
        let size = |key: &str| match stream.dict.get(key.as_bytes()) {
            Some(Object::Integer(value)) => usize::try_from(*value).ok(),
            _ => None,
        };
        let wrong =
            || RecordError::Damaged { what: "an object stream is out of order", at: stream.at };
        let first = size("First").ok_or_else(wrong)?;
        if size("N").is_none_or(|count| index >= count) {
            return Err(wrong());
        }
        let data = self.unpacked_holder(holder, &stream)?;
        let mut lexer = Lexer::new(&data, 0);
        let mut pair = None;
        for _ in 0..=index {
            pair = lexer.unsigned().zip(lexer.unsigned());
        }
        let (found, offset) = pair.ok_or_else(wrong)?;
        if found != u64::from(number) {
            return Err(wrong());
        }
        let offset = usize::try_from(offset).map_err(|_| wrong())?;
        let start = first.checked_add(offset).ok_or_else(wrong)?;
        let mut inner = Lexer::new(&data, start);
        let object = inner.object()?;
        self.budget.read(lexer.position() + (inner.position() - start))?;
        Ok(object)
    }

    fn unpacked_holder(
        &self,
        holder: u32,
        stream: &Stream<'_>,
    ) -> Result<Rc<Vec<u8>>, RecordError> {
        if let Some(data) = self.unpacked.borrow().get(&holder) {
            return Ok(Rc::clone(data));
        }
        let data = Rc::new(self.budget.unpack(stream)?);
        self.unpacked.borrow_mut().insert(holder, Rc::clone(&data));
        Ok(data)
    }

    /// The stream object of this number.
    pub(super) fn stream(&self, number: u32) -> Result<Stream<'a>, RecordError> {
        let Some(&Entry::At(at)) = self.table.entries.get(&number) else {
            return Err(self.damaged("a stream is missing"));
        };
        let lexer = object_head(self.data, at, number)?;
        let stream = read_stream(self.data, lexer, |length| self.guarded(|| self.resolve(length)))?;
        self.budget.read((stream.end - at).saturating_sub(stream.raw.len()))?;
        Ok(stream)
    }

    /// The unpacked content of the stream of this number.
    pub(super) fn content(&self, stream: &Stream<'_>) -> Result<Vec<u8>, RecordError> {
        self.budget.unpack(stream)
    }
}

/// Passes `number generation obj` at `at`.
fn object_head(data: &[u8], at: usize, number: u32) -> Result<Lexer<'_>, RecordError> {
    let mut lexer = Lexer::new(data, at);
    let found = lexer.unsigned();
    if found != Some(u64::from(number)) || lexer.unsigned().is_none() {
        return Err(lexer.damaged("an object is not where the table says"));
    }
    lexer.expect(b"obj", "an object has no head")?;
    Ok(lexer)
}

/// Reads a stream whose dictionary comes next; `length` settles a length that
/// stands in another object.
pub(super) fn read_stream<'a>(
    data: &'a [u8],
    mut lexer: Lexer<'a>,
    length: impl FnOnce(&Object) -> Result<Object, RecordError>,
) -> Result<Stream<'a>, RecordError> {
    let at = lexer.position();
    let Object::Dict(dict) = lexer.object()? else {
        return Err(lexer.damaged("a stream has no dictionary"));
    };
    lexer.expect(b"stream", "a stream is missing")?;
    if !lexer.take(b"\r\n") && !lexer.take(b"\n") {
        return Err(lexer.damaged("a stream has no beginning"));
    }
    let size = match dict.get(b"Length".as_slice()) {
        Some(Object::Integer(size)) => Some(*size),
        Some(reference @ Object::Reference(_)) => match length(reference)? {
            Object::Integer(size) => Some(size),
            _ => None,
        },
        _ => None,
    };
    let start = lexer.position();
    let end =
        size.and_then(|size| usize::try_from(size).ok()).and_then(|size| start.checked_add(size));
    let raw = end.and_then(|end| data.get(start..end).map(|raw| (raw, end)));
    let Some((raw, end)) = raw else {
        return Err(lexer.damaged("a stream has no valid length"));
    };
    let mut after = Lexer::new(data, end);
    after.expect(b"endstream", "a stream has no end")?;
    Ok(Stream { dict, raw, at, end: after.position() })
}
