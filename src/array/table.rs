//! Element positions from a CSV file.
//!
//! Header `x_m,y_m` and optionally `power` (relative weight), `phase_rad`,
//! `tilt_x_rad`, `tilt_y_rad`, in any order.

use crate::error::{Place, ScenarioError};
use crate::scenario::Scenario;
use std::path::Path;

/// The columns a table may have; the first two it must have.
const COLUMNS: [&str; 6] = [
    "x_m",
    "y_m",
    "power",
    "phase_rad",
    "tilt_x_rad",
    "tilt_y_rad",
];

/// One element of a table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TableRow {
    /// Line of the file, from 1.
    pub line: usize,
    /// Centre.
    pub x_m: f64,
    /// Centre.
    pub y_m: f64,
    /// Relative weight of its power.
    pub power: f64,
    /// Static phase.
    pub phase_rad: f64,
    /// Static tilt along x.
    pub tilt_x_rad: f64,
    /// Static tilt along y.
    pub tilt_y_rad: f64,
}

/// Read the table that a scenario names.
///
/// # Errors
/// The file cannot be read, is empty, has an unknown, repeated or missing column,
/// a ragged row, a value that is not a finite number, or a negative power.
pub fn read(scenario: &Scenario, file: &Path) -> Result<Vec<TableRow>, ScenarioError> {
    let path = scenario.source.folder.join(file);
    let text = std::fs::read_to_string(&path).map_err(|error| {
        scenario.error(
            "array.table",
            format!("\"{}\" cannot be read ({error})", file.display()),
            "a CSV file beside the scenario, with the header `x_m,y_m`",
        )
    })?;
    parse(&text, &file.display().to_string())
}

fn parse(text: &str, file: &str) -> Result<Vec<TableRow>, ScenarioError> {
    let fault = |line: Option<usize>, key: &str, found: String, allowed: String| ScenarioError {
        file: file.to_string(),
        place: line.map_or(Place::File, Place::Line),
        key: key.to_string(),
        found,
        allowed,
        nearest: None,
    };
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(text.as_bytes());
    let unreadable = |error: csv::Error| {
        let line = error.position().map(|position| position.line() as usize);
        let found = match error.kind() {
            csv::ErrorKind::UnequalLengths {
                expected_len, len, ..
            } => {
                format!("found {len} values")
                    + &format!(" where the header names {expected_len} columns")
            }
            _ => error.to_string(),
        };
        fault(
            line,
            "",
            found,
            "every row needs one value per column".to_string(),
        )
    };
    let header = reader.headers().map_err(unreadable)?.clone();
    let header_line = reader.position().line().max(1) as usize;
    let mut places = [None; COLUMNS.len()];
    for (place, name) in header.iter().enumerate() {
        match COLUMNS.iter().position(|column| *column == name) {
            Some(column) if places[column].is_none() => places[column] = Some(place),
            Some(_) => {
                return Err(fault(
                    Some(1),
                    name,
                    "this column stands twice".to_string(),
                    "each column may stand once".to_string(),
                ));
            }
            None => {
                let nearest = COLUMNS
                    .iter()
                    .min_by_key(|column| strsim::damerau_levenshtein(column, name))
                    .filter(|column| strsim::damerau_levenshtein(column, name) <= 3);
                let mut error = fault(
                    Some(1),
                    name,
                    "an unknown column".to_string(),
                    format!("the columns are {}", COLUMNS.join(", ")),
                );
                error.nearest = nearest.map(ToString::to_string);
                return Err(error);
            }
        }
    }
    for column in 0..2 {
        if places[column].is_none() {
            return Err(fault(
                Some(header_line.min(1)),
                COLUMNS[column],
                "this column is missing".to_string(),
                "a table starts with the header `x_m,y_m`, and optionally power, phase_rad, tilt_x_rad, tilt_y_rad"
                    .to_string(),
            ));
        }
    }
    let mut rows = Vec::new();
    for record in reader.records() {
        let record = record.map_err(unreadable)?;
        let line = record
            .position()
            .map_or(0, |position| position.line() as usize);
        let value = |column: usize, default: f64| -> Result<f64, ScenarioError> {
            let Some(place) = places[column] else {
                return Ok(default);
            };
            let text = record.get(place).unwrap_or("");
            match text.parse::<f64>() {
                Ok(value) if value.is_finite() => Ok(value),
                _ => Err(fault(
                    Some(line),
                    COLUMNS[column],
                    format!("found \"{text}\""),
                    "a finite number in SI units is needed".to_string(),
                )),
            }
        };
        let power = value(2, 1.0)?;
        if power < 0.0 {
            return Err(fault(
                Some(line),
                "power",
                format!("found {power}"),
                "a relative power of 0 or more is needed".to_string(),
            ));
        }
        rows.push(TableRow {
            line,
            x_m: value(0, 0.0)?,
            y_m: value(1, 0.0)?,
            power,
            phase_rad: value(3, 0.0)?,
            tilt_x_rad: value(4, 0.0)?,
            tilt_y_rad: value(5, 0.0)?,
        });
    }
    if rows.iter().map(|row| row.power).sum::<f64>() <= 0.0 {
        return Err(fault(
            None,
            "",
            if rows.is_empty() {
                "no rows"
            } else {
                "no row with power"
            }
            .to_string(),
            "a table needs at least one element that radiates".to_string(),
        ));
    }
    Ok(rows)
}
