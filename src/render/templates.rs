//! The templates: embedded, one environment for each face and language, undefined variables refused.

use std::collections::HashMap;
use std::sync::{Arc, Mutex, OnceLock};

use include_dir::{Dir, include_dir};
use minijinja::syntax::SyntaxConfig;
use minijinja::value::{Serde, Value, ValueKind};
use minijinja::{AutoEscape, Environment, Error, ErrorKind, UndefinedBehavior};

use super::error::RenderError;
use super::faces::{Face, typst_string};
use crate::bibliography::Bibliography;
use crate::report::locale::Locale;

static TEMPLATES: Dir<'static> = include_dir!("$CARGO_MANIFEST_DIR/report_templates");

/// Work that one rendering may do; far above what a report of 200 experiments needs.
const FUEL: u64 = 50_000_000;

/// Citations in the order of their first appearance.
#[derive(Debug, Default, Clone)]
pub struct Cited(Arc<Mutex<Vec<String>>>);

impl Cited {
    /// The number of a key, which is given the next one when it is new.
    fn number(&self, key: &str) -> usize {
        let mut keys = self.0.lock().unwrap_or_else(std::sync::PoisonError::into_inner);
        match keys.iter().position(|known| known == key) {
            Some(position) => position + 1,
            None => {
                keys.push(key.to_owned());
                keys.len()
            }
        }
    }

    fn keys(&self) -> Vec<String> {
        self.0.lock().unwrap_or_else(std::sync::PoisonError::into_inner).clone()
    }
}

/// The content of an embedded file that is no template.
pub fn asset(path: &str) -> Option<&'static [u8]> {
    TEMPLATES.get_file(path).map(include_dir::File::contents)
}

/// Templates of one face in one language.
pub struct Templates {
    environment: Environment<'static>,
}

impl Templates {
    /// Builds the environment. `bibliography` serves `citation_number` and `reference_entries`.
    ///
    /// # Errors
    ///
    /// A template that does not parse.
    pub fn new(
        face: Face,
        locale: &'static Locale,
        bibliography: &Arc<Bibliography>,
    ) -> Result<Self, RenderError> {
        let mut environment = base(face, locale)?;
        add_citations(&mut environment, bibliography);
        Ok(Self { environment })
    }

    /// Renders a template with a context.
    ///
    /// # Errors
    ///
    /// [`RenderError::Template`] with the file and line of the template.
    pub fn render(&self, name: &str, context: &Value) -> Result<String, RenderError> {
        let template = self.environment.get_template(name)?;
        Ok(template.render(context)?)
    }
}

/// The environment of a face and language without what belongs to one document, parsed once for the process.
fn base(face: Face, locale: &'static Locale) -> Result<Environment<'static>, RenderError> {
    type Known = Mutex<HashMap<(Face, &'static str), Environment<'static>>>;
    static KNOWN: OnceLock<Known> = OnceLock::new();
    let known = KNOWN.get_or_init(Known::default);
    let mut known = known.lock().unwrap_or_else(std::sync::PoisonError::into_inner);
    if let Some(environment) = known.get(&(face, locale.tag)) {
        return Ok(environment.clone());
    }
    let environment = parse(face, locale)?;
    known.insert((face, locale.tag), environment.clone());
    Ok(environment)
}

fn parse(face: Face, locale: &'static Locale) -> Result<Environment<'static>, RenderError> {
    let mut environment = Environment::new();
    environment.set_undefined_behavior(UndefinedBehavior::Strict);
    let syntax = SyntaxConfig::builder()
        .trim_blocks(true)
        .lstrip_blocks(true)
        .keep_trailing_newline(true)
        .build()?;
    environment.set_syntax(syntax);
    environment.set_fuel(Some(FUEL));
    environment.set_auto_escape_callback(move |_| AutoEscape::Custom(face.name().into()));
    environment.set_formatter(move |out, _, value| {
        let text = shown(face, locale, value)?;
        out.write_str(&text).map_err(Error::from)
    });
    add_files(&mut environment, face, locale.tag)?;
    add_numbers(&mut environment, face, locale);
    add_text(&mut environment);
    Ok(environment)
}

/// What a value looks like in the output. A bare fraction has no precision rule, so it is refused.
fn shown(face: Face, locale: &Locale, value: &Value) -> Result<String, Error> {
    let refuse = |what: String| Err(Error::new(ErrorKind::InvalidOperation, what));
    match value.kind() {
        _ if value.is_safe() => Ok(value.to_string()),
        ValueKind::String => Ok(face.escape(&value.to_string())),
        ValueKind::Number => match u64::try_from(value.clone()) {
            Ok(whole) if value.is_integer() => Ok(face.escape(&locale.whole(whole))),
            _ => refuse(format!("the number {value} needs a filter that says how it is rounded")),
        },
        ValueKind::Undefined => Err(ErrorKind::UndefinedError.into()),
        other => refuse(format!("a value of kind {other} cannot be printed")),
    }
}

/// Adds the files of the face and of the language; both are reached by their path below their own folder.
fn add_files(
    environment: &mut Environment<'static>,
    face: Face,
    language: &str,
) -> Result<(), RenderError> {
    for root in [format!("faces/{}", face.name()), language.to_owned()] {
        let Some(folder) = TEMPLATES.get_dir(&root) else { continue };
        let mut folders = vec![folder];
        while let Some(folder) = folders.pop() {
            folders.extend(folder.dirs());
            for file in folder.files() {
                let name = file.path().strip_prefix(&root).unwrap_or(file.path());
                let name = name.to_string_lossy().replace('\\', "/");
                if let (true, Some(source)) = (name.ends_with(".j2"), file.contents_utf8()) {
                    environment.add_template_owned(name, source)?;
                }
            }
        }
    }
    Ok(())
}

/// Filters that say how a number is written.
fn add_numbers(environment: &mut Environment<'static>, face: Face, locale: &'static Locale) {
    environment.add_filter("whole", move |value: u64| locale.whole(value));
    environment
        .add_filter("fixed", move |value: f64, decimals: usize| locale.fixed(value, decimals));
    environment.add_filter("written", move |value: f64| locale.as_written(value));
    environment.add_filter("significant", move |value: f64, digits: usize| {
        locale.significant(value, digits)
    });
    environment.add_filter("share", move |value: f64| locale.share(value));
    environment.add_filter("percent", move |value: f64| locale.percent(value));
    environment.add_filter("power", move |value: f64| locale.power(value));
    environment.add_filter("complement", move |value: f64| locale.complement(value));
    environment.add_filter("probability", move |value: f64| locale.probability(value));
    environment.add_filter("listed", move |words: Vec<String>| locale.list(&words));
    environment.add_filter("math", move |number: String| {
        Value::from_safe_string(face.in_formula(&number))
    });
    // A number that is raised to a power stands in brackets when it is itself a product.
    environment.add_filter("base", move |number: String| {
        let text = face.in_formula(&number);
        let text = if number.contains('×') { format!("({text})") } else { text };
        Value::from_safe_string(text)
    });
}

/// Filters that hand text to places with a syntax of their own.
fn add_text(environment: &mut Environment<'static>) {
    let quoted = |text: &str| Value::from_safe_string(serde_json::Value::from(text).to_string());
    environment.add_filter("string", |text: String| Value::from_safe_string(typst_string(&text)));
    environment.add_filter("yaml", move |text: String| quoted(&text));
    environment
        .add_filter("yaml_markup", move |text: String| quoted(&Face::Markdown.escape(&text)));
    environment.add_filter("shell", |text: String| shell_word(&text));
    environment.add_filter("code", |text: String| Value::from_safe_string(code_span(&text)));
    environment.add_filter("destination", |path: String| {
        let mut escaped = path.replace('\\', "\\\\");
        escaped = escaped.replace('<', "\\<").replace('>', "\\>");
        Value::from_safe_string(format!("<{escaped}>"))
    });
    environment.add_filter("blockquote", |text: Value| {
        let text = text.to_string();
        let lines = text.trim().lines().map(|line| format!("> {line}").trim_end().to_owned());
        Value::from_safe_string(lines.collect::<Vec<_>>().join("\n"))
    });
    // The built-in filter forgets that markup is already safe.
    environment.add_filter("trim", |text: Value| {
        let trimmed = text.to_string().trim().to_owned();
        if text.is_safe() { Value::from_safe_string(trimmed) } else { Value::from(trimmed) }
    });
}

/// A word as a POSIX shell must be given it, and no option whatever it begins with.
fn shell_word(text: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "._-/".contains(c);
    let text = if text.starts_with('-') { format!("./{text}") } else { text.to_owned() };
    if text.chars().all(plain) { text } else { format!("'{}'", text.replace('\'', "'\\''")) }
}

/// A code span whose fence is longer than any run of backticks inside.
fn code_span(text: &str) -> String {
    let longest = text.split(|c| c != '`').map(str::len).max().unwrap_or(0);
    let fence = "`".repeat(longest + 1);
    let pad = if longest > 0 { " " } else { "" };
    format!("{fence}{pad}{text}{pad}{fence}")
}

/// `citation_number(key)` gives a number, `reference_entries()` the list so far.
fn add_citations(environment: &mut Environment<'static>, bibliography: &Arc<Bibliography>) {
    let cited = Cited::default();
    let (known, numbers) = (Arc::clone(bibliography), cited.clone());
    environment.add_function("citation_number", move |key: String| {
        if known.contains(&key) {
            Ok(numbers.number(&key))
        } else {
            let what = format!("`{key}` is not in the bibliography");
            Err(Error::new(ErrorKind::InvalidOperation, what))
        }
    });
    let known = Arc::clone(bibliography);
    environment.add_function("reference_entries", move || {
        let references = known
            .vancouver(&cited.keys())
            .map_err(|error| Error::new(ErrorKind::InvalidOperation, error.to_string()))?;
        Ok(Value::from(Serde(references)))
    });
}
