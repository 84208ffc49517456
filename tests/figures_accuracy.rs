//! Figures read at the default sampling against the irradiance they stand for.
//!
//! The reference takes no map: it integrates the direct sum over discs in polar coordinates
//! (five Gauss points on each panel of radius, a trapezoidal rule in azimuth, converged to 1e-7
//! of P), climbs to the peak, and follows the half-maximum contour along rays from it.

mod common;

use common::{Anywhere, array_of, assert_close, bisect, gauss_nodes, greatest, map, scenario};
use common::{prepared, text};
use facula::farfield::choose::Task;
use facula::farfield::{Direct, Grid};
use facula::figures::{Figures, Reader};
use facula::perturb::TrialErrors;
use facula::scenario::{Figure, MethodChoice, Scenario};
use rayon::prelude::*;
use std::f64::consts::TAU;

/// Radii in spots λ·range/D.
const RADII: [f64; 9] = [0.25, 0.5, 0.75, 1.0, 1.22, 2.0, 3.0, 5.0, 8.0];

/// Arrays with the errors of one trial; the last takes a wide window for its grating lobes.
fn cases() -> Vec<(&'static str, Scenario)> {
    let errors = "[errors]\npiston = \"0.5 rad\"\njitter = \"1 urad\"\ncommon_jitter = \"0.4 urad\"\n\
                  dropout = 0.1\npower_spread = 0.3\n";
    let circle = "shape = \"circle\"\nsize = \"0.1 m\"";
    [
        ("circle", "layout = \"hexagonal\"\nrings = 0", circle, ""),
        (
            "nineteen circles",
            "layout = \"hexagonal\"\nrings = 2\npitch = \"0.11 m\"",
            circle,
            "",
        ),
        (
            "nineteen circles with errors",
            "layout = \"hexagonal\"\nrings = 2\npitch = \"0.11 m\"",
            circle,
            errors,
        ),
        (
            "squares with errors",
            "layout = \"square\"\nrows = 3\ncolumns = 5",
            "shape = \"square\"\nsize = \"0.1 m\"",
            errors,
        ),
        (
            "hexagons about a gap",
            "layout = \"hexagonal\"\noutline = \"square\"\nacross = \"0.3 m\"\norigin = \"gap\"",
            "shape = \"hexagon\"\nsize = \"0.1 m\"",
            errors,
        ),
    ]
    .into_iter()
    .map(|(name, layout, element, errors)| (name, scenario(&text(layout, element, errors))))
    .collect()
}

struct Read {
    figures: Figures,
    shares: Vec<f64>,
}

/// The trial that every check takes.
fn trial(scenario: &Scenario) -> TrialErrors<'_> {
    TrialErrors {
        errors: &scenario.errors,
        seed: 6,
        trial: 2,
    }
}

/// All figures, and the shares within [`RADII`], at four samples a spot.
fn read(scenario: &Scenario, method: MethodChoice) -> Read {
    let array = array_of(scenario);
    let spot_m = array.spot_m();
    let grid = Grid::covering(16.0 * spot_m, spot_m / 4.0);
    let task = Task::of_trials(grid, &scenario.errors);
    let (map, radiated) = map(prepared(&array, task, method).as_ref(), trial(scenario));
    let power = radiated.power_w;
    let reading = |diameter_m: f64| {
        let reader = Reader::new(&array, grid, Some(diameter_m));
        reader.read(&map, power, &mut reader.workspace()).figures
    };
    Read {
        figures: reading(spot_m),
        shares: RADII
            .iter()
            .map(|radius| {
                let figures = reading(2.0 * radius * spot_m);
                figures.get(Figure::BucketFraction).unwrap_or(f64::NAN)
            })
            .collect(),
    }
}

/// Power of a draw within each of [`RADII`], in shares of P.
fn exact_shares(directions: &Anywhere<'_>, spot_m: f64, power: f64) -> Vec<f64> {
    let mut from = 0.0;
    let mut sum = 0.0;
    RADII
        .iter()
        .map(|&to| {
            // Two periods of the band limit a spot, and as many around the circle.
            let panels = (2.0 * (to - from)).ceil() as usize + 1;
            let azimuths = 32 + (16.0 * to) as usize;
            sum += gauss_nodes(from * spot_m, to * spot_m, panels)
                .into_par_iter()
                .map(|(r, weight)| {
                    (0..azimuths)
                        .map(|index| {
                            let (sin, cos) = (TAU * index as f64 / azimuths as f64).sin_cos();
                            weight * r * directions.at(r * cos, r * sin)
                        })
                        .sum::<f64>()
                        * TAU
                        / azimuths as f64
                })
                .sum::<f64>();
            from = to;
            sum / power
        })
        .collect()
}

/// The highest point of a draw: the brightest of a coarse net, then along u and v in turn.
fn exact_peak(directions: &Anywhere<'_>, spot_m: f64) -> (f64, f64, f64) {
    let net = (-40..=40).flat_map(|j| (-40..=40).map(move |i| (f64::from(i), f64::from(j))));
    let (mut u, mut v) = net
        .map(|(i, j)| (0.1 * i * spot_m, 0.1 * j * spot_m))
        .max_by(|a, b| directions.at(a.0, a.1).total_cmp(&directions.at(b.0, b.1)))
        .unwrap_or((0.0, 0.0));
    for _ in 0..20 {
        u = greatest(|u| directions.at(u, v), u - 0.1 * spot_m, u + 0.1 * spot_m).0;
        v = greatest(|v| directions.at(u, v), v - 0.1 * spot_m, v + 0.1 * spot_m).0;
    }
    (u, v, directions.at(u, v))
}

#[test]
fn power_in_circles_of_a_quarter_to_eight_spots_is_read_to_a_thousandth() {
    for (name, scenario) in cases() {
        let array = array_of(&scenario);
        let spot_m = array.spot_m();
        let directions = Anywhere::new(&array, trial(&scenario), 9.0 * spot_m);
        let exact = exact_shares(&directions, spot_m, directions.power_w());
        for (method, choice, tolerance) in [
            ("direct", MethodChoice::Direct, 1.5e-4),
            ("factored", MethodChoice::Factored, 1.5e-4),
            ("sampled", MethodChoice::Sampled, 8e-4),
        ] {
            let found = read(&scenario, choice).shares;
            for ((radius, found), expected) in RADII.iter().zip(found).zip(&exact) {
                assert_close(
                    &format!("{name}, {method}: share within {radius} spots"),
                    found,
                    *expected,
                    tolerance,
                    "1e-3 is promised; measured up to 6e-5 for direct and factored, 3e-4 for sampled",
                );
            }
        }
    }
}

#[test]
fn peaks_and_widths_are_read_to_a_thousandth() {
    let reason = "1e-3 is promised; measured up to 2.1e-4";
    for (name, scenario) in cases() {
        let array = array_of(&scenario);
        let spot_m = array.spot_m();
        let directions = Anywhere::new(&array, trial(&scenario), 9.0 * spot_m);
        let (u, v, peak) = exact_peak(&directions, spot_m);
        // Distance from the peak to half of it, along an azimuth.
        let ray = |azimuth: f64| {
            let (sin, cos) = azimuth.sin_cos();
            let below = |r: f64| directions.at(u + r * cos, v + r * sin) - 0.5 * peak;
            let step = 0.02 * spot_m;
            let out = (1..500)
                .map(|n| f64::from(n) * step)
                .find(|&r| below(r) < 0.0);
            let out = out.unwrap_or_else(|| panic!("no half along {azimuth}"));
            bisect(below, out - step, out)
        };
        let rays = 360;
        let area: f64 = (0..rays)
            .map(|index| 0.5 * ray(TAU * f64::from(index) / f64::from(rays)).powi(2))
            .sum::<f64>()
            * TAU
            / f64::from(rays);
        let quarter = TAU / 4.0;
        for (method, choice) in [
            ("direct", MethodChoice::Direct),
            ("factored", MethodChoice::Factored),
            ("sampled", MethodChoice::Sampled),
        ] {
            let figures = read(&scenario, choice).figures;
            let check = |figure: Figure, expected: f64, scale: f64| {
                let found = figures.get(figure).unwrap_or(f64::NAN);
                assert_close(
                    &format!("{name}, {method}: {}", figure.name()),
                    found / scale,
                    expected / scale,
                    5e-4,
                    reason,
                );
            };
            check(Figure::PeakIrradiance, peak, peak);
            check(Figure::AimIrradiance, directions.at(0.0, 0.0), peak);
            check(Figure::Offset, u.hypot(v), spot_m);
            check(Figure::FwhmX, ray(0.0) + ray(2.0 * quarter), spot_m);
            check(Figure::FwhmY, ray(quarter) + ray(3.0 * quarter), spot_m);
            check(Figure::Fwhm, 2.0 * (2.0 * area / TAU).sqrt(), spot_m);
        }
    }
}

/// Circles, widths and side lobe of a map eight times as fine, which needs less interpolation.
#[test]
fn figures_at_the_default_sampling_are_those_of_a_map_eight_times_as_fine() {
    for (name, scenario) in cases() {
        let array = array_of(&scenario);
        let spot_m = array.spot_m();
        let figures = |samples: f64| {
            let grid = Grid::covering(16.25 * spot_m, spot_m / samples);
            let task = Task::of_trials(grid, &scenario.errors);
            let (map, radiated) = map(&Direct::new(&array, task), trial(&scenario));
            let reader = Reader::new(&array, grid, None);
            reader
                .read(&map, radiated.power_w, &mut reader.workspace())
                .figures
        };
        let (usual, fine) = (figures(4.0), figures(32.0));
        for (figure, scale) in [
            (Figure::Encircled50Diameter, spot_m),
            (Figure::Fwhm, spot_m),
            (Figure::FwhmX, spot_m),
            (Figure::FwhmY, spot_m),
            (Figure::SecondMomentX, spot_m),
            (Figure::SecondMomentY, spot_m),
            (Figure::SideLobeRatio, 1.0),
            (
                Figure::PeakIrradiance,
                fine.get(Figure::PeakIrradiance).unwrap_or(f64::NAN),
            ),
        ] {
            match (usual.get(figure), fine.get(figure)) {
                (Some(found), Some(expected)) => assert_close(
                    &format!("{name}: {}", figure.name()),
                    found / scale,
                    expected / scale,
                    5e-4,
                    "1e-3 is promised; measured up to 2.1e-4",
                ),
                (found, expected) => assert!(
                    found.is_none() && expected.is_none(),
                    "{name}: {} is {found:?} and {expected:?}",
                    figure.name()
                ),
            }
        }
    }
}
