//! Values given on the command line, over those of the file.

use super::document::{self, Node, Table, Value};
use crate::error::{Place, ScenarioError};

/// One value that replaces what the file says.
#[derive(Debug, Clone)]
pub struct Override {
    /// Names above the key, outermost first.
    sections: Vec<String>,
    key: String,
    node: Node,
}

impl Override {
    /// Reads `SECTION.KEY=VALUE`, where VALUE is a TOML value or a bare string.
    ///
    /// `option` is the option as typed; errors about the value name it.
    pub fn parse(assignment: &str, option: &str) -> Result<Self, ScenarioError> {
        let place = Place::Option(option.to_string());
        let fail = |found: &str| ScenarioError {
            file: "command line".to_string(),
            place: place.clone(),
            key: String::new(),
            found: found.to_string(),
            allowed: "it takes SECTION.KEY=VALUE, such as \"errors.piston=40 nm\"".to_string(),
            nearest: None,
        };
        let (path, value) = assignment
            .split_once('=')
            .ok_or_else(|| fail("found no `=`"))?;
        let mut names: Vec<String> = path.split('.').map(|name| name.trim().into()).collect();
        if names.iter().any(String::is_empty) {
            return Err(fail("found an empty key"));
        }
        let key = names.pop().unwrap_or_default();
        Ok(Override {
            sections: names,
            key,
            node: document::parse_option(value.trim(), &place),
        })
    }

    /// Puts the value into the tree, over whatever the file says.
    pub(super) fn apply(&self, root: &mut Table) {
        let mut table = root;
        for name in &self.sections {
            let section = Node {
                place: self.node.place.clone(),
                value: Value::Table(Table::new()),
            };
            let node = entry(table, name, &section);
            if !matches!(node.value, Value::Table(_)) {
                *node = section;
            }
            let Value::Table(inner) = &mut node.value else {
                return;
            };
            table = inner;
        }
        *entry(table, &self.key, &self.node) = self.node.clone();
    }
}

/// The entry of `name`, begun with `new` where it is not written.
fn entry<'a>(table: &'a mut Table, name: &str, new: &Node) -> &'a mut Node {
    let index = match table.iter().position(|(key, _)| key == name) {
        Some(index) => index,
        None => {
            table.push((name.to_string(), new.clone()));
            table.len() - 1
        }
    };
    &mut table[index].1
}
