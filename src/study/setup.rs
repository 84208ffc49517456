//! What every study starts from: the array laid out, its map and method chosen, and
//! the array without errors computed.

use crate::array::Array;
use crate::error::ScenarioError;
use crate::farfield::choose::{Choice, MEMORY_LIMIT_BYTES, Refusal, Task, choose, still_s};
use crate::farfield::closed_form::mean_map;
use crate::farfield::pattern::clipping_loss;
use crate::farfield::{Grid, Map};
use crate::figures::{Reader, Reading};
use crate::perturb::TrialErrors;
use crate::scenario::names::Named;
use crate::scenario::{Errors, Figure, Layout, MethodChoice, Scenario, Statistic, Window};

/// Most pixels a side that an automatic window takes for the 80 % circle.
const MOST_AUTO_PIXELS: usize = 2047;

/// Least share of a beam that an element must let through: less is lost in rounding.
const LEAST_PASSED: f64 = 1e-9;

/// Room around the 80 % circle without errors, so that errors may widen it.
const ROOM_AROUND_CIRCLE: f64 = 1.25;

/// A scenario ready to run.
#[derive(Debug)]
pub struct Setup {
    /// The scenario.
    pub scenario: Scenario,
    /// Its array.
    pub array: Array,
    /// Grid of the map.
    pub grid: Grid,
    /// How the far field of a trial is computed; with `closed_form`, that of the mean field.
    pub choice: Choice,
    /// Reads figures, with the array without errors as the reference.
    pub reader: Reader,
    /// Map of the array without errors.
    pub ideal_map: Map,
    /// Its figures.
    pub ideal: Reading,
    /// The mean map, where means in closed form are asked for and no trials.
    pub closed_form: Option<Map>,
}

impl Setup {
    /// Lay out the array and compute it without errors.
    ///
    /// # Errors
    /// What [`Array::new`] refuses, a map or an array beyond the memory limit, and
    /// bounds on figures that the array without errors does not have.
    pub fn new(scenario: Scenario) -> Result<Setup, ScenarioError> {
        let array = Array::new(&scenario)?;
        refuse_wild_tilts(&scenario, &array)?;
        if scenario.run.method == MethodChoice::ClosedForm {
            refuse_beyond_closed_form(&scenario, &array)?;
        }
        if clipping_loss(&array.element) > 1.0 - LEAST_PASSED {
            return Err(scenario.error(
                "array.element.beam_radius",
                "next to nothing of the beam passes the element",
                "make the beam wider, or the obscuration smaller",
            ));
        }
        let pixel_m = array.spot_m() / scenario.run.samples_per_spot;
        let (choice, reader, ideal_map, ideal) = match scenario.run.window {
            Window::Width { width_m } => {
                without_errors(&scenario, &array, Grid::covering(width_m, pixel_m))?
            }
            Window::Auto => automatic_window(&scenario, &array, pixel_m)?,
        };
        let closed_form = match scenario.run.method {
            MethodChoice::ClosedForm => Some(
                mean_map(&array, &scenario.errors, ideal_map.grid).map_err(|refusal| {
                    scenario.error("run.window", refusal.found, refusal.advice)
                })?,
            ),
            _ => None,
        };
        let setup = Setup {
            closed_form,
            grid: ideal_map.grid,
            scenario,
            array,
            choice,
            reader,
            ideal_map,
            ideal,
        };
        setup.refuse_undefined_bounds()?;
        Ok(setup)
    }

    /// Aim irradiance without errors over P·(area of the circle D)/(λ·range)².
    pub fn aperture_efficiency(&self) -> f64 {
        let array = &self.array;
        let filled = array.power_w() * array.envelope_area_m2()
            / (array.wavelength_m * array.range_m).powi(2);
        self.ideal_map.aim_w_m2() / filled
    }

    /// Name of the method.
    pub fn method(&self) -> &'static str {
        if self.closed_form.is_some() {
            MethodChoice::ClosedForm.name()
        } else {
            self.choice.method().name()
        }
    }

    /// Workers that fit in memory, of `threads`.
    pub fn workers(&self, threads: usize) -> usize {
        let room = (MEMORY_LIMIT_BYTES - self.choice.shared_bytes) / self.trial_bytes();
        threads.min(room as usize).max(1)
    }

    /// Bytes that a worker needs for a trial, map and figures included.
    pub fn trial_bytes(&self) -> f64 {
        let pixels = (self.grid.pixels as f64).powi(2);
        self.choice.worker_bytes + pixels * (4.0 * 8.0 + 16.0)
    }

    /// Seconds that reading the figures of one map takes on the reference machine.
    pub fn reading_s(&self) -> f64 {
        let pixels = self.grid.pixels as f64;
        // Two passes of transforms, bins by |f|, and the searches for peaks and widths.
        2.5e-4 + pixels * pixels * (20e-9 + 4e-9 * pixels.log2())
    }

    /// Seconds of one core that the predictions and the lobes take on the reference machine.
    pub fn predictions_s(&self) -> f64 {
        let maps = 1.0 + self.scenario.errors.sources() as f64;
        let pixels = self.grid.pixels as f64;
        // A still far field, the scattered part on a grid of its own, and a reading.
        let rows_s = still_s(&self.array, self.grid);
        let still_s = rows_s + 2e-3 + 1e-7 * pixels * pixels;
        maps * (20e-3 + still_s + self.reading_s()) + rows_s + 100e-3
    }

    fn refuse_undefined_bounds(&self) -> Result<(), ScenarioError> {
        for bound in &self.scenario.require.bounds {
            if self.ideal.figures.get(bound.figure).is_none() {
                let remedy = match bound.figure {
                    Figure::BucketPower | Figure::BucketFraction | Figure::BeamQuality => {
                        "state a target.bucket_diameter inside the window"
                    }
                    Figure::Strehl | Figure::StrehlPeak | Figure::CombiningEfficiency => {
                        "the array without errors puts next to no light on the aim point: change focus or offsets"
                    }
                    Figure::SideLobeRatio => "a larger run.window that holds a side lobe",
                    _ => "a larger run.window",
                };
                return Err(self.scenario.error(
                    &format!("require.{}", bound.figure.name()),
                    "this figure is undefined for the array without errors",
                    format!("to define it: {remedy}"),
                ));
            }
        }
        Ok(())
    }
}

/// Figures whose mean over trials is the figure of the mean map.
pub const LINEAR: [Figure; 4] = [
    Figure::Strehl,
    Figure::AimIrradiance,
    Figure::RadiatedPower,
    Figure::BucketPower,
];

/// Most elements that the closed form takes one by one, when each points elsewhere.
const MOST_POINTING: usize = 100_000_000;

/// Refuse what the closed form cannot say.
fn refuse_beyond_closed_form(scenario: &Scenario, array: &Array) -> Result<(), ScenarioError> {
    let require = &scenario.require;
    if require.statistic == Statistic::Trials && !require.bounds.is_empty() {
        return Err(scenario.error(
            "require.statistic",
            "bounds on single trials, with run.method = \"closed_form\"",
            "the closed form knows means only: use statistic = \"mean\" or \"long_exposure\", or another method",
        ));
    }
    let beyond = require
        .bounds
        .iter()
        .find(|bound| require.statistic == Statistic::Mean && !LINEAR.contains(&bound.figure));
    if let Some(bound) = beyond {
        return Err(scenario.error(
            &format!("require.{}", bound.figure.name()),
            "a bound on the mean of this figure, with run.method = \"closed_form\"",
            format!(
                "the closed form knows the means of {} only: use statistic = \"long_exposure\", or another method",
                LINEAR.map(Figure::name).join(", ")
            ),
        ));
    }
    if array.len() > MOST_POINTING && array.largest_tilt_rad() > 0.0 {
        let key = match scenario.array.layout {
            Layout::Table { .. } => "array.table",
            _ => "target.focus",
        };
        return Err(scenario.error(
            key,
            format!("{} elements that each point elsewhere, with run.method = \"closed_form\"", array.len()),
            format!("with static tilts the closed form holds at most {MOST_POINTING} elements: focus at the range, or take method = \"auto\""),
        ));
    }
    Ok(())
}

/// Refuse tilts that throw the elements' beams so far off that nothing combines, and
/// that would take sums of absurd length to say so.
fn refuse_wild_tilts(scenario: &Scenario, array: &Array) -> Result<(), ScenarioError> {
    let errors = &scenario.errors;
    let size_m = array.element.size_m;
    let beam_rad = array.wavelength_m / size_m;
    let inside_rad = array.curvature_per_m.abs() * size_m / 2.0;
    let steady = match scenario.array.layout {
        Layout::Table { .. } => "array.table",
        _ => "target.focus",
    };
    for (key, tilt_rad, most) in [
        ("errors.jitter", errors.jitter_rad.rms(), 10.0),
        (
            "errors.common_jitter",
            errors.common_jitter_rad.rms(),
            100.0,
        ),
        (steady, array.largest_tilt_rad(), 1000.0),
        ("target.focus", inside_rad, 1000.0),
    ] {
        let beams = tilt_rad / beam_rad;
        if beams > most * (1.0 + 1e-9) {
            return Err(scenario.error(
                key,
                format!("tilts of {tilt_rad:.3e} rad, {beams:.3e} times the beam of one element"),
                format!("at most {most} times λ/size = {beam_rad:.3e} rad can be computed"),
            ));
        }
    }
    Ok(())
}

type WithoutErrors = (Choice, Reader, Map, Reading);

/// The map of the array without errors on a grid, and its reading.
fn without_errors(
    scenario: &Scenario,
    array: &Array,
    grid: Grid,
) -> Result<WithoutErrors, ScenarioError> {
    let refused = |refusal: Refusal| {
        let key = if grid.pixels > MOST_AUTO_PIXELS {
            "run.window"
        } else {
            "run.method"
        };
        scenario.error(key, refusal.found, refusal.advice)
    };
    let method = scenario.run.method;
    let (task, method) = match method {
        MethodChoice::ClosedForm => {
            let mean = Task::mean_field(grid, scenario.errors.jitter_rad.rms());
            (mean, MethodChoice::Auto)
        }
        method => (Task::of_trials(grid, &scenario.errors), method),
    };
    let choice = choose(array, task, method).map_err(refused)?;
    let still = choose(array, Task::still(grid), method).map_err(refused)?;
    let mut map = Map::dark(grid);
    still
        .prepare(array)
        .worker()
        .irradiance(TrialErrors::none(&Errors::none()), &mut map);
    let mut reader = Reader::new(array, grid, scenario.target.bucket_diameter_m);
    let reading = reader.set_reference(array, &map);
    Ok((choice, reader, map, reading))
}

/// A window of 16 spots, twice the bucket, the reach of common jitter, and the 80 %
/// circle of the array without errors as far as 2047² pixels allow.
fn automatic_window(
    scenario: &Scenario,
    array: &Array,
    pixel_m: f64,
) -> Result<WithoutErrors, ScenarioError> {
    let spot_m = array.spot_m();
    let bucket_m = scenario.target.bucket_diameter_m.unwrap_or(0.0);
    let reach_m = 4.0 * array.range_m * scenario.errors.common_jitter_rad.rms() + 4.0 * spot_m;
    let least_m = (16.0 * spot_m).max(2.0 * bucket_m).max(2.0 * reach_m);
    let most_m = MOST_AUTO_PIXELS as f64 * pixel_m;
    let mut width_m = least_m;
    loop {
        let found = without_errors(scenario, array, Grid::covering(width_m, pixel_m))?;
        let circle_m = found.3.figures.get(Figure::Encircled80Diameter);
        match circle_m {
            Some(circle_m) => {
                let needed_m = (ROOM_AROUND_CIRCLE * circle_m).min(most_m).max(least_m);
                let grid = Grid::covering(needed_m, pixel_m);
                if grid.pixels == found.2.grid.pixels {
                    return Ok(found);
                }
                return without_errors(scenario, array, grid);
            }
            None if width_m >= most_m * (1.0 - 1e-9) => return Ok(found),
            None => width_m = (2.0 * width_m).min(most_m),
        }
    }
}
