//! Where the elements of a lattice or of rings sit.
//!
//! Sites come row by row, y ascending and x ascending within a row, so that an
//! element keeps its number, and with it its random draws, whatever computes it.

use super::element::SQRT_3;
use crate::scenario::{ArraySection, Element, Keep, Lattice, Layout, Origin, Outline};
use std::f64::consts::TAU;

/// Sites that touch an edge are inside, up to this share of its size.
const SLACK: f64 = 1e-9;

/// Centres of the elements of every layout but a table, before the hole is cut.
pub fn sites(section: &ArraySection) -> Vec<(f64, f64)> {
    let pitch = section.pitch_m;
    match &section.layout {
        Layout::SquareBlock { rows, columns } => {
            let at = |index: u64, count: u64| (index as f64 - (count as f64 - 1.0) / 2.0) * pitch;
            (0..*rows)
                .flat_map(|row| {
                    (0..*columns).map(move |column| (at(column, *columns), at(row, *rows)))
                })
                .collect()
        }
        Layout::HexagonalRings { rings } => {
            let rings = *rings as i64;
            (-rings..=rings)
                .flat_map(|row| {
                    let count = 2 * rings + 1 - row.abs();
                    (0..count).map(move |index| {
                        let x = (index as f64 - (count as f64 - 1.0) / 2.0) * pitch;
                        (x, row as f64 * SQRT_3 / 2.0 * pitch)
                    })
                })
                .collect()
        }
        Layout::Outlined {
            lattice,
            outline,
            across_m,
            origin,
        } => outlined(*lattice, pitch, *origin, *across_m)
            .filter(|&(x, y)| inside(*outline, *across_m, section.keep, &section.element, x, y))
            .collect(),
        Layout::Rings { counts } => counts
            .iter()
            .enumerate()
            .flat_map(|(ring, &count)| {
                (0..count).map(move |index| {
                    let azimuth = TAU * index as f64 / count as f64;
                    let radius = ring as f64 * pitch;
                    (radius * azimuth.cos(), radius * azimuth.sin())
                })
            })
            .collect(),
        Layout::Table { .. } => Vec::new(),
    }
}

/// How many sites a layout has, or nearly has, without listing them; `None` for a table.
pub fn expected_count(section: &ArraySection) -> Option<f64> {
    Some(match &section.layout {
        Layout::SquareBlock { rows, columns } => *rows as f64 * *columns as f64,
        Layout::HexagonalRings { rings } => 1.0 + 3.0 * *rings as f64 * (*rings as f64 + 1.0),
        Layout::Outlined {
            lattice,
            outline,
            across_m,
            ..
        } => {
            let share = match outline {
                Outline::Circle => std::f64::consts::FRAC_PI_4,
                Outline::Square => 1.0,
                Outline::Hexagon => SQRT_3 / 2.0,
            };
            share * across_m * across_m / cell_area_m2(*lattice, section.pitch_m)
        }
        Layout::Rings { counts } => counts.iter().map(|&count| count as f64).sum(),
        Layout::Table { .. } => return None,
    })
}

/// Area of a lattice cell.
pub fn cell_area_m2(lattice: Lattice, pitch_m: f64) -> f64 {
    match lattice {
        Lattice::Square => pitch_m * pitch_m,
        Lattice::Hexagonal => SQRT_3 / 2.0 * pitch_m * pitch_m,
    }
}

/// The lattice of a layout, if it has one.
pub fn lattice(layout: &Layout) -> Option<Lattice> {
    match layout {
        Layout::SquareBlock { .. } => Some(Lattice::Square),
        Layout::HexagonalRings { .. } => Some(Lattice::Hexagonal),
        Layout::Outlined { lattice, .. } => Some(*lattice),
        Layout::Rings { .. } | Layout::Table { .. } => None,
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

/// Lattice sites of a square that is sure to hold any outline of this size.
fn outlined(
    lattice: Lattice,
    pitch: f64,
    origin: Origin,
    across: f64,
) -> impl Iterator<Item = (f64, f64)> {
    let row_pitch = match lattice {
        Lattice::Square => pitch,
        Lattice::Hexagonal => SQRT_3 / 2.0 * pitch,
    };
    let (shift_x, shift_y) = match (origin, lattice) {
        (Origin::Site, _) => (0.0, 0.0),
        (Origin::Gap, Lattice::Square) => (0.5 * pitch, 0.5 * pitch),
        (Origin::Gap, Lattice::Hexagonal) => (0.5 * pitch, SQRT_3 / 6.0 * pitch),
    };
    // A hexagon outline reaches across/√3 along x: the widest of all.
    let reach = across * 0.6;
    let rows = (reach / row_pitch) as i64 + 2;
    let columns = (reach / pitch) as i64 + 2;
    (-rows..=rows).flat_map(move |row| {
        let offset = match lattice {
            Lattice::Hexagonal if row.rem_euclid(2) == 1 => 0.5 * pitch,
            _ => 0.0,
        };
        (-columns..=columns).map(move |column| {
            (
                column as f64 * pitch + offset - shift_x,
                row as f64 * row_pitch - shift_y,
            )
        })
    })
}

/// Whether an element at (`x`, `y`) is inside an outline, whole or by its centre.
fn inside(outline: Outline, across: f64, keep: Keep, element: &Element, x: f64, y: f64) -> bool {
    let limit = across / 2.0 * (1.0 + SLACK);
    if outline == Outline::Circle {
        return match keep {
            Keep::Whole => element.farthest_m(x, y) <= limit,
            Keep::Centre => x.hypot(y) <= limit,
        };
    }
    let normals: &[(f64, f64)] = match outline {
        Outline::Square => &[(1.0, 0.0), (0.0, 1.0)],
        // Corners on ±x: flats face ±y and the directions 60° from it.
        _ => &[(0.0, 1.0), (SQRT_3 / 2.0, 0.5), (SQRT_3 / 2.0, -0.5)],
    };
    normals.iter().all(|&(nx, ny)| {
        let margin = match keep {
            Keep::Whole => element.extent_along_m(nx, ny),
            Keep::Centre => 0.0,
        };
        (x * nx + y * ny).abs() + margin <= limit
    })
}
