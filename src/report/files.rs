//! The files of a result folder, but for `summary.json`, which knows the time they took.

use super::picture::{AperturePicture, EncircledPicture, HistogramPicture, MapPicture};
use super::tables;
use super::units::significant;
use crate::farfield::Map;
use crate::figures::Figures;
use crate::perturb::{TrialErrors, for_each_element};
use crate::scenario::Figure;
use crate::study::assess::{Outcome, Shown};
use rayon::prelude::*;

/// A file to be written: its name and its bytes.
pub type File = (String, Vec<u8>);

/// Names of all results: no table copied beside them may bear one.
pub const NAMES: [&str; 12] = [
    "summary.json",
    "scenario.toml",
    "trials.csv",
    "encircled.csv",
    "lobes.csv",
    "maps.npz",
    "map_ideal.png",
    "map_one_trial.png",
    "map_long_exposure.png",
    "aperture.png",
    "encircled.png",
    "strehl.png",
];

/// Draws one picture of an outcome, where it has what the picture shows.
type Painter = fn(&Outcome) -> Option<Vec<u8>>;

/// The scenario as run, the tables and the maps of an `assess`.
///
/// # Errors
/// None in practice: everything is rendered in memory.
pub fn tables(outcome: &Outcome) -> Result<Vec<File>, ndarray_npy::WriteNpzError> {
    Ok([
        (
            "scenario.toml",
            outcome.setup.scenario.to_toml().into_bytes(),
        ),
        ("trials.csv", tables::trials(outcome)),
        ("encircled.csv", tables::encircled(outcome)),
        ("lobes.csv", tables::lobes(outcome)),
        ("maps.npz", tables::maps(outcome)?),
    ]
    .map(|(name, bytes)| (name.to_string(), bytes))
    .into())
}

/// The pictures of an `assess`, drawn in parallel; in closed form those that need no trial.
pub fn pictures(outcome: &Outcome) -> Vec<File> {
    let painters: [(&str, Painter); 6] = [
        ("map_ideal.png", |outcome| {
            let setup = &outcome.setup;
            let figures = &setup.ideal.figures;
            Some(map(outcome, "without errors", &setup.ideal_map, figures))
        }),
        ("map_one_trial.png", |outcome| {
            let shown = outcome.shown.as_ref()?;
            Some(map(outcome, &caption(shown), &shown.map, &shown.figures))
        }),
        ("map_long_exposure.png", |outcome| {
            let what = format!("long exposure: {}", averaged(outcome));
            let figures = &outcome.long_exposure.figures;
            Some(map(outcome, &what, &outcome.trials.mean_map, figures))
        }),
        ("aperture.png", aperture),
        ("encircled.png", encircled),
        ("strehl.png", histogram),
    ];
    painters
        .par_iter()
        .filter_map(|(name, draw)| Some((name.to_string(), draw(outcome)?)))
        .collect()
}

/// What the long exposure is a mean of.
fn averaged(outcome: &Outcome) -> String {
    if outcome.setup.closed_form.is_some() {
        "mean in closed form".to_string()
    } else {
        format!("mean of {} trials", outcome.trials.trials.len())
    }
}

fn caption(shown: &Shown) -> String {
    let strehl = match shown.figures.get(Figure::Strehl) {
        Some(strehl) => format!(
            ", Strehl ratio {} (nearest the median)",
            significant(strehl, 3)
        ),
        None => String::new(),
    };
    format!("one trial, no. {}{strehl}", shown.trial)
}

fn map(outcome: &Outcome, what: &str, map: &Map, figures: &Figures) -> Vec<u8> {
    MapPicture {
        title: &outcome.setup.scenario.title,
        what,
        map,
        peak_irradiance_w_m2: figures.get(Figure::PeakIrradiance),
        range_m: outcome.setup.array.range_m,
        bucket_diameter_m: outcome.setup.scenario.target.bucket_diameter_m,
        encircled_80_diameter_m: figures.get(Figure::Encircled80Diameter),
        spot_m: outcome.setup.array.spot_m(),
    }
    .png()
}

fn aperture(outcome: &Outcome) -> Option<Vec<u8>> {
    let shown = outcome.shown.as_ref()?;
    let setup = &outcome.setup;
    let trial = TrialErrors {
        errors: &setup.scenario.errors,
        seed: setup.scenario.run.seed,
        trial: shown.trial,
    };
    let picture = AperturePicture {
        title: &setup.scenario.title,
        what: &caption(shown),
        element: setup.array.element,
        envelope_diameter_m: setup.array.envelope_diameter_m,
        elements: &|visit| for_each_element(&setup.array, trial, visit),
        wavelength_m: setup.array.wavelength_m,
    };
    Some(picture.png())
}

fn encircled(outcome: &Outcome) -> Option<Vec<u8>> {
    let band = &outcome.encircled;
    let half = |diameter: Option<f64>| diameter.map(|diameter| diameter / 2.0);
    let picture = EncircledPicture {
        title: &outcome.setup.scenario.title,
        what: &format!(
            "power within a circle, long exposure a {}",
            averaged(outcome)
        ),
        radius_m: &band.radius_m,
        ideal: &band.ideal,
        long_exposure: &band.long_exposure,
        p05: &band.p05,
        p95: &band.p95,
        bucket_radius_m: half(outcome.setup.scenario.target.bucket_diameter_m),
        encircled_80_radius_m: half(
            outcome
                .long_exposure
                .figures
                .get(Figure::Encircled80Diameter),
        ),
    };
    Some(picture.png())
}

fn histogram(outcome: &Outcome) -> Option<Vec<u8>> {
    outcome.shown.as_ref()?;
    let trials = &outcome.trials.trials;
    let values: Vec<f64> = trials
        .iter()
        .map(|trial| trial.figures.get(Figure::Strehl).unwrap_or(f64::NAN))
        .collect();
    let picture = HistogramPicture {
        title: &outcome.setup.scenario.title,
        values: &values,
        mean: outcome.statistics[Figure::Strehl as usize].1.mean,
        bounds: &outcome.setup.scenario.require.bounds,
        predicted_mean: outcome.predicted.figures.get(Figure::Strehl),
    };
    Some(picture.png())
}
