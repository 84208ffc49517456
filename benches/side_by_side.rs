//! What `side_by_side.py` sets against general numerical libraries: times of whole
//! trials on one thread, and maps with the draws that they were computed from.
//!
//! With `--json` it prints one JSON object; without, as under a plain `cargo bench`, nothing.

mod common;

use common::{PIXELS, RANGE_M, SIZE_M, Trials, WAVELENGTH_M};
use facula::farfield::Map;
use facula::perturb::{Draw, TrialErrors};
use facula::scenario::{Errors, Figure};
use facula::study::setup::Setup;
use serde_json::{Value, json};
use std::time::Instant;

/// Timed trials of an array, after one that is not.
const REPEATS: usize = 9;

/// Seconds of whole trials, and of what comes before the first.
fn timed(side: usize, pixel_m: Option<f64>) -> Value {
    let start = Instant::now();
    let setup = common::square(side, common::ERRORS, pixel_m);
    let laid_out_s = start.elapsed().as_secs_f64();
    let mut map = Map::dark(setup.grid);
    let mut trial_s = Vec::new();
    let start = Instant::now();
    let mut prepared_s = 0.0;
    Trials::whole(&setup).run(|next| {
        prepared_s = start.elapsed().as_secs_f64();
        next(&mut map);
        for _ in 0..REPEATS {
            let start = Instant::now();
            next(&mut map);
            trial_s.push(start.elapsed().as_secs_f64());
        }
    });
    json!({
        "side": side,
        "elements": setup.array.len(),
        "pixel_m": setup.grid.pixel_m,
        "method": setup.choice.description(),
        "setup_s": laid_out_s + prepared_s,
        "trial_s": trial_s,
    })
}

/// The map of trial 0 with some errors, and the draw behind it where elements are few.
fn map_of(setup: &Setup, errors: &Errors) -> Value {
    let trial = TrialErrors {
        errors,
        seed: 1,
        trial: 0,
    };
    let mut map = Map::dark(setup.grid);
    let far_field = setup.choice.prepare(&setup.array);
    let radiated = far_field.worker().irradiance(trial, &mut map);
    let workspace = &mut setup.reader.workspace();
    let figures = setup.reader.read(&map, radiated.power_w, workspace).figures;
    let figures: serde_json::Map<String, Value> = [
        Figure::Strehl,
        Figure::PeakIrradiance,
        Figure::Encircled50Diameter,
        Figure::Encircled80Diameter,
        Figure::Encircled86Diameter,
    ]
    .into_iter()
    .map(|figure| (figure.name().to_string(), json!(figures.get(figure))))
    .collect();
    let draw = (setup.array.len() < 10_000).then(|| {
        let draw = Draw::of_trial(&setup.array, trial);
        json!({
            "phase_rad": draw.phase_rad,
            "tilt_x_rad": draw.tilt_x_rad,
            "tilt_y_rad": draw.tilt_y_rad,
            "amplitude": draw.amplitude,
        })
    });
    json!({
        "pixel_m": setup.grid.pixel_m,
        "element_power_w": setup.array.power_w() / setup.array.len() as f64,
        "irradiance_w_m2": map.irradiance_w_m2,
        "figures": figures,
        "draw": draw,
    })
}

fn main() {
    if !std::env::args().any(|argument| argument == "--json") {
        return;
    }
    common::one_thread();
    // Pixels as a transform of the aperture gives them that is padded to four times its side.
    let padded_m = |side: usize| WAVELENGTH_M * RANGE_M / (4.0 * side as f64 * SIZE_M);
    let small = common::square(64, common::ERRORS, Some(padded_m(64)));
    let pistons = common::square(64, "piston = \"50 nm\"", None);
    let still = common::square(1000, "", None);
    let growth = [100, 316, 1000, 2860].map(|side| timed(side, None));
    let report = json!({
        "wavelength_m": WAVELENGTH_M,
        "range_m": RANGE_M,
        "size_m": SIZE_M,
        "pixels": PIXELS,
        "growth": growth,
        "small": timed(64, Some(padded_m(64))),
        "maps": {
            "small": map_of(&small, &small.scenario.errors),
            "pistons": map_of(&pistons, &pistons.scenario.errors),
            "still": map_of(&still, &common::nothing_drawn()),
        },
    });
    println!("{report}");
}
