//! A document as its own proof: hashes, and the inputs that travel inside it.
//!
//! ```text
//! PDF      -> pdf_attachments::attachments -\
//!                                            > Attachment (name, role, bytes)
//! Markdown -> markdown::extract ------------/
//! ```

pub mod documents;
pub mod error;
pub mod hash;
pub mod limits;
pub mod markdown;
pub mod pdf_attachments;
pub mod verify;

pub use error::RecordError;
pub use hash::{ContentHash, sha256_hex};

/// A file that travelled inside a document.
///
/// Everything in it comes from the document: the name is no path, the role no
/// proof.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Attachment {
    /// The name that the document gives the file.
    pub name: String,
    /// What the file is to the document.
    pub role: String,
    /// The content.
    pub bytes: Vec<u8>,
}
