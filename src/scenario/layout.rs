//! Reads `[array]` and `[array.element]`.

use super::document::{Node, Value};
use super::names::Named;
use super::overlap::clearance;
use super::section::{NOT_NEGATIVE, POSITIVE, Range, Section};
use super::{ArraySection, Element, Keep, Lattice, Layout, Origin, Shape};
use crate::error::{Place, ScenarioError};
use crate::quantity::{self, Kind};
use std::path::PathBuf;

/// Keys of `[array]`.
pub(super) const KEYS: &[&str] = &[
    "layout", "pitch", "rows", "columns", "rings", "outline", "across", "keep", "origin", "hole",
    "taper", "table", "element",
];
/// Keys of `[array.element]`.
pub(super) const ELEMENT_KEYS: &[&str] =
    &["shape", "size", "obscuration", "profile", "beam_radius"];

/// Rows, columns, rings or elements of a ring: products of two stay whole numbers.
const MOST: u64 = 1_000_000;

const OBSCURATION: Range = Range {
    text: "0 or more and less than 1, a fraction of the size",
    holds: |value| (0.0..1.0).contains(&value),
};
/// Beyond this the outermost elements would round to no power at all.
const TAPER: Range = Range {
    text: "from 0 dB to 300 dB",
    holds: |value| (0.0..=300.0).contains(&value),
};

/// The words for `array.layout`.
#[derive(Debug, Clone, Copy)]
enum Word {
    Lattice(Lattice),
    Rings,
    Table,
}

const WORDS: &[(&str, Word)] = &[
    ("square", Word::Lattice(Lattice::Square)),
    ("hexagonal", Word::Lattice(Lattice::Hexagonal)),
    ("rings", Word::Rings),
    ("table", Word::Table),
];

/// Keys that only some layouts take, and which.
const GOES_WITH: &[(&str, &str)] = &[
    ("rows", "layout = \"square\" without an outline"),
    ("columns", "layout = \"square\" without an outline"),
    (
        "rings",
        "layout = \"hexagonal\" without an outline, or with layout = \"rings\"",
    ),
    (
        "outline",
        "layout = \"square\" or \"hexagonal\", in place of rows, columns and rings",
    ),
    ("across", "an outline"),
    ("origin", "an outline"),
    ("keep", "an outline or a hole"),
    ("table", "layout = \"table\""),
    ("pitch", "every layout except \"table\""),
];

/// Reads `[array]`.
pub(super) fn read(section: &Section<'_>) -> Result<ArraySection, ScenarioError> {
    let word = section.one_of("layout", WORDS)?;
    let word = section.required("layout", word, "is one of square, hexagonal, rings, table")?;
    let element_section = section.section("element")?;
    let element = read_element(&element_section)?;
    let layout = read_layout(section, word)?;
    let pitch_m = match (word, section.quantity("pitch", Kind::Length, POSITIVE)?) {
        (Word::Table, _) => 0.0,
        (_, Some(pitch_m)) => pitch_m,
        (Word::Lattice(lattice), None) => closest_pitch(lattice, element.shape, element.size_m),
        (Word::Rings, None) => {
            return section.required("pitch", None, "is the spacing of the rings, a length");
        }
    };
    let array = ArraySection {
        layout,
        pitch_m,
        hole_m: section
            .quantity("hole", Kind::Length, NOT_NEGATIVE)?
            .filter(|hole_m| *hole_m > 0.0),
        keep: section.choice("keep")?.unwrap_or(Keep::Whole),
        taper_db: read_taper(section)?,
        element,
    };
    check_hole(section, &array)?;
    check_pitch(section, &element_section, &array)?;
    Ok(array)
}

fn read_element(section: &Section<'_>) -> Result<Element, ScenarioError> {
    let shape = section.choice("shape")?;
    let shape = section.required("shape", shape, "is one of circle, square, hexagon")?;
    let size_m = section.required_quantity("size", Kind::Length)?;
    let obscuration = section.quantity("obscuration", Kind::Ratio, OBSCURATION)?;
    let gaussian = section
        .one_of("profile", &[("uniform", false), ("gaussian", true)])?
        .unwrap_or(false);
    let beam_radius_m = if gaussian {
        Some(section.required_quantity("beam_radius", Kind::Length)?)
    } else if section.node("beam_radius").is_some() {
        let allowed = "it goes with profile = \"gaussian\"";
        return Err(section.error("beam_radius", "found with a uniform profile", allowed));
    } else {
        None
    };
    Ok(Element {
        shape,
        size_m,
        obscuration: obscuration.unwrap_or(0.0),
        beam_radius_m,
    })
}

fn read_layout(section: &Section<'_>, word: Word) -> Result<Layout, ScenarioError> {
    let written = |key: &str| section.node(key).is_some();
    let outlined = written("outline") || written("across");
    let (takes, beside): (&[&str], &str) = match word {
        Word::Lattice(_) if outlined => (
            &["pitch", "outline", "across", "origin", "keep"],
            "beside an outline",
        ),
        Word::Lattice(Lattice::Square) => {
            (&["pitch", "rows", "columns"], "with layout = \"square\"")
        }
        Word::Lattice(Lattice::Hexagonal) => (&["pitch", "rings"], "with layout = \"hexagonal\""),
        Word::Rings => (&["pitch", "rings"], "with layout = \"rings\""),
        Word::Table => (&["table"], "with layout = \"table\""),
    };
    for (key, partner) in GOES_WITH {
        let taken = takes.contains(key) || (*key == "keep" && written("hole"));
        if written(key) && !taken {
            let found = format!("found {beside}");
            return Err(section.error(key, found, format!("it goes with {partner}")));
        }
    }
    match word {
        Word::Lattice(lattice) if outlined => read_outlined(section, lattice),
        Word::Lattice(Lattice::Square) => read_block(section),
        Word::Lattice(Lattice::Hexagonal) => {
            let rings = section.integer("rings", 0, MOST)?;
            let what = "counts rings around the centre element; or else give outline and across";
            let rings = section.required("rings", rings, what)?;
            Ok(Layout::HexagonalRings { rings })
        }
        Word::Rings => read_rings(section),
        Word::Table => {
            let what = "the name of a CSV file";
            let file = section.text("table", what)?;
            let file = section.required("table", file, format!("is {what}"))?;
            if file.trim().is_empty() {
                return Err(section.error("table", "found an empty name", format!("it is {what}")));
            }
            Ok(Layout::Table {
                file: PathBuf::from(file),
            })
        }
    }
}

fn read_outlined(section: &Section<'_>, lattice: Lattice) -> Result<Layout, ScenarioError> {
    let outline = section.choice("outline")?;
    let across_m = section.quantity("across", Kind::Length, POSITIVE)?;
    Ok(Layout::Outlined {
        lattice,
        outline: section.required("outline", outline, "is one of circle, square, hexagon")?,
        across_m: section.required("across", across_m, "is the size of the outline, a length")?,
        origin: section.choice("origin")?.unwrap_or(Origin::Site),
    })
}

fn read_block(section: &Section<'_>) -> Result<Layout, ScenarioError> {
    let rows = section.integer("rows", 1, MOST)?;
    let columns = section.integer("columns", 1, MOST)?;
    let what = "rows come with columns; or else give outline and across";
    Ok(Layout::SquareBlock {
        rows: section.required("rows", rows, what)?,
        columns: section.required("columns", columns, what)?,
    })
}

fn read_rings(section: &Section<'_>) -> Result<Layout, ScenarioError> {
    let what = "how many elements in each ring, such as [1, 6, 12]";
    let node = section.required("rings", section.node("rings"), format!("is {what}"))?;
    match &node.value {
        Value::Array(items) if !items.is_empty() => {
            let count = |item: &Node| section.integer_of("rings", item, 1, MOST);
            let counts = items.iter().map(count).collect::<Result<_, _>>()?;
            Ok(Layout::Rings { counts })
        }
        Value::Array(_) => Err(section.placed(
            "rings",
            node,
            "found an empty list",
            format!("it is {what}"),
        )),
        _ => Err(section.wrong_type("rings", node, format!("it is a list: {what}"))),
    }
}

fn read_taper(section: &Section<'_>) -> Result<f64, ScenarioError> {
    let Some(node) = section.node("taper") else {
        return Ok(0.0);
    };
    let accepted = "a level needs the unit dB";
    section.quantity_of("taper", node, accepted, TAPER, |text| {
        // No taper is no taper in any unit.
        match text.parse() {
            Ok(0.0) => Ok(0.0),
            _ => quantity::parse_decibels(text),
        }
    })
}

/// The smallest pitch at which no elements of a lattice overlap.
fn closest_pitch(lattice: Lattice, shape: Shape, size_m: f64) -> f64 {
    match (lattice, shape) {
        (Lattice::Square, Shape::Hexagon) | (Lattice::Hexagonal, Shape::Square) => {
            2.0 / 3.0_f64.sqrt() * size_m
        }
        _ => size_m,
    }
}

fn check_hole(section: &Section<'_>, array: &ArraySection) -> Result<(), ScenarioError> {
    if let (Layout::Outlined { across_m, .. }, Some(hole_m)) = (&array.layout, array.hole_m)
        && hole_m > *across_m
    {
        let found = format!(
            "found a hole of {}, larger than the outline",
            quantity::exact(hole_m, Kind::Length)
        );
        let across = quantity::exact(*across_m, Kind::Length);
        let allowed = format!("it is at most array.across, {across}");
        return Err(section.error("hole", found, allowed));
    }
    Ok(())
}

/// Refuses a lattice whose neighbours overlap.
fn check_pitch(
    section: &Section<'_>,
    element_section: &Section<'_>,
    array: &ArraySection,
) -> Result<(), ScenarioError> {
    let Element { shape, size_m, .. } = array.element;
    let pitch_m = array.pitch_m;
    // The pair with the least room sets the pitch.
    let tightest = neighbours(&array.layout)
        .into_iter()
        .map(|(x, y)| clearance(shape, size_m, x * pitch_m, y * pitch_m))
        .min_by(f64::total_cmp);
    let Some(room) = tightest.filter(|room| super::overlap::is_too_close(*room)) else {
        return Ok(());
    };
    let found = |what: &str| {
        let size = quantity::exact(size_m, Kind::Length);
        let pitch = quantity::exact(pitch_m, Kind::Length);
        let name = shape.name();
        format!("found {what}: {name} elements of {size} overlap at a pitch of {pitch}")
    };
    let least = round_up(pitch_m / room);
    let allowed = format!("at this size and layout the pitch is at least {least}");
    // An option is likelier to be the cause than a line that was right without it.
    let is_option = |section: &Section<'_>, key: &str| {
        let place = section.node(key).map(|node| &node.place);
        matches!(place, Some(Place::Option(_)))
    };
    if is_option(element_section, "size") && !is_option(section, "pitch") {
        return Err(element_section.error("size", found("too large an element"), allowed));
    }
    Err(section.error("pitch", found("too small a pitch"), allowed))
}

/// A length to six digits, upwards, so that what a message offers is accepted.
fn round_up(length_m: f64) -> String {
    let digits = |value_m: f64| format!("{value_m:.5e}").parse().unwrap_or(value_m);
    let nearest_m: f64 = digits(length_m);
    let up_m = if nearest_m < length_m * (1.0 - 1e-10) {
        digits(length_m * (1.0 + 5e-6))
    } else {
        nearest_m
    };
    quantity::exact(up_m, Kind::Length)
}

/// Offsets between neighbours that the layout has, over the pitch.
fn neighbours(layout: &Layout) -> Vec<(f64, f64)> {
    let square = |rows: bool, columns: bool| {
        [
            (columns, (1.0, 0.0)),
            (rows, (0.0, 1.0)),
            (rows && columns, (1.0, 1.0)),
        ]
        .into_iter()
        .filter_map(|(exists, offset)| exists.then_some(offset))
        .collect()
    };
    match layout {
        Layout::SquareBlock { rows, columns } => square(*rows > 1, *columns > 1),
        Layout::Outlined {
            lattice: Lattice::Square,
            ..
        } => square(true, true),
        Layout::HexagonalRings { rings: 0 } | Layout::Rings { .. } | Layout::Table { .. } => {
            Vec::new()
        }
        Layout::HexagonalRings { .. } | Layout::Outlined { .. } => {
            vec![(1.0, 0.0), (0.5, 0.75_f64.sqrt())]
        }
    }
}
