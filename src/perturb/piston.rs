//! Piston: a zero-mean normal phase error of each element.

use super::Draw;
use super::stream::{Purpose, Stream};

pub(super) fn draw(draw: &mut Draw, rms_rad: f64, seed: u64, trial: u64) {
    if rms_rad > 0.0 {
        Stream::new(seed, Purpose::Piston, trial).normals(0, &mut draw.phase_rad);
        for phase in &mut draw.phase_rad {
            *phase *= rms_rad;
        }
    }
}
