//! The mean map over independent errors, in closed form.
//!
//! With ℓ = 1 − dropout, σ the piston rms, α = E√(P/P₀) of the power spread,
//! m = ℓ α exp(−σ²/2), q = ℓ (dark) or 1 (unlocked), Ā and B the means of A(θ − δ)
//! and |A(θ − δ)|² over the jitter:
//!
//! ⟨I⟩·(λL)² = m² |Σ wₙ Ā(θ − δₙ) exp(−ikθ·rₙ)|² + Σ Pₙ [q B(θ − δₙ) − m² |Ā(θ − δₙ)|²]
//!
//! Derived from E zₙzₘ* = m² for n ≠ m and E|zₙ|² = q; compare Nabors, Appl. Opt. 33,
//! 2284 (1994) and Yaitskova, Dohlen & Dierickx, JOSA A 20, 1563 (2003). Common jitter
//! convolves the result with a normal distribution. It needs independent elements:
//! grouped failures and correlated surfaces need Monte Carlo.

use super::choose::{Refusal, Task, choose};
use super::map::{Grid, Map};
use super::pattern::{Wavefront, on_grid};
use super::pointing::pointing;
use super::smooth::Samples;
use crate::array::Array;
use crate::perturb::TrialErrors;
use crate::scenario::{Dropped, Errors, MethodChoice};
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::TAU;

/// Seconds that the direct sum may take for the mean field, which it knows to all digits.
const DIRECT_S: f64 = 0.02;

/// Moments of one element's complex amplitude z over piston, dropout and power spread.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Moments {
    /// E z, real.
    pub mean: f64,
    /// E|z|².
    pub mean_square: f64,
    /// E z², real.
    pub square: f64,
    /// E z|z|², real.
    pub cubic: f64,
    /// E|z|⁴.
    pub quartic: f64,
}

impl Moments {
    /// Of the error sources of a scenario.
    ///
    /// E exp(inφ) = exp(−n²σ²/2) for normal φ, 0 for a uniform one; E g^(j/2) of a
    /// log-normal g of mean 1 and relative spread p is (1 + p²)^(j(j − 2)/8).
    pub fn of(errors: &Errors) -> Moments {
        let sigma = errors.piston_rad.rms();
        let lit = 1.0 - errors.dropout;
        let power = |j: f64| (1.0 + errors.power_spread.powi(2)).powf(j * (j - 2.0) / 8.0);
        let phase = |n: f64| (-n * n * sigma * sigma / 2.0).exp();
        let radiating = match errors.dropped {
            Dropped::Dark => lit,
            Dropped::Unlocked => 1.0,
        };
        Moments {
            mean: lit * power(1.0) * phase(1.0),
            mean_square: radiating,
            square: lit * phase(2.0),
            cubic: lit * power(3.0) * phase(1.0),
            quartic: radiating * power(4.0),
        }
    }
}

/// The mean map on `grid`.
///
/// # Errors
/// No far-field method can hold the enlarged map that common jitter needs.
pub fn mean_map(array: &Array, errors: &Errors, grid: Grid) -> Result<Map, Refusal> {
    let common_m = errors.common_jitter_rad.rms() * array.range_m;
    if common_m <= 0.0 {
        return independent_mean(array, errors, grid);
    }
    let spot_m = array.spot_m();
    let half = grid.width_m() / 2.0;
    // The band limit leaves no guard at two samples a spot; the Gaussian then does the rest.
    let band = (1.0 / spot_m).min(0.4 / grid.pixel_m);
    let samples = Samples::new(half + 6.0 * common_m, band, grid.pixel_m);
    let wide = Grid {
        pixels: samples.count,
        pixel_m: grid.pixel_m,
    };
    let map = independent_mean(array, errors, wide)?;
    let mut spectrum = samples.spectrum(&map.irradiance_w_m2);
    let frequencies = samples.frequencies();
    for (row, fy) in spectrum.chunks_exact_mut(samples.count).zip(&frequencies) {
        for (value, fx) in row.iter_mut().zip(&frequencies) {
            *value *= blur(fx, fy, common_m);
        }
    }
    Ok(Map {
        grid,
        irradiance_w_m2: samples.evaluate(&spectrum, &grid.axis_m()),
    })
}

/// Transform of a normal distribution of rms `sigma` per axis.
fn blur(fx: &f64, fy: &f64, sigma: f64) -> f64 {
    (-0.5 * (TAU * sigma).powi(2) * (fx * fx + fy * fy)).exp()
}

/// The mean map without common jitter.
fn independent_mean(array: &Array, errors: &Errors, grid: Grid) -> Result<Map, Refusal> {
    let jitter_rad = errors.jitter_rad.rms();
    let moments = Moments::of(errors);
    let task = Task::mean_field(grid, jitter_rad);
    let choice = match choose(array, task, MethodChoice::Direct) {
        Ok(exact) if exact.trial_s <= DIRECT_S => exact,
        _ => choose(array, task, MethodChoice::Auto)?,
    };
    let far_field = choice.prepare(array);
    let mut map = Map::dark(grid);
    far_field
        .worker()
        .irradiance(TrialErrors::none(&Errors::none()), &mut map);
    let coherent = moments.mean * moments.mean;
    let scattered = scattered(array, moments, jitter_rad, grid);
    for (value, scattered) in map.irradiance_w_m2.iter_mut().zip(scattered) {
        // The scattered part can fall below zero by its rounding only.
        *value = (coherent * *value + scattered).max(0.0);
    }
    Ok(map)
}

/// Σ Pₙ [q B(θ − δₙ) − m² |Ā(θ − δₙ)|²]/(λL)² on the map's grid.
fn scattered(array: &Array, moments: Moments, jitter_rad: f64, grid: Grid) -> Vec<f64> {
    let (half_x, half_y) = array.element.half_extent_m();
    // |A|² is the transform of the element's autocorrelation, twice as wide as the element.
    let band = 2.0 * half_x.max(half_y) / array.wavelength_m;
    let theta: Vec<f64> = grid.axis_m().iter().map(|u| u / array.range_m).collect();
    let flat = grid.width_m() / 2.0 / array.range_m + array.largest_tilt_rad() + 6.0 * jitter_rad;
    let samples = Samples::new(flat, band, 0.25 / band);
    let angles = samples.axis();
    let squares = |mean_over_tilt_rad: f64| -> Vec<f64> {
        let wavefront = Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad,
        };
        on_grid(&array.element, array.wavenumber(), wavefront, &angles)
            .iter()
            .map(Complex64::norm_sqr)
            .collect()
    };
    let mut spectrum = samples.spectrum(&squares(0.0));
    let coherent = samples.spectrum(&squares(jitter_rad));
    let pointing = pointing(array, &samples);
    let frequencies = samples.frequencies();
    let scale = (array.wavelength_m * array.range_m).powi(-2);
    spectrum
        .par_chunks_exact_mut(samples.count)
        .enumerate()
        .for_each(|(j, row)| {
            for (i, value) in row.iter_mut().enumerate() {
                let place = j * samples.count + i;
                let jittered = *value
                    * blur(&frequencies[i], &frequencies[j], jitter_rad)
                    * moments.mean_square;
                let coherent = moments.mean * moments.mean * coherent[place];
                *value = (jittered - coherent) * pointing[place] * scale;
            }
        });
    samples.evaluate(&spectrum, &theta)
}

/// Standard deviation of the Strehl ratio over draws of piston, dropout and power spread.
///
/// `None` with jitter of either kind, or with static phases or tilts: then the Strehl
/// ratio is not the square of a sum of independent terms with real weights. With
/// S = Σ wₙ zₙ = M + X, M = E S, the variance of |S|² is that of 2M Re X + |X|², whose
/// moments follow from those of z; for piston alone and equal elements it is
/// (N − 1)(1 − μ)²[(1 − μ)² + 2Nμ]/N³, μ = exp(−σ²).
pub fn strehl_std(array: &Array, errors: &Errors) -> Option<f64> {
    if errors.jitter_rad.rms() > 0.0
        || errors.common_jitter_rad.rms() > 0.0
        || array.has_static_phase()
        || array.largest_tilt_rad() > 0.0
    {
        return None;
    }
    let Moments {
        mean,
        mean_square,
        square,
        cubic,
        quartic,
    } = Moments::of(errors);
    let [p1, p2, p3, p4] = [1, 2, 3, 4].map(|power| array.amplitude_sum(power));
    // Central moments of x = z − E z.
    let variance = mean_square - mean * mean;
    let pseudo = square - mean * mean;
    let third = cubic - mean * (square + 2.0 * mean_square) + 2.0 * mean.powi(3);
    let fourth = quartic - 4.0 * mean * cubic + mean * mean * (2.0 * square + 4.0 * mean_square)
        - 3.0 * mean.powi(4);
    let steady = mean * p1;
    let linear = 4.0 * steady * steady * p2 * 0.5 * (variance + pseudo);
    let cross = 4.0 * steady * p3 * third;
    let quadratic = p4 * (fourth - 2.0 * variance * variance - pseudo * pseudo)
        + p2 * p2 * (variance * variance + pseudo * pseudo);
    Some((linear + cross + quadratic).max(0.0).sqrt() / (p1 * p1))
}
