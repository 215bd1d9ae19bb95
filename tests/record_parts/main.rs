//! The parts between a document's source and its proof: Typst to PDF, SVG to PNG,
//! and inputs read back out of PDF and Markdown.

mod attachments;
mod hostile_pdf;
mod made_pdf;
mod markdown;
mod pdf;
mod png;
mod sample;
#[path = "../shared/tools.rs"]
mod tools;
