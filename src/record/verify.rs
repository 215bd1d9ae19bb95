//! Takes the inputs out of a document, recomputes everything, and says for each step whether it agrees.

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
use crate::spec::{self, InputFile, Loaded, MemoryFolder};

/// One step of a verification.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Finding {
    /// What was looked at.
    pub what: &'static str,
    /// Whether it agrees.
    pub verdict: Verdict,
    /// What was found.
    pub detail: String,
}

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
        Self { what, verdict, detail }
    }
}

/// What a document says of itself.
struct Claims {
    version: String,
    /// SHA-256 of each input, by name; the spec has the empty name.
    hashes: BTreeMap<String, String>,
    plan: ClaimedPlan,
    store: Option<FigureStore>,
}

enum ClaimedPlan {
    Text(Vec<u8>),
    Sha256(String),
}

/// Verifies a PDF or a Markdown.
///
/// # Errors
///
/// A file that is neither, or whose attachments cannot be read. A disagreement is no error but a finding.
pub fn verify(
    document: &[u8],
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
            findings.push(Finding::new("numbers", false, "", detail.trim_end()));
            return Ok(findings);
        }
    };
    let plan = match documents::solve(&loaded, progress) {
        Ok(plan) => plan,
        Err(error) => {
            findings.push(Finding::new("numbers", false, "", error.to_string()));
            return Ok(findings);
        }
    };
    findings.push(numbers(&plan, &claims)?);
    findings.push(rendered(document, is_pdf, &loaded, &plan, &claims, fonts)?);
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

fn numbers(plan: &Plan, claims: &Claims) -> Result<Finding, Error> {
    let json = documents::plan_json(plan).map_err(crate::render::RenderError::Plan)?;
    let agrees = match &claims.plan {
        ClaimedPlan::Text(bytes) => bytes == json.as_bytes(),
        ClaimedPlan::Sha256(hash) => *hash == sha256_hex(json.as_bytes()),
    };
    Ok(Finding::new(
        "numbers",
        agrees,
        "the recomputed plan equals the document's",
        "the recomputed plan is not the document's",
    ))
}

fn rendered(
    document: &[u8],
    is_pdf: bool,
    loaded: &Loaded,
    plan: &Plan,
    claims: &Claims,
    fonts: &FontSet,
) -> Result<Finding, Error> {
    let press = documents::press(loaded, plan)?;
    let again = match (&claims.store, is_pdf) {
        (_, true) => press.pdf(fonts)?,
        (Some(store), false) => press.markdown(store)?.text.into_bytes(),
        (None, false) => Vec::new(),
    };
    let place = again.iter().zip(document).position(|(a, b)| a != b);
    let place = place.unwrap_or(again.len().min(document.len()));
    Ok(Finding::new(
        "document",
        again == document,
        "rendered again, byte for byte",
        format!("rendered again, it differs from byte {place} on"),
    ))
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
    Ok((markdown::extract(text)?, claims))
}
