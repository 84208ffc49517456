//! Element positions from a CSV file.
//!
//! Header `x_m,y_m` and optionally `power` (relative weight), `phase_rad`,
//! `tilt_x_rad`, `tilt_y_rad`, in any order. Blank lines and lines that start with `#`
//! are left out. Numbers and names hold no comma, so that a line is its cells.

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

/// What a row takes where its column is left out.
const DEFAULTS: [f64; 6] = [0.0, 0.0, 1.0, 0.0, 0.0, 0.0];

/// Largest value of any column; it keeps squares and sums finite.
const LARGEST: f64 = 1e25;

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
/// a ragged row, a value that is no usable number, or no element with power.
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
    let fault = |place: Place, key: &str, found: String, allowed: &str| ScenarioError {
        file: file.to_string(),
        place,
        key: key.to_string(),
        found,
        allowed: allowed.to_string(),
        nearest: None,
    };
    let mut lines = text
        .trim_start_matches('\u{feff}')
        .lines()
        .enumerate()
        .map(|(index, line)| (index + 1, line.trim()))
        .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'));
    let Some((header_line, header)) = lines.next() else {
        let allowed = "a table starts with the header `x_m,y_m`";
        return Err(fault(Place::File, "", "no header".to_string(), allowed));
    };
    let names: Vec<&str> = cells(header).collect();
    let places = columns(&names).map_err(|slip| {
        let place = Place::Line(header_line);
        let mut error = fault(place, slip.name, slip.found.to_string(), slip.allowed);
        error.nearest = slip.nearest.map(str::to_string);
        error
    })?;
    let mut rows = Vec::new();
    for (line, row) in lines {
        let values: Vec<&str> = cells(row).collect();
        if values.len() != names.len() {
            let (count, expected) = (values.len(), names.len());
            let found = format!("found {count} values where the header names {expected} columns");
            let allowed = "every row needs one value per column";
            return Err(fault(Place::Line(line), "", found, allowed));
        }
        let mut numbers = DEFAULTS;
        for (column, place) in places.iter().enumerate() {
            let Some(text) = place.map(|place| values[place]) else {
                continue;
            };
            let (least, allowed) = match COLUMNS[column] {
                "power" => (0.0, "a relative power from 0 to 1e25 is needed"),
                _ => (
                    -LARGEST,
                    "a finite number in SI units is needed, at most 1e25",
                ),
            };
            numbers[column] = text
                .parse()
                .ok()
                .filter(|number| (least..=LARGEST).contains(number))
                .ok_or_else(|| {
                    let found = format!("found \"{text}\"");
                    fault(Place::Line(line), COLUMNS[column], found, allowed)
                })?;
        }
        let [x_m, y_m, power, phase_rad, tilt_x_rad, tilt_y_rad] = numbers;
        rows.push(TableRow {
            line,
            x_m,
            y_m,
            power,
            phase_rad,
            tilt_x_rad,
            tilt_y_rad,
        });
    }
    if !rows.iter().any(|row| row.power > 0.0) {
        let found = match rows.len() {
            0 => "no rows",
            _ => "no row with power",
        };
        let allowed = "a table needs at least one element that radiates";
        return Err(fault(Place::File, "", found.to_string(), allowed));
    }
    Ok(rows)
}

/// The cells of a line, without the quotes that spreadsheets put around names.
fn cells(line: &str) -> impl Iterator<Item = &str> {
    line.split(',')
        .map(|cell| cell.trim().trim_matches('"').trim())
}

/// What is wrong with a header.
struct Slip<'a> {
    name: &'a str,
    found: &'static str,
    allowed: &'static str,
    nearest: Option<&'static str>,
}

/// Where each of [`COLUMNS`] stands among the names of a header.
fn columns<'a>(names: &[&'a str]) -> Result<[Option<usize>; COLUMNS.len()], Slip<'a>> {
    let mut places = [None; COLUMNS.len()];
    for (place, &name) in names.iter().enumerate() {
        let slip = |found, allowed| Slip {
            name,
            found,
            allowed,
            nearest: None,
        };
        match COLUMNS.iter().position(|column| *column == name) {
            Some(column) if places[column].is_none() => places[column] = Some(place),
            Some(_) => {
                return Err(slip(
                    "this column stands twice",
                    "each column may stand once",
                ));
            }
            None => {
                let distance = |column: &&&str| strsim::damerau_levenshtein(column, name);
                return Err(Slip {
                    nearest: COLUMNS
                        .iter()
                        .min_by_key(distance)
                        .filter(|column| distance(column) <= 3)
                        .copied(),
                    ..slip("an unknown column", NAMES_ALLOWED)
                });
            }
        }
    }
    for column in 0..2 {
        if places[column].is_none() {
            return Err(Slip {
                name: COLUMNS[column],
                found: "this column is missing",
                allowed: NAMES_ALLOWED,
                nearest: None,
            });
        }
    }
    Ok(places)
}

const NAMES_ALLOWED: &str = "the header names x_m, y_m and, where wanted, power, phase_rad, \
                             tilt_x_rad, tilt_y_rad, separated by commas";
