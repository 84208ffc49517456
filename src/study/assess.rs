//! `assess`: what does this array put on its target, and does that meet the requirement?

use super::requirement::{Verdict, judge};
use super::setup::{LINEAR, Setup};
use crate::farfield::closed_form::{Moments, mean_map};
use crate::farfield::{FarField, Map};
use crate::figures::lobes::{Lobe, brightest};
use crate::figures::{Figures, Reading};
use crate::perturb::TrialErrors;
use crate::scenario::{Errors, Figure};
use crate::trials::statistics::{Summary, Undefined, quantile};
use crate::trials::{Machine, Progress, Trials, run};

/// Everything that `assess` found.
#[derive(Debug)]
pub struct Outcome {
    /// The scenario, its array and the array without errors.
    pub setup: Setup,
    /// Every trial, and the long exposure's map; in closed form that map and no trial.
    pub trials: Trials,
    /// Statistics of every figure, in the order of [`Figure::ALL`].
    pub statistics: Vec<(Figure, Summary)>,
    /// Figures of the long exposure.
    pub long_exposure: Reading,
    /// The closed form's mean.
    pub predicted: Predicted,
    /// Each error source on its own, in closed form.
    pub alone: Vec<Alone>,
    /// The verdict.
    pub verdict: Verdict,
    /// The trial whose Strehl ratio is nearest the median; none in closed form.
    pub shown: Option<Shown>,
    /// Shares of P within each radius of the reader.
    pub encircled: EncircledBand,
    /// Brightest lobes of the array without errors.
    pub lobes: Vec<Lobe>,
    /// What a reader must know.
    pub notes: Vec<String>,
}

/// Figures of the closed form's mean map.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Predicted {
    /// Every figure of the mean map.
    pub figures: Figures,
    /// Standard deviation of the Strehl ratio, where it has a closed form.
    pub strehl_std: Option<f64>,
}

/// One error source on its own.
#[derive(Debug, Clone, PartialEq)]
pub struct Alone {
    /// Its key in `[errors]`.
    pub source: &'static str,
    /// Figures of the mean map with this source alone.
    pub figures: Figures,
}

/// One trial in full.
#[derive(Debug, Clone, PartialEq)]
pub struct Shown {
    /// Its number.
    pub trial: u64,
    /// Its map.
    pub map: Map,
    /// Its figures.
    pub figures: Figures,
}

/// Encircled energy over radius.
#[derive(Debug, Clone, PartialEq)]
pub struct EncircledBand {
    /// Radii about the aim point.
    pub radius_m: Vec<f64>,
    /// Without errors.
    pub ideal: Vec<f64>,
    /// Of the long exposure.
    pub long_exposure: Vec<f64>,
    /// 5th percentile over trials.
    pub p05: Vec<f64>,
    /// Median over trials.
    pub p50: Vec<f64>,
    /// 95th percentile over trials.
    pub p95: Vec<f64>,
}

/// Run the study on the current thread pool.
pub fn assess(setup: Setup, progress: &dyn Progress) -> Outcome {
    let (trials, shown) = if let Some(mean_map) = &setup.closed_form {
        (means(&setup, mean_map.clone()), None)
    } else {
        let far_field = setup.choice.prepare(&setup.array);
        let machine = Machine {
            errors: &setup.scenario.errors,
            seed: setup.scenario.run.seed,
            far_field: far_field.as_ref(),
            reader: &setup.reader,
        };
        let count = setup.scenario.run.trials;
        progress.stage("trials", count);
        let workers = setup.workers(rayon::current_num_threads());
        let trials = run(machine, count, workers, progress);
        let shown = shown_trial(&setup, &trials, far_field.as_ref());
        (trials, Some(shown))
    };
    progress.stage("predictions and lobes", 2);
    let mut workspace = setup.reader.workspace();
    let long_exposure = setup
        .reader
        .read(&trials.mean_map, trials.mean_power_w, &mut workspace);
    let statistics = statistics(&setup, &trials, &long_exposure.figures);
    let ((predicted, alone), lobes) = rayon::join(
        || {
            let predictions = predictions(&setup);
            progress.advance(1);
            predictions
        },
        || {
            let lobes = brightest(&setup.array, setup.grid.width_m());
            progress.advance(1);
            lobes
        },
    );
    let verdict = judge(
        &setup.scenario.require,
        &trials.trials,
        |figure| statistics[figure as usize].1.mean,
        &long_exposure.figures,
    );
    let encircled = band(&setup, &trials, &long_exposure);
    let mut outcome = Outcome {
        setup,
        trials,
        statistics,
        long_exposure,
        predicted,
        alone,
        verdict,
        shown,
        encircled,
        lobes,
        notes: Vec::new(),
    };
    outcome.notes = super::notes::of(&outcome);
    outcome
}

/// The closed form's mean map in the place of trials.
fn means(setup: &Setup, mean_map: Map) -> Trials {
    let moments = Moments::of(&setup.scenario.errors);
    Trials {
        trials: Vec::new(),
        mean_power_w: setup.array.power_w() * moments.mean_square,
        mean_map,
    }
}

/// Statistics of every figure over the trials; in closed form the means that the mean map holds.
fn statistics(setup: &Setup, trials: &Trials, of_mean_map: &Figures) -> Vec<(Figure, Summary)> {
    let summary = |figure: Figure| {
        if setup.closed_form.is_some() {
            return Summary {
                mean: of_mean_map.get(figure).filter(|_| LINEAR.contains(&figure)),
                ..Summary::default()
            };
        }
        let values: Vec<Option<f64>> = trials
            .trials
            .iter()
            .map(|trial| trial.figures.get(figure))
            .collect();
        Summary::of(&values, undefined(figure))
    };
    Figure::ALL
        .into_iter()
        .map(|figure| (figure, summary(figure)))
        .collect()
}

/// What an undefined value of a figure means in statistics.
fn undefined(figure: Figure) -> Undefined {
    match figure {
        Figure::Encircled50Diameter | Figure::Encircled80Diameter | Figure::Encircled86Diameter => {
            Undefined::Largest
        }
        _ => Undefined::LeftOut,
    }
}

/// Compute again, in full, the trial whose Strehl ratio (or else aim irradiance) is nearest the median.
fn shown_trial(setup: &Setup, trials: &Trials, far_field: &dyn FarField) -> Shown {
    let key = |index: usize| {
        let figures = &trials.trials[index].figures;
        figures
            .get(Figure::Strehl)
            .or(figures.get(Figure::AimIrradiance))
            .unwrap_or(0.0)
    };
    let mut ascending: Vec<f64> = (0..trials.trials.len()).map(key).collect();
    ascending.sort_by(f64::total_cmp);
    let median = quantile(&ascending, 0.5).unwrap_or(0.0);
    let distance = |index: usize| (key(index) - median).abs();
    let nearest = (0..trials.trials.len())
        .map(distance)
        .fold(f64::INFINITY, f64::min);
    // The two middle ones of an even number tie but for rounding: the earlier is shown.
    let tie = 1e-6 * median.abs();
    let index = (0..trials.trials.len())
        .find(|&index| distance(index) <= nearest + tie)
        .unwrap_or(0);
    let trial = trials.trials[index].trial;
    let errors = &setup.scenario.errors;
    let mut map = Map::dark(setup.grid);
    let seed = setup.scenario.run.seed;
    far_field.worker().irradiance(
        TrialErrors {
            errors,
            seed,
            trial,
        },
        &mut map,
    );
    Shown {
        trial,
        map,
        figures: trials.trials[index].figures,
    }
}

/// The closed form with all errors, and with each source alone.
fn predictions(setup: &Setup) -> (Predicted, Vec<Alone>) {
    let errors = &setup.scenario.errors;
    let figures_with = |errors: &Errors| {
        let moments = Moments::of(errors);
        mean_map(&setup.array, errors, setup.grid).map_or_else(
            |_| Figures::default(),
            |map| {
                let power_w = setup.array.power_w() * moments.mean_square;
                setup
                    .reader
                    .read(&map, power_w, &mut setup.reader.workspace())
                    .figures
            },
        )
    };
    let alone = each_alone(errors)
        .into_iter()
        .map(|(source, errors)| Alone {
            source,
            figures: figures_with(&errors),
        })
        .collect();
    let predicted = Predicted {
        figures: figures_with(errors),
        strehl_std: crate::farfield::closed_form::strehl_std(&setup.array, errors),
    };
    (predicted, alone)
}

/// For each source that is not zero, the errors with that source alone.
fn each_alone(errors: &Errors) -> Vec<(&'static str, Errors)> {
    let none = Errors {
        dropped: errors.dropped,
        ..Errors::none()
    };
    let mut alone = Vec::new();
    let mut with = |source, present: bool, errors: Errors| {
        if present {
            alone.push((source, errors));
        }
    };
    let (piston, jitter, common) = (
        &errors.piston_rad,
        &errors.jitter_rad,
        &errors.common_jitter_rad,
    );
    with(
        "piston",
        piston.rms() > 0.0,
        Errors {
            piston_rad: piston.clone(),
            ..none.clone()
        },
    );
    with(
        "jitter",
        jitter.rms() > 0.0,
        Errors {
            jitter_rad: jitter.clone(),
            ..none.clone()
        },
    );
    with(
        "common_jitter",
        common.rms() > 0.0,
        Errors {
            common_jitter_rad: common.clone(),
            ..none.clone()
        },
    );
    with(
        "dropout",
        errors.dropout > 0.0,
        Errors {
            dropout: errors.dropout,
            ..none.clone()
        },
    );
    with(
        "power_spread",
        errors.power_spread > 0.0,
        Errors {
            power_spread: errors.power_spread,
            ..none.clone()
        },
    );
    alone
}

/// Encircled energy: ideal, long exposure, and percentiles over the trials.
fn band(setup: &Setup, trials: &Trials, long_exposure: &Reading) -> EncircledBand {
    let radius_m = setup.reader.radius_m().to_vec();
    let mut percentiles = [Vec::new(), Vec::new(), Vec::new()];
    let mut shares = vec![0.0; trials.trials.len()];
    for radius in 0..radius_m.len() {
        for (share, trial) in shares.iter_mut().zip(&trials.trials) {
            *share = f64::from(trial.encircled[radius]);
        }
        shares.sort_by(f64::total_cmp);
        for (values, at) in percentiles.iter_mut().zip([0.05, 0.50, 0.95]) {
            values.push(quantile(&shares, at).unwrap_or(f64::NAN));
        }
    }
    let [p05, p50, p95] = percentiles;
    EncircledBand {
        radius_m,
        ideal: setup.ideal.encircled.clone(),
        long_exposure: long_exposure.encircled.clone(),
        p05,
        p50,
        p95,
    }
}
