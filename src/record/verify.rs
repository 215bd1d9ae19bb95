//! Takes the inputs out of a document, recomputes everything, and says for each step whether it agrees.

mod difference;

use std::collections::BTreeMap;

use serde::Deserialize;

use super::documents::{self, PLAN_NAME};
use super::error::RecordError;
use super::hash::sha256_hex;
use super::{Attachment, markdown, pdf_attachments};
use crate::error::Error;
use crate::plan::Plan;
use crate::render::FigureStore;
use crate::render::pdf::FontSet;
use crate::solver::Progress;
use crate::spec::{self, InputFile, Loaded, MemoryFolder, printable};

/// One step of a verification.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Finding {
    /// What was looked at.
    pub what: &'static str,
    /// Whether it agrees.
    pub verdict: Verdict,
    /// What was found, in one line or more, safe to print on a terminal.
    pub detail: String,
}

/// Characters of a line of a detail; more come only from a document that was made to annoy.
const LONGEST_LINE: usize = 2000;

/// Whether a step agrees.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// It agrees.
    Agrees,
    /// It does not, or it could not be done because an earlier step failed.
    Differs,
}

impl Finding {
    /// Whether the step agrees.
    pub fn is_good(&self) -> bool {
        self.verdict == Verdict::Agrees
    }

    fn new(
        what: &'static str,
        agrees: bool,
        good: impl Into<String>,
        bad: impl Into<String>,
    ) -> Self {
        let (verdict, detail) = match agrees {
            true => (Verdict::Agrees, good.into()),
            false => (Verdict::Differs, bad.into()),
        };
        // Names and versions come from the document, and end up on a terminal.
        let lines: Vec<_> = detail.lines().map(|line| printable(line, LONGEST_LINE)).collect();
        Self { what, verdict, detail: lines.join("\n") }
    }
}

/// What a document says of itself.
struct Claims {
    version: String,
    /// SHA-256 of each input, by name; the spec has the empty name.
    hashes: BTreeMap<String, String>,
    plan: ClaimedPlan,
    /// Where a Markdown keeps its figures; a PDF has none.
    store: Option<FigureStore>,
}

enum ClaimedPlan {
    Text(Vec<u8>),
    Sha256(String),
}

/// Gives the content of a file in a folder beside the document, by a path of two names parted by `/`.
pub type Beside<'a> = dyn Fn(&str) -> std::io::Result<Vec<u8>> + 'a;

/// Verifies a PDF or a Markdown, and the figures beside the Markdown.
///
/// # Errors
///
/// A file that is neither, or whose attachments cannot be read. A disagreement is no error but a finding.
pub fn verify(
    document: &[u8],
    beside: &Beside<'_>,
    fonts: &FontSet,
    progress: &dyn Progress,
) -> Result<Vec<Finding>, Error> {
    let is_pdf = document.starts_with(b"%PDF");
    let (files, claims) = if is_pdf { from_pdf(document)? } else { from_markdown(document)? };
    let mut findings = Vec::new();
    let Some(spec) = files.iter().find(|file| file.role == "spec") else {
        return Err(RecordError::NoSpec.into());
    };
    let names: Vec<_> =
        files.iter().filter(|f| f.role != "plan").map(|f| f.name.as_str()).collect();
    findings.push(Finding::new("inputs", true, names.join(", "), ""));
    findings.push(hashes(&files, &claims));
    let same_version = claims.version == env!("CARGO_PKG_VERSION");
    findings.push(Finding::new(
        "program version",
        same_version,
        claims.version.clone(),
        format!("made by {}, this is {}", claims.version, env!("CARGO_PKG_VERSION")),
    ));
    let loaded = match load(spec, &files) {
        Ok(loaded) => loaded,
        Err(error) => {
            let detail = format!("cannot be recomputed: {error}");
            findings.push(Finding::new("plan", false, "", detail.trim_end()));
            return Ok(findings);
        }
    };
    let plan = match documents::solve(&loaded, progress) {
        Ok(plan) => plan,
        Err(error) => {
            findings.push(Finding::new("plan", false, "", error.to_string()));
            return Ok(findings);
        }
    };
    findings.push(same_plan(&plan, &claims)?);
    let press = documents::press(&loaded, &plan)?;
    match &claims.store {
        None => findings.push(same_pdf(document, &press.pdf(fonts)?)),
        Some(store) => {
            let again = press.markdown(store)?;
            findings.push(same_markdown(document, &again.text));
            let folder = store.folder.as_deref();
            findings.extend(folder.map(|folder| same_figures(folder, &again.figures, beside)));
        }
    }
    Ok(findings)
}

fn load(spec: &Attachment, files: &[Attachment]) -> Result<Loaded, spec::SpecProblems> {
    let others = files.iter().filter(|file| file.role == "data" || file.role == "references");
    let folder = MemoryFolder(others.map(|f| (f.name.clone(), f.bytes.clone())).collect());
    spec::load(InputFile { name: spec.name.clone(), bytes: spec.bytes.clone() }, &folder)
}

fn hashes(files: &[Attachment], claims: &Claims) -> Finding {
    let mut wrong = Vec::new();
    let mut stated = claims.hashes.clone();
    for file in files.iter().filter(|file| file.role != "plan") {
        let key = if file.role == "spec" { "" } else { file.name.as_str() };
        match stated.remove(key) {
            Some(hash) if hash == sha256_hex(&file.bytes) => {}
            Some(_) => wrong.push(format!("{} was altered", file.name)),
            None => wrong.push(format!("{} is not the document's own", file.name)),
        }
    }
    wrong.extend(stated.keys().map(|name| format!("{name} is missing")));
    Finding::new("hashes", wrong.is_empty(), "SHA-256 of every input as stated", wrong.join("; "))
}

fn same_plan(plan: &Plan, claims: &Claims) -> Result<Finding, Error> {
    let json = documents::plan_json(plan).map_err(crate::render::RenderError::Plan)?;
    let agrees = match &claims.plan {
        ClaimedPlan::Text(bytes) => bytes == json.as_bytes(),
        ClaimedPlan::Sha256(hash) => *hash == sha256_hex(json.as_bytes()),
    };
    Ok(Finding::new(
        "plan",
        agrees,
        "the recomputed plan equals the document's",
        "the recomputed plan is not the document's",
    ))
}

/// Another build may render otherwise under the same version number, so a disagreement speaks of this program alone.
const AGAIN: &str = "rendered again by this program";

fn same_pdf(document: &[u8], again: &[u8]) -> Finding {
    let place = again.iter().zip(document).position(|(a, b)| a != b);
    let place = place.unwrap_or(again.len().min(document.len()));
    Finding::new(
        "document",
        again == document,
        format!("{AGAIN}, it is the same byte for byte"),
        format!("{AGAIN}, it differs from byte {place} on"),
    )
}

fn same_markdown(document: &[u8], again: &str) -> Finding {
    let wrong = difference::of_markdown(&String::from_utf8_lossy(document), again);
    Finding::new(
        "document",
        wrong.is_none() && document == again.as_bytes(),
        format!("{AGAIN}, it is the same byte for byte"),
        format!("{AGAIN}: {}", wrong.unwrap_or_default()),
    )
}

fn same_figures(folder: &str, again: &[(String, Vec<u8>)], beside: &Beside<'_>) -> Finding {
    let wrong = difference::of_figures(folder, again, beside);
    let count = again.len();
    let several = if count == 1 { "file" } else { "files" };
    Finding::new(
        "figures",
        wrong.is_empty(),
        format!("{count} {several} in {folder}, the same byte for byte"),
        wrong.join("; "),
    )
}

#[derive(Deserialize)]
struct PlanHead {
    program_version: String,
    fingerprints: PrintsHead,
}

#[derive(Deserialize)]
struct PrintsHead {
    spec: PrintHead,
    files: Vec<PrintHead>,
}

#[derive(Deserialize)]
struct PrintHead {
    name: String,
    sha256: String,
}

fn from_pdf(document: &[u8]) -> Result<(Vec<Attachment>, Claims), RecordError> {
    let mut files = pdf_attachments::attachments(document)?;
    let plan = files.iter().find(|file| file.name == PLAN_NAME).ok_or(RecordError::NoPlan)?;
    let head: PlanHead = serde_json::from_slice(&plan.bytes).map_err(|_| RecordError::NoPlan)?;
    let mut hashes: BTreeMap<_, _> =
        head.fingerprints.files.iter().map(|p| (p.name.clone(), p.sha256.clone())).collect();
    hashes.insert(String::new(), head.fingerprints.spec.sha256);
    let plan = ClaimedPlan::Text(plan.bytes.clone());
    for file in &mut files {
        file.role = match file.name.as_str() {
            PLAN_NAME => "plan",
            name if name == head.fingerprints.spec.name => "spec",
            _ => "data",
        }
        .to_owned();
    }
    Ok((files, Claims { version: head.program_version, hashes, plan, store: None }))
}

fn from_markdown(document: &[u8]) -> Result<(Vec<Attachment>, Claims), RecordError> {
    let text = std::str::from_utf8(document).map_err(|_| RecordError::NeitherPdfNorMarkdown)?;
    // Changed line ends are a finding, and must not hide the others.
    let text = text.replace("\r\n", "\n");
    let matter = text
        .strip_prefix("---\n")
        .and_then(|rest| rest.split_once("\n---\n"))
        .map(|(matter, _)| matter)
        .filter(|matter| matter.len() < 1 << 20)
        .ok_or(RecordError::NeitherPdfNorMarkdown)?;
    let matter: serde_yaml::Value =
        serde_yaml::from_str(matter).map_err(|_| RecordError::NeitherPdfNorMarkdown)?;
    let own = matter.get("sufficit").ok_or(RecordError::NeitherPdfNorMarkdown)?;
    let word = |key: &str| own.get(key).and_then(|v| v.as_str()).unwrap_or_default().to_owned();
    let mut hashes = BTreeMap::from([(String::new(), word("spec-sha256"))]);
    for position in 1.. {
        let name = word(&format!("file-{position}"));
        if name.is_empty() {
            break;
        }
        hashes.insert(name, word(&format!("file-{position}-sha256")));
    }
    let folder = Some(word("figures")).filter(|folder| !folder.is_empty());
    let store = FigureStore { folder, pixels: word("figure-format") == "png" };
    let claims = Claims {
        version: word("version"),
        hashes,
        plan: ClaimedPlan::Sha256(word("plan-sha256")),
        store: Some(store),
    };
    Ok((markdown::extract(&text)?, claims))
}
