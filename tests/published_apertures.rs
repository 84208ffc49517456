//! One element against the printed diffraction patterns of single apertures.
//!
//! Digits that a publication prints are compared to half of their last place, and the many
//! digits that its formula gives more closely. "Value from memory" marks digits and formulas
//! that were not read again in the source; "derived" marks our own.

mod common;

use common::{Directions, UNIT_M, Within, bisect, cut, greatest, ideal, least, one, setup};
use common::{WAVELENGTH_RANGE_M2, share_within};
use facula::scenario::Figure;
use facula::study::setup::Setup;
use std::f64::consts::{FRAC_1_SQRT_2, PI};

const ROOT: Within = Within(
    2e-8,
    "a root of the exact pattern, given with eight decimals",
);
const ZERO: Within = Within(1e-15, "an exact null: the square of a root's rounding");
const FLAT: Within = Within(1e-6, "a maximum is flat: half of the digits");
const LEVEL: Within = Within(5e-9, "given with eight decimals");
const READ: Within = Within(
    2e-6,
    "read from the map between pixels: measured up to 5e-7",
);
const WIDTH: Within = Within(1e-4, "interpolated between pixels: measured up to 4.6e-5");
const AREA: Within = Within(2e-4, "area inside the half-maximum contour: measured 9e-5");
const EXACT: Within = Within(1e-12, "a closed form, to rounding");

/// Error of power shares on the painted grid. A square's straight edges meet the grid all along,
/// and its alias adds up: the share within 4.1 λ/size errs most.
const PAINTED: Within = Within(2e-4, "aliasing of the painted edges: measured up to 7e-5");
const PAINTED_SQUARE: Within = Within(1.8e-3, "aliasing of the painted edges: measured up to 9e-4");

/// A figure in units of λ·range/size.
fn in_units(setup: &Setup, figure: Figure) -> f64 {
    ideal(setup, figure) / UNIT_M
}

fn by_method(method: &str) -> String {
    format!("[run]\nmethod = \"{method}\"")
}

fn printed(decimals: i32) -> Within {
    Within(
        0.501 * 10f64.powi(-decimals),
        "half of the last printed place",
    )
}

/// Power shares of an element within radii given in λ·range/size, by both methods.
fn shares(shape: &str, element: &str, painted: Within, expected: &[(f64, f64)]) {
    let exact = Within(1e-6, "band-limited sum over the map: measured up to 4e-7");
    for (method, within) in [("direct", exact), ("sampled", painted)] {
        let setup = setup(&one(shape, element, &by_method(method)));
        for &(radius, share) in expected {
            let found = share_within(&setup, 2.0 * radius * UNIT_M);
            within.check(
                &format!("{shape}, {method}: share within {radius}"),
                found,
                share,
            );
        }
    }
}

/// Diameters that hold 50, 80 and 86.5 % against radii in λ·range/size; NaN is not checked.
fn diameters(shape: &str, radii: [f64; 3]) {
    let setup = setup(&one(shape, "", &by_method("direct")));
    for (figure, radius) in [
        Figure::Encircled50Diameter,
        Figure::Encircled80Diameter,
        Figure::Encircled86Diameter,
    ]
    .into_iter()
    .zip(radii)
    .filter(|(_, radius)| radius.is_finite())
    {
        READ.check(figure.name(), in_units(&setup, figure), 2.0 * radius);
    }
}

/// Born & Wolf, *Principles of Optics*, section 8.5.2 (values from memory); the shares were
/// first given by Rayleigh (1881), 83.8 % read in a page that quotes him.
#[test]
fn a_filled_circle_has_the_dark_rings_and_encircled_energies_of_airy() {
    let setup = setup(&one("circle", "", &by_method("direct")));
    let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
    let pattern = cut(&directions, false);
    let rings = [1.219_669_891_27, 2.233_130_594_38, 3.238_315_484_17];
    for (exact, digits) in rings.into_iter().zip([1.220, 2.233, 3.238]) {
        let (radius, dark) = least(&pattern, exact - 0.3, exact + 0.3);
        printed(3).check("dark ring", radius, digits);
        ROOT.check("dark ring", radius, exact);
        ZERO.check("dark ring", dark, 0.0);
    }
    let exact = [0.837_784_869_173, 0.909_930_535_086, 0.937_647_474_374];
    for (radius, digits) in rings.into_iter().zip([0.838, 0.910, 0.938]) {
        let share = share_within(&setup, 2.0 * radius * UNIT_M);
        printed(3).check("share within a dark ring", share, digits);
    }
    let rows: Vec<(f64, f64)> = rings.into_iter().zip(exact).collect();
    shares("circle", "", PAINTED, &rows);
    // 50, 80 and 86.5 %: derived.
    diameters("circle", [0.534_832_147_7, 0.896_942_102_6, 1.617_161_505]);
}

/// Half width 1.03 and side lobes: Born & Wolf, section 8.5.2 (values from memory); −17.6 dB
/// read in a page on circular apertures; the further digits are derived.
#[test]
fn a_filled_circle_has_the_half_width_and_side_lobes_of_airy() {
    let setup = setup(&one("circle", "", ""));
    let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
    let pattern = cut(&directions, false);
    let half = 2.0 * bisect(|x| pattern(x) - 0.5, 0.1, 1.0);
    printed(2).check("half width", half, 1.03);
    ROOT.check("half width", half, 1.028_993_969_96);
    WIDTH.check("fwhm_x", in_units(&setup, Figure::FwhmX), 1.028_993_969_96);
    WIDTH.check("fwhm_y", in_units(&setup, Figure::FwhmY), 1.028_993_969_96);
    AREA.check("fwhm", in_units(&setup, Figure::Fwhm), 1.028_993_969_96);
    let e2 = 2.0 * bisect(|x| pattern(x) - (-2.0f64).exp(), 0.1, 1.1);
    ROOT.check("1/e² width", e2, 1.644_922_989_56);
    for (digits, place, level) in [
        (0.0175, 1.634_719_35, 0.017_497_862_79),
        (0.0042, 2.679_292_024, 0.004_157_996_385),
    ] {
        let (x, found) = greatest(&pattern, place - 0.3, place + 0.3);
        printed(4).check("side lobe", found, digits);
        LEVEL.check("side lobe", found, level);
        FLAT.check("its place", x, place);
    }
    let lobe = ideal(&setup, Figure::SideLobeRatio);
    printed(1).check("side lobe of the map, dB", 10.0 * lobe.log10(), -17.6);
    Within(3e-5, "interpolated between pixels: measured 1.2e-5").check(
        "side lobe of the map",
        lobe,
        0.017_497_862_8,
    );
}

/// P·A/(λ·range)²: Born & Wolf, section 8.5.1 (value from memory); the number is derived.
#[test]
fn the_peak_of_a_filled_circle_is_power_times_area_over_wavelength_times_range_squared() {
    let setup = setup(
        "[beam]\nwavelength = \"1.06 um\"\npower = \"1 kW\"\n\
         [array]\nlayout = \"hexagonal\"\nrings = 0\n\
         [array.element]\nshape = \"circle\"\nsize = \"1 m\"\n[target]\nrange = \"1000 km\"\n\
         [run]\nmethod = \"direct\"\n",
    );
    let within = Within(1e-6, "given with ten digits");
    for figure in [Figure::AimIrradiance, Figure::PeakIrradiance] {
        within.check(figure.name(), ideal(&setup, figure), 699.001_569_4);
    }
}

/// ISO 11146-1 integrates over three times the width (rule from memory); the width that is
/// then consistent for the Airy pattern is derived.
#[test]
fn the_second_moment_width_over_three_widths_is_2_83_spots_for_a_filled_circle() {
    let setup = setup(&one("circle", "", ""));
    let within = Within(
        5e-5,
        "the iteration stops at a change of 1e-4: measured 1.1e-5",
    );
    for figure in [Figure::SecondMomentX, Figure::SecondMomentY] {
        within.check(figure.name(), in_units(&setup, figure), 2.827_215_12);
    }
}

/// First null, width and side lobes: Born & Wolf, section 8.5.1 and the textbooks on uniform
/// lines of sources (values from memory; 0.886 read in a page on uniform arrays).
#[test]
fn a_filled_square_has_the_pattern_of_two_slits() {
    let setup = setup(&one("square", "", ""));
    let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
    for along_v in [false, true] {
        let pattern = cut(&directions, along_v);
        let (null, dark) = least(&pattern, 0.8, 1.2);
        ROOT.check("first null", null, 1.0);
        ZERO.check("first null", dark, 0.0);
        let half = 2.0 * bisect(|x| pattern(x) - 0.5, 0.1, 1.0);
        printed(3).check("half width", half, 0.886);
        ROOT.check("half width", half, 0.885_892_941_379);
        let e2 = 2.0 * bisect(|x| pattern(x) - (-2.0f64).exp(), 0.1, 0.9);
        ROOT.check("1/e² width", e2, 1.400_005_228_97);
        for (digits_db, place, level) in [
            (-13.26, 1.430_296_653_1, 0.047_190_449_226),
            (-17.83, 2.459_024_033, 0.016_480_025_993),
        ] {
            let (x, found) = greatest(&pattern, place - 0.3, place + 0.3);
            printed(2).check("side lobe, dB", 10.0 * found.log10(), digits_db);
            LEVEL.check("side lobe", found, level);
            FLAT.check("its place", x, place);
        }
    }
    let diagonal = 1.430_296_653_1 * UNIT_M;
    let corner = directions.at(diagonal, diagonal) / directions.at(0.0, 0.0);
    LEVEL.check("diagonal side lobe", corner, 0.002_226_938_498_1);
    let read = Within(5e-5, "interpolated between pixels: measured 1.7e-5");
    read.check("fwhm_x", in_units(&setup, Figure::FwhmX), 0.885_892_941_4);
    read.check(
        "side lobe of the map",
        ideal(&setup, Figure::SideLobeRatio),
        0.047_190_449_2,
    );
    let aim = SIZE_SQUARED / WAVELENGTH_RANGE_M2.powi(2);
    EXACT.check("aim irradiance", directions.at(0.0, 0.0) / aim, 1.0);
}

const SIZE_SQUARED: f64 = common::SIZE_M * common::SIZE_M;

/// Rows 2.5 and 2.9 to 2.16, derived.
#[test]
fn a_filled_square_sends_81_5_per_cent_through_its_central_square() {
    // Pixel centres end exactly on the square's edges, where the irradiance is zero to second
    // order: their sum is the trapezoidal rule. D is the diagonal of the element.
    let run = format!(
        "[run]\nmethod = \"direct\"\nwindow = \"{} m\"\nsamples_per_spot = {}",
        2.0 * UNIT_M,
        32.0 * FRAC_1_SQRT_2
    );
    let square = setup(&one("square", "", &run));
    assert_eq!(square.grid.pixels, 65);
    Within(1.5e-7, "trapezoidal rule of 64 steps: measured 6e-8").check(
        "within the first nulls",
        ideal(&square, Figure::WindowFraction),
        0.815_089_971_657_01,
    );
    shares(
        "square",
        "",
        PAINTED_SQUARE,
        &[
            (0.5, 0.527_477_344_568),
            (1.0, 0.812_785_828_887),
            (1.219_669_891, 0.820_577_964_907),
            (2.0, 0.900_910_373_708),
            (4.143_311_22, 0.95),
        ],
    );
    diameters("square", [0.479_261_47, 0.874_366_14, f64::NAN]);
}

/// An annulus in units of λ·range/size.
struct Annulus {
    obscuration: f64,
    rings: [f64; 3],
    shares: [f64; 3],
    within_airy: f64,
    fwhm: f64,
    lobe: (f64, f64),
}

const ANNULI: [Annulus; 3] = [
    Annulus {
        obscuration: 0.2,
        rings: [1.166_506_78, 2.357_207_32, 3.088_516_62],
        shares: [0.763_762_674, 0.900_305_964, 0.907_519_995],
        within_airy: 0.763_918_836_8,
        fwhm: 1.006_752_08,
        lobe: (1.630_225_3, 0.030_350_247),
    },
    Annulus {
        obscuration: 0.33,
        rings: [1.097_683_43, 2.424_333_26, 3.137_210_74],
        shares: [0.654_259_752, 0.897_969_961, 0.904_034_185],
        within_airy: 0.656_497_491_8,
        fwhm: 0.971_978_876,
        lobe: (1.607_030_1, 0.053_968_234),
    },
    Annulus {
        obscuration: 0.5,
        rings: [1.000_906_05, 2.286_488_43, 3.490_152_3],
        shares: [0.478_622_324, 0.828_558_273, 0.901_481_682],
        within_airy: 0.492_998_734_7,
        fwhm: 0.911_669_406,
        lobe: (1.535_089_2, 0.096_336_54),
    },
];

/// Born & Wolf, section 8.6.2 (formulas from memory); Mahajan, *Optical Imaging and
/// Aberrations, part II* (found, digits not seen). The null of ε = 0.5 is printed as 1.00
/// (value from memory); the other digits are derived.
#[test]
fn an_obscured_circle_has_the_pattern_of_an_annulus() {
    for row in ANNULI {
        let element = format!("obscuration = {}", row.obscuration);
        let setup = setup(&one("circle", &element, &by_method("direct")));
        let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
        let pattern = cut(&directions, false);
        let mut expected = vec![(1.219_669_891, row.within_airy)];
        for (radius, share) in row.rings.into_iter().zip(row.shares) {
            let (found, _) = least(&pattern, radius - 0.2, radius + 0.2);
            ROOT.check("dark ring", found, radius);
            expected.push((radius, share));
        }
        shares("circle", &element, PAINTED, &expected);
        let half = 2.0 * bisect(|x| pattern(x) - 0.5, 0.1, 0.9);
        ROOT.check("half width", half, row.fwhm);
        WIDTH.check("fwhm_x", in_units(&setup, Figure::FwhmX), row.fwhm);
        AREA.check("fwhm", in_units(&setup, Figure::Fwhm), row.fwhm);
        let (place, level) = greatest(&pattern, row.lobe.0 - 0.3, row.lobe.0 + 0.3);
        LEVEL.check("first bright ring", level, row.lobe.1);
        FLAT.check("its radius", place, row.lobe.0);
        // The same power from less area: the peak falls by the area lost.
        let filled = PI / 4.0 * SIZE_SQUARED / WAVELENGTH_RANGE_M2.powi(2);
        let peak = directions.at(0.0, 0.0) / filled;
        EXACT.check(
            "peak over a filled circle's",
            peak,
            1.0 - row.obscuration.powi(2),
        );
        if row.obscuration > 0.4 {
            let (null, _) = least(&pattern, 0.8, 1.2);
            printed(2).check("first null of ε = 0.5", null, 1.00);
        }
    }
}

/// Section 3: derived; the transform itself stands in Smith & Marsh, JOSA 64, 798 (1974), from
/// memory. Two flats of our hexagon face ±x, so u runs across flats and v across corners.
#[test]
fn a_hexagon_has_its_own_nulls_and_side_lobes_across_flats_and_corners() {
    let setup = setup(&one("hexagon", "", &by_method("direct")));
    let directions = Directions::new(&setup.array, 8.0 * UNIT_M);
    for (along_v, null, half_width, place, level) in [
        (
            true,
            1.154_700_538_4,
            0.976_557_674_7,
            1.586_187,
            0.021_687_47,
        ),
        (
            false,
            1.169_214_093_4,
            0.976_720_559_9,
            1.525_524,
            0.012_534_39,
        ),
    ] {
        let pattern = cut(&directions, along_v);
        let (found, dark) = least(&pattern, null - 0.2, null + 0.2);
        ROOT.check("first null", found, null);
        ZERO.check("first null", dark, 0.0);
        let half = 2.0 * bisect(|x| pattern(x) - 0.5, 0.1, 1.0);
        ROOT.check("half width", half, half_width);
        let figure = if along_v {
            Figure::FwhmY
        } else {
            Figure::FwhmX
        };
        WIDTH.check(figure.name(), in_units(&setup, figure), half_width);
        let (x, found) = greatest(&pattern, place - 0.2, place + 0.2);
        LEVEL.check("side lobe", found, level);
        FLAT.check("its place", x, place);
    }
    shares(
        "hexagon",
        "",
        PAINTED,
        &[
            (0.5, 0.486_645_464_4),
            (1.0, 0.828_379_836_3),
            (1.22, 0.833_520_635_3),
            (2.0, 0.903_035_601_4),
            (3.0, 0.934_182_673_4),
        ],
    );
    diameters("hexagon", [0.510_235_32, 0.864_684_72, f64::NAN]);
    let aim = 0.75f64.sqrt() * SIZE_SQUARED / WAVELENGTH_RANGE_M2.powi(2);
    EXACT.check("aim irradiance", directions.at(0.0, 0.0) / aim, 1.0);
}
