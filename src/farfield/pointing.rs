//! Where the elements of an array point: the transform of their static tilts.

use super::smooth::Samples;
use crate::array::sites::LatticeSites;
use crate::array::{Array, Elements, Sites};
use num_complex::Complex64;
use rayon::prelude::*;
use std::f64::consts::TAU;

/// Elements of a list that are taken up together.
const BLOCK: usize = 256;

/// Σ Pₙ exp(−i2πf·δₙ) at every frequency of `samples`, `[fy][fx]`.
pub fn pointing(array: &Array, samples: &Samples) -> Vec<Complex64> {
    let count = samples.count;
    if array.largest_tilt_rad() <= 0.0 {
        return vec![array.power_w().into(); count * count];
    }
    match &array.sites {
        Sites::List(_) => of_list(&array.list(), samples),
        Sites::Lattice {
            sites,
            amplitude,
            taper_per_m2,
        } => {
            let power = |position_m: f64| (-2.0 * taper_per_m2 * position_m * position_m).exp();
            let mut sums = of_lattice(sites, array.defocus_per_m, power, samples);
            for sum in &mut sums {
                *sum *= amplitude * amplitude;
            }
            sums
        }
    }
}

/// Elements one by one: phasors along x of a block, then every row takes them up.
fn of_list(elements: &Elements, samples: &Samples) -> Vec<Complex64> {
    let (count, frequencies) = (samples.count, samples.frequencies());
    let mut sums = vec![Complex64::default(); count * count];
    for first in (0..elements.len()).step_by(BLOCK) {
        let block = first..(first + BLOCK).min(elements.len());
        let along_x: Vec<Complex64> = block
            .clone()
            .flat_map(|n| {
                let tilt = elements.tilt_x_rad[n];
                frequencies
                    .iter()
                    .map(move |f| Complex64::cis(-TAU * f * tilt))
            })
            .collect();
        sums.par_chunks_exact_mut(count)
            .zip(&frequencies)
            .for_each(|(row, f)| {
                for (phasors, n) in along_x.chunks_exact(count).zip(block.clone()) {
                    let power = elements.amplitude[n] * elements.amplitude[n];
                    let along_y = power * Complex64::cis(-TAU * f * elements.tilt_y_rad[n]);
                    for (value, phasor) in row.iter_mut().zip(phasors) {
                        *value += along_y * phasor;
                    }
                }
            });
    }
    sums
}

/// A lattice whose focus lies elsewhere, δ = c r: running sums along x serve every row.
fn of_lattice(
    sites: &LatticeSites,
    defocus_per_m: f64,
    power: impl Fn(f64) -> f64 + Sync,
    samples: &Samples,
) -> Vec<Complex64> {
    let (count, frequencies) = (samples.count, samples.frequencies());
    let step = 1.0 / (samples.count as f64 * samples.spacing);
    let turn = |f: f64, position_m: f64| Complex64::cis(-TAU * f * defocus_per_m * position_m);
    // [fx][fy], each fx on its own.
    let by_column: Vec<Vec<Complex64>> = frequencies
        .par_iter()
        .map(|&fx| {
            let running = [0, 1].map(|parity| {
                let mut sums = vec![Complex64::default()];
                for column in 0..sites.columns {
                    let x = sites.x_m(parity, column);
                    sums.push(sums[column] + power(x) * turn(fx, x));
                }
                sums
            });
            let mut sums = vec![Complex64::default(); count];
            for row in &sites.rows {
                let running = &running[row.parity];
                let along_x: Complex64 = row
                    .spans
                    .iter()
                    .map(|span| running[span.end] - running[span.start])
                    .sum();
                // Frequencies rise in equal steps from 0, then from the most negative one.
                let advance = turn(step, row.y_m);
                let (up, down) = sums.split_at_mut(count / 2 + 1);
                for (half, lowest) in [(up, 0.0), (down, -((count / 2) as f64) * step)] {
                    let mut value = along_x * power(row.y_m) * turn(lowest, row.y_m);
                    for sum in half {
                        *sum += value;
                        value *= advance;
                    }
                }
            }
            sums
        })
        .collect();
    (0..count * count)
        .map(|place| by_column[place % count][place / count])
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::scenario::Scenario;
    use std::path::Path;

    #[test]
    fn a_lattice_points_where_its_listed_elements_point() {
        let text = "[beam]\nwavelength = \"1 um\"\n[array]\nlayout = \"hexagonal\"\n\
            outline = \"circle\"\nacross = \"30 cm\"\nhole = \"6 cm\"\ntaper = \"6 dB\"\n\
            [array.element]\nshape = \"circle\"\nsize = \"1 cm\"\n\
            [target]\nrange = \"10 km\"\nfocus = \"7 km\"\n";
        let scenario = Scenario::from_toml(text, "test", Path::new("."), &[]).expect("valid");
        let array = Array::new(&scenario).expect("an array");
        let samples = Samples::new(3e-5, 1e4, 2e-5);
        let (fast, slow) = (pointing(&array, &samples), of_list(&array.list(), &samples));
        let worst = fast
            .iter()
            .zip(&slow)
            .map(|(a, b)| (a - b).norm())
            .fold(0.0, f64::max);
        assert!(worst < 1e-11, "{worst:e} of the 1 W radiated");
    }
}
