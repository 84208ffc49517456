//! What a reader must know to read the figures rightly.

use super::assess::Outcome;
use crate::scenario::{Figure, MethodChoice};

/// The phase left out by the Fresnel integral above which a note warns, in radians.
pub const PARAXIAL_LIMIT_RAD: f64 = 0.1;

/// Why an array whose elements are all out has no such figure.
const NO_LIGHT: &str = "there is no light";

/// The notes of an outcome, most important first.
pub fn of(outcome: &Outcome) -> Vec<String> {
    let setup = &outcome.setup;
    let mut notes = Vec::new();
    let left_out = setup.array.paraxial_phase_rad();
    if left_out > PARAXIAL_LIMIT_RAD {
        notes.push(format!(
            "The target is close for an aperture of this size: the small-angle (Fresnel) integral leaves out up to {left_out:.2} rad of phase at the aperture's edge, so read the figures as approximate."
        ));
    }
    if setup
        .reader
        .reference()
        .is_some_and(|reference| reference.aim_w_m2.is_none())
    {
        notes.push(
            "Strehl ratios are undefined: without errors the aim point receives less than 1e-9 of P × emitting area / (wavelength × range)²."
                .to_string(),
        );
    }
    for figure in Figure::ALL {
        if let Some(note) = undefined_note(outcome, figure) {
            notes.push(note);
        }
    }
    match setup.scenario.target.bucket_diameter_m {
        None => notes.push(
            "No bucket is stated (target.bucket_diameter), so bucket power, bucket fraction and beam quality are undefined."
                .to_string(),
        ),
        Some(_) if setup.ideal.figures.get(Figure::BucketPower).is_none() => notes.push(
            "The bucket is larger than the window (run.window), so bucket power, bucket fraction and beam quality are undefined."
                .to_string(),
        ),
        Some(_) => {}
    }
    if setup.closed_form.is_some() {
        notes.push(
            "Means in closed form: no trial was run. The long exposure is the mean map; means over trials are known for Strehl ratio, aim irradiance, radiated and bucket power, spreads and percentiles for none."
                .to_string(),
        );
    }
    if setup.scenario.run.method == MethodChoice::Auto {
        notes.push(format!(
            "Method \"{}\" was chosen automatically.",
            setup.method()
        ));
    }
    notes
}

/// Why a figure is undefined, ideally or in some trials; the bucket has a note of its own.
fn undefined_note(outcome: &Outcome, figure: Figure) -> Option<String> {
    let reason = match figure {
        Figure::Encircled50Diameter | Figure::Encircled80Diameter | Figure::Encircled86Diameter => {
            "the circle is larger than the window"
        }
        Figure::Fwhm | Figure::FwhmX | Figure::FwhmY => {
            "the region above half of the peak reaches the window's edge"
        }
        Figure::SecondMomentX | Figure::SecondMomentY => {
            "the square of three widths (ISO 11146-1) reaches the window's edge"
        }
        Figure::SideLobeRatio => "no second maximum lies inside the window",
        Figure::Offset | Figure::CombiningEfficiency | Figure::WindowFraction => NO_LIGHT,
        _ => return None,
    };
    let trials = outcome.trials.trials.len();
    // Strehl ratios that are undefined for want of a reference have their own note.
    if figure == Figure::CombiningEfficiency && outcome.setup.ideal.figures.get(figure).is_none() {
        return None;
    }
    let dark = outcome
        .trials
        .trials
        .iter()
        .filter(|trial| trial.figures.get(Figure::WindowFraction).is_none())
        .count();
    let missing = trials - outcome.statistics[figure as usize].1.count;
    let ideal = outcome.setup.ideal.figures.get(figure).is_none();
    let long = outcome.long_exposure.figures.get(figure).is_none();
    let reason = match dark {
        0 => reason.to_string(),
        _ if reason == NO_LIGHT || missing == dark && !ideal => NO_LIGHT.to_string(),
        _ => format!("{reason}, or {NO_LIGHT}"),
    };
    let mut cases = Vec::new();
    if ideal {
        cases.push("without errors".to_string());
    }
    if missing > 0 {
        cases.push(format!("in {missing} of {trials} trials"));
    }
    if long {
        cases.push("in the long exposure".to_string());
    }
    (!cases.is_empty()).then(|| {
        format!(
            "{} is undefined {}: {reason}.",
            figure.key(),
            cases.join(", ")
        )
    })
}
