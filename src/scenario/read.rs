//! From text to a [`Scenario`].

use super::document::{self, Node, Table, Value};
use super::section::{NOT_NEGATIVE, POSITIVE, Range, SHARE, Section};
use super::{Beam, Contributions, Dropped, Errors, Facets, MethodChoice, Run, Target, Window};
use super::{Override, Scenario, Source, bounds, layout};
use crate::error::{Place, ScenarioError};
use crate::quantity::{self, Kind};
use std::path::Path;

/// Title and sections.
const KEYS: &[&str] = &[
    "title", "beam", "array", "target", "errors", "require", "run",
];
const BEAM_KEYS: &[&str] = &["wavelength", "power"];
const TARGET_KEYS: &[&str] = &["range", "focus", "facets", "bucket_diameter"];
const ERRORS_KEYS: &[&str] = &[
    "piston",
    "jitter",
    "common_jitter",
    "dropout",
    "dropped",
    "power_spread",
];
const RUN_KEYS: &[&str] = &["trials", "seed", "window", "samples_per_spot", "method"];

/// A table of every trial has to fit in memory.
const MOST_TRIALS: u64 = 1_000_000_000;

const SAMPLES: Range = Range {
    text: "2 or more (at most 1e6)",
    holds: |value| (2.0..=1e6).contains(&value),
};

impl Scenario {
    /// Reads the file at `path`; tables are found beside it.
    pub fn read(path: &Path, overrides: &[Override]) -> Result<Self, ScenarioError> {
        let file = path.display().to_string();
        let fail = |found: String, allowed: &str| ScenarioError {
            file: file.clone(),
            place: Place::File,
            key: String::new(),
            found,
            allowed: allowed.to_string(),
            nearest: None,
        };
        let bytes = std::fs::read(path).map_err(|error| {
            fail(
                format!("cannot be read: {error}"),
                "give a scenario file, or - for standard input",
            )
        })?;
        let text = String::from_utf8(bytes)
            .map_err(|_| fail("not text in UTF-8".to_string(), "a scenario is a TOML file"))?;
        let folder = path.parent().unwrap_or(Path::new(""));
        Scenario::from_toml(&text, &file, folder, overrides)
    }

    /// Reads `text`, called `file` in messages, with tables relative to `folder`.
    pub fn from_toml(
        text: &str,
        file: &str,
        folder: &Path,
        overrides: &[Override],
    ) -> Result<Self, ScenarioError> {
        if text.trim().is_empty() {
            return Err(ScenarioError {
                file: file.to_string(),
                place: Place::File,
                key: String::new(),
                found: "an empty file".to_string(),
                allowed: "a scenario needs [beam], [array], [array.element] and [target]"
                    .to_string(),
                nearest: None,
            });
        }
        let mut tree = document::parse(text, file)?;
        for replacement in overrides {
            replacement.apply(&mut tree);
        }
        let source = Source {
            file: file.to_string(),
            text: text.to_string(),
            folder: folder.to_path_buf(),
            places: document::places(&tree),
        };
        read(&tree, source)
    }
}

fn read(tree: &Table, source: Source) -> Result<Scenario, ScenarioError> {
    let root = Section::root(&source.file, tree);
    root.only(KEYS)?;
    let open = |name: &str, keys: &[&str]| {
        let section = root.section(name)?;
        section.only(keys)?;
        Ok(section)
    };
    let beam_section = open("beam", BEAM_KEYS)?;
    let array_section = open("array", layout::KEYS)?;
    array_section
        .section("element")?
        .only(layout::ELEMENT_KEYS)?;
    let target_section = open("target", TARGET_KEYS)?;
    let errors_section = open("errors", ERRORS_KEYS)?;
    let run_section = open("run", RUN_KEYS)?;
    let require_section = root.section("require")?;
    bounds::check_keys(&require_section)?;

    let title = root
        .text("title", "a text")?
        .unwrap_or_default()
        .to_string();
    let beam = read_beam(&beam_section)?;
    let array = layout::read(&array_section)?;
    let target = read_target(&target_section)?;
    let errors = read_errors(&errors_section, beam.wavelength_m)?;
    let run = read_run(&run_section)?;
    let context = bounds::Context {
        array: &array,
        target: &target,
        errors: &errors,
    };
    let require = bounds::read(&require_section, &context)?;
    Ok(Scenario {
        title,
        beam,
        array,
        target,
        errors,
        require,
        run,
        source,
    })
}

fn read_beam(section: &Section<'_>) -> Result<Beam, ScenarioError> {
    Ok(Beam {
        wavelength_m: section.required_quantity("wavelength", Kind::Length)?,
        power_w: section
            .quantity("power", Kind::Power, POSITIVE)?
            .unwrap_or(1.0),
    })
}

fn read_target(section: &Section<'_>) -> Result<Target, ScenarioError> {
    let range_m = section.required_quantity("range", Kind::Length)?;
    let focus_m = match section.node("focus").map(|node| &node.value) {
        None => range_m,
        Some(Value::Text(word)) if word == "range" => range_m,
        Some(Value::Text(word)) if word == "infinity" => f64::INFINITY,
        Some(_) => section
            .quantity("focus", Kind::Length, POSITIVE)
            .map_err(|error| or_words(error, "\"range\" or \"infinity\""))?
            .unwrap_or(range_m),
    };
    Ok(Target {
        range_m,
        focus_m,
        facets: section.choice("facets")?.unwrap_or(Facets::Curved),
        bucket_diameter_m: section.quantity("bucket_diameter", Kind::Length, POSITIVE)?,
    })
}

/// Adds the words that stand in place of a quantity to what is allowed.
fn or_words(mut error: ScenarioError, words: &str) -> ScenarioError {
    error.allowed = format!("{}; or it is {words}", error.allowed);
    error
}

fn read_errors(section: &Section<'_>, wavelength_m: f64) -> Result<Errors, ScenarioError> {
    let contributions = |key: &str, kind: Kind| {
        read_contributions(section, key, kind, |text| match kind {
            Kind::Phase => quantity::parse_phase(text, wavelength_m),
            _ => quantity::parse(text, kind),
        })
    };
    let dropout = section.quantity("dropout", Kind::Ratio, SHARE)?;
    let power_spread = section.quantity("power_spread", Kind::Ratio, NOT_NEGATIVE)?;
    Ok(Errors {
        piston_rad: contributions("piston", Kind::Phase)?,
        jitter_rad: contributions("jitter", Kind::Angle)?,
        common_jitter_rad: contributions("common_jitter", Kind::Angle)?,
        dropout: dropout.unwrap_or(0.0),
        dropped: section.choice("dropped")?.unwrap_or(Dropped::Dark),
        power_spread: power_spread.unwrap_or(0.0),
    })
}

fn read_contributions(
    section: &Section<'_>,
    key: &str,
    kind: Kind,
    read: impl Fn(&str) -> Result<f64, quantity::QuantityError>,
) -> Result<Contributions, ScenarioError> {
    let accepted = quantity::accepted(kind);
    let quantity =
        |key: &str, node: &Node| section.quantity_of(key, node, &accepted, NOT_NEGATIVE, &read);
    let parts = match section.node(key) {
        None => vec![(String::new(), 0.0)],
        Some(node) => match &node.value {
            Value::Table(parts) => {
                if parts.iter().all(|(name, _)| name.is_empty()) {
                    let allowed = "a table has a named contribution on each line";
                    return Err(section.error(key, "found no named contribution", allowed));
                }
                parts
                    .iter()
                    .map(|(name, part)| {
                        Ok((name.clone(), quantity(&format!("{key}.{name}"), part)?))
                    })
                    .collect::<Result<_, _>>()?
            }
            _ => vec![(String::new(), quantity(key, node)?)],
        },
    };
    Ok(Contributions { parts })
}

fn read_run(section: &Section<'_>) -> Result<Run, ScenarioError> {
    let window = match section.node("window").map(|node| &node.value) {
        None => None,
        Some(Value::Text(word)) if word == "auto" => None,
        Some(_) => section
            .quantity("window", Kind::Length, POSITIVE)
            .map_err(|error| or_words(error, "\"auto\""))?,
    };
    Ok(Run {
        trials: section.integer("trials", 1, MOST_TRIALS)?.unwrap_or(200),
        seed: section.integer("seed", 0, u64::MAX)?.unwrap_or(1),
        window: window.map_or(Window::Auto, |width_m| Window::Width { width_m }),
        samples_per_spot: section.number("samples_per_spot", SAMPLES)?.unwrap_or(4.0),
        method: section.choice("method")?.unwrap_or(MethodChoice::Auto),
    })
}
