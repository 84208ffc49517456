//! The order in which elements meet: eight rows of a lattice abreast.
//!
//! Loops over elements run over groups of 256 *slots*. On a lattice a group is a tile
//! of 32 columns × 8 rows of equal parity, slot = 8·column + row, so that the eight
//! rows ride in the lanes of a vector register; a slot without an element is idle. In
//! a list a group is just 256 elements in a row. An element keeps its slot, and with it
//! its random draws, whatever computes it and on whichever thread.

use super::sites::LatticeSites;
use super::{Array, Sites};
use std::ops::Range;

/// Rows abreast.
pub const LANES: usize = 8;
/// Columns of a tile.
pub const TILE: usize = 32;
/// Slots of a group.
pub const GROUP: usize = LANES * TILE;

/// Up to eight rows of equal parity.
#[derive(Debug, Clone, PartialEq)]
pub struct Band {
    /// Parity of its rows.
    pub parity: usize,
    /// Indices of its rows.
    pub rows: Vec<usize>,
    /// Number of the group at its first tile.
    pub first_group: u64,
    /// Tiles that hold an element.
    pub tiles: Range<usize>,
}

/// The bands of a lattice.
pub fn bands(sites: &LatticeSites) -> Vec<Band> {
    let tiles_across = sites.columns.div_ceil(TILE);
    let mut bands = Vec::new();
    for parity in [0, 1] {
        let rows: Vec<usize> = (0..sites.rows.len())
            .filter(|&row| sites.rows[row].parity == parity)
            .collect();
        for rows in rows.chunks(LANES) {
            let ends = rows.iter().filter_map(|&row| sites.rows[row].ends());
            let (first, last) = ends.fold((usize::MAX, 0), |(first, last), (start, end)| {
                (first.min(start), last.max(end + 1))
            });
            bands.push(Band {
                parity,
                rows: rows.to_vec(),
                first_group: (bands.len() * tiles_across) as u64,
                tiles: if last == 0 {
                    0..0
                } else {
                    first / TILE..last.div_ceil(TILE)
                },
            });
        }
    }
    bands
}

/// An element in its group.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Slot {
    /// Place in the group.
    pub slot: usize,
    /// Number of the element.
    pub number: usize,
    /// Centre.
    pub x_m: f64,
    /// Centre.
    pub y_m: f64,
}

impl Array {
    /// Call `visit` with every group's number, and its elements.
    pub fn for_each_group(&self, mut visit: impl FnMut(u64, &[Slot])) {
        match &self.sites {
            Sites::List(elements) => {
                for first in (0..elements.len()).step_by(GROUP) {
                    let count = GROUP.min(elements.len() - first);
                    let slots: Vec<Slot> = (0..count)
                        .map(|slot| Slot {
                            slot,
                            number: first + slot,
                            x_m: elements.x_m[first + slot],
                            y_m: elements.y_m[first + slot],
                        })
                        .collect();
                    visit((first / GROUP) as u64, &slots);
                }
            }
            Sites::Lattice { sites, .. } => {
                let mut slots = Vec::with_capacity(GROUP);
                for band in bands(sites) {
                    for tile in band.tiles.clone() {
                        slots.clear();
                        for (lane, &row) in band.rows.iter().enumerate() {
                            let row = &sites.rows[row];
                            let mut number = row.first;
                            for span in &row.spans {
                                let start = span.start.max(tile * TILE);
                                let end = span.end.min((tile + 1) * TILE);
                                for column in start..end {
                                    slots.push(Slot {
                                        slot: (column - tile * TILE) * LANES + lane,
                                        number: number + column - span.start,
                                        x_m: sites.x_m(row.parity, column),
                                        y_m: row.y_m,
                                    });
                                }
                                number += span.len();
                            }
                        }
                        visit(band.first_group + tile as u64, &slots);
                    }
                }
            }
        }
    }
}
