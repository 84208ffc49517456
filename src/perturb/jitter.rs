//! Pointing jitter: zero-mean normal tilts, per axis, of each element and of the whole array.

use super::block::Block;
use super::stream::{Stream, Words};
use super::vector::normal_pair;
use crate::array::bands::GROUP;

/// Each slot's two words give its tilts along x and y.
#[inline(always)]
pub fn draw<const FUSED: bool>(block: &mut Block, rms_rad: f32, stream: Stream, group: u64) {
    let mut words: [Words; 2] = [[0; GROUP]; 2];
    stream.words(2 * group, &mut words[0]);
    stream.words(2 * group + 1, &mut words[1]);
    for i in 0..GROUP {
        let (cos, sin) = normal_pair::<FUSED>(words[0][i], words[1][i]);
        block.tilt_x_rad[i] = rms_rad * cos;
        block.tilt_y_rad[i] = rms_rad * sin;
    }
}

/// Tilt of the whole array in a trial.
pub fn common_tilt_rad(rms_rad: f64, stream: Stream) -> (f64, f64) {
    let mut words: Words = [0; GROUP];
    stream.words(0, &mut words);
    let (cos, sin) = normal_pair::<false>(words[0], words[1]);
    (rms_rad * f64::from(cos), rms_rad * f64::from(sin))
}
