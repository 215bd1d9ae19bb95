//! From the engine's tree of elements to a flat list of styled pieces.

use hayagriva::citationberg::{FontStyle, FontWeight};
use hayagriva::{Elem, ElemChild, ElemChildren, ElemMeta, Formatting};
use serde::Serialize;

/// A piece of text in one style.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Run {
    /// The text, as data: it may hold characters that a markup language reads as commands.
    pub text: String,
    /// Whether it is set in italics.
    pub italic: bool,
    /// Whether it is set in bold.
    pub bold: bool,
    /// Where it leads to, an `http` or `https` address.
    pub url: Option<String>,
}

/// The pieces of a reference, neighbours of one style joined, no space at either end.
pub(super) fn flatten(content: &ElemChildren) -> Vec<Run> {
    let mut out = Vec::new();
    children(content, &mut out);
    if let Some(first) = out.first_mut() {
        first.text = first.text.trim_start().to_owned();
    }
    if let Some(last) = out.last_mut() {
        last.text.truncate(last.text.trim_end().len());
    }
    out.retain(|run| !run.text.is_empty());
    out
}

fn children(content: &ElemChildren, out: &mut Vec<Run>) {
    let mut after_date = false;
    for child in &content.0 {
        match child {
            ElemChild::Text(text) => {
                let piece = mend(out, &text.text, after_date);
                push(out, piece, &text.formatting, None);
            }
            ElemChild::Elem(Elem { children: inner, .. }) => children(inner, out),
            // A formula in a title is shown as it was typed.
            ElemChild::Markup(source) => {
                push(out, &format!("${source}$"), &Formatting::default(), None);
            }
            ElemChild::Link { text, url } => {
                push(out, &text.text, &text.formatting, address(url));
            }
            ElemChild::Transparent { .. } => {}
        }
        after_date = matches!(child, ElemChild::Elem(elem) if elem.meta == Some(ElemMeta::Date));
    }
}

/// The style's punctuation without its two slips: a space before the semicolon after a date that has a year
/// alone, and a full stop after a title that ends in a question or exclamation mark.
fn mend<'a>(out: &mut [Run], piece: &'a str, after_date: bool) -> &'a str {
    let Some(last) = out.last_mut() else {
        return piece;
    };
    if after_date && piece.starts_with(';') {
        last.text.truncate(last.text.trim_end().len());
    }
    match piece.strip_prefix('.') {
        Some(rest) if last.text.ends_with(['?', '!']) => rest,
        _ => piece,
    }
}

fn push(out: &mut Vec<Run>, text: &str, formatting: &Formatting, url: Option<String>) {
    let italic = formatting.font_style == FontStyle::Italic;
    let bold = formatting.font_weight == FontWeight::Bold;
    match out.last_mut() {
        Some(last) if last.italic == italic && last.bold == bold && last.url == url => {
            last.text.push_str(text);
        }
        _ => out.push(Run { text: text.to_owned(), italic, bold, url }),
    }
}

/// The address with every character percent-encoded that RFC 3986 does not allow in one; no link at all for
/// any scheme but `http` and `https`.
fn address(url: &str) -> Option<String> {
    if !is_web_address(url) {
        return None;
    }
    let mut out = String::with_capacity(url.len());
    for byte in url.bytes() {
        if byte.is_ascii_alphanumeric() || b"-._~:/?#@!$&'()*+,;=%".contains(&byte) {
            out.push(char::from(byte));
        } else {
            out.push_str(&format!("%{byte:02X}"));
        }
    }
    Some(out)
}

/// Whether the address begins with `http://` or `https://` and names a host.
pub(super) fn is_web_address(url: &str) -> bool {
    ["http://", "https://"].iter().any(|scheme| {
        url.get(..scheme.len()).is_some_and(|start| start.eq_ignore_ascii_case(scheme))
            && url.len() > scheme.len()
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn addresses_keep_the_web_schemes_only_and_are_encoded() {
        assert_eq!(
            address("https://doi.org/10.1002/(SICI)1<873::AID>3.0"),
            Some("https://doi.org/10.1002/(SICI)1%3C873::AID%3E3.0".to_owned())
        );
        assert_eq!(address("javascript:alert(1)"), None);
        assert_eq!(address("file:///etc/passwd"), None);
        assert_eq!(
            address("https://a.example/\"é"),
            Some("https://a.example/%22%C3%A9".to_owned())
        );
    }
}
