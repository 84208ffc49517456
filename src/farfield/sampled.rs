//! `sampled`: the aperture painted on a grid, and one pruned two-dimensional FFT.
//!
//! The grid pitch Δ = samples_per_spot·D/n makes the transform's bins fall on the
//! map's pixels. Rows without light need no first pass, and only the map's columns
//! and rows are kept, so a trial costs (occupied rows + map columns) transforms of
//! length n rather than 2n.
//!
//! Cells hold the mean of the element's field over the cell (covered area at the
//! edges). The mean multiplies the transform by sinc(θΔ/λ) per axis, which is divided
//! out. That holds for a tilted element too when its cells hold the mean of the tilted
//! field: sinc(δΔ/λ) times the tilt's phase where the cell's light has its middle, which an
//! edge or a sloping profile moves from the cell's centre. What is left is aliasing,
//! weighted by θΔ/λ.

use super::fft::good_length;
use super::map::{Grid, Map};
use super::paint::{Cells, paint};
use super::pattern::{Wavefront, sinc};
use super::{FarField, Method, Radiated, Worker};
use crate::array::{Array, Elements};
use crate::perturb::{Draw, TrialErrors};
use num_complex::Complex64;
use rayon::prelude::*;
use rustfft::{Fft, FftPlanner};
use std::f64::consts::PI;
use std::sync::Arc;

/// Grid cells across an element, at least.
///
/// An alias reaches the map with the element's pattern out at λ/Δ, so a map that shows
/// the element's own side lobes needs a finer grid, and so does one to whose edges a focus
/// or a table points the elements.
pub fn cells_across_element(array: &Array, grid: Grid) -> f64 {
    let beam_rad = array.wavelength_m / array.element.size_m;
    let nulls = grid.width_m() / 2.0 / array.range_m / beam_rad;
    let aside = array.largest_tilt_rad() / beam_rad;
    if nulls <= 1.0 && aside <= 0.5 {
        16.0
    } else {
        24.0
    }
}

/// Columns that one task of the second pass gathers.
const COLUMNS: usize = 16;

/// Grids longer than this are never transformed: they are foreseen, and refused.
const LONGEST: usize = 100_000_000;

/// Geometry of the painted grid, known before anything is allocated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SampledPlan {
    /// FFT length.
    pub length: usize,
    /// Grid pitch in the aperture.
    pub pitch_m: f64,
    /// Rows that may hold light.
    pub rows: usize,
    /// Bytes of the painted elements, shared by all workers.
    pub shared_bytes: f64,
    /// Bytes that each worker needs.
    pub worker_bytes: f64,
}

impl SampledPlan {
    /// Plan for a map, `cells` across an element at least, with tilts of up to
    /// `largest_tilt_rad`, over which no more than 0.6 rad may pass in a cell.
    pub fn new(array: &Array, grid: Grid, cells: f64, largest_tilt_rad: f64) -> SampledPlan {
        let size_m = array.element.size_m;
        let inside = array.curvature_per_m.abs() * size_m / 2.0;
        let turns = array.wavenumber() * (largest_tilt_rad + inside) * size_m;
        let cells = cells.max(turns / 0.6);
        // n Δ = λ·range/pixel, whatever n.
        let span_m = array.wavelength_m * array.range_m / grid.pixel_m;
        let least = (span_m * cells / size_m * (1.0 - 1e-12)).ceil();
        let least = (least as usize).max(4 * grid.pixels);
        // Fast lengths lie far apart up there, and no memory holds such a grid.
        let length = if least < LONGEST {
            good_length(least)
        } else {
            least
        };
        let pitch_m = span_m / length as f64;
        let rows = ((array.envelope_diameter_m / pitch_m).ceil() as usize).saturating_add(3);
        let (half_x, half_y) = array.element.half_extent_m();
        let box_cells = (2.0 * half_x / pitch_m + 2.0) * (2.0 * half_y / pitch_m + 2.0);
        SampledPlan {
            length,
            pitch_m,
            rows,
            // The edge crosses about four cells for each cell across.
            shared_bytes: array.len() as f64 * (8.0 * box_cells + 64.0 * size_m / pitch_m + 96.0),
            worker_bytes: 16.0 * (rows as f64 * grid.pixels as f64 + length as f64)
                + 8.0 * (grid.pixels as f64).powi(2)
                + 73.0 * array.len() as f64,
        }
    }
}

/// The painted array, ready for any number of draws.
pub struct Sampled<'a> {
    array: &'a Array,
    elements: Elements,
    grid: Grid,
    plan: SampledPlan,
    cells: Cells,
    /// q of the factor exp(−q|s|²) on the field of an element.
    exponent_per_m2: Complex64,
    fft: Arc<dyn Fft<f64>>,
    /// 1/sinc(θΔ/λ) along one axis of the map.
    deconvolution: Vec<f64>,
}

impl std::fmt::Debug for Sampled<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Sampled")
            .field("plan", &self.plan)
            .finish_non_exhaustive()
    }
}

impl<'a> Sampled<'a> {
    /// Paint the array; `mean_over_tilt_rad` as in [`Wavefront`].
    pub fn new(
        array: &'a Array,
        grid: Grid,
        plan: SampledPlan,
        mean_over_tilt_rad: f64,
    ) -> Sampled<'a> {
        let wavefront = Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad,
        };
        let cell_over_wavelength = plan.pitch_m / array.wavelength_m;
        let elements = array.list();
        Sampled {
            array,
            grid,
            plan,
            cells: paint(array, &elements, plan.pitch_m, wavefront),
            exponent_per_m2: wavefront.exponent_per_m2(&array.element, array.wavenumber()),
            elements,
            fft: FftPlanner::new().plan_fft_forward(plan.length),
            deconvolution: grid
                .axis_m()
                .iter()
                .map(|u| 1.0 / sinc(PI * u / array.range_m * cell_over_wavelength))
                .collect(),
        }
    }
}

impl FarField for Sampled<'_> {
    fn method(&self) -> Method {
        Method::Sampled
    }

    fn grid(&self) -> Grid {
        self.grid
    }

    fn worker(&self) -> Box<dyn Worker + '_> {
        let pixels = self.grid.pixels;
        Box::new(SampledWorker {
            sampled: self,
            draw: Draw::default(),
            excitation: vec![Excitation::default(); self.array.len()],
            half_way: vec![Complex64::default(); self.cells.rows.len() * pixels],
            transposed: vec![0.0; pixels * pixels],
        })
    }
}

/// What drives one element in one trial.
#[derive(Debug, Clone, Copy, Default)]
struct Excitation {
    phasor: Complex64,
    tilt_x_rad: f64,
    tilt_y_rad: f64,
}

struct SampledWorker<'a> {
    sampled: &'a Sampled<'a>,
    draw: Draw,
    excitation: Vec<Excitation>,
    /// After the first pass: [occupied row][map column].
    half_way: Vec<Complex64>,
    /// Irradiance by [map column][map row].
    transposed: Vec<f64>,
}

/// Buffers of one thread within a pass.
struct Scratch {
    line: Vec<Complex64>,
    fft: Vec<Complex64>,
}

impl SampledWorker<'_> {
    fn scratch(&self, lines: usize) -> Scratch {
        let sampled = self.sampled;
        Scratch {
            line: vec![Complex64::default(); lines * sampled.plan.length],
            fft: vec![Complex64::default(); sampled.fft.get_inplace_scratch_len()],
        }
    }

    fn excite(&mut self) {
        let (array, pitch) = (self.sampled.array, self.sampled.plan.pitch_m);
        let (elements, draw) = (&self.sampled.elements, &self.draw);
        let turn = PI * pitch / array.wavelength_m;
        let (common_x, common_y) = draw.common_tilt_rad;
        for (n, excitation) in self.excitation.iter_mut().enumerate() {
            // A tilt of the whole array tilts each element and lifts its centre.
            let tilt_x_rad = elements.tilt_x_rad[n] + draw.tilt_x_rad[n] + common_x;
            let tilt_y_rad = elements.tilt_y_rad[n] + draw.tilt_y_rad[n] + common_y;
            let lift = common_x * elements.x_m[n] + common_y * elements.y_m[n];
            let smear = sinc(turn * tilt_x_rad) * sinc(turn * tilt_y_rad);
            *excitation = Excitation {
                phasor: Complex64::from_polar(
                    elements.amplitude[n] * draw.amplitude[n] * smear,
                    elements.phase_rad[n] + draw.phase_rad[n] + array.wavenumber() * lift,
                ),
                tilt_x_rad,
                tilt_y_rad,
            };
        }
    }

    /// Paint one row of the aperture into `line`, whose negative half wraps around.
    fn paint_row(&self, row: i64, line: &mut [Complex64]) {
        let sampled = self.sampled;
        let (elements, pitch) = (&sampled.elements, sampled.plan.pitch_m);
        let length = sampled.plan.length as i64;
        let k = sampled.array.wavenumber();
        line.fill(Complex64::default());
        for strip in sampled.cells.strips(row) {
            let n = strip.element;
            let excitation = &self.excitation[n];
            if excitation.phasor == Complex64::default() {
                continue;
            }
            let (tilt_x, tilt_y) = (excitation.tilt_x_rad, excitation.tilt_y_rad);
            let x = strip.first_column as f64 * pitch - elements.x_m[n];
            let y = row as f64 * pitch - elements.y_m[n];
            let mut phasor = excitation.phasor * Complex64::cis(k * (tilt_x * x + tilt_y * y));
            let step = Complex64::cis(k * tilt_x * pitch);
            // A field exp(−q|s|²) leans towards one side of its cell, by −q s Δ²/6.
            let lean = Complex64::new(0.0, -k * pitch * pitch / 6.0) * sampled.exponent_per_m2;
            let mut leaning = 1.0 + lean * (tilt_x * x + tilt_y * y);
            let leaning_step = lean * tilt_x * pitch;
            let mut edges = strip.edges.iter();
            let mut edge = edges.next();
            for (offset, cell) in strip.cells.iter().enumerate() {
                let column = (strip.first_column + offset as i64).rem_euclid(length);
                let mut value = phasor * Complex64::new(f64::from(cell.re), f64::from(cell.im));
                if let Some(crossed) = edge
                    && crossed.column as usize == offset
                {
                    let turn =
                        k * (tilt_x * f64::from(crossed.x_m) + tilt_y * f64::from(crossed.y_m));
                    // exp(i·turn), a fraction of a radian.
                    value *= Complex64::new(1.0 - turn * turn / 2.0, turn);
                    edge = edges.next();
                }
                line[column as usize] += value * leaning;
                phasor *= step;
                leaning += leaning_step;
            }
        }
    }
}

impl Worker for SampledWorker<'_> {
    fn irradiance(&mut self, trial: TrialErrors<'_>, map: &mut Map) -> Radiated {
        let sampled = self.sampled;
        self.draw.redraw(sampled.array, trial);
        self.excite();
        let (length, pixels) = (sampled.plan.length, sampled.grid.pixels);
        let centre = sampled.grid.centre();
        // Map index → transform bin, negative frequencies at the end.
        let bin = |index: usize| (index + length - centre) % length;

        let mut half_way = std::mem::take(&mut self.half_way);
        half_way
            .par_chunks_mut(pixels)
            .zip(&sampled.cells.rows)
            .for_each_init(
                || self.scratch(1),
                |scratch, (kept, &row)| {
                    self.paint_row(row, &mut scratch.line);
                    sampled
                        .fft
                        .process_with_scratch(&mut scratch.line, &mut scratch.fft);
                    for (index, value) in kept.iter_mut().enumerate() {
                        *value = scratch.line[bin(index)];
                    }
                },
            );

        let array = sampled.array;
        let cell_area = sampled.plan.pitch_m * sampled.plan.pitch_m;
        let scale = (cell_area / (array.wavelength_m * array.range_m)).powi(2);
        let mut transposed = std::mem::take(&mut self.transposed);
        transposed
            .par_chunks_mut(COLUMNS * pixels)
            .enumerate()
            .for_each_init(
                || self.scratch(COLUMNS),
                |scratch, (block, kept)| {
                    let first = block * COLUMNS;
                    let width = kept.len() / pixels;
                    scratch.line.fill(Complex64::default());
                    for (source, &row) in half_way.chunks_exact(pixels).zip(&sampled.cells.rows) {
                        let place = row.rem_euclid(length as i64) as usize;
                        for column in 0..width {
                            scratch.line[column * length + place] = source[first + column];
                        }
                    }
                    for (column, (line, kept)) in scratch
                        .line
                        .chunks_exact_mut(length)
                        .zip(kept.chunks_exact_mut(pixels))
                        .enumerate()
                    {
                        sampled.fft.process_with_scratch(line, &mut scratch.fft);
                        let across = sampled.deconvolution[first + column];
                        for (index, value) in kept.iter_mut().enumerate() {
                            let along = sampled.deconvolution[index];
                            *value = line[bin(index)].norm_sqr() * scale * (across * along).powi(2);
                        }
                    }
                },
            );
        for (row, line) in map.irradiance_w_m2.chunks_exact_mut(pixels).enumerate() {
            for (column, value) in line.iter_mut().enumerate() {
                *value = transposed[column * pixels + row];
            }
        }
        self.half_way = half_way;
        self.transposed = transposed;
        Radiated::of(&sampled.elements, &self.draw)
    }
}
