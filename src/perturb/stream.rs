//! Random streams: one per (seed, purpose, trial), seekable by element.
//!
//! Each stream is a ChaCha8 key stream whose key is the study's seed and whose
//! stream number joins purpose and trial. Element n owns a fixed place in it, so
//! any element of any trial can be drawn alone, on any thread, and switching one
//! error on or off leaves the numbers of the others as they were.

use rand::{Rng, SeedableRng, rngs::ChaCha8Rng};
use std::f64::consts::TAU;

/// What a stream is for. The numbers are part of the reproducibility promise.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// Piston of each element.
    Piston = 1,
    /// Tilt of each element.
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

/// One stream, with element-wise access.
#[derive(Debug)]
pub struct Stream {
    words: ChaCha8Rng,
}

impl Stream {
    /// The stream of a purpose in a trial.
    pub fn new(seed: u64, purpose: Purpose, trial: u64) -> Stream {
        let mut words = ChaCha8Rng::seed_from_u64(seed);
        // Trials stay below 2^56, which no machine can run.
        words.set_stream(((purpose as u64) << 56) | trial);
        Stream { words }
    }

    /// Fill `values` with uniforms in [0, 1), one 32-bit word each, from element `first` on.
    pub fn uniforms(&mut self, first: usize, values: &mut [f64]) {
        self.words.set_word_pos(first as u128);
        for value in values {
            *value = f64::from(self.words.next_u32()) / 4_294_967_296.0;
        }
    }

    /// Fill `values` with standard normals from place `first` on, which must be even.
    ///
    /// Places 2j and 2j + 1 share two 32-bit words (Box and Muller, Ann. Math. Stat.
    /// 29, 610 (1958)); the largest magnitude that can occur is √(2 ln 2³³) = 6.76.
    pub fn normals(&mut self, first: usize, values: &mut [f64]) {
        debug_assert!(first.is_multiple_of(2));
        self.words.set_word_pos(first as u128);
        for pair in values.chunks_mut(2) {
            // Half a step keeps the logarithm finite.
            let u = (f64::from(self.words.next_u32()) + 0.5) / 4_294_967_296.0;
            let azimuth = TAU * f64::from(self.words.next_u32()) / 4_294_967_296.0;
            let radius = (-2.0 * libm::log(u)).sqrt();
            pair[0] = radius * libm::cos(azimuth);
            if let Some(second) = pair.get_mut(1) {
                *second = radius * libm::sin(azimuth);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_element_draws_the_same_number_alone_or_in_a_block() {
        let mut whole = vec![0.0; 1001];
        Stream::new(7, Purpose::Piston, 42).normals(0, &mut whole);
        let mut part = vec![0.0; 5];
        Stream::new(7, Purpose::Piston, 42).normals(500, &mut part);
        assert_eq!(whole[500..505], part[..]);
    }

    #[test]
    fn streams_of_other_purposes_trials_and_seeds_differ() {
        let first = |seed, purpose, trial| {
            let mut value = [0.0];
            Stream::new(seed, purpose, trial).uniforms(3, &mut value);
            value[0].to_bits()
        };
        let base = first(1, Purpose::Piston, 0);
        assert_ne!(base, first(1, Purpose::Jitter, 0));
        assert_ne!(base, first(1, Purpose::Piston, 1));
        assert_ne!(base, first(2, Purpose::Piston, 0));
    }

    /// Pinned, so that a change of the draws cannot pass unnoticed.
    #[test]
    fn the_first_normals_are_what_they_have_always_been() {
        let mut values = [0.0; 2];
        Stream::new(1, Purpose::Piston, 0).normals(0, &mut values);
        let pinned = [-0.297_275_800_718_029_56, -0.177_011_942_802_594_94_f64];
        assert_eq!(values.map(f64::to_bits), pinned.map(f64::to_bits));
    }
}
