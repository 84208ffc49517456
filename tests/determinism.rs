//! The same scenario and seed give the same bits, whatever computes them.

mod common;

use common::{Unwatched, array_of, map, scenario, setup, text};
use facula::array::Array;
use facula::farfield::Method;
use facula::perturb::{Draw, State, TrialErrors};
use facula::scenario::{Errors, Figure};
use facula::study::assess::{Outcome, assess};
use facula::study::setup::Setup;
use std::f64::consts::PI;

/// 37 trials are five batches, the last of five.
fn study(method: &str) -> Setup {
    setup(&text(
        "layout = \"hexagonal\"\nrings = 2\npitch = \"0.105 m\"",
        "shape = \"circle\"\nsize = \"0.1 m\"",
        &format!(
            "bucket_diameter = \"5 mm\"\n[errors]\npiston = \"0.4 rad\"\njitter = \"2 urad\"\n\
             common_jitter = \"0.3 urad\"\ndropout = 0.1\npower_spread = 0.2\n\
             [require]\nstrehl = \">= 0.5\"\n\
             [run]\ntrials = 37\nseed = 4\nmethod = \"{method}\""
        ),
    ))
}

fn on_threads<T: Send>(threads: usize, work: impl FnOnce() -> T + Send) -> T {
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .unwrap_or_else(|error| panic!("{error}"))
        .install(work)
}

/// All that an outcome tells, written out: Rust prints the shortest digits that give a float's
/// bits back, so equal texts are equal bits.
fn told(outcome: &Outcome) -> Vec<(&'static str, String)> {
    vec![
        ("trials", format!("{:?}", outcome.trials.trials)),
        ("mean map", format!("{:?}", outcome.trials.mean_map)),
        ("mean power", format!("{:?}", outcome.trials.mean_power_w)),
        ("statistics", format!("{:?}", outcome.statistics)),
        ("long exposure", format!("{:?}", outcome.long_exposure)),
        ("predicted", format!("{:?}", outcome.predicted)),
        ("alone", format!("{:?}", outcome.alone)),
        ("verdict", format!("{:?}", outcome.verdict)),
        ("shown", format!("{:?}", outcome.shown)),
        ("encircled", format!("{:?}", outcome.encircled)),
        ("lobes", format!("{:?}", outcome.lobes)),
        ("ideal", format!("{:?}", outcome.setup.ideal)),
        ("ideal map", format!("{:?}", outcome.setup.ideal_map)),
        ("notes", format!("{:?}", outcome.notes)),
    ]
}

#[test]
fn any_number_of_threads_gives_the_same_bits() {
    for (method, expected) in [
        ("auto", Method::Factored),
        ("sampled", Method::Sampled),
        ("direct", Method::Direct),
    ] {
        let run = |threads| on_threads(threads, || told(&assess(study(method), &Unwatched)));
        assert_eq!(study(method).choice.method(), expected);
        let alone = run(1);
        for threads in [2, 3, 7] {
            for (one, other) in alone.iter().zip(run(threads)) {
                assert!(
                    one.1 == other.1,
                    "{method}: {} differs on {threads} threads",
                    one.0
                );
            }
        }
    }
}

#[test]
fn a_trial_computed_alone_equals_the_same_trial_in_the_run() {
    for method in ["factored", "sampled", "direct"] {
        let outcome = assess(study(method), &Unwatched);
        let setup = &outcome.setup;
        let far_field = setup.choice.prepare(&setup.array);
        for trial in [0, 7, 8, 20, 36] {
            let errors = TrialErrors {
                errors: &setup.scenario.errors,
                seed: 4,
                trial,
            };
            let (map, radiated) = map(far_field.as_ref(), errors);
            let reading = setup
                .reader
                .read(&map, radiated.power_w, &mut setup.reader.workspace());
            let in_run = &outcome.trials.trials[trial as usize];
            assert_eq!(in_run.trial, trial);
            let draw = Draw::of_trial(&setup.array, errors);
            assert_eq!(in_run.dark, count(&draw, State::Dark));
            for figure in Figure::ALL {
                let bits = |value: Option<f64>| value.map(f64::to_bits);
                assert_eq!(
                    bits(reading.figures.get(figure)),
                    bits(in_run.figures.get(figure)),
                    "{method}, trial {trial}: {}",
                    figure.name()
                );
            }
        }
    }
}

#[test]
fn more_trials_leave_the_first_ones_as_they_were() {
    let run = |trials: u64| {
        let mut setup = study("auto");
        setup.scenario.run.trials = trials;
        format!("{:?}", &assess(setup, &Unwatched).trials.trials[..11])
    };
    assert!(run(11) == run(37));
}

fn count(draw: &Draw, state: State) -> usize {
    draw.state.iter().filter(|&&each| each == state).count()
}

/// Errors of trial 11 of seed 7.
fn eleventh(array: &Array, errors: &Errors) -> Draw {
    let trial = TrialErrors {
        errors,
        seed: 7,
        trial: 11,
    };
    Draw::of_trial(array, trial)
}

fn elements(errors: &str) -> (Array, Errors) {
    let scenario = scenario(&text(
        "layout = \"hexagonal\"\nrings = 4",
        "shape = \"circle\"\nsize = \"0.1 m\"",
        &format!("[errors]\n{errors}"),
    ));
    (array_of(&scenario), scenario.errors)
}

/// Standard draws times magnitudes: a trial keeps its luck when a magnitude changes.
#[test]
fn changing_or_stopping_one_error_leaves_the_draws_of_the_others_bit_for_bit() {
    let draw = |piston: f64, jitter: f64, dropout: f64, spread: f64, common: f64| {
        let (array, errors) = elements(&format!(
            "piston = \"{piston} rad\"\njitter = \"{jitter} urad\"\ndropout = {dropout}\n\
             power_spread = {spread}\ncommon_jitter = \"{common} urad\""
        ));
        eleventh(&array, &errors)
    };
    let bits = |values: &[f64]| {
        values
            .iter()
            .map(|value| value.to_bits())
            .collect::<Vec<_>>()
    };
    let base = draw(0.5, 2.0, 0.2, 0.3, 0.0);
    let dark = count(&base, State::Dark);
    assert!(dark > 2 && dark < 30, "{dark}");
    for piston in [0.0, 0.25, 1.0] {
        let other = draw(piston, 2.0, 0.2, 0.3, 0.0);
        assert_eq!(bits(&other.tilt_x_rad), bits(&base.tilt_x_rad));
        assert_eq!(bits(&other.tilt_y_rad), bits(&base.tilt_y_rad));
        assert_eq!(bits(&other.amplitude), bits(&base.amplitude));
        assert_eq!(other.state, base.state);
        // A power of two scales exactly.
        let scaled: Vec<f64> = base
            .phase_rad
            .iter()
            .map(|phase| phase * piston / 0.5)
            .collect();
        assert!(other.phase_rad == scaled, "piston {piston}");
    }
    for jitter in [0.0, 1.0, 4.0] {
        let other = draw(0.5, jitter, 0.2, 0.3, 0.0);
        assert_eq!(bits(&other.phase_rad), bits(&base.phase_rad));
        assert_eq!(bits(&other.amplitude), bits(&base.amplitude));
        assert_eq!(other.state, base.state);
    }
    for dropout in [0.0, 0.1, 0.4] {
        let other = draw(0.5, 2.0, dropout, 0.3, 0.0);
        assert_eq!(bits(&other.phase_rad), bits(&base.phase_rad));
        assert_eq!(bits(&other.tilt_x_rad), bits(&base.tilt_x_rad));
        for n in 0..61 {
            // The unlucky of a low probability are among those of a higher one.
            let (fewer, more) = if dropout < 0.2 {
                (&other, &base)
            } else {
                (&base, &other)
            };
            assert!(fewer.state[n] == State::Lit || more.state[n] == State::Dark);
            if other.state[n] == State::Lit && base.state[n] == State::Lit {
                assert_eq!(other.amplitude[n].to_bits(), base.amplitude[n].to_bits());
            }
        }
    }
    for spread in [0.0, 0.1] {
        let other = draw(0.5, 2.0, 0.2, spread, 0.0);
        assert_eq!(bits(&other.phase_rad), bits(&base.phase_rad));
        assert_eq!(bits(&other.tilt_y_rad), bits(&base.tilt_y_rad));
        assert_eq!(other.state, base.state);
    }
    let common = draw(0.5, 2.0, 0.2, 0.3, 3.0).common_tilt_rad;
    let alone = draw(0.0, 0.0, 0.0, 0.0, 3.0).common_tilt_rad;
    assert_eq!(common.0.to_bits(), alone.0.to_bits());
    assert_eq!(common.1.to_bits(), alone.1.to_bits());
    let (array, errors) = elements("dropout = 0.2\ndropped = \"unlocked\"");
    let unlocked = eleventh(&array, &errors);
    for n in 0..61 {
        let out = unlocked.state[n] == State::Unlocked;
        assert_eq!(
            out,
            base.state[n] == State::Dark,
            "the same luck, dark or unlocked"
        );
        assert!(!out || unlocked.phase_rad[n].abs() <= PI);
    }
}
