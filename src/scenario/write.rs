//! A [`Scenario`] as text, with every default written out.

use super::names::Named;
use super::{ArraySection, Contributions, Element, Errors, Layout, Requirement, Run, Scenario};
use super::{Beam, Target, Window};
use crate::quantity::{Kind, exact, exact_phase};
use std::fmt::Display;
use std::path::Path;

/// Text under construction.
#[derive(Debug, Default)]
struct Sheet(String);

impl Sheet {
    fn section(&mut self, name: &str) {
        self.0.push_str(&format!("\n[{name}]\n"));
    }

    fn value(&mut self, key: &str, value: impl Display) {
        self.0.push_str(&format!("{key} = {value}\n"));
    }

    fn text(&mut self, key: &str, text: &str) {
        self.value(key, quoted(text));
    }

    fn choice(&mut self, key: &str, choice: impl Named) {
        self.text(key, choice.name());
    }

    fn quantity(&mut self, key: &str, value: f64, kind: Kind) {
        self.text(key, &exact(value, kind));
    }

    fn number(&mut self, key: &str, value: f64) {
        self.value(key, exact(value, Kind::Ratio));
    }
}

fn quoted(text: &str) -> String {
    toml::Value::from(text).to_string()
}

impl Scenario {
    /// The complete scenario, which reads back to the same values.
    ///
    /// A table is named by its file name alone, since it is copied beside.
    pub fn to_toml(&self) -> String {
        let mut sheet = Sheet::default();
        sheet.text("title", &self.title);
        write_beam(&mut sheet, &self.beam);
        write_array(&mut sheet, &self.array);
        write_element(&mut sheet, &self.array.element);
        write_target(&mut sheet, &self.target);
        write_errors(&mut sheet, &self.errors, self.beam.wavelength_m);
        write_requirement(&mut sheet, &self.require);
        write_run(&mut sheet, &self.run);
        sheet.0
    }
}

fn write_beam(sheet: &mut Sheet, beam: &Beam) {
    sheet.section("beam");
    sheet.quantity("wavelength", beam.wavelength_m, Kind::Length);
    sheet.quantity("power", beam.power_w, Kind::Power);
}

fn write_array(sheet: &mut Sheet, array: &ArraySection) {
    sheet.section("array");
    match &array.layout {
        Layout::SquareBlock { rows, columns } => {
            sheet.text("layout", "square");
            sheet.value("rows", rows);
            sheet.value("columns", columns);
        }
        Layout::HexagonalRings { rings } => {
            sheet.text("layout", "hexagonal");
            sheet.value("rings", rings);
        }
        Layout::Outlined {
            lattice,
            outline,
            across_m,
            origin,
        } => {
            sheet.choice("layout", *lattice);
            sheet.choice("outline", *outline);
            sheet.quantity("across", *across_m, Kind::Length);
            sheet.choice("origin", *origin);
        }
        Layout::Rings { counts } => {
            sheet.text("layout", "rings");
            sheet.value("rings", format_args!("{counts:?}"));
        }
        Layout::Table { file } => {
            sheet.text("layout", "table");
            let name = Path::new(file.file_name().unwrap_or(file.as_os_str()));
            sheet.text("table", &name.to_string_lossy());
        }
    }
    if !matches!(array.layout, Layout::Table { .. }) {
        sheet.quantity("pitch", array.pitch_m, Kind::Length);
    }
    sheet.quantity("hole", array.hole_m.unwrap_or(0.0), Kind::Length);
    sheet.choice("keep", array.keep);
    let taper = exact(array.taper_db, Kind::Ratio);
    sheet.text("taper", &format!("{taper} dB"));
}

fn write_element(sheet: &mut Sheet, element: &Element) {
    sheet.section("array.element");
    sheet.choice("shape", element.shape);
    sheet.quantity("size", element.size_m, Kind::Length);
    sheet.number("obscuration", element.obscuration);
    match element.beam_radius_m {
        None => sheet.text("profile", "uniform"),
        Some(beam_radius_m) => {
            sheet.text("profile", "gaussian");
            sheet.quantity("beam_radius", beam_radius_m, Kind::Length);
        }
    }
}

fn write_target(sheet: &mut Sheet, target: &Target) {
    sheet.section("target");
    sheet.quantity("range", target.range_m, Kind::Length);
    if target.focus_m.is_infinite() {
        sheet.text("focus", "infinity");
    } else if target.focus_m.to_bits() == target.range_m.to_bits() {
        sheet.text("focus", "range");
    } else {
        sheet.quantity("focus", target.focus_m, Kind::Length);
    }
    sheet.choice("facets", target.facets);
    match target.bucket_diameter_m {
        Some(diameter_m) => sheet.quantity("bucket_diameter", diameter_m, Kind::Length),
        None => sheet.value("# bucket_diameter", "none"),
    }
}

fn write_errors(sheet: &mut Sheet, errors: &Errors, wavelength_m: f64) {
    sheet.section("errors");
    let angle = |value| exact(value, Kind::Angle);
    let phase = |value| exact_phase(value, wavelength_m);
    sheet.value("piston", contributions(&errors.piston_rad, phase));
    sheet.value("jitter", contributions(&errors.jitter_rad, angle));
    sheet.value(
        "common_jitter",
        contributions(&errors.common_jitter_rad, angle),
    );
    sheet.number("dropout", errors.dropout);
    sheet.choice("dropped", errors.dropped);
    sheet.number("power_spread", errors.power_spread);
}

fn contributions(contributions: &Contributions, write: impl Fn(f64) -> String) -> String {
    match contributions.parts.as_slice() {
        [(name, rms)] if name.is_empty() => quoted(&write(*rms)),
        parts => {
            let parts = parts.iter();
            let list: Vec<String> = parts
                .map(|(name, rms)| format!("{} = {}", bare_or_quoted(name), quoted(&write(*rms))))
                .collect();
            format!("{{ {} }}", list.join(", "))
        }
    }
}

fn bare_or_quoted(name: &str) -> String {
    let bare = |letter: char| letter.is_ascii_alphanumeric() || letter == '_' || letter == '-';
    if !name.is_empty() && name.chars().all(bare) {
        name.to_string()
    } else {
        // A key takes no multi-line text, which a line break would choose.
        let escaped: String = name.chars().map(escape).collect();
        format!("\"{escaped}\"")
    }
}

fn escape(letter: char) -> String {
    match letter {
        '"' | '\\' => format!("\\{letter}"),
        _ if letter.is_control() => format!("\\u{:04X}", u32::from(letter)),
        _ => letter.to_string(),
    }
}

fn write_requirement(sheet: &mut Sheet, require: &Requirement) {
    sheet.section("require");
    let bounds = &require.bounds;
    for (index, first) in bounds.iter().enumerate() {
        let same = |bound: &&super::Bound| bound.figure == first.figure;
        if bounds[..index].iter().any(|bound| same(&bound)) {
            continue;
        }
        let texts: Vec<String> = bounds
            .iter()
            .filter(same)
            .map(|bound| {
                let value = exact(bound.value, bound.figure.kind());
                quoted(&format!("{} {value}", bound.comparison.name()))
            })
            .collect();
        match texts.as_slice() {
            [one] => sheet.value(first.figure.name(), one),
            several => sheet.value(
                first.figure.name(),
                format_args!("[{}]", several.join(", ")),
            ),
        }
    }
    sheet.choice("statistic", require.statistic);
    sheet.number("confidence", require.confidence);
}

fn write_run(sheet: &mut Sheet, run: &Run) {
    sheet.section("run");
    sheet.value("trials", run.trials);
    sheet.value("seed", run.seed);
    match run.window {
        Window::Auto => sheet.text("window", "auto"),
        Window::Width { width_m } => sheet.quantity("window", width_m, Kind::Length),
    }
    sheet.number("samples_per_spot", run.samples_per_spot);
    sheet.choice("method", run.method);
}
