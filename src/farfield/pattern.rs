//! The far field of one element, A(θ) = ∫ψ(s) exp(−ikθ·s) d²s.
//!
//! ψ is real for flat phase, with ∫ψ² = 1 over the open element. Three things
//! that multiply it share one form, exp(−q|s|²): a Gaussian profile of 1/e²
//! irradiance radius w (q = 1/w²), a phase k c|s|²/2 left by focus or facets
//! (q = −ikc/2), and, for the mean field of an element whose tilt has a normal
//! distribution of rms τ per axis, exp(−k²τ²|s|²/2) (q = k²τ²/2).
//!
//! With q = 0 closed forms serve: 2J₁(x)/x for a disc, sinc·sinc for a square, and
//! for the hexagon the transform over strips (compare Smith & Marsh, JOSA 64, 798
//! (1974)). Else Gauss–Legendre sums, whose error is below 1e-10 of A(0) out to the
//! largest angle asked for.

use super::quadrature::gauss_legendre;
use crate::array::element::SQRT_3;
use crate::scenario::{Element, Shape};
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::PI;

/// The far field of one element, in metres (field per √W, times λ·range).
#[derive(Debug, Clone)]
pub struct ElementPattern {
    wavenumber: f64,
    scale_per_m: f64,
    outline: Part,
    obscuration: Option<Part>,
}

/// What the element does to the wave besides cutting it out.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Wavefront {
    /// c of the phase k c|s|²/2 inside the element, in 1/m.
    pub curvature_per_m: f64,
    /// Rms tilt per axis over which the field is averaged; 0 for a single draw.
    pub mean_over_tilt_rad: f64,
}

impl Wavefront {
    /// q of the factor exp(−q|s|²) on the field of an element.
    pub fn exponent_per_m2(&self, element: &Element, wavenumber: f64) -> Complex64 {
        let waist = element.beam_radius_m.map_or(0.0, |radius| radius.powi(-2));
        let tilt = wavenumber * self.mean_over_tilt_rad;
        Complex64::new(
            waist + tilt * tilt / 2.0,
            -wavenumber * self.curvature_per_m / 2.0,
        )
    }
}

/// The transform of one outline, with the means to evaluate it.
#[derive(Debug, Clone)]
enum Part {
    /// Flat disc of a radius.
    Disc(f64),
    /// Flat square of a side.
    Square(f64),
    /// Flat hexagon of a flat-to-flat size.
    Hexagon(f64),
    /// Round, any q: radius and weight × exp(−qr²) × 2πr.
    Radial(Vec<(f64, Complex64)>),
    /// Square, any q: the even half of each axis.
    Separable(Vec<(f64, Complex64)>),
    /// Hexagon, any q: one quadrant.
    Quadrant(Vec<(f64, f64, Complex64)>),
}

impl ElementPattern {
    /// The pattern of an element, good for directions up to `largest_angle_rad` from its tilt.
    pub fn new(
        element: &Element,
        wavenumber: f64,
        wavefront: Wavefront,
        largest_angle_rad: f64,
    ) -> ElementPattern {
        let q = wavefront.exponent_per_m2(element, wavenumber);
        let reach = wavenumber * largest_angle_rad;
        let obscured_m = element.obscuration * element.size_m / 2.0;
        ElementPattern {
            wavenumber,
            scale_per_m: 1.0 / profile_power_m2(element).sqrt(),
            outline: Part::outline(element, q, reach),
            obscuration: (obscured_m > 0.0).then(|| Part::disc(obscured_m, q, reach)),
        }
    }

    /// A(θ) at a direction.
    pub fn at(&self, theta_x_rad: f64, theta_y_rad: f64) -> Complex64 {
        let (a, b) = (self.wavenumber * theta_x_rad, self.wavenumber * theta_y_rad);
        let mut field = self.outline.at(a, b);
        if let Some(obscuration) = &self.obscuration {
            field -= obscuration.at(a, b);
        }
        field * self.scale_per_m
    }

    /// About how many sines or Bessel functions one evaluation takes.
    pub fn evaluations(&self) -> f64 {
        let part = |part: &Part| match part {
            Part::Disc(_) | Part::Square(_) => 2,
            Part::Hexagon(_) => 5,
            Part::Radial(rule) => rule.len(),
            Part::Separable(rule) => 2 * rule.len(),
            Part::Quadrant(rule) => 2 * rule.len(),
        };
        (part(&self.outline) + self.obscuration.as_ref().map_or(0, part)) as f64
    }
}

/// A strip of an element: nodes and weights along y at one x.
#[derive(Debug, Clone)]
pub struct Strip {
    /// Its x from the element's centre.
    pub x_m: f64,
    /// y from the element's centre, and the weight of the field there.
    pub nodes: Vec<(f64, Complex64)>,
}

/// A rule for ∫ψ(s) F(s) d²s over the element, F a polynomial of `degree` times a wave
/// of direction up to `largest_angle_rad`; an obscuration comes as strips of negative weight.
pub fn element_strips(
    element: &Element,
    wavenumber: f64,
    wavefront: Wavefront,
    largest_angle_rad: f64,
    degree: usize,
) -> Vec<Strip> {
    let q = wavefront.exponent_per_m2(element, wavenumber);
    let reach = wavenumber * largest_angle_rad;
    let scale = 1.0 / profile_power_m2(element).sqrt();
    let half = element.size_m / 2.0;
    let rule = |reach_m: f64| {
        let turns = reach * reach_m + q.norm() * reach_m * reach_m;
        gauss_legendre(16 + degree + turns.ceil() as usize, -reach_m, reach_m)
    };
    let strip = |x: f64, weight_x: f64, top: f64, scale: f64| Strip {
        x_m: x,
        nodes: rule(top)
            .into_iter()
            .map(|(y, weight)| {
                let field = (-q * (x * x + y * y)).exp();
                (y, scale * weight_x * weight * field)
            })
            .collect(),
    };
    // x = r sin φ: the strips' ends meet the circle smoothly.
    let disc = |radius: f64, scale: f64| -> Vec<Strip> {
        let turns = reach * radius + q.norm() * radius * radius;
        gauss_legendre(24 + degree + turns.ceil() as usize, -PI / 2.0, PI / 2.0)
            .into_iter()
            .map(|(azimuth, weight)| {
                let top = radius * azimuth.cos();
                strip(radius * azimuth.sin(), weight * top, top, scale)
            })
            .collect()
    };
    let mut strips: Vec<Strip> = match element.shape {
        Shape::Circle => disc(half, scale),
        Shape::Square => rule(half)
            .into_iter()
            .map(|(x, weight)| strip(x, weight, half, scale))
            .collect(),
        Shape::Hexagon => {
            // The slope breaks at x = 0: a rule on each side.
            let turns = reach * half + q.norm() * half * half;
            let side = gauss_legendre(14 + degree + turns.ceil() as usize, 0.0, half);
            side.iter()
                .flat_map(|&(x, weight)| [(x, weight), (-x, weight)])
                .map(|(x, weight)| strip(x, weight, (element.size_m - x.abs()) / SQRT_3, scale))
                .collect()
        }
    };
    if element.obscuration > 0.0 {
        strips.extend(disc(element.obscuration * half, -scale));
    }
    strips
}

/// A(θ) at every pair of `angles_rad`, `[y][x]`: strip by strip, which separates the two axes.
pub fn on_grid(
    element: &Element,
    wavenumber: f64,
    wavefront: Wavefront,
    angles_rad: &[f64],
) -> Vec<Complex64> {
    let largest = angles_rad.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
    let diagonal = std::f64::consts::SQRT_2 * largest;
    let strips = element_strips(element, wavenumber, wavefront, diagonal, 0);
    // Along y first: [strip][θy].
    let along: Vec<Vec<Complex64>> = strips
        .par_iter()
        .map(|strip| {
            let wave = |angle: &f64, y: f64| Complex64::cis(-wavenumber * angle * y);
            let sum = |angle| {
                strip
                    .nodes
                    .iter()
                    .map(|&(y, weight)| weight * wave(angle, y))
                    .sum()
            };
            angles_rad.iter().map(sum).collect()
        })
        .collect();
    let waves: Vec<Vec<Complex64>> = strips
        .iter()
        .map(|strip| {
            let wave = |angle: &f64| Complex64::cis(-wavenumber * angle * strip.x_m);
            angles_rad.iter().map(wave).collect()
        })
        .collect();
    (0..angles_rad.len())
        .into_par_iter()
        .flat_map_iter(|row| {
            let mut line = vec![Complex64::default(); angles_rad.len()];
            for (along, waves) in along.iter().zip(&waves) {
                for (value, wave) in line.iter_mut().zip(waves) {
                    *value += along[row] * wave;
                }
            }
            line
        })
        .collect()
}

/// ∫exp(−2s²/w²) over the open element: the profile's power for unit irradiance at its centre.
pub fn profile_power_m2(element: &Element) -> f64 {
    let Some(radius_m) = element.beam_radius_m else {
        return element.open_area_m2();
    };
    let q = Complex64::new(2.0 / (radius_m * radius_m), 0.0);
    let obscured_m = element.obscuration * element.size_m / 2.0;
    let mut power = Part::outline(element, q, 0.0).at(0.0, 0.0).re;
    if obscured_m > 0.0 {
        power -= Part::disc(obscured_m, q, 0.0).at(0.0, 0.0).re;
    }
    power
}

/// Share of a Gaussian beam's power that the element's edge and obscuration cut off; 0 when uniform.
pub fn clipping_loss(element: &Element) -> f64 {
    match element.beam_radius_m {
        Some(radius_m) => 1.0 - profile_power_m2(element) / (PI / 2.0 * radius_m * radius_m),
        None => 0.0,
    }
}

/// Nodes that a rule on [0, `reach_m`] needs for exp(−qs²) cos(as), a up to `largest`.
fn nodes(reach_m: f64, q: Complex64, largest: f64) -> Vec<(f64, f64)> {
    // Past e⁻³⁶ nothing is left that double precision would notice.
    let reach_m = reach_m.min((36.0 / q.re).sqrt());
    let turns = 0.5 * largest * reach_m + q.norm() * reach_m * reach_m;
    gauss_legendre(16 + turns.ceil() as usize, 0.0, reach_m)
}

impl Part {
    fn outline(element: &Element, q: Complex64, largest: f64) -> Part {
        let size = element.size_m;
        // Below this the factor exp(−qs²) differs from 1 by less than 1e-10 anywhere.
        let flat = q.norm() * size * size < 1e-10;
        match element.shape {
            Shape::Circle => Part::disc(size / 2.0, q, largest),
            Shape::Square if flat => Part::Square(size),
            Shape::Hexagon if flat => Part::Hexagon(size),
            Shape::Square => Part::Separable(
                nodes(size / 2.0, q, largest)
                    .into_iter()
                    .map(|(x, weight)| (x, 2.0 * weight * (-q * x * x).exp()))
                    .collect(),
            ),
            Shape::Hexagon => {
                let mut rule = Vec::new();
                for (x, weight_x) in nodes(size / 2.0, q, largest) {
                    let top = (size - x) / SQRT_3;
                    for (y, weight_y) in nodes(top, q, largest) {
                        let weight = 4.0 * weight_x * weight_y;
                        rule.push((x, y, weight * (-q * (x * x + y * y)).exp()));
                    }
                }
                Part::Quadrant(rule)
            }
        }
    }

    fn disc(radius: f64, q: Complex64, largest: f64) -> Part {
        if q.norm() * radius * radius < 1e-10 {
            return Part::Disc(radius);
        }
        Part::Radial(
            nodes(radius, q, largest)
                .into_iter()
                .map(|(r, weight)| (r, 2.0 * PI * r * weight * (-q * r * r).exp()))
                .collect(),
        )
    }

    /// The transform at the spatial frequency (`a`, `b`) in rad/m.
    fn at(&self, a: f64, b: f64) -> Complex64 {
        match self {
            Part::Disc(radius) => {
                let x = radius * a.hypot(b);
                (PI * radius * radius * jinc(x)).into()
            }
            Part::Square(side) => {
                (side * side * sinc(a * side / 2.0) * sinc(b * side / 2.0)).into()
            }
            Part::Hexagon(size) => hexagon(*size, a, b).into(),
            Part::Radial(rule) => {
                let frequency = a.hypot(b);
                rule.iter()
                    .map(|(r, weight)| weight * libm::j0(frequency * r))
                    .sum()
            }
            Part::Separable(rule) => {
                let axis = |frequency: f64| -> Complex64 {
                    rule.iter()
                        .map(|(x, weight)| weight * (frequency * x).cos())
                        .sum()
                };
                axis(a) * axis(b)
            }
            Part::Quadrant(rule) => rule
                .iter()
                .map(|(x, y, weight)| weight * ((a * x).cos() * (b * y).cos()))
                .sum(),
        }
    }
}

/// 2J₁(x)/x.
pub fn jinc(x: f64) -> f64 {
    if x.abs() < 1e-4 {
        1.0 - x * x / 8.0
    } else {
        2.0 * libm::j1(x) / x
    }
}

/// sin(x)/x.
pub fn sinc(x: f64) -> f64 {
    if x.abs() < 1e-4 {
        1.0 - x * x / 6.0
    } else {
        x.sin() / x
    }
}

/// Transform of a hexagon with two flats facing ±x, `size` from flat to flat.
///
/// The hexagon is |x| ≤ size/2, |y| ≤ (size − |x|)/√3. Integrating over y, then over
/// x, with A = a·size/4 and B = √3·b·size/4:
/// (√3/4)·size²·[sinc B cos A (s₊ + s₋) + cos B sin A (s₊ − s₋)/B], s± = sinc(A ∓ B/3).
fn hexagon(size: f64, a: f64, b: f64) -> f64 {
    let (big_a, big_b) = (a * size / 4.0, SQRT_3 * b * size / 4.0);
    let (plus, minus) = (sinc(big_a - big_b / 3.0), sinc(big_a + big_b / 3.0));
    let slope = if big_b.abs() < 1e-5 {
        // (s₊ − s₋)/B tends to −(2/3) sinc′(A).
        -2.0 / 3.0 * sinc_slope(big_a)
    } else {
        (plus - minus) / big_b
    };
    SQRT_3 / 4.0
        * size
        * size
        * (sinc(big_b) * big_a.cos() * (plus + minus) + big_b.cos() * big_a.sin() * slope)
}

/// Derivative of sin(x)/x.
fn sinc_slope(x: f64) -> f64 {
    if x.abs() < 1e-3 {
        -x / 3.0
    } else {
        (x.cos() - x.sin() / x) / x
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Midpoint sum over the open element on a fine grid of covered cells.
    fn by_cells(element: &Element, wavenumber: f64, c: f64, tx: f64, ty: f64) -> Complex64 {
        let cells = 400;
        let cell = element.size_m * 1.2 / f64::from(cells);
        let mut sum = Complex64::new(0.0, 0.0);
        let mut power = 0.0;
        for i in 0..cells {
            for j in 0..cells {
                let x = (f64::from(i) + 0.5 - f64::from(cells) / 2.0) * cell;
                let y = (f64::from(j) + 0.5 - f64::from(cells) / 2.0) * cell;
                let area = element.covered_area_m2(x, y, cell);
                let square = x * x + y * y;
                let field = element
                    .beam_radius_m
                    .map_or(1.0, |w| (-square / (w * w)).exp());
                let phase = wavenumber * (c * square / 2.0 - tx * x - ty * y);
                sum += area * field * Complex64::cis(phase);
                power += area * field * field;
            }
        }
        sum / power.sqrt()
    }

    #[test]
    fn every_shape_profile_and_curvature_agrees_with_a_sum_over_cells() {
        let wavenumber = 2.0 * PI;
        for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
            for obscuration in [0.0, 0.35] {
                for beam_radius_m in [None, Some(0.45)] {
                    for c in [0.0, 1.3] {
                        let element = Element {
                            shape,
                            size_m: 1.0,
                            obscuration,
                            beam_radius_m,
                        };
                        let wavefront = Wavefront {
                            curvature_per_m: c,
                            mean_over_tilt_rad: 0.0,
                        };
                        let pattern = ElementPattern::new(&element, wavenumber, wavefront, 3.0);
                        for (tx, ty) in [(0.0, 0.0), (0.7, 0.0), (0.0, -1.1), (1.3, 0.4)] {
                            let cells = by_cells(&element, wavenumber, c, tx, ty);
                            let error = (pattern.at(tx, ty) - cells).norm();
                            // The midpoint rule on 400 cells is good to a few 1e-5.
                            assert!(error < 1e-4, "{element:?} c={c} θ=({tx},{ty}): {error}");
                        }
                    }
                }
            }
        }
    }

    #[test]
    fn closed_forms_agree_with_quadrature() {
        for shape in [Shape::Circle, Shape::Square, Shape::Hexagon] {
            let element = Element {
                shape,
                size_m: 1.0,
                obscuration: 0.2,
                beam_radius_m: None,
            };
            let flat = ElementPattern::new(&element, 1.0, Wavefront::default(), 40.0);
            // A curvature just above the limit of "flat" takes the quadrature.
            let nearly = Wavefront {
                curvature_per_m: 2e-9,
                mean_over_tilt_rad: 0.0,
            };
            let summed = ElementPattern::new(&element, 1.0, nearly, 40.0);
            for (a, b) in [
                (0.0, 0.0),
                (3.0, 0.0),
                (0.0, 7.0),
                (20.0, -11.0),
                (1e-6, 30.0),
            ] {
                let error = (flat.at(a, b) - summed.at(a, b)).norm();
                assert!(error < 1e-8, "{shape:?} ({a}, {b}): {error}");
            }
        }
    }
}
