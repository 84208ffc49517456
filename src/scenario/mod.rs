//! The scenario: what a user writes, validated and in SI units.
//!
//! One TOML file says everything about a study. [`Scenario::from_toml`] reads
//! it, refuses what it cannot mean, and fills every default;
//! [`Scenario::to_toml`] writes it back with nothing left implicit.

mod bounds;
mod document;
mod layout;
pub mod names;
pub mod overlap;
mod overrides;
mod read;
pub mod require;
mod section;
mod write;

use crate::error::{Place, ScenarioError};
use std::collections::BTreeMap;
use std::path::PathBuf;

pub use overlap::elements_overlap;
pub use overrides::Override;
pub use require::{Bound, Comparison, Figure, Requirement, Statistic};

/// A commented scenario to begin from, as `facula starter` prints it.
pub const STARTER: &str = include_str!("starter.toml");

/// A whole scenario.
#[derive(Debug, Clone, PartialEq)]
pub struct Scenario {
    /// Free text, shown on every output.
    pub title: String,
    /// The light.
    pub beam: Beam,
    /// The aperture.
    pub array: ArraySection,
    /// The target plane.
    pub target: Target,
    /// The error sources.
    pub errors: Errors,
    /// What must be met.
    pub require: Requirement,
    /// How it is computed.
    pub run: Run,
    /// Where each key was written, for errors found after reading.
    pub source: Source,
}

/// Where a scenario came from.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Source {
    /// File name as given, or `standard input`.
    pub file: String,
    /// The text as read.
    pub text: String,
    /// Folder that tables are relative to.
    pub folder: PathBuf,
    /// Place of every dotted key and section that was written.
    pub places: BTreeMap<String, Place>,
}

/// `[beam]`
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Beam {
    /// Vacuum wavelength.
    pub wavelength_m: f64,
    /// Power leaving the aperture with every element lit, after clipping.
    pub power_w: f64,
}

/// `[array]`
#[derive(Debug, Clone, PartialEq)]
pub struct ArraySection {
    /// Where the elements sit.
    pub layout: Layout,
    /// Centre-to-centre distance of neighbours, or ring spacing; NaN-free, 0 for a table.
    pub pitch_m: f64,
    /// Diameter of a central hole.
    pub hole_m: Option<f64>,
    /// Whether a site at an edge is kept by its whole element or its centre.
    pub keep: Keep,
    /// Edge taper in dB.
    pub taper_db: f64,
    /// The element that every site carries.
    pub element: Element,
}

/// Where the elements sit.
#[derive(Debug, Clone, PartialEq)]
pub enum Layout {
    /// A square lattice of rows × columns, centred on the axis.
    SquareBlock {
        /// Rows (along y).
        rows: u64,
        /// Columns (along x).
        columns: u64,
    },
    /// Complete hexagonal rings around a centre element.
    HexagonalRings {
        /// Rings; 0 is the centre element alone.
        rings: u64,
    },
    /// Lattice sites inside an outline.
    Outlined {
        /// The lattice.
        lattice: Lattice,
        /// The outline.
        outline: Outline,
        /// Its diameter, side, or flat-to-flat size.
        across_m: f64,
        /// Whether a site lies on the axis.
        origin: Origin,
    },
    /// Concentric rings; ring j at radius j × pitch, first element on +x.
    Rings {
        /// Elements in each ring.
        counts: Vec<u64>,
    },
    /// Positions from a CSV file.
    Table {
        /// Path as written, relative to the scenario's folder.
        file: PathBuf,
    },
}

/// A lattice.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Lattice {
    /// Square.
    Square,
    /// Hexagonal, one of its three rows of neighbours along x.
    Hexagonal,
}

/// The outline that sites are chosen by.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outline {
    /// Circle.
    Circle,
    /// Square.
    Square,
    /// Hexagon with corners on ±x.
    Hexagon,
}

/// Which sites at an edge are kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Keep {
    /// The element lies wholly inside.
    Whole,
    /// Its centre does.
    Centre,
}

/// What lies on the axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Origin {
    /// A lattice site.
    Site,
    /// The gap between sites.
    Gap,
}

/// `[array.element]`
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Element {
    /// Outline of the element.
    pub shape: Shape,
    /// Diameter, side or flat-to-flat.
    pub size_m: f64,
    /// Diameter of the round central obscuration over `size_m`.
    pub obscuration: f64,
    /// 1/e² irradiance radius of a Gaussian profile; `None` is uniform.
    pub beam_radius_m: Option<f64>,
}

/// Shape of an element.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// Circle.
    Circle,
    /// Square, sides along x and y.
    Square,
    /// Hexagon, two flats facing ±x.
    Hexagon,
}

/// `[target]`
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Target {
    /// Distance from the aperture to the target plane.
    pub range_m: f64,
    /// Distance at which the wavefront converges; infinite for a collimated array.
    pub focus_m: f64,
    /// Whether the focusing wavefront is followed inside each element.
    pub facets: Facets,
    /// Diameter of the circle around the aim point in which power counts.
    pub bucket_diameter_m: Option<f64>,
}

/// How each element follows the focusing wavefront.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Facets {
    /// Continuously.
    Curved,
    /// By piston and tilt only; each element is collimated.
    Flat,
}

/// `[errors]`
#[derive(Debug, Clone, PartialEq)]
pub struct Errors {
    /// Phase error of each element, radians rms.
    pub piston_rad: Contributions,
    /// Tilt of each element, radians rms per axis.
    pub jitter_rad: Contributions,
    /// Tilt of the whole array, radians rms per axis.
    pub common_jitter_rad: Contributions,
    /// Probability that an element is out.
    pub dropout: f64,
    /// What an element that is out does.
    pub dropped: Dropped,
    /// Standard deviation of element power over its mean.
    pub power_spread: f64,
}

/// One error, as a single value or as named contributions.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Contributions {
    /// Name and rms; a single unnamed value has an empty name.
    pub parts: Vec<(String, f64)>,
}

impl Contributions {
    /// Root sum square of the contributions, which are independent.
    pub fn rms(&self) -> f64 {
        self.parts
            .iter()
            .map(|(_, rms)| rms * rms)
            .sum::<f64>()
            .sqrt()
    }
}

/// What an element that is out does.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Dropped {
    /// Radiates nothing.
    Dark,
    /// Radiates its power at a uniformly random phase.
    Unlocked,
}

/// `[run]`
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Run {
    /// Monte Carlo trials.
    pub trials: u64,
    /// Seed of every random stream.
    pub seed: u64,
    /// Full width of the map.
    pub window: Window,
    /// Map pixels per λ·range/D.
    pub samples_per_spot: f64,
    /// Far-field method.
    pub method: MethodChoice,
}

/// Width of the target-plane map.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Window {
    /// Chosen from spot, bucket, common jitter and the 80 % circle.
    Auto,
    /// Stated.
    Width {
        /// Full width in metres.
        width_m: f64,
    },
}

/// What `run.method` asks for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum MethodChoice {
    /// Whichever fits.
    Auto,
    /// One FFT of the painted aperture.
    Sampled,
    /// Element pattern times array factor.
    Factored,
    /// The plain sum over elements.
    Direct,
    /// The mean map in closed form.
    ClosedForm,
}

impl Scenario {
    /// An error about `key`, placed where that key (or its section) was written.
    pub fn error(
        &self,
        key: &str,
        found: impl Into<String>,
        allowed: impl Into<String>,
    ) -> ScenarioError {
        let mut name = key;
        let place = loop {
            if let Some(place) = self.source.places.get(name) {
                break place.clone();
            }
            match name.rfind('.') {
                Some(dot) => name = &name[..dot],
                None => break Place::File,
            }
        };
        ScenarioError {
            file: self.source.file.clone(),
            place,
            key: key.to_string(),
            found: found.into(),
            allowed: allowed.into(),
            nearest: None,
        }
    }
}

impl Errors {
    /// Whether nothing is in error.
    pub fn is_none(&self) -> bool {
        self.sources() == 0
    }

    /// How many sources are not zero.
    pub fn sources(&self) -> usize {
        let present = [
            self.piston_rad.rms() > 0.0,
            self.jitter_rad.rms() > 0.0,
            self.common_jitter_rad.rms() > 0.0,
            self.dropout > 0.0,
            self.power_spread > 0.0,
        ];
        present.into_iter().filter(|present| *present).count()
    }

    /// No errors at all.
    pub fn none() -> Errors {
        Errors {
            piston_rad: Contributions::default(),
            jitter_rad: Contributions::default(),
            common_jitter_rad: Contributions::default(),
            dropout: 0.0,
            dropped: Dropped::Dark,
            power_spread: 0.0,
        }
    }
}
