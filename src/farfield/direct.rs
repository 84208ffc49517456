//! `direct`: the sum over elements at each map point. Slow, obvious, exact.

use super::choose::Task;
use super::map::{Grid, Map};
use super::pattern::{ElementPattern, Wavefront};
use super::{FarField, Method, Radiated, Worker, largest_angle_rad};
use crate::array::{Array, Elements};
use crate::perturb::{Draw, TrialErrors};
use num_complex::Complex64;
use rayon::prelude::*;

/// Elements whose phasors along u are held at once.
const BLOCK: usize = 512;

/// The direct sum.
#[derive(Debug)]
pub struct Direct<'a> {
    array: &'a Array,
    elements: Elements,
    grid: Grid,
    pattern: ElementPattern,
}

impl<'a> Direct<'a> {
    /// Prepare the sum.
    pub fn new(array: &'a Array, task: Task) -> Direct<'a> {
        let wavefront = Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad: task.mean_over_tilt_rad,
        };
        let reach = largest_angle_rad(array, task);
        Direct {
            array,
            elements: array.list(),
            grid: task.grid,
            pattern: ElementPattern::new(&array.element, array.wavenumber(), wavefront, reach),
        }
    }

    /// Irradiance of the array without errors in one direction, in W/m².
    pub fn irradiance_without_errors_at(&self, theta_x_rad: f64, theta_y_rad: f64) -> f64 {
        let (elements, k) = (&self.elements, self.array.wavenumber());
        let field: Complex64 = (0..elements.len())
            .map(|n| {
                let phase = elements.phase_rad[n]
                    - k * (theta_x_rad * elements.x_m[n] + theta_y_rad * elements.y_m[n]);
                let pattern = self.pattern.at(
                    theta_x_rad - elements.tilt_x_rad[n],
                    theta_y_rad - elements.tilt_y_rad[n],
                );
                Complex64::from_polar(elements.amplitude[n], phase) * pattern
            })
            .sum();
        field.norm_sqr() / (self.array.wavelength_m * self.array.range_m).powi(2)
    }

    /// Fields at the map's pixels, in √W·m.
    fn fields(&self, draw: &Draw) -> Vec<Complex64> {
        let (elements, k, pixels) = (&self.elements, self.array.wavenumber(), self.grid.pixels);
        // A tilt of the whole array shifts the whole pattern.
        let shifted = |common: f64| -> Vec<f64> {
            let axis = self.grid.axis_m();
            axis.iter()
                .map(|u| u / self.array.range_m - common)
                .collect()
        };
        let theta_x = shifted(draw.common_tilt_rad.0);
        let theta_y = shifted(draw.common_tilt_rad.1);
        let tilt = |n: usize| {
            (
                elements.tilt_x_rad[n] + draw.tilt_x_rad[n],
                elements.tilt_y_rad[n] + draw.tilt_y_rad[n],
            )
        };
        // One tilt for all: the pattern leaves the sum.
        let first = tilt(0);
        let shared = (0..elements.len()).all(|n| tilt(n) == first);
        let mut fields = vec![Complex64::default(); pixels * pixels];
        let mut phasors = vec![Complex64::default(); BLOCK * pixels];
        for block in (0..elements.len()).step_by(BLOCK) {
            let numbers = block..(block + BLOCK).min(elements.len());
            phasors
                .par_chunks_mut(pixels)
                .zip(numbers.clone())
                .for_each(|(row, n)| {
                    let amplitude = elements.amplitude[n] * draw.amplitude[n];
                    let phase = elements.phase_rad[n] + draw.phase_rad[n];
                    for (value, theta_x) in row.iter_mut().zip(&theta_x) {
                        let phase = phase - k * theta_x * elements.x_m[n];
                        *value = Complex64::from_polar(amplitude, phase);
                    }
                });
            fields
                .par_chunks_mut(pixels)
                .zip(&theta_y)
                .for_each(|(line, &theta_y)| {
                    for (row, n) in phasors.chunks_exact(pixels).zip(numbers.clone()) {
                        let along_y = Complex64::cis(-k * theta_y * elements.y_m[n]);
                        if shared {
                            for (field, phasor) in line.iter_mut().zip(row) {
                                *field += along_y * phasor;
                            }
                        } else {
                            let (tilt_x, tilt_y) = tilt(n);
                            for ((field, phasor), theta_x) in line.iter_mut().zip(row).zip(&theta_x)
                            {
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
                .zip(&theta_y)
                .for_each(|(line, theta_y)| {
                    for (field, theta_x) in line.iter_mut().zip(&theta_x) {
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
        Box::new(DirectWorker {
            direct: self,
            draw: Draw::default(),
        })
    }
}

struct DirectWorker<'a> {
    direct: &'a Direct<'a>,
    draw: Draw,
}

impl Worker for DirectWorker<'_> {
    fn irradiance(&mut self, trial: TrialErrors<'_>, map: &mut Map) -> Radiated {
        let direct = self.direct;
        self.draw.redraw(direct.array, trial);
        let scale = (direct.array.wavelength_m * direct.array.range_m).powi(-2);
        let fields = direct.fields(&self.draw);
        for (value, field) in map.irradiance_w_m2.iter_mut().zip(fields) {
            *value = field.norm_sqr() * scale;
        }
        Radiated::of(&direct.elements, &self.draw)
    }
}
