//! Layouts and elements → positions, amplitudes, and what follows from them.

use crate::scenario::Element;

/// A tiled aperture as a structure of arrays.
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
    /// Diameter of the smallest circle around the axis that holds every element whole.
    pub envelope_diameter_m: f64,
}

impl Array {
    /// Number of elements.
    pub fn len(&self) -> usize {
        self.x_m.len()
    }

    /// Whether there is no element (never, for an array made from a scenario).
    pub fn is_empty(&self) -> bool {
        self.x_m.is_empty()
    }
}
