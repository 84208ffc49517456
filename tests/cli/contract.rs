//! Every key, column and array that the results promise, with its type.

use super::run::{Desk, names};
use ndarray::{Array1, Array2};
use ndarray_npy::NpzReader;
use serde_json::Value;
use std::io::Cursor;

/// Figures of merit, in the order of every table.
const FIGURES: [&str; 20] = [
    "strehl",
    "strehl_peak",
    "aim_irradiance_w_m2",
    "peak_irradiance_w_m2",
    "offset_m",
    "radiated_power_w",
    "bucket_power_w",
    "bucket_fraction",
    "encircled_50_diameter_m",
    "encircled_80_diameter_m",
    "encircled_86_diameter_m",
    "fwhm_m",
    "fwhm_x_m",
    "fwhm_y_m",
    "second_moment_x_m",
    "second_moment_y_m",
    "side_lobe_ratio",
    "combining_efficiency",
    "beam_quality",
    "window_fraction",
];

/// Keys outside the tables of figures, and what stands there; `?` allows null.
const KEYS: &str = "
facula text
command text
title text
scenario.file text
scenario.sha256 text
seed count
trials count
method text
array.elements count
array.envelope_diameter_m number
array.emitting_area_m2 number
array.fill_factor number
array.cell_fill_factor number?
array.aperture_efficiency number
array.clipping_loss number
array.diffraction_spot_m number
array.grating_lobe_spacing_rad number?
predicted.strehl number?
predicted.aim_irradiance_w_m2 number
predicted.bucket_fraction number?
predicted.encircled_80_diameter_m number?
predicted.strehl_std number?
requirement.statistic text
requirement.met_share number?
requirement.low number?
requirement.high number?
requirement.confidence number
requirement.met flag?
requirement.bounds list
window.width_m number
window.pixels count
window.pixel_m number
notes list
timing object
";

#[track_caller]
fn at<'a>(json: &'a Value, path: &str) -> &'a Value {
    path.split('.').fold(json, |value, key| {
        value.get(key).unwrap_or_else(|| panic!("no {path}"))
    })
}

#[track_caller]
fn expect(json: &Value, path: &str, kind: &str) {
    let value = at(json, path);
    let (kind, nullable) = match kind.strip_suffix('?') {
        Some(kind) => (kind, true),
        None => (kind, false),
    };
    let right = match kind {
        "text" => value.is_string(),
        "count" => value.is_u64(),
        "number" => value.is_number(),
        "flag" => value.is_boolean(),
        "list" => value.is_array(),
        "object" => value.is_object(),
        other => panic!("no kind {other}"),
    };
    assert!(right || nullable && value.is_null(), "{path}: {value}");
}

#[track_caller]
fn keeps_the_contract(summary: &Value) {
    for line in KEYS.lines().filter(|line| !line.is_empty()) {
        let (path, kind) = line.split_once(' ').expect("path and kind");
        expect(summary, path, kind);
    }
    for figure in FIGURES {
        for group in ["ideal", "long_exposure"] {
            expect(summary, &format!("{group}.{figure}"), "number?");
        }
        for statistic in [
            "mean",
            "std",
            "standard_error",
            "p05",
            "p50",
            "p95",
            "min",
            "max",
        ] {
            let path = format!("mean_of_trials.{figure}.{statistic}");
            expect(summary, &path, "number?");
        }
        expect(summary, &format!("mean_of_trials.{figure}.count"), "count");
    }
    for bound in at(summary, "requirement.bounds")
        .as_array()
        .expect("a list")
    {
        expect(bound, "figure", "text");
        expect(bound, "bound", "text");
        expect(bound, "met_share", "number");
    }
    for note in summary["notes"].as_array().expect("a list") {
        assert!(note.is_string(), "{note}");
    }
}

#[test]
fn the_summary_has_every_key_of_the_contract_with_its_type() {
    let desk = Desk::new();
    let title = "title=A \"quoted\" title\nof two lines, ψ";
    for words in [
        &[][..],
        &["--set", "require.statistic=mean"],
        &["--set", "require.statistic=long_exposure"],
        &["--trials", "1"],
        &["--set", "errors.dropout=1"],
        &["--set", "array.rows=1", "--set", "array.columns=1"],
        &[
            "--set",
            "errors.jitter=10 urad",
            "--set",
            "errors.common_jitter=5 urad",
        ],
        &["--set", title],
    ] {
        let words = [&["assess", "small.toml", "--json"], words].concat();
        let out = desk.good(&words).out;
        let summary: Value = serde_json::from_str(&out).expect("JSON");
        keeps_the_contract(&summary);
    }
}

#[test]
fn a_run_without_bounds_has_a_null_verdict() {
    let desk = Desk::new();
    let text = desk.text("small.toml").replace("strehl = \">= 0.2\"\n", "");
    desk.put("free.toml", &text);
    desk.good(&["assess", "free.toml", "--out", "o"]);
    let summary = desk.json("o/summary.json");
    keeps_the_contract(&summary);
    assert!(summary["requirement"]["met"].is_null());
    assert!(summary["requirement"]["met_share"].is_null());
}

/// Header and rows of a CSV file.
fn table(bytes: &[u8]) -> (Vec<String>, Vec<Vec<String>>) {
    let mut reader = csv::Reader::from_reader(bytes);
    let cells = |record: &csv::StringRecord| record.iter().map(String::from).collect();
    let header = cells(reader.headers().expect("a header"));
    let rows = reader.records().map(|row| cells(&row.expect("a row")));
    (header, rows.collect())
}

#[test]
fn the_tables_have_their_columns_and_rows() {
    let desk = Desk::new();
    desk.good(&["assess", "small.toml", "--out", "o"]);
    let summary = desk.json("o/summary.json");
    let (header, rows) = table(&desk.read("o/trials.csv"));
    let counts = ["trial", "dark", "unlocked"];
    assert_eq!(header, [&counts[..], &FIGURES].concat());
    assert_eq!(rows.len(), 12);
    for (number, row) in rows.iter().enumerate() {
        assert_eq!(row[0], number.to_string());
        for cell in row {
            assert!(
                cell.is_empty() || cell.parse().is_ok_and(f64::is_finite),
                "{cell}"
            );
        }
    }
    for (column, figure) in FIGURES.iter().enumerate() {
        let defined = rows.iter().filter(|row| !row[column + 3].is_empty());
        let count = &summary["mean_of_trials"][figure]["count"];
        assert_eq!(*count, defined.count(), "{figure}");
    }
    let (header, rows) = table(&desk.read("o/encircled.csv"));
    let columns = ["radius_m", "ideal", "long_exposure", "p05", "p50", "p95"];
    assert_eq!(header, columns);
    assert!(rows.len() > 10);
    let values = |column: usize| -> Vec<f64> {
        rows.iter()
            .map(|row| row[column].parse().expect("a number"))
            .collect()
    };
    assert!(values(0).is_sorted());
    assert!(values(0)[0].abs() < 1e-12);
    for (column, name) in columns.iter().enumerate().skip(1) {
        let within = |share: &f64| (-1e-9..=1.0 + 1e-6).contains(share);
        assert!(values(column).iter().all(within), "{name}");
    }
    let (header, rows) = table(&desk.read("o/lobes.csv"));
    let columns = [
        "theta_x_rad",
        "theta_y_rad",
        "u_m",
        "v_m",
        "irradiance_over_peak",
    ];
    assert_eq!(header, columns);
    assert!((1..=20).contains(&rows.len()), "{}", rows.len());
    assert_eq!(rows[0][4], "1");
}

/// A named array of an archive.
macro_rules! array {
    ($npz:expr, $name:literal, $type:ty) => {{
        let array: $type = $npz.by_name($name).expect($name);
        array
    }};
}

#[test]
fn maps_are_rows_of_v_and_columns_of_u_both_ascending() {
    let desk = Desk::new();
    // One element, tilted by two pixels along u and by minus one along v.
    let pixel_rad = 1e-6 / (2f64.sqrt() * 1e-2) / 4.0;
    let (tilt_x, tilt_y) = (2.0 * pixel_rad, -pixel_rad);
    let table = format!("x_m,y_m,tilt_x_rad,tilt_y_rad\n0,0,{tilt_x},{tilt_y}\n");
    desk.put("one.csv", &table);
    let text = super::run::on_table("one.csv").replace("strehl = \">= 0.2\"\n", "");
    desk.put("one.toml", &text.replace("dropout = 0.1", ""));
    desk.good(&["assess", "one.toml", "--out", "o"]);
    let mut npz = NpzReader::new(Cursor::new(desk.read("o/maps.npz"))).expect("an archive");
    let pixels = desk.json("o/summary.json")["window"]["pixels"]
        .as_u64()
        .expect("a count") as usize;
    let u_m = array!(npz, "u_m", Array1<f64>);
    let v_m = array!(npz, "v_m", Array1<f64>);
    for axis_m in [&u_m, &v_m] {
        assert_eq!(axis_m.len(), pixels);
        assert!(axis_m.as_slice().expect("a row").is_sorted());
        assert!(axis_m[pixels / 2].abs() < 1e-12);
    }
    let maps = [
        array!(npz, "ideal", Array2<f64>),
        array!(npz, "long_exposure", Array2<f64>),
        array!(npz, "one_trial", Array2<f64>),
    ];
    for map in maps {
        assert_eq!(map.dim(), (pixels, pixels));
        let ((row, column), _) = map
            .indexed_iter()
            .max_by(|a, b| a.1.total_cmp(b.1))
            .expect("pixels");
        assert_eq!(column, pixels / 2 + 2, "u ascends with the column");
        assert_eq!(row, pixels / 2 - 1, "v ascends with the row");
    }
}

#[test]
fn all_pictures_decode() {
    let desk = Desk::new();
    desk.good(&["assess", "small.toml", "--out", "o"]);
    let pictures: Vec<String> = names(&desk.at("o"))
        .into_iter()
        .filter(|name| name.ends_with(".png"))
        .collect();
    let expected = [
        "aperture.png",
        "encircled.png",
        "map_ideal.png",
        "map_long_exposure.png",
        "map_one_trial.png",
        "strehl.png",
    ];
    assert_eq!(pictures, expected);
    for name in pictures {
        let picture = image::load_from_memory(&desk.read(&format!("o/{name}"))).expect(&name);
        assert!(picture.width() > 300 && picture.height() > 200, "{name}");
    }
}
