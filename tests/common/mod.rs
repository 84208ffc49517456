//! What the outside checks share: scenarios, single directions, and one comparison.
#![allow(dead_code, reason = "each test crate uses its share of these")]

use facula::array::Array;
use facula::farfield::choose::Tilts;
use facula::farfield::{Direct, FarField, Grid, Map, Sampled, SampledPlan, cells_across_element};
use facula::figures::Reader;
use facula::perturb::Draw;
use facula::scenario::{Figure, Scenario};
use facula::study::setup::Setup;
use facula::trials::Progress;
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
    none: Draw,
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
            direct: Direct::new(array, everywhere, 0.0, 0.0),
            none: Draw::none(array.len()),
            range_m: array.range_m,
        }
    }

    /// At (u, v), in W/m².
    pub fn at(&self, u_m: f64, v_m: f64) -> f64 {
        self.of(&self.none, u_m, v_m)
    }

    /// At (u, v) with the errors of a draw, in W/m².
    pub fn of(&self, draw: &Draw, u_m: f64, v_m: f64) -> f64 {
        self.direct
            .irradiance_at(draw, u_m / self.range_m, v_m / self.range_m)
    }
}

/// The map of a draw by a far field.
pub fn map(far_field: &dyn FarField, draw: &Draw) -> Map {
    let mut map = Map::dark(far_field.grid());
    far_field.worker().irradiance(draw, &mut map);
    map
}

/// The direct sum for a grid and tilts.
pub fn direct(array: &Array, grid: Grid, tilts: Tilts) -> Direct<'_> {
    let rms = tilts.jitter_rad.hypot(tilts.common_jitter_rad);
    Direct::new(array, grid, 0.0, rms)
}

/// The sampled method, `finer` times as many cells across an element as it would take.
pub fn sampled(array: &Array, grid: Grid, tilts: Tilts, finer: f64) -> Sampled<'_> {
    let largest = array.largest_tilt_rad() + 6.0 * tilts.jitter_rad.hypot(tilts.common_jitter_rad);
    let usual = SampledPlan::new(array, grid, cells_across_element(array, grid), largest);
    let cells = finer * array.element.size_m / usual.pitch_m;
    let plan = if finer > 1.0 {
        SampledPlan::new(array, grid, cells, largest)
    } else {
        usual
    };
    Sampled::new(array, grid, plan, 0.0)
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
