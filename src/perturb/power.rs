//! Power spread: log-normal element powers whose mean is kept.

use super::block::Block;
use super::stream::{Stream, Words};
use super::vector::{exp, normal_pair};
use crate::array::bands::GROUP;

/// σ of ln P for a relative standard deviation `spread` of P: √ln(1 + spread²).
pub fn log_normal_sigma(spread: f64) -> f64 {
    libm::log1p(spread * spread).sqrt()
}

/// Amplitude factors exp((σg − σ²/2)/2) with g normal; slots i and i + 128 share two words.
#[inline(always)]
pub fn draw<const FUSED: bool>(block: &mut Block, sigma: f32, stream: Stream, group: u64) {
    let mut words: Words = [0; GROUP];
    stream.words(group, &mut words);
    let (radius, azimuth) = words.split_at(GROUP / 2);
    let (first, second) = block.amplitude.split_at_mut(GROUP / 2);
    let (half, offset) = (sigma / 2.0, sigma * sigma / 4.0);
    for i in 0..GROUP / 2 {
        let (cos, sin) = normal_pair::<FUSED>(radius[i], azimuth[i]);
        first[i] = exp::<FUSED>(half * cos - offset);
        second[i] = exp::<FUSED>(half * sin - offset);
    }
}
