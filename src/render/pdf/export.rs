//! Laid-out pages to an archival, accessible PDF.

use sha2::{Digest, Sha256};
use typst::foundations::{Datetime, Smart};
use typst_pdf::{PdfOptions, PdfStandard, PdfStandards, Timestamp};

use super::Job;
use super::compile::{Compiled, compile};
use super::error::{Diagnostic, Severity, TypstError};

/// Name and version of the program, as the PDF's metadata give them.
const CREATOR: &str = concat!("Sufficit ", env!("CARGO_PKG_VERSION"));

/// Results that the last so many documents had no use for leave Typst's cache:
/// enough to reuse fonts and styles, too few for a long run to grow.
const DOCUMENTS_REMEMBERED: usize = 3;

/// The bytes of a tagged PDF that conforms to PDF/A-3a (ISO 19005-3) and
/// PDF/UA-1 (ISO 14289-1) together.
///
/// For both standards the source must set a title and alternative texts; each
/// `pdf.attach` needs `description` and `mime-type`. Typst checks all of it and
/// refuses what does not conform. Equal jobs give equal bytes.
///
/// # Errors
///
/// Those of [`compile`] and of [`export`].
pub fn pdf(job: &Job<'_>) -> Result<Vec<u8>, TypstError> {
    export(job, &compile(job)?)
}

/// Writes `compiled`, which must come from the same `job`, as [`pdf`] does.
///
/// # Errors
///
/// * [`TypstError::Date`] when the job's date is not in the calendar.
/// * [`TypstError::Refused`] when the document breaks one of the two standards.
pub fn export(job: &Job<'_>, compiled: &Compiled) -> Result<Vec<u8>, TypstError> {
    let options = PdfOptions {
        ident: Smart::Custom(identity(job)),
        creator: Smart::Custom(Some(CREATOR.to_owned())),
        timestamp: Some(timestamp(job.date)?),
        page_ranges: None,
        standards: standards()?,
        tagged: true,
        pretty: false,
    };
    let outcome = typst_pdf::pdf(&compiled.document, &options);
    comemo::evict(DOCUMENTS_REMEMBERED);
    outcome.map_err(|errors| TypstError::Refused {
        diagnostics: Diagnostic::all(&compiled.world, &errors),
        warnings: compiled.warnings.clone(),
    })
}

/// Noon UTC of the day: a well-formed PDF date needs an hour and a zone, which no
/// author gives, and noon keeps the day when a reader shows it in local time.
fn timestamp((year, month, day): (u16, u8, u8)) -> Result<Timestamp, TypstError> {
    Datetime::from_ymd_hms(i32::from(year), month, day, 12, 0, 0)
        .map(Timestamp::new_utc)
        .ok_or(TypstError::Date { year, month, day })
}

fn standards() -> Result<PdfStandards, TypstError> {
    PdfStandards::new(&[PdfStandard::A_3a, PdfStandard::Ua_1]).map_err(|problem| {
        TypstError::Refused {
            diagnostics: vec![Diagnostic {
                severity: Severity::Error,
                message: problem.message().to_string(),
                place: None,
                hints: problem.hints().iter().map(ToString::to_string).collect(),
                trace: Vec::new(),
            }],
            warnings: Vec::new(),
        }
    })
}

/// The PDF's document identifier: a digest of all that goes into the document.
/// Each part is preceded by its length, so that no two lists of parts look alike.
fn identity(job: &Job<'_>) -> String {
    let mut digest = Sha256::new();
    let mut add = |part: &[u8]| {
        digest.update((part.len() as u64).to_le_bytes());
        digest.update(part);
    };
    add(job.main.as_bytes());
    for (path, data) in &job.files {
        add(path.as_bytes());
        add(data);
    }
    let (year, month, day) = job.date;
    add(format!("{year:04}-{month:02}-{day:02}").as_bytes());
    digest.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
}
