//! The files inside a PDF, read without trusting it.
//!
//! A reader of its own, because general PDF libraries repair, cache and unpack
//! whatever they meet: a hostile file makes them run out of stack or memory, which
//! nothing can catch. This one reads the few objects that lead to the attachments,
//! strictly and within fixed limits ([`limits`](super::limits)), and repairs
//! nothing: a record that needs repair is no proof.
//!
//! # Sources
//!
//! ISO 32000-1:2008, 7.7.4 (names), 7.9.2.2 (text strings), 7.9.6 (name trees),
//! 7.11.3 and 7.11.4 (embedded files); ISO 19005-3:2012, annex E (associated
//! files).

mod file;
mod lexer;
mod text;
mod unpack;
mod xref;

use std::collections::HashSet;

use self::file::File;
use self::lexer::{Dict, Object};
use super::Attachment;
use super::error::{RecordError, shown};
use super::limits::{ATTACHMENTS, DOCUMENT, NAME, too_large, too_many};

/// Nodes of the tree of names.
const NODES: usize = 1000;

/// The files that a PDF carries, in the order of its table of names, followed by
/// those that are only associated with the document.
///
/// The role of each is its relationship to the document in lower case (`source`,
/// `data`, `alternative`, `supplement`, `unspecified`). Names are data of unknown
/// origin: they may hold anything and must never be used as paths.
///
/// # Errors
///
/// * [`RecordError::NotPdf`], [`RecordError::Truncated`],
///   [`RecordError::Encrypted`], [`RecordError::Damaged`] for a file that is not a
///   whole, plain PDF.
/// * [`RecordError::Filter`] for attachments packed by anything but FlateDecode.
/// * [`RecordError::SameNameTwice`]; [`RecordError::TooLarge`].
pub fn attachments(pdf: &[u8]) -> Result<Vec<Attachment>, RecordError> {
    if pdf.len() > DOCUMENT {
        return Err(too_large("the PDF", DOCUMENT));
    }
    if !pdf.starts_with(b"%PDF-") {
        return Err(RecordError::NotPdf);
    }
    let file = File::open(pdf)?;
    let catalogue = file.catalogue()?;
    let mut specifications = in_names(&file, &catalogue)?;
    specifications.extend(associated(&file, &catalogue)?);

    let mut streams = HashSet::new();
    let mut names = HashSet::new();
    let mut found = Vec::new();
    for specification in specifications {
        let Object::Dict(specification) = file.resolve(&specification)? else {
            return Err(file.damaged("an attachment has no description"));
        };
        let stream = embedded_stream(&file, &specification)?;
        if !streams.insert(stream) {
            continue;
        }
        let attachment = read(&file, &specification, stream)?;
        if !names.insert(attachment.name.clone()) {
            return Err(RecordError::SameNameTwice { name: shown(&attachment.name) });
        }
        found.push(attachment);
    }
    Ok(found)
}

/// File specifications under `Names` / `EmbeddedFiles`.
fn in_names(file: &File<'_>, catalogue: &Dict) -> Result<Vec<Object>, RecordError> {
    let Object::Dict(names) = get(file, catalogue, "Names")? else {
        return Ok(Vec::new());
    };
    let mut found = Vec::new();
    let mut seen = HashSet::new();
    let mut nodes = 0_usize;
    let mut waiting: Vec<Object> =
        names.get(b"EmbeddedFiles".as_slice()).cloned().into_iter().collect();
    while let Some(node) = waiting.pop() {
        nodes += 1;
        if nodes > NODES {
            return Err(too_many("the tree of attachment names", NODES));
        }
        if let Object::Reference(number) = node
            && !seen.insert(number)
        {
            return Err(file.damaged("the tree of attachment names is a circle"));
        }
        let Object::Dict(node) = file.resolve(&node)? else {
            return Err(file.damaged("the tree of attachment names is out of order"));
        };
        if let Object::Array(pairs) = get(file, &node, "Names")? {
            for pair in pairs.chunks(2) {
                let [_, specification] = pair else {
                    return Err(file.damaged("the tree of attachment names is out of order"));
                };
                found.push(specification.clone());
            }
        }
        if let Object::Array(kids) = get(file, &node, "Kids")? {
            waiting.extend(kids.into_iter().rev().take(NODES));
        }
        bounded(&found)?;
    }
    Ok(found)
}

/// File specifications under `AF`.
fn associated(file: &File<'_>, catalogue: &Dict) -> Result<Vec<Object>, RecordError> {
    let found = match get(file, catalogue, "AF")? {
        Object::Array(found) => found,
        _ => Vec::new(),
    };
    bounded(&found)?;
    Ok(found)
}

fn bounded(found: &[Object]) -> Result<(), RecordError> {
    if found.len() > ATTACHMENTS {
        return Err(too_many("the number of attachments", ATTACHMENTS));
    }
    Ok(())
}

/// A dictionary's entry, references followed; null when absent.
fn get(file: &File<'_>, dict: &Dict, key: &str) -> Result<Object, RecordError> {
    dict.get(key.as_bytes()).map_or(Ok(Object::Other), |value| file.resolve(value))
}

/// The number of the stream that holds the attachment's bytes.
fn embedded_stream(file: &File<'_>, specification: &Dict) -> Result<u32, RecordError> {
    let Object::Dict(embedded) = get(file, specification, "EF")? else {
        return Err(file.damaged("an attachment has no content"));
    };
    let stream = embedded.get(b"UF".as_slice()).or_else(|| embedded.get(b"F".as_slice()));
    match stream {
        Some(&Object::Reference(number)) => Ok(number),
        _ => Err(file.damaged("an attachment has no content")),
    }
}

fn read(file: &File<'_>, specification: &Dict, stream: u32) -> Result<Attachment, RecordError> {
    let name = match (get(file, specification, "UF")?, get(file, specification, "F")?) {
        (Object::Text(name), _) => text::decode(&name),
        (_, Object::Text(name)) => text::decode_plain(&name),
        _ => return Err(file.damaged("an attachment has no name")),
    };
    if name.len() > NAME {
        return Err(too_large("the name of an attachment", NAME));
    }
    let role = match get(file, specification, "AFRelationship")? {
        Object::Name(role) => String::from_utf8_lossy(&role).to_lowercase(),
        _ => "unspecified".to_owned(),
    };
    let stream = file.stream(stream)?;
    let bytes = file.content(&stream)?;
    if let Object::Dict(parameters) = get(file, &stream.dict, "Params")?
        && let Object::Integer(size) = get(file, &parameters, "Size")?
        && u64::try_from(size).ok() != Some(bytes.len() as u64)
    {
        return Err(RecordError::Damaged {
            what: "an attachment is not as long as it says",
            at: stream.at,
        });
    }
    Ok(Attachment { name, role, bytes })
}
