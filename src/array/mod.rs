//! Layouts and elements → positions, amplitudes, and what follows from them.

pub mod bands;
pub mod element;
mod overlap;
pub mod sites;
mod table;

use crate::error::{Place, ScenarioError};
use crate::scenario::{Element, Facets, Layout, Scenario};
use sites::LatticeSites;
use std::f64::consts::{LN_10, PI, TAU};

/// Most elements: beyond, a single trial takes minutes.
const MOST_ELEMENTS: f64 = 2e10;

/// A tiled aperture, with the light it carries.
///
/// The static part of each element's phase and tilt (a table's offsets, and what
/// a focus away from the target leaves) belongs to the array, not to its errors.
#[derive(Debug, Clone, PartialEq)]
pub struct Array {
    /// Where the elements sit, and the light that each carries.
    pub sites: Sites,
    /// The element at every site.
    pub element: Element,
    /// Diameter D of the smallest circle around the axis that holds every element whole.
    pub envelope_diameter_m: f64,
    /// Wavelength.
    pub wavelength_m: f64,
    /// Distance to the target plane.
    pub range_m: f64,
    /// c = 1/range − 1/focus of the phase k c|r|²/2 that focusing elsewhere leaves over the array.
    pub defocus_per_m: f64,
    /// c of the phase k c|s|²/2 that is left inside each element.
    pub curvature_per_m: f64,
}

/// Where the elements sit.
#[derive(Debug, Clone, PartialEq)]
pub enum Sites {
    /// On a lattice, never listed.
    Lattice {
        /// The sites.
        sites: LatticeSites,
        /// √P of an element on the axis, in √W.
        amplitude: f64,
        /// √P falls as exp(−taper_per_m2·r²).
        taper_per_m2: f64,
    },
    /// Anywhere: centres, √P, and a table's own offsets (without what the focus leaves).
    List(Elements),
}

/// Elements as a structure of arrays.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Elements {
    /// Centres, x.
    pub x_m: Vec<f64>,
    /// Centres, y.
    pub y_m: Vec<f64>,
    /// √P, in √W, with every element lit.
    pub amplitude: Vec<f64>,
    /// Static phase.
    pub phase_rad: Vec<f64>,
    /// Static tilt along x.
    pub tilt_x_rad: Vec<f64>,
    /// Static tilt along y.
    pub tilt_y_rad: Vec<f64>,
}

impl Elements {
    /// Number of elements.
    pub fn len(&self) -> usize {
        self.x_m.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.x_m.is_empty()
    }

    fn push(&mut self, x_m: f64, y_m: f64, amplitude: f64) {
        self.x_m.push(x_m);
        self.y_m.push(y_m);
        self.amplitude.push(amplitude);
        self.phase_rad.push(0.0);
        self.tilt_x_rad.push(0.0);
        self.tilt_y_rad.push(0.0);
    }
}

impl Array {
    /// Lay out the elements of a scenario.
    ///
    /// A focus f away from the range L leaves, with c = 1/L − 1/f, the piston
    /// k c |r|²/2 and the tilt c r of an element at r, and k c |s|²/2 inside it; flat
    /// facets leave k |s|²/(2L) inside (Fresnel's integral, expanded about r).
    ///
    /// # Errors
    /// An unusable table, an outline or hole that leaves no element, elements that overlap, or too many.
    pub fn new(scenario: &Scenario) -> Result<Array, ScenarioError> {
        let section = &scenario.array;
        let foreseen = sites::foreseen(section);
        if foreseen > MOST_ELEMENTS {
            return Err(scenario.error(
                "array",
                format!("about {foreseen:.0e} elements"),
                format!(
                    "at most {MOST_ELEMENTS:.0e} can be computed: use fewer, or a larger pitch"
                ),
            ));
        }
        let sites = match sites::lattice_sites(section) {
            Some(sites) if sites.is_empty() => return Err(no_element(scenario)),
            Some(sites) => tapered(scenario, sites),
            None => Sites::List(listed(scenario)?),
        };
        let range_m = scenario.target.range_m;
        let defocus_per_m = 1.0 / range_m - 1.0 / scenario.target.focus_m;
        let mut array = Array {
            sites,
            element: section.element,
            envelope_diameter_m: 0.0,
            wavelength_m: scenario.beam.wavelength_m,
            range_m,
            defocus_per_m,
            curvature_per_m: match scenario.target.facets {
                Facets::Curved => defocus_per_m,
                Facets::Flat => 1.0 / range_m,
            },
        };
        array.envelope_diameter_m =
            2.0 * array.farthest(|x_m, y_m| section.element.farthest_m(x_m, y_m));
        Ok(array)
    }

    /// Number of elements.
    pub fn len(&self) -> usize {
        match &self.sites {
            Sites::Lattice { sites, .. } => sites.len(),
            Sites::List(elements) => elements.len(),
        }
    }

    /// Whether there is no element (never, for an array made from a scenario).
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Every element, listed: 48 bytes each.
    pub fn list(&self) -> Elements {
        let mut elements = match &self.sites {
            Sites::List(elements) => elements.clone(),
            Sites::Lattice {
                sites,
                amplitude,
                taper_per_m2,
            } => {
                let mut elements = Elements::default();
                for row in &sites.rows {
                    for column in row.columns() {
                        let x_m = sites.x_m(row.parity, column);
                        let square = x_m * x_m + row.y_m * row.y_m;
                        elements.push(x_m, row.y_m, amplitude * (-taper_per_m2 * square).exp());
                    }
                }
                elements
            }
        };
        let c = self.defocus_per_m;
        for n in 0..elements.len() {
            let (x, y) = (elements.x_m[n], elements.y_m[n]);
            elements.phase_rad[n] += self.wavenumber() * c * (x * x + y * y) / 2.0;
            elements.tilt_x_rad[n] += c * x;
            elements.tilt_y_rad[n] += c * y;
        }
        elements
    }

    /// Σ √Pᵖ over the elements.
    pub fn amplitude_sum(&self, power: i32) -> f64 {
        match &self.sites {
            Sites::List(elements) => elements.amplitude.iter().map(|a| a.powi(power)).sum(),
            Sites::Lattice {
                sites,
                amplitude,
                taper_per_m2,
            } => amplitude.powi(power) * lattice_sum(sites, f64::from(power) * taper_per_m2),
        }
    }

    /// The largest value over the elements of a function that grows outwards along every row.
    fn farthest(&self, of: impl Fn(f64, f64) -> f64) -> f64 {
        match &self.sites {
            Sites::List(elements) => (0..elements.len())
                .map(|n| of(elements.x_m[n], elements.y_m[n]))
                .fold(0.0, f64::max),
            Sites::Lattice { sites, .. } => farthest_on_lattice(sites, of),
        }
    }

    /// Bound on |x| and |y| of every site, idle columns of a lattice included.
    pub fn reach_m(&self) -> f64 {
        let largest = |positions: &mut dyn Iterator<Item = f64>| {
            positions.fold(0.0, |reach: f64, position| reach.max(position.abs()))
        };
        match &self.sites {
            Sites::List(elements) => {
                largest(&mut elements.x_m.iter().chain(&elements.y_m).copied())
            }
            Sites::Lattice { sites, .. } => {
                let last = sites.columns.saturating_sub(1);
                let ends = [0, 1].map(|parity| [sites.x_m(parity, 0), sites.x_m(parity, last)]);
                let rows = sites.rows.iter().map(|row| row.y_m);
                largest(&mut ends.into_iter().flatten().chain(rows))
            }
        }
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
        self.amplitude_sum(2)
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

    /// The lattice of the sites, if they have one.
    pub fn lattice(&self) -> Option<&LatticeSites> {
        match &self.sites {
            Sites::Lattice { sites, .. } => Some(sites),
            Sites::List(_) => None,
        }
    }

    /// Emitting area of an element over the area of a lattice cell; `None` without a lattice.
    pub fn cell_fill_factor(&self) -> Option<f64> {
        let sites = self.lattice()?;
        Some(self.element.open_area_m2() / sites::cell_area_m2(sites.lattice, sites.pitch_m))
    }

    /// Angle between the main lobe and the nearest grating lobe: λ/pitch on a square
    /// lattice, 2λ/(√3·pitch) on a hexagonal one; `None` where the layout has none.
    pub fn grating_lobe_spacing_rad(&self) -> Option<f64> {
        let sites = self.lattice().filter(|_| self.len() > 1)?;
        let order = self.wavelength_m / sites.pitch_m;
        Some(match sites.lattice {
            crate::scenario::Lattice::Square => order,
            crate::scenario::Lattice::Hexagonal => 2.0 / element::SQRT_3 * order,
        })
    }

    /// π(D/2)⁴/(4λ·range³): the phase in radians at the aperture's edge that the
    /// Fresnel integral leaves out (Goodman, *Introduction to Fourier Optics*, section
    /// on the Fresnel approximation; from memory). It must be well below 1.
    pub fn paraxial_phase_rad(&self) -> f64 {
        PI * (self.envelope_diameter_m / 2.0).powi(4)
            / (4.0 * self.wavelength_m * self.range_m.powi(3))
    }

    /// Bound on the static tilt along either axis: what the focus leaves, and a table's own.
    pub fn largest_tilt_rad(&self) -> f64 {
        let own = match &self.sites {
            Sites::Lattice { .. } => 0.0,
            Sites::List(elements) => elements
                .tilt_x_rad
                .iter()
                .chain(&elements.tilt_y_rad)
                .fold(0.0, |largest: f64, tilt| largest.max(tilt.abs())),
        };
        own + self.defocus_per_m.abs() * self.envelope_diameter_m / 2.0
    }

    /// Whether some element has a phase of its own when nothing is in error.
    pub fn has_static_phase(&self) -> bool {
        let own = match &self.sites {
            Sites::Lattice { .. } => false,
            Sites::List(elements) => elements.phase_rad.iter().any(|phase| phase.abs() > 0.0),
        };
        own || self.defocus_per_m.abs() > 0.0
    }
}

/// The largest value over lattice elements of a function that grows outwards along every row.
fn farthest_on_lattice(sites: &LatticeSites, of: impl Fn(f64, f64) -> f64) -> f64 {
    sites
        .rows
        .iter()
        .filter_map(|row| {
            let (first, last) = row.ends()?;
            let at = |column| of(sites.x_m(row.parity, column), row.y_m);
            Some(at(first).max(at(last)))
        })
        .fold(0.0, f64::max)
}

/// Σ exp(−`per_m2`·r²) over lattice elements, by running sums along one row of each parity.
fn lattice_sum(sites: &LatticeSites, per_m2: f64) -> f64 {
    if per_m2 <= 0.0 {
        return sites.len() as f64;
    }
    let running = [0, 1].map(|parity| {
        let mut sums = vec![0.0];
        for column in 0..sites.columns {
            let x = sites.x_m(parity, column);
            sums.push(sums[column] + (-per_m2 * x * x).exp());
        }
        sums
    });
    sites
        .rows
        .iter()
        .map(|row| {
            let sums = &running[row.parity];
            let along: f64 = row
                .spans
                .iter()
                .map(|span| sums[span.end] - sums[span.start])
                .sum();
            along * (-per_m2 * row.y_m * row.y_m).exp()
        })
        .sum()
}

/// Give lattice sites their amplitudes: edge taper, scaled to the beam's power.
fn tapered(scenario: &Scenario, sites: LatticeSites) -> Sites {
    let section = &scenario.array;
    let edge_m = match &section.layout {
        Layout::Outlined { across_m, .. } => across_m / 2.0,
        _ => farthest_on_lattice(&sites, f64::hypot),
    };
    // Power falls as 10^(−T/10·r²/R²): √P as exp(−T·ln 10/20·r²/R²).
    let taper_per_m2 = if edge_m > 0.0 {
        section.taper_db * LN_10 / 20.0 / (edge_m * edge_m)
    } else {
        0.0
    };
    Sites::Lattice {
        amplitude: (scenario.beam.power_w / lattice_sum(&sites, 2.0 * taper_per_m2)).sqrt(),
        taper_per_m2,
        sites,
    }
}

/// Elements of rings and tables, with their amplitudes.
fn listed(scenario: &Scenario) -> Result<Elements, ScenarioError> {
    let section = &scenario.array;
    let clear = |x: f64, y: f64| match section.hole_m {
        Some(hole_m) => sites::clear_of_hole(hole_m, section.keep, &section.element, x, y),
        None => true,
    };
    let mut elements = Elements::default();
    match &section.layout {
        Layout::Table { file } => {
            let mut rows = table::read(scenario, file)?;
            rows.retain(|row| clear(row.x_m, row.y_m));
            for (n, row) in rows.iter().enumerate() {
                elements.push(row.x_m, row.y_m, row.power.sqrt());
                elements.phase_rad[n] = row.phase_rad;
                elements.tilt_x_rad[n] = row.tilt_x_rad;
                elements.tilt_y_rad[n] = row.tilt_y_rad;
            }
            if let Some((first, second)) = overlap::first_overlap(&elements, &section.element) {
                let (first, second) = (rows[first], rows[second]);
                return Err(ScenarioError {
                    file: file.display().to_string(),
                    place: Place::Line(second.line),
                    key: String::new(),
                    found: format!(
                        "the element at ({}, {}) m overlaps the one in line {}",
                        second.x_m, second.y_m, first.line
                    ),
                    allowed:
                        "elements may touch, not overlap: move it or make array.element.size smaller"
                            .to_string(),
                    nearest: None,
                });
            }
        }
        Layout::Rings { counts } => {
            for (x, y) in sites::ring_sites(counts, section.pitch_m) {
                if clear(x, y) {
                    elements.push(x, y, 1.0);
                }
            }
            if let Some((first, second)) = overlap::first_overlap(&elements, &section.element) {
                let apart = (elements.x_m[first] - elements.x_m[second])
                    .hypot(elements.y_m[first] - elements.y_m[second]);
                return Err(scenario.error(
                    "array.rings",
                    format!("elements overlap: two centres lie {apart} m apart"),
                    "use fewer elements in a ring, a larger pitch, or smaller elements",
                ));
            }
        }
        _ => {}
    }
    let squares = |n: usize| elements.x_m[n].powi(2) + elements.y_m[n].powi(2);
    let edge_square = (0..elements.len()).map(squares).fold(0.0, f64::max);
    if edge_square > 0.0 {
        for n in 0..elements.len() {
            let way = (elements.x_m[n].powi(2) + elements.y_m[n].powi(2)) / edge_square;
            elements.amplitude[n] *= 10f64.powf(-section.taper_db / 20.0 * way);
        }
    }
    let total: f64 = elements.amplitude.iter().map(|a| a * a).sum();
    if total <= 0.0 {
        return Err(no_element(scenario));
    }
    for amplitude in &mut elements.amplitude {
        *amplitude *= (scenario.beam.power_w / total).sqrt();
    }
    Ok(elements)
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
            "the hole leaves no element that radiates",
            "make it smaller",
        ),
    }
}
