//! What a malformed scenario is answered with: line, key, and a way out.

use facula::error::Place;
use facula::scenario::{Override, Scenario};
use std::path::Path;

/// A good scenario; each case spoils one thing.
const BASE: &str = r#"title = "Relay"

[beam]
wavelength = "1064 nm"
power = "10 kW"

[array]
layout = "square"
rows = 4
columns = 4
pitch = "50 mm"

[array.element]
shape = "square"
size = "50 mm"

[target]
range = "20 km"
bucket_diameter = "1 m"

[errors]
piston = "40 nm"
dropout = 0.02

[require]
strehl = ">= 0.8"
confidence = 0.9

[run]
trials = 50
window = "auto"
samples_per_spot = 4
"#;

#[track_caller]
fn refuse(text: &str) -> facula::error::ScenarioError {
    match Scenario::from_toml(text, "relay.toml", Path::new(""), &[]) {
        Ok(_) => panic!("accepted:\n{text}"),
        Err(error) => error,
    }
}

/// Checks cases, one a line: text of `BASE` => its replacement, then the line
/// and key of the error and parts of its message, with `\n` for a line break.
#[track_caller]
fn check(cases: &str) {
    for case in cases.lines().filter(|case| !case.is_empty()) {
        let columns: Vec<String> = case
            .split(" | ")
            .map(|column| column.replace("\\n", "\n"))
            .collect();
        let [edit, line, key, fragments @ ..] = columns.as_slice() else {
            panic!("columns of {case}");
        };
        let (old, new) = edit.split_once(" => ").expect("an edit");
        assert!(BASE.contains(old), "the base has no {old:?}");
        let error = refuse(&BASE.replacen(old, new, 1));
        let message = error.to_string();
        let line = line.parse().expect("a line number");
        assert_eq!(error.place, Place::Line(line), "{case}: {message}");
        assert_eq!(error.key, *key, "{case}: {message}");
        assert_eq!(error.file, "relay.toml");
        for fragment in fragments {
            assert!(message.contains(fragment), "{case}: {message}");
        }
    }
}

#[test]
fn base_is_accepted() {
    let scenario = Scenario::from_toml(BASE, "relay.toml", Path::new(""), &[]);
    assert!(scenario.is_ok(), "{scenario:?}");
}

#[test]
fn names() {
    check(
        r##"
wavelength => wavelenght | 4 | beam.wavelenght | unknown key | [beam] takes wavelength, power | did you mean `wavelength`?
columns => cols | 10 | array.cols | unknown key | columns
[target] => [targets] | 17 | targets | unknown section | did you mean `target`?
[target] => [budget] | 17 | budget | unknown section
title = "Relay" => wavelength = "1064 nm" | 1 | wavelength | outside any section
piston => pistons | 22 | errors.pistons | did you mean `piston`?
strehl => strehl_ratio | 26 | require.strehl_ratio | unknown key | window_fraction | did you mean `strehl`?
strehl => fwhm_m | 26 | require.fwhm_m | did you mean `fwhm`?
strehl => peak_irradiance_w_m2 | 26 | require.peak_irradiance_w_m2 | did you mean `peak_irradiance`?
trials => trails | 30 | run.trails | did you mean `trials`?
"square"\nrows => "squares"\nrows | 8 | array.layout | found "squares", an unknown word | square, hexagonal, rings, table | did you mean `square`?
size = => diameter = | 15 | array.element.diameter | [array.element] takes shape, size
"##,
    );
}

#[test]
fn missing_keys() {
    check(
        r##"
wavelength = "1064 nm"\n =>  | 3 | beam.wavelength | missing | nm, um
layout = "square"\n =>  | 7 | array.layout | missing | hexagonal
columns = 4\n =>  | 7 | array.columns | missing | rows come with columns
rows = 4\ncolumns = 4\n =>  | 7 | array.rows | missing | outline and across
rows = 4\ncolumns = 4\n => outline = "circle"\n | 7 | array.across | missing | size of the outline
rows = 4\ncolumns = 4\n => across = "1 m"\n | 7 | array.outline | missing | circle
size = "50 mm"\n =>  | 13 | array.element.size | missing | a length
range = "20 km"\n =>  | 17 | target.range | missing | a length
layout = "square"\nrows = 4\ncolumns = 4\n => layout = "hexagonal"\n | 7 | array.rings | missing
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "rings"\nrings = [1, 6]\n | 7 | array.pitch | missing | spacing
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "table"\n | 7 | array.table | missing | CSV
size = "50 mm"\n => size = "50 mm"\nprofile = "gaussian"\n | 13 | array.element.beam_radius | missing
"##,
    );
    let error = refuse("[beam]\nwavelength = \"1 um\"\n");
    assert_eq!(
        (error.place, error.key.as_str()),
        (Place::File, "array.layout")
    );
}

#[test]
fn units() {
    check(
        r##"
"50 mm" => "3 furlongs" | 11 | array.pitch | relay.toml:11: array.pitch: found "3 furlongs", an unknown unit; a length needs one of nm, um, µm, mm, cm, m, km, Mm, Gm, au
"1064 nm" => "1064" | 4 | beam.wavelength | missing unit | a length needs one of
"1064 nm" => 1064 | 4 | beam.wavelength | found 1064, a number with a missing unit
"1064 nm" => 1.064e-6 | 4 | beam.wavelength | missing unit
"1064 nm" => true | 4 | beam.wavelength | found true | a length
"1064 nm" => ["1064 nm"] | 4 | beam.wavelength | found a list
"1064 nm" => "nm" | 4 | beam.wavelength | finite number
"1064 nm" => "" | 4 | beam.wavelength | finite number
"10 kW" => "10 km" | 5 | beam.power | wrong kind (a length) | mW, W, kW
"10 kW" => "10 kw" | 5 | beam.power | unknown unit | did you mean `kW`?
"40 nm" => "40 urad" | 22 | errors.piston | wrong kind (an angle) | rad, deg, waves, nm
"40 nm" => { loop = "20 nm", drift = 3 } | 22 | errors.piston.drift | missing unit
"40 nm" => {} | 22 | errors.piston | no named contribution
dropout = 0.02 => dropout = "2 dB" | 23 | errors.dropout | wrong kind (a level) | plain number
pitch = "50 mm" => taper = "3" | 11 | array.taper | missing unit | dB
pitch = "50 mm" => taper = "3 %" | 11 | array.taper | wrong kind (a ratio) | dB
strehl = ">= 0.8" => fwhm = "<= 1 W" | 26 | require.fwhm | wrong kind (a power)
"##,
    );
}

#[test]
fn ranges() {
    check(
        r##"
"1064 nm" => "nan nm" | 4 | beam.wavelength | finite number
"1064 nm" => "inf nm" | 4 | beam.wavelength | finite number
"1064 nm" => "-1064 nm" | 4 | beam.wavelength | found "-1064 nm" | more than 0
"10 kW" => "0 W" | 5 | beam.power | more than 0
rows = 4 => rows = 0 | 9 | array.rows | whole number from 1
rows = 4 => rows = 4.0 | 9 | array.rows | found 4.0 | whole number
rows = 4 => rows = "4" | 9 | array.rows | found "4", a text | whole number
"50 mm" => "0 mm" | 11 | array.pitch | more than 0
pitch = "50 mm" => taper = "-1 dB" | 11 | array.taper | from 0 dB
size = "50 mm" => size = "50 mm"\nobscuration = 1 | 16 | array.element.obscuration | less than 1
"20 km" => "0 km" | 18 | target.range | more than 0
"20 km" => "1e400 km" | 18 | target.range | too large
"1 m" => "0 m" | 19 | target.bucket_diameter | more than 0
"1 m" => "1 m"\nfocus = "-3 km" | 20 | target.focus | more than 0 | infinity
"1 m" => "1 m"\nfocus = "target" | 20 | target.focus | a length | "range" or "infinity"
"40 nm" => "-40 nm" | 22 | errors.piston | 0 or more
dropout = 0.02 => dropout = 1.2 | 23 | errors.dropout | found 1.2 | from 0 to 1
dropout = 0.02 => dropout = nan | 23 | errors.dropout | finite number
dropout = 0.02 => dropout = inf | 23 | errors.dropout | finite number
dropout = 0.02 => power_spread = -0.1 | 23 | errors.power_spread | 0 or more
confidence = 0.9 => confidence = 0 | 27 | require.confidence | more than 0 and at most 1
confidence = 0.9 => confidence = 1.1 | 27 | require.confidence | at most 1
trials = 50 => trials = 0 | 30 | run.trials | found 0 | from 1
trials = 50 => seed = -1 | 30 | run.seed | found -1 | from 0
trials = 50 => seed = 99999999999999999999 | 30 | run.seed | from 0
"auto" => "0 m" | 31 | run.window | more than 0 | "auto"
"auto" => "wide" | 31 | run.window | "auto"
samples_per_spot = 4 => samples_per_spot = 1.9 | 32 | run.samples_per_spot | found 1.9 | 2 or more
samples_per_spot = 4 => samples_per_spot = "4" | 32 | run.samples_per_spot | a text | plain number
"Relay" => 7 | 1 | title | found 7 | a text
"##,
    );
}

#[test]
fn layouts() {
    check(
        r##"
rows = 4 => rings = 4 | 9 | array.rings | layout = "square" | it goes with layout = "hexagonal"
pitch = => outline = "circle"\nacross = | 9 | array.rows | beside an outline
pitch = "50 mm" => origin = "gap" | 11 | array.origin | an outline
pitch = "50 mm" => keep = "centre" | 11 | array.keep | an outline or a hole
pitch = "50 mm" => table = "a.csv" | 11 | array.table | layout = "table"
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "table"\ntable = "a.csv"\npitch = "1 m"\n | 10 | array.pitch | except "table"
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "table"\ntable = ""\n | 9 | array.table | an empty name
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "rings"\npitch = "1 m"\nrings = 3\n | 10 | array.rings | found 3 | [1, 6, 12]
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "rings"\npitch = "1 m"\nrings = []\n | 10 | array.rings | an empty list
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "rings"\npitch = "1 m"\nrings = [\n1,\n0]\n | 12 | array.rings | found 0 | from 1
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "hexagonal"\nrings = [1, 6]\n | 9 | array.rings | found a list | whole number
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "hexagonal"\nrings = -1\n | 9 | array.rings | found -1
layout = "square"\nrows = 4\ncolumns = 4\npitch = "50 mm"\n => layout = "square"\noutline = "circle"\nacross = "1 m"\nhole = "1.1 m"\n | 11 | array.hole | a hole of 1.1 m | array.across, 1 m
size = => beam_radius = "1 cm"\nsize = | 15 | array.element.beam_radius | uniform | gaussian
"##,
    );
}

#[test]
fn overlaps() {
    // Layout, element and pitch that is just too small; the smallest that is not.
    for (layout, shape, too_small, least) in [
        (
            "layout = \"square\"\nrows = 2\ncolumns = 2",
            "circle",
            "99 mm",
            "100 mm",
        ),
        (
            "layout = \"square\"\nrows = 1\ncolumns = 9",
            "square",
            "99 mm",
            "100 mm",
        ),
        (
            "layout = \"square\"\nrows = 1\ncolumns = 9",
            "hexagon",
            "99 mm",
            "100 mm",
        ),
        (
            "layout = \"square\"\nrows = 9\ncolumns = 1",
            "hexagon",
            "115 mm",
            "115.471 mm",
        ),
        (
            "layout = \"square\"\nrows = 2\ncolumns = 2",
            "hexagon",
            "115 mm",
            "115.471 mm",
        ),
        (
            "layout = \"hexagonal\"\nrings = 1",
            "circle",
            "99 mm",
            "100 mm",
        ),
        (
            "layout = \"hexagonal\"\nrings = 1",
            "hexagon",
            "99 mm",
            "100 mm",
        ),
        (
            "layout = \"hexagonal\"\nrings = 1",
            "square",
            "115 mm",
            "115.471 mm",
        ),
        (
            "layout = \"hexagonal\"\noutline = \"circle\"\nacross = \"1 m\"",
            "square",
            "115 mm",
            "115.471 mm",
        ),
    ] {
        let with = |pitch: &str| {
            format!(
                "[beam]\nwavelength = \"1 um\"\n[target]\nrange = \"1 km\"\n\
                 [array.element]\nshape = \"{shape}\"\nsize = \"100 mm\"\n\
                 [array]\npitch = \"{pitch}\"\n{layout}\n"
            )
        };
        let error = refuse(&with(too_small));
        assert_eq!(error.place, Place::Line(9), "{error}");
        assert_eq!(error.key, "array.pitch");
        assert!(error.found.contains("overlap"), "{error}");
        assert!(
            error.allowed.ends_with(&format!("at least {least}")),
            "{error}"
        );
        let good = Scenario::from_toml(&with(least), "good.toml", Path::new(""), &[]);
        assert!(good.is_ok(), "{layout} {shape}: {good:?}");
    }
    // A single element has no neighbour.
    let single = BASE
        .replace("= 4\ncolumns = 4", "= 1\ncolumns = 1")
        .replace("pitch = \"50", "pitch = \"5");
    assert!(Scenario::from_toml(&single, "single.toml", Path::new(""), &[]).is_ok());
}

#[test]
fn bounds() {
    const BOUND: &str = "strehl = \">= 0.8\"";
    const BUCKET: &str = "bucket_diameter = \"1 m\"\n";
    check(
        r##"
strehl = ">= 0.8" => strehl = 0.8 | 26 | require.strehl | found 0.8 | ">= VALUE"
strehl = ">= 0.8" => strehl = "0.8" | 26 | require.strehl | neither >= nor <=
strehl = ">= 0.8" => strehl = "> 0.8" | 26 | require.strehl | neither >= nor <=
strehl = ">= 0.8" => strehl = ">= high" | 26 | require.strehl | finite number
strehl = ">= 0.8" => strehl = [">= 0.8", ">= 0.9"] | 26 | require.strehl | 2 lower and 0 upper
strehl = ">= 0.8" => strehl = [] | 26 | require.strehl | 0 lower and 0 upper
strehl = ">= 0.8" => strehl = [\n">= 0.8",\n0.9] | 28 | require.strehl | found 0.9
strehl = ">= 0.8" => strehl = [">= 0.8", "<= 0.7"] | 26 | require.strehl | 0.8 above an upper bound of 0.7
strehl = ">= 0.8" => strehl = ">= 1.01" | 26 | require.strehl | never above 1
strehl = ">= 0.8" => combining_efficiency = ">= 101 %" | 26 | require.combining_efficiency | never above 1
strehl = ">= 0.8" => bucket_fraction = ">= 1.2" | 26 | require.bucket_fraction | never above 1
strehl = ">= 0.8" => window_fraction = ">= 1.2" | 26 | require.window_fraction | never above 1
strehl = ">= 0.8" => fwhm = "<= -1 m" | 26 | require.fwhm | found "<= -1 m", which cannot be met
strehl = ">= 0.8" => statistic = "median" | 26 | require.statistic | trials, mean, long_exposure
"##,
    );
    for figure in [
        "bucket_power = \">= 1 W\"",
        "bucket_fraction = \">= 0.1\"",
        "beam_quality = \"<= 2\"",
    ] {
        let error = refuse(&BASE.replace(BUCKET, "").replace(BOUND, figure));
        assert_eq!(error.place, Place::Line(25), "{error}");
        assert!(error.allowed.contains("target.bucket_diameter"), "{error}");
    }
    // With a power spread, or away from the focus, the ratio may exceed 1.
    for (old, new) in [("dropout", "power_spread"), (BUCKET, "focus = \"19 km\"\n")] {
        let text = BASE
            .replace(old, new)
            .replace(BOUND, "strehl = \">= 1.01\"");
        assert!(Scenario::from_toml(&text, "relay.toml", Path::new(""), &[]).is_ok());
    }
}

#[test]
fn syntax() {
    check(
        r##"
power = "10 kW" => wavelength = "1 um" | 5 |  | duplicate key "wavelength"
[errors] => [beam] | 21 |  | duplicate key "beam"
rows = 4 => rows 4 | 9 |  | TOML
"20 km" => "20 km | 18 |  | TOML
"20 km" => 20 km | 18 |  | TOML
"##,
    );
    // Lines are counted past a byte-order mark and with any line ends.
    let windows = BASE.replace("rows", "row").replace('\n', "\r\n");
    let error = refuse(&format!("\u{feff}{windows}"));
    assert_eq!(error.place, Place::Line(9), "{error}");
    let error = refuse(" \n");
    assert_eq!(error.place, Place::File);
    assert!(
        error.to_string().starts_with("relay.toml: an empty file; "),
        "{error}"
    );
}

#[test]
fn files() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let missing = folder.path().join("none.toml");
    let error = Scenario::read(&missing, &[]).expect_err("no such file");
    assert!(error.found.contains("cannot be read"), "{error}");
    let binary = folder.path().join("binary.toml");
    std::fs::write(&binary, [0xff, 0xfe, 0x00]).expect("a written file");
    let error = Scenario::read(&binary, &[]).expect_err("no text");
    assert!(error.found.contains("UTF-8"), "{error}");
    let good = folder.path().join("good.toml");
    std::fs::write(&good, BASE).expect("a written file");
    let scenario = Scenario::read(&good, &[]).expect("a scenario");
    assert_eq!(scenario.source.folder, folder.path());
}

#[test]
fn options() {
    for (assignment, option, key, fragment) in [
        (
            "errors.pistn=40 nm",
            "--set errors.pistn=40 nm",
            "errors.pistn",
            "did you mean `piston`?",
        ),
        (
            "eror.piston=40 nm",
            "--set eror.piston=40 nm",
            "eror",
            "unknown section",
        ),
        (
            "errors.piston=40",
            "--set errors.piston=40",
            "errors.piston",
            "missing unit",
        ),
        (
            "errors.piston=",
            "--set errors.piston=",
            "errors.piston",
            "finite number",
        ),
        (
            "errors.piston.loop=1 W",
            "--set errors.piston.loop=1 W",
            "errors.piston.loop",
            "wrong kind",
        ),
        ("errors=3", "--set errors=3", "errors", "is a section"),
        (
            "beam.wavelength.x=3",
            "--set beam.wavelength.x=3",
            "beam.wavelength",
            "found a table",
        ),
        (
            "array.element.size=0 m",
            "--set array.element.size=0 m",
            "array.element.size",
            "more than 0",
        ),
        (
            "array.element.size=6 cm",
            "--set array.element.size=6 cm",
            "array.element.size",
            "overlap at a pitch of 50 mm",
        ),
        (
            "array.pitch=4 cm",
            "--set array.pitch=4 cm",
            "array.pitch",
            "at least 50 mm",
        ),
        (
            "array.rows=many",
            "--set array.rows=many",
            "array.rows",
            "whole number",
        ),
        ("run.trials=0", "--trials 0", "run.trials", "found 0"),
        ("run.seed=-3", "--seed -3", "run.seed", "found -3"),
        (
            "require.strehl=>= 2",
            "--set require.strehl=>= 2",
            "require.strehl",
            "never above 1",
        ),
    ] {
        let replacement = Override::parse(assignment, option).expect(assignment);
        let error = Scenario::from_toml(BASE, "relay.toml", Path::new(""), &[replacement])
            .expect_err(assignment);
        assert_eq!(error.place, Place::Option(option.to_string()), "{error}");
        assert_eq!(error.key, key, "{error}");
        let message = error.to_string();
        assert!(message.contains(fragment), "{message}");
    }
    for assignment in ["errors.piston", "=3", "errors.=3", ".piston=3", ""] {
        let option = format!("--set {assignment}");
        let error = Override::parse(assignment, &option).expect_err(assignment);
        assert_eq!(error.place, Place::Option(option));
        assert!(error.to_string().contains("SECTION.KEY=VALUE"), "{error}");
    }
}

#[test]
fn no_slip_of_a_key_panics() {
    let places: Vec<usize> = BASE.char_indices().map(|(at, _)| at).collect();
    for at in places {
        for slip in ["", "\"", "µ", "=", "\n", "e", "9e999", "[", "{"] {
            let text = format!("{}{slip}{}", &BASE[..at], &BASE[at + 1..]);
            if let Err(error) = Scenario::from_toml(&text, "relay.toml", Path::new(""), &[]) {
                assert!(!error.found.is_empty() && !error.allowed.is_empty());
            }
        }
        let cut = Scenario::from_toml(&BASE[..at], "relay.toml", Path::new(""), &[]);
        assert!(cut.is_err() || Some(at) >= BASE.find("\nbucket"));
    }
}
