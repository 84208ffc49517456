//! `direct` against the whole Fresnel integral, summed here from scratch.
//!
//! The reference knows no pattern, array factor, piston or tilt of an element: it sums
//! E(r)·exp(ik|r|²/2L)·exp(−ik r·u/L) over the points r of all apertures, E being the field that
//! leaves the aperture. Its rules are five Gauss points on each of many panels (over radius with
//! a trapezoidal rule in azimuth for discs), converged to 1e-10 of the peak; the program's are
//! good to 1e-10 of each element's aim field. The tolerance is ten times that: 1e-9 of the peak.

mod common;

use common::{Directions, array_of, assert_close, gauss_nodes, prepared, scenario_in, still_map};
use facula::farfield::Grid;
use facula::farfield::choose::Task;
use facula::scenario::{MethodChoice, Scenario};
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::TAU;
use std::path::Path;

/// An element of the aperture: centre, power, phase and tilts, as the table gives them.
const ELEMENTS: [[f64; 6]; 4] = [
    [-0.0061, 0.0023, 0.8, 0.0, 0.0, 0.0],
    [0.0007, -0.0031, 1.0, 0.7, 20e-6, -10e-6],
    [0.0081, 0.0017, 0.4, -1.1, 0.0, 30e-6],
    [0.0023, 0.0083, 1.3, 2.0, -5e-6, 0.0],
];
const SIZE_M: f64 = 0.005;

/// Every method and its error over the peak.
const METHODS: [(MethodChoice, f64); 3] = [
    (MethodChoice::Direct, 1e-9),
    (MethodChoice::Sampled, 2e-3),
    (MethodChoice::Factored, 5e-6),
];

/// What the reference is told: numbers of the case, none of the program's.
#[derive(Clone, Copy)]
struct Optics {
    wavelength_m: f64,
    range_m: f64,
    /// 0 for a collimated wavefront.
    inverse_focus_per_m: f64,
    flat_facets: bool,
    waist_m: Option<f64>,
    obscuration: f64,
}

/// Points and areas of an element about its centre.
fn points(shape: &str, obscuration: f64, size_m: f64) -> Vec<(f64, f64, f64)> {
    let ring = |from: f64, to: f64| -> Vec<(f64, f64, f64)> {
        const AZIMUTHS: usize = 96;
        gauss_nodes(from, to, 8)
            .into_iter()
            .flat_map(|(r, weight)| {
                (0..AZIMUTHS).map(move |index| {
                    let (sin, cos) = (TAU * index as f64 / AZIMUTHS as f64).sin_cos();
                    (r * cos, r * sin, weight * r * TAU / AZIMUTHS as f64)
                })
            })
            .collect()
    };
    let half = size_m / 2.0;
    let mut points = Vec::new();
    match shape {
        "circle" => return ring(obscuration * half, half),
        "square" => {
            for (x, weight_x) in gauss_nodes(-half, half, 14) {
                for (y, weight_y) in gauss_nodes(-half, half, 14) {
                    points.push((x, y, weight_x * weight_y));
                }
            }
        }
        _ => {
            // Corners on ±y: at x the hexagon reaches up to (size − |x|)/√3.
            for (from, to) in [(-half, 0.0), (0.0, half)] {
                for (x, weight_x) in gauss_nodes(from, to, 7) {
                    let top = (size_m - x.abs()) / 3f64.sqrt();
                    for (y, weight_y) in gauss_nodes(-top, top, 14) {
                        points.push((x, y, weight_x * weight_y));
                    }
                }
            }
        }
    }
    if obscuration > 0.0 {
        let hole = ring(0.0, obscuration * half);
        points.extend(hole.into_iter().map(|(x, y, area)| (x, y, -area)));
    }
    points
}

/// Irradiance of `ELEMENTS` at (u, v) by the whole integral, in W/m², for 1 W in all.
fn by_integral(shape: &str, optics: Optics, u_m: f64, v_m: f64) -> f64 {
    let k = TAU / optics.wavelength_m;
    let points = points(shape, optics.obscuration, SIZE_M);
    let profile = |x: f64, y: f64| {
        optics
            .waist_m
            .map_or(1.0, |waist| (-(x * x + y * y) / (waist * waist)).exp())
    };
    let profile_power: f64 = points
        .iter()
        .map(|(x, y, area)| area * profile(*x, *y).powi(2))
        .sum();
    let total: f64 = ELEMENTS.iter().map(|element| element[2]).sum();
    let mut field = Complex64::default();
    for [x0, y0, power, phase, tilt_x, tilt_y] in ELEMENTS {
        let amplitude = (power / total / profile_power).sqrt();
        for &(sx, sy, area) in &points {
            let (x, y) = (x0 + sx, y0 + sy);
            // The wavefront that converges at the focus, or its tangent plane at the centre.
            let converging = if optics.flat_facets {
                (x0 * x0 + y0 * y0) / 2.0 + x0 * sx + y0 * sy
            } else {
                (x * x + y * y) / 2.0
            };
            let leaving = phase + k * (tilt_x * sx + tilt_y * sy)
                - k * converging * optics.inverse_focus_per_m;
            let travelled = k * (x * x + y * y) / (2.0 * optics.range_m)
                - k * (x * u_m + y * v_m) / optics.range_m;
            field += Complex64::from_polar(amplitude * profile(sx, sy) * area, leaving + travelled);
        }
    }
    field.norm_sqr() / (optics.wavelength_m * optics.range_m).powi(2)
}

fn table(rows: &[[f64; 6]]) -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap_or_else(|error| panic!("{error}"));
    let mut text = String::from("x_m,y_m,power,phase_rad,tilt_x_rad,tilt_y_rad\n");
    for row in rows {
        let cells: Vec<String> = row.iter().map(|value| format!("{value:e}")).collect();
        text += &(cells.join(",") + "\n");
    }
    std::fs::write(folder.path().join("t.csv"), text).unwrap_or_else(|error| panic!("{error}"));
    folder
}

fn bench(folder: &Path, shape: &str, optics: Optics) -> Scenario {
    let focus = if optics.inverse_focus_per_m > 0.0 {
        format!("{:e} m", 1.0 / optics.inverse_focus_per_m)
    } else {
        "infinity".to_string()
    };
    let profile = optics.waist_m.map_or(String::new(), |waist| {
        format!("profile = \"gaussian\"\nbeam_radius = \"{waist} m\"\n")
    });
    scenario_in(
        folder,
        &format!(
            "[beam]\nwavelength = \"{} m\"\n[array]\nlayout = \"table\"\ntable = \"t.csv\"\n\
         [array.element]\nshape = \"{shape}\"\nsize = \"{SIZE_M} m\"\nobscuration = {}\n{profile}\
         [target]\nrange = \"{} m\"\nfocus = \"{focus}\"\nfacets = \"{}\"\n",
            optics.wavelength_m,
            optics.obscuration,
            optics.range_m,
            if optics.flat_facets { "flat" } else { "curved" }
        ),
    )
}

/// 5 mm elements at 10 m and 1 µm: over an element the phase k|s|²/2L reaches 1.96 rad at the
/// edge, over the array 24 rad. Focus at, before and beyond the target, and none.
#[test]
fn the_direct_sum_is_the_whole_fresnel_integral_on_a_bench() {
    let folder = table(&ELEMENTS);
    let mut cases = Vec::new();
    for shape in ["circle", "square", "hexagon"] {
        for (waist_m, obscuration) in [
            (None, 0.0),
            (Some(0.002), 0.0),
            (None, 0.4),
            (Some(0.0025), 0.3),
        ] {
            for inverse_focus_per_m in [0.1, 1.0 / 7.0, 1.0 / 14.0, 0.0] {
                for flat_facets in [false, true] {
                    cases.push((
                        shape,
                        Optics {
                            wavelength_m: 1e-6,
                            range_m: 10.0,
                            inverse_focus_per_m,
                            flat_facets,
                            waist_m,
                            obscuration,
                        },
                    ));
                }
            }
        }
    }
    let spots = [
        (0.0, 0.0),
        (0.6e-3, -0.2e-3),
        (-1.3e-3, 2.1e-3),
        (3.1e-3, 0.4e-3),
        (0.1e-3, -4.0e-3),
    ];
    let errors: Vec<f64> = cases
        .par_iter()
        .map(|&(shape, optics)| {
            let array = array_of(&bench(folder.path(), shape, optics));
            let directions = Directions::new(&array, 5e-3);
            let area: f64 = points(shape, optics.obscuration, SIZE_M)
                .iter()
                .map(|p| p.2)
                .sum();
            let scale = 4.0 * area / (optics.wavelength_m * optics.range_m).powi(2);
            spots
                .iter()
                .map(|&(u, v)| {
                    (directions.at(u, v) - by_integral(shape, optics, u, v)).abs() / scale
                })
                .fold(0.0, f64::max)
        })
        .collect();
    for ((shape, optics), error) in cases.iter().zip(&errors) {
        let name = format!(
            "{shape}, 1/focus {:.3}, flat {}, waist {:?}, obscured {}",
            optics.inverse_focus_per_m, optics.flat_facets, optics.waist_m, optics.obscuration
        );
        assert_close(
            &name,
            *error,
            0.0,
            1e-9,
            "two converged quadratures, over the highest peak",
        );
    }
}

/// The map, and not only single directions: rows are v, columns u.
#[test]
fn the_map_is_the_integral_with_rows_along_v_and_columns_along_u() {
    let folder = table(&ELEMENTS);
    // A focus at 12 m tilts the outer elements by almost λ/size: too much for `factored`.
    for (focus_m, methods) in [(12.0, &METHODS[..2]), (10.2, &METHODS[..])] {
        let optics = Optics {
            wavelength_m: 1e-6,
            range_m: 10.0,
            inverse_focus_per_m: 1.0 / focus_m,
            flat_facets: false,
            waist_m: None,
            obscuration: 0.0,
        };
        let array = array_of(&bench(folder.path(), "square", optics));
        let grid = Grid {
            pixels: 17,
            pixel_m: 0.2e-3,
        };
        let maps: Vec<_> = methods
            .iter()
            .map(|(method, _)| still_map(prepared(&array, Task::still(grid), *method).as_ref()))
            .collect();
        let peak = maps[0]
            .irradiance_w_m2
            .iter()
            .fold(0.0, |a: f64, &b| a.max(b));
        for row in 0..17 {
            for column in 0..17 {
                let at = |index: usize| (index as f64 - 8.0) * grid.pixel_m;
                let expected = by_integral("square", optics, at(column), at(row));
                for (map, (method, tolerance)) in maps.iter().zip(methods) {
                    assert_close(
                        &format!("{method:?} [{row}, {column}]"),
                        map.at(row, column) / peak,
                        expected / peak,
                        *tolerance,
                        "direct: quadrature; the others: their design",
                    );
                }
            }
        }
    }
}

const FAR: &str = "[beam]\nwavelength = \"1 um\"\npower = \"4 W\"\n[array]\nlayout = \"table\"\ntable = \"t.csv\"\n\
    [array.element]\nshape = \"square\"\nsize = \"0.1 m\"\n[target]\nrange = \"1 km\"\n";

/// By hand: 1 W and 3 W through 0.01 m² each, at (−0.1, 0) and (0.1, 0.2), 1 km, 1 µm. One watt
/// alone puts 1·0.01/(1e-3)² = 10 kW/m² on the aim point, three put 30; together
/// (1 + √3)²·10 = 74.641 kW/m². The second, ahead by 1 rad, turns against the first by
/// k(0.2u + 0.2v)/L: 1 rad again at u = 1/(0.2·k/L) = 0.795775 mm, where all is in phase but for
/// the elements' sinc².
#[test]
fn two_elements_interfere_to_the_irradiance_found_by_hand() {
    let rows = |phase: f64| {
        [
            [-0.1, 0.0, 1.0, 0.0, 0.0, 0.0],
            [0.1, 0.2, 3.0, phase, 0.0, 0.0],
        ]
    };
    let at = |phase: f64, u: f64, v: f64| {
        let folder = table(&rows(phase));
        let array = array_of(&scenario_in(folder.path(), FAR));
        Directions::new(&array, 0.05).at(u, v)
    };
    let hand = |what: &str, found: f64, expected: f64| {
        assert_close(
            what,
            found,
            expected,
            1e-6 * expected + 1e-6,
            "seven digits by hand",
        );
    };
    hand("in phase", at(0.0, 0.0, 0.0), 74_641.016);
    hand("half a turn apart", at(TAU / 2.0, 0.0, 0.0), 5_358.984);
    hand("a quarter apart", at(TAU / 4.0, 0.0, 0.0), 40_000.0);
    let fringe = 0.795_774_715e-3;
    let x = TAU / 2.0 * fringe / 0.01;
    let element = (x.sin() / x).powi(2);
    hand(
        "one radian ahead, along u",
        at(1.0, fringe, 0.0),
        74_641.016 * element,
    );
    hand(
        "one radian ahead, along v",
        at(1.0, 0.0, fringe),
        74_641.016 * element,
    );
    // On the other side of the aim point it is two radians apart.
    let apart = 40_000.0 + 20_000.0 * 3f64.sqrt() * 2f64.cos();
    hand("on the other side", at(1.0, -fringe, 0.0), apart * element);
}

/// A lopsided table: the light of an element tilted towards +x lands at +u, one tilted towards
/// −y at −v, half a beam away, whichever method draws the map.
#[test]
fn a_tilt_towards_plus_x_moves_the_light_to_plus_u() {
    // Half of λ/size is too much for `factored`.
    for (tilt_x, tilt_y, methods) in [
        (5e-6, 0.0, &METHODS[..2]),
        (0.0, -5e-6, &METHODS[..2]),
        (4e-6, -3e-6, &METHODS[..2]),
        (2e-6, 0.0, &METHODS[..]),
        (1e-6, -2e-6, &METHODS[..]),
    ] {
        let folder = table(&[[0.3, -0.1, 2.0, 0.4, tilt_x, tilt_y]]);
        let array = array_of(&scenario_in(folder.path(), FAR));
        let grid = Grid {
            pixels: 101,
            pixel_m: 0.25e-3,
        };
        for &(method, _) in methods {
            let map = still_map(prepared(&array, Task::still(grid), method).as_ref());
            let brightest = (0..grid.pixels * grid.pixels)
                .max_by(|&a, &b| map.irradiance_w_m2[a].total_cmp(&map.irradiance_w_m2[b]))
                .unwrap_or(0);
            let at = |index: usize| (index as f64 - 50.0) * grid.pixel_m;
            let (u, v) = (at(brightest % grid.pixels), at(brightest / grid.pixels));
            assert_close("u of the light", u, tilt_x * 1e3, 0.13e-3, "half a pixel");
            assert_close("v of the light", v, tilt_y * 1e3, 0.13e-3, "half a pixel");
        }
    }
}
