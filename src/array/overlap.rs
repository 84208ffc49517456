//! Finding elements that overlap where no lattice rules it out.

use super::Elements;
use crate::scenario::{Element, elements_overlap};
use std::collections::HashMap;

/// The first pair (earlier, later) of elements that overlap.
///
/// Elements are binned into cells as wide as an element's widest extent, so that
/// only neighbouring cells need a look.
pub fn first_overlap(elements: &Elements, element: &Element) -> Option<(usize, usize)> {
    let (half_x, half_y) = element.half_extent_m();
    let cell_m = 2.0 * half_x.max(half_y);
    let mut cells: HashMap<(i64, i64), Vec<usize>> = HashMap::new();
    for n in 0..elements.len() {
        let (x, y) = (elements.x_m[n], elements.y_m[n]);
        let (column, row) = ((x / cell_m).floor() as i64, (y / cell_m).floor() as i64);
        for key in (-1..=1)
            .flat_map(|j| (-1..=1).map(move |i| (column.saturating_add(i), row.saturating_add(j))))
        {
            for &other in cells.get(&key).map_or(&[][..], Vec::as_slice) {
                let (dx, dy) = (x - elements.x_m[other], y - elements.y_m[other]);
                if elements_overlap(element.shape, element.size_m, dx, dy) {
                    return Some((other, n));
                }
            }
        }
        cells.entry((column, row)).or_default().push(n);
    }
    None
}
