//! What `check` prints: what follows from a scenario, and what a run will take.

use super::console::{one_line, per_cent, spoken_bound, wrap};
use super::units::{readable, significant};
use crate::farfield::pattern::clipping_loss;
use crate::quantity::Kind;
use crate::scenario::Figure;
use crate::scenario::names::Named;
use crate::study::notes::PARAXIAL_LIMIT_RAD;
use crate::study::requirement::meets;
use crate::study::setup::Setup;
use serde_json::{Value, json};

/// Seconds of one core that the pictures and tables of a study take on the reference machine.
const PICTURES_S: f64 = 0.2;

/// Seconds that `assess` will take on `threads` threads of a machine of this `pace`.
fn run_s(setup: &Setup, threads: usize, pace: f64) -> f64 {
    let trial_s = setup.choice.trial_s + setup.reading_s();
    let trials = trials(setup) * trial_s / setup.workers(threads) as f64;
    // The picture of the aperture draws every element a few times over.
    let pictures_s = PICTURES_S + 60e-9 * setup.array.len() as f64;
    let pictures_s = if setup.closed_form.is_some() {
        PICTURES_S
    } else {
        pictures_s
    };
    let afterwards = (setup.predictions_s() + pictures_s) / threads as f64;
    pace * (setup.choice.setup_s + trials + afterwards)
}

/// Trials that will run.
fn trials(setup: &Setup) -> f64 {
    match setup.closed_form {
        Some(_) => 0.0,
        None => setup.scenario.run.trials as f64,
    }
}

/// Bytes that `assess` will hold at its peak.
fn run_bytes(setup: &Setup, threads: usize) -> f64 {
    let workers = setup.workers(threads) as f64;
    // A trial keeps its figures and its encircled curve.
    let kept = trials(setup) * 1100.0;
    27e6 + setup.choice.shared_bytes + workers * setup.trial_bytes() + kept
}

/// The same as data.
pub fn run_facts(setup: &Setup, threads: usize, pace: f64) -> Value {
    json!({
        "method": setup.method(),
        "trials": trials(setup),
        "threads": threads,
        "window_m": setup.grid.width_m(),
        "pixels": setup.grid.pixels,
        "pixel_m": setup.grid.pixel_m,
        "paraxial_phase_rad": setup.array.paraxial_phase_rad(),
        "foreseen_s": run_s(setup, threads, pace),
        "foreseen_bytes": run_bytes(setup, threads),
    })
}

/// Everything that `check` prints.
pub fn describe(setup: &Setup, threads: usize, pace: f64) -> String {
    let (array, scenario) = (&setup.array, &setup.scenario);
    let length = |value: f64| readable(value, Kind::Length, 4);
    let mut lines = vec![one_line(&scenario.title), String::new()];
    let mut fact = |name: &str, text: String| lines.push(format!("{name:<22} {text}"));
    fact(
        "elements",
        format!(
            "{}, {} of {}",
            array.len(),
            array.element.shape.name(),
            length(array.element.size_m)
        ),
    );
    fact("envelope diameter D", length(array.envelope_diameter_m));
    let cells = array.cell_fill_factor().map_or(String::new(), |fill| {
        format!(" ({} of a lattice cell)", significant(fill, 4))
    });
    fact(
        "fill factor",
        format!(
            "{} of the circle D{cells}",
            significant(array.fill_factor(), 4)
        ),
    );
    fact(
        "aperture efficiency",
        significant(setup.aperture_efficiency(), 4),
    );
    fact("clipping loss", per_cent(clipping_loss(&array.element)));
    fact("diffraction spot λL/D", length(array.spot_m()));
    let lobes = array.grating_lobe_spacing_rad().map_or(
        "none: the layout has no lattice".to_string(),
        |spacing| {
            format!(
                "{} apart, {} at the target",
                readable(spacing, Kind::Angle, 4),
                length(spacing * array.range_m)
            )
        },
    );
    fact("grating lobes", lobes);
    let left_out = array.paraxial_phase_rad();
    let verdict = if left_out <= PARAXIAL_LIMIT_RAD {
        "small angles hold"
    } else {
        "WARNING: the target is close for this aperture; results are approximate"
    };
    fact(
        "paraxial check",
        format!(
            "{} rad left out at the edge: {verdict}",
            significant(left_out, 2)
        ),
    );
    let ideal = |figure: Figure| {
        setup
            .ideal
            .figures
            .get(figure)
            .map_or("undefined".to_string(), |value| {
                readable(value, figure.kind(), 4)
            })
    };
    fact(
        "without errors",
        format!(
            "peak {}, FWHM {}, 80 % circle {}",
            ideal(Figure::PeakIrradiance),
            ideal(Figure::Fwhm),
            ideal(Figure::Encircled80Diameter)
        ),
    );
    for bound in &scenario.require.bounds {
        let verdict = if meets(bound, setup.ideal.figures.get(bound.figure)) {
            "met"
        } else {
            "MISSED"
        };
        fact(
            "requirement",
            format!(
                "{}: {verdict} without errors ({})",
                spoken_bound(bound),
                ideal(bound.figure)
            ),
        );
    }
    fact(
        "map",
        format!(
            "{} wide, {1} × {1} pixels of {2}",
            length(setup.grid.width_m()),
            setup.grid.pixels,
            length(setup.grid.pixel_m)
        ),
    );
    fact(
        "method",
        match setup.closed_form {
            Some(_) => "closed_form: means only, no trials".to_string(),
            None => format!(
                "{}: {} ({})",
                setup.method(),
                setup.choice.description(),
                setup.choice.why
            ),
        },
    );
    fact(
        "assess will take",
        format!(
            "about {} for {} trials on {} threads, {:.0} MB of memory",
            duration(run_s(setup, threads, pace)),
            trials(setup),
            threads,
            (run_bytes(setup, threads) / 1e6).ceil()
        ),
    );
    lines
        .iter()
        .flat_map(|line| wrap(line))
        .map(|line| line + "\n")
        .collect()
}

/// A duration as people say it.
fn duration(seconds: f64) -> String {
    match seconds {
        s if s < 10.0 => format!("{} s", significant(s, 2)),
        s if s < 90.0 => format!("{s:.0} s"),
        s if s < 5400.0 => format!("{:.0} min", s / 60.0),
        s if s < 172_800.0 => format!("{:.1} h", s / 3600.0),
        s => format!("{:.0} days", s / 86_400.0),
    }
}
