//! Gauss–Legendre rules.

use std::f64::consts::PI;

/// Nodes and weights on [`from`, `to`], exact for polynomials up to degree 2·count − 1.
///
/// Newton's method on the three-term recurrence, from Chebyshev-like starting
/// points (Abramowitz & Stegun, 25.4.29 and 22.16.6).
pub fn gauss_legendre(count: usize, from: f64, to: f64) -> Vec<(f64, f64)> {
    let (half, middle) = (0.5 * (to - from), 0.5 * (to + from));
    (0..count)
        .map(|index| {
            let mut x = -(PI * (index as f64 + 0.75) / (count as f64 + 0.5)).cos();
            let mut slope = 1.0;
            // Quadratic convergence: six steps pass double precision.
            for _ in 0..6 {
                let (mut below, mut value) = (1.0, x);
                for degree in 2..=count {
                    let degree = degree as f64;
                    let next = ((2.0 * degree - 1.0) * x * value - (degree - 1.0) * below) / degree;
                    (below, value) = (value, next);
                }
                slope = count as f64 * (x * value - below) / (x * x - 1.0);
                x -= value / slope;
            }
            (
                middle + half * x,
                half * 2.0 / ((1.0 - x * x) * slope * slope),
            )
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn integrates_polynomials_of_the_highest_degree_exactly() {
        for count in [2, 7, 40] {
            let degree = 2 * count as i32 - 1;
            let sum: f64 = gauss_legendre(count, 0.0, 1.0)
                .iter()
                .map(|(x, weight)| weight * x.powi(degree))
                .sum();
            assert!((sum * f64::from(degree + 1) - 1.0).abs() < 1e-13, "{count}");
        }
    }
}
