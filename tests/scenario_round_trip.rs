//! A scenario written out and read again is the same scenario.

use facula::scenario::{
    Figure, Keep, Layout, Override, STARTER, Scenario, Source, Statistic, Window,
};
use std::path::Path;

const HEAD: &str = "[beam]\nwavelength = \"1550 nm\"\n";
const TARGET: &str = "[target]\nrange = \"1.5 km\"\n";
const CIRCLE: &str = "[array.element]\nshape = \"circle\"\nsize = \"30 mm\"\n";

#[track_caller]
fn read(text: &str, overrides: &[Override]) -> Scenario {
    Scenario::from_toml(text, "case.toml", Path::new("cases"), overrides)
        .unwrap_or_else(|error| panic!("{error}\n{text}"))
}

/// Every value, with doubles in the shortest digits that identify their bits.
fn values(scenario: &Scenario) -> String {
    let mut bare = scenario.clone();
    bare.source = Source::default();
    format!("{bare:#?}")
}

#[track_caller]
fn survives(text: &str) {
    let scenario = read(text, &[]);
    let written = scenario.to_toml();
    let again = read(&written, &[]);
    assert_eq!(values(&scenario), values(&again), "{written}");
    assert_eq!(written, again.to_toml());
}

#[test]
fn every_section_survives() {
    let arrays = [
        "layout = \"square\"\nrows = 3\ncolumns = 4",
        "layout = \"square\"\nrows = 1\ncolumns = 4\nhole = \"12.3 mm\"\nkeep = \"centre\"",
        "layout = \"hexagonal\"\nrings = 0",
        "layout = \"hexagonal\"\nrings = 5\npitch = \"31.7 mm\"\ntaper = \"9.7 dB\"",
        "layout = \"hexagonal\"\noutline = \"hexagon\"\nacross = \"0.7 m\"\norigin = \"gap\"",
        "layout = \"square\"\noutline = \"circle\"\nacross = \"0.7 m\"\nkeep = \"centre\"",
        "layout = \"rings\"\nrings = [1, 6, 12]\npitch = \"0.04 m\"",
        "layout = \"table\"\ntable = \"positions.csv\"\ntaper = 0",
    ];
    let elements = [
        "shape = \"circle\"\nsize = \"30 mm\"",
        "shape = \"square\"\nsize = \"1.1e-2 m\"\nobscuration = \"17 %\"",
        "shape = \"hexagon\"\nsize = \"0.0261 m\"\nprofile = \"gaussian\"\nbeam_radius = \"11.7 mm\"",
    ];
    let rests = [
        "[target]\nrange = \"1 au\"",
        "[target]\nrange = \"384.4 Mm\"\nfocus = \"infinity\"\nfacets = \"flat\"\n\
         [errors]\npiston = \"40 nm\"\njitter = \"0.3 arcsec\"\ncommon_jitter = \"1e-9 deg\"\n\
         dropout = \"2 %\"\ndropped = \"unlocked\"\npower_spread = 0.1",
        "[target]\nrange = \"7 km\"\nfocus = \"6.9 km\"\nbucket_diameter = \"33 cm\"\n\
         [errors]\npiston = { zeta = \"20 nm\", alpha = \"0.01 waves\", \"a b\\\"\\n\" = \"3 deg\" }\n\
         [errors.jitter]\nmount = \"0.1 urad\"\n\
         [require]\nwindow_fraction = \"<= 1\"\nstrehl = [\"<= 0.95\", \">= 80 %\"]\n\
         bucket_power = \">= 0.3 W\"\nfwhm = \"<= 0.9 m\"\npeak_irradiance = \">= 3 mW/cm^2\"\n\
         statistic = \"mean\"\nconfidence = 0.5\n\
         [run]\ntrials = 7\nseed = 18446744073709551615\nwindow = \"3.3 m\"\n\
         samples_per_spot = 2.5\nmethod = \"closed_form\"",
    ];
    for array in arrays {
        for element in elements {
            for rest in rests {
                survives(&format!(
                    "title = 'A \"case\" \\ of its own'\n{HEAD}power = \"0.3 kW\"\n\
                     [array]\n{array}\n[array.element]\n{element}\n{rest}\n"
                ));
            }
        }
    }
}

#[test]
fn any_title_survives() {
    let text = format!("{HEAD}[array]\nlayout = \"hexagonal\"\nrings = 1\n{CIRCLE}{TARGET}");
    for title in [
        "",
        "two\nlines",
        "\n leading and trailing\r\n",
        "tab\tand \"quotes\" and 'quotes' and \\",
        "\"\"\"\n'''",
        "bell \u{7} delete \u{7f} µ λ",
    ] {
        let mut scenario = read(&text, &[]);
        scenario.title = title.to_string();
        assert_eq!(read(&scenario.to_toml(), &[]).title, title);
    }
}

#[test]
fn many_odd_values_survive() {
    let mut odd = 0.1_f64;
    for _ in 0..500 {
        // The logistic map wanders over full mantissas.
        odd = 3.99 * odd * (1.0 - odd);
        survives(&format!(
            "{HEAD}power = \"{odd} GW\"\n[array]\nlayout = \"hexagonal\"\nrings = 2\n\
             taper = \"{odd} dB\"\nhole = \"{odd} mm\"\n\
             [array.element]\nshape = \"square\"\nsize = \"{odd} cm\"\nobscuration = {odd}\n\
             [target]\nrange = \"{odd} au\"\nfocus = \"{odd} Gm\"\n\
             [errors]\npiston = \"{odd} um\"\njitter = \"{odd} arcmin\"\ndropout = \"{odd} %\"\n\
             [require]\nfwhm = \"<= {odd} km\"\naim_irradiance = \"<= {odd} W/cm^2\"\n"
        ));
    }
}

#[test]
fn starter_reads_as_it_is() {
    let scenario = read(STARTER, &[]);
    assert!(!scenario.title.is_empty());
    assert!(STARTER.lines().count() <= 90);
    survives(STARTER);
    for figure in Figure::ALL {
        assert!(STARTER.contains(figure.name()), "{}", figure.name());
    }
}

#[test]
fn defaults_are_those_of_the_contract() {
    let text =
        format!("{HEAD}[array]\nlayout = \"square\"\nrows = 2\ncolumns = 2\n{CIRCLE}{TARGET}");
    let written = read(&text, &[]).to_toml();
    for line in [
        "title = \"\"",
        "power = \"1 W\"",
        "pitch = \"30 mm\"",
        "hole = \"0 m\"",
        "keep = \"whole\"",
        "taper = \"0.0 dB\"",
        "obscuration = 0.0",
        "profile = \"uniform\"",
        "focus = \"range\"",
        "facets = \"curved\"",
        "piston = \"0 rad\"",
        "dropped = \"dark\"",
        "statistic = \"trials\"",
        "confidence = 0.9",
        "trials = 200",
        "seed = 1",
        "window = \"auto\"",
        "samples_per_spot = 4.0",
        "method = \"auto\"",
    ] {
        assert!(
            written.lines().any(|written| written == line),
            "{line}\n{written}"
        );
    }
}

#[test]
fn a_table_is_written_by_its_bare_name() {
    let text = format!(
        "{HEAD}[array]\nlayout = \"table\"\ntable = \"data/positions.csv\"\n{CIRCLE}{TARGET}"
    );
    let scenario = read(&text, &[]);
    let layout = Layout::Table {
        file: "data/positions.csv".into(),
    };
    assert_eq!(scenario.array.layout, layout);
    assert!(scenario.to_toml().contains("table = \"positions.csv\""));
}

#[test]
fn options_replace_what_the_file_says() {
    let option = |text: &str| {
        Override::parse(text, &format!("--set {text}")).unwrap_or_else(|error| panic!("{error}"))
    };
    let overrides = [
        option("title=Second of two"),
        option("errors.piston=0.1 rad"),
        option("errors.jitter.mount=2 urad"),
        option("errors.jitter.other = \"1 urad\""),
        option("array.element.size=25 mm"),
        option("array.hole=1 mm"),
        option("array.keep=centre"),
        option("require.strehl=[\">= 0.5\", \"<= 0.9\"]"),
        option("require.statistic=long_exposure"),
        option("run.trials=10"),
        option("run.trials=20"),
        option("run.window=3 m"),
    ];
    let text = format!(
        "{HEAD}[array]\nlayout = \"square\"\nrows = 2\ncolumns = 2\n{CIRCLE}{TARGET}\
         [errors]\npiston = {{ loop = \"20 nm\" }}\njitter = \"3 urad\"\n"
    );
    let scenario = read(&text, &overrides);
    assert_eq!(scenario.title, "Second of two");
    assert_eq!(scenario.errors.piston_rad.parts, [(String::new(), 0.1)]);
    let parts = [("mount".to_string(), 2e-6), ("other".to_string(), 1e-6)];
    assert_eq!(scenario.errors.jitter_rad.parts, parts);
    assert_eq!(scenario.array.keep, Keep::Centre);
    assert_eq!(scenario.require.bounds.len(), 2);
    assert_eq!(scenario.require.statistic, Statistic::LongExposure);
    assert_eq!(scenario.run.trials, 20);
    assert_eq!(scenario.run.window, Window::Width { width_m: 3.0 });
    let error = scenario.error("run.trials", "too many", "fewer");
    assert_eq!(
        error.to_string(),
        "case.toml: --set run.trials=20: run.trials: too many; fewer"
    );
    let error = scenario.error("array.rows", "too many", "fewer");
    assert_eq!(
        error.to_string(),
        "case.toml:5: array.rows: too many; fewer"
    );
}

#[test]
fn bounds_keep_their_order() {
    let text = format!(
        "{HEAD}[array]\nlayout = \"hexagonal\"\nrings = 1\n{CIRCLE}{TARGET}\
         [require]\nstrehl = \">= 0.5\"\nfwhm = \"<= 1 m\"\nconfidence = 0.8\noffset = \"<= 1 m\"\n"
    );
    let figures: Vec<Figure> = read(&text, &[])
        .require
        .bounds
        .iter()
        .map(|b| b.figure)
        .collect();
    assert_eq!(figures, [Figure::Strehl, Figure::Fwhm, Figure::Offset]);
}

#[test]
fn closest_pitch_is_the_default() {
    for (layout, shape, pitch) in [
        ("square", "circle", 1.0),
        ("square", "square", 1.0),
        ("square", "hexagon", 2.0 / 3.0_f64.sqrt()),
        ("hexagonal", "circle", 1.0),
        ("hexagonal", "square", 2.0 / 3.0_f64.sqrt()),
        ("hexagonal", "hexagon", 1.0),
    ] {
        let text = format!(
            "{HEAD}[array]\nlayout = \"{layout}\"\noutline = \"square\"\nacross = \"9 m\"\n\
             [array.element]\nshape = \"{shape}\"\nsize = \"1 m\"\n{TARGET}"
        );
        let pitch_m = read(&text, &[]).array.pitch_m;
        assert!(
            (pitch_m - pitch).abs() < 1e-15,
            "{layout} {shape}: {pitch_m}"
        );
    }
}
