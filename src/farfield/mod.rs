//! Array and draw → irradiance at the target.
//!
//! Every method stands behind [`FarField`] and fills the same map, so that each is
//! the others' check. [`choose`] picks one for an array and a map.

pub mod choose;
pub mod closed_form;
mod direct;
mod factored;
mod fft;
mod kernel;
pub mod map;
mod paint;
pub mod pattern;
mod pointing;
mod quadrature;
mod sampled;
mod smooth;
mod tile;
pub mod tilt;

use crate::array::{Array, Elements};
use crate::perturb::{Draw, State, TrialErrors};
use choose::Task;

pub use direct::Direct;
pub use factored::{Factored, expand};
pub use fft::good_length;
pub use map::{Grid, Map};
pub use sampled::{Sampled, SampledPlan, cells_across_element};

/// A way to compute the far field.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Method {
    /// The plain sum over elements.
    Direct,
    /// One FFT of the painted aperture.
    Sampled,
    /// Element pattern times array factor.
    Factored,
}

impl Method {
    /// Its name in a scenario.
    pub fn name(self) -> &'static str {
        match self {
            Method::Direct => "direct",
            Method::Sampled => "sampled",
            Method::Factored => "factored",
        }
    }
}

/// An array made ready for any number of draws.
pub trait FarField: Send + Sync {
    /// Which method this is.
    fn method(&self) -> Method;
    /// Grid of the maps.
    fn grid(&self) -> Grid;
    /// A worker with the memory that a trial needs, to be reused from trial to trial.
    fn worker(&self) -> Box<dyn Worker + '_>;
}

/// Computes one draw after another.
pub trait Worker: Send {
    /// Fill `map` with the irradiance of a trial. `map` has the grid of the method.
    fn irradiance(&mut self, trial: TrialErrors<'_>, map: &mut Map) -> Radiated;
}

/// What the elements of a trial radiate.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Radiated {
    /// Power of all elements together.
    pub power_w: f64,
    /// Elements that radiate nothing.
    pub dark: usize,
    /// Elements at a random phase.
    pub unlocked: usize,
}

impl Radiated {
    fn of(elements: &Elements, draw: &Draw) -> Radiated {
        let count = |state| draw.state.iter().filter(|&&each| each == state).count();
        let amplitudes = elements.amplitude.iter().zip(&draw.amplitude);
        Radiated {
            power_w: amplitudes
                .map(|(amplitude, factor)| (amplitude * factor).powi(2))
                .sum(),
            dark: count(State::Dark),
            unlocked: count(State::Unlocked),
        }
    }
}

/// The largest angle between a map point and an element's tilt, six deviations of random tilt included.
fn largest_angle_rad(array: &Array, task: Task) -> f64 {
    let corner = std::f64::consts::FRAC_1_SQRT_2 * task.grid.width_m() / array.range_m;
    let random = task.jitter_rad.hypot(task.common_jitter_rad);
    corner + std::f64::consts::SQRT_2 * (array.largest_tilt_rad() + 6.7 * random)
}
