//! The TOML text as a tree that remembers where everything was written.

use crate::error::{Place, ScenarioError};
use std::collections::BTreeMap;
use toml::de::{DeTable, DeValue};

/// A value and the place where it was written.
#[derive(Debug, Clone)]
pub(super) struct Node {
    pub place: Place,
    pub value: Value,
}

/// A TOML value.
#[derive(Debug, Clone)]
pub(super) enum Value {
    Text(String),
    Integer(i128),
    Float(f64),
    Boolean(bool),
    /// A date, or an integer beyond any use, as written.
    Other(String),
    Array(Vec<Node>),
    Table(Table),
}

/// Keys and values, in the order written.
pub(super) type Table = Vec<(String, Node)>;

impl Value {
    /// The value as a message quotes it.
    pub fn describe(&self) -> String {
        match self {
            Value::Text(text) => format!("found \"{text}\""),
            Value::Integer(number) => format!("found {number}"),
            Value::Float(number) => format!("found {number:?}"),
            Value::Boolean(flag) => format!("found {flag}"),
            Value::Other(text) => format!("found {text}"),
            Value::Array(_) => "found a list".to_string(),
            Value::Table(_) => "found a table".to_string(),
        }
    }
}

/// Value of `key` in `table`.
pub(super) fn find<'a>(table: &'a Table, key: &str) -> Option<&'a Node> {
    table
        .iter()
        .find(|(name, _)| name == key)
        .map(|(_, node)| node)
}

/// Reads `text`, named `file` in errors.
pub(super) fn parse(text: &str, file: &str) -> Result<Table, ScenarioError> {
    let document = DeTable::parse(text).map_err(|error| {
        let span = error.span().unwrap_or_default();
        let message = error.message().replace('\n', ", ");
        let found = match text.get(span.clone()) {
            Some(key) if message == "duplicate key" => format!("{message} \"{key}\""),
            _ => message,
        };
        ScenarioError {
            file: file.to_string(),
            place: Place::Line(line_at(text, span.start)),
            key: String::new(),
            found,
            allowed: "a scenario is a TOML file, each key once".to_string(),
            nearest: None,
        }
    })?;
    let place = |start| Place::Line(line_at(text, start));
    Ok(table(document.get_ref(), &place))
}

/// Reads the value of an option: TOML, or else a bare string.
pub(super) fn parse_option(text: &str, place: &Place) -> Node {
    let value = match DeValue::parse(text) {
        Ok(spanned) => value(spanned.get_ref(), &|_| place.clone()),
        Err(_) => Value::Text(text.to_string()),
    };
    let place = place.clone();
    Node { place, value }
}

/// Place of every dotted key and section.
pub(super) fn places(root: &Table) -> BTreeMap<String, Place> {
    let mut places = BTreeMap::new();
    collect(root, "", &mut places);
    places
}

fn collect(table: &Table, prefix: &str, places: &mut BTreeMap<String, Place>) {
    for (name, node) in table {
        let path = format!("{prefix}{name}");
        if let Value::Table(inner) = &node.value {
            collect(inner, &format!("{path}."), places);
        }
        places.insert(path, node.place.clone());
    }
}

fn line_at(text: &str, offset: usize) -> usize {
    let before = &text.as_bytes()[..offset.min(text.len())];
    1 + before.iter().filter(|byte| **byte == b'\n').count()
}

fn table(source: &DeTable<'_>, place: &dyn Fn(usize) -> Place) -> Table {
    // The parser sorts by name; a requirement's bounds keep the user's order.
    let mut entries: Vec<_> = source.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    entries
        .into_iter()
        .map(|(key, entry)| {
            let node = Node {
                place: place(entry.span().start),
                value: value(entry.get_ref(), place),
            };
            (key.get_ref().to_string(), node)
        })
        .collect()
}

fn value(source: &DeValue<'_>, place: &dyn Fn(usize) -> Place) -> Value {
    match source {
        DeValue::String(text) => Value::Text(text.to_string()),
        DeValue::Integer(number) => match i128::from_str_radix(number.as_str(), number.radix()) {
            Ok(integer) => Value::Integer(integer),
            Err(_) => Value::Other(number.to_string()),
        },
        DeValue::Float(number) => match number.as_str().parse() {
            Ok(float) => Value::Float(float),
            Err(_) => Value::Other(number.to_string()),
        },
        DeValue::Boolean(flag) => Value::Boolean(*flag),
        DeValue::Datetime(date) => Value::Other(date.to_string()),
        DeValue::Array(items) => Value::Array(
            items
                .iter()
                .map(|item| Node {
                    place: place(item.span().start),
                    value: value(item.get_ref(), place),
                })
                .collect(),
        ),
        DeValue::Table(inner) => Value::Table(table(inner, place)),
    }
}
