//! Whether two equal elements overlap.
//!
//! Two congruent, centrally symmetric convex shapes overlap exactly when the
//! offset between their centres lies inside the shape scaled by two.

use super::Shape;

/// Slack by which touching elements may come too close, relative to their size.
const SLACK: f64 = 1e-9;

/// Whether two elements of `shape` and `size_m` overlap when their centres are
/// (`dx_m`, `dy_m`) apart. Touching is not overlap.
pub fn elements_overlap(shape: Shape, size_m: f64, dx_m: f64, dy_m: f64) -> bool {
    is_too_close(clearance(shape, size_m, dx_m, dy_m))
}

/// Whether a [`clearance`] means overlap.
pub(super) fn is_too_close(clearance: f64) -> bool {
    clearance < 1.0 - SLACK
}

/// The offset between two centres over the offset in the same direction at
/// which the elements touch.
pub(super) fn clearance(shape: Shape, size_m: f64, dx_m: f64, dy_m: f64) -> f64 {
    let (across_x, across_y) = (dx_m.abs() / size_m, dy_m.abs() / size_m);
    match shape {
        Shape::Circle => across_x.hypot(across_y),
        Shape::Square => across_x.max(across_y),
        // The normals of the flats lie at 0° and ±60° from x.
        Shape::Hexagon => across_x.max(0.5 * across_x + 0.75_f64.sqrt() * across_y),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Offsets at which elements of unit size touch.
    fn touching(shape: Shape) -> Vec<(f64, f64)> {
        let half_root_3 = 0.75_f64.sqrt();
        match shape {
            Shape::Circle => vec![(1.0, 0.0), (0.0, 1.0), (0.6, 0.8), (-0.5, half_root_3)],
            Shape::Square => vec![(1.0, 0.0), (0.0, 1.0), (1.0, 1.0), (-0.3, 1.0)],
            Shape::Hexagon => vec![
                (1.0, 0.0),
                (0.5, half_root_3),
                (-0.5, half_root_3),
                (0.0, 1.0 / half_root_3),
                (-1.0, 1.0 / 3.0_f64.sqrt()),
                (0.25, 1.75 / half_root_3 / 2.0),
            ],
        }
    }

    #[test]
    fn touching_is_allowed_and_closer_is_not() {
        for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
            for (x, y) in touching(shape) {
                for size_m in [1e-3, 1.0, 7.0] {
                    let at = |scale: f64| {
                        let (dx_m, dy_m) = (x * size_m * scale, y * size_m * scale);
                        elements_overlap(shape, size_m, dx_m, dy_m)
                    };
                    assert!(!at(1.0), "{shape:?} at ({x}, {y})");
                    assert!(!at(1.0 - 1e-10), "{shape:?} at ({x}, {y})");
                    assert!(at(1.0 - 1e-8), "{shape:?} at ({x}, {y})");
                    assert!(!at(1.5), "{shape:?} at ({x}, {y})");
                }
            }
        }
    }

    #[test]
    fn elements_on_one_spot_overlap() {
        for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
            assert!(elements_overlap(shape, 0.1, 0.0, 0.0));
        }
    }
}
