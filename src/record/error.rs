//! Why a document gave nothing back.

/// Why inputs could not be read back out of a document, or a hash out of text.
///
/// Positions are byte offsets in the file from 0, lines count from 1. Text taken
/// from the document is escaped and cut before it enters a message.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum RecordError {
    /// Neither of the two kinds of document that carry their inputs.
    #[error("this is neither a PDF nor a Markdown that Sufficit made")]
    NeitherPdfNorMarkdown,
    /// No spec inside.
    #[error("the document carries no spec, so nothing in it can be recomputed")]
    NoSpec,
    /// No plan inside.
    #[error("the PDF carries no readable plan, so it was not made by Sufficit or was altered")]
    NoPlan,
    /// The file does not begin as a PDF does.
    #[error("this is not a PDF file: it does not begin with %PDF-")]
    NotPdf,
    /// The PDF asks for a password or would, in another reader.
    #[error("the PDF is encrypted; save it without a password first")]
    Encrypted,
    /// The file's end is missing.
    #[error("the PDF is cut off: its end mark is missing")]
    Truncated,
    /// The file contradicts itself.
    #[error("the PDF is damaged: {what} (near byte {at})")]
    Damaged {
        /// What is wrong.
        what: &'static str,
        /// Where, as a byte offset.
        at: usize,
    },
    /// A limit that keeps hostile files from filling memory.
    #[error("{what} exceeds the limit of {limit}")]
    TooLarge {
        /// What is too large or too many.
        what: &'static str,
        /// The limit, with its unit.
        limit: String,
    },
    /// A stream is packed in a way that Sufficit never writes.
    #[error("the PDF packs a stream by {name}, which is not read here")]
    Filter {
        /// The filter's name in the file.
        name: String,
    },
    /// Two inputs of one document share a name.
    #[error("the document was altered: it holds two files named {name}")]
    SameNameTwice {
        /// The shared name.
        name: String,
    },
    /// An embedded file of a Markdown document is out of order.
    #[error("line {line} of the Markdown: {what}")]
    Markdown {
        /// The line of the block's opening fence.
        line: usize,
        /// What is wrong.
        what: &'static str,
    },
    /// Text that is not a SHA-256.
    #[error("{given} is not a SHA-256 of 64 lower-case hexadecimal digits")]
    NotAHash {
        /// The text.
        given: String,
    },
}

/// Text from a document made fit for a message: escaped, cut, quoted.
pub(super) fn shown(text: &str) -> String {
    const LONGEST: usize = 80;
    let cut: String = text.chars().take(LONGEST).collect();
    if text.chars().nth(LONGEST).is_some() { format!("{cut:?}…") } else { format!("{cut:?}") }
}
