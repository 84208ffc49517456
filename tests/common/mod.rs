//! What the outside checks share: scenarios, single directions, and one comparison.
#![allow(dead_code, reason = "each test crate uses its share of these")]

pub mod layouts;

use facula::array::{Array, Elements};
use facula::farfield::choose::{Task, choose};
use facula::farfield::pattern::{ElementPattern, Wavefront};
use facula::farfield::{
    Direct, FarField, Grid, Map, Radiated, Sampled, SampledPlan, cells_across_element,
};
use facula::figures::Reader;
use facula::perturb::{Draw, TrialErrors};
use facula::scenario::{Errors, Figure, MethodChoice, Scenario};
use facula::study::setup::Setup;
use facula::trials::Progress;
use num_complex::Complex64;
use std::path::Path;

/// λ·range of every scenario that [`text`] writes, in m²: 1 µm over 1 km.
pub const WAVELENGTH_RANGE_M2: f64 = 1e-3;

/// Fail unless `found` lies within `tolerance` of `expected`.
///
/// The one place where floats are compared; `reason` says where the tolerance comes from.
#[track_caller]
pub fn assert_close(what: &str, found: f64, expected: f64, tolerance: f64, reason: &str) {
    let difference = (found - expected).abs();
    println!("{what}: {found} for {expected}, off by {difference:.2e} of {tolerance:.1e}");
    assert!(
        difference <= tolerance,
        "{what}: {found}, expected {expected}: off by {difference:.3e}, allowed {tolerance:.3e} ({reason})"
    );
}

/// A tolerance and where it comes from.
#[derive(Debug, Clone, Copy)]
pub struct Within(pub f64, pub &'static str);

impl Within {
    /// Fail unless `found` agrees with `expected`.
    #[track_caller]
    pub fn check(self, what: &str, found: f64, expected: f64) {
        assert_close(what, found, expected, self.0, self.1);
    }
}

/// A scenario at 1 µm and 1 km; `rest` continues `[target]` and may open other sections.
pub fn text(array: &str, element: &str, rest: &str) -> String {
    format!(
        "[beam]\nwavelength = \"1 um\"\n[array]\n{array}\n[array.element]\n{element}\n[target]\nrange = \"1 km\"\n{rest}\n"
    )
}

/// Size of the element of [`one`].
pub const SIZE_M: f64 = 0.1;

/// λ·range/size of [`one`].
pub const UNIT_M: f64 = WAVELENGTH_RANGE_M2 / SIZE_M;

/// A scenario of a single element.
pub fn one(shape: &str, element: &str, rest: &str) -> String {
    text(
        "layout = \"square\"\nrows = 1\ncolumns = 1",
        &format!("shape = \"{shape}\"\nsize = \"{SIZE_M} m\"\n{element}"),
        rest,
    )
}

/// The exact pattern along u or v over its value at the aim point, in λ·range/size of [`one`].
pub fn cut(directions: &Directions<'_>, along_v: bool) -> impl Fn(f64) -> f64 {
    let aim = directions.at(0.0, 0.0);
    move |x| {
        let (u, v) = if along_v { (0.0, x) } else { (x, 0.0) };
        directions.at(u * UNIT_M, v * UNIT_M) / aim
    }
}

/// Read a scenario.
#[track_caller]
pub fn scenario(text: &str) -> Scenario {
    scenario_in(Path::new("."), text)
}

/// Read a scenario whose tables lie in `folder`.
#[track_caller]
pub fn scenario_in(folder: &Path, text: &str) -> Scenario {
    Scenario::from_toml(text, "test.toml", folder, &[])
        .unwrap_or_else(|error| panic!("{error}\n{text}"))
}

/// Lay out the array of a scenario.
#[track_caller]
pub fn array(text: &str) -> Array {
    array_of(&scenario(text))
}

/// Lay out the array of a scenario that is read.
#[track_caller]
pub fn array_of(scenario: &Scenario) -> Array {
    Array::new(scenario).unwrap_or_else(|error| panic!("{error}"))
}

/// A scenario ready to run, with the array without errors computed.
#[track_caller]
pub fn setup(text: &str) -> Setup {
    Setup::new(scenario(text)).unwrap_or_else(|error| panic!("{error}\n{text}"))
}

/// A figure of the array without errors.
#[track_caller]
pub fn ideal(setup: &Setup, figure: Figure) -> f64 {
    setup
        .ideal
        .figures
        .get(figure)
        .unwrap_or_else(|| panic!("{} is undefined", figure.key()))
}

/// Share of P within a circle of `diameter_m`, of the array without errors.
pub fn share_within(setup: &Setup, diameter_m: f64) -> f64 {
    let reading = Reader::new(&setup.array, setup.grid, Some(diameter_m))
        .set_reference(&setup.array, &setup.ideal_map);
    reading
        .figures
        .get(Figure::BucketFraction)
        .unwrap_or_else(|| panic!("a bucket of {diameter_m} m does not fit"))
}

/// Irradiance without errors in single directions, through the direct sum.
pub struct Directions<'a> {
    direct: Direct<'a>,
    range_m: f64,
}

impl<'a> Directions<'a> {
    /// For points up to `reach_m` from the aim point.
    pub fn new(array: &'a Array, reach_m: f64) -> Directions<'a> {
        let everywhere = Grid {
            pixels: 1,
            pixel_m: 2.0 * reach_m,
        };
        Directions {
            direct: Direct::new(array, Task::still(everywhere)),
            range_m: array.range_m,
        }
    }

    /// At (u, v), in W/m².
    pub fn at(&self, u_m: f64, v_m: f64) -> f64 {
        self.direct
            .irradiance_without_errors_at(u_m / self.range_m, v_m / self.range_m)
    }
}

/// Irradiance of one trial anywhere, summed here over its listed elements.
pub struct Anywhere<'a> {
    array: &'a Array,
    elements: Elements,
    draw: Draw,
    pattern: ElementPattern,
}

impl<'a> Anywhere<'a> {
    /// For points up to `reach_m` from the aim point and tilts as large as the draw's.
    pub fn new(array: &'a Array, trial: TrialErrors<'_>, reach_m: f64) -> Anywhere<'a> {
        let draw = Draw::of_trial(array, trial);
        let (common_x, common_y) = draw.common_tilt_rad;
        let tilt = draw
            .tilt_x_rad
            .iter()
            .chain(&draw.tilt_y_rad)
            .chain([&common_x, &common_y])
            .fold(0.0, |largest: f64, tilt| largest.max(tilt.abs()));
        let reach_rad = reach_m / array.range_m + 3.0 * (tilt + array.largest_tilt_rad());
        let wavefront = Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad: 0.0,
        };
        Anywhere {
            array,
            elements: array.list(),
            pattern: ElementPattern::new(&array.element, array.wavenumber(), wavefront, reach_rad),
            draw,
        }
    }

    /// At (u, v), in W/m².
    pub fn at(&self, u_m: f64, v_m: f64) -> f64 {
        let (elements, draw, k) = (&self.elements, &self.draw, self.array.wavenumber());
        let (common_x, common_y) = draw.common_tilt_rad;
        let x = u_m / self.array.range_m - common_x;
        let y = v_m / self.array.range_m - common_y;
        let field: Complex64 = (0..elements.len())
            .map(|n| {
                let path_m = x * elements.x_m[n] + y * elements.y_m[n];
                let phase = elements.phase_rad[n] + draw.phase_rad[n] - k * path_m;
                let amplitude = elements.amplitude[n] * draw.amplitude[n];
                let tilt_x = elements.tilt_x_rad[n] + draw.tilt_x_rad[n];
                let tilt_y = elements.tilt_y_rad[n] + draw.tilt_y_rad[n];
                Complex64::from_polar(amplitude, phase) * self.pattern.at(x - tilt_x, y - tilt_y)
            })
            .sum();
        field.norm_sqr() / (self.array.wavelength_m * self.array.range_m).powi(2)
    }

    /// Power of the trial, in W.
    pub fn power_w(&self) -> f64 {
        let amplitudes = self.elements.amplitude.iter().zip(&self.draw.amplitude);
        amplitudes
            .map(|(whole, factor)| (whole * factor).powi(2))
            .sum()
    }
}

/// The map of a trial by a far field, and what it radiates.
pub fn map(far_field: &dyn FarField, trial: TrialErrors<'_>) -> (Map, Radiated) {
    let mut map = Map::dark(far_field.grid());
    let radiated = far_field.worker().irradiance(trial, &mut map);
    (map, radiated)
}

/// The map without errors by a far field.
pub fn still_map(far_field: &dyn FarField) -> Map {
    map(far_field, TrialErrors::none(&Errors::none())).0
}

/// A far field by the method asked for.
#[track_caller]
pub fn prepared(array: &Array, task: Task, method: MethodChoice) -> Box<dyn FarField + '_> {
    choose(array, task, method)
        .unwrap_or_else(|refusal| panic!("{refusal:?}"))
        .prepare(array)
}

/// The sampled method, `finer` times as many cells across an element as it would take.
pub fn sampled(array: &Array, task: Task, finer: f64) -> Sampled<'_> {
    let largest = array.largest_tilt_rad() + 6.0 * task.jitter_rad.hypot(task.common_jitter_rad);
    let grid = task.grid;
    let usual = SampledPlan::new(array, grid, cells_across_element(array, grid), largest);
    let cells = finer * array.element.size_m / usual.pitch_m;
    let plan = if finer > 1.0 {
        SampledPlan::new(array, grid, cells, largest)
    } else {
        usual
    };
    Sampled::new(array, grid, plan, task.mean_over_tilt_rad)
}

/// A zero of `f` between `low` and `high`, where its signs differ.
#[track_caller]
pub fn bisect(f: impl Fn(f64) -> f64, mut low: f64, mut high: f64) -> f64 {
    let rising = f(high) > 0.0;
    assert!((f(low) > 0.0) != rising, "no change of sign");
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if (f(middle) > 0.0) == rising {
            high = middle;
        } else {
            low = middle;
        }
    }
    0.5 * (low + high)
}

/// Where `f` is least between `low` and `high`, and its value there (golden section).
pub fn least(f: impl Fn(f64) -> f64, mut low: f64, mut high: f64) -> (f64, f64) {
    let ratio = (5f64.sqrt() - 1.0) / 2.0;
    for _ in 0..60 {
        let (left, right) = (high - ratio * (high - low), low + ratio * (high - low));
        if f(left) < f(right) {
            high = right;
        } else {
            low = left;
        }
    }
    let x = 0.5 * (low + high);
    (x, f(x))
}

/// Where `f` is greatest between `low` and `high`, and its value there.
pub fn greatest(f: impl Fn(f64) -> f64, low: f64, high: f64) -> (f64, f64) {
    let (x, value) = least(|x| -f(x), low, high);
    (x, -value)
}

/// ∫f from `low` to `high`: five Gauss points on each of `panels` parts.
pub fn integral(f: impl Fn(f64) -> f64, low: f64, high: f64, panels: usize) -> f64 {
    gauss_nodes(low, high, panels)
        .into_iter()
        .map(|(x, weight)| weight * f(x))
        .sum()
}

/// Nodes and weights of five Gauss points on each of `panels` parts (Abramowitz & Stegun, table 25.4).
pub fn gauss_nodes(low: f64, high: f64, panels: usize) -> Vec<(f64, f64)> {
    const RULE: [(f64, f64); 5] = [
        (-0.906_179_845_938_664, 0.236_926_885_056_189_1),
        (-0.538_469_310_105_683_1, 0.478_628_670_499_366_5),
        (0.0, 0.568_888_888_888_888_9),
        (0.538_469_310_105_683_1, 0.478_628_670_499_366_5),
        (0.906_179_845_938_664, 0.236_926_885_056_189_1),
    ];
    let half = 0.5 * (high - low) / panels as f64;
    (0..panels)
        .flat_map(|panel| {
            let middle = low + half * (2 * panel + 1) as f64;
            RULE.map(|(x, weight)| (middle + half * x, half * weight))
        })
        .collect()
}

/// A study's progress that nobody watches.
#[derive(Debug)]
pub struct Unwatched;

impl Progress for Unwatched {
    fn stage(&self, _: &str, _: u64) {}
    fn advance(&self, _: u64) {}
}
