//! What the benches share: arrays that are ready to run, and trials one after another.
#![allow(dead_code, reason = "each bench uses its share of these")]

use criterion::{Criterion, measurement::WallTime};
use facula::array::Array;
use facula::farfield::Map;
use facula::perturb::TrialErrors;
use facula::scenario::{Errors, MethodChoice, Scenario, Window};
use facula::study::setup::Setup;
use std::path::Path;
use std::time::Duration;

/// Pixels a side of the benches' maps.
pub const PIXELS: usize = 257;

/// Wavelength of [`square`].
pub const WAVELENGTH_M: f64 = 1e-6;
/// Range of [`square`].
pub const RANGE_M: f64 = 1e6;
/// Diameter of an element of [`square`], and distance of neighbours.
pub const SIZE_M: f64 = 0.1;

/// Errors of the usual trial; 0.5 µrad are 0.05 λ/size.
pub const ERRORS: &str =
    "piston = \"50 nm\"\njitter = \"0.5 urad\"\ndropout = \"2 %\"\npower_spread = \"5 %\"";

/// The scenario that users see first.
const DEMO: &str = include_str!("../../configs/crater_relay.toml");

/// Everything on one thread, here and inside the far fields.
pub fn one_thread() {
    // A second call finds the pool as it left it.
    let _ = rayon::ThreadPoolBuilder::new()
        .num_threads(1)
        .build_global();
}

/// A group of measurements, short enough that all benches take about two minutes.
pub fn group<'a>(
    criterion: &'a mut Criterion,
    name: &str,
) -> criterion::BenchmarkGroup<'a, WallTime> {
    one_thread();
    let mut group = criterion.benchmark_group(name);
    group
        .sample_size(20)
        .warm_up_time(Duration::from_millis(300))
        .measurement_time(Duration::from_millis(1500));
    group
}

fn scenario(text: &str) -> Scenario {
    Scenario::from_toml(text, "bench", Path::new("."), &[])
        .unwrap_or_else(|error| panic!("{error}\n{text}"))
}

/// Circular elements that touch, `side` × `side` of them, and 257 × 257 pixels of
/// `pixel_m`, or four to a spot.
pub fn square(side: usize, errors: &str, pixel_m: Option<f64>) -> Setup {
    let mut scenario = scenario(&format!(
        "[beam]\nwavelength = \"{WAVELENGTH_M} m\"\n\
         [array]\nlayout = \"square\"\nrows = {side}\ncolumns = {side}\npitch = \"{SIZE_M} m\"\n\
         [array.element]\nshape = \"circle\"\nsize = \"{SIZE_M} m\"\n\
         [target]\nrange = \"{RANGE_M} m\"\n[errors]\n{errors}\n\
         [run]\nmethod = \"factored\"\n"
    ));
    let array = Array::new(&scenario).unwrap_or_else(|error| panic!("{error}"));
    let pixel_m = pixel_m.unwrap_or(array.spot_m() / 4.0);
    scenario.run.samples_per_spot = array.spot_m() / pixel_m;
    scenario.run.window = Window::Width {
        width_m: PIXELS as f64 * pixel_m,
    };
    scenario.target.bucket_diameter_m = Some(PIXELS as f64 * pixel_m / 4.0);
    ready(scenario)
}

/// The demonstration scenario by one method.
pub fn demo(method: MethodChoice) -> Setup {
    let mut scenario = scenario(DEMO);
    scenario.run.method = method;
    ready(scenario)
}

fn ready(scenario: Scenario) -> Setup {
    Setup::new(scenario).unwrap_or_else(|error| panic!("{error}"))
}

/// Errors that draw nothing, yet send every element the way of a trial with errors: a
/// chance of dropout so small that no random word lies below it.
pub fn nothing_drawn() -> Errors {
    Errors {
        dropout: 1e-12,
        ..Errors::none()
    }
}

/// Trials one after another in the memory of one worker.
#[derive(Debug, Clone, Copy)]
pub struct Trials<'a> {
    /// The array made ready.
    pub setup: &'a Setup,
    /// Errors to draw, of no larger tilts than the setup's own.
    pub errors: &'a Errors,
    /// Whether the figures are read.
    pub figures: bool,
}

impl<'a> Trials<'a> {
    /// Whole trials of a setup: from drawing to figures.
    pub fn whole(setup: &'a Setup) -> Trials<'a> {
        Trials {
            setup,
            errors: &setup.scenario.errors,
            figures: true,
        }
    }

    /// Far fields alone, with other errors than the setup's.
    pub fn fields(setup: &'a Setup, errors: &'a Errors) -> Trials<'a> {
        Trials {
            setup,
            errors,
            figures: false,
        }
    }

    /// Call `measure` with a function that runs the next trial and leaves its map.
    pub fn run(self, measure: impl FnOnce(&mut dyn FnMut(&mut Map))) {
        let setup = self.setup;
        let far_field = setup.choice.prepare(&setup.array);
        let mut worker = far_field.worker();
        let mut workspace = setup.reader.workspace();
        let mut trial = 0;
        measure(&mut |map| {
            let errors = TrialErrors {
                errors: self.errors,
                seed: 1,
                trial,
            };
            trial += 1;
            let radiated = worker.irradiance(errors, map);
            if self.figures {
                let reading = setup.reader.read(map, radiated.power_w, &mut workspace);
                std::hint::black_box(reading);
            }
        });
    }
}
