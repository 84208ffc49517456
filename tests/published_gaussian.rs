//! A Gaussian beam clipped by one element against what was printed on its best radius.

mod common;

use common::{Directions, SIZE_M, UNIT_M, WAVELENGTH_RANGE_M2, Within, array, bisect, cut};
use common::{greatest, ideal, least, one, setup, share_within};
use facula::farfield::pattern::clipping_loss;
use facula::scenario::Figure;
use facula::study::setup::Setup;
use std::f64::consts::PI;

const FLAT: Within = Within(2e-6, "a maximum is flat: half of the digits");
const SUMS: Within = Within(1e-9, "Gauss-Legendre sums, given with nine digits or more");
const ROOT: Within = Within(
    2e-8,
    "a root of the exact pattern, given with eight decimals",
);

/// A Gaussian whose 1/e² irradiance radius is half of the size over `radius_over_waist`.
fn gaussian(radius_over_waist: f64, obscuration: f64) -> String {
    let waist_m = SIZE_M / 2.0 / radius_over_waist;
    format!("profile = \"gaussian\"\nbeam_radius = \"{waist_m} m\"\nobscuration = {obscuration}")
}

/// Aim irradiance over P₀·(area)/(λ·range)², P₀ being the power before clipping at the edge.
fn gain(shape: &str, radius_over_waist: f64, obscuration: f64) -> f64 {
    let area_m2 = SIZE_M * SIZE_M * if shape == "circle" { PI / 4.0 } else { 1.0 };
    let array = array(&one(shape, &gaussian(radius_over_waist, obscuration), ""));
    let aim = Directions::new(&array, UNIT_M).at(0.0, 0.0);
    aim * WAVELENGTH_RANGE_M2.powi(2) / area_m2 * (1.0 - clipping_loss(&array.element))
}

/// Aim irradiance without errors over P·(area of the circle D)/(λ·range)², of the map.
fn aperture_efficiency(setup: &Setup) -> f64 {
    let uniform = setup.array.power_w() * setup.array.envelope_area_m2();
    ideal(setup, Figure::AimIrradiance) * WAVELENGTH_RANGE_M2.powi(2) / uniform
}

/// Klein & Degnan, Appl. Opt. 13, 2134 (1974) and Buck, Proc. IEEE 55, 448 (1967): 1.12 and
/// 0.8145 (values from memory); further digits are derived.
#[test]
fn a_clipped_gaussian_serves_the_aim_point_best_at_1_12_waists() {
    let (best, highest) = greatest(|alpha| gain("circle", alpha, 0.0), 0.9, 1.4);
    Within(5e-3, "two printed decimals").check("best radius over waist", best, 1.12);
    Within(5e-5, "four printed decimals").check("gain there", highest, 0.8145);
    FLAT.check("best radius over waist", best, 1.120_906_422_78);
    SUMS.check("gain there", highest, 0.814_528_755_178);
    let setup = setup(&one(
        "circle",
        &gaussian(best, 0.0),
        "[run]\nmethod = \"direct\"",
    ));
    let kept = 1.0 - clipping_loss(&setup.array.element);
    SUMS.check("power through the edge", kept, 0.918_964_051_754);
    SUMS.check(
        "aperture efficiency",
        aperture_efficiency(&setup),
        0.886_355_405_985,
    );
}

/// Rows 5.5 to 5.9, derived.
#[test]
fn the_gain_of_a_clipped_gaussian_follows_its_closed_form_at_other_radii() {
    for (alpha, expected, taper) in [
        (0.5, 0.391_432_748_6, 0.994_824_014_2),
        (0.8, 0.698_288_913_6, 0.967_209_128_8),
        (1.0, 0.799_152_801_8, 0.924_234_314_5),
        (1.5, 0.711_387_153_3, 0.719_378_729_1),
        (2.0, 0.481_852_092_4, 0.482_013_790_0),
    ] {
        SUMS.check(
            &format!("gain at {alpha}"),
            gain("circle", alpha, 0.0),
            expected,
        );
        let setup = setup(&one(
            "circle",
            &gaussian(alpha, 0.0),
            "[run]\nmethod = \"direct\"",
        ));
        SUMS.check(
            &format!("aperture efficiency at {alpha}"),
            aperture_efficiency(&setup),
            taper,
        );
        let kept = 1.0 - (-2.0 * alpha * alpha).exp();
        SUMS.check(
            "power through the edge",
            1.0 - clipping_loss(&setup.array.element),
            kept,
        );
    }
}

/// Klein & Degnan's fit 1.12 − 1.30γ² + 2.12γ⁴ (value from memory); exact digits derived.
#[test]
fn an_obscured_gaussian_is_best_at_klein_and_degnans_radius() {
    for (gamma, best, highest) in [
        (0.2f64, 1.074_460_92, 0.708_806_365),
        (0.4, 0.976_327_062, 0.469_512_867),
    ] {
        let (alpha, found) = greatest(|alpha| gain("circle", alpha, gamma), 0.8, 1.4);
        let fit = 1.12 - 1.30 * gamma.powi(2) + 2.12 * gamma.powi(4);
        Within(0.0102, "their fit is good to about one per cent").check("the fit", alpha, fit);
        FLAT.check("best radius over waist", alpha, best);
        SUMS.check("gain there", found, highest);
    }
}

/// Row 5.13, derived.
#[test]
fn a_gaussian_clipped_by_a_square_is_best_at_0_99_waists_in_half_a_side() {
    let (best, highest) = greatest(|alpha| gain("square", alpha, 0.0), 0.8, 1.3);
    FLAT.check("best half side over waist", best, 0.989_939_082_842);
    SUMS.check("gain there", highest, 0.792_279_604_615);
}

/// Rows 5.14 to 5.16, derived.
#[test]
fn a_clipped_gaussian_spreads_as_its_transform_says() {
    let share = Within(
        1e-6,
        "band-limited sum over the map, radii given with seven digits",
    );
    for (alpha, fwhm, e2_width, null, within_airy, radius_865) in [
        (
            1.120_906_42,
            1.161_430_22,
            1.883_568_03,
            1.494_751_44,
            0.961_728_915,
            0.920_074_4,
        ),
        (
            1.0,
            1.131_503_02,
            1.829_191_41,
            1.425_776_74,
            0.950_424_032,
            0.913_148_7,
        ),
        (
            1.5,
            1.289_585_95,
            2.118_359_52,
            1.876_734_82,
            0.951_288_599,
            1.014_392,
        ),
    ] {
        let setup = setup(&one(
            "circle",
            &gaussian(alpha, 0.0),
            "[run]\nmethod = \"direct\"",
        ));
        let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
        let pattern = cut(&directions, false);
        let half = 2.0 * bisect(|x| pattern(x) - 0.5, 0.1, 1.0);
        ROOT.check("half width", half, fwhm);
        Within(5e-5, "interpolated between pixels: measured up to 1.7e-5").check(
            "fwhm_x",
            ideal(&setup, Figure::FwhmX) / UNIT_M,
            fwhm,
        );
        Within(2e-4, "area inside the half-maximum contour: measured 9e-5").check(
            "fwhm",
            ideal(&setup, Figure::Fwhm) / UNIT_M,
            fwhm,
        );
        let e2 = 2.0 * bisect(|x| pattern(x) - (-2.0f64).exp(), 0.1, 1.3);
        ROOT.check("1/e² width", e2, e2_width);
        let (found, _) = least(&pattern, null - 0.2, null + 0.2);
        ROOT.check("first null", found, null);
        let within = share_within(&setup, 2.0 * 1.219_669_891 * UNIT_M);
        share.check("share within 1.22", within, within_airy);
        let within = share_within(&setup, 2.0 * radius_865 * UNIT_M);
        share.check("share within the 86.5 % circle", within, 0.865);
    }
}
