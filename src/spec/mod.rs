//! YAML text to checked study.
//!
//! A file passes through: bytes to text, text to a tree of keys and values, keys against the language (which the designs
//! share in making), values against their meaning. Each step reports all it finds, every fault with line, column, reason
//! and way out; only a file that is no text or no YAML stops early.
//!
//! May use `quantities`, `designs`, `study` and `bibliography`.

mod check;
mod choose;
mod commas;
mod experiment;
mod files;
mod finding;
mod frame;
mod hints;
mod keys;
mod language;
mod load;
mod locate;
mod nearest;
mod node;
mod notation;
mod problems;
mod raw;
mod repair;
mod shape;
mod source_files;
mod structure;
mod suspects;
mod syntax;
mod table;
mod text;
mod words;

pub use files::{
    DiskFolder, Folder, FolderError, InputFile, Inputs, LARGEST_FILE, LARGEST_SPEC, MemoryFolder,
};
pub use language::json_schema;
pub use load::{Loaded, load};
pub use problems::{Located, Mark, Note, SpecProblems};
pub(crate) use text::printable;
