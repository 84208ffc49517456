//! A square map drawn at any size: smooth when enlarged, averaged when reduced.

use crate::farfield::map::Map;

/// Samples of a square part of a map.
#[derive(Debug)]
pub(super) struct Samples {
    side: usize,
    values: Vec<f64>,
}

impl Samples {
    /// `side × side` values over ±`half_width_m` about the aim point.
    ///
    /// A map is sampled at least as finely as its band limit asks, so that the
    /// Lanczos kernel restores what lies between its pixels; reduced, the same
    /// kernel is widened to the new pixel and nothing is skipped.
    pub fn of(map: &Map, half_width_m: f64, side: usize) -> Samples {
        let pixels = map.grid.pixels;
        let usable = pixels > 0
            && map.grid.pixel_m > 0.0
            && half_width_m > 0.0
            && map.irradiance_w_m2.len() == pixels * pixels;
        if !usable {
            return Samples {
                side,
                values: vec![0.0; side * side],
            };
        }
        let taps: Vec<Taps> = (0..side)
            .map(|index| {
                let step_m = 2.0 * half_width_m / side as f64;
                let at_m = (index as f64 + 0.5) * step_m - half_width_m;
                Taps::about(
                    at_m / map.grid.pixel_m + map.grid.centre() as f64,
                    (step_m / map.grid.pixel_m).max(1.0),
                    pixels,
                )
            })
            .collect();
        let first_row = taps.iter().map(|taps| taps.first).min().unwrap_or(0);
        let last_row = taps
            .iter()
            .map(|taps| taps.first + taps.weights.len())
            .max()
            .unwrap_or(0);
        let narrowed: Vec<f64> = map.irradiance_w_m2[first_row * pixels..last_row * pixels]
            .chunks(pixels)
            .flat_map(|row| taps.iter().map(|taps| taps.weigh(|at| row[at])))
            .collect();
        let mut values = vec![0.0; side * side];
        for (line, taps) in values.chunks_mut(side).zip(&taps) {
            for (weight, row) in taps.weights.iter().zip(taps.first - first_row..) {
                let row = &narrowed[row * side..(row + 1) * side];
                for (value, part) in line.iter_mut().zip(row) {
                    *value += weight * part;
                }
            }
            for value in line {
                // The kernel rings below zero beside a hard edge.
                *value = value.max(0.0);
            }
        }
        Samples { side, values }
    }

    /// Value at a row (v, ascending) and column (u).
    pub fn at(&self, row: usize, column: usize) -> f64 {
        if row < self.side && column < self.side {
            self.values[row * self.side + column]
        } else {
            0.0
        }
    }
}

/// Weights of neighbouring pixels.
struct Taps {
    first: usize,
    weights: Vec<f64>,
}

impl Taps {
    /// About a place in pixels, `stretch` pixels to the new pixel.
    fn about(at: f64, stretch: f64, pixels: usize) -> Taps {
        const LOBES: f64 = 3.0;
        let reach = LOBES * stretch;
        let last_pixel = (pixels - 1) as f64;
        let first = (at - reach).ceil().clamp(0.0, last_pixel) as usize;
        let last = (at + reach).floor().clamp(0.0, last_pixel) as usize;
        let mut weights: Vec<f64> = (first..=last.max(first))
            .map(|pixel| {
                let distance = (pixel as f64 - at) / stretch;
                sinc(distance) * sinc(distance / LOBES)
            })
            .collect();
        let sum: f64 = weights.iter().sum();
        if sum.abs() > 1e-6 {
            weights.iter_mut().for_each(|weight| *weight /= sum);
        } else {
            let even = 1.0 / weights.len() as f64;
            weights.fill(even);
        }
        Taps { first, weights }
    }

    /// Undefined values count as none.
    fn weigh(&self, value_at: impl Fn(usize) -> f64) -> f64 {
        self.weights
            .iter()
            .zip(self.first..)
            .map(|(weight, at)| {
                let value = value_at(at);
                if value.is_finite() {
                    weight * value
                } else {
                    0.0
                }
            })
            .sum()
    }
}

fn sinc(x: f64) -> f64 {
    let x = std::f64::consts::PI * x;
    if x.abs() < 1e-9 { 1.0 } else { x.sin() / x }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::farfield::map::Grid;

    fn bump(pixels: usize) -> Map {
        let grid = Grid {
            pixels,
            pixel_m: 1.0,
        };
        let axis = grid.axis_m();
        let irradiance_w_m2 = axis
            .iter()
            .flat_map(|v| {
                axis.iter()
                    .map(move |u| (-((u - 2.0).powi(2) + v * v) / 32.0).exp())
            })
            .collect();
        Map {
            grid,
            irradiance_w_m2,
        }
    }

    #[test]
    fn a_smooth_map_is_restored_between_its_pixels() {
        let samples = Samples::of(&bump(41), 10.25, 82);
        let (row, column) = (41, 53);
        let at = |index: usize| (index as f64 + 0.5) * 0.25 - 10.25;
        let expected = (-((at(column) - 2.0).powi(2) + at(row).powi(2)) / 32.0).exp();
        // Lanczos with three lobes restores a band-limited bump to a few parts in a thousand.
        assert!((samples.at(row, column) - expected).abs() < 5e-3);
    }

    #[test]
    fn a_reduced_map_keeps_its_mean() {
        let map = bump(301);
        let sum: f64 = map.irradiance_w_m2.iter().sum();
        let samples = Samples::of(&map, 150.5, 101);
        let reduced: f64 = samples.values.iter().sum::<f64>() * (301.0_f64 / 101.0).powi(2);
        assert!((reduced / sum - 1.0).abs() < 0.02);
    }
}
