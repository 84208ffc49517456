//! Layouts of a few elements that the far-field methods are compared on.

/// λ/size of every element here, in rad; it is 0.1 m across.
pub const BEAM_RAD: f64 = 1e-5;

/// Layouts of a few elements, with pitch for the shape; the table is irregular.
pub const LAYOUTS: [(&str, &str); 11] = [
    (
        "two",
        "layout = \"square\"\nrows = 1\ncolumns = 2\npitch = \"0.13 m\"",
    ),
    ("block", "layout = \"square\"\nrows = 3\ncolumns = 4"),
    ("seven", "layout = \"hexagonal\"\nrings = 1"),
    (
        "nineteen",
        "layout = \"hexagonal\"\nrings = 2\npitch = \"0.121 m\"",
    ),
    (
        "disc with a hole",
        "layout = \"square\"\noutline = \"circle\"\nacross = \"0.6 m\"\nhole = \"0.2 m\"",
    ),
    (
        "disc about a gap",
        "layout = \"hexagonal\"\noutline = \"circle\"\nacross = \"0.55 m\"\norigin = \"gap\"\nkeep = \"centre\"",
    ),
    (
        "square about a gap",
        "layout = \"square\"\noutline = \"square\"\nacross = \"0.5 m\"\norigin = \"gap\"\ntaper = \"6 dB\"",
    ),
    (
        "hexagon with a hole",
        "layout = \"hexagonal\"\noutline = \"hexagon\"\nacross = \"0.6 m\"\nhole = \"0.15 m\"",
    ),
    (
        "one in a square outline",
        "layout = \"hexagonal\"\noutline = \"square\"\nacross = \"0.16 m\"",
    ),
    (
        "rings",
        "layout = \"rings\"\nrings = [1, 5, 9]\npitch = \"0.163 m\"",
    ),
    ("table", "layout = \"table\"\ntable = \"positions.csv\""),
];

/// The table of the last layout.
pub const TABLE: &str = "x_m,y_m,power,phase_rad,tilt_x_rad,tilt_y_rad\n\
    -0.171,0.083,1.0,0.0,0,0\n0.0437,0.1911,0.4,1.3,2e-6,0\n0.2213,-0.0127,1.7,-0.4,0,-3e-6\n\
    -0.0531,-0.1609,0.9,0.2,1e-6,1e-6\n0.1171,-0.2287,1.2,2.1,0,0\n";

/// Errors of every kind but jitter.
pub const ALL_ERRORS: &str = "piston = \"0.6 rad\"\ndropout = 0.15\npower_spread = 0.3\n";

/// An element of 0.1 m.
pub fn element(shape: &str, more: &str) -> String {
    format!("shape = \"{shape}\"\nsize = \"0.1 m\"\n{more}")
}

/// A folder that holds [`TABLE`].
pub fn folder_with_table() -> tempfile::TempDir {
    let folder = tempfile::tempdir().unwrap_or_else(|error| panic!("{error}"));
    std::fs::write(folder.path().join("positions.csv"), TABLE)
        .unwrap_or_else(|error| panic!("{error}"));
    folder
}
