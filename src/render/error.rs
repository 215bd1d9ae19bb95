//! Why a document could not be made.

use thiserror::Error;

use super::figures::FigureError;
use super::pdf::TypstError;
use super::png::PngError;

/// A failure of a renderer.
#[derive(Debug, Error)]
pub enum RenderError {
    /// A template does not parse, or asks for something that is not there.
    #[error("template {}", place(.0))]
    Template(#[from] minijinja::Error),
    /// Typst refused the source.
    #[error(transparent)]
    Typst(#[from] TypstError),
    /// A figure could not be drawn.
    #[error(transparent)]
    Figure(#[from] FigureError),
    /// A figure could not be turned into pixels.
    #[error(transparent)]
    Png(#[from] PngError),
    /// The plan could not be written as JSON.
    #[error("the plan could not be written as JSON: {0}")]
    Plan(serde_json::Error),
    /// The program has no templates in the language.
    #[error("there are no templates in the language `{0}`")]
    Language(String),
    /// A label of a figure is missing in the templates.
    #[error("the template `figures.j2` gives no text for `{0}`")]
    Label(&'static str),
}

fn place(error: &minijinja::Error) -> String {
    let mut text = format!("{}, line {}: ", error.name().unwrap_or("?"), error.line().unwrap_or(0));
    text.push_str(&error.to_string());
    let mut cause = std::error::Error::source(error);
    while let Some(inner) = cause {
        text.push_str(&format!("; {inner}"));
        cause = inner.source();
    }
    text
}
