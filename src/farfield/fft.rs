//! Lengths that transform fast, and a plain two-dimensional transform.

use num_complex::Complex64;
use rustfft::{FftDirection, FftPlanner};

/// The smallest length of at least `least` whose prime factors are 2, 3 and 5.
pub fn good_length(least: usize) -> usize {
    next_with_factors(least, &[2, 3, 5])
}

/// The smallest multiple of 16 of at least `least` with no prime factor above 7: single
/// precision transforms these two to three times as fast as their neighbours.
pub fn good_single_length(least: usize) -> usize {
    16 * next_with_factors(least.div_ceil(16), &[2, 3, 5, 7])
}

fn next_with_factors(least: usize, factors: &[usize]) -> usize {
    (least.max(1)..)
        .find(|&length| {
            let mut rest = length;
            for &factor in factors {
                while rest.is_multiple_of(factor) {
                    rest /= factor;
                }
            }
            rest == 1
        })
        .expect("there is a power of two above every length")
}

/// Transform a square of `length` × `length` values in place, without normalisation.
pub fn transform_square(values: &mut [Complex64], length: usize, direction: FftDirection) {
    let fft = FftPlanner::new().plan_fft(length, direction);
    let mut scratch = vec![Complex64::default(); fft.get_inplace_scratch_len()];
    for row in values.chunks_exact_mut(length) {
        fft.process_with_scratch(row, &mut scratch);
    }
    // Sixteen columns at a time: each cache line of a row is used whole.
    let mut columns = vec![Complex64::default(); 16 * length];
    for first in (0..length).step_by(16) {
        let width = 16.min(length - first);
        for (row, line) in values.chunks_exact(length).enumerate() {
            for column in 0..width {
                columns[column * length + row] = line[first + column];
            }
        }
        for column in columns.chunks_exact_mut(length).take(width) {
            fft.process_with_scratch(column, &mut scratch);
        }
        for (row, line) in values.chunks_exact_mut(length).enumerate() {
            for column in 0..width {
                line[first + column] = columns[column * length + row];
            }
        }
    }
}
