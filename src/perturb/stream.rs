//! Random streams: one per (seed, purpose, trial), seekable by group of elements.
//!
//! Each stream is a ChaCha8 key stream (Bernstein 2008, with a 64-bit counter and a
//! 64-bit stream number) whose key holds the study's seed and whose stream number
//! joins purpose and trial. Group g owns the 256 words of blocks 16g to 16g + 15, so
//! any element of any trial can be drawn alone, on any thread, and switching one error
//! on or off leaves the numbers of the others as they were. Eight blocks are computed
//! abreast, and words leave in the order in which the lanes hold them.

use crate::array::bands::GROUP;

/// What a stream is for. The numbers are part of the reproducibility promise.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// Piston of each element.
    Piston = 1,
    /// Tilt of each element: two groups of words for each group of elements.
    Jitter = 2,
    /// Tilt of the whole array.
    CommonJitter = 3,
    /// Which elements are out.
    Dropout = 4,
    /// Phase of elements that are out but radiate.
    UnlockedPhase = 5,
    /// Power of each element.
    PowerSpread = 6,
}

/// Blocks abreast.
const LANES: usize = 8;

/// One word of each block abreast.
type Lane = [u32; LANES];

/// Words of a stream for one group.
pub type Words = [u32; GROUP];

/// Names a stream.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stream {
    seed: u64,
    number: u64,
}

impl Stream {
    /// The stream of a purpose in a trial.
    pub fn new(seed: u64, purpose: Purpose, trial: u64) -> Stream {
        // Trials stay below 2^56, which no machine can run.
        let number = ((purpose as u64) << 56) | trial;
        Stream { seed, number }
    }

    /// The words of group `group`.
    #[inline(always)]
    pub fn words(self, group: u64, words: &mut Words) {
        for (half, words) in words.chunks_exact_mut(GROUP / 2).enumerate() {
            self.blocks(16 * group + 8 * half as u64, words);
        }
    }

    /// Eight blocks from `counter` on: word w of block b goes to place 8w + b.
    #[inline(always)]
    fn blocks(self, counter: u64, words: &mut [u32]) {
        let halves = |value: u64| (value as u32, (value >> 32) as u32);
        let (seed, stream) = (halves(self.seed), halves(self.number));
        let mut start: [Lane; 16] = [[0; LANES]; 16];
        // "expand 32-byte k", the key (the seed and zeros), counter, stream number.
        let constants = [0x6170_7865, 0x3320_646e, 0x7962_2d32, 0x6b20_6574];
        for (row, constant) in start.iter_mut().zip(constants) {
            *row = [constant; LANES];
        }
        start[4] = [seed.0; LANES];
        start[5] = [seed.1; LANES];
        for lane in 0..LANES {
            let (low, high) = halves(counter + lane as u64);
            start[12][lane] = low;
            start[13][lane] = high;
        }
        start[14] = [stream.0; LANES];
        start[15] = [stream.1; LANES];
        let mut state = start;
        for _ in 0..4 {
            quarter_round(&mut state, 0, 4, 8, 12);
            quarter_round(&mut state, 1, 5, 9, 13);
            quarter_round(&mut state, 2, 6, 10, 14);
            quarter_round(&mut state, 3, 7, 11, 15);
            quarter_round(&mut state, 0, 5, 10, 15);
            quarter_round(&mut state, 1, 6, 11, 12);
            quarter_round(&mut state, 2, 7, 8, 13);
            quarter_round(&mut state, 3, 4, 9, 14);
        }
        for ((words, end), start) in words.chunks_exact_mut(LANES).zip(&state).zip(&start) {
            for lane in 0..LANES {
                words[lane] = end[lane].wrapping_add(start[lane]);
            }
        }
    }
}

#[inline(always)]
fn quarter_round(state: &mut [Lane; 16], a: usize, b: usize, c: usize, d: usize) {
    add_xor_rotate(state, a, b, d, 16);
    add_xor_rotate(state, c, d, b, 12);
    add_xor_rotate(state, a, b, d, 8);
    add_xor_rotate(state, c, d, b, 7);
}

/// `into += from; turned = (turned ^ into) <<< by`.
#[inline(always)]
fn add_xor_rotate(state: &mut [Lane; 16], into: usize, from: usize, turned: usize, by: u32) {
    for lane in 0..LANES {
        state[into][lane] = state[into][lane].wrapping_add(state[from][lane]);
        state[turned][lane] = (state[turned][lane] ^ state[into][lane]).rotate_left(by);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::{Rng, SeedableRng, rngs::ChaCha8Rng};

    /// The rand crate's generator, an implementation of its own, gives the same words.
    #[test]
    fn words_are_those_of_chacha8() {
        let (seed, trial, group) = (0x0123_4567_89ab_cdef, 42, 1_000_003);
        let mut words = [0; GROUP];
        Stream::new(seed, Purpose::Jitter, trial).words(group, &mut words);
        let mut key = [0; 32];
        key[..8].copy_from_slice(&seed.to_le_bytes());
        let mut reference = ChaCha8Rng::from_seed(key);
        reference.set_stream(((Purpose::Jitter as u64) << 56) | trial);
        for (place, &found) in words.iter().enumerate() {
            let (half, word, lane) = (place / 128, place % 128 / 8, place % 8);
            let block = 16 * group + (8 * half + lane) as u64;
            reference.set_word_pos(u128::from(block) * 16 + word as u128);
            assert_eq!(found, reference.next_u32(), "word {place}");
        }
    }
}
