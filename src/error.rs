//! The one error that a user of a scenario file meets.
use std::fmt;

/// Where a faulty value was written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Place {
    /// A line of the file, counted from 1.
    Line(usize),
    /// A command-line option, as typed (`--set errors.piston=…`).
    Option(String),
    /// The file as a whole.
    File,
}

/// A scenario (or a table that it names) that cannot be used, and why.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub struct ScenarioError {
    /// File name as the user gave it, or `standard input`.
    pub file: String,
    /// Where in it.
    pub place: Place,
    /// Dotted key, e.g. `array.element.size`; empty where no key is concerned.
    pub key: String,
    /// What stands there.
    pub found: String,
    /// What would be accepted.
    pub allowed: String,
    /// The nearest valid name or unit, where a spelling mistake is likely.
    pub nearest: Option<String>,
}

impl fmt::Display for ScenarioError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.place {
            Place::Line(line) => write!(f, "{}:{line}: ", self.file)?,
            Place::Option(option) => write!(f, "{}: {option}: ", self.file)?,
            Place::File => write!(f, "{}: ", self.file)?,
        }
        if !self.key.is_empty() {
            write!(f, "{}: ", self.key)?;
        }
        write!(f, "{}; {}", self.found, self.allowed)?;
        if let Some(nearest) = &self.nearest {
            write!(f, " (did you mean `{nearest}`?)")?;
        }
        Ok(())
    }
}
