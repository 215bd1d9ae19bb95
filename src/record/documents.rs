//! From loaded inputs to a plan and to a press that prints it.

use super::hash::sha256_hex;
use super::markdown::embed;
use crate::plan::{Fingerprint, Fingerprints, Plan};
use crate::render::{Press, RenderError};
use crate::report::AttachmentView;
use crate::solver::{self, Progress, SolverError};
use crate::spec::{InputFile, Inputs, Loaded};

/// Name under which the plan is attached to a PDF.
pub const PLAN_NAME: &str = "sufficit-plan.json";

/// Hashes of everything that was read.
pub fn fingerprints(inputs: &Inputs) -> Fingerprints {
    let print =
        |file: &InputFile| Fingerprint { name: file.name.clone(), sha256: sha256_hex(&file.bytes) };
    Fingerprints { spec: print(&inputs.spec), files: inputs.files.iter().map(print).collect() }
}

/// Solves what was loaded.
///
/// # Errors
///
/// As [`solver::solve`].
pub fn solve(loaded: &Loaded, progress: &dyn Progress) -> Result<Plan, SolverError> {
    solver::solve(&loaded.study, fingerprints(&loaded.inputs), progress)
}

/// The plan as JSON text, indented, with a line feed at the end; the same plan gives the same bytes.
///
/// # Errors
///
/// Only when a number is not finite, which a solved plan never holds.
pub fn plan_json(plan: &Plan) -> Result<String, serde_json::Error> {
    Ok(serde_json::to_string_pretty(plan)? + "\n")
}

/// A press for a plan, its inputs and the plan itself attached.
///
/// # Errors
///
/// As [`Press::new`].
pub fn press<'a>(loaded: &Loaded, plan: &'a Plan) -> Result<Press<'a>, RenderError> {
    let json = plan_json(plan).map_err(RenderError::Plan)?;
    let attachments = attachments(&loaded.inputs, json);
    Press::new(plan, attachments, loaded.bibliography.clone())
}

fn attachments(inputs: &Inputs, plan: String) -> Vec<AttachmentView> {
    let spec = input(&inputs.spec, "spec", "source");
    let files = inputs.files.iter().map(|file| input(file, role(&file.name), "data"));
    let plan = AttachmentView {
        name: PLAN_NAME.to_owned(),
        path: String::new(),
        mime: "application/json",
        role: "plan",
        relationship: "supplement",
        sha256: sha256_hex(plan.as_bytes()),
        block: String::new(),
        bytes: plan.into_bytes(),
    };
    let mut all: Vec<_> = std::iter::once(spec).chain(files).chain([plan]).collect();
    for (position, attachment) in all.iter_mut().enumerate() {
        attachment.path = format!("inputs/{position}");
    }
    all
}

fn input(file: &InputFile, role: &'static str, relationship: &'static str) -> AttachmentView {
    AttachmentView {
        name: file.name.clone(),
        path: String::new(),
        mime: mime(&file.name),
        role,
        relationship,
        sha256: sha256_hex(&file.bytes),
        block: embed(&file.name, role, &file.bytes),
        bytes: file.bytes.clone(),
    }
}

fn role(name: &str) -> &'static str {
    if is_yaml(name) { "references" } else { "data" }
}

fn mime(name: &str) -> &'static str {
    if is_yaml(name) { "application/yaml" } else { "text/csv" }
}

fn is_yaml(name: &str) -> bool {
    let extension = name.rsplit_once('.').map(|(_, extension)| extension.to_ascii_lowercase());
    matches!(extension.as_deref(), Some("yaml" | "yml"))
}
