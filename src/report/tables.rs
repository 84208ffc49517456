//! `trials.csv`, `encircled.csv`, `lobes.csv` and `maps.npz`.

use crate::farfield::Map;
use crate::scenario::Figure;
use crate::study::assess::Outcome;
use ndarray::{Array1, Array2};
use ndarray_npy::{NpzWriter, WriteNpzError};
use std::io::Cursor;

/// Rows of numbers under a header, an undefined one as an empty field.
fn csv(header: &[String], rows: impl Iterator<Item = Vec<Option<f64>>>) -> Vec<u8> {
    let mut text = header.join(",") + "\n";
    for row in rows {
        let fields: Vec<String> = row
            .into_iter()
            .map(|value| value.map_or(String::new(), |value| value.to_string()))
            .collect();
        text += &(fields.join(",") + "\n");
    }
    text.into_bytes()
}

/// `trials.csv`: a row a trial.
pub fn trials(outcome: &Outcome) -> Vec<u8> {
    let mut header = vec![
        "trial".to_string(),
        "dark".to_string(),
        "unlocked".to_string(),
    ];
    header.extend(Figure::ALL.iter().map(|figure| figure.key()));
    csv(
        &header,
        outcome.trials.trials.iter().map(|trial| {
            let counts = [trial.trial as f64, trial.dark as f64, trial.unlocked as f64];
            counts
                .into_iter()
                .map(Some)
                .chain(Figure::ALL.map(|figure| trial.figures.get(figure)))
                .collect()
        }),
    )
}

/// `encircled.csv`: shares of P within a radius.
pub fn encircled(outcome: &Outcome) -> Vec<u8> {
    let band = &outcome.encircled;
    let header = ["radius_m", "ideal", "long_exposure", "p05", "p50", "p95"].map(String::from);
    let columns = [
        &band.radius_m,
        &band.ideal,
        &band.long_exposure,
        &band.p05,
        &band.p50,
        &band.p95,
    ];
    csv(
        &header,
        (0..band.radius_m.len()).map(|row| {
            let defined = |column: &&Vec<f64>| Some(column[row]).filter(|share| share.is_finite());
            columns.iter().map(defined).collect()
        }),
    )
}

/// `lobes.csv`: the brightest lobes of the array without errors.
pub fn lobes(outcome: &Outcome) -> Vec<u8> {
    let range_m = outcome.setup.array.range_m;
    let header = [
        "theta_x_rad",
        "theta_y_rad",
        "u_m",
        "v_m",
        "irradiance_over_peak",
    ];
    csv(
        &header.map(String::from),
        outcome.lobes.iter().map(|lobe| {
            vec![
                Some(lobe.theta_x_rad),
                Some(lobe.theta_y_rad),
                Some(lobe.theta_x_rad * range_m),
                Some(lobe.theta_y_rad * range_m),
                Some(lobe.irradiance_over_peak),
            ]
        }),
    )
}

/// `maps.npz`: irradiance `[v, u]` in W/m², and the pixel centres.
///
/// # Errors
/// None in practice: the archive is written to memory.
pub fn maps(outcome: &Outcome) -> Result<Vec<u8>, WriteNpzError> {
    let mut archive = NpzWriter::new(Cursor::new(Vec::new()));
    let mut add = |name: &str, map: &Map| {
        let pixels = map.grid.pixels;
        let values = Array2::from_shape_vec((pixels, pixels), map.irradiance_w_m2.clone())
            .unwrap_or_default();
        archive.add_array(name, &values)
    };
    add("ideal", &outcome.setup.ideal_map)?;
    add("long_exposure", &outcome.trials.mean_map)?;
    if let Some(shown) = &outcome.shown {
        add("one_trial", &shown.map)?;
    }
    let axis = Array1::from_vec(outcome.setup.grid.axis_m());
    archive.add_array("u_m", &axis)?;
    archive.add_array("v_m", &axis)?;
    Ok(archive.finish()?.into_inner())
}
