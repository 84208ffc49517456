//! The mean of a band-limited function over random shifts of its argument.
//!
//! Samples on a grid that extends beyond the points asked for are tapered to zero in
//! a margin, transformed, multiplied by the transform of the distribution of shifts,
//! and evaluated where wanted. The taper is an error function whose spectrum has
//! fallen to 1e-6 within the guard band between the function's band limit and
//! Nyquist's; nothing else is approximated.

use super::fft::transform_square;
use num_complex::Complex64;
use rayon::prelude::*;
use rustfft::FftDirection;
use std::f64::consts::TAU;

/// A square grid of samples about 0, spaced by `spacing`, `count` (odd) a side.
#[derive(Debug, Clone, Copy)]
pub struct Samples {
    /// Samples a side.
    pub count: usize,
    /// Spacing.
    pub spacing: f64,
    /// Half width within which the samples are left as they are.
    pub flat: f64,
}

impl Samples {
    /// A grid for a function of band limit `band` (cycles per unit), flat out to `flat`,
    /// sampled at `spacing`, which must leave a guard band: 1/spacing > 2·band.
    pub fn new(flat: f64, band: f64, spacing: f64) -> Samples {
        let guard = 0.5 / spacing - band;
        // erfc steps over 7 widths w; exp(−(π w guard)²) = 1e-6.
        let margin = 7.0 * 3.72 / (std::f64::consts::PI * guard);
        let half = ((flat + margin) / spacing).ceil() as usize;
        Samples {
            count: 2 * half + 1,
            spacing,
            flat,
        }
    }

    /// The sample positions along one axis.
    pub fn axis(&self) -> Vec<f64> {
        let half = (self.count / 2) as f64;
        (0..self.count)
            .map(|index| (index as f64 - half) * self.spacing)
            .collect()
    }

    /// Factor on each sample along one axis: 1 inside, falling to 0 at the edge.
    fn taper(&self) -> Vec<f64> {
        let edge = (self.count / 2) as f64 * self.spacing;
        let middle = 0.5 * (self.flat + edge);
        let width = (edge - self.flat) / 7.0;
        self.axis()
            .iter()
            .map(|x| 0.5 * libm::erfc((x.abs() - middle) / width))
            .collect()
    }

    /// Spectrum of samples `[y, x]` once tapered, divided by count²: coefficients of exp(i2π(fx·x + fy·y)).
    pub fn spectrum(&self, samples: &[f64]) -> Vec<Complex64> {
        let (taper, count) = (self.taper(), self.count);
        let half = count / 2;
        let mut values = vec![Complex64::default(); count * count];
        // The origin goes to index 0, so that phases refer to it.
        values
            .par_chunks_exact_mut(count)
            .enumerate()
            .for_each(|(place, row)| {
                let j = (place + half) % count;
                for (place, value) in row.iter_mut().enumerate() {
                    let i = (place + half) % count;
                    *value = (taper[i] * taper[j] * samples[j * count + i]).into();
                }
            });
        transform_square(&mut values, count, FftDirection::Forward);
        let scale = 1.0 / (count * count) as f64;
        for value in &mut values {
            *value *= scale;
        }
        values
    }

    /// Frequency of each spectrum index along one axis, in cycles per unit.
    pub fn frequencies(&self) -> Vec<f64> {
        let count = self.count as i64;
        (0..count)
            .map(|index| {
                let signed = if 2 * index < count {
                    index
                } else {
                    index - count
                };
                signed as f64 / (self.count as f64 * self.spacing)
            })
            .collect()
    }

    /// The real function of a spectrum at every pair of `points`, `[y, x]`.
    pub fn evaluate(&self, spectrum: &[Complex64], points: &[f64]) -> Vec<f64> {
        let waves: Vec<Complex64> = points
            .iter()
            .flat_map(|x| {
                self.frequencies()
                    .into_iter()
                    .map(move |f| Complex64::cis(TAU * f * x))
            })
            .collect();
        // Along x first: [fy][point].
        let half_way: Vec<Complex64> = spectrum
            .par_chunks_exact(self.count)
            .flat_map_iter(|row| {
                waves
                    .chunks_exact(self.count)
                    .map(move |wave| wave.iter().zip(row).map(|(w, s)| w * s).sum())
            })
            .collect();
        waves
            .par_chunks_exact(self.count)
            .flat_map_iter(|wave| {
                let mut line = vec![Complex64::default(); points.len()];
                for (w, row) in wave.iter().zip(half_way.chunks_exact(points.len())) {
                    for (value, part) in line.iter_mut().zip(row) {
                        *value += w * part;
                    }
                }
                line.into_iter().map(|value| value.re)
            })
            .collect()
    }
}
