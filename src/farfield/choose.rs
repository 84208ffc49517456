//! Which method computes a map, what it costs, and whether it fits in memory.

use super::pattern::{ElementPattern, Wavefront};
use super::{Direct, FarField, Grid, Method, Sampled, SampledPlan, cells_across_element};
use crate::array::Array;
use crate::scenario::MethodChoice;

/// What a far field may hold in memory, all workers together.
pub const MEMORY_LIMIT_BYTES: f64 = 4e9;

/// A method for an array and a map, with its cost foreseen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Choice {
    /// The method.
    pub method: Method,
    /// Bytes held once.
    pub shared_bytes: f64,
    /// Bytes held by each worker.
    pub worker_bytes: f64,
    /// Seconds to set up, on one core of a 2020s desktop processor.
    pub setup_s: f64,
    /// Seconds a trial, on one such core.
    pub trial_s: f64,
    /// Grid of the sampled method.
    pub sampled: SampledPlan,
}

/// Why no method can be used.
#[derive(Debug, Clone, PartialEq)]
pub struct Refusal {
    /// What was asked, and what it would take.
    pub found: String,
    /// What to do about it.
    pub advice: String,
}

impl Choice {
    /// Why this method, in a few words.
    pub fn reason(&self) -> String {
        match self.method {
            Method::Direct => "the sum over elements is the cheapest here".to_string(),
            Method::Sampled => format!(
                "the aperture painted on {0} × {0} points, one pruned transform a trial",
                self.sampled.length
            ),
        }
    }
}

/// The tilts that an array's elements will have.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Tilts {
    /// Rms per axis of each element's own tilt.
    pub jitter_rad: f64,
    /// Rms per axis of the tilt of all.
    pub common_jitter_rad: f64,
}

impl Tilts {
    /// Six deviations of both together: more than any draw reaches in practice.
    fn largest_rad(&self) -> f64 {
        6.0 * self.jitter_rad.hypot(self.common_jitter_rad)
    }
}

/// Choose a method.
///
/// # Errors
/// The method asked for (or, with `Auto`, every method) exceeds the memory limit, or is not one of these.
pub fn choose(
    array: &Array,
    grid: Grid,
    tilts: Tilts,
    requested: MethodChoice,
) -> Result<Choice, Refusal> {
    let pixels = (grid.pixels as f64).powi(2);
    if 8.0 * pixels * 4.0 > MEMORY_LIMIT_BYTES {
        return Err(Refusal {
            found: format!("a map of {0} × {0} pixels", grid.pixels),
            advice: "use a smaller run.window or run.samples_per_spot".to_string(),
        });
    }
    let direct = direct_choice(array, grid, tilts);
    let sampled = sampled_choice(array, grid, tilts);
    let fits = |choice: &Choice| choice.shared_bytes + choice.worker_bytes <= MEMORY_LIMIT_BYTES;
    match requested {
        MethodChoice::Direct => Ok(direct),
        MethodChoice::Sampled if fits(&sampled) => Ok(sampled),
        MethodChoice::Auto => Ok(if fits(&sampled) && sampled.trial_s < direct.trial_s {
            sampled
        } else {
            direct
        }),
        MethodChoice::Sampled => Err(Refusal {
            found: format!(
                "`sampled` would need {:.1} GB ({} elements on a grid of {} across)",
                (sampled.shared_bytes + sampled.worker_bytes) / 1e9,
                array.len(),
                sampled.sampled.length
            ),
            advice: format!(
                "at most {:.0} GB are used: take method = \"direct\", fewer elements or a smaller window",
                MEMORY_LIMIT_BYTES / 1e9
            ),
        }),
        MethodChoice::Factored | MethodChoice::ClosedForm => Err(Refusal {
            found: "a method that this version does not have".to_string(),
            advice: "use \"auto\", \"sampled\" or \"direct\"".to_string(),
        }),
    }
}

/// Make a method ready; `mean_over_tilt_rad` as in [`Wavefront`].
pub fn prepare<'a>(
    choice: &Choice,
    array: &'a Array,
    grid: Grid,
    tilts: Tilts,
    mean_over_tilt_rad: f64,
) -> Box<dyn FarField + 'a> {
    match choice.method {
        Method::Direct => Box::new(Direct::new(
            array,
            grid,
            mean_over_tilt_rad,
            tilts.jitter_rad.hypot(tilts.common_jitter_rad),
        )),
        Method::Sampled => Box::new(Sampled::new(
            array,
            grid,
            choice.sampled,
            mean_over_tilt_rad,
        )),
    }
}

/// Seconds of one round of [`reference_work`] on the machine that the costs below were taken on.
pub const REFERENCE_WORK_S: f64 = 25e-6;

/// Arithmetic of the kind that a trial is made of, to compare machines by.
pub fn reference_work(rounds: usize) {
    let fft = rustfft::FftPlanner::new().plan_fft_forward(2048);
    let mut line = vec![num_complex::Complex64::new(1.0, 0.5); 2048];
    let mut scratch = vec![num_complex::Complex64::default(); fft.get_inplace_scratch_len()];
    for _ in 0..rounds {
        fft.process_with_scratch(&mut line, &mut scratch);
        // Keeps the values finite over any number of rounds.
        line.iter_mut().for_each(|value| *value /= 2048f64.sqrt());
    }
    std::hint::black_box(line);
}

/// One complex multiply-add in a vectorised loop.
const MULTIPLY_ADD_S: f64 = 1.0e-9;
/// One sine and cosine.
const PHASOR_S: f64 = 20e-9;
/// One butterfly of a long transform: length × log₂ length of these make an FFT.
const BUTTERFLY_S: f64 = 0.9e-9;
/// One cell of a painted row.
const CELL_S: f64 = 4e-9;
/// Covered area of one cell.
const COVER_S: f64 = 60e-9;

fn direct_choice(array: &Array, grid: Grid, tilts: Tilts) -> Choice {
    let (elements, pixels) = (array.len() as f64, grid.pixels as f64);
    let each_its_own = tilts.jitter_rad > 0.0 || array.largest_tilt_rad() > 0.0;
    let pattern = ElementPattern::new(
        &array.element,
        array.wavenumber(),
        Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad: 0.0,
        },
        super::largest_angle_rad(array, grid, tilts.jitter_rad),
    );
    let patterns = if each_its_own { elements } else { 1.0 };
    let trial_s = elements * pixels * (PHASOR_S + pixels * MULTIPLY_ADD_S)
        + patterns * pixels * pixels * pattern.evaluations() * PHASOR_S;
    Choice {
        method: Method::Direct,
        shared_bytes: 0.0,
        worker_bytes: pixels * (24.0 * pixels + 16.0 * 512.0) + 40.0 * elements,
        setup_s: 0.0,
        trial_s,
        sampled: SampledPlan::new(array, grid, cells_across_element(array, grid), 0.0),
    }
}

fn sampled_choice(array: &Array, grid: Grid, tilts: Tilts) -> Choice {
    let largest = array.largest_tilt_rad() + tilts.largest_rad();
    let plan = SampledPlan::new(array, grid, cells_across_element(array, grid), largest);
    let length = plan.length as f64;
    let transforms = (plan.rows + grid.pixels) as f64;
    let cells = plan.shared_bytes / 8.0;
    let uniform = array.element.beam_radius_m.is_none() && array.curvature_per_m.abs() < 1e-30;
    Choice {
        method: Method::Sampled,
        shared_bytes: plan.shared_bytes,
        worker_bytes: plan.worker_bytes,
        setup_s: cells * COVER_S * if uniform { 1.0 } else { 5.0 },
        trial_s: transforms * length * length.log2() * BUTTERFLY_S + cells * CELL_S,
        sampled: plan,
    }
}
