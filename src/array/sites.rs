//! Where the elements sit.
//!
//! A lattice is kept as rows of spans, not as a list, so that ten billion sites take
//! a few megabytes; rings and tables are lists. Elements are numbered row by row, y
//! ascending and x ascending within a row.

use super::element::SQRT_3;
use crate::scenario::{ArraySection, Element, Keep, Lattice, Layout, Origin, Outline};
use std::f64::consts::TAU;
use std::ops::Range;

/// Sites that touch an edge are inside, up to this share of its size.
const SLACK: f64 = 1e-9;

/// Sites of a lattice, in rows.
#[derive(Debug, Clone, PartialEq)]
pub struct LatticeSites {
    /// The lattice.
    pub lattice: Lattice,
    /// Distance of neighbours.
    pub pitch_m: f64,
    /// Rows of the lattice, y ascending, empty ones included.
    pub rows: Vec<Row>,
    /// Columns that a row may have.
    pub columns: usize,
    /// x of column 0 in rows of parity 0 and 1.
    pub first_x_m: [f64; 2],
}

/// One row of a lattice.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// y of its centres.
    pub y_m: f64,
    /// 1 for the rows of a hexagonal lattice that are shifted by half a pitch.
    pub parity: usize,
    /// Number of its first element.
    pub first: usize,
    /// Columns that carry an element, left and right of a hole; the second is empty without one.
    pub spans: [Range<usize>; 2],
}

impl Row {
    /// Elements in the row.
    pub fn len(&self) -> usize {
        self.spans[0].len() + self.spans[1].len()
    }

    /// Whether the row carries no element.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Its columns with an element, ascending.
    pub fn columns(&self) -> impl Iterator<Item = usize> + use<> {
        self.spans[0].clone().chain(self.spans[1].clone())
    }

    /// First and last column with an element.
    pub fn ends(&self) -> Option<(usize, usize)> {
        let [left, right] = &self.spans;
        let first = if left.is_empty() { right } else { left };
        let last = if right.is_empty() { left } else { right };
        (!self.is_empty()).then(|| (first.start, last.end - 1))
    }
}

impl LatticeSites {
    /// x of a column in a row.
    pub fn x_m(&self, parity: usize, column: usize) -> f64 {
        self.first_x_m[parity] + column as f64 * self.pitch_m
    }

    /// Elements in all rows.
    pub fn len(&self) -> usize {
        self.rows.last().map_or(0, |row| row.first + row.len())
    }

    /// Whether no row carries an element.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }
}

/// About how many elements a layout holds, before any is laid out; 0 for a table.
pub fn foreseen(section: &ArraySection) -> f64 {
    match &section.layout {
        Layout::SquareBlock { rows, columns } => *rows as f64 * *columns as f64,
        Layout::HexagonalRings { rings } => 3.0 * (*rings as f64) * (*rings as f64 + 1.0) + 1.0,
        Layout::Outlined {
            lattice, across_m, ..
        } => across_m * across_m / cell_area_m2(*lattice, section.pitch_m),
        Layout::Rings { counts } => counts.iter().map(|&count| count as f64).sum(),
        Layout::Table { .. } => 0.0,
    }
}

/// Sites of a layout with a lattice; `None` for rings and tables.
pub fn lattice_sites(section: &ArraySection) -> Option<LatticeSites> {
    let pitch_m = section.pitch_m;
    let mut sites = match &section.layout {
        Layout::SquareBlock { rows, columns } => block(pitch_m, *rows, *columns),
        Layout::HexagonalRings { rings } => hexagonal_rings(pitch_m, *rings),
        Layout::Outlined {
            lattice,
            outline,
            across_m,
            origin,
        } => {
            let edge = Edge {
                outline: *outline,
                across_m: *across_m,
                keep: section.keep,
                element: section.element,
            };
            outlined(*lattice, pitch_m, *origin, &edge)
        }
        Layout::Rings { .. } | Layout::Table { .. } => return None,
    };
    if let Some(hole_m) = section.hole_m {
        cut_hole(&mut sites, hole_m, section);
    }
    let mut first = 0;
    for row in &mut sites.rows {
        row.first = first;
        first += row.len();
    }
    Some(sites)
}

/// Centres of the rings layout.
pub fn ring_sites(counts: &[u64], pitch_m: f64) -> Vec<(f64, f64)> {
    counts
        .iter()
        .enumerate()
        .flat_map(|(ring, &count)| {
            (0..count).map(move |index| {
                let azimuth = TAU * index as f64 / count as f64;
                let radius = ring as f64 * pitch_m;
                (radius * azimuth.cos(), radius * azimuth.sin())
            })
        })
        .collect()
}

/// Area of a lattice cell.
pub fn cell_area_m2(lattice: Lattice, pitch_m: f64) -> f64 {
    match lattice {
        Lattice::Square => pitch_m * pitch_m,
        Lattice::Hexagonal => SQRT_3 / 2.0 * pitch_m * pitch_m,
    }
}

/// Whether an element at (`x`, `y`) is clear of a central hole.
pub fn clear_of_hole(hole_m: f64, keep: Keep, element: &Element, x: f64, y: f64) -> bool {
    let radius = hole_m / 2.0 * (1.0 - SLACK);
    match keep {
        Keep::Whole => element.nearest_m(x, y) >= radius,
        Keep::Centre => x.hypot(y) >= radius,
    }
}

/// Rows × columns, centred on the axis.
fn block(pitch_m: f64, rows: u64, columns: u64) -> LatticeSites {
    let first = |count: u64| -(count as f64 - 1.0) / 2.0 * pitch_m;
    LatticeSites {
        lattice: Lattice::Square,
        pitch_m,
        rows: (0..rows)
            .map(|row| Row {
                y_m: first(rows) + row as f64 * pitch_m,
                parity: 0,
                first: 0,
                spans: [0..columns as usize, 0..0],
            })
            .collect(),
        columns: columns as usize,
        first_x_m: [first(columns); 2],
    }
}

/// Complete rings around a centre site.
fn hexagonal_rings(pitch_m: f64, rings: u64) -> LatticeSites {
    let rings = rings as i64;
    let left = -(rings as f64) * pitch_m;
    LatticeSites {
        lattice: Lattice::Hexagonal,
        pitch_m,
        rows: (-rings..=rings)
            .map(|row| {
                let skipped = (row.unsigned_abs() / 2) as usize;
                let count = (2 * rings + 1 - row.abs()) as usize;
                Row {
                    y_m: row as f64 * SQRT_3 / 2.0 * pitch_m,
                    parity: row.rem_euclid(2) as usize,
                    first: 0,
                    spans: [skipped..skipped + count, 0..0],
                }
            })
            .collect(),
        columns: 2 * rings as usize + 1,
        first_x_m: [left, left + 0.5 * pitch_m],
    }
}

/// An outline, and what counts as inside.
struct Edge {
    outline: Outline,
    across_m: f64,
    keep: Keep,
    element: Element,
}

impl Edge {
    /// Whether an element at (`x`, `y`) is inside, whole or by its centre.
    fn holds(&self, x: f64, y: f64) -> bool {
        let limit = self.across_m / 2.0 * (1.0 + SLACK);
        if self.outline == Outline::Circle {
            return match self.keep {
                Keep::Whole => self.element.farthest_m(x, y) <= limit,
                Keep::Centre => x.hypot(y) <= limit,
            };
        }
        let normals: &[(f64, f64)] = match self.outline {
            Outline::Square => &[(1.0, 0.0), (0.0, 1.0)],
            // Corners on ±x: flats face ±y and the directions 60° from it.
            _ => &[(0.0, 1.0), (SQRT_3 / 2.0, 0.5), (SQRT_3 / 2.0, -0.5)],
        };
        normals.iter().all(|&(nx, ny)| {
            let margin = match self.keep {
                Keep::Whole => self.element.extent_along_m(nx, ny),
                Keep::Centre => 0.0,
            };
            (x * nx + y * ny).abs() + margin <= limit
        })
    }
}

/// Lattice sites inside an outline.
fn outlined(lattice: Lattice, pitch_m: f64, origin: Origin, edge: &Edge) -> LatticeSites {
    let row_pitch_m = match lattice {
        Lattice::Square => pitch_m,
        Lattice::Hexagonal => SQRT_3 / 2.0 * pitch_m,
    };
    let (shift_x, shift_y) = match (origin, lattice) {
        (Origin::Site, _) => (0.0, 0.0),
        (Origin::Gap, Lattice::Square) => (0.5 * pitch_m, 0.5 * pitch_m),
        (Origin::Gap, Lattice::Hexagonal) => (0.5 * pitch_m, SQRT_3 / 6.0 * pitch_m),
    };
    // A hexagon outline reaches across/√3 along x: the widest of all.
    let reach_m = 0.6 * edge.across_m;
    let (half_rows, half_columns) = (
        (reach_m / row_pitch_m) as i64 + 2,
        (reach_m / pitch_m) as i64 + 2,
    );
    let left = -(half_columns as f64) * pitch_m - shift_x;
    let mut sites = LatticeSites {
        lattice,
        pitch_m,
        rows: Vec::new(),
        columns: 2 * half_columns as usize + 1,
        first_x_m: [left, left + 0.5 * pitch_m],
    };
    let mut before = 0..0;
    for row in -half_rows..=half_rows {
        let y_m = row as f64 * row_pitch_m - shift_y;
        let parity = match lattice {
            Lattice::Square => 0,
            Lattice::Hexagonal => row.rem_euclid(2) as usize,
        };
        let span = span(&sites, parity, before, |x| edge.holds(x, y_m));
        before = span.clone();
        sites.rows.push(Row {
            y_m,
            parity,
            first: 0,
            spans: [span, 0..0],
        });
    }
    sites.rows.retain(|row| !row.is_empty());
    trim(&mut sites);
    sites
}

/// Drop the columns on the left and right that no row uses.
fn trim(sites: &mut LatticeSites) {
    let used = |row: &Row| row.spans[0].clone();
    let start = sites
        .rows
        .iter()
        .map(|row| used(row).start)
        .min()
        .unwrap_or(0);
    let end = sites
        .rows
        .iter()
        .map(|row| used(row).end)
        .max()
        .unwrap_or(0);
    for row in &mut sites.rows {
        let span = used(row);
        row.spans[0] = span.start - start..span.end - start;
    }
    for x in &mut sites.first_x_m {
        *x += start as f64 * sites.pitch_m;
    }
    sites.columns = end - start;
}

/// Columns of a row where `holds` is true, which is an interval about x = 0; walks from
/// the span of the row before, which differs little.
fn span(
    sites: &LatticeSites,
    parity: usize,
    before: Range<usize>,
    holds: impl Fn(f64) -> bool,
) -> Range<usize> {
    let inside = |column: usize| holds(sites.x_m(parity, column));
    let nearest = (-sites.first_x_m[parity] / sites.pitch_m).round();
    let middle = (nearest.max(0.0) as usize).min(sites.columns.saturating_sub(1));
    // At a gap two sites are equally near; rounding may take either, so look at both.
    let Some(middle) = [
        middle,
        middle.saturating_sub(1),
        (middle + 1).min(sites.columns - 1),
    ]
    .into_iter()
    .find(|&column| inside(column)) else {
        return 0..0;
    };
    let mut start = before.start.min(middle);
    while start > 0 && inside(start - 1) {
        start -= 1;
    }
    while start < middle && !inside(start) {
        start += 1;
    }
    let mut end = before.end.max(middle + 1).min(sites.columns);
    while end < sites.columns && inside(end) {
        end += 1;
    }
    while end > middle + 1 && !inside(end - 1) {
        end -= 1;
    }
    start..end
}

/// Leave out the sites at a central hole.
fn cut_hole(sites: &mut LatticeSites, hole_m: f64, section: &ArraySection) {
    let mut before = 0..0;
    for index in 0..sites.rows.len() {
        let (y_m, parity) = (sites.rows[index].y_m, sites.rows[index].parity);
        let hole = span(sites, parity, before, |x| {
            !clear_of_hole(hole_m, section.keep, &section.element, x, y_m)
        });
        before = hole.clone();
        if hole.is_empty() {
            continue;
        }
        let whole = sites.rows[index].spans[0].clone();
        sites.rows[index].spans = [
            whole.start..hole.start.clamp(whole.start, whole.end),
            hole.end.clamp(whole.start, whole.end)..whole.end,
        ];
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::scenario::Shape;

    /// The spans agree with a plain test of every site of the plane.
    #[test]
    fn spans_hold_exactly_the_sites_inside_the_outline_and_outside_the_hole() {
        for lattice in [Lattice::Square, Lattice::Hexagonal] {
            for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
                for outline in [Outline::Circle, Outline::Square, Outline::Hexagon] {
                    for keep in [Keep::Whole, Keep::Centre] {
                        for origin in [Origin::Site, Origin::Gap] {
                            agrees(lattice, shape, outline, keep, origin);
                        }
                    }
                }
            }
        }
    }

    fn agrees(lattice: Lattice, shape: Shape, outline: Outline, keep: Keep, origin: Origin) {
        let element = Element {
            shape,
            size_m: 0.8,
            obscuration: 0.0,
            beam_radius_m: None,
        };
        let (across_m, hole_m) = (13.3, 3.1);
        let section = ArraySection {
            layout: Layout::Outlined {
                lattice,
                outline,
                across_m,
                origin,
            },
            pitch_m: 1.0,
            hole_m: Some(hole_m),
            keep,
            taper_db: 0.0,
            element,
        };
        let edge = Edge {
            outline,
            across_m,
            keep,
            element,
        };
        let mut expected = Vec::new();
        for row in -12..=12 {
            for column in -12..=12 {
                let (row, column) = (f64::from(row), f64::from(column));
                let (mut x, mut y) = match lattice {
                    Lattice::Square => (column, row),
                    Lattice::Hexagonal => (column + 0.5 * row.rem_euclid(2.0), row * SQRT_3 / 2.0),
                };
                if origin == Origin::Gap {
                    x -= 0.5;
                    y -= if lattice == Lattice::Square {
                        0.5
                    } else {
                        SQRT_3 / 6.0
                    };
                }
                if edge.holds(x, y) && clear_of_hole(hole_m, keep, &element, x, y) {
                    expected.push((x, y));
                }
            }
        }
        let sites = lattice_sites(&section).expect("a lattice");
        let found: Vec<(f64, f64)> = sites
            .rows
            .iter()
            .flat_map(|row| {
                row.columns()
                    .map(|column| (sites.x_m(row.parity, column), row.y_m))
            })
            .collect();
        let case = format!("{lattice:?} {shape:?} {outline:?} {keep:?} {origin:?}");
        assert_eq!(found.len(), expected.len(), "{case}");
        assert_eq!(found.len(), sites.len(), "{case}");
        for (a, b) in found.iter().zip(&expected) {
            assert!(
                (a.0 - b.0).abs() < 1e-9 && (a.1 - b.1).abs() < 1e-9,
                "{case}: {a:?} {b:?}"
            );
        }
    }
}
