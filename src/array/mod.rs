//! Layouts and elements → positions, amplitudes, and what follows from them.

pub mod element;
mod overlap;
pub mod sites;
mod table;

use crate::error::ScenarioError;
use crate::scenario::{Element, Facets, Lattice, Layout, Scenario};
use std::f64::consts::{PI, TAU};

/// More elements than this are refused before they are listed: at 80 bytes each
/// they would take 16 GB.
pub const MOST_ELEMENTS: f64 = 2e8;

/// A tiled aperture as a structure of arrays, with the light it carries.
///
/// The static part of each element's phase and tilt (a table's offsets, and what
/// a focus away from the target leaves) belongs to the array, not to its errors.
#[derive(Debug, Clone, PartialEq)]
pub struct Array {
    /// Element centres, x.
    pub x_m: Vec<f64>,
    /// Element centres, y.
    pub y_m: Vec<f64>,
    /// √P of each element, in √W, with every element lit.
    pub amplitude: Vec<f64>,
    /// Static phase.
    pub phase_rad: Vec<f64>,
    /// Static tilt along x.
    pub tilt_x_rad: Vec<f64>,
    /// Static tilt along y.
    pub tilt_y_rad: Vec<f64>,
    /// The element at every site.
    pub element: Element,
    /// The lattice that the sites belong to, and its pitch.
    pub lattice: Option<(Lattice, f64)>,
    /// Diameter D of the smallest circle around the axis that holds every element whole.
    pub envelope_diameter_m: f64,
    /// Wavelength.
    pub wavelength_m: f64,
    /// Distance to the target plane.
    pub range_m: f64,
    /// c of the phase k c |s|²/2 that is left inside each element, in 1/m.
    pub curvature_per_m: f64,
}

impl Array {
    /// Lay out the elements of a scenario.
    ///
    /// A focus f away from the range L leaves, with c = 1/L − 1/f, the piston
    /// k c |r|²/2 and the tilt c r of an element at r, and k c |s|²/2 inside it; flat
    /// facets leave k |s|²/(2L) inside (Fresnel's integral, expanded about r).
    ///
    /// # Errors
    /// An unusable table, an outline or hole that leaves no element, elements that
    /// overlap, or more elements than a machine can list.
    pub fn new(scenario: &Scenario) -> Result<Array, ScenarioError> {
        let section = &scenario.array;
        if let Some(count) = sites::expected_count(section)
            && count > MOST_ELEMENTS
        {
            return Err(scenario.error(
                "array",
                format!("about {count:.3e} elements"),
                format!(
                    "at most {MOST_ELEMENTS:.0e} elements can be held in memory: use larger elements or a smaller aperture"
                ),
            ));
        }
        let wavelength_m = scenario.beam.wavelength_m;
        let mut array = Array {
            x_m: Vec::new(),
            y_m: Vec::new(),
            amplitude: Vec::new(),
            phase_rad: Vec::new(),
            tilt_x_rad: Vec::new(),
            tilt_y_rad: Vec::new(),
            element: section.element,
            lattice: sites::lattice(&section.layout).map(|lattice| (lattice, section.pitch_m)),
            envelope_diameter_m: 0.0,
            wavelength_m,
            range_m: scenario.target.range_m,
            curvature_per_m: 0.0,
        };
        array.place(scenario)?;
        if array.is_empty() {
            return Err(no_element(scenario));
        }
        array.envelope_diameter_m = 2.0
            * (0..array.len())
                .map(|n| array.element.farthest_m(array.x_m[n], array.y_m[n]))
                .fold(0.0, f64::max);
        array.share_power(scenario);
        array.focus(scenario);
        Ok(array)
    }

    /// Fill positions, table weights (into `amplitude`, as power) and table offsets.
    fn place(&mut self, scenario: &Scenario) -> Result<(), ScenarioError> {
        let section = &scenario.array;
        let clear = |x: f64, y: f64| match section.hole_m {
            Some(hole_m) => sites::clear_of_hole(hole_m, section.keep, &section.element, x, y),
            None => true,
        };
        if let Layout::Table { file } = &section.layout {
            let mut rows = table::read(scenario, file)?;
            rows.retain(|row| clear(row.x_m, row.y_m));
            for row in &rows {
                self.x_m.push(row.x_m);
                self.y_m.push(row.y_m);
                self.amplitude.push(row.power);
                self.phase_rad.push(row.phase_rad);
                self.tilt_x_rad.push(row.tilt_x_rad);
                self.tilt_y_rad.push(row.tilt_y_rad);
            }
            if let Some((first, second)) = overlap::first_overlap(self) {
                let (first, second) = (rows[first], rows[second]);
                return Err(ScenarioError {
                    file: file.display().to_string(),
                    place: crate::error::Place::Line(second.line),
                    key: String::new(),
                    found: format!(
                        "the element at ({}, {}) m overlaps the one in line {}",
                        second.x_m, second.y_m, first.line
                    ),
                    allowed: "elements may touch, not overlap: move it or make array.element.size smaller"
                        .to_string(),
                    nearest: None,
                });
            }
            return Ok(());
        }
        for (x, y) in sites::sites(section) {
            if clear(x, y) {
                self.x_m.push(x);
                self.y_m.push(y);
            }
        }
        let count = self.x_m.len();
        self.amplitude = vec![1.0; count];
        self.phase_rad = vec![0.0; count];
        self.tilt_x_rad = vec![0.0; count];
        self.tilt_y_rad = vec![0.0; count];
        if let Layout::Rings { .. } = section.layout
            && let Some((first, second)) = overlap::first_overlap(self)
        {
            let apart =
                (self.x_m[first] - self.x_m[second]).hypot(self.y_m[first] - self.y_m[second]);
            return Err(scenario.error(
                "array.rings",
                format!("elements overlap: two centres lie {apart} m apart"),
                "use fewer elements in a ring, a larger pitch, or smaller elements",
            ));
        }
        Ok(())
    }

    /// Turn relative powers into √W: edge taper times the table's weights, scaled to the beam's power.
    fn share_power(&mut self, scenario: &Scenario) {
        let section = &scenario.array;
        let edge_m = match &section.layout {
            Layout::Outlined { across_m, .. } => across_m / 2.0,
            _ => (0..self.len())
                .map(|n| self.x_m[n].hypot(self.y_m[n]))
                .fold(0.0, f64::max),
        };
        for n in 0..self.len() {
            if edge_m > 0.0 {
                let (x, y) = (self.x_m[n] / edge_m, self.y_m[n] / edge_m);
                self.amplitude[n] *= 10f64.powf(-section.taper_db / 10.0 * (x * x + y * y));
            }
        }
        let total: f64 = self.amplitude.iter().sum();
        for weight in &mut self.amplitude {
            *weight = (scenario.beam.power_w * *weight / total).sqrt();
        }
    }

    /// Add the piston, tilt and curvature that focus and facets leave.
    fn focus(&mut self, scenario: &Scenario) {
        let range_m = scenario.target.range_m;
        let focus_m = scenario.target.focus_m;
        // An equal focus must cancel exactly, which the difference of reciprocals does.
        let c = 1.0 / range_m - 1.0 / focus_m;
        for n in 0..self.len() {
            let (x, y) = (self.x_m[n], self.y_m[n]);
            self.phase_rad[n] += self.wavenumber() * c * (x * x + y * y) / 2.0;
            self.tilt_x_rad[n] += c * x;
            self.tilt_y_rad[n] += c * y;
        }
        self.curvature_per_m = match scenario.target.facets {
            Facets::Curved => c,
            Facets::Flat => 1.0 / range_m,
        };
    }

    /// Number of elements.
    pub fn len(&self) -> usize {
        self.x_m.len()
    }

    /// Whether there is no element (never, for an array made from a scenario).
    pub fn is_empty(&self) -> bool {
        self.x_m.is_empty()
    }

    /// k = 2π/λ in rad/m.
    pub fn wavenumber(&self) -> f64 {
        TAU / self.wavelength_m
    }

    /// λ·range/D in metres.
    pub fn spot_m(&self) -> f64 {
        self.wavelength_m * self.range_m / self.envelope_diameter_m
    }

    /// Power with every element lit, in watts.
    pub fn power_w(&self) -> f64 {
        self.amplitude
            .iter()
            .map(|amplitude| amplitude * amplitude)
            .sum()
    }

    /// Area of the circle D.
    pub fn envelope_area_m2(&self) -> f64 {
        PI / 4.0 * self.envelope_diameter_m * self.envelope_diameter_m
    }

    /// Area that radiates.
    pub fn emitting_area_m2(&self) -> f64 {
        self.len() as f64 * self.element.open_area_m2()
    }

    /// Emitting area over the area of the circle D.
    pub fn fill_factor(&self) -> f64 {
        self.emitting_area_m2() / self.envelope_area_m2()
    }

    /// Emitting area of an element over the area of a lattice cell; `None` without a lattice.
    pub fn cell_fill_factor(&self) -> Option<f64> {
        let (lattice, pitch_m) = self.lattice?;
        Some(self.element.open_area_m2() / sites::cell_area_m2(lattice, pitch_m))
    }

    /// Angle between the main lobe and the nearest grating lobe: λ/pitch on a square
    /// lattice, 2λ/(√3·pitch) on a hexagonal one; `None` where the layout has none.
    pub fn grating_lobe_spacing_rad(&self) -> Option<f64> {
        let (lattice, pitch_m) = self.lattice.filter(|_| self.len() > 1)?;
        Some(match lattice {
            Lattice::Square => self.wavelength_m / pitch_m,
            Lattice::Hexagonal => 2.0 / element::SQRT_3 * self.wavelength_m / pitch_m,
        })
    }

    /// π(D/2)⁴/(4λ·range³): the phase in radians at the aperture's edge that the
    /// Fresnel integral leaves out (Goodman, *Introduction to Fourier Optics*, section
    /// on the Fresnel approximation; from memory). It must be well below 1.
    pub fn paraxial_phase_rad(&self) -> f64 {
        PI * (self.envelope_diameter_m / 2.0).powi(4)
            / (4.0 * self.wavelength_m * self.range_m.powi(3))
    }

    /// Largest static tilt along either axis.
    pub fn largest_tilt_rad(&self) -> f64 {
        self.tilt_x_rad
            .iter()
            .chain(&self.tilt_y_rad)
            .fold(0.0, |largest: f64, tilt| largest.max(tilt.abs()))
    }
}

/// The error for a layout that keeps no element, with what would let one in.
fn no_element(scenario: &Scenario) -> ScenarioError {
    let size_m = scenario.array.element.size_m;
    match &scenario.array.layout {
        Layout::Outlined { across_m, .. } => scenario.error(
            "array.across",
            format!("an outline {across_m} m across holds no element of {size_m} m"),
            "make it larger, the elements or the hole smaller, or set keep = \"centre\"",
        ),
        _ => scenario.error(
            "array.hole",
            "the hole leaves no element",
            "make it smaller",
        ),
    }
}
