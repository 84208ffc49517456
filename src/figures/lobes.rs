//! The brightest lobes of the array without errors, inside the window and beyond it.
//!
//! Out to a few element beam widths the lobes are local maxima of a wide map; the
//! grating lobes of a lattice beyond that map stand at λ times the reciprocal lattice's
//! vectors, as bright as the element pattern leaves them.

use super::interpolate::Interpolant;
use super::spot::{local_maxima, refine};
use crate::array::Array;
use crate::array::element::SQRT_3;
use crate::farfield::choose::{Task, choose};
use crate::farfield::pattern::{ElementPattern, Wavefront};
use crate::farfield::{Grid, Map};
use crate::perturb::TrialErrors;
use crate::scenario::{Errors, Lattice, MethodChoice};

/// One lobe.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lobe {
    /// Direction.
    pub theta_x_rad: f64,
    /// Direction.
    pub theta_y_rad: f64,
    /// Irradiance over the highest of all.
    pub irradiance_over_peak: f64,
}

/// Lobes listed.
pub const LISTED: usize = 20;
/// Half width of the wide map in element beam widths λ/size.
const BEAM_WIDTHS: f64 = 2.5;
/// Pixels of the wide map at most.
const MOST_PIXELS: usize = 767;
/// Samples per spot of the wide map.
const SAMPLES_PER_SPOT: f64 = 4.0;
/// Grating orders looked at in either direction.
const ORDERS: i32 = 6;

/// The brightest lobes, brightest first; the main lobe is one of them.
///
/// `window_m` is the width of the study's map, which the search covers as far as 767 pixels allow.
pub fn brightest(array: &Array, window_m: f64) -> Vec<Lobe> {
    let spot_m = array.spot_m();
    let beam_m = array.wavelength_m * array.range_m / array.element.size_m;
    let width_m = window_m.max(2.0 * BEAM_WIDTHS * beam_m);
    let mut grid = Grid::covering(width_m, spot_m / SAMPLES_PER_SPOT);
    grid.pixels = grid.pixels.min(MOST_PIXELS);
    let Ok(choice) = choose(array, Task::still(grid), MethodChoice::Auto) else {
        return Vec::new();
    };
    let mut map = Map::dark(grid);
    choice
        .prepare(array)
        .worker()
        .irradiance(TrialErrors::none(&Errors::none()), &mut map);
    let interpolant = Interpolant::new(SAMPLES_PER_SPOT);
    let mut maxima = local_maxima(&map);
    maxima.sort_by(|a, b| b.2.total_cmp(&a.2));
    // Pixels stand up to a fifth below their maxima, so a few more than are listed.
    maxima.truncate(3 * LISTED);
    let to_angle = |pixel: f64| (pixel - grid.centre() as f64) * grid.pixel_m / array.range_m;
    let mut lobes: Vec<Lobe> = maxima
        .iter()
        .map(|&(column, row, _)| {
            let peak = refine(&map, &interpolant, column, row);
            Lobe {
                theta_x_rad: to_angle(peak.x),
                theta_y_rad: to_angle(peak.y),
                irradiance_over_peak: peak.irradiance_w_m2,
            }
        })
        .collect();
    lobes.extend(grating_lobes(array, grid, map.aim_w_m2()));
    lobes.sort_by(|a, b| b.irradiance_over_peak.total_cmp(&a.irradiance_over_peak));
    lobes.truncate(LISTED);
    let peak = lobes.first().map_or(1.0, |lobe| lobe.irradiance_over_peak);
    lobes.retain(|lobe| lobe.irradiance_over_peak > 0.0);
    for lobe in &mut lobes {
        lobe.irradiance_over_peak /= peak;
    }
    lobes
}

/// Grating lobes of a lattice outside `seen`, with absolute irradiance: that at the aim point times
/// the element pattern's fall. What a focus elsewhere tilts the elements by is left out.
fn grating_lobes(array: &Array, seen: Grid, aim_w_m2: f64) -> Vec<Lobe> {
    let Some(sites) = array.lattice().filter(|_| array.len() > 1) else {
        return Vec::new();
    };
    let step = array.wavelength_m / sites.pitch_m;
    let limit = (seen.width_m() / 2.0 - seen.pixel_m) / array.range_m;
    let mut directions: Vec<(f64, f64)> = Vec::new();
    for h in -ORDERS..=ORDERS {
        for k in -ORDERS..=ORDERS {
            let (h, k) = (f64::from(h), f64::from(k));
            // Reciprocal vectors of the lattices with a row of neighbours along x.
            let (x, y) = match sites.lattice {
                Lattice::Square => (h * step, k * step),
                Lattice::Hexagonal => (h * step, (2.0 * k - h) / SQRT_3 * step),
            };
            if x.abs() > limit || y.abs() > limit {
                directions.push((x, y));
            }
        }
    }
    let reach = 2.0 * f64::from(ORDERS) * step;
    let pattern = ElementPattern::new(
        &array.element,
        array.wavenumber(),
        Wavefront {
            curvature_per_m: array.curvature_per_m,
            mean_over_tilt_rad: 0.0,
        },
        reach,
    );
    let irradiance = |(x, y): (f64, f64)| pattern.at(x, y).norm_sqr();
    directions.sort_by(|&a, &b| irradiance(b).total_cmp(&irradiance(a)));
    directions.truncate(LISTED);
    // The array factor repeats at every grating order; at the centre of the map it has been seen.
    let centre = irradiance((0.0, 0.0));
    directions
        .into_iter()
        .map(|direction| Lobe {
            theta_x_rad: direction.0,
            theta_y_rad: direction.1,
            irradiance_over_peak: aim_w_m2 * irradiance(direction) / centre,
        })
        .collect()
}
