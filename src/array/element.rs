//! Geometry of one element: area, extent, and how much of a cell it covers.
//!
//! An element is a convex outline with an optional round obscuration at its
//! centre. A hexagon has two flats facing ±x, so its corners lie at
//! (0, ±size/√3) and (±size/2, ±size/(2√3)).

use crate::scenario::{Element, Shape};
use std::f64::consts::PI;

/// √3
pub const SQRT_3: f64 = 1.732_050_807_568_877_2;

impl Element {
    /// Area inside the outline, obscuration not taken off.
    pub fn outline_area_m2(&self) -> f64 {
        let size_squared = self.size_m * self.size_m;
        match self.shape {
            Shape::Circle => PI / 4.0 * size_squared,
            Shape::Square => size_squared,
            Shape::Hexagon => SQRT_3 / 2.0 * size_squared,
        }
    }

    /// Area that radiates: the outline less the obscuration.
    pub fn open_area_m2(&self) -> f64 {
        let obscured = self.obscuration * self.size_m;
        self.outline_area_m2() - PI / 4.0 * obscured * obscured
    }

    /// Corners of a polygonal outline about its centre, anticlockwise; none for a circle.
    pub fn corners_m(&self) -> Vec<(f64, f64)> {
        let half = self.size_m / 2.0;
        match self.shape {
            Shape::Circle => vec![],
            Shape::Square => vec![(half, -half), (half, half), (-half, half), (-half, -half)],
            Shape::Hexagon => {
                let (long, short) = (self.size_m / SQRT_3, self.size_m / (2.0 * SQRT_3));
                vec![
                    (half, -short),
                    (half, short),
                    (0.0, long),
                    (-half, short),
                    (-half, -short),
                    (0.0, -long),
                ]
            }
        }
    }

    /// Half extents along x and y.
    pub fn half_extent_m(&self) -> (f64, f64) {
        let half = self.size_m / 2.0;
        match self.shape {
            Shape::Hexagon => (half, self.size_m / SQRT_3),
            _ => (half, half),
        }
    }

    /// Extent of the outline from its centre along the unit vector (`nx`, `ny`).
    pub fn extent_along_m(&self, nx: f64, ny: f64) -> f64 {
        match self.shape {
            Shape::Circle => self.size_m / 2.0,
            _ => self
                .corners_m()
                .iter()
                .map(|(x, y)| x * nx + y * ny)
                .fold(0.0, f64::max),
        }
    }

    /// Distance from the axis to the farthest point of an element centred at (`x_m`, `y_m`).
    pub fn farthest_m(&self, x_m: f64, y_m: f64) -> f64 {
        match self.shape {
            Shape::Circle => x_m.hypot(y_m) + self.size_m / 2.0,
            _ => self
                .corners_m()
                .iter()
                .map(|(x, y)| (x_m + x).hypot(y_m + y))
                .fold(0.0, f64::max),
        }
    }

    /// Distance from the axis to the nearest point of an element centred at (`x_m`, `y_m`);
    /// 0 when the axis passes through its outline.
    pub fn nearest_m(&self, x_m: f64, y_m: f64) -> f64 {
        let corners = self.corners_m();
        if corners.is_empty() {
            return (x_m.hypot(y_m) - self.size_m / 2.0).max(0.0);
        }
        let mut inside = true;
        let mut nearest = f64::INFINITY;
        for (index, &(ax, ay)) in corners.iter().enumerate() {
            let (bx, by) = corners[(index + 1) % corners.len()];
            let (ax, ay, bx, by) = (ax + x_m, ay + y_m, bx + x_m, by + y_m);
            let (ex, ey) = (bx - ax, by - ay);
            // The axis is left of every side of an anticlockwise outline that holds it.
            inside &= ex * -ay - ey * -ax >= 0.0;
            let along = (-(ax * ex + ay * ey) / (ex * ex + ey * ey)).clamp(0.0, 1.0);
            nearest = nearest.min((ax + along * ex).hypot(ay + along * ey));
        }
        if inside { 0.0 } else { nearest }
    }

    /// Area of the open element inside the cell of side `cell_m` centred at
    /// (`x_m`, `y_m`) from the element's centre.
    ///
    /// Exact: circles by the area under the arc, polygons by clipping.
    pub fn covered_area_m2(&self, x_m: f64, y_m: f64, cell_m: f64) -> f64 {
        let half = cell_m / 2.0;
        let (x0, x1, y0, y1) = (x_m - half, x_m + half, y_m - half, y_m + half);
        let outline = match self.shape {
            Shape::Circle => disc_in_rectangle_m2(self.size_m / 2.0, x0, x1, y0, y1),
            Shape::Square => {
                let side = self.size_m / 2.0;
                (x1.min(side) - x0.max(-side)).max(0.0) * (y1.min(side) - y0.max(-side)).max(0.0)
            }
            Shape::Hexagon => clipped_polygon_area_m2(&self.corners_m(), x0, x1, y0, y1),
        };
        if self.obscuration > 0.0 && outline > 0.0 {
            outline - disc_in_rectangle_m2(self.obscuration * self.size_m / 2.0, x0, x1, y0, y1)
        } else {
            outline
        }
    }
}

/// Area of the disc of `radius` about the origin inside a rectangle.
fn disc_in_rectangle_m2(radius: f64, x0: f64, x1: f64, y0: f64, y1: f64) -> f64 {
    let (a, b) = (x0.max(-radius), x1.min(radius));
    if a >= b {
        return 0.0;
    }
    // Between the abscissae where the arc crosses a horizontal side, the height of the
    // strip is one of four simple forms, each with an elementary integral.
    let mut cuts = vec![a, b];
    for y in [y0, y1] {
        if y.abs() < radius {
            let x = (radius * radius - y * y).sqrt();
            cuts.extend([x, -x].into_iter().filter(|&x| a < x && x < b));
        }
    }
    cuts.sort_by(f64::total_cmp);
    let under_arc = |x: f64| {
        let x = x.clamp(-radius, radius);
        0.5 * (x * (radius * radius - x * x).sqrt() + radius * radius * (x / radius).asin())
    };
    let mut area = 0.0;
    for pair in cuts.windows(2) {
        let (left, right) = (pair[0], pair[1]);
        let middle = 0.5 * (left + right);
        let arc = (radius * radius - middle * middle).max(0.0).sqrt();
        let (top, bottom) = (y1.min(arc), y0.max(-arc));
        if top <= bottom {
            continue;
        }
        let arc_area = under_arc(right) - under_arc(left);
        let width = right - left;
        area += if y1 < arc { y1 * width } else { arc_area };
        area -= if y0 > -arc { y0 * width } else { -arc_area };
    }
    area
}

/// Area of a convex anticlockwise polygon inside a rectangle (Sutherland and Hodgman 1974).
fn clipped_polygon_area_m2(corners: &[(f64, f64)], x0: f64, x1: f64, y0: f64, y1: f64) -> f64 {
    let mut polygon = corners.to_vec();
    // Each side of the rectangle keeps what lies where `inward · point >= offset`.
    for (nx, ny, offset) in [
        (1.0, 0.0, x0),
        (-1.0, 0.0, -x1),
        (0.0, 1.0, y0),
        (0.0, -1.0, -y1),
    ] {
        let mut kept = Vec::with_capacity(polygon.len() + 1);
        for (index, &(px, py)) in polygon.iter().enumerate() {
            let (qx, qy) = polygon[(index + 1) % polygon.len()];
            let (p, q) = (px * nx + py * ny - offset, qx * nx + qy * ny - offset);
            if p >= 0.0 {
                kept.push((px, py));
            }
            if (p >= 0.0) != (q >= 0.0) {
                let t = p / (p - q);
                kept.push((px + t * (qx - px), py + t * (qy - py)));
            }
        }
        polygon = kept;
        if polygon.len() < 3 {
            return 0.0;
        }
    }
    let doubled: f64 = (0..polygon.len())
        .map(|index| {
            let (px, py) = polygon[index];
            let (qx, qy) = polygon[(index + 1) % polygon.len()];
            px * qy - qx * py
        })
        .sum();
    0.5 * doubled
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn cells_cover_each_shape_exactly_once() {
        for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
            let element = Element {
                shape,
                size_m: 1.0,
                obscuration: 0.3,
                beam_radius_m: None,
            };
            let cell = 0.0731;
            let covered: f64 = (-10..=10)
                .flat_map(|i| (-10..=10).map(move |j| (i, j)))
                .map(|(i, j)| {
                    element.covered_area_m2(
                        0.013 + f64::from(i) * cell,
                        f64::from(j) * cell - 0.021,
                        cell,
                    )
                })
                .sum();
            assert!(
                (covered - element.open_area_m2()).abs() < 1e-12,
                "{shape:?}: {covered}"
            );
        }
    }

    #[test]
    fn nearest_and_farthest_points_of_a_hexagon() {
        let hexagon = Element {
            shape: Shape::Hexagon,
            size_m: 2.0,
            obscuration: 0.0,
            beam_radius_m: None,
        };
        assert!((hexagon.nearest_m(5.0, 0.0) - 4.0).abs() < 1e-12);
        assert!((hexagon.nearest_m(0.0, 5.0) - (5.0 - 2.0 / SQRT_3)).abs() < 1e-12);
        assert!((hexagon.farthest_m(0.0, 5.0) - (5.0 + 2.0 / SQRT_3)).abs() < 1e-12);
        assert!(hexagon.nearest_m(0.5, 0.5).abs() < 1e-12);
    }
}
