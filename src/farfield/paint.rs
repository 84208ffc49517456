//! Painting elements on the grid of the `sampled` method.

use super::pattern::{Wavefront, profile_power_m2};
use crate::array::{Array, Elements};
use crate::scenario::Element;
use num_complex::{Complex32, Complex64};
use rayon::prelude::*;

/// Every element's mean field in each cell that it touches, for unit power.
#[derive(Debug)]
pub struct Cells {
    /// Rows that hold light, ascending; row i lies at y = i·pitch.
    pub rows: Vec<i64>,
    /// Elements by their first row.
    order: Vec<usize>,
    /// First row of each entry of `order`.
    first_rows: Vec<i64>,
    /// Painted boxes, by element.
    boxes: Vec<PaintedBox>,
    /// Most rows of any box.
    tallest: i64,
}

/// The cells of one element, row by row.
#[derive(Debug)]
struct PaintedBox {
    first_row: i64,
    first_column: i64,
    columns: usize,
    cells: Vec<Complex32>,
    /// Cells that an edge crosses, row by row.
    edges: Vec<Edge>,
}

/// A cell that an edge crosses: its light sits about the middle of the covered part.
#[derive(Debug, Clone, Copy)]
pub struct Edge {
    row: u32,
    /// Column within the strip.
    pub column: u32,
    /// From the cell's centre to the middle of the covered part.
    pub x_m: f32,
    /// From the cell's centre to the middle of the covered part.
    pub y_m: f32,
}

/// One row of one element.
#[derive(Debug)]
pub struct Strip<'a> {
    /// The element.
    pub element: usize,
    /// Column of its first cell; column j lies at x = j·pitch.
    pub first_column: i64,
    /// Mean field in each cell.
    pub cells: &'a [Complex32],
    /// Those that an edge crosses, by column.
    pub edges: &'a [Edge],
}

impl Cells {
    /// The strips that cross a row, in a fixed order.
    pub fn strips(&self, row: i64) -> impl Iterator<Item = Strip<'_>> {
        let from = self
            .first_rows
            .partition_point(|&first| first <= row - self.tallest);
        let to = self.first_rows.partition_point(|&first| first <= row);
        self.order[from..to].iter().filter_map(move |&element| {
            let painted = &self.boxes[element];
            let row = (row - painted.first_row) as usize;
            let start = row * painted.columns;
            let cells = painted.cells.get(start..start + painted.columns)?;
            let up_to = |row: usize| {
                painted
                    .edges
                    .partition_point(|edge| (edge.row as usize) < row)
            };
            Some(Strip {
                element,
                first_column: painted.first_column,
                cells,
                edges: &painted.edges[up_to(row)..up_to(row + 1)],
            })
        })
    }
}

/// Paint every element of an array on a grid of `pitch_m`.
pub fn paint(array: &Array, elements: &Elements, pitch_m: f64, wavefront: Wavefront) -> Cells {
    let brush = Brush::new(array, pitch_m, wavefront);
    let boxes: Vec<PaintedBox> = (0..elements.len())
        .into_par_iter()
        .map(|n| brush.paint(elements.x_m[n], elements.y_m[n]))
        .collect();
    let mut order: Vec<usize> = (0..boxes.len()).collect();
    order.sort_by_key(|&n| boxes[n].first_row);
    let height = |painted: &PaintedBox| (painted.cells.len() / painted.columns) as i64;
    let mut rows: Vec<i64> = boxes
        .iter()
        .flat_map(|painted| painted.first_row..painted.first_row + height(painted))
        .collect();
    rows.sort_unstable();
    rows.dedup();
    Cells {
        rows,
        first_rows: order.iter().map(|&n| boxes[n].first_row).collect(),
        order,
        tallest: boxes.iter().map(height).max().unwrap_or(1),
        boxes,
    }
}

/// What every element is painted with.
struct Brush {
    element: Element,
    pitch_m: f64,
    scale: f64,
    /// Exponent q of exp(−q|s|²).
    q: Complex64,
}

impl Brush {
    fn new(array: &Array, pitch_m: f64, wavefront: Wavefront) -> Brush {
        Brush {
            element: array.element,
            pitch_m,
            scale: 1.0 / profile_power_m2(&array.element).sqrt(),
            q: wavefront.exponent_per_m2(&array.element, array.wavenumber()),
        }
    }

    fn paint(&self, x_m: f64, y_m: f64) -> PaintedBox {
        let (half_x, half_y) = self.element.half_extent_m();
        let cell = |position: f64| (position / self.pitch_m).round() as i64;
        let (first_column, last_column) = (cell(x_m - half_x), cell(x_m + half_x));
        let (first_row, last_row) = (cell(y_m - half_y), cell(y_m + half_y));
        let mut cells = Vec::new();
        let mut edges = Vec::new();
        for row in first_row..=last_row {
            for column in first_column..=last_column {
                let (mean, middle) = self.cell(
                    column as f64 * self.pitch_m - x_m,
                    row as f64 * self.pitch_m - y_m,
                );
                cells.push(Complex32::new(mean.re as f32, mean.im as f32));
                if let Some((x, y)) = middle {
                    edges.push(Edge {
                        row: (row - first_row) as u32,
                        column: (column - first_column) as u32,
                        x_m: x as f32,
                        y_m: y as f32,
                    });
                }
            }
        }
        PaintedBox {
            first_row,
            first_column,
            columns: (last_column - first_column + 1) as usize,
            cells,
            edges,
        }
    }

    /// Mean field over the cell centred at (`x`, `y`) from the element's centre, and where an
    /// edge crosses it, the way from there to the middle of the covered part.
    fn cell(&self, x: f64, y: f64) -> (Complex64, Option<(f64, f64)>) {
        let pitch = self.pitch_m;
        let area = pitch * pitch;
        let covered = self.element.covered_area_m2(x, y, pitch) / area;
        if covered <= 0.0 {
            return (Complex64::default(), None);
        }
        let size = self.element.size_m;
        let flat = self.q.norm() * size * size < 1e-10;
        let field = |x: f64, y: f64| (-self.q * (x * x + y * y)).exp();
        if covered > 1.0 - 1e-9 {
            if flat {
                return ((covered * self.scale).into(), None);
            }
            // Two Gauss points an axis: exact to the fourth order of the pitch.
            let offset = pitch / 12f64.sqrt();
            let sum: Complex64 = [(-1.0, -1.0), (-1.0, 1.0), (1.0, -1.0), (1.0, 1.0)]
                .iter()
                .map(|(i, j)| 0.25 * field(x + i * offset, y + j * offset))
                .sum();
            return (sum * self.scale, None);
        }
        // Smaller cells, each at its centre.
        const PARTS: i32 = 4;
        let part = pitch / f64::from(PARTS);
        let at = |index: i32| (f64::from(index) - f64::from(PARTS - 1) / 2.0) * part;
        let mut sum = Complex64::default();
        let (mut share, mut middle_x, mut middle_y) = (0.0, 0.0, 0.0);
        for (i, j) in (0..PARTS).flat_map(|i| (0..PARTS).map(move |j| (i, j))) {
            let (dx, dy) = (at(i), at(j));
            let covered = self.element.covered_area_m2(x + dx, y + dy, part) / area;
            share += covered;
            middle_x += covered * dx;
            middle_y += covered * dy;
            if !flat {
                sum += covered * field(x + dx, y + dy);
            }
        }
        let mean = if flat { covered.into() } else { sum };
        // A sliver's middle is lost in rounding, and so is its light.
        let middle = (share > 1e-9).then(|| (middle_x / share, middle_y / share));
        (mean * self.scale, middle)
    }
}
