//! The errors of one group of elements, computed in vector lanes.
//!
//! The same machine code serves every far-field method, so that all see the same
//! trial. It is compiled for several instruction sets and chosen at run time; between
//! a processor that fuses multiply and add and one that does not, draws may differ in
//! their last bits.

use super::stream::{Purpose, Stream};
use super::{State, TrialErrors, dropout, jitter, piston, power};
use crate::array::bands::GROUP;
use crate::scenario::Dropped;
use multiversion::multiversion;
use std::f64::consts::TAU;

/// Errors of a group, one entry a slot.
#[derive(Debug, Clone)]
pub struct Block {
    /// Phase error in turns of 2π.
    pub turns: [f32; GROUP],
    /// Tilt error along x, without the common tilt.
    pub tilt_x_rad: [f32; GROUP],
    /// Tilt error along y, without the common tilt.
    pub tilt_y_rad: [f32; GROUP],
    /// Factor on the amplitude.
    pub amplitude: [f32; GROUP],
    /// What the element does.
    pub state: [State; GROUP],
}

impl Default for Block {
    fn default() -> Block {
        Block {
            turns: [0.0; GROUP],
            tilt_x_rad: [0.0; GROUP],
            tilt_y_rad: [0.0; GROUP],
            amplitude: [1.0; GROUP],
            state: [State::Lit; GROUP],
        }
    }
}

/// Magnitudes of the errors as the lanes take them, and the streams of a trial.
#[derive(Debug, Clone, Copy)]
pub struct Recipe {
    piston_turns: f32,
    jitter_rad: f32,
    power_sigma: f32,
    dropout_below: u32,
    dropped: Dropped,
    seed: u64,
    trial: u64,
}

impl Recipe {
    /// Of a trial.
    pub fn new(trial: TrialErrors<'_>) -> Recipe {
        let errors = trial.errors;
        Recipe {
            piston_turns: (errors.piston_rad.rms() / TAU) as f32,
            jitter_rad: errors.jitter_rad.rms() as f32,
            power_sigma: power::log_normal_sigma(errors.power_spread) as f32,
            dropout_below: (errors.dropout * 2_147_483_648.0).round() as u32,
            dropped: errors.dropped,
            seed: trial.seed,
            trial: trial.trial,
        }
    }

    /// Whether elements may be out.
    pub fn drops(&self) -> bool {
        self.dropout_below > 0
    }

    #[inline(always)]
    fn stream(&self, purpose: Purpose) -> Stream {
        Stream::new(self.seed, purpose, self.trial)
    }

    /// Draw the errors of a group.
    #[inline(always)]
    pub fn fill<const FUSED: bool>(&self, group: u64, block: &mut Block) {
        if self.piston_turns > 0.0 {
            let stream = self.stream(Purpose::Piston);
            piston::draw::<FUSED>(block, self.piston_turns, stream, group);
        } else {
            block.turns = [0.0; GROUP];
        }
        if self.jitter_rad > 0.0 {
            let stream = self.stream(Purpose::Jitter);
            jitter::draw::<FUSED>(block, self.jitter_rad, stream, group);
        } else {
            block.tilt_x_rad = [0.0; GROUP];
            block.tilt_y_rad = [0.0; GROUP];
        }
        if self.power_sigma > 0.0 {
            let stream = self.stream(Purpose::PowerSpread);
            power::draw::<FUSED>(block, self.power_sigma, stream, group);
        } else {
            block.amplitude = [1.0; GROUP];
        }
        block.state = [State::Lit; GROUP];
        if self.drops() {
            let luck = self.stream(Purpose::Dropout);
            let phases = self.stream(Purpose::UnlockedPhase);
            dropout::draw(block, self.dropout_below, self.dropped, luck, phases, group);
        }
    }
}

/// Draw the errors of a group.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
pub fn draw(recipe: &Recipe, group: u64, block: &mut Block) {
    const FUSED: bool =
        multiversion::target::target_cfg_f!(any(target_feature = "fma", target_arch = "aarch64"));
    recipe.fill::<FUSED>(group, block);
}
