//! Brings everything together: one set of sentences and figures, several documents.

use std::sync::Arc;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use minijinja::value::{Serde, Value};
use serde::Serialize;
use sha2::{Digest, Sha256};

use super::error::RenderError;
use super::faces::Face;
use super::labels::{Labels, draw};
use super::pdf::{self, FontSet, Job};
use super::png;
use super::templates::{Templates, asset};
use crate::bibliography::Bibliography;
use crate::plan::Plan;
use crate::report::locale::Locale;
use crate::report::{self, AttachmentView, ExperimentView, FigureView, Report};

/// Pixels for each unit of a figure, when pictures of pixels are asked for.
const PIXELS: f32 = 2.0;

/// A plan that is ready to be printed: sentences written, figures drawn.
pub struct Press<'a> {
    bibliography: Arc<Bibliography>,
    locale: &'static Locale,
    report: Report<'a>,
}

/// A Typst document with the files that it reads.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TypstDocument {
    /// The main source.
    pub main: String,
    /// Path and content of each further file.
    pub files: Vec<(String, Vec<u8>)>,
}

/// A Markdown document with its figures.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct MarkdownDocument {
    /// The text.
    pub text: String,
    /// Path relative to the document, and content, of each figure.
    pub figures: Vec<(String, Vec<u8>)>,
}

/// A figure beside a Markdown document, as its front matter names it.
#[derive(Serialize)]
struct FigureFile {
    name: String,
    sha256: String,
}

/// Where a Markdown document keeps its figures.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FigureStore {
    /// Name of the folder beside the document; `None` puts them into the document itself.
    pub folder: Option<String>,
    /// PNG instead of SVG.
    pub pixels: bool,
}

impl FigureStore {
    /// The format, as a file extension.
    pub fn extension(&self) -> &'static str {
        if self.pixels { "png" } else { "svg" }
    }

    fn inline(&self, bytes: &[u8]) -> String {
        let kind = if self.pixels { "png" } else { "svg+xml" };
        format!("data:image/{kind};base64,{}", STANDARD.encode(bytes))
    }
}

impl<'a> Press<'a> {
    /// Writes the sentences and draws the figures.
    ///
    /// # Errors
    ///
    /// An unknown language, a broken template, a figure that cannot be drawn.
    pub fn new(
        plan: &'a Plan,
        attachments: Vec<AttachmentView>,
        bibliography: Bibliography,
    ) -> Result<Self, RenderError> {
        let locale = Locale::of(&plan.language)
            .ok_or_else(|| RenderError::Language(plan.language.clone()))?;
        let bibliography = Arc::new(bibliography);
        let mut report = report::build(plan, locale, attachments);
        let plain = Templates::new(Face::Text, locale, &bibliography)?;
        let plan_value = Value::from(Serde(plan));
        for experiment in &mut report.experiments {
            write_sentences(experiment, &plan_value, &plain, locale)?;
        }
        Ok(Self { bibliography, locale, report })
    }

    /// The statements to paste, one for each experiment.
    pub fn statements(&self) -> Vec<&str> {
        self.report.experiments.iter().map(|e| e.statement.as_str()).collect()
    }

    /// The document model.
    pub fn report(&self) -> &Report<'a> {
        &self.report
    }

    /// What the terminal shows.
    ///
    /// # Errors
    ///
    /// A broken template.
    pub fn summary(&self) -> Result<String, RenderError> {
        let templates = Templates::new(Face::Text, self.locale, &self.bibliography)?;
        templates.render("summary.j2", &Value::from(Serde(&self.report)))
    }

    /// The Typst source with everything that it reads.
    ///
    /// # Errors
    ///
    /// A broken template.
    pub fn typst(&self) -> Result<TypstDocument, RenderError> {
        let templates = Templates::new(Face::Typst, self.locale, &self.bibliography)?;
        let main = templates.render("document.j2", &Value::from(Serde(&self.report)))?;
        let style = asset("faces/typst/style.typ").unwrap_or_default().to_vec();
        let mut files = vec![("style.typ".to_owned(), style)];
        for attachment in &self.report.inputs.attachments {
            files.push((attachment.path.clone(), attachment.bytes.clone()));
        }
        for figure in self.figures() {
            files.push((figure.path.clone(), figure.svg.clone().into_bytes()));
        }
        Ok(TypstDocument { main, files })
    }

    /// The PDF.
    ///
    /// # Errors
    ///
    /// A broken template, a character that no font has, or a refusal by the typesetter.
    pub fn pdf(&self, fonts: &FontSet) -> Result<Vec<u8>, RenderError> {
        let TypstDocument { main, files } = self.typst()?;
        let date = self.report.plan.date;
        let date = (date.year, date.month, date.day);
        Ok(pdf::pdf(&Job { main: &main, files, date, fonts })?)
    }

    /// The Markdown, its figures stored as asked.
    ///
    /// # Errors
    ///
    /// A broken template, or a figure that cannot be turned into pixels.
    pub fn markdown(&self, store: &FigureStore) -> Result<MarkdownDocument, RenderError> {
        let templates = Templates::new(Face::Markdown, self.locale, &self.bibliography)?;
        let mut figures = Vec::new();
        let mut files = Vec::new();
        let mut paths = Vec::new();
        for figure in self.figures() {
            let bytes = match store.pixels {
                true => png::png(&figure.svg, PIXELS, &FontSet::embedded())?,
                false => figure.svg.clone().into_bytes(),
            };
            match &store.folder {
                Some(folder) => {
                    let name = format!("{}.{}", figure_name(figure), store.extension());
                    let path = format!("{folder}/{name}");
                    paths.push(path.clone());
                    let sha256 =
                        Sha256::digest(&bytes).iter().map(|b| format!("{b:02x}")).collect();
                    files.push(FigureFile { name, sha256 });
                    figures.push((path, bytes));
                }
                None => paths.push(store.inline(&bytes)),
            }
        }
        let mut context = serde_json::to_value(&self.report).map_err(RenderError::Plan)?;
        relocate(&mut context, paths);
        let context = minijinja::context! {
            figures_folder => store.folder.as_deref().unwrap_or(""),
            figure_format => store.extension(),
            figure_files => Value::from(Serde(files)),
            ..Value::from(Serde(context))
        };
        Ok(MarkdownDocument { text: tidy(&templates.render("document.j2", &context)?), figures })
    }

    fn figures(&self) -> impl Iterator<Item = &FigureView> {
        self.report.experiments.iter().flat_map(|e| &e.figures)
    }
}

fn write_sentences(
    experiment: &mut ExperimentView<'_>,
    plan: &Value,
    plain: &Templates,
    locale: &'static Locale,
) -> Result<(), RenderError> {
    let context = minijinja::context! { e => Value::from(Serde(&*experiment)), plan => plan };
    let statement = one_line(&plain.render("statement.j2", &context)?);
    experiment.statement_characters = statement.chars().count();
    experiment.statement_words = statement.split([' ', '\u{a0}']).filter(|w| !w.is_empty()).count();
    experiment.statement = statement;
    let labels = Labels::read(&plain.render("figures.j2", &context)?);
    for figure in draw(experiment.plan, &labels, locale)? {
        let path = format!("figures/{}-{}.svg", experiment.number, figure.kind);
        experiment.figures.push(FigureView { path, ..figure });
    }
    Ok(())
}

fn figure_name(figure: &FigureView) -> &str {
    let name = figure.path.rsplit('/').next().unwrap_or(&figure.path);
    name.strip_suffix(".svg").unwrap_or(name)
}

/// Points the figures of a serialised report at other places.
fn relocate(report: &mut serde_json::Value, paths: Vec<String>) {
    let mut paths = paths.into_iter();
    let experiments = report.get_mut("experiments").and_then(|e| e.as_array_mut());
    for experiment in experiments.into_iter().flatten() {
        let figures = experiment.get_mut("figures").and_then(|f| f.as_array_mut());
        for path in figures.into_iter().flatten().filter_map(|f| f.get_mut("path")) {
            *path = paths.next().unwrap_or_default().into();
        }
    }
}

/// White space of templates is layout of their source, not of the sentence.
pub(super) fn one_line(text: &str) -> String {
    text.split([' ', '\n', '\r', '\t'])
        .filter(|word| !word.is_empty())
        .collect::<Vec<_>>()
        .join(" ")
}

/// Never more than one empty line in a row, no white space at line ends.
fn tidy(text: &str) -> String {
    let mut tidied = String::with_capacity(text.len());
    let mut fence: Option<String> = None;
    let mut empty = true;
    for line in text.lines() {
        let ticks: String = line.chars().take_while(|c| *c == '`').collect();
        match &fence {
            Some(open) => {
                tidied.push_str(line);
                tidied.push('\n');
                if ticks.len() >= open.len() && line.trim_end() == ticks {
                    fence = None;
                    empty = false;
                }
                continue;
            }
            None if ticks.len() >= 3 => fence = Some(ticks),
            None => {}
        }
        let line = line.trim_end();
        if !(line.is_empty() && empty) {
            tidied.push_str(line);
            tidied.push('\n');
        }
        empty = line.is_empty();
    }
    tidied
}
