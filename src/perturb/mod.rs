//! The errors of the array: one draw a trial.
//!
//! Every source has a file and a stream of its own. Each fills its share of a
//! [`Draw`] with a standard draw times its magnitude, so that a trial keeps its
//! luck when a magnitude changes (common random numbers).

mod dropout;
mod jitter;
mod piston;
mod power;
pub mod stream;

use crate::array::Array;
use crate::scenario::Errors;

pub use power::log_normal_sigma;

/// State of an element in a trial.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum State {
    /// Lit and locked.
    Lit,
    /// Radiates nothing.
    Dark,
    /// Radiates at a random phase.
    Unlocked,
}

/// The errors of every element in one trial.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Draw {
    /// Phase error, the piston of the common tilt included.
    pub phase_rad: Vec<f64>,
    /// Tilt error along x, common jitter included.
    pub tilt_x_rad: Vec<f64>,
    /// Tilt error along y, common jitter included.
    pub tilt_y_rad: Vec<f64>,
    /// Factor on the amplitude: 0 when dark, 1 without errors.
    pub amplitude: Vec<f64>,
    /// What each element does.
    pub state: Vec<State>,
    /// Tilt of the whole array, already contained in phases and tilts.
    pub common_tilt_rad: (f64, f64),
}

impl Draw {
    /// The array without errors.
    pub fn none(elements: usize) -> Draw {
        Draw {
            phase_rad: vec![0.0; elements],
            tilt_x_rad: vec![0.0; elements],
            tilt_y_rad: vec![0.0; elements],
            amplitude: vec![1.0; elements],
            state: vec![State::Lit; elements],
            common_tilt_rad: (0.0, 0.0),
        }
    }

    /// Draw the errors of a trial, reusing this draw's memory.
    pub fn redraw(&mut self, array: &Array, errors: &Errors, seed: u64, trial: u64) {
        let elements = array.len();
        self.phase_rad.clear();
        self.phase_rad.resize(elements, 0.0);
        self.tilt_x_rad.clear();
        self.tilt_x_rad.resize(elements, 0.0);
        self.tilt_y_rad.clear();
        self.tilt_y_rad.resize(elements, 0.0);
        self.amplitude.clear();
        self.amplitude.resize(elements, 1.0);
        self.state.clear();
        self.state.resize(elements, State::Lit);
        self.common_tilt_rad = (0.0, 0.0);
        piston::draw(self, errors.piston_rad.rms(), seed, trial);
        power::draw(self, errors.power_spread, seed, trial);
        jitter::draw(self, errors.jitter_rad.rms(), seed, trial);
        dropout::draw(self, errors.dropout, errors.dropped, seed, trial);
        jitter::draw_common(self, array, errors.common_jitter_rad.rms(), seed, trial);
    }

    /// A fresh draw of a trial.
    pub fn of_trial(array: &Array, errors: &Errors, seed: u64, trial: u64) -> Draw {
        let mut draw = Draw::default();
        draw.redraw(array, errors, seed, trial);
        draw
    }

    /// How many elements are in a state.
    pub fn count(&self, state: State) -> usize {
        self.state.iter().filter(|&&each| each == state).count()
    }
}
