//! Power in circles about the aim point, from the map's spectrum.
//!
//! The power within radius R is Σ Î(f)·R·J₁(2πRf)/f over the spectrum Î of the map, a
//! band-limited function: no pixel is cut by the circle. Frequencies between the band
//! limit D/(λ·range) and Nyquist's are faded out, which keeps the circle's ringing
//! short. The spectrum is first gathered by |f| onto a fine line of bins with cubic
//! (Lagrange) weights, once per map; then each radius costs one sum over the line.

use crate::farfield::pattern::jinc;
use crate::farfield::{Map, good_length};
use multiversion::multiversion;
use num_complex::Complex64;
use rustfft::{Fft, FftPlanner};
use std::f64::consts::PI;
use std::sync::Arc;

/// Bins per frequency step of the padded map's transform.
const BINS_PER_STEP: f64 = 16.0;

/// Columns that a pass of the transform gathers at once.
const GATHERED: usize = 8;

/// Radii at which the whole curve is read.
pub const RADII: usize = 161;

/// Encircled power for maps of one grid.
pub struct Encircled {
    pixels: usize,
    pixel_m: f64,
    length: usize,
    /// Band limit and Nyquist limit, in frequency steps.
    band_steps: f64,
    nyquist_steps: f64,
    fft: Arc<dyn Fft<f64>>,
    /// Radii of the curve, from 0 to half the window.
    pub radius_m: Vec<f64>,
    /// `[radius][bin]` of R·J₁(2πRf)/f.
    kernels: Vec<f64>,
    jinc: Jinc,
    /// `[column][row]` of half the spectrum's columns and rows.
    places: Vec<Place>,
    bins: usize,
}

impl std::fmt::Debug for Encircled {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Encircled")
            .field("length", &self.length)
            .finish_non_exhaustive()
    }
}

/// Memory for one map's spectrum, reused from map to map.
#[derive(Debug)]
pub struct Spectrum {
    rows: Vec<Complex64>,
    columns: Vec<Complex64>,
    scratch: Vec<Complex64>,
    /// Spectrum gathered by |f|.
    line: Vec<f64>,
}

impl Encircled {
    /// Prepare for maps of `pixels` a side, `pixel_m` apart, `samples_per_spot` of them a spot.
    pub fn new(pixels: usize, pixel_m: f64, samples_per_spot: f64) -> Encircled {
        // Zeros around the map keep the periodic images of its edges a few spots away.
        let length = good_length(pixels + (6.0 * samples_per_spot).ceil() as usize);
        let nyquist_steps = (length / 2) as f64;
        let bins = (nyquist_steps * BINS_PER_STEP) as usize + 3;
        let half_m = pixels as f64 * pixel_m / 2.0;
        let radius_m: Vec<f64> = (0..RADII)
            .map(|index| half_m * index as f64 / (RADII - 1) as f64)
            .collect();
        let mut encircled = Encircled {
            pixels,
            pixel_m,
            length,
            band_steps: length as f64 / samples_per_spot,
            nyquist_steps,
            fft: FftPlanner::new().plan_fft_forward(length),
            radius_m,
            kernels: Vec::new(),
            places: Vec::new(),
            jinc: Jinc::up_to(PI * half_m / pixel_m + 1.0),
            bins,
        };
        encircled.places = encircled.places();
        encircled.kernels = encircled
            .radius_m
            .iter()
            .flat_map(|&radius| encircled.kernel(radius))
            .collect();
        encircled
    }

    /// R·J₁(2πRf)/f at every bin, πR² at f = 0.
    fn kernel(&self, radius_m: f64) -> impl Iterator<Item = f64> {
        let step = 2.0 * PI * radius_m / (BINS_PER_STEP * self.length as f64 * self.pixel_m);
        let area = PI * radius_m * radius_m;
        (0..self.bins).map(move |bin| area * self.jinc.at(step * bin as f64))
    }

    /// Memory for [`Encircled::transform`].
    pub fn spectrum(&self) -> Spectrum {
        Spectrum {
            rows: vec![Complex64::default(); self.pixels * self.length],
            columns: vec![Complex64::default(); GATHERED * self.length],
            scratch: vec![Complex64::default(); self.fft.get_inplace_scratch_len()],
            line: vec![0.0; self.bins],
        }
    }

    /// Take a map into `spectrum`.
    pub fn transform(&self, map: &Map, spectrum: &mut Spectrum) {
        let (pixels, length) = (self.pixels, self.length);
        let centre = pixels / 2;
        let place = |pixel: usize| (pixel + length - centre) % length;
        spectrum.rows.fill(Complex64::default());
        for (row, line) in spectrum
            .rows
            .chunks_exact_mut(length)
            .zip(map.irradiance_w_m2.chunks_exact(pixels))
        {
            for (pixel, &value) in line.iter().enumerate() {
                row[place(pixel)].re = value;
            }
            self.fft.process_with_scratch(row, &mut spectrum.scratch);
        }
        spectrum.line.fill(0.0);
        // A real map's spectrum is conjugate in −f: half the columns tell all, and of
        // those the rows f and −f count together.
        let half = length / 2;
        for first in (0..=half).step_by(GATHERED) {
            let width = GATHERED.min(half + 1 - first);
            spectrum.columns.fill(Complex64::default());
            for (row, line) in spectrum.rows.chunks_exact(length).enumerate() {
                for (column, value) in line[first..first + width].iter().enumerate() {
                    spectrum.columns[column * length + place(row)] = *value;
                }
            }
            for column in 0..width {
                let line = &mut spectrum.columns[column * length..(column + 1) * length];
                self.fft.process_with_scratch(line, &mut spectrum.scratch);
                let places = &self.places[(first + column) * (half + 1)..];
                for (row, place) in places[..=half].iter().enumerate() {
                    if place.share <= 0.0 {
                        // Every higher frequency is beyond Nyquist's too.
                        break;
                    }
                    let mirrored = (length - row) % length;
                    let value = if mirrored == row {
                        line[row].re
                    } else {
                        line[row].re + line[mirrored].re
                    };
                    gather(&mut spectrum.line, place, value);
                }
            }
        }
    }

    /// Where each frequency of a quarter of the spectrum goes.
    fn places(&self) -> Vec<Place> {
        let half = self.length / 2;
        let scale = 1.0 / (self.length * self.length) as f64;
        (0..=half)
            .flat_map(|column| (0..=half).map(move |row| (column, row)))
            .map(|(column, row)| {
                let steps = (column as f64).hypot(row as f64);
                let place = steps * BINS_PER_STEP;
                let twice = if column == 0 || 2 * column == self.length {
                    1.0
                } else {
                    2.0
                };
                Place {
                    bin: place.floor() as usize,
                    weights: cubic_weights(place - place.floor()),
                    share: twice * self.fade(steps) * scale,
                }
            })
            .collect()
    }

    /// 1 within the band, falling to 0 at Nyquist's frequency (a raised cosine).
    fn fade(&self, steps: f64) -> f64 {
        if steps <= self.band_steps {
            1.0
        } else if steps >= self.nyquist_steps {
            0.0
        } else {
            let way = (steps - self.band_steps) / (self.nyquist_steps - self.band_steps);
            0.5 * (1.0 + (PI * way).cos())
        }
    }

    /// Power within a radius, in watts.
    pub fn power_w(&self, spectrum: &Spectrum, radius_m: f64) -> f64 {
        spectrum
            .line
            .iter()
            .zip(self.kernel(radius_m))
            .map(|(value, kernel)| value * kernel)
            .sum()
    }

    /// Power within each of the curve's radii, in watts.
    pub fn curve_w(&self, spectrum: &Spectrum) -> Vec<f64> {
        self.kernels
            .chunks_exact(self.bins)
            .map(|kernel| dot(kernel, &spectrum.line))
            .collect()
    }

    /// Diameter of the circle that holds `power_w`; `None` when it is larger than the window.
    pub fn diameter_m(&self, spectrum: &Spectrum, curve_w: &[f64], power_w: f64) -> Option<f64> {
        let upper = curve_w.iter().position(|&within| within >= power_w)?;
        if upper == 0 {
            return Some(0.0);
        }
        // False position, with the stale end's value halved (Illinois rule): superlinear and bracketed.
        let (mut low, mut high) = (self.radius_m[upper - 1], self.radius_m[upper]);
        let (mut below, mut above) = (curve_w[upper - 1] - power_w, curve_w[upper] - power_w);
        let tolerance = 1e-7 * self.radius_m[RADII - 1];
        for _ in 0..60 {
            if high - low <= tolerance || above <= 0.0 {
                break;
            }
            let middle = (low * above - high * below) / (above - below);
            let value = self.power_w(spectrum, middle) - power_w;
            if value.abs() <= 1e-9 * power_w {
                return Some(2.0 * middle);
            }
            if value < 0.0 {
                (low, below) = (middle, value);
                above *= 0.5;
            } else {
                (high, above) = (middle, value);
                below *= 0.5;
            }
        }
        Some(low + high)
    }
}

/// 2J₁(x)/x from a table with cubic Lagrange interpolation; its error is below 3e-8.
struct Jinc {
    values: Vec<f64>,
}

impl Jinc {
    const STEPS_PER_UNIT: f64 = 20.0;

    fn up_to(largest: f64) -> Jinc {
        let steps = (largest * Jinc::STEPS_PER_UNIT).ceil() as i32 + 3;
        // One step left of 0, where the function is even.
        let values = (-1..=steps)
            .map(|step| jinc(f64::from(step) / Jinc::STEPS_PER_UNIT))
            .collect();
        Jinc { values }
    }

    fn at(&self, x: f64) -> f64 {
        let place = x * Jinc::STEPS_PER_UNIT;
        let base = (place as usize).min(self.values.len() - 4);
        let weights = cubic_weights(place - base as f64);
        let around = &self.values[base..base + 4];
        weights[0] * around[0]
            + weights[1] * around[1]
            + weights[2] * around[2]
            + weights[3] * around[3]
    }
}

/// Lagrange weights of the places −1, 0, 1 and 2 at `t` in [0, 1].
fn cubic_weights(t: f64) -> [f64; 4] {
    [
        -t * (t - 1.0) * (t - 2.0) / 6.0,
        (t + 1.0) * (t - 1.0) * (t - 2.0) / 2.0,
        -(t + 1.0) * t * (t - 2.0) / 2.0,
        (t + 1.0) * t * (t - 1.0) / 6.0,
    ]
}

/// Where a frequency goes on the line of bins, and with what share.
struct Place {
    /// The bin left of it.
    bin: usize,
    /// Weights of that bin's left neighbour, itself and the two on its right.
    weights: [f64; 4],
    /// Fade and scale.
    share: f64,
}

/// Add `value` at a place with the four weights of cubic Lagrange interpolation.
fn gather(line: &mut [f64], place: &Place, value: f64) {
    let value = place.share * value;
    if place.bin == 0 {
        // The kernel is even in f: the bin left of 0 is its mirror image.
        line[1] += place.weights[0] * value;
        for offset in 1..4 {
            line[offset - 1] += place.weights[offset] * value;
        }
        return;
    }
    let bins = &mut line[place.bin - 1..place.bin + 3];
    for (bin, weight) in bins.iter_mut().zip(place.weights) {
        *bin += weight * value;
    }
}

/// Scalar product, in eight running sums: the order is fixed and suits vector lanes.
#[multiversion(targets("x86_64+avx2+fma"))]
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; 8];
    let (a, a_rest) = a.as_chunks::<8>();
    let (b, b_rest) = b.as_chunks::<8>();
    for (a, b) in a.iter().zip(b) {
        for lane in 0..8 {
            sums[lane] += a[lane] * b[lane];
        }
    }
    let rest: f64 = a_rest.iter().zip(b_rest).map(|(a, b)| a * b).sum();
    sums.iter().sum::<f64>() + rest
}
