//! Monte Carlo on the aim point against closed forms, in standard errors.
//!
//! Seeds are fixed. A mean must lie within four standard errors; a variance s² of n values
//! within four times √((m₄ − s⁴(n − 3)/(n − 1))/n), m₄ being the sample's fourth central moment
//! (the sampling variance of s² for any distribution, Kenney & Keeping, from memory).
//! Mean Strehl ratios under piston: compare Nabors, Appl. Opt. 33, 2284 (1994) and Yaitskova,
//! Dohlen & Dierickx, JOSA A 20, 1563 (2003), formulas from memory; all digits are derived.

mod common;

use common::{Directions, Within, array_of, assert_close, scenario, text};
use facula::array::Array;
use facula::farfield::choose::Task;
use facula::farfield::closed_form::{mean_map, strehl_std};
use facula::farfield::{Direct, FarField, Grid, Map, Radiated};
use facula::perturb::TrialErrors;
use facula::scenario::Errors;
use rayon::prelude::*;
use std::f64::consts::PI;

const ERRORS: f64 = 4.0;
const CLOSED: Within = Within(2e-9, "a closed form, given with nine digits or more");

/// Size of every element: λ/size is 10 µrad.
const SIZE_M: f64 = 0.1;
const BEAM_RAD: f64 = 1e-6 / SIZE_M;

/// An array of `count` elements and its errors. Circles lie in hexagonal rings where those have
/// that many, squares and other counts in touching rows.
fn case(count: usize, shape: &str, errors: &str) -> (Array, Errors) {
    let rings = (0..20).find(|k| 1 + 3 * k * (k + 1) == count);
    let layout = match (shape, rings) {
        ("circle", Some(rings)) => format!("layout = \"hexagonal\"\nrings = {rings}"),
        _ => {
            let rows = (1..=count)
                .rfind(|n| n * n <= count && count.is_multiple_of(*n))
                .unwrap_or(1);
            format!(
                "layout = \"square\"\nrows = {rows}\ncolumns = {}",
                count / rows
            )
        }
    };
    let element = format!("shape = \"{shape}\"\nsize = \"{SIZE_M} m\"");
    let scenario = scenario(&text(&layout, &element, &format!("[errors]\n{errors}")));
    let array = array_of(&scenario);
    assert_eq!(array.len(), count);
    (array, scenario.errors)
}

/// `value` of the aim irradiance over that without errors, and of what radiates, for every trial.
fn sample<T: Send>(
    (array, errors): &(Array, Errors),
    trials: u64,
    value: impl Fn(f64, Radiated) -> T + Sync,
) -> Vec<T> {
    let aim = Grid {
        pixels: 1,
        pixel_m: array.spot_m() / 4.0,
    };
    let direct = Direct::new(array, Task::of_trials(aim, errors));
    let full = direct.irradiance_without_errors_at(0.0, 0.0);
    (0..trials)
        .into_par_iter()
        .map_init(
            || (direct.worker(), Map::dark(aim)),
            |(worker, map), trial| {
                let trial = TrialErrors {
                    errors,
                    seed: 2024,
                    trial,
                };
                let radiated = worker.irradiance(trial, map);
                value(map.aim_w_m2() / full, radiated)
            },
        )
        .collect()
}

fn strehls(case: &(Array, Errors), trials: u64) -> Vec<f64> {
    sample(case, trials, |strehl, _| strehl)
}

/// Mean and k-th central moments for k = 2 (with n − 1) and 4.
fn moments(values: &[f64]) -> (f64, f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    let central = |k: i32| {
        values
            .iter()
            .map(|value| (value - mean).powi(k))
            .sum::<f64>()
    };
    (mean, central(2) / (n - 1.0), central(4) / n)
}

#[track_caller]
fn check_mean(what: &str, values: &[f64], expected: f64) {
    let (mean, variance, _) = moments(values);
    let error = (variance / values.len() as f64).sqrt();
    let what = format!("{what}: mean");
    assert_close(
        &what,
        mean,
        expected,
        ERRORS * error,
        "four standard errors of the mean",
    );
}

#[track_caller]
fn check_std(what: &str, values: &[f64], expected: f64) {
    let (_, variance, fourth) = moments(values);
    let n = values.len() as f64;
    let error = ((fourth - variance * variance * (n - 3.0) / (n - 1.0)) / n).sqrt();
    let what = format!("{what}: variance");
    assert_close(
        &what,
        variance,
        expected * expected,
        ERRORS * error,
        "four standard errors of the variance, from the fourth moment",
    );
}

/// The closed form's mean Strehl ratio.
fn predicted((array, errors): &(Array, Errors)) -> f64 {
    let grid = Grid {
        pixels: 5,
        pixel_m: array.spot_m() / 4.0,
    };
    let map = mean_map(array, errors, grid).unwrap_or_else(|refusal| panic!("{refusal:?}"));
    map.aim_w_m2() / Directions::new(array, array.spot_m()).at(0.0, 0.0)
}

/// Rows 7.3 to 7.7.
#[test]
fn piston_alone_has_the_mean_and_variance_of_n_random_phasors() {
    for (count, rms, mean, std, trials) in [
        (2, 0.5, 0.889_400_391_5, 0.139_112_419_4, 100_000),
        (7, 0.3, 0.926_226_730_2, 0.040_730_602_8, 40_000),
        (19, 0.5, 0.790_442_847_1, 0.061_695_450_8, 20_000),
        (
            100,
            0.314_159_265_36,
            0.906_957_875_2,
            0.012_587_979_6,
            4_000,
        ),
        (1000, 1.0, 0.368_511_561_7, 0.017_142_269_3, 2_000),
    ] {
        let case = case(count, "circle", &format!("piston = \"{rms} rad\""));
        let name = format!("{count} elements, {rms} rad");
        let values = strehls(&case, trials);
        check_mean(&name, &values, mean);
        check_std(&name, &values, std);
        let found = strehl_std(&case.0, &case.1).unwrap_or(f64::NAN);
        CLOSED.check(&format!("{name}: predicted std"), found, std);
        Within(1e-6, "the mean map's transform").check(&name, predicted(&case), mean);
    }
}

/// Rows 7.9 and 7.55: 0.8 at λ/13.3 of the exponential form; λ/14 for "about 0.8" is Maréchal's
/// (Born & Wolf, section 9.3, value from memory).
#[test]
fn marechals_criterion_stands_near_a_fourteenth_of_a_wave() {
    for (path, mean) in [
        ("0.075181767 um", 0.8),
        ("0.4723807271 rad", 0.8),
        ("0.0714285714 waves", 0.817_568_57),
        ("0.05 waves", 0.906_018_055_8),
    ] {
        let case = case(397, "circle", &format!("piston = \"{path}\""));
        let many = mean + (1.0 - mean) / 397.0;
        Within(1e-6, "the mean map's transform").check(path, predicted(&case), many);
        check_mean(path, &strehls(&case, 2_000), many);
    }
    let printed = Within(0.02, "1/14 is a rounded number: ~0.8");
    printed.check(
        "λ/14",
        predicted(&case(397, "circle", "piston = \"0.0714285714 waves\"")),
        0.8,
    );
}

/// Rows 7.16 to 7.21.
#[test]
fn dropout_dark_or_unlocked_has_the_mean_of_binomial_sums() {
    for (errors, mean, std) in [
        ("dropout = 0.05", 0.903_783_783_8, Some(0.067_229_181_9)),
        (
            "dropout = 0.05\npiston = \"0.3 rad\"",
            0.828_206_059_7,
            None,
        ),
        (
            "dropout = 0.05\npiston = \"0.3 rad\"\ndropped = \"unlocked\"",
            0.829_557_411_1,
            None,
        ),
    ] {
        let case = case(37, "circle", errors);
        let values = strehls(&case, 20_000);
        check_mean(errors, &values, mean);
        let foreseen = strehl_std(&case.0, &case.1).unwrap_or(f64::NAN);
        if let Some(std) = std {
            CLOSED.check(&format!("{errors}: predicted std"), foreseen, std);
        }
        check_std(errors, &values, foreseen);
        Within(1e-6, "the mean map's transform").check(errors, predicted(&case), mean);
    }
}

/// Fan, IEEE JSTQE 15, 291 (2009), abstract: with dropped elements "the efficiency is equal to
/// the fraction of operating elements".
#[test]
fn the_combining_efficiency_of_dropped_elements_is_the_fraction_that_operates() {
    let case = case(61, "circle", "dropout = 0.2");
    let rows = sample(&case, 300, |strehl, radiated| {
        let share = radiated.power_w / case.0.power_w();
        let operating = (61 - radiated.dark) as f64 / 61.0;
        (strehl / share, operating)
    });
    for (efficiency, operating) in rows {
        assert_close("efficiency", efficiency, operating, 1e-12, "rounding");
    }
}

/// Fan (2009) and Goodno, Shih & Rothenberg, Opt. Express 18, 25403 (2010): 1 − p²/4 to the
/// leading order (formula from memory). For a log-normal spread (1 + p²)^(−1/4) is derived.
#[test]
fn a_power_spread_costs_a_quarter_of_its_square() {
    for (count, spread, trials) in [
        (2, 0.5f64, 100_000),
        (7, 0.3, 40_000),
        (397, 0.3, 4_000),
        (200, 0.1, 8_000),
    ] {
        let case = case(count, "circle", &format!("power_spread = {spread}"));
        let name = format!("{count} elements, {spread}");
        let n = count as f64;
        let amplitude = (1.0 + spread * spread).powf(-0.125);
        let mean = amplitude.powi(2) + (1.0 - amplitude.powi(2)) / n;
        let rows = sample(&case, trials, |strehl, radiated| {
            (strehl, radiated.power_w / case.0.power_w())
        });
        let values: Vec<f64> = rows.iter().map(|row| row.0).collect();
        let powers: Vec<f64> = rows.iter().map(|row| row.1).collect();
        check_mean(&name, &values, mean);
        check_std(
            &name,
            &values,
            strehl_std(&case.0, &case.1).unwrap_or(f64::NAN),
        );
        check_mean(&format!("{name}: power"), &powers, 1.0);
        check_std(&format!("{name}: power"), &powers, spread / n.sqrt());
        Within(1e-6, "the mean map's transform").check(&name, predicted(&case), mean);
        if count == 200 {
            let efficiency: Vec<f64> = rows.iter().map(|row| row.0 / row.1).collect();
            let (found, variance, _) = moments(&efficiency);
            let error = (variance / trials as f64).sqrt();
            let leading = 1.0 - spread * spread / 4.0;
            let beyond = spread.powi(4) / 4.0 + spread * spread / (4.0 * n);
            assert_close(
                "efficiency",
                found,
                leading,
                ERRORS * error + beyond,
                "four standard errors, the next order, and 1/N",
            );
        }
    }
}

/// Mean field squared and mean power of a tilted element at g = σ·size/λ, rows 7.27 to 7.30.
const TILTED: [(&str, f64, f64, f64); 8] = [
    ("circle", 0.1, 0.952_042_987, 0.952_613_256),
    ("circle", 0.2, 0.823_537_517, 0.831_072_193),
    ("circle", 0.3, 0.651_993_068, 0.680_141_737),
    ("circle", 0.5, 0.330_074_559, 0.422_025_683),
    ("square", 0.1, 0.936_724_750, 0.937_712_752),
    ("square", 0.2, 0.773_870_272, 0.786_024_899),
    ("square", 0.3, 0.572_274_191, 0.613_292_034),
    ("square", 0.5, 0.247_239_203, 0.354_452_190),
];

/// Row 7.26, derived; compare Yaitskova & Dohlen, JOSA A 19, 1274 (2002), formulas not seen.
#[test]
fn jitter_of_each_element_scatters_what_its_mean_field_lacks() {
    for (shape, g, coherent, whole) in TILTED {
        for (count, piston, trials) in [
            (1, 0.0f64, 40_000),
            (2, 0.0, 30_000),
            (7, 0.4, 15_000),
            (217, 0.0, 1_000),
        ] {
            let case = case(
                count,
                shape,
                &format!(
                    "jitter = \"{:e} rad\"\npiston = \"{piston} rad\"",
                    g * BEAM_RAD
                ),
            );
            let coherent = coherent * (-piston * piston).exp();
            let mean = coherent + (whole - coherent) / count as f64;
            let name = format!("{count} {shape}s, g = {g}");
            check_mean(&name, &strehls(&case, trials), mean);
            Within(5e-9, "given with nine digits").check(&name, predicted(&case), mean);
        }
    }
    let case = case(
        19,
        "circle",
        &format!("jitter = \"{:e} rad\"", 0.2 * BEAM_RAD),
    );
    CLOSED.check(
        "row 7.32",
        (0.831_072_193 - 0.823_537_517) / 19.0 + 0.823_537_517,
        0.823_934_079,
    );
    Within(5e-9, "given with nine digits").check("row 7.32", predicted(&case), 0.823_934_079);
}

/// Rows 7.24 and 7.25 with the whole aperture for the element: one circle, and a square filled
/// by squares, whose number does not matter.
#[test]
fn common_jitter_costs_a_filled_array_what_it_costs_its_whole_aperture() {
    for (shape, g, _, whole) in TILTED {
        let counts: &[(usize, f64)] = match shape {
            "circle" => &[(1, 1.0)],
            _ => &[(1, 1.0), (4, 2.0), (36, 6.0)],
        };
        for &(count, across) in counts {
            let case = case(
                count,
                shape,
                &format!("common_jitter = \"{:e} rad\"", g * BEAM_RAD / across),
            );
            let name = format!("{count} {shape}s, g = {g}");
            check_mean(&name, &strehls(&case, 20_000), whole);
            Within(5e-9, "given with nine digits").check(&name, predicted(&case), whole);
        }
    }
}

/// The spread that the closed form foresees, for all that it covers at once.
#[test]
fn the_predicted_spread_of_strehl_is_that_of_the_trials() {
    for dropped in ["dark", "unlocked"] {
        for (count, trials) in [(2, 100_000), (7, 40_000), (37, 10_000), (397, 3_000)] {
            let case = case(
                count,
                "circle",
                &format!(
                    "piston = \"0.5 rad\"\ndropout = 0.1\ndropped = \"{dropped}\"\npower_spread = 0.3"
                ),
            );
            let name = format!("{count} elements, {dropped}");
            let values = strehls(&case, trials);
            let foreseen = strehl_std(&case.0, &case.1).unwrap_or(f64::NAN);
            check_std(&name, &values, foreseen);
            check_mean(&name, &values, predicted(&case));
        }
    }
}

/// Rows 7.51 to 7.54: Born & Wolf, section 8.8, and Goodman, *Introduction to Fourier Optics*
/// (formulas from memory; 0.81 at a quarter wave is the printed digit).
#[test]
fn a_focus_error_dims_the_aim_point_by_the_square_of_a_sinc() {
    let aim = |count: usize, shape: &str, inverse_focus: f64| {
        let (rows, size) = if count == 1 {
            (1, SIZE_M)
        } else {
            (4, SIZE_M / 4.0)
        };
        let array = common::array(&text(
            &format!("layout = \"square\"\nrows = {rows}\ncolumns = {rows}"),
            &format!("shape = \"{shape}\"\nsize = \"{size} m\""),
            &format!("focus = \"{:e} m\"", 1.0 / inverse_focus),
        ));
        Directions::new(&array, array.spot_m()).at(0.0, 0.0)
    };
    let sums = Within(1e-9, "Gauss-Legendre sums, given with ten digits");
    for (waves, circle) in [(0.25, 0.810_569_469_1), (0.5, 0.405_284_734_6), (1.0, 0.0)] {
        for sign in [1.0, -1.0] {
            let c = sign * 8.0 * waves * 1e-6 / (SIZE_M * SIZE_M);
            let found = aim(1, "circle", 1e-3 - c) / aim(1, "circle", 1e-3);
            sums.check(&format!("circle, {waves} waves"), found, circle);
            if waves < 0.3 {
                Within(5e-3, "two printed decimals").check("circle, λ/4", found, 0.81);
                // Half a side takes the place of the radius; 16 tiles are the same aperture.
                for count in [1, 16] {
                    let found = aim(count, "square", 1e-3 - c) / aim(count, "square", 1e-3);
                    sums.check(&format!("square of {count}, λ/4"), found, 0.640_487_766_9);
                }
            }
        }
    }
    let quarter = (PI / 4.0).sin() / (PI / 4.0);
    CLOSED.check("sinc² of a quarter", quarter * quarter, 0.810_569_469_1);
}
