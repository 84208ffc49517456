//! `factored`: element pattern × array factor, the array factor by a non-uniform FFT.
//!
//! The elements share one pattern, so U(θ) = Σₜ fₜ(θ) Σₙ zₙ gₜ(δₙ) exp(−ikθ·rₙ) with a
//! few terms t for the tilts (see [`super::tilt`]). Each inner sum is spread onto an
//! oversampled grid, transformed where it is occupied, and kept where the map looks. On
//! a lattice spreading separates into columns and rows, and tiles of elements are
//! drawn, spread and forgotten: no array of N elements exists.

use super::choose::Task;
use super::kernel::{Axis, WIDTH};
use super::map::{Grid, Map};
use super::pattern::Wavefront;
use super::tile::{
    Columns, RunningColumns, Tile, Workspace, add_lane, add_term, deconvolve, process,
    process_list, spread_row,
};
use super::tilt::{Demand, TiltExpansion};
use super::{FarField, Method, Radiated, Worker};
use crate::array::bands::{Band, GROUP, LANES, TILE, bands};
use crate::array::sites::LatticeSites;
use crate::array::{Array, Elements, Sites};
use crate::perturb::TrialErrors;
use crate::perturb::block::Recipe;
use num_complex::{Complex32, Complex64};
use rustfft::{Fft, FftPlanner};
use std::ops::Range;
use std::sync::{Arc, OnceLock};

/// Error of the tilt expansion over the peak amplitude.
const TOLERANCE: f64 = 4e-7;

/// Columns that a pass of the transform gathers at once.
const GATHERED: usize = 8;

/// An array made ready for the factored far field.
pub struct Factored<'a> {
    array: &'a Array,
    grid: Grid,
    axis: Axis,
    expansion: TiltExpansion,
    sites: Prepared<'a>,
    /// Single precision: its rounding, 6e-8 of the rms field, is far below the peak's 1e-6.
    fft: Arc<dyn Fft<f32>>,
    /// fₜ on the map `[column][row]`, without a tilt of the whole array.
    fields: Vec<Vec<Complex64>>,
}

/// What is prepared for the sites.
enum Prepared<'a> {
    Lattice(Box<OnLattice<'a>>),
    List(Box<List>),
}

/// A lattice with its columns' places on the grid.
struct OnLattice<'a> {
    sites: &'a LatticeSites,
    light: Light,
    bands: Vec<Band>,
    columns: [Columns; 2],
    /// Sums along rows for the array without errors, once they are needed.
    running: OnceLock<[RunningColumns; 2]>,
}

/// Elements of a list with their places on the grid.
struct List {
    elements: Elements,
    /// First cell along x and y, and weights.
    spreads: Vec<([u32; 2], [[f32; WIDTH]; 2])>,
    tilted: bool,
}

impl std::fmt::Debug for Factored<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Factored")
            .field("length", &self.axis.length)
            .field("terms", &self.expansion.terms())
            .finish_non_exhaustive()
    }
}

/// The tilts' expansion for an array and a map; `None` when the tilts are too large for this method.
pub fn expand(array: &Array, task: Task) -> Option<TiltExpansion> {
    let wavefront = Wavefront {
        curvature_per_m: array.curvature_per_m,
        mean_over_tilt_rad: task.mean_over_tilt_rad,
    };
    let demand = Demand {
        half_width_rad: task.grid.width_m() / 2.0 / array.range_m + 6.7 * task.common_jitter_rad,
        random_rad: task.jitter_rad,
        structured_rad: array.largest_tilt_rad(),
        tolerance: TOLERANCE,
    };
    TiltExpansion::new(array, wavefront, demand)
}

impl<'a> Factored<'a> {
    /// Prepare the array with the expansion that [`expand`] found for it.
    pub fn new(array: &'a Array, grid: Grid, expansion: TiltExpansion) -> Factored<'a> {
        let axis = Axis::new(array, grid);
        let sites = match &array.sites {
            Sites::Lattice {
                sites,
                amplitude,
                taper_per_m2,
            } => Prepared::Lattice(Box::new(OnLattice {
                sites,
                light: Light {
                    amplitude: *amplitude,
                    taper_per_m2: *taper_per_m2,
                    wavenumber: array.wavenumber(),
                    defocus_per_m: array.defocus_per_m,
                },
                bands: bands(sites),
                columns: [0, 1].map(|parity| {
                    let x_m: Vec<f64> = (0..sites.columns)
                        .map(|column| sites.x_m(parity, column))
                        .collect();
                    Columns::new(&axis, &x_m)
                }),
                running: OnceLock::new(),
            })),
            Sites::List(_) => Prepared::List(Box::new(List::new(array, &axis))),
        };
        let theta: Vec<f64> = grid.axis_m().iter().map(|u| u / array.range_m).collect();
        let fields = (0..expansion.terms())
            .map(|term| {
                let mut field = vec![Complex64::default(); grid.pixels * grid.pixels];
                expansion.evaluate(term, &theta, &theta, &mut field);
                field
            })
            .collect();
        Factored {
            array,
            grid,
            fft: FftPlanner::new().plan_fft_forward(axis.length),
            axis,
            expansion,
            sites,
            fields,
        }
    }
}

impl List {
    fn new(array: &Array, axis: &Axis) -> List {
        let elements = array.list();
        let spreads = (0..elements.len())
            .map(|n| {
                let (x, across) = axis.spread(elements.x_m[n]);
                let (y, along) = axis.spread(elements.y_m[n]);
                let single = |weights: [f64; WIDTH]| weights.map(|weight| weight as f32);
                ([x as u32, y as u32], [single(across), single(along)])
            })
            .collect();
        List {
            tilted: array.largest_tilt_rad() > 0.0,
            elements,
            spreads,
        }
    }
}

impl FarField for Factored<'_> {
    fn method(&self) -> Method {
        Method::Factored
    }

    fn grid(&self) -> Grid {
        self.grid
    }

    fn worker(&self) -> Box<dyn Worker + '_> {
        let (terms, cells, pixels) = (self.expansion.terms(), self.axis.cells, self.grid.pixels);
        Box::new(FactoredWorker {
            factored: self,
            workspace: Workspace::new(&self.expansion),
            band: vec![[0.0; LANES]; terms * 2 * cells],
            row: vec![Complex64::default(); cells],
            grids: vec![Complex64::default(); terms * cells * cells],
            lines: vec![Complex32::default(); GATHERED * self.axis.length],
            half_way: vec![Complex32::default(); cells * pixels],
            scratch: vec![Complex32::default(); self.fft.get_inplace_scratch_len()],
            field: vec![Complex64::default(); pixels * pixels],
            shifted: Vec::new(),
        })
    }
}

struct FactoredWorker<'a> {
    factored: &'a Factored<'a>,
    workspace: Workspace,
    /// Cells of a band: `[term][real, imaginary][cell][row]`.
    band: Vec<[f32; LANES]>,
    /// One row of the band's cells, for one term.
    row: Vec<Complex64>,
    /// Spread strengths: `[term][cell along y][cell along x]`.
    grids: Vec<Complex64>,
    lines: Vec<Complex32>,
    /// After the pass along x: `[cell along y][map column]`.
    half_way: Vec<Complex32>,
    scratch: Vec<Complex32>,
    /// Field at the map's pixels, `[column][row]`.
    field: Vec<Complex64>,
    /// fₜ shifted by the tilt of the whole array, one term at a time.
    shifted: Vec<Complex64>,
}

impl Worker for FactoredWorker<'_> {
    fn irradiance(&mut self, trial: TrialErrors<'_>, map: &mut Map) -> Radiated {
        let factored = self.factored;
        let common = trial.common_tilt_rad();
        self.grids.fill(Complex64::default());
        let radiated = match &factored.sites {
            // One monomial: no element tilts, and the only term is the pattern itself.
            Prepared::Lattice(lattice)
                if trial.errors.is_none() && factored.expansion.monomials.len() == 1 =>
            {
                self.spread_still(lattice)
            }
            Prepared::Lattice(lattice) => self.spread_lattice(trial, common, lattice),
            Prepared::List(list) => self.spread_list(trial, common, list),
        };
        self.transform(common);
        let scale = (factored.array.wavelength_m * factored.array.range_m).powi(-2);
        let pixels = factored.grid.pixels;
        for (row, line) in map.irradiance_w_m2.chunks_exact_mut(pixels).enumerate() {
            for (value, column) in line.iter_mut().zip(self.field.chunks_exact(pixels)) {
                *value = column[row].norm_sqr() * scale;
            }
        }
        radiated
    }
}

/// What a lattice's elements carry, a product of one factor in x and one in y.
struct Light {
    amplitude: f64,
    taper_per_m2: f64,
    wavenumber: f64,
    defocus_per_m: f64,
}

impl Light {
    /// Factor of a coordinate: edge taper, focus, and the lift of a tilt of the whole array.
    fn factor(&self, position_m: f64, common_tilt_rad: f64) -> Complex64 {
        let square = position_m * position_m;
        let path_m = self.defocus_per_m * square / 2.0 + common_tilt_rad * position_m;
        Complex64::from_polar(
            (-self.taper_per_m2 * square).exp(),
            self.wavenumber * path_m,
        )
    }
}

impl FactoredWorker<'_> {
    fn spread_lattice(
        &mut self,
        trial: TrialErrors<'_>,
        common: (f64, f64),
        lattice: &OnLattice<'_>,
    ) -> Radiated {
        let factored = self.factored;
        let OnLattice {
            sites,
            light,
            bands,
            columns,
            ..
        } = lattice;
        let recipe = Recipe::new(trial);
        let tilted = light.defocus_per_m.abs() > 0.0;
        let plain = !tilted && light.taper_per_m2 <= 0.0 && common == (0.0, 0.0);
        let x_m = [0, 1].map(|parity| -> Vec<f64> {
            (0..sites.columns.div_ceil(TILE) * TILE)
                .map(|column| sites.x_m(parity, column))
                .collect()
        });
        let factors = [0, 1].map(|parity: usize| -> Vec<[f32; 2]> {
            x_m[parity]
                .iter()
                .map(|&x| light.factor(x, common.0))
                .map(|factor| [factor.re as f32, factor.im as f32])
                .collect()
        });
        let tilts = [0, 1].map(|parity: usize| -> Vec<f32> {
            x_m[parity]
                .iter()
                .map(|x| (light.defocus_per_m * x) as f32)
                .collect()
        });
        let mut radiated = Radiated::default();
        for band in bands {
            self.band.fill([0.0; LANES]);
            self.workspace.power = [0.0; LANES];
            let occupied: Vec<[Range<usize>; 2]> = band
                .rows
                .iter()
                .map(|&row| sites.rows[row].spans.clone())
                .collect();
            let y_m = |lane: usize| band.rows.get(lane).map_or(0.0, |&row| sites.rows[row].y_m);
            let along_y: [f32; LANES] =
                std::array::from_fn(|lane| (light.defocus_per_m * y_m(lane)) as f32);
            for tile in band.tiles.clone() {
                let span = tile * TILE..(tile + 1) * TILE;
                let full = band.rows.len() == LANES
                    && occupied.iter().all(|[left, right]| {
                        let holds =
                            |held: &Range<usize>| held.start <= span.start && held.end >= span.end;
                        holds(left) || holds(right)
                    });
                let tile = Tile {
                    group: band.first_group + tile as u64,
                    tile,
                    columns: &columns[band.parity],
                    factor: &factors[band.parity][span.clone()],
                    plain,
                    static_tilt_rad: tilted.then(|| (&tilts[band.parity][span.clone()], &along_y)),
                    occupied: (!full).then_some(&occupied[..]),
                };
                process(
                    &recipe,
                    &factored.expansion,
                    &tile,
                    &mut self.workspace,
                    &mut self.band,
                );
            }
            for (lane, &row) in band.rows.iter().enumerate() {
                let y = sites.rows[row].y_m;
                let factor = light.amplitude * light.factor(y, common.1);
                self.add_row(lane, y, factor);
                radiated.power_w += self.workspace.power[lane] * factor.norm_sqr();
            }
        }
        radiated.dark = std::mem::take(&mut self.workspace.dark);
        radiated.unlocked = std::mem::take(&mut self.workspace.unlocked);
        radiated
    }

    /// Spread a lattice without errors, row by row whatever the number of its columns.
    fn spread_still(&mut self, lattice: &OnLattice<'_>) -> Radiated {
        let (sites, light) = (lattice.sites, &lattice.light);
        let running = lattice.running.get_or_init(|| {
            [0, 1].map(|parity| {
                let factors: Vec<Complex64> = (0..sites.columns)
                    .map(|column| light.factor(sites.x_m(parity, column), 0.0))
                    .collect();
                lattice.columns[parity].running(&factors)
            })
        });
        let axis = &self.factored.axis;
        let grid = &mut self.grids[..axis.cells * axis.cells];
        for row in &sites.rows {
            let (first, weights) = axis.spread(row.y_m);
            let factor = light.amplitude * light.factor(row.y_m, 0.0);
            running[row.parity].row(&row.spans, factor, &mut self.row);
            let lines = &mut grid[first * axis.cells..(first + WIDTH) * axis.cells];
            spread_row(&self.row, &weights, lines);
        }
        Radiated {
            power_w: self.factored.array.power_w(),
            ..Radiated::default()
        }
    }

    /// Spread one row's cells along y.
    fn add_row(&mut self, lane: usize, y_m: f64, factor: Complex64) {
        let axis = &self.factored.axis;
        let cells = axis.cells;
        let (first, weights) = axis.spread(y_m);
        for (term, grid) in self.grids.chunks_exact_mut(cells * cells).enumerate() {
            let (real, imaginary) = self.band[2 * term * cells..][..2 * cells].split_at(cells);
            let lines = &mut grid[first * cells..(first + WIDTH) * cells];
            add_lane(
                real,
                imaginary,
                lane,
                factor,
                &weights,
                &mut self.row,
                lines,
            );
        }
    }

    fn spread_list(&mut self, trial: TrialErrors<'_>, common: (f64, f64), list: &List) -> Radiated {
        let factored = self.factored;
        let recipe = Recipe::new(trial);
        let (elements, k, cells) = (
            &list.elements,
            factored.array.wavenumber(),
            factored.axis.cells,
        );
        let mut radiated = Radiated::default();
        for first in (0..elements.len()).step_by(GROUP) {
            let numbers = first..(first + GROUP).min(elements.len());
            let tilt = list.tilted.then(|| {
                (
                    &elements.tilt_x_rad[numbers.clone()],
                    &elements.tilt_y_rad[numbers.clone()],
                )
            });
            let group = (first / GROUP) as u64;
            process_list(
                &recipe,
                &factored.expansion,
                group,
                numbers.len(),
                tilt,
                &mut self.workspace,
            );
            for n in numbers {
                let slot = n - first;
                let lift = k * (common.0 * elements.x_m[n] + common.1 * elements.y_m[n]);
                let light =
                    Complex64::from_polar(elements.amplitude[n], elements.phase_rad[n] + lift);
                radiated.power_w += self.workspace.power_of(slot) * light.norm_sqr();
                let ([x, y], [across, along]) = &list.spreads[n];
                for ((real, imaginary), grid) in self
                    .workspace
                    .strengths_of(slot)
                    .zip(self.grids.chunks_exact_mut(cells * cells))
                {
                    let strength = light * Complex64::new(f64::from(real), f64::from(imaginary));
                    for (row, weight) in along.iter().enumerate() {
                        let start = (*y as usize + row) * cells + *x as usize;
                        let strength = strength * f64::from(*weight);
                        for (value, weight) in grid[start..start + WIDTH].iter_mut().zip(across) {
                            *value += strength * f64::from(*weight);
                        }
                    }
                }
            }
        }
        radiated.dark = std::mem::take(&mut self.workspace.dark);
        radiated.unlocked = std::mem::take(&mut self.workspace.unlocked);
        radiated
    }

    /// Transform every term's grid and add it, times its fₜ, to the field.
    fn transform(&mut self, common: (f64, f64)) {
        let factored = self.factored;
        let (axis, pixels) = (&factored.axis, factored.grid.pixels);
        let (cells, length, centre) = (axis.cells, axis.length, factored.grid.centre());
        let still = common.0.abs() <= 0.0 && common.1.abs() <= 0.0;
        let directions = |common: f64| -> Vec<f64> {
            let axis_m = factored.grid.axis_m();
            axis_m
                .iter()
                .map(|u| u / factored.array.range_m - common)
                .collect()
        };
        let (theta_x, theta_y) = (directions(common.0), directions(common.1));
        self.field.fill(Complex64::default());
        for (term, grid) in self.grids.chunks_exact(cells * cells).enumerate() {
            for (row, kept) in grid
                .chunks_exact(cells)
                .zip(self.half_way.chunks_exact_mut(pixels))
            {
                let line = &mut self.lines[..length];
                line.fill(Complex32::default());
                for (value, &place) in row.iter().zip(&axis.places) {
                    // Grids narrower than the points' reach wrap around.
                    line[place] += Complex32::new(value.re as f32, value.im as f32);
                }
                factored.fft.process_with_scratch(line, &mut self.scratch);
                deconvolve(line, centre, &axis.deconvolution, kept);
            }
            let pattern = if still {
                &factored.fields[term]
            } else {
                self.shifted.resize(pixels * pixels, Complex64::default());
                factored
                    .expansion
                    .evaluate(term, &theta_x, &theta_y, &mut self.shifted);
                &self.shifted
            };
            for first in (0..pixels).step_by(GATHERED) {
                let width = GATHERED.min(pixels - first);
                self.lines.fill(Complex32::default());
                for (row, &place) in self.half_way.chunks_exact(pixels).zip(&axis.places) {
                    for (column, value) in row[first..first + width].iter().enumerate() {
                        self.lines[column * length + place] += value;
                    }
                }
                for column in 0..width {
                    let line = &mut self.lines[column * length..(column + 1) * length];
                    factored.fft.process_with_scratch(line, &mut self.scratch);
                    let span = (first + column) * pixels..(first + column + 1) * pixels;
                    let (field, pattern) = (&mut self.field[span.clone()], &pattern[span]);
                    add_term(line, centre, &axis.deconvolution, pattern, field);
                }
            }
        }
    }
}
