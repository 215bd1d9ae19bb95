//! From the document model to bytes: templates, figures, Typst, Markdown, plain text.
//!
//! The only room that knows `minijinja`, `typst`, `plotters` and `resvg`. It computes no statistics.

pub mod error;
pub mod faces;
pub mod figures;
mod labels;
pub mod pdf;
pub mod png;
mod press;
mod templates;

pub use error::RenderError;
pub use press::{FigureStore, MarkdownDocument, Press, TypstDocument};
