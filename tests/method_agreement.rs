//! `sampled` against `direct` over whole maps, for every layout, shape, profile and error.
//!
//! The tolerance of 2e-3 of the map's own peak is the error that the sampled method is designed
//! for; each test prints the worst that it found.

mod common;

use common::layouts::{ALL_ERRORS, BEAM_RAD, LAYOUTS, element, folder_with_table};
use common::{array_of, assert_close, map, sampled, scenario_in, text};
use facula::array::Array;
use facula::farfield::choose::Task;
use facula::farfield::{Direct, Grid, Map};
use facula::perturb::TrialErrors;
use facula::scenario::Errors;
use rayon::prelude::*;
use std::path::Path;

struct Case<'a> {
    layout: &'a str,
    element: String,
    target: &'a str,
    errors: String,
    samples: f64,
    narrow: bool,
}

fn prepared(folder: &Path, case: &Case<'_>) -> (Array, Errors, Task) {
    let scenario = scenario_in(
        folder,
        &text(
            case.layout,
            &case.element,
            &format!("{}\n[errors]\n{}", case.target, case.errors),
        ),
    );
    let array = array_of(&scenario);
    let spot_m = array.spot_m();
    // The window of 16 spots, and never less than the element's own main lobe; or just less
    // than that lobe, where the sampled method takes its coarsest grid.
    let beam_m = BEAM_RAD * array.range_m;
    let width_m = if case.narrow {
        1.95 * beam_m
    } else {
        (16.0 * spot_m).max(2.4 * beam_m)
    };
    let grid = Grid::covering(width_m, spot_m / case.samples);
    let task = Task::of_trials(grid, &scenario.errors);
    (array, scenario.errors, task)
}

/// Largest difference over the peak of the first map.
fn worst(exact: &Map, other: &Map) -> f64 {
    let peak = exact
        .irradiance_w_m2
        .iter()
        .fold(0.0, |a: f64, &b| a.max(b));
    exact
        .irradiance_w_m2
        .iter()
        .zip(&other.irradiance_w_m2)
        .map(|(a, b)| (a - b).abs() / peak)
        .fold(0.0, f64::max)
}

/// Worst difference between the methods over `draws` trials.
fn disagreement(folder: &Path, case: &Case<'_>, draws: u64) -> f64 {
    let (array, errors, task) = prepared(folder, case);
    let (exact, painted) = (Direct::new(&array, task), sampled(&array, task, 1.0));
    (0..draws)
        .map(|trial| {
            let trial = TrialErrors {
                errors: &errors,
                seed: 9,
                trial,
            };
            let (exact, painted) = (map(&exact, trial), map(&painted, trial));
            assert_eq!(exact.1, painted.1, "both list the same trial");
            worst(&exact.0, &painted.0)
        })
        .fold(0.0, f64::max)
}

/// Check every case in parallel, and print them by their error.
fn check_all(cases: &[(String, Case<'_>)], draws: u64, tolerance: f64, reason: &str) {
    let folder = folder_with_table();
    let mut found: Vec<(f64, &str)> = cases
        .par_iter()
        .map(|(name, case)| (disagreement(folder.path(), case, draws), name.as_str()))
        .collect();
    found.sort_by(|a, b| b.0.total_cmp(&a.0));
    for (error, name) in &found {
        println!("{error:.2e} {name}");
    }
    assert_close(found[0].1, found[0].0, 0.0, tolerance, reason);
}

const DESIGNED: &str = "the error that the sampled method is designed for";

fn every_layout(shape: &str, tolerance: f64, reason: &str) {
    let mut cases = Vec::new();
    for (name, layout) in LAYOUTS {
        for (profile, more) in [
            ("uniform", ""),
            (
                "gaussian",
                "profile = \"gaussian\"\nbeam_radius = \"0.047 m\"",
            ),
        ] {
            for (kind, errors) in [
                ("without errors", String::new()),
                (
                    "all errors",
                    format!(
                        "{ALL_ERRORS}jitter = \"{:e} rad\"\ncommon_jitter = \"{:e} rad\"",
                        0.2 * BEAM_RAD,
                        0.05 * BEAM_RAD
                    ),
                ),
                (
                    "half a beam of jitter",
                    format!(
                        "{ALL_ERRORS}dropped = \"unlocked\"\njitter = \"{:e} rad\"",
                        0.5 * BEAM_RAD
                    ),
                ),
            ] {
                for narrow in [false, true] {
                    cases.push((
                        format!("{name}, {shape}, {profile}, {kind}, narrow {narrow}"),
                        Case {
                            layout,
                            element: element(shape, more),
                            target: "",
                            errors: errors.clone(),
                            samples: if shape == "hexagon" { 2.0 } else { 2.6 },
                            narrow,
                        },
                    ));
                }
            }
        }
    }
    // The direct sum over a hexagon's Gaussian takes hundreds of terms a direction.
    check_all(
        &cases,
        if shape == "hexagon" { 1 } else { 3 },
        tolerance,
        reason,
    );
}

#[test]
fn sampled_circles_agree_with_the_direct_sum_in_every_layout() {
    every_layout("circle", 1e-3, "measured up to 4e-4");
}

#[test]
fn sampled_squares_agree_with_the_direct_sum_in_every_layout() {
    // Straight edges along the grid add their aliases up: measured up to 1.8e-3.
    every_layout("square", 2e-3, DESIGNED);
}

#[test]
fn sampled_hexagons_agree_with_the_direct_sum_in_every_layout() {
    every_layout("hexagon", 1e-3, "measured up to 5e-4");
}

#[test]
fn sampled_agrees_with_the_direct_sum_with_obscurations_facets_and_focus_errors() {
    let mut cases = Vec::new();
    for shape in ["circle", "square", "hexagon"] {
        for (name, more) in [
            ("uniform", ""),
            ("obscured", "obscuration = 0.35"),
            (
                "gaussian, obscured",
                "obscuration = 0.2\nprofile = \"gaussian\"\nbeam_radius = \"0.05 m\"",
            ),
        ] {
            for target in [
                "facets = \"flat\"",
                "focus = \"1100 m\"",
                "focus = \"900 m\"\nfacets = \"flat\"",
                "focus = \"infinity\"",
            ] {
                for (errors, narrow) in [
                    ("", false),
                    ("", shape != "hexagon"),
                    (
                        "piston = \"0.6 rad\"\njitter = \"2 urad\"\ncommon_jitter = \"1 urad\"",
                        more.is_empty(),
                    ),
                ] {
                    cases.push((
                        format!("{shape}, {name}, {target:?}, {errors:?}, narrow {narrow}"),
                        Case {
                            layout: LAYOUTS[if shape == "hexagon" { 0 } else { 2 }].1,
                            element: element(shape, more),
                            target,
                            errors: errors.to_string(),
                            samples: 2.0,
                            narrow,
                        },
                    ));
                }
            }
        }
    }
    check_all(&cases, 1, 2e-3, DESIGNED);
}

/// Counts of samples that fold the grating orders of a lattice onto the map's edges.
#[test]
fn sampled_agrees_with_the_direct_sum_at_commensurate_samplings() {
    let mut cases = Vec::new();
    for (rows, columns) in [(1, 1), (1, 2), (2, 2), (4, 4), (1, 8)] {
        let layout = format!("layout = \"square\"\nrows = {rows}\ncolumns = {columns}");
        let layout: &'static str = layout.leak();
        for samples in [2.0, 4.0, 2.0 * 2f64.sqrt(), 5.0] {
            cases.push((
                format!("{rows} × {columns}, {samples}"),
                Case {
                    layout,
                    element: element("square", ""),
                    target: "",
                    errors: String::new(),
                    samples,
                    narrow: false,
                },
            ));
        }
    }
    check_all(&cases, 1, 2e-3, DESIGNED);
}

/// Aliases come from λ/Δ and farther: half the pitch leaves less of them.
#[test]
fn a_grid_twice_as_fine_comes_closer_to_the_direct_sum() {
    let folder = folder_with_table();
    for shape in ["circle", "square", "hexagon"] {
        for (name, layout) in [LAYOUTS[2], LAYOUTS[10]] {
            let case = Case {
                layout,
                element: element(shape, ""),
                target: "",
                errors: format!("{ALL_ERRORS}jitter = \"1 urad\""),
                samples: 2.6,
                narrow: false,
            };
            let (array, errors, task) = prepared(folder.path(), &case);
            let trial = TrialErrors {
                errors: &errors,
                seed: 1,
                trial: 0,
            };
            let exact = map(&Direct::new(&array, task), trial).0;
            let [usual, fine, finest] = [1.0, 2.0, 4.0]
                .map(|finer| worst(&exact, &map(&sampled(&array, task, finer), trial).0));
            println!("{shape}, {name}: {usual:.2e} {fine:.2e} {finest:.2e}");
            assert!(fine < 0.7 * usual, "{shape}, {name}: {usual} → {fine}");
            assert!(finest < 0.7 * fine, "{shape}, {name}: {fine} → {finest}");
        }
    }
}
