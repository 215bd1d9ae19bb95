//! How much of a document is read back at most: documents come from strangers.

use super::error::RecordError;

const MIB: usize = 1024 * 1024;

/// Largest document that is looked at.
pub const DOCUMENT: usize = 64 * MIB;

/// Most files in one document.
pub const ATTACHMENTS: usize = 200;

/// Largest single file after unpacking.
pub const ATTACHMENT: usize = 16 * MIB;

/// Largest sum of all that is unpacked from one document.
pub const UNPACKED: usize = 64 * MIB;

/// Longest file name, in bytes.
pub const NAME: usize = 4096;

/// The refusal of something that counts more bytes than `limit`.
pub(super) fn too_large(what: &'static str, limit: usize) -> RecordError {
    let limit =
        if limit >= MIB { format!("{} MiB", limit / MIB) } else { format!("{limit} bytes") };
    RecordError::TooLarge { what, limit }
}

/// The refusal of something that counts more pieces than `limit`.
pub(super) fn too_many(what: &'static str, limit: usize) -> RecordError {
    RecordError::TooLarge { what, limit: limit.to_string() }
}
