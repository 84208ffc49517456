//! Power spread: log-normal element powers whose mean is kept.

use super::Draw;
use super::stream::{Purpose, Stream};

/// σ of ln P for a relative standard deviation `spread` of P: √ln(1 + spread²).
pub fn log_normal_sigma(spread: f64) -> f64 {
    libm::log1p(spread * spread).sqrt()
}

pub(super) fn draw(draw: &mut Draw, spread: f64, seed: u64, trial: u64) {
    if spread > 0.0 {
        let sigma = log_normal_sigma(spread);
        Stream::new(seed, Purpose::PowerSpread, trial).normals(0, &mut draw.amplitude);
        for factor in &mut draw.amplitude {
            *factor = libm::exp((sigma * *factor - sigma * sigma / 2.0) / 2.0);
        }
    }
}
