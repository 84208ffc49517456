//! Dropout: elements that are out, dark or radiating at a random phase.

use super::stream::{Purpose, Stream};
use super::{Draw, State};
use crate::scenario::Dropped;
use std::f64::consts::TAU;

pub(super) fn draw(draw: &mut Draw, probability: f64, dropped: Dropped, seed: u64, trial: u64) {
    if probability <= 0.0 {
        return;
    }
    let mut luck = vec![0.0; draw.state.len()];
    Stream::new(seed, Purpose::Dropout, trial).uniforms(0, &mut luck);
    let mut phases = Stream::new(seed, Purpose::UnlockedPhase, trial);
    for (n, luck) in luck.into_iter().enumerate() {
        if luck >= probability {
            continue;
        }
        match dropped {
            Dropped::Dark => {
                draw.state[n] = State::Dark;
                draw.amplitude[n] = 0.0;
            }
            Dropped::Unlocked => {
                let mut turn = [0.0];
                phases.uniforms(n, &mut turn);
                draw.state[n] = State::Unlocked;
                draw.phase_rad[n] = TAU * turn[0];
            }
        }
    }
}
