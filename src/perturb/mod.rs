//! The errors of the array: one draw a trial.
//!
//! Every source has a file and a stream of its own. Each fills its share of a block
//! with a standard draw times its magnitude, so that a trial keeps its luck when a
//! magnitude changes (common random numbers).

pub mod block;
mod dropout;
mod jitter;
mod piston;
mod power;
pub mod stream;
pub mod vector;

use crate::array::Array;
use crate::array::bands::Slot;
use crate::scenario::Errors;
use block::{Block, Recipe};
use std::f64::consts::TAU;
use stream::{Purpose, Stream};

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

/// Names the errors of one trial: they follow from magnitudes, seed and number alone.
#[derive(Debug, Clone, Copy)]
pub struct TrialErrors<'a> {
    /// Magnitudes.
    pub errors: &'a Errors,
    /// Seed of the study.
    pub seed: u64,
    /// Number of the trial.
    pub trial: u64,
}

impl<'a> TrialErrors<'a> {
    /// The array without errors, `errors` being [`Errors::none`].
    pub fn none(errors: &'a Errors) -> TrialErrors<'a> {
        TrialErrors {
            errors,
            seed: 0,
            trial: 0,
        }
    }

    /// Tilt of the whole array in this trial.
    pub fn common_tilt_rad(&self) -> (f64, f64) {
        let stream = Stream::new(self.seed, Purpose::CommonJitter, self.trial);
        jitter::common_tilt_rad(self.errors.common_jitter_rad.rms(), stream)
    }
}

/// The errors of every element in one trial, listed: 33 bytes each.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Draw {
    /// Phase error of each element.
    pub phase_rad: Vec<f64>,
    /// Tilt error along x, without the common tilt.
    pub tilt_x_rad: Vec<f64>,
    /// Tilt error along y, without the common tilt.
    pub tilt_y_rad: Vec<f64>,
    /// Factor on the amplitude: 0 when dark, 1 without errors.
    pub amplitude: Vec<f64>,
    /// What each element does.
    pub state: Vec<State>,
    /// Tilt of the whole array about the axis.
    pub common_tilt_rad: (f64, f64),
}

impl Draw {
    /// List the errors of a trial, reusing this draw's memory.
    pub fn redraw(&mut self, array: &Array, trial: TrialErrors<'_>) {
        let elements = array.len();
        self.phase_rad.resize(elements, 0.0);
        self.tilt_x_rad.resize(elements, 0.0);
        self.tilt_y_rad.resize(elements, 0.0);
        self.amplitude.resize(elements, 1.0);
        self.state.resize(elements, State::Lit);
        self.common_tilt_rad = trial.common_tilt_rad();
        for_each_block(array, trial, |block, slots| {
            for &Slot {
                slot, number: n, ..
            } in slots
            {
                self.phase_rad[n] = TAU * f64::from(block.turns[slot]);
                self.tilt_x_rad[n] = f64::from(block.tilt_x_rad[slot]);
                self.tilt_y_rad[n] = f64::from(block.tilt_y_rad[slot]);
                self.amplitude[n] = f64::from(block.amplitude[slot]);
                self.state[n] = block.state[slot];
            }
        });
    }

    /// A fresh list of a trial's errors.
    pub fn of_trial(array: &Array, trial: TrialErrors<'_>) -> Draw {
        let mut draw = Draw::default();
        draw.redraw(array, trial);
        draw
    }
}

/// Call `visit` with the errors of every group, and its elements.
fn for_each_block(array: &Array, trial: TrialErrors<'_>, mut visit: impl FnMut(&Block, &[Slot])) {
    let recipe = Recipe::new(trial);
    let mut block = Block::default();
    array.for_each_group(|group, slots| {
        block::draw(&recipe, group, &mut block);
        visit(&block, slots);
    });
}

/// One element as it is in a trial, for a picture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Seen {
    /// Centre.
    pub x_m: f64,
    /// Centre.
    pub y_m: f64,
    /// Phase error, without what a tilt of the whole array brings.
    pub phase_rad: f64,
    /// What it does.
    pub state: State,
}

/// Call `visit` with every element of a trial, one after another, listing none.
pub fn for_each_element(array: &Array, trial: TrialErrors<'_>, visit: &mut dyn FnMut(Seen)) {
    for_each_block(array, trial, |block, slots| {
        for each in slots {
            visit(Seen {
                x_m: each.x_m,
                y_m: each.y_m,
                phase_rad: TAU * f64::from(block.turns[each.slot]),
                state: block.state[each.slot],
            });
        }
    });
}
