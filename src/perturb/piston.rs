//! Piston: a zero-mean normal phase error of each element.

use super::block::Block;
use super::stream::{Stream, Words};
use super::vector::normal_pair;
use crate::array::bands::GROUP;

/// Slots i and i + 128 of a group share two words.
#[inline(always)]
pub fn draw<const FUSED: bool>(block: &mut Block, rms_turns: f32, stream: Stream, group: u64) {
    let mut words: Words = [0; GROUP];
    stream.words(group, &mut words);
    let (radius, azimuth) = words.split_at(GROUP / 2);
    let (first, second) = block.turns.split_at_mut(GROUP / 2);
    for i in 0..GROUP / 2 {
        let (cos, sin) = normal_pair::<FUSED>(radius[i], azimuth[i]);
        first[i] = rms_turns * cos;
        second[i] = rms_turns * sin;
    }
}
