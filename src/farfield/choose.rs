//! Which method computes a map, what it costs, and whether it fits in memory.

use super::factored::expand;
use super::kernel::{Axis, WIDTH};
use super::pattern::{ElementPattern, Wavefront};
use super::tilt::TiltExpansion;
use super::{Direct, Factored, FarField, Grid, Method, Sampled, SampledPlan, cells_across_element};
use crate::array::{Array, Sites};
use crate::scenario::{Errors, MethodChoice};

/// What a far field may hold in memory, all workers together.
pub const MEMORY_LIMIT_BYTES: f64 = 4e9;

/// The maps that are wanted, and the tilts that elements will have in them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Task {
    /// Grid of the maps.
    pub grid: Grid,
    /// Rms per axis of each element's own tilt.
    pub jitter_rad: f64,
    /// Rms per axis of the tilt of all.
    pub common_jitter_rad: f64,
    /// Rms per axis of tilts over which each element's field is averaged instead, as in [`Wavefront`].
    pub mean_over_tilt_rad: f64,
}

impl Task {
    /// Maps without random tilts.
    pub fn still(grid: Grid) -> Task {
        Task {
            grid,
            jitter_rad: 0.0,
            common_jitter_rad: 0.0,
            mean_over_tilt_rad: 0.0,
        }
    }

    /// Maps of trials with these errors.
    pub fn of_trials(grid: Grid, errors: &Errors) -> Task {
        Task {
            jitter_rad: errors.jitter_rad.rms(),
            common_jitter_rad: errors.common_jitter_rad.rms(),
            ..Task::still(grid)
        }
    }

    /// The mean field over jitter.
    pub fn mean_field(grid: Grid, jitter_rad: f64) -> Task {
        Task {
            mean_over_tilt_rad: jitter_rad,
            ..Task::still(grid)
        }
    }
}

/// A method for an array and a task, with its cost foreseen.
#[derive(Debug, Clone)]
pub struct Choice {
    /// The task.
    pub task: Task,
    /// How it is done.
    plan: Plan,
    /// Why this method.
    pub why: &'static str,
    /// Bytes held once.
    pub shared_bytes: f64,
    /// Bytes held by each worker.
    pub worker_bytes: f64,
    /// Seconds to set up, on one core of the reference machine.
    pub setup_s: f64,
    /// Seconds a trial, on one such core.
    pub trial_s: f64,
}

/// The reason of a method that the scenario names.
const AS_ASKED: &str = "as run.method asks";

/// What a method needs to know in advance.
#[derive(Debug, Clone)]
enum Plan {
    Direct,
    Sampled(SampledPlan),
    Factored(TiltExpansion),
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
    /// The method.
    pub fn method(&self) -> Method {
        match self.plan {
            Plan::Direct => Method::Direct,
            Plan::Sampled(_) => Method::Sampled,
            Plan::Factored(_) => Method::Factored,
        }
    }

    /// What the method does, in a few words.
    pub fn description(&self) -> String {
        match &self.plan {
            Plan::Direct => "the plain sum over elements".to_string(),
            Plan::Sampled(plan) => {
                format!("the aperture painted on {0} × {0} points", plan.length)
            }
            Plan::Factored(expansion) => match expansion.terms() {
                1 => "element pattern × array factor".to_string(),
                terms => format!("element pattern × array factor, tilts in {terms} terms"),
            },
        }
    }

    /// Make the method ready.
    pub fn prepare<'a>(&self, array: &'a Array) -> Box<dyn FarField + 'a> {
        let task = self.task;
        match &self.plan {
            Plan::Direct => Box::new(Direct::new(array, task)),
            Plan::Sampled(plan) => Box::new(Sampled::new(
                array,
                task.grid,
                *plan,
                task.mean_over_tilt_rad,
            )),
            Plan::Factored(expansion) => {
                Box::new(Factored::new(array, task.grid, expansion.clone()))
            }
        }
    }

    fn fits(&self) -> bool {
        self.shared_bytes + self.worker_bytes <= MEMORY_LIMIT_BYTES
    }

    /// This choice, unless it exceeds the memory limit.
    fn if_it_fits(self, elements: usize) -> Result<Choice, Refusal> {
        if self.fits() {
            return Ok(self);
        }
        Err(Refusal {
            found: format!(
                "`{}` would need {:.1} GB for {elements} elements and {pixels} × {pixels} pixels",
                self.method().name(),
                (self.shared_bytes + self.worker_bytes) / 1e9,
                pixels = self.task.grid.pixels,
            ),
            advice: format!(
                "at most {:.0} GB are used: take method = \"auto\", fewer elements or a smaller window",
                MEMORY_LIMIT_BYTES / 1e9
            ),
        })
    }
}

/// Choose a method: with `Auto` factored where it applies, else sampled where it fits, else direct.
///
/// # Errors
/// The method asked for (or, with `Auto`, every method) exceeds the memory limit or does not apply.
pub fn choose(array: &Array, task: Task, requested: MethodChoice) -> Result<Choice, Refusal> {
    /// Bytes that map, figures and pictures hold for each pixel.
    const PIXEL_BYTES: f64 = 100.0;
    let most = (MEMORY_LIMIT_BYTES / PIXEL_BYTES).sqrt().floor();
    if task.grid.pixels as f64 > most {
        let pixels = match task.grid.pixels {
            pixels if pixels < 10_000_000 => pixels.to_string(),
            pixels => format!("{:.0e}", pixels as f64),
        };
        return Err(Refusal {
            found: format!("a map of {pixels} × {pixels} pixels"),
            advice: format!(
                "at most {most} × {most} fit in memory: use a smaller run.window or run.samples_per_spot"
            ),
        });
    }
    let elements = array.len();
    match requested {
        MethodChoice::Direct => direct(array, task).if_it_fits(elements),
        MethodChoice::Sampled => sampled(array, task).if_it_fits(elements),
        MethodChoice::Factored => factored(array, task)
            .ok_or(Refusal {
                found: "tilts too large for `factored`".to_string(),
                advice: "it takes tilts up to about a quarter of wavelength/size, fewer with flat facets: take method = \"auto\" or \"sampled\"".to_string(),
            })?
            .if_it_fits(elements),
        MethodChoice::Auto => {
            let because = |why, choice| Choice { why, ..choice };
            if let Some(choice) = factored(array, task).filter(Choice::fits) {
                return Ok(because("all elements share one pattern", choice));
            }
            let sampled = sampled(array, task);
            if sampled.fits() {
                return Ok(because("the tilts are too large for factored", sampled));
            }
            let direct = direct(array, task).if_it_fits(elements)?;
            Ok(because("nothing faster fits in memory", direct))
        }
        MethodChoice::ClosedForm => Err(Refusal {
            found: "`closed_form` for a map of trials".to_string(),
            advice: "it computes means only".to_string(),
        }),
    }
}

/// Seconds of one round of [`reference_work`] on the machine that the costs below were taken on.
pub const REFERENCE_WORK_S: f64 = 7.5e-6;

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
const MULTIPLY_ADD_S: f64 = 0.5e-9;
/// One sine and cosine.
const PHASOR_S: f64 = 11e-9;
/// One butterfly: length × log₂ length of these make an FFT.
const BUTTERFLY_S: f64 = 0.27e-9;
/// Time of a transform in single precision over that in double.
const SINGLE: f64 = 0.5;
/// One cell of a painted row.
const CELL_S: f64 = 3e-9;
/// Covered area of one cell.
const COVER_S: f64 = 60e-9;
/// Drawing one element's errors of every kind.
const DRAW_S: f64 = 7e-9;

/// Seconds of a lattice's still field, row by row.
pub fn still_s(array: &Array, grid: Grid) -> f64 {
    let cells = Axis::new(array, grid).cells as f64;
    let rows = array.lattice().map_or(0, |sites| sites.rows.len()) as f64;
    25e-9 * rows * cells
}

/// Seconds of one transform of a length.
fn transform_s(length: usize) -> f64 {
    length as f64 * (length as f64).log2() * BUTTERFLY_S
}

fn direct(array: &Array, task: Task) -> Choice {
    let (elements, pixels) = (array.len() as f64, task.grid.pixels as f64);
    let each_its_own = task.jitter_rad > 0.0 || array.largest_tilt_rad() > 0.0;
    let pattern = ElementPattern::new(
        &array.element,
        array.wavenumber(),
        Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad: task.mean_over_tilt_rad,
        },
        super::largest_angle_rad(array, task),
    );
    let patterns = if each_its_own { elements } else { 1.0 };
    Choice {
        task,
        plan: Plan::Direct,
        why: AS_ASKED,
        shared_bytes: 48.0 * elements,
        worker_bytes: pixels * (16.0 * pixels + 16.0 * 512.0) + 33.0 * elements,
        setup_s: 0.0,
        trial_s: elements * pixels * (PHASOR_S + pixels * MULTIPLY_ADD_S)
            + patterns * pixels * pixels * pattern.evaluations() * PHASOR_S,
    }
}

fn sampled(array: &Array, task: Task) -> Choice {
    let random = 6.0 * task.jitter_rad.hypot(task.common_jitter_rad);
    let plan = SampledPlan::new(
        array,
        task.grid,
        cells_across_element(array, task.grid),
        array.largest_tilt_rad() + random,
    );
    let transforms = (plan.rows + task.grid.pixels) as f64;
    let cells = plan.shared_bytes / 8.0;
    let uniform = array.element.beam_radius_m.is_none() && array.curvature_per_m.abs() < 1e-30;
    Choice {
        task,
        shared_bytes: plan.shared_bytes,
        worker_bytes: plan.worker_bytes,
        setup_s: cells * COVER_S * if uniform { 1.0 } else { 5.0 },
        trial_s: transforms * transform_s(plan.length) + cells * CELL_S,
        plan: Plan::Sampled(plan),
        why: AS_ASKED,
    }
}

fn factored(array: &Array, task: Task) -> Option<Choice> {
    let expansion = expand(array, task)?;
    let axis = Axis::new(array, task.grid);
    let (elements, pixels) = (array.len() as f64, task.grid.pixels as f64);
    let (terms, cells) = (expansion.terms() as f64, axis.cells as f64);
    let spread_s = match array.sites {
        Sites::Lattice { .. } => 1.6e-9,
        Sites::List(_) => 60e-9,
    };
    // A tilt of the whole array has every term evaluated anew.
    let each_pixel_s = if task.common_jitter_rad > 0.0 {
        3e-9 + 0.4e-9 * expansion.nodes() as f64
    } else {
        3e-9
    };
    // Rows, and for each column the weights and the running sums of its cells; or a list.
    let site_bytes = match &array.sites {
        Sites::Lattice { sites, .. } => {
            80.0 * sites.rows.len() as f64 + 4.0 * 20.0 * WIDTH as f64 * sites.columns as f64
        }
        Sites::List(_) => 130.0 * elements,
    };
    Some(Choice {
        task,
        shared_bytes: site_bytes + 16.0 * terms * pixels * pixels,
        worker_bytes: 16.0 * (terms * cells * cells + cells * pixels + 2.0 * pixels * pixels)
            + 64.0 * terms * cells,
        setup_s: 1e-3 + 30e-9 * terms * pixels * pixels,
        trial_s: elements * (DRAW_S + terms * spread_s)
            + terms
                * (SINGLE * (cells + pixels) * transform_s(axis.length)
                    + each_pixel_s * pixels * pixels),
        plan: Plan::Factored(expansion),
        why: AS_ASKED,
    })
}
