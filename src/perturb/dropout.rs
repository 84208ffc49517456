//! Dropout: elements that are out, dark or radiating at a random phase.

use super::State;
use super::block::Block;
use super::stream::{Stream, Words};
use super::vector::turns;
use crate::array::bands::GROUP;
use crate::scenario::Dropped;

/// An element is out when its word falls below the probability's share of all words.
#[inline(always)]
pub fn draw(
    block: &mut Block,
    below: u32,
    dropped: Dropped,
    luck: Stream,
    phases: Stream,
    group: u64,
) {
    let mut words: Words = [0; GROUP];
    luck.words(group, &mut words);
    let mut any = 0;
    for i in 0..GROUP {
        let out = words[i] >> 1 < below;
        any |= u32::from(out);
        words[i] = u32::from(out);
    }
    if any == 0 {
        return;
    }
    match dropped {
        Dropped::Dark => {
            for i in 0..GROUP {
                if words[i] != 0 {
                    block.amplitude[i] = 0.0;
                    block.state[i] = State::Dark;
                }
            }
        }
        Dropped::Unlocked => {
            let mut azimuths: Words = [0; GROUP];
            phases.words(group, &mut azimuths);
            for i in 0..GROUP {
                if words[i] != 0 {
                    block.turns[i] = turns(azimuths[i]);
                    block.state[i] = State::Unlocked;
                }
            }
        }
    }
}
