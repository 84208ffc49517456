//! Pointing jitter: zero-mean normal tilts, per axis, of each element and of the whole array.

use super::Draw;
use super::stream::{Purpose, Stream};
use crate::array::Array;

pub(super) fn draw(draw: &mut Draw, rms_rad: f64, seed: u64, trial: u64) {
    if rms_rad > 0.0 {
        let mut stream = Stream::new(seed, Purpose::Jitter, trial);
        let mut pair = [0.0; 2];
        for n in 0..draw.tilt_x_rad.len() {
            stream.normals(2 * n, &mut pair);
            draw.tilt_x_rad[n] += rms_rad * pair[0];
            draw.tilt_y_rad[n] += rms_rad * pair[1];
        }
    }
}

/// The whole array tilted about the axis: each element takes the tilt, and the
/// piston k δ₀·r that its centre moves by.
pub(super) fn draw_common(draw: &mut Draw, array: &Array, rms_rad: f64, seed: u64, trial: u64) {
    if rms_rad > 0.0 {
        let mut pair = [0.0; 2];
        Stream::new(seed, Purpose::CommonJitter, trial).normals(0, &mut pair);
        let (tilt_x, tilt_y) = (rms_rad * pair[0], rms_rad * pair[1]);
        draw.common_tilt_rad = (tilt_x, tilt_y);
        for n in 0..array.len() {
            draw.phase_rad[n] +=
                array.wavenumber() * (tilt_x * array.x_m[n] + tilt_y * array.y_m[n]);
            draw.tilt_x_rad[n] += tilt_x;
            draw.tilt_y_rad[n] += tilt_y;
        }
    }
}
