//! What a malformed table, or an array that cannot be laid out, is answered with.

use facula::array::Array;
use facula::error::{Place, ScenarioError};
use facula::scenario::Scenario;
use facula::study::setup::Setup;
use std::path::Path;

/// A good scenario on a table; `[array]` stands in line 3.
const ON_TABLE: &str = r#"[beam]
wavelength = "1 um"
[array]
layout = "table"
table = "sites.csv"
[array.element]
shape = "circle"
size = "10 cm"
[target]
range = "10 km"
"#;

/// Lay out `scenario` beside `table`.
fn lay_out(scenario: &str, table: &[u8]) -> Result<Array, ScenarioError> {
    let folder = tempfile::tempdir().expect("a temporary folder");
    std::fs::write(folder.path().join("sites.csv"), table).expect("a written table");
    let scenario = Scenario::from_toml(scenario, "survey.toml", folder.path(), &[])?;
    Array::new(&scenario)
}

#[track_caller]
fn refused(table: &str, line: Option<usize>, key: &str, parts: &[&str]) {
    let error = lay_out(ON_TABLE, table.as_bytes()).expect_err(table);
    let place = line.map_or(Place::File, Place::Line);
    assert_eq!(
        (error.file.as_str(), &error.place),
        ("sites.csv", &place),
        "{table}"
    );
    assert_eq!(error.key, key, "{error}");
    let message = error.to_string();
    for part in parts {
        assert!(message.contains(part), "{part} in {message}");
    }
    assert!(!error.found.is_empty() && !error.allowed.is_empty());
}

#[test]
fn malformed_tables_are_refused_with_line_column_and_a_way_out() {
    for (table, line, key, parts) in [
        ("", None, "", &["no header", "x_m,y_m"][..]),
        ("# only this\n\n", None, "", &["no header"]),
        ("x_m,y_m\n", None, "", &["no rows"]),
        (
            "x_m,y_m,power\n0,0,0\n1,0,0\n",
            None,
            "",
            &["no row with power"],
        ),
        ("0,0\n1,0\n", Some(1), "0", &["an unknown column"]),
        (
            "x_m;y_m\n0;0\n",
            Some(1),
            "x_m;y_m",
            &["separated by commas"],
        ),
        ("x_m\n0\n", Some(1), "y_m", &["is missing"]),
        (
            "# survey\n\n# again\ny_m,power\n0,1\n",
            Some(4),
            "x_m",
            &["is missing"],
        ),
        ("x_m,y_m,x_m\n0,0,0\n", Some(1), "x_m", &["stands twice"]),
        (
            "# a\nx_m,y_m,\n0,0,0\n",
            Some(2),
            "",
            &["an unknown column"],
        ),
        (
            "\n# a\nx_m,y_m,pover\n0,0,1\n",
            Some(3),
            "pover",
            &[
                "sites.csv:3: pover: an unknown column",
                "did you mean `power`?",
            ],
        ),
        ("x_m,y_m,phase\n0,0,1\n", Some(1), "phase", &["phase_rad"]),
        ("x_m,y_m\n0,0\n1\n", Some(3), "", &["1 values", "2 columns"]),
        ("x_m,y_m\n0,0,0\n", Some(2), "", &["3 values", "2 columns"]),
        ("x_m,y_m\n0,0\n\n# far\n1,0,\n", Some(5), "", &["3 values"]),
        (
            "x_m,y_m\n0,0\n1,east\n",
            Some(3),
            "y_m",
            &["found \"east\"", "finite number"],
        ),
        ("x_m,y_m\n# c\n,0\n", Some(3), "x_m", &["found \"\""]),
        ("x_m,y_m\n0,NaN\n", Some(2), "y_m", &["found \"NaN\""]),
        ("x_m,y_m\ninf,0\n", Some(2), "x_m", &["found \"inf\""]),
        ("x_m,y_m\n1e400,0\n", Some(2), "x_m", &["found \"1e400\""]),
        ("x_m,y_m\n-1e300,0\n", Some(2), "x_m", &["at most 1e25"]),
        (
            "x_m,y_m\n0,1 m\n",
            Some(2),
            "y_m",
            &["found \"1 m\"", "SI units"],
        ),
        (
            "x_m,y_m,power\n0,0,-1\n",
            Some(2),
            "power",
            &["found \"-1\"", "from 0"],
        ),
        (
            "x_m,y_m,tilt_x_rad\n0,0,1\n1,0,?\n",
            Some(3),
            "tilt_x_rad",
            &["found \"?\""],
        ),
        (
            "# a\n\nx_m,y_m\n1,0\n# b\n0,0\n\n0.09,0\n",
            Some(8),
            "",
            &["(0.09, 0) m", "overlaps the one in line 6"],
        ),
        (
            "x_m,y_m\n1,2\n1,2\n",
            Some(3),
            "",
            &["overlaps the one in line 2"],
        ),
        ("x_m,y_m\n1e25,0\n1e25,0\n", Some(3), "", &["line 2"]),
    ] {
        refused(table, line, key, parts);
        // Line ends and a byte-order mark change nothing.
        let windows = format!("\u{feff}{}", table.replace('\n', "\r\n"));
        refused(&windows, line, key, parts);
    }
}

#[test]
fn good_tables_are_read_whatever_made_them() {
    for table in [
        "x_m,y_m,power\n0,0,1\n0.2,0,3\n",
        "\u{feff}x_m,y_m,power\r\n0,0,1\r\n0.2,0,3\r\n",
        "# by hand\n\n x_m , y_m , power\n0, 0, 1\n # aside\n\n2e-1 ,-0, 3.0",
        "power,y_m,x_m\n1,0,0\n3,0,0.2\n",
        "\"x_m\",\"y_m\",\"power\"\n\"0\",\"0\",\"1\"\n\"0.2\",\"0\",\"3\"\n",
    ] {
        let array = lay_out(ON_TABLE, table.as_bytes()).expect(table);
        assert_eq!(array.len(), 2, "{table}");
        let list = array.list();
        assert!((list.x_m[1] - 0.2).abs() < 1e-15, "{table}");
        // A quarter of the 1 W for the first, three for the second.
        assert!((list.amplitude[0].powi(2) - 0.25).abs() < 1e-15, "{table}");
    }
}

#[test]
fn a_table_that_cannot_be_read_is_named_where_the_scenario_names_it() {
    for (file, table, part) in [
        ("none.csv", &b""[..], "cannot be read"),
        (".", b"", "cannot be read"),
        ("sites.csv", b"x_m,y_m\n\xff\xfe,0\n", "UTF-8"),
    ] {
        let scenario = ON_TABLE.replace("sites.csv", file);
        let error = lay_out(&scenario, table).expect_err(file);
        assert_eq!(
            (error.file.as_str(), &error.place),
            ("survey.toml", &Place::Line(5))
        );
        assert_eq!(error.key, "array.table");
        assert!(error.found.contains(part), "{error}");
    }
}

/// A good scenario on a lattice; each case spoils something.
const ON_LATTICE: &str = r#"[beam]
wavelength = "1 um"
[array]
layout = "square"
rows = 2
columns = 2
[array.element]
shape = "square"
size = "10 cm"
[target]
range = "10 km"
[errors]
piston = "10 nm"
[require]
strehl = ">= 0.5"
[run]
window = "auto"
"#;

#[test]
fn arrays_that_cannot_be_computed_are_refused_with_line_and_key() {
    const BLOCK: &str = "layout = \"square\"\nrows = 2\ncolumns = 2\n";
    const BOUND: &str = "strehl = \">= 0.5\"";
    for (old, new, line, key, part) in [
        (
            BLOCK,
            "layout = \"square\"\noutline = \"circle\"\nacross = \"9 cm\"\n",
            6,
            "array.across",
            "holds no element",
        ),
        (
            BLOCK,
            "layout = \"square\"\nrows = 2\ncolumns = 2\nhole = \"1 m\"\n",
            7,
            "array.hole",
            "no element",
        ),
        (
            BLOCK,
            "layout = \"rings\"\npitch = \"20 cm\"\nrings = [1, 99]\n",
            6,
            "array.rings",
            "overlap",
        ),
        (
            BLOCK,
            "layout = \"square\"\nrows = 999999\ncolumns = 999999\n",
            3,
            "array",
            "at most 2e10",
        ),
        (
            BLOCK,
            "layout = \"hexagonal\"\npitch = \"20 cm\"\noutline = \"circle\"\nacross = \"1e9 m\"\n",
            3,
            "array",
            "at most 2e10",
        ),
        ("\"auto\"", "\"1e20 m\"", 17, "run.window", "pixels"),
        (
            "\"auto\"",
            "\"auto\"\nsamples_per_spot = 1000",
            17,
            "run.window",
            "pixels",
        ),
        (
            "size = \"10 cm\"",
            "size = \"10 cm\"\nprofile = \"gaussian\"\nbeam_radius = \"1 mm\"\nobscuration = 0.5",
            11,
            "array.element.beam_radius",
            "passes the element",
        ),
        (
            "piston = \"10 nm\"",
            "jitter = \"1 rad\"",
            13,
            "errors.jitter",
            "one element",
        ),
        (
            "piston = \"10 nm\"",
            "common_jitter = { a = \"1 deg\" }",
            13,
            "errors.common_jitter",
            "one element",
        ),
        (
            "range = \"10 km\"",
            "range = \"10 km\"\nfocus = \"1 mm\"",
            12,
            "target.focus",
            "one element",
        ),
        (
            "piston = \"10 nm\"",
            "jitter = \"20 urad\"\n[run]\nmethod = \"factored\"",
            15,
            "run.method",
            "tilts too large",
        ),
        (
            BOUND,
            "fwhm = \"<= 1 m\"\n[run]\nwindow = \"1 mm\"\n",
            15,
            "require.fwhm",
            "larger run.window",
        ),
    ] {
        // A later [run] takes the place of the one at the end.
        let mut text = ON_LATTICE.replace(old, new);
        if let Some(end) = text
            .rfind("[run]")
            .filter(|_| text.matches("[run]").count() > 1)
        {
            text.truncate(end);
        }
        let refusal =
            Scenario::from_toml(&text, "array.toml", Path::new(""), &[]).and_then(Setup::new);
        let error = refusal.map(|_| ()).expect_err(new);
        assert_eq!(
            (&error.place, error.key.as_str()),
            (&Place::Line(line), key),
            "{error}"
        );
        let message = error.to_string();
        assert!(
            message.starts_with("array.toml:") && message.contains(part),
            "{message}"
        );
        assert!(message.len() < 300, "{message}");
    }
}

#[test]
fn odd_but_lawful_arrays_are_computed() {
    for (old, new) in [
        ("rows = 2\ncolumns = 2", "rows = 1\ncolumns = 1"),
        ("\"auto\"", "\"1 nm\""),
        ("\"auto\"", "\"1 mm\"\nsamples_per_spot = 1000"),
        ("\"10 km\"", "\"1e25 m\""),
        (
            "layout = \"square\"\nrows = 2\ncolumns = 2",
            "layout = \"rings\"\npitch = \"1e25 m\"\nrings = [1, 6]",
        ),
        ("size = \"10 cm\"", "size = \"10 cm\"\nobscuration = 0.99"),
    ] {
        let text = ON_LATTICE.replace(old, new);
        let scenario = Scenario::from_toml(&text, "array.toml", Path::new(""), &[]);
        let setup = scenario.and_then(Setup::new);
        let setup = setup.unwrap_or_else(|error| panic!("{error}"));
        let strehl = setup.ideal.figures.get(facula::scenario::Figure::Strehl);
        assert!(
            strehl.is_some_and(|strehl| (strehl - 1.0).abs() < 1e-9),
            "{new}"
        );
    }
}
