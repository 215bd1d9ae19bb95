//! What a document says, independent of how it looks: the plan, dressed with what the templates need to speak of it.
//!
//! No number is computed here beyond counting, and no sentence is written: sentences stand in `report_templates/`.

pub mod build;
pub mod checklist;
pub mod figures;
pub mod locale;

use serde::Serialize;

use crate::plan::{ExperimentPlan, Fingerprints, Plan};
use crate::study::Purpose;

pub use build::build;
pub use checklist::ChecklistRow;

/// The document model: the only thing that templates see.
#[derive(Debug, Serialize)]
pub struct Report<'a> {
    /// The plan with its numbers.
    pub plan: &'a Plan,
    /// What the document is for.
    pub purpose: Purpose,
    /// The date in words.
    pub date: String,
    /// The experiments, dressed.
    pub experiments: Vec<ExperimentView<'a>>,
    /// Which item of which guideline is answered where.
    pub checklist: Vec<ChecklistRow>,
    /// The inputs as they travel with the document.
    pub inputs: InputsView<'a>,
    /// Version of the program.
    pub version: &'static str,
}

/// An experiment as the templates see it.
#[derive(Debug, Serialize)]
pub struct ExperimentView<'a> {
    /// The solved experiment.
    #[serde(flatten)]
    pub plan: &'a ExperimentPlan,
    /// Position from 1.
    pub number: usize,
    /// Decimals for computed values in the unit of the outcome.
    pub decimals: usize,
    /// Decimals for the effects of the table of sizes.
    pub table_decimals: usize,
    /// Whether all groups have the same size in the analysis.
    pub even: bool,
    /// Whether all groups have the same size at the start.
    pub even_start: bool,
    /// Figures of this experiment, filled in when they are drawn.
    pub figures: Vec<FigureView>,
    /// The statement to paste, filled in when it is written.
    pub statement: String,
    /// Its length in characters.
    pub statement_characters: usize,
    /// Its length in words.
    pub statement_words: usize,
}

/// A drawn figure.
#[derive(Debug, Clone, Serialize)]
pub struct FigureView {
    /// `power` or `contour`.
    pub kind: &'static str,
    /// Path of the file, relative to the document.
    pub path: String,
    /// What it shows for this study, in a sentence; also its alternative text.
    pub sentence: String,
    /// The drawing.
    #[serde(skip)]
    pub svg: String,
}

/// The inputs as they travel with the document.
#[derive(Debug, Serialize)]
pub struct InputsView<'a> {
    /// Hashes.
    pub fingerprints: &'a Fingerprints,
    /// First digits of the spec's hash.
    pub short_hash: String,
    /// The spec as text, line by line.
    pub spec_lines: Vec<String>,
    /// Each input as an attachment.
    pub attachments: Vec<AttachmentView>,
    /// Name of the spec's file.
    pub spec_name: String,
}

/// An input that is attached to the PDF.
#[derive(Debug, Clone, Serialize)]
pub struct AttachmentView {
    /// Name of the file.
    pub name: String,
    /// Path inside the typesetter's world.
    pub path: String,
    /// MIME type.
    pub mime: &'static str,
    /// `spec`, `data`, `references` or `plan`.
    pub role: &'static str,
    /// The relationship that PDF/A-3 asks for: `source`, `data` or `supplement`.
    pub relationship: &'static str,
    /// SHA-256 of the content.
    pub sha256: String,
    /// The block in which Markdown carries it; empty when it does not.
    pub block: String,
    /// The content.
    #[serde(skip)]
    pub bytes: Vec<u8>,
}
