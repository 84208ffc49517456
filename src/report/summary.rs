//! `summary.json`: every number of a study, keys with their SI unit.

use crate::figures::Figures;
use crate::scenario::{Figure, Statistic};
use crate::study::assess::Outcome;
use crate::study::setup::Setup;
use serde_json::{Map, Value, json};
use sha2::{Digest, Sha256};

/// How a run came about, which the library cannot know by itself.
#[derive(Debug, Clone, Default)]
pub struct RunInfo {
    /// The command with what changes its numbers: scenario, `--set`, `--seed`, `--trials`.
    pub command_line: String,
    /// Seconds by stage, and threads: the only part that may differ between two runs.
    pub timing: Vec<(String, f64)>,
}

/// The summary of an `assess`.
pub fn of_assess(outcome: &Outcome, run: &RunInfo) -> Value {
    let setup = &outcome.setup;
    let mut statistics = Map::new();
    for (figure, summary) in &outcome.statistics {
        statistics.insert(figure.key(), json!(summary));
    }
    let predicted = &outcome.predicted;
    let mut alone = Map::new();
    for each in &outcome.alone {
        alone.insert(each.source.to_string(), figures(&each.figures));
    }
    json!({
        "facula": env!("CARGO_PKG_VERSION"),
        "command": "assess",
        "command_line": run.command_line,
        "title": setup.scenario.title,
        "scenario": {
            "file": setup.scenario.source.file,
            "sha256": sha256(&setup.scenario.source.text),
        },
        "seed": setup.scenario.run.seed,
        "trials": outcome.trials.trials.len(),
        "method": setup.method(),
        "array": array(setup),
        "ideal": figures(&setup.ideal.figures),
        "mean_of_trials": statistics,
        "long_exposure": figures(&outcome.long_exposure.figures),
        "predicted": {
            "strehl": predicted.figures.get(Figure::Strehl),
            "strehl_std": predicted.strehl_std,
            "aim_irradiance_w_m2": predicted.figures.get(Figure::AimIrradiance),
            "bucket_fraction": predicted.figures.get(Figure::BucketFraction),
            "encircled_80_diameter_m": predicted.figures.get(Figure::Encircled80Diameter),
        },
        "predicted_alone": alone,
        "requirement": requirement(outcome),
        "shown_trial": outcome.shown.as_ref().map(|shown| shown.trial),
        "window": {
            "width_m": setup.grid.width_m(),
            "pixels": setup.grid.pixels,
            "pixel_m": setup.grid.pixel_m,
        },
        "notes": outcome.notes,
        "timing": run.timing.iter().map(|(key, value)| (key.clone(), json!(value))).collect::<Map<_, _>>(),
    })
}

/// What follows from a scenario without any trial.
pub fn array(setup: &Setup) -> Value {
    let array = &setup.array;
    json!({
        "elements": array.len(),
        "envelope_diameter_m": array.envelope_diameter_m,
        "emitting_area_m2": array.emitting_area_m2(),
        "fill_factor": array.fill_factor(),
        "cell_fill_factor": array.cell_fill_factor(),
        "aperture_efficiency": setup.aperture_efficiency(),
        "clipping_loss": crate::farfield::pattern::clipping_loss(&array.element),
        "diffraction_spot_m": array.spot_m(),
        "grating_lobe_spacing_rad": array.grating_lobe_spacing_rad(),
    })
}

fn figures(figures: &Figures) -> Value {
    Figure::ALL
        .into_iter()
        .map(|figure| (figure.key(), json!(figures.get(figure))))
        .collect::<Map<_, _>>()
        .into()
}

fn requirement(outcome: &Outcome) -> Value {
    let require = &outcome.setup.scenario.require;
    let verdict = &outcome.verdict;
    let bounds: Vec<Value> = verdict
        .bounds
        .iter()
        .map(|each| {
            json!({
                "figure": each.bound.figure.key(),
                "bound": bound_text(each.bound.comparison, each.bound.value),
                "value": each.bound.value,
                "met_share": each.met_share,
                "judged": each.judged,
                "met": each.met,
            })
        })
        .collect();
    json!({
        "statistic": match require.statistic {
            Statistic::Trials => "trials",
            Statistic::Mean => "mean",
            Statistic::LongExposure => "long_exposure",
        },
        "met_share": verdict.met_share,
        "low": verdict.interval.map(|interval| interval.0),
        "high": verdict.interval.map(|interval| interval.1),
        "confidence": require.confidence,
        "met": verdict.met,
        "bounds": bounds,
    })
}

fn bound_text(comparison: crate::scenario::Comparison, value: f64) -> String {
    use crate::scenario::names::Named;
    format!("{} {value}", comparison.name())
}

/// SHA-256 of a text, in hexadecimal.
fn sha256(text: &str) -> String {
    Sha256::digest(text.as_bytes())
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}
