//! Monte Carlo over whole maps, and through the whole study, against closed forms.

mod common;

use common::{Unwatched, assert_close, setup, text};
use facula::farfield::Map;
use facula::farfield::closed_form::mean_map;
use facula::perturb::TrialErrors;
use facula::scenario::Figure;
use facula::study::assess::assess;
use facula::study::setup::Setup;
use rayon::prelude::*;

/// Mean over trials and its standard error, at every pixel.
fn long_exposure(setup: &Setup, trials: u64) -> (Vec<f64>, Vec<f64>) {
    let (array, errors) = (&setup.array, &setup.scenario.errors);
    let far_field = setup.choice.prepare(array);
    let pixels = setup.grid.pixels * setup.grid.pixels;
    let batch = 50;
    let sums = (0..trials / batch)
        .into_par_iter()
        .map(|number| {
            let mut worker = far_field.worker();
            let mut map = Map::dark(setup.grid);
            let mut sums = vec![(0.0, 0.0); pixels];
            for trial in number * batch..(number + 1) * batch {
                let trial = TrialErrors {
                    errors,
                    seed: setup.scenario.run.seed,
                    trial,
                };
                worker.irradiance(trial, &mut map);
                for (sum, value) in sums.iter_mut().zip(&map.irradiance_w_m2) {
                    *sum = (sum.0 + value, sum.1 + value * value);
                }
            }
            sums
        })
        .collect::<Vec<_>>();
    let n = trials as f64;
    (0..pixels)
        .map(|pixel| {
            let (sum, squares) = sums.iter().fold((0.0, 0.0), |t, part| {
                (t.0 + part[pixel].0, t.1 + part[pixel].1)
            });
            let mean = sum / n;
            (mean, ((squares / n - mean * mean) / (n - 1.0)).sqrt())
        })
        .unzip()
}

/// Every error at once. A pixel's irradiance is skewed like an exponential, which moves the
/// share beyond three standard errors from 0.0027 to about 0.004 at this number of trials, and
/// the pixels of a map are a few dozen independent ones: hence the bounds.
#[test]
fn the_mean_map_of_the_trials_is_the_closed_form_at_every_pixel() {
    let errors = "piston = \"0.5 rad\"\njitter = \"3 urad\"\ncommon_jitter = \"0.6 urad\"\n\
                  dropout = 0.1\npower_spread = 0.3";
    for (name, layout, element, target, dropped) in [
        (
            "circles",
            "layout = \"hexagonal\"\nrings = 1\npitch = \"0.11 m\"",
            "shape = \"circle\"\nsize = \"0.1 m\"",
            "",
            "dark",
        ),
        (
            "hexagons",
            "layout = \"hexagonal\"\nrings = 1",
            "shape = \"hexagon\"\nsize = \"0.1 m\"",
            "",
            "unlocked",
        ),
        (
            "clipped squares with flat facets",
            "layout = \"square\"\nrows = 4\ncolumns = 3\ntaper = \"6 dB\"",
            "shape = \"square\"\nsize = \"0.1 m\"\nprofile = \"gaussian\"\nbeam_radius = \"0.05 m\"",
            "focus = \"980 m\"\nfacets = \"flat\"",
            "unlocked",
        ),
        (
            "rings",
            "layout = \"rings\"\nrings = [1, 5, 9]\npitch = \"0.14 m\"",
            "shape = \"circle\"\nsize = \"0.1 m\"\nobscuration = 0.3",
            "focus = \"1050 m\"",
            "dark",
        ),
    ] {
        let setup = setup(&text(
            layout,
            element,
            &format!(
                "{target}\n[errors]\n{errors}\ndropped = \"{dropped}\"\n[run]\nseed = 5\nsamples_per_spot = 2.5\nwindow = \"24 mm\""
            ),
        ));
        let (mean, error) = long_exposure(&setup, 1_000);
        let expected = mean_map(&setup.array, &setup.scenario.errors, setup.grid)
            .unwrap_or_else(|refusal| panic!("{refusal:?}"));
        let scores: Vec<f64> = mean
            .iter()
            .zip(&error)
            .zip(&expected.irradiance_w_m2)
            .map(|((mean, error), expected)| (mean - expected) / error)
            .collect();
        let count = scores.len() as f64;
        let worst = scores
            .iter()
            .fold(0.0, |worst: f64, score| worst.max(score.abs()));
        let beyond_three = scores.iter().filter(|score| score.abs() > 3.0).count() as f64 / count;
        let square = scores.iter().map(|score| score * score).sum::<f64>() / count;
        assert_close(
            &format!("{name}: worst pixel, in standard errors"),
            worst,
            0.0,
            5.0,
            "none of a few thousand lies beyond five",
        );
        assert_close(
            &format!("{name}: share beyond three"),
            beyond_three,
            0.0,
            0.015,
            "0.004 on average, times the clustering of neighbours",
        );
        assert_close(
            &format!("{name}: mean square"),
            square,
            1.0,
            0.6,
            "chi square of a few dozen independent pixels",
        );
    }
}

/// The study's own statistics against what it predicts, all errors at once.
#[test]
fn what_assess_predicts_is_what_its_trials_find() {
    for dropped in ["dark", "unlocked"] {
        let outcome = assess(
            setup(&text(
                "layout = \"hexagonal\"\nrings = 3\npitch = \"0.105 m\"\ntaper = \"3 dB\"",
                "shape = \"circle\"\nsize = \"0.1 m\"\nprofile = \"gaussian\"\nbeam_radius = \"0.045 m\"",
                &format!(
                    "bucket_diameter = \"4 mm\"\n[errors]\npiston = {{ loop = \"0.3 rad\", drift = \"40 nm\" }}\n\
                 jitter = \"2 urad\"\ncommon_jitter = \"0.3 urad\"\ndropout = \"8 %\"\ndropped = \"{dropped}\"\n\
                 power_spread = 0.2\n[run]\ntrials = 250\nseed = 3"
                ),
            )),
            &Unwatched,
        );
        let statistic = |figure: Figure| outcome.statistics[figure as usize].1;
        let predicted = |figure: Figure| outcome.predicted.figures.get(figure).unwrap_or(f64::NAN);
        for figure in [
            Figure::Strehl,
            Figure::AimIrradiance,
            Figure::BucketPower,
            Figure::RadiatedPower,
        ] {
            let found = statistic(figure);
            let error = found.standard_error.unwrap_or(f64::NAN);
            assert_close(
                &format!("{dropped}: {}", figure.name()),
                found.mean.unwrap_or(f64::NAN),
                predicted(figure),
                4.0 * error + 1e-12 * predicted(figure),
                "four standard errors",
            );
            let long = outcome
                .long_exposure
                .figures
                .get(figure)
                .unwrap_or(f64::NAN);
            let scale = predicted(figure);
            assert_close(
                "the long exposure's",
                long / scale,
                found.mean.unwrap_or(f64::NAN) / scale,
                1e-9,
                "power and irradiance are linear in the map",
            );
        }
        // Fractions and circles are not linear: the long exposure's are those of a mean map,
        // as the prediction's are. Powers err by the bucket's standard error at most.
        let bucket = statistic(Figure::BucketPower);
        let relative = bucket
            .standard_error
            .zip(bucket.mean)
            .map_or(f64::NAN, |(e, m)| e / m);
        for (figure, slope) in [
            (Figure::BucketFraction, 1.0),
            (Figure::Encircled80Diameter, 2.0),
        ] {
            let long = outcome
                .long_exposure
                .figures
                .get(figure)
                .unwrap_or(f64::NAN);
            assert_close(
                &format!("{dropped}: long exposure's {}", figure.name()),
                long / predicted(figure),
                1.0,
                4.0 * slope * relative,
                "four errors of the bucket power",
            );
        }
        assert!(
            outcome.predicted.strehl_std.is_none(),
            "jitter has no closed form of the spread"
        );
    }
}

/// `strehl_std` of the study where it has one, and `predicted` for each source alone.
#[test]
fn the_spread_that_assess_predicts_is_that_of_its_trials() {
    let outcome = assess(
        setup(&text(
            "layout = \"hexagonal\"\nrings = 1",
            "shape = \"circle\"\nsize = \"0.1 m\"",
            "[errors]\npiston = \"0.5 rad\"\ndropout = 0.05\npower_spread = 0.2\n\
             [run]\ntrials = 4000\nseed = 8\nwindow = \"4 mm\"",
        )),
        &Unwatched,
    );
    let found = outcome.statistics[Figure::Strehl as usize]
        .1
        .std
        .unwrap_or(f64::NAN);
    let foreseen = outcome.predicted.strehl_std.unwrap_or(f64::NAN);
    // For a kurtosis of 4, as here, a deviation's relative error is √(3/(4n)).
    let error = (3.0f64 / 4.0 / 4000.0).sqrt();
    assert_close(
        "strehl_std",
        found / foreseen,
        1.0,
        4.0 * error,
        "four errors of a deviation",
    );
    let alone: Vec<(&str, f64)> = outcome
        .alone
        .iter()
        .map(|alone| {
            (
                alone.source,
                alone.figures.get(Figure::Strehl).unwrap_or(f64::NAN),
            )
        })
        .collect();
    let m = (-0.25f64).exp();
    let expected = [
        ("piston", m + (1.0 - m) / 7.0),
        ("dropout", 0.95 * 0.95 + 0.95 * 0.05 / 7.0),
        ("power_spread", 1.04f64.powf(-0.25) * 6.0 / 7.0 + 1.0 / 7.0),
    ];
    assert_eq!(alone.len(), expected.len());
    for ((source, found), (name, expected)) in alone.into_iter().zip(expected) {
        assert_eq!(source, name);
        assert_close(
            name,
            found,
            expected,
            1e-6,
            "closed form, by the mean map's transform",
        );
    }
}
