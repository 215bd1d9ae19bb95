//! How a design reports a fault in the spec without knowing where the spec is: by a path of keys.

/// One step of a path into the spec.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub enum Step {
    /// The value of a key.
    Key(String),
    /// An item of a list, from 0.
    Index(usize),
}

/// A path into the spec.
#[derive(Debug, Clone, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Path(pub Vec<Step>);

impl Path {
    /// The path of nested keys written with dots, such as `design.groups`.
    pub fn of(dotted: &str) -> Self {
        Self(dotted.split('.').filter(|k| !k.is_empty()).map(|k| Step::Key(k.to_owned())).collect())
    }

    /// This path and one key more.
    #[must_use]
    pub fn key(&self, key: &str) -> Self {
        let mut path = self.clone();
        path.0.push(Step::Key(key.to_owned()));
        path
    }

    /// This path and one item more.
    #[must_use]
    pub fn item(&self, index: usize) -> Self {
        let mut path = self.clone();
        path.0.push(Step::Index(index));
        path
    }

    /// This path followed by another.
    #[must_use]
    pub fn join(&self, rest: &Self) -> Self {
        Self(self.0.iter().chain(&rest.0).cloned().collect())
    }
}

impl std::fmt::Display for Path {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        for (position, step) in self.0.iter().enumerate() {
            match step {
                Step::Key(key) if position == 0 => write!(f, "{key}")?,
                Step::Key(key) => write!(f, ".{key}")?,
                Step::Index(index) => write!(f, "[{index}]")?,
            }
        }
        Ok(())
    }
}

/// Which part of the spec at a path is at fault.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Aspect {
    /// The value.
    Value,
    /// The key itself (unknown, misplaced, or its mapping lacks something).
    Key,
}

/// Something wrong with the spec.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Where.
    pub at: Path,
    /// The key or the value.
    pub aspect: Aspect,
    /// What is wrong, in a line that starts in lower case and has no full stop.
    pub reason: String,
    /// The way out.
    pub help: Option<String>,
}

impl Fault {
    /// A fault of the value at a path.
    pub fn value(at: Path, reason: impl Into<String>) -> Self {
        Self { at, aspect: Aspect::Value, reason: reason.into(), help: None }
    }

    /// A fault of the key at a path.
    pub fn key(at: Path, reason: impl Into<String>) -> Self {
        Self { at, aspect: Aspect::Key, reason: reason.into(), help: None }
    }

    /// The same fault with the way out.
    #[must_use]
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// The same fault seen from a mapping that holds the path.
    #[must_use]
    pub fn below(mut self, parent: &Path) -> Self {
        self.at = parent.join(&self.at);
        self
    }
}

/// Access to the data files that a spec names.
pub trait Tables {
    /// The numbers of one column, of the rows in which each filter column holds the given text.
    ///
    /// # Errors
    ///
    /// A fault whose path is `file`, `column` or `where` (relative to the mapping that names the file), with the
    /// reason: the file cannot be read, lies outside the spec's folder, has no such column, a cell is not a number,
    /// or no row is left.
    fn column(
        &self,
        file: &str,
        column: &str,
        filter: &[(String, String)],
    ) -> Result<Vec<f64>, Fault>;
}
