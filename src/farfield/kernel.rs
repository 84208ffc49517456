//! Spreading points onto a grid: a compact kernel, and the axis that it works on.
//!
//! The array factor Σ zₙ exp(−ikθ·rₙ) on the map's uniform directions is a Fourier sum
//! of points at anything but grid places. Each point is spread over a few cells of an
//! oversampled grid by a smooth kernel, the grid is transformed, and the kernel's own
//! transform divided out (Dutt & Rokhlin, SIAM J. Sci. Comput. 14, 1368 (1993)). The
//! kernel is exp(β(√(1 − (2t/w)²) − 1)) over w cells (Barnett, Magland & af Klinteberg,
//! SIAM J. Sci. Comput. 41, C479 (2019)).

use super::fft::good_single_length;
use super::map::Grid;
use super::quadrature::gauss_legendre;
use crate::array::Array;
use std::f64::consts::{PI, TAU};

/// Cells that a point is spread over, per axis.
///
/// With this width and [`OVERSAMPLING`] the strongest alias at the map's edge is 3e-7.
pub const WIDTH: usize = 9;
/// Grid cells per map pixel, at least.
const OVERSAMPLING: f64 = 1.7;

/// The oversampled grid along one axis.
#[derive(Debug, Clone)]
pub struct Axis {
    /// Transform length.
    pub length: usize,
    /// Lowest cell that a point may touch (cell c lies at coordinate c/length).
    pub first_cell: i64,
    /// Cells that points may touch.
    pub cells: usize,
    /// Cells per metre in the aperture.
    cells_per_m: f64,
    beta: f64,
    /// Place of each cell on the transform's circle.
    pub places: Vec<usize>,
    /// 1/(kernel's transform) at each map pixel.
    pub deconvolution: Vec<f32>,
}

impl Axis {
    /// For the points of an array and the directions of a map.
    pub fn new(array: &Array, grid: Grid) -> Axis {
        // A spread of WIDTH cells must not meet itself around the grid.
        let least = (OVERSAMPLING * grid.pixels as f64).ceil() as usize;
        let length = good_single_length(least.max(2 * WIDTH + 2));
        let oversampling = length as f64 / grid.pixels as f64;
        // Just below the kernel's band limit at this oversampling (same paper, equation 4.5).
        let beta = 0.976 * PI * WIDTH as f64 * (1.0 - 0.5 / oversampling.min(3.0));
        // One period of the grid is λ·range/pixel in the aperture.
        let cells_per_m = length as f64 * grid.pixel_m / (array.wavelength_m * array.range_m);
        let edge = array.reach_m() * cells_per_m;
        let first_cell = (-edge).floor() as i64 - WIDTH as i64 / 2;
        let cells = (edge.ceil() as i64 + WIDTH as i64 / 2 - first_cell) as usize + 1;
        let mut axis = Axis {
            length,
            first_cell,
            cells,
            cells_per_m,
            beta,
            places: (first_cell..first_cell + cells as i64)
                .map(|cell| cell.rem_euclid(length as i64) as usize)
                .collect(),
            deconvolution: Vec::new(),
        };
        let half = WIDTH as f64 / 2.0;
        let rule = gauss_legendre(40, 0.0, half);
        let centre = grid.centre() as f64;
        axis.deconvolution = (0..grid.pixels)
            .map(|pixel| {
                let frequency = (pixel as f64 - centre) / length as f64;
                let transform: f64 = rule
                    .iter()
                    .map(|(t, weight)| 2.0 * weight * axis.kernel(*t) * (TAU * frequency * t).cos())
                    .sum();
                (1.0 / transform) as f32
            })
            .collect();
        axis
    }

    fn kernel(&self, t: f64) -> f64 {
        let x = t / (WIDTH as f64 / 2.0);
        if x.abs() >= 1.0 {
            return 0.0;
        }
        (self.beta * ((1.0 - x * x).sqrt() - 1.0)).exp()
    }

    /// Place (from `first_cell`) of the first cell that a point at `position_m` touches, and its weights.
    pub fn spread(&self, position_m: f64) -> (usize, [f64; WIDTH]) {
        let position = position_m * self.cells_per_m;
        let first = (position - WIDTH as f64 / 2.0).ceil();
        let mut weights = [0.0; WIDTH];
        for (tap, weight) in weights.iter_mut().enumerate() {
            *weight = self.kernel(first + tap as f64 - position);
        }
        ((first as i64 - self.first_cell) as usize, weights)
    }
}
