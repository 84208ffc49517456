//! Whole arrays against array theory.
//!
//! The array factor and its grating lobes stand in Balanis, *Antenna Theory*, array chapter
//! (formulas from memory); the digits computed from them are derived.

mod common;

use common::{Directions, WAVELENGTH_RANGE_M2, Within, array, assert_close, ideal, least, setup};
use common::{greatest, share_within, text};
use facula::array::Array;
use facula::figures::lobes::{Lobe, brightest};
use facula::scenario::Figure;

const EXACT: Within = Within(
    1e-9,
    "a sum of closed forms, given with nine digits or more",
);

/// Pitch of every lattice but the published one; λ·range/pitch is 1 cm.
const PITCH_M: f64 = 0.1;
const LOBE_M: f64 = WAVELENGTH_RANGE_M2 / PITCH_M;

fn square_lattice(rows: usize, columns: usize, shape: &str, fill: f64, run: &str) -> String {
    text(
        &format!(
            "layout = \"square\"\nrows = {rows}\ncolumns = {columns}\npitch = \"{PITCH_M} m\""
        ),
        &format!("shape = \"{shape}\"\nsize = \"{} m\"", fill * PITCH_M),
        run,
    )
}

fn hexagonal_rings(rings: usize, fill: f64, element: &str) -> String {
    text(
        &format!("layout = \"hexagonal\"\nrings = {rings}\npitch = \"{PITCH_M} m\""),
        &format!(
            "shape = \"circle\"\nsize = \"{} m\"\n{element}",
            fill * PITCH_M
        ),
        "[run]\nmethod = \"direct\"",
    )
}

/// Level over the aim point's in directions given in λ/pitch.
fn level(array: &Array, x: f64, y: f64) -> f64 {
    let directions = Directions::new(array, 4.0 * LOBE_M);
    directions.at(x * LOBE_M, y * LOBE_M) / directions.at(0.0, 0.0)
}

/// Row 6.2, derived.
#[test]
fn seven_in_a_row_have_dirichlets_array_factor_along_the_row_only() {
    let row = array(&square_lattice(1, 7, "square", 0.9, ""));
    let element = array(&square_lattice(1, 1, "square", 0.9, ""));
    let factor = |x: f64, y: f64| level(&row, x, y) / level(&element, x, y);
    EXACT.check("along the row", factor(0.3217, 0.0), 0.014_387_284_696_5);
    EXACT.check("across it", factor(0.0, 0.3217), 1.0);
    EXACT.check("at the grating lobe", factor(1.0, 0.0), 1.0);
    EXACT.check("at the first null", factor(1.0 / 7.0, 0.0), 0.0);
}

/// Rows 6.4 to 6.10, derived.
#[test]
fn grating_lobes_of_a_square_lattice_stand_at_the_level_of_the_element() {
    for (shape, fill, lobes) in [
        ("square", 0.5, [0.405_284_734_6, 0.164_255_716_1, 0.0]),
        (
            "square",
            0.8,
            [0.054_696_262_51, 0.002_991_681_132, 0.035_799_168_57],
        ),
        (
            "square",
            0.9,
            [0.011_944_829_74, 0.000_142_678_957_6, 0.010_804_2],
        ),
        (
            "square",
            0.95,
            [0.002_747_374_903, 7.548_068_86e-6, 0.002_680_141_854],
        ),
        (
            "circle",
            0.8,
            [0.154_402_783_9, 0.004_158_516_498, f64::NAN],
        ),
        (
            "circle",
            0.9,
            [0.080_268_510_29, 0.001_073_586_627, f64::NAN],
        ),
        (
            "circle",
            1.0,
            [0.032_830_452_08, 0.009_387_611_915, f64::NAN],
        ),
    ] {
        let array = array(&square_lattice(6, 6, shape, fill, ""));
        for ((x, y), expected) in [(1.0, 0.0), (1.0, 1.0), (2.0, 0.0)].into_iter().zip(lobes) {
            if expected.is_finite() {
                for (x, y) in [(x, y), (-y, x), (-x, -y)] {
                    let name = format!("{shape} {fill} at ({x}, {y})");
                    EXACT.check(&name, level(&array, x, y), expected);
                }
            }
        }
    }
}

/// Rows 6.25 and 6.26, derived. A row of neighbours lies along x, so the nearest lobes lie
/// along y and at 30° to x.
#[test]
fn grating_lobes_of_a_hexagonal_lattice_are_two_over_root_three_away_at_thirty_degrees() {
    let away = 2.0 / 3f64.sqrt();
    for (fill, expected) in [(1.0, 0.002_141_359_4), (0.9, 0.020_736_473_6)] {
        let array = array(&hexagonal_rings(3, fill, ""));
        for degrees in [30.0f64, 90.0, 150.0, 210.0, 270.0, 330.0] {
            let (sin, cos) = degrees.to_radians().sin_cos();
            let name = format!("fill {fill} at {degrees}°");
            EXACT.check(&name, level(&array, away * cos, away * sin), expected);
        }
        let spacing = array.grating_lobe_spacing_rad().unwrap_or(f64::NAN);
        EXACT.check(
            "reported spacing",
            spacing * PITCH_M / array.wavelength_m,
            away,
        );
    }
}

/// The slope of the element pulls each lobe inwards of its grating direction, by a hundredth here;
/// where to, and how high, is found by the direct sum.
#[test]
fn the_list_of_lobes_holds_the_six_nearest_grating_lobes() {
    let array = array(&hexagonal_rings(6, 0.9, ""));
    let spacing = 2.0 / 3f64.sqrt();
    let (place, height) = greatest(|y| level(&array, 0.0, y), 0.95 * spacing, 1.03 * spacing);
    let lobes = brightest(&array, 0.0);
    let angle =
        |lobe: &Lobe| lobe.theta_x_rad.hypot(lobe.theta_y_rad) * PITCH_M / array.wavelength_m;
    let far: Vec<_> = lobes
        .iter()
        .filter(|lobe| angle(lobe) > 0.9 * spacing)
        .collect();
    assert!(far.len() >= 6, "{far:?}");
    for lobe in &far[..6] {
        assert_close(
            "distance in λ/pitch",
            angle(lobe),
            place,
            1e-4,
            "between pixels of 0.02",
        );
        let azimuth = lobe.theta_y_rad.atan2(lobe.theta_x_rad).to_degrees();
        let off = (azimuth - 30.0).rem_euclid(60.0);
        assert_close(
            "azimuth from 30°",
            off.min(60.0 - off),
            0.0,
            2e-3,
            "by symmetry",
        );
        let read = 1e-3 * height;
        assert_close(
            "level",
            lobe.irradiance_over_peak,
            height,
            read,
            "between pixels",
        );
    }
}

/// Rows 6.11 to 6.17, derived. Pixel centres end on the edges of the lobe, where the
/// irradiance is zero to second order: their sum is the trapezoidal rule.
#[test]
fn the_central_lobe_of_a_gapped_square_array_holds_the_share_of_its_fill() {
    for (count, fill, expected) in [
        (2, 0.9, 0.685_280_006_3),
        (5, 0.9, 0.663_972_065_0),
        (10, 0.5, 0.204_907_876_4),
        (10, 0.8, 0.523_049_702_9),
        (10, 0.9, 0.661_151_887_9),
        (10, 0.95, 0.736_149_595_8),
        (10, 1.0, 0.815_089_971_7),
    ] {
        let across = ((count - 1) as f64 + fill) * 2f64.sqrt();
        let samples = 32.0 * count as f64 / across;
        let width = 2.0 * LOBE_M / count as f64;
        let setup = setup(&square_lattice(
            count,
            count,
            "square",
            fill,
            &format!(
                "[run]\nmethod = \"direct\"\nwindow = \"{width} m\"\nsamples_per_spot = {samples}"
            ),
        ));
        assert_eq!(setup.grid.pixels, 65);
        let share = ideal(&setup, Figure::WindowFraction);
        assert_close(
            &format!("{count} × {count}, {fill}"),
            share,
            expected,
            3e-7,
            "trapezoidal rule of 64 steps: measured up to 1e-7",
        );
    }
}

/// Row 6.20, derived: 0.81 of a lattice cell, 0.826446 of the tightest outer square.
#[test]
fn the_peak_of_a_gapped_array_falls_by_its_fill() {
    let setup = setup(&square_lattice(
        10,
        10,
        "square",
        0.9,
        "[run]\nmethod = \"direct\"",
    ));
    let outer = (9.9 * PITCH_M).powi(2) / WAVELENGTH_RANGE_M2.powi(2);
    let peak = ideal(&setup, Figure::PeakIrradiance) / outer;
    EXACT.check("peak over the filled outer square's", peak, 0.826_446_281_0);
    let cell = setup.array.cell_fill_factor().unwrap_or(f64::NAN);
    EXACT.check("cell fill factor", cell, 0.81);
}

/// Rows 6.21 to 6.34, derived.
#[test]
fn touching_circles_in_hexagonal_rings_have_their_fill_shares_and_nulls() {
    let share = Within(2e-6, "band-limited sum over the map");
    for (rings, fill, gapped_fill, touching, gapped, nulls) in [
        (
            1,
            7.0 / 9.0,
            0.674_197_384_1,
            0.749_259_213,
            0.618_243_907,
            [1.300_785_74, 1.333_586_53],
        ),
        (
            2,
            19.0 / 25.0,
            0.640_982_923_8,
            0.752_344_499,
            0.613_765_234,
            [1.322_233_86, 1.344_288_93],
        ),
        (
            3,
            37.0 / 49.0,
            0.629_489_603_0,
            0.753_388_171,
            0.612_604_274,
            [1.327_758_08, 1.347_150_63],
        ),
    ] {
        for (size, fill, expected) in [(1.0, fill, touching), (0.9, gapped_fill, gapped)] {
            let setup = setup(&hexagonal_rings(rings, size, ""));
            EXACT.check("fill factor", setup.array.fill_factor(), fill);
            // A filled circle of D would give P·πD²/4/(λ·range)²: the peak falls by the fill.
            let filled = setup.array.envelope_area_m2() / WAVELENGTH_RANGE_M2.powi(2);
            EXACT.check("peak", ideal(&setup, Figure::PeakIrradiance) / filled, fill);
            let radius_m = 1.219_669_891_27 * setup.array.spot_m();
            share.check(
                "share within 1.22 spots",
                share_within(&setup, 2.0 * radius_m),
                expected,
            );
        }
        let array = array(&hexagonal_rings(rings, 1.0, ""));
        let spot_m = array.spot_m();
        let directions = Directions::new(&array, 4.0 * spot_m);
        for (degrees, null) in [0.0f64, 30.0].into_iter().zip(nulls) {
            let (sin, cos) = degrees.to_radians().sin_cos();
            let cut = |x: f64| directions.at(x * cos * spot_m, x * sin * spot_m);
            let (found, _) = least(cut, null - 0.2, null + 0.2);
            assert_close(
                &format!("null at {degrees}°"),
                found,
                null,
                2e-8,
                "eight decimals",
            );
        }
    }
}

/// Row 6.36: the fill times the gain of Klein & Degnan, Appl. Opt. 13, 2134 (1974) at the best
/// truncation, 0.8145 (value from memory); the products are derived.
#[test]
fn clipped_gaussians_in_hexagonal_rings_lose_fill_times_truncation() {
    for (rings, expected) in [(1, 0.633_522_365), (2, 0.619_041_854), (3, 0.615_052_325)] {
        let waist_m = PITCH_M / 2.0 / 1.120_906_422_78;
        let setup = setup(&hexagonal_rings(
            rings,
            1.0,
            &format!("profile = \"gaussian\"\nbeam_radius = \"{waist_m} m\""),
        ));
        let filled = setup.array.envelope_area_m2() / WAVELENGTH_RANGE_M2.powi(2);
        let kept = 1.0 - facula::farfield::pattern::clipping_loss(&setup.array.element);
        let peak = ideal(&setup, Figure::PeakIrradiance) / filled * kept;
        EXACT.check(&format!("{rings} rings"), peak, expected);
    }
}
