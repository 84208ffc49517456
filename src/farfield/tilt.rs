//! Tilts as a short sum: A(θ − δ) ≈ Σₜ fₜ(θ) gₜ(δ).
//!
//! exp(ikδ·s) in Hermite polynomials of δ/σ, orthonormal under the normal distribution
//! of rms σ, has the closed coefficients (ikσs)ʲ exp(−k²σ²s²/2)/√j!. Put into
//! A(θ − δ) = ∫ψ(s) exp(ikδ·s) exp(−ikθ·s) d²s they give the coefficients C[θ, j, l] as
//! transforms of the element weighted by powers of s. A singular value decomposition of
//! C, over the window's directions and the polynomials, then leaves the fewest terms
//! whose error stays below the one asked for: in the mean over the elements and, for
//! what does not average out, pointwise.

use super::pattern::{Wavefront, element_strips};
use crate::array::Array;
use multiversion::multiversion;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Most polynomials' total degree; what needs more is no case for this method.
const MOST_DEGREE: usize = 24;
/// Most terms.
const MOST_TERMS: usize = 32;

/// One of the gₜ: monomials of (δx/σ, δy/σ) with their coefficients.
pub type Polynomial = Vec<(usize, f32)>;

/// The expansion.
#[derive(Debug, Clone)]
pub struct TiltExpansion {
    /// 1/σ, the scale of the polynomials' argument; 0 when no element tilts.
    pub per_rad: f32,
    /// Powers of x and y of each monomial, in an order that each follows from an earlier one.
    pub monomials: Vec<(usize, usize)>,
    /// gₜ.
    pub polynomials: Vec<Polynomial>,
    /// Chebyshev coefficients of each fₜ, `[x][y]`, over ±`half_width_rad`.
    fields: Vec<Vec<Complex64>>,
    nodes: usize,
    half_width_rad: f64,
}

/// What an expansion must serve.
#[derive(Debug, Clone, Copy)]
pub struct Demand {
    /// Half width of the directions.
    pub half_width_rad: f64,
    /// Rms per axis of the elements' random tilts.
    pub random_rad: f64,
    /// Bound on structured tilts per axis: a table's, or what a focus leaves.
    pub structured_rad: f64,
    /// Error over the peak amplitude.
    pub tolerance: f64,
}

impl TiltExpansion {
    /// Expand the pattern of an array's element; `None` when the tilts are too large for this method.
    pub fn new(array: &Array, wavefront: Wavefront, demand: Demand) -> Option<TiltExpansion> {
        let k = array.wavenumber();
        let (half_x, half_y) = array.element.half_extent_m();
        let reach_m = half_x.hypot(half_y).min(array.element.farthest_m(0.0, 0.0));
        // Structured tilts fill their range; a normal weight of this rms favours none of it.
        let sigma = demand.random_rad.hypot(0.6 * demand.structured_rad);
        let elements = array.len() as f64;
        // What remains of n independent errors of unit rms in the sum, with room for tails.
        let random_share = if demand.structured_rad > 0.0 {
            6.0
        } else {
            4.0 / elements.sqrt() + 10.0 / elements
        };
        let degree = if sigma > 0.0 {
            degree(
                k * sigma * reach_m,
                demand.tolerance / (3.0 * random_share.max(1e-3)),
            )?
        } else {
            0
        };
        let nodes = 14 + (1.1 * k * demand.half_width_rad * half_x.max(half_y)).ceil() as usize;
        let monomials: Vec<(usize, usize)> = (0..=degree)
            .flat_map(|total| (0..=total).map(move |y| (total - y, y)))
            .collect();
        let grid = Chebyshev::new(nodes, demand.half_width_rad);
        let columns = coefficients(array, wavefront, &grid, sigma, degree, &monomials);
        let chosen = choose_terms(&columns, random_share, demand.tolerance)?;
        let to_monomials = hermite_in_monomials(&monomials);
        let polynomials = chosen
            .iter()
            .map(|vector| {
                let mut sums = vec![0.0; monomials.len()];
                for (weight, row) in vector.iter().zip(&to_monomials) {
                    for (sum, coefficient) in sums.iter_mut().zip(row) {
                        *sum += weight * coefficient;
                    }
                }
                let largest = sums.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
                sums.into_iter()
                    .enumerate()
                    .filter(|(_, value)| value.abs() > 1e-12 * largest)
                    .map(|(monomial, value)| (monomial, value as f32))
                    .collect()
            })
            .collect();
        let fields = chosen
            .iter()
            .map(|vector| {
                let mut values = vec![Complex64::default(); nodes * nodes];
                for (weight, column) in vector.iter().zip(&columns) {
                    for (value, part) in values.iter_mut().zip(column) {
                        *value += weight * part;
                    }
                }
                transposed(&grid.coefficients(&values), nodes)
            })
            .collect();
        Some(TiltExpansion {
            per_rad: if sigma > 0.0 {
                (1.0 / sigma) as f32
            } else {
                0.0
            },
            monomials,
            polynomials,
            fields,
            nodes,
            half_width_rad: demand.half_width_rad,
        })
    }

    /// Terms.
    pub fn terms(&self) -> usize {
        self.polynomials.len()
    }

    /// Chebyshev points per axis that each fₜ takes.
    pub fn nodes(&self) -> usize {
        self.nodes
    }

    /// fₜ at every pair of directions, `[x][y]`, into `values`.
    pub fn evaluate(
        &self,
        term: usize,
        theta_x: &[f64],
        theta_y: &[f64],
        values: &mut [Complex64],
    ) {
        let basis = |theta: &[f64]| -> Vec<f64> {
            let mut rows = Vec::with_capacity(theta.len() * self.nodes);
            for angle in theta {
                let x = (angle / self.half_width_rad).clamp(-1.0, 1.0);
                let (mut before, mut value) = (1.0, x);
                for _ in 0..self.nodes {
                    rows.push(before);
                    (before, value) = (value, 2.0 * x * value - before);
                }
            }
            rows
        };
        let (across, along) = (basis(theta_y), basis(theta_x));
        // Along y for each Chebyshev order of x: [order][direction].
        let half_way: Vec<Complex64> = self.fields[term]
            .chunks_exact(self.nodes)
            .flat_map(|row| {
                across
                    .chunks_exact(self.nodes)
                    .map(move |basis| row.iter().zip(basis).map(|(c, b)| c * b).sum())
            })
            .collect();
        combine(values, theta_y.len(), &along, &half_way, self.nodes);
    }
}

/// Each line of `values`, `width` long: the sum of the rows of `parts` under its `nodes` weights.
#[multiversion(targets(
    "x86_64+avx2+fma+avx512f+avx512bw+avx512dq+avx512vl",
    "x86_64+avx2+fma"
))]
fn combine(
    values: &mut [Complex64],
    width: usize,
    weights: &[f64],
    parts: &[Complex64],
    nodes: usize,
) {
    for (line, weights) in values
        .chunks_exact_mut(width)
        .zip(weights.chunks_exact(nodes))
    {
        line.fill(Complex64::default());
        // Four rows at a time, so that a line is read and written a quarter as often.
        for (weights, parts) in weights.chunks(4).zip(parts.chunks(4 * width)) {
            let row = |index: usize| {
                let start = index.min(weights.len() - 1) * width;
                &parts[start..start + width]
            };
            let weight = |index: usize| weights.get(index).copied().unwrap_or(0.0);
            let (a, b, c, d) = (row(0), row(1), row(2), row(3));
            let (wa, wb, wc, wd) = (weight(0), weight(1), weight(2), weight(3));
            for (index, value) in line.iter_mut().enumerate() {
                value.re +=
                    (wa * a[index].re + wb * b[index].re) + (wc * c[index].re + wd * d[index].re);
                value.im +=
                    (wa * a[index].im + wb * b[index].im) + (wc * c[index].im + wd * d[index].im);
            }
        }
    }
}

/// The degree at which the Hermite series of exp(ikδ·s) may end: xᵈ⁺¹/√(d + 1)! below `tolerance`.
fn degree(x: f64, tolerance: f64) -> Option<usize> {
    let mut size = 1.0;
    for degree in 0..=MOST_DEGREE {
        size *= x / ((degree + 1) as f64).sqrt();
        if size < tolerance {
            return Some(degree);
        }
    }
    None
}

/// Chebyshev points in two dimensions.
struct Chebyshev {
    nodes: usize,
    half_width: f64,
}

impl Chebyshev {
    fn new(nodes: usize, half_width: f64) -> Chebyshev {
        Chebyshev { nodes, half_width }
    }

    fn points(&self) -> Vec<f64> {
        (0..self.nodes)
            .map(|j| self.half_width * (PI * (j as f64 + 0.5) / self.nodes as f64).cos())
            .collect()
    }

    /// Coefficients `[y][x]` of values at the points `[y][x]` (a discrete cosine transform).
    fn coefficients(&self, values: &[Complex64]) -> Vec<Complex64> {
        let n = self.nodes;
        let weight = |order: usize, node: usize| {
            let norm = if order == 0 { 1.0 } else { 2.0 } / n as f64;
            norm * (PI * order as f64 * (node as f64 + 0.5) / n as f64).cos()
        };
        let mut across = vec![Complex64::default(); n * n];
        for (row, out) in values.chunks_exact(n).zip(across.chunks_exact_mut(n)) {
            for (order, sum) in out.iter_mut().enumerate() {
                *sum = row
                    .iter()
                    .enumerate()
                    .map(|(node, v)| v * weight(order, node))
                    .sum();
            }
        }
        let mut both = vec![Complex64::default(); n * n];
        for order in 0..n {
            for node in 0..n {
                let weight = weight(order, node);
                for column in 0..n {
                    both[order * n + column] += weight * across[node * n + column];
                }
            }
        }
        both
    }
}

/// A square matrix, transposed.
fn transposed(values: &[Complex64], size: usize) -> Vec<Complex64> {
    (0..size * size)
        .map(|place| values[place % size * size + place / size])
        .collect()
}

/// C[monomial's (j, l)][θ], `[y][x]` within a column.
fn coefficients(
    array: &Array,
    wavefront: Wavefront,
    grid: &Chebyshev,
    sigma: f64,
    degree: usize,
    monomials: &[(usize, usize)],
) -> Vec<Vec<Complex64>> {
    let k = array.wavenumber();
    let mut spread = wavefront;
    // The factor exp(−k²σ²s²/2) is that of a mean over tilts of rms σ.
    spread.mean_over_tilt_rad = wavefront.mean_over_tilt_rad.hypot(sigma);
    let strips = element_strips(
        &array.element,
        k,
        spread,
        std::f64::consts::SQRT_2 * grid.half_width,
        degree,
    );
    let points = grid.points();
    let n = grid.nodes;
    // (ikσs)ʲ/√j! for j up to the degree.
    let powers = |s: f64| -> Vec<Complex64> {
        let step = Complex64::new(0.0, k * sigma * s);
        let mut power = Complex64::new(1.0, 0.0);
        (0..=degree)
            .map(|j| {
                let value = power;
                power *= step / ((j + 1) as f64).sqrt();
                value
            })
            .collect()
    };
    let mut columns = vec![vec![Complex64::default(); n * n]; monomials.len()];
    for strip in &strips {
        // Along y first: [l][θy].
        let mut along = vec![Complex64::default(); (degree + 1) * n];
        for &(y, weight) in &strip.nodes {
            let powers = powers(y);
            for (node, theta) in points.iter().enumerate() {
                let wave = weight * Complex64::cis(-k * theta * y);
                for (l, power) in powers.iter().enumerate() {
                    along[l * n + node] += wave * power;
                }
            }
        }
        let powers = powers(strip.x_m);
        let waves: Vec<Complex64> = points
            .iter()
            .map(|theta| Complex64::cis(-k * theta * strip.x_m))
            .collect();
        for (column, &(j, l)) in columns.iter_mut().zip(monomials) {
            for (row, part) in column.chunks_exact_mut(n).zip(&along[l * n..]) {
                let part = part * powers[j];
                for (value, wave) in row.iter_mut().zip(&waves) {
                    *value += part * wave;
                }
            }
        }
    }
    columns
}

/// The leading right singular vectors of C that meet the tolerance.
fn choose_terms(
    columns: &[Vec<Complex64>],
    random_share: f64,
    tolerance: f64,
) -> Option<Vec<Vec<f64>>> {
    let size = columns.len();
    let mut gram = vec![0.0; size * size];
    for (a, first) in columns.iter().enumerate() {
        for (b, second) in columns.iter().enumerate().take(a + 1) {
            let dot: f64 = first
                .iter()
                .zip(second)
                .map(|(x, y)| (x.conj() * y).re)
                .sum();
            gram[a * size + b] = dot;
            gram[b * size + a] = dot;
        }
    }
    let vectors = eigenvectors(gram, size);
    let directions = columns[0].len();
    let peak = columns[0].iter().fold(0.0, |a: f64, b| a.max(b.norm()));
    // What is left of the mean and of the mean square, at every direction.
    let mut mean_left: Vec<Complex64> = columns[0].clone();
    let mut square_left: Vec<f64> = (0..directions)
        .map(|direction| {
            columns
                .iter()
                .map(|column| column[direction].norm_sqr())
                .sum()
        })
        .collect();
    let mut chosen: Vec<Vec<f64>> = Vec::new();
    for vector in vectors {
        for direction in 0..directions {
            let field: Complex64 = vector
                .iter()
                .zip(columns)
                .map(|(weight, column)| weight * column[direction])
                .sum();
            mean_left[direction] -= field * vector[0];
            square_left[direction] -= field.norm_sqr();
        }
        chosen.push(vector);
        let error = (0..directions)
            .map(|direction| {
                mean_left[direction].norm() + random_share * square_left[direction].max(0.0).sqrt()
            })
            .fold(0.0, f64::max);
        // Subtraction leaves about 1e-16 of the squares: that is no error of the terms.
        if error <= tolerance * peak + random_share * 3e-8 * peak {
            return Some(chosen);
        }
        if chosen.len() == MOST_TERMS {
            return None;
        }
    }
    Some(chosen)
}

/// Eigenvectors of a symmetric matrix, largest eigenvalue first (Jacobi's method,
/// cyclic; Golub & Van Loan, *Matrix Computations*, section on Jacobi methods).
fn eigenvectors(mut matrix: Vec<f64>, size: usize) -> Vec<Vec<f64>> {
    let mut vectors = vec![0.0; size * size];
    for index in 0..size {
        vectors[index * size + index] = 1.0;
    }
    let trace: f64 = (0..size).map(|index| matrix[index * size + index]).sum();
    for _ in 0..30 {
        let mut turned = false;
        for p in 0..size {
            for q in p + 1..size {
                let off = matrix[p * size + q];
                let (app, aqq) = (matrix[p * size + p], matrix[q * size + q]);
                if off.abs() <= 1e-17 * (app * aqq).abs().sqrt() + 1e-30 * trace {
                    continue;
                }
                turned = true;
                let tau = (aqq - app) / (2.0 * off);
                let t = tau.signum() / (tau.abs() + (1.0 + tau * tau).sqrt());
                let c = 1.0 / (1.0 + t * t).sqrt();
                let s = t * c;
                for index in 0..size {
                    let (x, y) = (matrix[index * size + p], matrix[index * size + q]);
                    matrix[index * size + p] = c * x - s * y;
                    matrix[index * size + q] = s * x + c * y;
                }
                for index in 0..size {
                    let (x, y) = (matrix[p * size + index], matrix[q * size + index]);
                    matrix[p * size + index] = c * x - s * y;
                    matrix[q * size + index] = s * x + c * y;
                }
                for index in 0..size {
                    let (x, y) = (vectors[index * size + p], vectors[index * size + q]);
                    vectors[index * size + p] = c * x - s * y;
                    vectors[index * size + q] = s * x + c * y;
                }
            }
        }
        if !turned {
            break;
        }
    }
    let mut order: Vec<usize> = (0..size).collect();
    order.sort_by(|&a, &b| matrix[b * size + b].total_cmp(&matrix[a * size + a]));
    order
        .into_iter()
        .map(|column| (0..size).map(|row| vectors[row * size + column]).collect())
        .collect()
}

/// Each orthonormal Hermite product He_j(x)·He_l(y)/√(j! l!) in the monomials.
fn hermite_in_monomials(monomials: &[(usize, usize)]) -> Vec<Vec<f64>> {
    let degree = monomials.iter().map(|(x, y)| x + y).max().unwrap_or(0);
    // One-dimensional, orthonormal: h_{j+1} = (x h_j − √j h_{j−1})/√(j + 1).
    let mut one: Vec<Vec<f64>> = vec![vec![0.0; degree + 1]; degree + 1];
    one[0][0] = 1.0;
    for j in 0..degree {
        for power in 0..=degree {
            let raised = if power > 0 { one[j][power - 1] } else { 0.0 };
            let before = if j > 0 {
                (j as f64).sqrt() * one[j - 1][power]
            } else {
                0.0
            };
            one[j + 1][power] = (raised - before) / ((j + 1) as f64).sqrt();
        }
    }
    monomials
        .iter()
        .map(|&(j, l)| {
            monomials
                .iter()
                .map(|&(a, b)| one[j][a] * one[l][b])
                .collect()
        })
        .collect()
}
