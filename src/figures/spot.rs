//! Peaks, widths at half maximum, and second moments.

use super::interpolate::Interpolant;
use crate::farfield::Map;

/// A maximum of the map, between its pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Column, in pixels.
    pub x: f64,
    /// Row, in pixels.
    pub y: f64,
    /// Irradiance.
    pub irradiance_w_m2: f64,
}

/// How much an interpolated maximum may exceed its pixel: at two samples a spot or more, below this.
const HEADROOM: f64 = 1.6;

/// The highest local maxima of a map, highest first, at least two where the map has them.
pub fn highest_peaks(map: &Map, interpolant: &Interpolant) -> Vec<Peak> {
    let mut pixels = local_maxima(map);
    pixels.sort_by(|a, b| b.2.total_cmp(&a.2).then(a.0.cmp(&b.0)).then(a.1.cmp(&b.1)));
    let mut peaks: Vec<Peak> = Vec::new();
    for (column, row, value) in pixels {
        let second = peaks.get(1).map_or(0.0, |peak| peak.irradiance_w_m2);
        if peaks.len() >= 2 && value * HEADROOM < second {
            break;
        }
        peaks.push(refine(map, interpolant, column, row));
        peaks.sort_by(|a, b| b.irradiance_w_m2.total_cmp(&a.irradiance_w_m2));
        peaks.truncate(2);
    }
    peaks
}

/// Pixels inside the map's border that no neighbour of eight exceeds: column, row, irradiance.
pub fn local_maxima(map: &Map) -> Vec<(usize, usize, f64)> {
    let pixels = map.grid.pixels;
    let mut found = Vec::new();
    for row in 1..pixels.saturating_sub(1) {
        let [above, line, below] = [row - 1, row, row + 1]
            .map(|row| &map.irradiance_w_m2[row * pixels..(row + 1) * pixels]);
        for column in 1..pixels - 1 {
            let value = line[column];
            let beats = |other: f64| value > other;
            let holds = |other: f64| value >= other;
            // Of equal neighbours the first in reading order counts.
            if beats(line[column - 1])
                && holds(line[column + 1])
                && above[column - 1..=column + 1]
                    .iter()
                    .all(|&other| beats(other))
                && below[column - 1..=column + 1]
                    .iter()
                    .all(|&other| holds(other))
            {
                found.push((column, row, value));
            }
        }
    }
    found
}

/// Climb from a pixel to the maximum of the interpolated map.
///
/// Newton's method on a small stencil, along the principal axes of curvature: on the
/// crest of a ring only the axis across it is curved, and only along that a step is taken.
pub fn refine(map: &Map, interpolant: &Interpolant, column: usize, row: usize) -> Peak {
    const STEP: f64 = 0.1;
    let (start_x, start_y) = (column as f64, row as f64);
    let (mut x, mut y) = (start_x, start_y);
    let mut best = Peak {
        x,
        y,
        irradiance_w_m2: map.at(row, column),
    };
    for _ in 0..6 {
        let f = interpolant.grid(map, &[x - STEP, x, x + STEP], &[y - STEP, y, y + STEP]);
        if f[4] > best.irradiance_w_m2 {
            best = Peak {
                x,
                y,
                irradiance_w_m2: f[4],
            };
        }
        let (gx, gy) = ((f[5] - f[3]) / (2.0 * STEP), (f[7] - f[1]) / (2.0 * STEP));
        let hxx = (f[5] - 2.0 * f[4] + f[3]) / (STEP * STEP);
        let hyy = (f[7] - 2.0 * f[4] + f[1]) / (STEP * STEP);
        let hxy = (f[8] - f[6] - f[2] + f[0]) / (4.0 * STEP * STEP);
        let (middle, half) = (0.5 * (hxx + hyy), (0.5 * (hxx - hyy)).hypot(hxy));
        let azimuth = 0.5 * hxy.atan2(0.5 * (hxx - hyy));
        let (cos, sin) = (azimuth.cos(), azimuth.sin());
        let flattest = 1e-3 * (middle.abs() + half);
        // Curvature along the axis at `azimuth`, and across it.
        let step = |curvature: f64, gradient: f64| {
            if curvature < -flattest {
                (-gradient / curvature).clamp(-0.7, 0.7)
            } else {
                0.0
            }
        };
        let along = step(middle + half, cos * gx + sin * gy);
        let across = step(middle - half, cos * gy - sin * gx);
        x = (x + cos * along - sin * across).clamp(start_x - 0.9, start_x + 0.9);
        y = (y + sin * along + cos * across).clamp(start_y - 0.9, start_y + 0.9);
        if along.abs().max(across.abs()) < 1e-4 {
            break;
        }
    }
    best
}

/// Widths at half of the peak, in pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HalfWidths {
    /// Diameter of the circle with the area of the region above half.
    pub of_area: Option<f64>,
    /// Along x through the peak.
    pub along_x: Option<f64>,
    /// Along y through the peak.
    pub along_y: Option<f64>,
}

/// Full widths at half maximum; `None` where the region reaches the map's edge.
pub fn half_widths(map: &Map, interpolant: &Interpolant, peak: Peak) -> HalfWidths {
    let half = peak.irradiance_w_m2 / 2.0;
    let across = |dx: f64, dy: f64| {
        let from = |sign: f64| crossing(map, interpolant, peak, half, sign * dx, sign * dy);
        Some(from(1.0)? + from(-1.0)?)
    };
    HalfWidths {
        of_area: area_above(map, interpolant, peak, half)
            .map(|area| 2.0 * (area / std::f64::consts::PI).sqrt()),
        along_x: across(1.0, 0.0),
        along_y: across(0.0, 1.0),
    }
}

/// Distance from the peak to where the map first falls to `level` along (`dx`, `dy`).
fn crossing(
    map: &Map,
    interpolant: &Interpolant,
    peak: Peak,
    level: f64,
    dx: f64,
    dy: f64,
) -> Option<f64> {
    const STEP: f64 = 0.5;
    let last = (map.grid.pixels - 1) as f64;
    let value = |t: f64| interpolant.at(map, peak.x + t * dx, peak.y + t * dy);
    let mut low = 0.0;
    loop {
        let high = low + STEP;
        let (x, y) = (peak.x + high * dx, peak.y + high * dy);
        if !(0.0..=last).contains(&x) || !(0.0..=last).contains(&y) {
            return None;
        }
        if value(high) < level {
            let (mut low, mut high) = (low, high);
            for _ in 0..20 {
                let middle = 0.5 * (low + high);
                if value(middle) < level {
                    high = middle;
                } else {
                    low = middle;
                }
            }
            return Some(0.5 * (low + high));
        }
        low = high;
    }
}

/// Area in pixels² of the connected region about the peak where the map exceeds `level`.
///
/// The region is found on a grid fine enough that some 80 steps cross it, and its
/// boundary is drawn by linear interpolation between the fine points.
fn area_above(map: &Map, interpolant: &Interpolant, peak: Peak, level: f64) -> Option<f64> {
    let last = map.grid.pixels - 1;
    let (mut left, mut right, mut bottom, mut top, count) = coarse_box(map, peak, 0.7 * level);
    let fine = (80.0 / (count as f64).sqrt()).ceil().clamp(2.0, 24.0) as usize;
    loop {
        let steps = |from: usize, to: usize| -> Vec<f64> {
            (0..=(to - from) * fine)
                .map(|index| from as f64 + index as f64 / fine as f64)
                .collect()
        };
        let (columns, rows) = (steps(left, right), steps(bottom, top));
        let values = interpolant.grid(map, &columns, &rows);
        let width = columns.len();
        let nearest = |position: f64, from: usize, count: usize| {
            (((position - from as f64) * fine as f64).round() as usize).min(count - 1)
        };
        let start = nearest(peak.y, bottom, rows.len()) * width + nearest(peak.x, left, width);
        let region = connected(&values, width, start, level);
        let touches = |inside: &dyn Fn(usize, usize) -> bool| {
            region
                .iter()
                .enumerate()
                .any(|(place, &held)| held && inside(place % width, place / width))
        };
        let (right_edge, top_edge) = (width - 1, rows.len() - 1);
        let sides = [
            touches(&|column, _| column == 0),
            touches(&|column, _| column == right_edge),
            touches(&|_, row| row == 0),
            touches(&|_, row| row == top_edge),
        ];
        if !sides.contains(&true) {
            let area = bounded_area(&values, &region, width, level);
            return Some(area / (fine * fine) as f64);
        }
        let at_map_edge = (sides[0] && left == 0)
            || (sides[1] && right == last)
            || (sides[2] && bottom == 0)
            || (sides[3] && top == last);
        if at_map_edge {
            return None;
        }
        let grow = 4;
        left = left.saturating_sub(grow);
        bottom = bottom.saturating_sub(grow);
        right = (right + grow).min(last);
        top = (top + grow).min(last);
    }
}

/// Bounding box (left, right, bottom, top) with two pixels to spare, and pixel count, of
/// the eight-connected pixels about the peak above `level`.
fn coarse_box(map: &Map, peak: Peak, level: f64) -> (usize, usize, usize, usize, usize) {
    let pixels = map.grid.pixels;
    let last = pixels - 1;
    let start = (
        (peak.x.round() as usize).min(last),
        (peak.y.round() as usize).min(last),
    );
    let mut seen = vec![false; pixels * pixels];
    let mut stack = vec![start];
    seen[start.1 * pixels + start.0] = true;
    let (mut left, mut right, mut bottom, mut top, mut count) =
        (start.0, start.0, start.1, start.1, 0);
    while let Some((column, row)) = stack.pop() {
        count += 1;
        (left, right) = (left.min(column), right.max(column));
        (bottom, top) = (bottom.min(row), top.max(row));
        for next_row in row.saturating_sub(1)..=(row + 1).min(last) {
            for next_column in column.saturating_sub(1)..=(column + 1).min(last) {
                let place = next_row * pixels + next_column;
                if !seen[place] && map.irradiance_w_m2[place] >= level {
                    seen[place] = true;
                    stack.push((next_column, next_row));
                }
            }
        }
    }
    (
        left.saturating_sub(2),
        (right + 2).min(last),
        bottom.saturating_sub(2),
        (top + 2).min(last),
        count,
    )
}

/// Four-connected points above `level` reached from `start`.
fn connected(values: &[f64], width: usize, start: usize, level: f64) -> Vec<bool> {
    let mut held = vec![false; values.len()];
    held[start] = true;
    let mut stack = vec![start];
    while let Some(place) = stack.pop() {
        let column = place % width;
        let neighbours = [
            (column > 0).then(|| place - 1),
            (column + 1 < width).then_some(place + 1),
            place.checked_sub(width),
            (place + width < values.len()).then_some(place + width),
        ];
        for next in neighbours.into_iter().flatten() {
            if !held[next] && values[next] >= level {
                held[next] = true;
                stack.push(next);
            }
        }
    }
    held
}

/// Area, in squares of the fine grid, inside the level line around the held points.
fn bounded_area(values: &[f64], held: &[bool], width: usize, level: f64) -> f64 {
    const CORNERS: [(f64, f64); 4] = [(0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)];
    let height = values.len() / width;
    let mut area = 0.0;
    for row in 0..height - 1 {
        for column in 0..width - 1 {
            let base = row * width + column;
            let places = [base, base + 1, base + width + 1, base + width];
            let inside = places.map(|place| held[place]);
            match inside.iter().filter(|&&corner| corner).count() {
                0 => continue,
                4 => {
                    area += 1.0;
                    continue;
                }
                _ => {}
            }
            let mut polygon: Vec<(f64, f64)> = Vec::with_capacity(8);
            for corner in 0..4 {
                let next = (corner + 1) % 4;
                if inside[corner] {
                    polygon.push(CORNERS[corner]);
                }
                if inside[corner] != inside[next] {
                    let (a, b) = (values[places[corner]] - level, values[places[next]] - level);
                    // Both sides above: the next point belongs to another region.
                    let t = if a * b < 0.0 { a / (a - b) } else { 0.5 };
                    let (p, q) = (CORNERS[corner], CORNERS[next]);
                    polygon.push((p.0 + t * (q.0 - p.0), p.1 + t * (q.1 - p.1)));
                }
            }
            let doubled: f64 = (0..polygon.len())
                .map(|index| {
                    let (p, q) = (polygon[index], polygon[(index + 1) % polygon.len()]);
                    p.0 * q.1 - q.0 * p.1
                })
                .sum();
            area += doubled / 2.0;
        }
    }
    area
}

/// 4σ widths along x and y in pixels after ISO 11146-1: over a square three times the
/// larger width about the centroid, started at three times `fwhm` about the peak and
/// iterated to 1e-4. `None` when the square reaches the map's edge.
pub fn second_moments(
    map: &Map,
    interpolant: &Interpolant,
    peak: Peak,
    fwhm: f64,
) -> Option<(f64, f64)> {
    let pixels = map.grid.pixels;
    let last = (pixels - 1) as f64;
    let (mut x, mut y, mut side) = (peak.x, peak.y, 3.0 * fwhm);
    let mut widths = (fwhm, fwhm);
    for _ in 0..50 {
        let half = side / 2.0;
        if x - half < 0.0 || y - half < 0.0 || x + half > last || y + half > last {
            return None;
        }
        let across = interpolant.moment_weights(x - half, x + half, x, pixels);
        let along = interpolant.moment_weights(y - half, y + half, y, pixels);
        let span = |centre: f64| {
            let reach = half + super::interpolate::REACH;
            let first = (centre - reach).floor().max(0.0) as usize;
            first..((centre + reach).ceil() as usize + 1).min(pixels)
        };
        let columns = span(x);
        let mut moments = [0.0; 5];
        for row in span(y) {
            let line = &map.irradiance_w_m2[row * pixels..(row + 1) * pixels];
            let mut sums = [0.0; 3];
            for (value, weights) in line[columns.clone()].iter().zip(&across[columns.clone()]) {
                for (sum, weight) in sums.iter_mut().zip(weights) {
                    *sum += weight * value;
                }
            }
            let weights = along[row];
            moments[0] += weights[0] * sums[0];
            moments[1] += weights[0] * sums[1];
            moments[2] += weights[0] * sums[2];
            moments[3] += weights[1] * sums[0];
            moments[4] += weights[2] * sums[0];
        }
        let power = moments[0];
        let (mean_x, mean_y) = (moments[1] / power, moments[3] / power);
        let width = |square: f64, mean: f64| 4.0 * (square / power - mean * mean).max(0.0).sqrt();
        let next = (width(moments[2], mean_x), width(moments[4], mean_y));
        let change = ((next.0 - widths.0) / next.0)
            .abs()
            .max(((next.1 - widths.1) / next.1).abs());
        (x, y) = (x + mean_x, y + mean_y);
        widths = next;
        side = 3.0 * next.0.max(next.1);
        if change < 1e-4 {
            break;
        }
    }
    Some(widths)
}
