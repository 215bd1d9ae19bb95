//! What can go wrong between Typst source and PDF, in words.

use std::fmt;

use typst::diag::{Severity as TypstSeverity, SourceDiagnostic};
use typst::syntax::{DiagSpan, Lines};
use typst::{World, WorldExt};

use super::world::MemoryWorld;

/// Lines of source longer than this are cut in an excerpt.
const EXCERPT_CHARACTERS: usize = 160;

/// So many characters are named in a message; a text in a foreign script may hold
/// hundreds.
const CHARACTERS_NAMED: usize = 12;

/// Why a job gave no PDF.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum TypstError {
    /// No font of the set has these characters.
    #[error("{}", missing_sentence(.characters))]
    MissingGlyphs {
        /// The characters, in order of code point, each once.
        characters: Vec<char>,
    },
    /// Archival PDF forbids these characters.
    #[error("{}", forbidden_sentence(.characters))]
    ForbiddenCharacters {
        /// The characters, in order of code point, each once.
        characters: Vec<char>,
    },
    /// Typst refused the source, or its output breaks a PDF standard: a fault of
    /// the template, not of the user's input.
    #[error("{}", joined(.diagnostics))]
    Refused {
        /// What Typst said, errors only.
        diagnostics: Vec<Diagnostic>,
        /// Warnings given before the refusal.
        warnings: Vec<Diagnostic>,
    },
    /// A virtual path leaves the document's own files or holds a backslash.
    #[error("`{path}` is not a path inside the document")]
    Path {
        /// The path as it was given.
        path: String,
    },
    /// Two files of one job share a path.
    #[error("two files of the document share the path `{path}`")]
    SamePathTwice {
        /// The shared path.
        path: String,
    },
    /// The date is not in the calendar.
    #[error("{year:04}-{month:02}-{day:02} is not a date")]
    Date {
        /// Year.
        year: u16,
        /// Month.
        month: u8,
        /// Day.
        day: u8,
    },
}

/// How grave a [`Diagnostic`] is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Severity {
    /// No document came out.
    Error,
    /// A document came out, but something in its source is doubtful.
    Warning,
}

/// One remark of Typst's, with the place it speaks of.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Diagnostic {
    /// How grave it is.
    pub severity: Severity,
    /// Typst's sentence.
    pub message: String,
    /// The place, unless the remark is about the document as a whole.
    pub place: Option<Place>,
    /// Ways out.
    pub hints: Vec<String>,
    /// The calls that led there, innermost first.
    pub trace: Vec<String>,
}

/// A place in a source file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// Virtual path.
    pub file: String,
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// The line's text, cut when long.
    pub excerpt: String,
}

impl Diagnostic {
    pub(super) fn new(world: &MemoryWorld, source: &SourceDiagnostic) -> Self {
        let trace = source.trace.iter().map(|point| {
            let place = Place::find(world, point.span.into());
            match place {
                Some(place) => format!("{} ({}:{})", point.v, place.file, place.line),
                None => point.v.to_string(),
            }
        });
        Self {
            severity: match source.severity {
                TypstSeverity::Error => Severity::Error,
                TypstSeverity::Warning => Severity::Warning,
            },
            message: source.message.to_string(),
            place: Place::find(world, source.span),
            hints: source.hints.iter().map(|hint| hint.v.to_string()).collect(),
            trace: trace.collect(),
        }
    }

    pub(super) fn all(world: &MemoryWorld, sources: &[SourceDiagnostic]) -> Vec<Self> {
        sources.iter().map(|one| Self::new(world, one)).collect()
    }
}

impl Place {
    fn find(world: &MemoryWorld, span: DiagSpan) -> Option<Self> {
        let id = span.id()?;
        let range = world.range(span)?;
        let lines = match world.source(id) {
            Ok(source) => source.lines().clone(),
            Err(_) => {
                let data = world.file(id).ok()?;
                Lines::new(String::from_utf8_lossy(&data).into_owned())
            }
        };
        let (line, column) = lines.byte_to_line_column(range.start)?;
        let text = lines.text().get(lines.line_to_range(line)?)?.trim_end();
        let visible = |c: char| {
            if c.is_control() { char::REPLACEMENT_CHARACTER } else { c }
        };
        let mut excerpt: String = text.chars().take(EXCERPT_CHARACTERS).map(visible).collect();
        if text.chars().nth(EXCERPT_CHARACTERS).is_some() {
            excerpt.push('…');
        }
        Some(Self {
            file: id.vpath().get_without_slash().to_owned(),
            line: line + 1,
            column: column + 1,
            excerpt,
        })
    }
}

impl fmt::Display for Diagnostic {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let word = match self.severity {
            Severity::Error => "error",
            Severity::Warning => "warning",
        };
        write!(f, "{word}: {}", self.message)?;
        if let Some(place) = &self.place {
            let number = place.line.to_string();
            write!(
                f,
                "\n  in {} at {number}:{}\n  {number} | {}",
                place.file, place.column, place.excerpt
            )?;
        }
        for step in &self.trace {
            write!(f, "\n  {step}")?;
        }
        for hint in &self.hints {
            write!(f, "\n  hint: {hint}")?;
        }
        Ok(())
    }
}

fn joined(diagnostics: &[Diagnostic]) -> String {
    let lines: Vec<String> = diagnostics.iter().map(Diagnostic::to_string).collect();
    lines.join("\n")
}

fn missing_sentence(characters: &[char]) -> String {
    let (noun, pronoun) = number(characters);
    let list = listed(characters, |c| format!("{c} (U+{:04X})", u32::from(c)));
    format!(
        "no font has the {noun} {list}; \
         name a folder with a font that has {pronoun} by `--fonts FOLDER`"
    )
}

/// Such characters are invisible or harmful on a terminal: only their code points
/// are shown.
fn forbidden_sentence(characters: &[char]) -> String {
    let (noun, pronoun) = number(characters);
    let list = listed(characters, |c| format!("U+{:04X}", u32::from(c)));
    format!("an archival PDF may not hold the {noun} {list}; take {pronoun} out of the text")
}

fn number(characters: &[char]) -> (&'static str, &'static str) {
    match characters.len() {
        1 => ("character", "it"),
        _ => ("characters", "them"),
    }
}

fn listed(characters: &[char], name: impl Fn(char) -> String) -> String {
    let shown = characters.iter().take(CHARACTERS_NAMED).map(|&c| name(c));
    let mut list = shown.collect::<Vec<String>>().join(", ");
    let rest = characters.len().saturating_sub(CHARACTERS_NAMED);
    if rest > 0 {
        list.push_str(&format!(" and {rest} more"));
    }
    list
}
