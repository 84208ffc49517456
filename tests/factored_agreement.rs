//! `factored` against `direct` over whole maps, for every layout, shape, profile and error.
//!
//! Errors are |√I_f − √I_d|·λL over Σ√P·|A(0)|, the largest amplitude that the array could put
//! anywhere. The tolerance of 1e-6 is what the expansion of tilts, the spreading kernel and
//! single precision may leave together. Each test prints its worst errors as a table.

mod common;

use common::layouts::{ALL_ERRORS, BEAM_RAD, LAYOUTS, element, folder_with_table};
use common::{array_of, assert_close, map, prepared, scenario_in, text};
use facula::array::Array;
use facula::farfield::choose::{Task, choose};
use facula::farfield::pattern::{ElementPattern, Wavefront};
use facula::farfield::{Direct, Grid, Map, good_length};
use facula::perturb::TrialErrors;
use facula::scenario::{Errors, MethodChoice};
use rayon::prelude::*;
use std::collections::BTreeMap;
use std::path::Path;

const TOLERANCE: f64 = 1e-6;

/// Profiles of an element of 0.1 m.
const PROFILES: [(&str, &str); 3] = [
    ("uniform", ""),
    (
        "clipped Gaussian",
        "profile = \"gaussian\"\nbeam_radius = \"0.047 m\"",
    ),
    ("obscured", "obscuration = 0.35"),
];

/// What the errors of a case are, besides none.
fn errors(jitter_beams: f64, dropped: &str) -> String {
    format!(
        "{ALL_ERRORS}piston = \"0.3 rad\"\ndropped = \"{dropped}\"\njitter = \"{:e} rad\"\n\
         common_jitter = \"{:e} rad\"",
        jitter_beams * BEAM_RAD,
        0.05 * BEAM_RAD
    )
    .replace("piston = \"0.6 rad\"\n", "")
}

/// Names and texts of all kinds of errors.
fn kinds() -> [(&'static str, String); 3] {
    [
        ("none", String::new()),
        ("all, jitter 0.05, dark", errors(0.05, "dark")),
        ("all, jitter 0.1, unlocked", errors(0.1, "unlocked")),
    ]
}

/// Where a map looks.
#[derive(Clone, Copy)]
enum Look {
    /// So wide in λ/size, at so many samples a spot.
    Beams(f64, f64),
    /// So many pixels a side, each so large that one pitch of 0.1 m is that many grid cells.
    Commensurate(usize, f64),
}

/// One comparison, and the row and column of the table that it counts for.
struct Case {
    row: String,
    column: String,
    layout: String,
    element: String,
    target: &'static str,
    errors: String,
    look: Look,
}

fn read(folder: &Path, case: &Case) -> (Array, Errors, Task) {
    let rest = format!("{}\n[errors]\n{}", case.target, case.errors);
    let scenario = scenario_in(folder, &text(&case.layout, &case.element, &rest));
    let array = array_of(&scenario);
    let grid = match case.look {
        Look::Beams(beams, samples) => {
            Grid::covering(beams * BEAM_RAD * array.range_m, array.spot_m() / samples)
        }
        Look::Commensurate(pixels, cells) => {
            let length = good_length((1.6 * pixels as f64).ceil() as usize) as f64;
            let pixel_m = cells * array.wavelength_m * array.range_m / (length * 0.1);
            Grid { pixels, pixel_m }
        }
    };
    let task = Task::of_trials(grid, &scenario.errors);
    (array, scenario.errors, task)
}

/// Largest difference of amplitudes over the largest that the array could reach.
fn worst(array: &Array, exact: &Map, other: &Map) -> f64 {
    let wavefront = Wavefront {
        curvature_per_m: array.curvature_per_m,
        mean_over_tilt_rad: 0.0,
    };
    let pattern = ElementPattern::new(&array.element, array.wavenumber(), wavefront, BEAM_RAD);
    let reach = array.amplitude_sum(1) * pattern.at(0.0, 0.0).norm();
    let scale = array.wavelength_m * array.range_m / reach;
    exact
        .irradiance_w_m2
        .iter()
        .zip(&other.irradiance_w_m2)
        .map(|(a, b)| (a.sqrt() - b.sqrt()).abs() * scale)
        .fold(0.0, f64::max)
}

/// Steady tilts that `factored` may refuse, in λ/size: with elements that focus by themselves, and
/// with flat facets, which leave 1.25 waves in each element here.
const REFUSABLE: [f64; 2] = [0.25, 0.12];

/// Worst difference over two trials, whose powers and counts must agree too; `None` where large
/// steady tilts are refused.
fn disagreement(folder: &Path, case: &Case) -> Option<f64> {
    let (array, errors, task) = read(folder, case);
    let exact = Direct::new(&array, task);
    let factored = match choose(&array, task, MethodChoice::Factored) {
        Ok(choice) => choice.prepare(&array),
        Err(refusal) => {
            let tilt = array.largest_tilt_rad() / BEAM_RAD;
            let refusable = REFUSABLE[usize::from(case.target.contains("flat"))];
            assert!(tilt > refusable, "{}: {tilt} λ/size, {refusal:?}", case.row);
            return None;
        }
    };
    let trials = if case.errors.is_empty() { 1 } else { 2 };
    (0..trials)
        .map(|trial| {
            let trial = TrialErrors {
                errors: &errors,
                seed: 9,
                trial,
            };
            let (exact, one) = map(&exact, trial);
            let (fast, other) = map(factored.as_ref(), trial);
            assert_eq!((one.dark, one.unlocked), (other.dark, other.unlocked));
            let off = (one.power_w - other.power_w).abs();
            assert!(off <= 1e-6 * one.power_w, "{}: {one:?} {other:?}", case.row);
            worst(&array, &exact, &fast)
        })
        .reduce(f64::max)
}

/// Check every case in parallel, and print the worst of each row and column.
fn check_all(cases: &[Case]) {
    let folder = folder_with_table();
    let found: Vec<Option<f64>> = cases
        .par_iter()
        .map(|case| disagreement(folder.path(), case))
        .collect();
    let mut columns: Vec<&str> = Vec::new();
    let mut rows: Vec<&str> = Vec::new();
    let mut table: BTreeMap<(&str, &str), Option<f64>> = BTreeMap::new();
    for (case, &error) in cases.iter().zip(&found) {
        if !columns.contains(&case.column.as_str()) {
            columns.push(&case.column);
        }
        if !rows.contains(&case.row.as_str()) {
            rows.push(&case.row);
        }
        let cell = table.entry((&case.row, &case.column)).or_default();
        *cell = error.into_iter().chain(*cell).reduce(f64::max);
    }
    println!("\n| | {} |", columns.join(" | "));
    println!("| --- |{}", " --- |".repeat(columns.len()));
    for row in rows {
        let cells = columns
            .iter()
            .map(|column| match table.get(&(row, *column)) {
                Some(Some(error)) => format!("{error:.1e}"),
                Some(None) => "refused".to_string(),
                None => "–".to_string(),
            });
        println!("| {row} | {} |", cells.collect::<Vec<_>>().join(" | "));
    }
    let mut taken: Vec<(f64, String)> = cases
        .iter()
        .zip(found)
        .filter_map(|(case, error)| Some((error?, format!("{}, {}", case.row, case.column))))
        .collect();
    taken.sort_by(|a, b| b.0.total_cmp(&a.0));
    let (error, name) = &taken[0];
    assert_close(
        name,
        *error,
        0.0,
        TOLERANCE,
        "what the method is designed for",
    );
}

fn every_layout(shape: &str) {
    let mut cases = Vec::new();
    for (layout_number, (row, layout)) in LAYOUTS.into_iter().enumerate() {
        for (number, (profile, more)) in PROFILES.into_iter().enumerate() {
            for (kind, (column, errors)) in kinds().into_iter().enumerate() {
                // Every layout, profile and kind meets every sampling somewhere; the direct sum
                // over a clipped hexagon takes hundreds of terms a direction, and the coarsest.
                let turn = layout_number + number + kind;
                let slow = shape != "circle" && profile != "uniform" && !errors.is_empty();
                let samples = if slow { 2.0 } else { [2.0, 3.3, 4.0][turn % 3] };
                let beams = if slow { 1.6 } else { [2.6, 1.3][turn % 2] };
                cases.push(Case {
                    row: format!("{row}, {profile}"),
                    column: column.to_string(),
                    layout: layout.to_string(),
                    element: element(shape, more),
                    target: "",
                    errors,
                    look: Look::Beams(beams, samples),
                });
            }
        }
    }
    check_all(&cases);
}

#[test]
fn factored_circles_agree_with_the_direct_sum_in_every_layout() {
    every_layout("circle");
}

#[test]
fn factored_squares_agree_with_the_direct_sum_in_every_layout() {
    every_layout("square");
}

#[test]
fn factored_hexagons_agree_with_the_direct_sum_in_every_layout() {
    every_layout("hexagon");
}

#[test]
fn factored_agrees_with_the_direct_sum_from_two_elements_to_four_hundred() {
    let mut cases = Vec::new();
    for (count, shape, layout, beams) in [
        (
            2,
            "circle",
            "layout = \"square\"\nrows = 1\ncolumns = 2",
            3.2,
        ),
        (7, "hexagon", "layout = \"hexagonal\"\nrings = 1", 3.2),
        (19, "circle", "layout = \"hexagonal\"\nrings = 2", 2.6),
        (61, "circle", "layout = \"hexagonal\"\nrings = 4", 1.6),
        (
            400,
            "square",
            "layout = \"square\"\nrows = 20\ncolumns = 20",
            1.1,
        ),
        (
            400,
            "circle",
            "layout = \"square\"\nrows = 16\ncolumns = 25",
            1.1,
        ),
    ] {
        for (column, errors) in kinds() {
            for samples in [2.0, 3.3, 4.0] {
                // A wide map of many elements is long work for the direct sum.
                if count == 400 && samples > 3.0 && !(errors.is_empty() || shape == "square") {
                    continue;
                }
                cases.push(Case {
                    row: format!("{count} {shape}s, {samples} samples"),
                    column: column.to_string(),
                    layout: layout.to_string(),
                    element: element(shape, ""),
                    target: "",
                    errors: errors.clone(),
                    look: Look::Beams(beams, samples),
                });
            }
        }
    }
    check_all(&cases);
}

/// A focus elsewhere tilts the elements the more the farther out they are; flat facets and a
/// focus leave a curved phase inside each; the table brings tilts of its own.
#[test]
fn factored_agrees_with_the_direct_sum_with_focus_errors_facets_and_tables() {
    let mut cases = Vec::new();
    for layout in [3, 4, 6, 9, 10] {
        for (place, target) in [
            "focus = \"1002 m\"",
            "focus = \"990 m\"",
            "facets = \"flat\"",
            "focus = \"1005 m\"\nfacets = \"flat\"",
        ]
        .into_iter()
        .enumerate()
        {
            for (turn, (column, errors)) in kinds().into_iter().enumerate() {
                let shape = ["circle", "square"][(layout + place + turn) % 2];
                let more = PROFILES[(layout + place) % 3].1;
                cases.push(Case {
                    row: format!("{}, {}", LAYOUTS[layout].0, target.replace('\n', ", ")),
                    column: column.to_string(),
                    layout: LAYOUTS[layout].1.to_string(),
                    element: element(shape, more),
                    target,
                    errors,
                    look: Look::Beams(1.6, 2.0),
                });
            }
        }
    }
    check_all(&cases);
}

/// Elements that all fall on cells of the grid, or all half way between.
#[test]
fn factored_agrees_with_the_direct_sum_where_the_pitch_is_a_whole_number_of_cells() {
    let mut cases = Vec::new();
    for (rows, columns) in [(1, 1), (1, 2), (2, 2), (4, 4), (1, 8), (3, 5), (16, 16)] {
        for (column, errors) in [&kinds()[0], &kinds()[2]] {
            for cells in [1.0, 1.5, 2.0, 4.0] {
                for pixels in [33, 49] {
                    cases.push(Case {
                        row: format!("{rows} × {columns}, {cells} cells a pitch"),
                        column: (*column).to_string(),
                        layout: format!("layout = \"square\"\nrows = {rows}\ncolumns = {columns}"),
                        element: element("square", ""),
                        target: "",
                        errors: errors.clone(),
                        look: Look::Commensurate(pixels, cells),
                    });
                }
            }
        }
    }
    for samples in [2.0, 4.0, 2.0 * 2f64.sqrt(), 5.0] {
        cases.push(Case {
            row: format!("4 × 4, {samples:.3} samples a spot"),
            column: "none".to_string(),
            layout: "layout = \"square\"\nrows = 4\ncolumns = 4".to_string(),
            element: element("square", ""),
            target: "",
            errors: String::new(),
            look: Look::Beams(2.6, samples),
        });
    }
    check_all(&cases);
}

/// Memory is reused from trial to trial, and must carry nothing over.
#[test]
fn a_factored_map_does_not_depend_on_the_trials_that_its_worker_computed_before() {
    let folder = folder_with_table();
    for (row, layout) in LAYOUTS {
        for (column, errors) in kinds() {
            let case = Case {
                row: row.to_string(),
                column: column.to_string(),
                layout: layout.to_string(),
                element: element("circle", ""),
                target: "",
                errors,
                look: Look::Beams(1.3, 2.0),
            };
            let (array, errors, task) = read(folder.path(), &case);
            let factored = prepared(&array, task, MethodChoice::Factored);
            let trial = |trial| TrialErrors {
                errors: &errors,
                seed: 3,
                trial,
            };
            let mut worker = factored.worker();
            for number in [5, 0, 5, 8, 1, 5] {
                let mut reused = Map::dark(task.grid);
                let radiated = worker.irradiance(trial(number), &mut reused);
                let (fresh, alone) = map(factored.as_ref(), trial(number));
                assert!(reused == fresh, "{row}, {column}, trial {number}");
                assert!(radiated == alone, "{row}, {column}, trial {number}");
            }
        }
    }
}
