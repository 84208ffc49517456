//! `direct`: the sum over elements at each map point. Slow, obvious, exact.

use super::map::{Grid, Map};
use super::pattern::{ElementPattern, Wavefront};
use super::{FarField, Method, Worker, largest_angle_rad};
use crate::array::Array;
use crate::perturb::Draw;
use num_complex::Complex64;
use rayon::prelude::*;

/// Elements whose phasors along u are held at once.
const BLOCK: usize = 512;

/// The direct sum.
#[derive(Debug)]
pub struct Direct<'a> {
    array: &'a Array,
    grid: Grid,
    pattern: ElementPattern,
}

impl<'a> Direct<'a> {
    /// Prepare the sum; `mean_over_tilt_rad` as in [`Wavefront`], `random_tilt_rad` the rms of the tilts to come.
    pub fn new(
        array: &'a Array,
        grid: Grid,
        mean_over_tilt_rad: f64,
        random_tilt_rad: f64,
    ) -> Direct<'a> {
        let wavefront = Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad,
        };
        let reach = largest_angle_rad(array, grid, random_tilt_rad);
        Direct {
            array,
            grid,
            pattern: ElementPattern::new(&array.element, array.wavenumber(), wavefront, reach),
        }
    }

    /// Irradiance in one direction, in W/m².
    pub fn irradiance_at(&self, draw: &Draw, theta_x_rad: f64, theta_y_rad: f64) -> f64 {
        let (array, k) = (self.array, self.array.wavenumber());
        let field: Complex64 = (0..array.len())
            .map(|n| {
                let phase = array.phase_rad[n] + draw.phase_rad[n]
                    - k * (theta_x_rad * array.x_m[n] + theta_y_rad * array.y_m[n]);
                let tilt_x = array.tilt_x_rad[n] + draw.tilt_x_rad[n];
                let tilt_y = array.tilt_y_rad[n] + draw.tilt_y_rad[n];
                Complex64::from_polar(array.amplitude[n] * draw.amplitude[n], phase)
                    * self.pattern.at(theta_x_rad - tilt_x, theta_y_rad - tilt_y)
            })
            .sum();
        field.norm_sqr() / (array.wavelength_m * array.range_m).powi(2)
    }

    fn fields(&self, draw: &Draw) -> Vec<Complex64> {
        let (array, k, pixels) = (self.array, self.array.wavenumber(), self.grid.pixels);
        let theta: Vec<f64> = self
            .grid
            .axis_m()
            .iter()
            .map(|u| u / array.range_m)
            .collect();
        let tilt = |n: usize| {
            (
                array.tilt_x_rad[n] + draw.tilt_x_rad[n],
                array.tilt_y_rad[n] + draw.tilt_y_rad[n],
            )
        };
        // One tilt for all: the pattern leaves the sum.
        let first = tilt(0);
        let shared = (0..array.len()).all(|n| tilt(n) == first);
        let mut fields = vec![Complex64::default(); pixels * pixels];
        let mut phasors = vec![Complex64::default(); BLOCK * pixels];
        for block in (0..array.len()).step_by(BLOCK) {
            let elements = block..(block + BLOCK).min(array.len());
            phasors
                .par_chunks_mut(pixels)
                .zip(elements.clone())
                .for_each(|(row, n)| {
                    let amplitude = array.amplitude[n] * draw.amplitude[n];
                    let phase = array.phase_rad[n] + draw.phase_rad[n];
                    for (value, theta_x) in row.iter_mut().zip(&theta) {
                        *value =
                            Complex64::from_polar(amplitude, phase - k * theta_x * array.x_m[n]);
                    }
                });
            fields
                .par_chunks_mut(pixels)
                .zip(&theta)
                .for_each(|(line, &theta_y)| {
                    for (row, n) in phasors.chunks_exact(pixels).zip(elements.clone()) {
                        let along_y = Complex64::cis(-k * theta_y * array.y_m[n]);
                        if shared {
                            for (field, phasor) in line.iter_mut().zip(row) {
                                *field += along_y * phasor;
                            }
                        } else {
                            let (tilt_x, tilt_y) = tilt(n);
                            for ((field, phasor), theta_x) in line.iter_mut().zip(row).zip(&theta) {
                                *field += along_y
                                    * phasor
                                    * self.pattern.at(theta_x - tilt_x, theta_y - tilt_y);
                            }
                        }
                    }
                });
        }
        if shared {
            fields
                .par_chunks_mut(pixels)
                .zip(&theta)
                .for_each(|(line, theta_y)| {
                    for (field, theta_x) in line.iter_mut().zip(&theta) {
                        *field *= self.pattern.at(theta_x - first.0, theta_y - first.1);
                    }
                });
        }
        fields
    }
}

impl FarField for Direct<'_> {
    fn method(&self) -> Method {
        Method::Direct
    }

    fn grid(&self) -> Grid {
        self.grid
    }

    fn worker(&self) -> Box<dyn Worker + '_> {
        Box::new(DirectWorker(self))
    }
}

struct DirectWorker<'a>(&'a Direct<'a>);

impl Worker for DirectWorker<'_> {
    fn irradiance(&mut self, draw: &Draw, map: &mut Map) {
        let scale = (self.0.array.wavelength_m * self.0.array.range_m).powi(-2);
        for (value, field) in map.irradiance_w_m2.iter_mut().zip(self.0.fields(draw)) {
            *value = field.norm_sqr() * scale;
        }
    }
}
