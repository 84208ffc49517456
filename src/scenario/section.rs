//! Reading the keys of one section, and the errors that this can meet.

use super::document::{Node, Table, Value, find};
use super::names::Named;
use crate::error::{Place, ScenarioError};
use crate::quantity::{self, Kind, QuantityError};

/// Values that a key takes, and how messages call them.
#[derive(Debug, Clone, Copy)]
pub(super) struct Range {
    pub text: &'static str,
    pub holds: fn(f64) -> bool,
}

/// Anything positive; the limits keep products of a few such values finite.
pub(super) const POSITIVE: Range = Range {
    text: "more than 0 (1e-15 to 1e25 in SI units)",
    holds: |value| (1e-15..=1e25).contains(&value),
};
/// Zero and above; the limit keeps squares finite.
pub(super) const NOT_NEGATIVE: Range = Range {
    text: "0 or more (at most 1e25 in SI units)",
    holds: |value| (0.0..=1e25).contains(&value),
};
/// A probability.
pub(super) const SHARE: Range = Range {
    text: "from 0 to 1",
    holds: |value| (0.0..=1.0).contains(&value),
};

/// One section of the file, or an empty one where it is not written.
#[derive(Debug)]
pub(super) struct Section<'a> {
    file: &'a str,
    path: String,
    place: Place,
    table: Option<&'a Table>,
}

impl<'a> Section<'a> {
    /// The whole file.
    pub fn root(file: &'a str, table: &'a Table) -> Self {
        Section {
            file,
            path: String::new(),
            place: Place::File,
            table: Some(table),
        }
    }

    /// The section `name` inside this one.
    pub fn section(&self, name: &str) -> Result<Self, ScenarioError> {
        let (place, table) = match self.node(name) {
            None => (Place::File, None),
            Some(node) => match &node.value {
                Value::Table(table) => (node.place.clone(), Some(table)),
                other => {
                    let allowed = format!("[{}] is a section", self.dotted(name));
                    return Err(self.error(name, other.describe(), allowed));
                }
            },
        };
        Ok(Section {
            file: self.file,
            path: self.dotted(name),
            place,
            table,
        })
    }

    /// Refuses every key that is not in `keys`.
    pub fn only(&self, keys: &[&str]) -> Result<(), ScenarioError> {
        let unknown = self
            .entries()
            .find(|(name, _)| !keys.contains(&name.as_str()));
        let Some((name, node)) = unknown else {
            return Ok(());
        };
        let (found, allowed) = if self.path.is_empty() && matches!(node.value, Value::Table(_)) {
            ("unknown section", "a scenario takes".to_string())
        } else if self.path.is_empty() {
            (
                "unknown key outside any section",
                "a scenario takes".to_string(),
            )
        } else {
            ("unknown key", format!("[{}] takes", self.path))
        };
        let mut error = self.error(name, found, format!("{allowed} {}", keys.join(", ")));
        error.nearest = nearest_name(name, keys);
        Err(error)
    }

    /// Keys and values, in the order written.
    pub fn entries(&self) -> impl Iterator<Item = &'a (String, Node)> + use<'a> {
        self.table.into_iter().flatten()
    }

    /// What is written for `key`.
    pub fn node(&self, key: &str) -> Option<&'a Node> {
        self.table.and_then(|table| find(table, key))
    }

    /// An error about `key`, placed at it, or else at the section.
    pub fn error(
        &self,
        key: &str,
        found: impl Into<String>,
        allowed: impl Into<String>,
    ) -> ScenarioError {
        ScenarioError {
            file: self.file.to_string(),
            place: self
                .node(key)
                .map_or(&self.place, |node| &node.place)
                .clone(),
            key: self.dotted(key),
            found: found.into(),
            allowed: allowed.into(),
            nearest: None,
        }
    }

    /// The value, or an error that says what is missing.
    pub fn required<T>(
        &self,
        key: &str,
        value: Option<T>,
        what: impl Into<String>,
    ) -> Result<T, ScenarioError> {
        value.ok_or_else(|| {
            self.error(
                key,
                "missing",
                format!("it is required, and {}", what.into()),
            )
        })
    }

    /// A quantity with its unit, in SI units.
    pub fn quantity(
        &self,
        key: &str,
        kind: Kind,
        range: Range,
    ) -> Result<Option<f64>, ScenarioError> {
        let read = |text: &str| quantity::parse(text, kind);
        self.node(key)
            .map(|node| self.quantity_of(key, node, &quantity::accepted(kind), range, read))
            .transpose()
    }

    /// A quantity that must be given.
    pub fn required_quantity(&self, key: &str, kind: Kind) -> Result<f64, ScenarioError> {
        let value = self.quantity(key, kind, POSITIVE)?;
        self.required(key, value, quantity::accepted(kind))
    }

    /// The quantity that `node`, written under `key`, holds; `read` converts its text.
    pub fn quantity_of(
        &self,
        key: &str,
        node: &Node,
        accepted: &str,
        range: Range,
        read: impl Fn(&str) -> Result<f64, QuantityError>,
    ) -> Result<f64, ScenarioError> {
        let result = match &node.value {
            Value::Text(text) => read(text),
            // A bare number fails like its text: where it is wrong, it lacks a unit.
            Value::Integer(number) => read(&number.to_string()),
            Value::Float(number) => read(&format!("{number:?}")),
            _ => return Err(self.wrong_type(key, node, accepted)),
        };
        match result {
            Ok(value) => self.within(key, node, value, range),
            Err(error) => {
                let found = match node.value {
                    Value::Text(_) => error.found,
                    // A number stands in the file without quotes.
                    _ => error.found.replace('"', ""),
                };
                let mut placed = self.placed(key, node, found, error.allowed);
                placed.nearest = error.nearest;
                Err(placed)
            }
        }
    }

    /// A pure number.
    pub fn number(&self, key: &str, range: Range) -> Result<Option<f64>, ScenarioError> {
        let Some(node) = self.node(key) else {
            return Ok(None);
        };
        let value = plain_number(&node.value).ok_or_else(|| {
            self.wrong_type(key, node, format!("it is a plain number, {}", range.text))
        })?;
        self.within(key, node, value, range).map(Some)
    }

    /// A whole number from `least` to `most`.
    pub fn integer(&self, key: &str, least: u64, most: u64) -> Result<Option<u64>, ScenarioError> {
        self.node(key)
            .map(|node| self.integer_of(key, node, least, most))
            .transpose()
    }

    /// The whole number that `node`, written under `key`, holds.
    pub fn integer_of(
        &self,
        key: &str,
        node: &Node,
        least: u64,
        most: u64,
    ) -> Result<u64, ScenarioError> {
        let allowed = || format!("it is a whole number from {least} to {most}");
        let Value::Integer(number) = node.value else {
            return Err(self.wrong_type(key, node, allowed()));
        };
        u64::try_from(number)
            .ok()
            .filter(|number| (least..=most).contains(number))
            .ok_or_else(|| self.placed(key, node, node.value.describe(), allowed()))
    }

    /// A text.
    pub fn text(&self, key: &str, what: &str) -> Result<Option<&'a str>, ScenarioError> {
        match self.node(key) {
            None => Ok(None),
            Some(Node {
                value: Value::Text(text),
                ..
            }) => Ok(Some(text)),
            Some(node) => Err(self.wrong_type(key, node, format!("it is {what}, in quotes"))),
        }
    }

    /// One of the words of `T`.
    pub fn choice<T: Named>(&self, key: &str) -> Result<Option<T>, ScenarioError> {
        self.one_of(key, T::NAMES)
    }

    /// One of `words`.
    pub fn one_of<T: Copy>(
        &self,
        key: &str,
        words: &[(&'static str, T)],
    ) -> Result<Option<T>, ScenarioError> {
        let names: Vec<&str> = words.iter().map(|(name, _)| *name).collect();
        let what = format!("one of {}", names.join(", "));
        let Some(text) = self.text(key, &what)? else {
            return Ok(None);
        };
        match words.iter().find(|(name, _)| *name == text) {
            Some((_, choice)) => Ok(Some(*choice)),
            None => {
                let found = format!("found \"{text}\", an unknown word");
                let mut error = self.error(key, found, format!("it is {what}"));
                error.nearest = nearest_name(text, &names);
                Err(error)
            }
        }
    }

    fn within(
        &self,
        key: &str,
        node: &Node,
        value: f64,
        range: Range,
    ) -> Result<f64, ScenarioError> {
        if (range.holds)(value) {
            // A negative zero would be written back as such.
            return Ok(value + 0.0);
        }
        let allowed = format!("it must be {}", range.text);
        Err(self.placed(key, node, node.value.describe(), allowed))
    }

    /// An error about a value of a type that `key` does not take.
    pub fn wrong_type(&self, key: &str, node: &Node, allowed: impl Into<String>) -> ScenarioError {
        let found = match node.value {
            Value::Text(_) => format!("{}, a text", node.value.describe()),
            _ => node.value.describe(),
        };
        self.placed(key, node, found, allowed)
    }

    /// An error placed at `node`, which may be inside the value of `key`.
    pub fn placed(
        &self,
        key: &str,
        node: &Node,
        found: impl Into<String>,
        allowed: impl Into<String>,
    ) -> ScenarioError {
        let mut error = self.error(key, found, allowed);
        error.place = node.place.clone();
        error
    }

    fn dotted(&self, key: &str) -> String {
        if self.path.is_empty() {
            key.to_string()
        } else {
            format!("{}.{key}", self.path)
        }
    }
}

fn plain_number(value: &Value) -> Option<f64> {
    match value {
        Value::Integer(number) => Some(*number as f64),
        Value::Float(number) => Some(*number),
        _ => None,
    }
}

/// The name most like `name`, if one is like it.
pub(super) fn nearest_name(name: &str, names: &[&str]) -> Option<String> {
    let lower = name.to_lowercase();
    // A third of the letters may differ, by slip, swap or omission.
    let close = |candidate: &&&str| {
        let longer = candidate.len().max(name.len());
        strsim::osa_distance(&lower, candidate) <= (longer / 3).max(1)
    };
    let longer_or_shorter = |candidate: &&&str| {
        name.len() > 2 && (lower.starts_with(**candidate) || candidate.starts_with(&lower))
    };
    names
        .iter()
        .filter(close)
        .min_by_key(|candidate| strsim::osa_distance(&lower, candidate))
        .or_else(|| names.iter().find(longer_or_shorter))
        .map(|candidate| candidate.to_string())
}
