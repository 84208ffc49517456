//! A tile of 32 columns × 8 rows: draw its errors, form its phasors, spread its columns.
//!
//! Everything runs on eight rows abreast, in single precision, whose rounding (6e-8 of
//! each element, at random) stays far below the kernel's error. Weights are the same
//! for all rows of a parity, so that spreading is a banded matrix times eight vectors:
//! each cell gathers the columns in its reach.

use super::kernel::{Axis, WIDTH};
use super::tilt::TiltExpansion;
use crate::array::bands::{GROUP, LANES, TILE};
use crate::perturb::State;
use crate::perturb::block::{Block, Recipe};
use crate::perturb::vector::{cos_sin_turns, fma};
use multiversion::multiversion;
use num_complex::{Complex32, Complex64};
use std::ops::Range;

/// One value a row.
pub type Lane = [f32; LANES];

/// Real and imaginary strength of each slot, for one term: by column, then row.
type Strength = [[Lane; TILE]; 2];

/// Columns of one parity and the cells that gather them.
#[derive(Debug, Clone)]
pub struct Columns {
    /// For every cell: the columns in its reach, and where their weights begin.
    gathers: Vec<(Range<usize>, usize)>,
    weights: Vec<f32>,
    /// For every tile: the cells that its columns reach.
    tiles: Vec<Range<usize>>,
}

impl Columns {
    /// Columns at `x_m`, ascending.
    pub fn new(axis: &Axis, x_m: &[f64]) -> Columns {
        let spread: Vec<_> = x_m.iter().map(|&x| axis.spread(x)).collect();
        let mut gathers = Vec::with_capacity(axis.cells);
        let mut weights = Vec::with_capacity(WIDTH * x_m.len());
        for cell in 0..axis.cells {
            let start = spread.partition_point(|(first, _)| first + WIDTH <= cell);
            let end = spread.partition_point(|(first, _)| *first <= cell);
            gathers.push((start..end, weights.len()));
            weights.extend(
                spread[start..end]
                    .iter()
                    .map(|(first, taps)| taps[cell - first] as f32),
            );
        }
        let tiles = spread
            .chunks(TILE)
            .map(|tile| tile[0].0..tile[tile.len() - 1].0 + WIDTH)
            .collect();
        Columns {
            gathers,
            weights,
            tiles,
        }
    }

    /// Running sums over the columns of every cell's weights times `factor`, for rows
    /// that all their columns fill alike.
    pub fn running(&self, factor: &[Complex64]) -> RunningColumns {
        let mut sums = Vec::with_capacity(self.weights.len() + self.gathers.len());
        let starts = self
            .gathers
            .iter()
            .map(|(columns, offset)| {
                let start = sums.len();
                let mut sum = Complex64::default();
                sums.push(sum);
                for (column, weight) in columns.clone().zip(&self.weights[*offset..]) {
                    sum += factor[column] * f64::from(*weight);
                    sums.push(sum);
                }
                (columns.clone(), start)
            })
            .collect();
        RunningColumns { starts, sums }
    }

    /// Part of a cell's gather that lies in a tile: columns within the tile, and their weights.
    #[inline(always)]
    fn gather(&self, cell: usize, tile: usize) -> (usize, &[f32]) {
        let (columns, offset) = &self.gathers[cell];
        let start = columns.start.max(tile * TILE);
        let end = columns.end.min((tile + 1) * TILE).max(start);
        let from = offset + start - columns.start;
        (start - tile * TILE, &self.weights[from..from + end - start])
    }
}

/// Sums over columns, to be read for any span of them.
#[derive(Debug)]
pub struct RunningColumns {
    /// For every cell: the columns in its reach, and where their sums begin.
    starts: Vec<(Range<usize>, usize)>,
    sums: Vec<Complex64>,
}

impl RunningColumns {
    /// What the columns of a row's spans bring to every cell, times `factor`.
    pub fn row(&self, spans: &[Range<usize>; 2], factor: Complex64, cells: &mut [Complex64]) {
        for (value, (columns, start)) in cells.iter_mut().zip(&self.starts) {
            let up_to = |column: usize| {
                self.sums[start + column.clamp(columns.start, columns.end) - columns.start]
            };
            let sum: Complex64 = spans
                .iter()
                .filter(|span| !span.is_empty())
                .map(|span| up_to(span.end) - up_to(span.start))
                .sum();
            *value = factor * sum;
        }
    }
}

/// What a tile is computed from, besides its errors.
#[derive(Debug, Clone, Copy)]
pub struct Tile<'a> {
    /// Number of its group.
    pub group: u64,
    /// Its place in the row of tiles.
    pub tile: usize,
    /// Columns of its parity.
    pub columns: &'a Columns,
    /// Factor (real, imaginary) on each column's elements.
    pub factor: &'a [[f32; 2]],
    /// Whether every factor is 1.
    pub plain: bool,
    /// Static tilt of each column along x, and of each row along y.
    pub static_tilt_rad: Option<(&'a [f32], &'a [f32; LANES])>,
    /// Columns of each row that carry an element, where not all do.
    pub occupied: Option<&'a [[Range<usize>; 2]]>,
}

/// Memory that is reused from tile to tile.
#[derive(Debug)]
pub struct Workspace {
    block: Block,
    monomials: Vec<[f32; GROUP]>,
    strengths: Vec<Strength>,
    /// Σ|z|² of each row, without the rows' own factors.
    pub power: [f64; LANES],
    /// Elements that radiate nothing.
    pub dark: usize,
    /// Elements at a random phase.
    pub unlocked: usize,
}

impl Workspace {
    /// For an expansion.
    pub fn new(expansion: &TiltExpansion) -> Workspace {
        Workspace {
            block: Block::default(),
            monomials: vec![[1.0; GROUP]; expansion.monomials.len()],
            strengths: vec![[[[0.0; LANES]; TILE]; 2]; expansion.terms()],
            power: [0.0; LANES],
            dark: 0,
            unlocked: 0,
        }
    }

    /// |amplitude|² of a slot of the last group.
    pub fn power_of(&self, slot: usize) -> f64 {
        f64::from(self.block.amplitude[slot]).powi(2)
    }

    /// Strength of a slot of the last group, real and imaginary, for every term.
    pub fn strengths_of(&self, slot: usize) -> impl Iterator<Item = (f32, f32)> {
        self.strengths.iter().map(move |[real, imaginary]| {
            (real.as_flattened()[slot], imaginary.as_flattened()[slot])
        })
    }
}

/// Draw a tile, and add it to the cells of its band: `[term][real, imaginary][cell][row]`.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn process(
    recipe: &Recipe,
    expansion: &TiltExpansion,
    tile: &Tile<'_>,
    workspace: &mut Workspace,
    cells: &mut [Lane],
) {
    const FUSED: bool =
        multiversion::target::target_cfg_f!(any(target_feature = "fma", target_arch = "aarch64"));
    recipe.fill::<FUSED>(tile.group, &mut workspace.block);
    if let Some(occupied) = tile.occupied {
        clear_idle(&mut workspace.block, tile.tile, occupied);
    }
    if let Some((along_x, along_y)) = tile.static_tilt_rad {
        add_static_tilt(&mut workspace.block, along_x, along_y);
    }
    strengths::<FUSED>(expansion, workspace);
    take_census(recipe, tile.factor, workspace);
    if !tile.plain {
        apply_factor::<FUSED>(tile.factor, workspace);
    }
    let count = expansion.terms();
    let (each, mut term) = (cells.len() / count, 0);
    while term < count {
        let cells = &mut cells[term * each..];
        let strengths = &workspace.strengths[term..];
        term += match count - term {
            1 => gather_terms::<FUSED, 1>(tile, strengths, cells),
            2 => gather_terms::<FUSED, 2>(tile, strengths, cells),
            3 => gather_terms::<FUSED, 3>(tile, strengths, cells),
            _ => gather_terms::<FUSED, 4>(tile, strengths, cells),
        };
    }
}

/// Draw a group of a list, leaving its strengths in the workspace; `tilt` are static tilts of its elements.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn process_list(
    recipe: &Recipe,
    expansion: &TiltExpansion,
    group: u64,
    count: usize,
    tilt: Option<(&[f64], &[f64])>,
    workspace: &mut Workspace,
) {
    const FUSED: bool =
        multiversion::target::target_cfg_f!(any(target_feature = "fma", target_arch = "aarch64"));
    recipe.fill::<FUSED>(group, &mut workspace.block);
    let block = &mut workspace.block;
    for slot in count..GROUP {
        block.amplitude[slot] = 0.0;
        block.state[slot] = State::Lit;
    }
    if let Some((x, y)) = tilt {
        for slot in 0..count {
            block.tilt_x_rad[slot] += x[slot] as f32;
            block.tilt_y_rad[slot] += y[slot] as f32;
        }
    }
    strengths::<FUSED>(expansion, workspace);
    take_census(recipe, &[], workspace);
}

/// Add one row of a band's cells, times a factor, to the grid lines that it reaches.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn add_lane(
    real: &[Lane],
    imaginary: &[Lane],
    lane: usize,
    factor: Complex64,
    weights: &[f64; WIDTH],
    row: &mut [Complex64],
    lines: &mut [Complex64],
) {
    for ((value, real), imaginary) in row.iter_mut().zip(real).zip(imaginary) {
        *value = factor * Complex64::new(f64::from(real[lane]), f64::from(imaginary[lane]));
    }
    spread_row(row, weights, lines);
}

/// Add a row of cells to the grid lines that it reaches.
#[inline(always)]
pub fn spread_row(row: &[Complex64], weights: &[f64; WIDTH], lines: &mut [Complex64]) {
    for (line, &weight) in lines.chunks_exact_mut(row.len()).zip(weights) {
        for (value, part) in line.iter_mut().zip(row) {
            value.re += weight * part.re;
            value.im += weight * part.im;
        }
    }
}

/// Keep the map's part of a transformed line, the kernel divided out.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn deconvolve(
    line: &[Complex32],
    centre: usize,
    deconvolution: &[f32],
    kept: &mut [Complex32],
) {
    // Negative frequencies stand at the line's end.
    let values = line[line.len() - centre..].iter().chain(line);
    for ((kept, value), factor) in kept.iter_mut().zip(values).zip(deconvolution) {
        *kept = value * factor;
    }
}

/// Add the map's part of a transformed line, the kernel divided out, times a pattern to a field.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn add_term(
    line: &[Complex32],
    centre: usize,
    deconvolution: &[f32],
    pattern: &[Complex64],
    field: &mut [Complex64],
) {
    let mut add = |line: &[Complex32], from: usize| {
        let span = from..from + line.len();
        let parts = pattern[span.clone()]
            .iter()
            .zip(&deconvolution[span.clone()]);
        for ((field, value), (pattern, factor)) in field[span].iter_mut().zip(line).zip(parts) {
            let value = value * factor;
            *field += Complex64::new(f64::from(value.re), f64::from(value.im)) * pattern;
        }
    };
    add(&line[line.len() - centre..], 0);
    add(&line[..pattern.len() - centre], centre);
}

/// Darken slots without an element.
#[inline(always)]
fn clear_idle(block: &mut Block, tile: usize, occupied: &[[Range<usize>; 2]]) {
    for lane in 0..LANES {
        let spans = occupied.get(lane);
        for column in 0..TILE {
            let place = tile * TILE + column;
            let held =
                spans.is_some_and(|[left, right]| left.contains(&place) || right.contains(&place));
            if !held {
                block.amplitude[column * LANES + lane] = 0.0;
                block.state[column * LANES + lane] = State::Lit;
            }
        }
    }
}

#[inline(always)]
fn add_static_tilt(block: &mut Block, along_x: &[f32], along_y: &[f32; LANES]) {
    for (column, x) in along_x.iter().enumerate() {
        for lane in 0..LANES {
            block.tilt_x_rad[column * LANES + lane] += x;
            block.tilt_y_rad[column * LANES + lane] += along_y[lane];
        }
    }
}

/// amplitude · gₜ(tilt) · exp(iφ) for every term.
#[inline(always)]
fn strengths<const FUSED: bool>(expansion: &TiltExpansion, workspace: &mut Workspace) {
    const CHUNK: usize = 4 * LANES;
    let block = &workspace.block;
    let monomials = &mut workspace.monomials;
    let scale = expansion.per_rad;
    for (index, &(power_x, power_y)) in expansion.monomials.iter().enumerate().skip(1) {
        // Monomials come by total degree, x's power falling: (a − 1, b) stands `a + b` places before.
        let (parent, tilt) = if power_x > 0 {
            (index - power_x - power_y, &block.tilt_x_rad)
        } else {
            (index - power_y - 1, &block.tilt_y_rad)
        };
        let (before, rest) = monomials.split_at_mut(index);
        for slot in 0..GROUP {
            rest[0][slot] = before[parent][slot] * (tilt[slot] * scale);
        }
    }
    let mut cos = [0.0; GROUP];
    let mut sin = [0.0; GROUP];
    for slot in 0..GROUP {
        let (c, s) = cos_sin_turns::<FUSED>(block.turns[slot]);
        cos[slot] = block.amplitude[slot] * c;
        sin[slot] = block.amplitude[slot] * s;
    }
    for (polynomial, [real, imaginary]) in
        expansion.polynomials.iter().zip(&mut workspace.strengths)
    {
        for chunk in 0..GROUP / CHUNK {
            let start = chunk * CHUNK;
            let mut sum = [0.0f32; CHUNK];
            for &(monomial, coefficient) in polynomial {
                let values = &monomials[monomial][start..start + CHUNK];
                for lane in 0..CHUNK {
                    sum[lane] = fma::<FUSED>(coefficient, values[lane], sum[lane]);
                }
            }
            let real = &mut real.as_flattened_mut()[start..start + CHUNK];
            let imaginary = &mut imaginary.as_flattened_mut()[start..start + CHUNK];
            for lane in 0..CHUNK {
                real[lane] = sum[lane] * cos[start + lane];
                imaginary[lane] = sum[lane] * sin[start + lane];
            }
        }
    }
}

/// Count what is out, and add up |amplitude · column's factor|² by row.
#[inline(always)]
fn take_census(recipe: &Recipe, factor: &[[f32; 2]], workspace: &mut Workspace) {
    let block = &workspace.block;
    let mut sums = [0.0f32; LANES];
    for ([a, b], values) in factor.iter().zip(block.amplitude.chunks_exact(LANES)) {
        let square = a * a + b * b;
        for lane in 0..LANES {
            sums[lane] += square * values[lane] * values[lane];
        }
    }
    for lane in 0..LANES {
        workspace.power[lane] += f64::from(sums[lane]);
    }
    if recipe.drops() {
        let (mut dark, mut unlocked) = (0u32, 0u32);
        for state in &block.state {
            dark += u32::from(*state == State::Dark);
            unlocked += u32::from(*state == State::Unlocked);
        }
        workspace.dark += dark as usize;
        workspace.unlocked += unlocked as usize;
    }
}

/// Multiply every term by the columns' complex factors.
#[inline(always)]
fn apply_factor<const FUSED: bool>(factor: &[[f32; 2]], workspace: &mut Workspace) {
    for [real, imaginary] in &mut workspace.strengths {
        for ((real, imaginary), [a, b]) in real.iter_mut().zip(imaginary).zip(factor) {
            for lane in 0..LANES {
                let (x, y) = (real[lane], imaginary[lane]);
                real[lane] = fma::<FUSED>(*a, x, -(b * y));
                imaginary[lane] = fma::<FUSED>(*a, y, b * x);
            }
        }
    }
}

/// Gather the tile's columns into the cells of `N` terms; returns `N`.
#[inline(always)]
fn gather_terms<const FUSED: bool, const N: usize>(
    tile: &Tile<'_>,
    strengths: &[Strength],
    cells: &mut [Lane],
) -> usize {
    let per_part = cells.len() / (2 * strengths.len());
    let strengths: &[Strength; N] = strengths.first_chunk().expect("as many terms as counted");
    for cell in tile.columns.tiles[tile.tile].clone() {
        let (first, weights) = tile.columns.gather(cell, tile.tile);
        let mut sums: [[Lane; 2]; N] = [[[0.0; LANES]; 2]; N];
        for (index, &weight) in weights.iter().enumerate() {
            for term in 0..N {
                for part in 0..2 {
                    let values = &strengths[term][part][first + index];
                    for lane in 0..LANES {
                        sums[term][part][lane] =
                            fma::<FUSED>(weight, values[lane], sums[term][part][lane]);
                    }
                }
            }
        }
        for term in 0..N {
            for part in 0..2 {
                let values = &mut cells[(2 * term + part) * per_part + cell];
                for lane in 0..LANES {
                    values[lane] += sums[term][part][lane];
                }
            }
        }
    }
    N
}
