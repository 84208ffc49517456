//! A small raster canvas with exact antialiasing.
//!
//! Every outline is given by its signed distance, and a pixel on an edge is
//! covered in proportion. That draws clean circles, dashes and tilings in one
//! pass at the final size, where a general raster library would have to draw
//! larger and shrink, at several times the cost.

use super::style::Colour;
use image::codecs::png::{CompressionType, FilterType, PngEncoder};
use image::{ExtendedColorType, ImageEncoder};

/// A place on the canvas in pixels, y downwards.
pub(super) type Point = (f64, f64);

/// A rectangle in pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Rect {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Rect {
    /// From the left top corner and the size.
    pub fn sized(left: f64, top: f64, width: f64, height: f64) -> Rect {
        Rect {
            left,
            top,
            right: left + width,
            bottom: top + height,
        }
    }

    pub fn width(&self) -> f64 {
        self.right - self.left
    }

    pub fn height(&self) -> f64 {
        self.bottom - self.top
    }

    pub fn centre(&self) -> Point {
        (
            0.5 * (self.left + self.right),
            0.5 * (self.top + self.bottom),
        )
    }

    /// Larger by `margin` on every side.
    pub fn grown(&self, margin: f64) -> Rect {
        Rect {
            left: self.left - margin,
            top: self.top - margin,
            right: self.right + margin,
            bottom: self.bottom + margin,
        }
    }

    /// The part that lies inside `other`.
    fn within(&self, other: &Rect) -> Rect {
        Rect {
            left: self.left.max(other.left),
            top: self.top.max(other.top),
            right: self.right.min(other.right),
            bottom: self.bottom.min(other.bottom),
        }
    }
}

/// How a line is drawn.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pen {
    pub colour: Colour,
    pub width_px: f64,
    /// Lengths of dash and gap in turn; empty for a solid line.
    pub dash_px: &'static [f64],
    /// A wider line beneath it, for lines over a picture of any brightness.
    pub casing: Option<Colour>,
}

impl Pen {
    /// A solid line.
    pub fn solid(colour: Colour, width_px: f64) -> Pen {
        Pen {
            colour,
            width_px,
            dash_px: &[],
            casing: None,
        }
    }
}

/// The picture being drawn.
#[derive(Debug)]
pub(super) struct Canvas {
    width: usize,
    height: usize,
    rgb: Vec<u8>,
    clip: Rect,
}

impl Canvas {
    /// A white canvas.
    pub fn new(width: usize, height: usize) -> Canvas {
        Canvas {
            width,
            height,
            rgb: vec![255; width * height * 3],
            clip: Rect::sized(0.0, 0.0, width as f64, height as f64),
        }
    }

    /// Full area.
    pub fn area(&self) -> Rect {
        Rect::sized(0.0, 0.0, self.width as f64, self.height as f64)
    }

    /// Draws with everything outside `rect` cut off.
    pub fn clipped(&mut self, rect: Rect, draw: impl FnOnce(&mut Canvas)) {
        let before = self.clip;
        self.clip = rect.within(&before);
        draw(self);
        self.clip = before;
    }

    /// Rows and columns of the pixels that `rect` touches inside the clip.
    fn touched(&self, rect: &Rect) -> (std::ops::Range<usize>, std::ops::Range<usize>) {
        let undefined = [rect.left, rect.top, rect.right, rect.bottom]
            .iter()
            .any(|value| value.is_nan());
        if undefined {
            return (0..0, 0..0);
        }
        let part = rect.within(&self.clip);
        // Casting saturates, so that wild coordinates touch nothing.
        let range = |low: f64, high: f64| {
            let low = low.floor().max(0.0) as usize;
            low..(high.ceil() as usize).max(low)
        };
        (range(part.top, part.bottom), range(part.left, part.right))
    }

    /// Mixes `colour` into a pixel.
    pub fn blend(&mut self, column: usize, row: usize, colour: Colour, share: f64) {
        if column >= self.width || row >= self.height || share <= 0.0 {
            return;
        }
        let at = (row * self.width + column) * 3;
        let share = share.min(1.0);
        for (old, new) in self.rgb[at..at + 3].iter_mut().zip(colour.0) {
            let mixed = f64::from(*old) + (f64::from(new) - f64::from(*old)) * share;
            *old = (mixed + 0.5) as u8;
        }
    }

    /// Paints every pixel of `rect` by its column and row within it.
    pub fn paint(&mut self, rect: Rect, colour_at: impl Fn(usize, usize) -> Colour) {
        let (rows, columns) = self.touched(&rect);
        let (left, top) = (rect.left.max(0.0) as usize, rect.top.max(0.0) as usize);
        for row in rows {
            for column in columns.clone() {
                let colour = colour_at(column.saturating_sub(left), row.saturating_sub(top));
                self.blend(column, row, colour, 1.0);
            }
        }
    }

    /// Fills the area where `distance_px` is negative, within `bounds`.
    pub fn fill(
        &mut self,
        bounds: Rect,
        colour: Colour,
        opacity: f64,
        distance_px: impl Fn(f64, f64) -> f64,
    ) {
        let (rows, columns) = self.touched(&bounds.grown(1.0));
        for row in rows {
            for column in columns.clone() {
                let distance = distance_px(column as f64 + 0.5, row as f64 + 0.5);
                let covered = (0.5 - distance).clamp(0.0, 1.0);
                self.blend(column, row, colour, covered * opacity);
            }
        }
    }

    /// Fills a rectangle, its edges covering pixels in part.
    pub fn fill_rect(&mut self, rect: Rect, colour: Colour, opacity: f64) {
        let (rows, columns) = self.touched(&rect);
        let overlap = |low: f64, high: f64, at: usize| {
            (high.min(at as f64 + 1.0) - low.max(at as f64)).clamp(0.0, 1.0)
        };
        for row in rows {
            let tall = overlap(rect.top, rect.bottom, row);
            for column in columns.clone() {
                let wide = overlap(rect.left, rect.right, column);
                self.blend(column, row, colour, tall * wide * opacity);
            }
        }
    }

    /// Draws a line through points.
    pub fn stroke(&mut self, points: &[Point], pen: Pen) {
        let pieces = dashes(points, pen.dash_px);
        if let Some(casing) = pen.casing {
            self.stroke_pieces(&pieces, casing, pen.width_px + 3.0);
        }
        self.stroke_pieces(&pieces, pen.colour, pen.width_px);
    }

    /// Draws a circle.
    pub fn circle(&mut self, centre: Point, radius_px: f64, pen: Pen) {
        // Chords stay within a twentieth of a pixel of the arc up to a few thousand pixels.
        let chords = (radius_px.abs().sqrt() * 12.0).clamp(24.0, 1200.0) as usize;
        let points: Vec<Point> = (0..=chords)
            .map(|index| {
                let angle = std::f64::consts::TAU * index as f64 / chords as f64;
                (
                    centre.0 + radius_px * angle.cos(),
                    centre.1 - radius_px * angle.sin(),
                )
            })
            .collect();
        self.stroke(&points, pen);
    }

    /// All pieces in one go, so that joints and crossings are not darkened twice.
    fn stroke_pieces(&mut self, pieces: &[Vec<Point>], colour: Colour, width_px: f64) {
        let half = 0.5 * width_px;
        let segments = || {
            pieces
                .iter()
                .flat_map(|piece| piece.windows(2).map(|pair| (pair[0], pair[1])))
        };
        let around = |(a, b): (Point, Point)| {
            Rect {
                left: a.0.min(b.0),
                top: a.1.min(b.1),
                right: a.0.max(b.0),
                bottom: a.1.max(b.1),
            }
            .grown(half + 1.0)
        };
        let Some(bounds) = segments().map(around).reduce(|one, other| Rect {
            left: one.left.min(other.left),
            top: one.top.min(other.top),
            right: one.right.max(other.right),
            bottom: one.bottom.max(other.bottom),
        }) else {
            return;
        };
        let (all_rows, all_columns) = self.touched(&bounds);
        let stride = all_columns.len();
        let mut covered = vec![0f32; stride * all_rows.len()];
        for (a, b) in segments() {
            let (rows, columns) = self.touched(&around((a, b)));
            for row in rows {
                for column in columns.clone() {
                    let distance =
                        distance_to_segment((column as f64 + 0.5, row as f64 + 0.5), a, b) - half;
                    let share = (0.5 - distance).clamp(0.0, 1.0) as f32;
                    let at = (row - all_rows.start) * stride + column - all_columns.start;
                    covered[at] = covered[at].max(share);
                }
            }
        }
        for (row, line) in all_rows.zip(covered.chunks(stride.max(1))) {
            for (column, share) in all_columns.clone().zip(line) {
                self.blend(column, row, colour, f64::from(*share));
            }
        }
    }

    /// The picture as a PNG file.
    pub fn into_png(self) -> Vec<u8> {
        let mut png = Vec::new();
        let written =
            PngEncoder::new_with_quality(&mut png, CompressionType::Fast, FilterType::Sub)
                .write_image(
                    &self.rgb,
                    self.width as u32,
                    self.height as u32,
                    ExtendedColorType::Rgb8,
                );
        // Writing to memory at a matching size does not fail.
        debug_assert!(written.is_ok());
        png
    }
}

fn distance_to_segment(point: Point, a: Point, b: Point) -> f64 {
    let (along_x, along_y) = (b.0 - a.0, b.1 - a.1);
    let (from_x, from_y) = (point.0 - a.0, point.1 - a.1);
    let length_squared = along_x * along_x + along_y * along_y;
    let share = if length_squared > 0.0 {
        ((from_x * along_x + from_y * along_y) / length_squared).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (from_x - share * along_x).hypot(from_y - share * along_y)
}

/// Cuts a line into its dashes; points that are not finite break it.
fn dashes(points: &[Point], pattern: &[f64]) -> Vec<Vec<Point>> {
    let whole = points
        .split(|point| !(point.0.is_finite() && point.1.is_finite()))
        .filter(|piece| piece.len() > 1);
    if pattern.is_empty() || pattern.iter().any(|length| *length <= 0.0) {
        return whole.map(<[Point]>::to_vec).collect();
    }
    let mut pieces = Vec::new();
    for line in whole {
        let (mut index, mut left, mut current) = (0, pattern[0], vec![line[0]]);
        for pair in line.windows(2) {
            let (mut from, to) = (pair[0], pair[1]);
            let mut length = (to.0 - from.0).hypot(to.1 - from.1);
            while length > left && pieces.len() < 10_000 {
                let share = left / length;
                from = (
                    from.0 + share * (to.0 - from.0),
                    from.1 + share * (to.1 - from.1),
                );
                length -= left;
                if index % 2 == 0 {
                    current.push(from);
                    pieces.push(std::mem::take(&mut current));
                }
                index += 1;
                left = pattern[index % pattern.len()];
                current = vec![from];
            }
            left -= length;
            if index % 2 == 0 {
                current.push(to);
            }
        }
        if index % 2 == 0 && current.len() > 1 {
            pieces.push(current);
        }
    }
    pieces
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dashes_keep_their_lengths_around_corners() {
        let pieces = dashes(&[(0.0, 0.0), (3.0, 0.0), (3.0, 4.0)], &[2.0, 1.0]);
        let lengths: Vec<f64> = pieces
            .iter()
            .map(|piece| {
                piece
                    .windows(2)
                    .map(|pair| (pair[1].0 - pair[0].0).hypot(pair[1].1 - pair[0].1))
                    .sum()
            })
            .collect();
        assert_eq!(lengths.len(), 3);
        assert!(
            lengths
                .iter()
                .zip([2.0, 2.0, 1.0])
                .all(|(length, expected)| (length - expected).abs() < 1e-12)
        );
    }

    #[test]
    fn wild_coordinates_draw_nothing() {
        let mut canvas = Canvas::new(8, 8);
        canvas.stroke(
            &[(f64::NAN, 1.0), (f64::INFINITY, 2.0), (1e300, 1e300)],
            Pen::solid(Colour([0; 3]), 2.0),
        );
        canvas.circle((4.0, 4.0), f64::NAN, Pen::solid(Colour([0; 3]), 2.0));
        canvas.fill_rect(Rect::sized(-1e9, f64::NAN, 1e300, 0.0), Colour([0; 3]), 1.0);
        assert!(canvas.rgb.iter().all(|value| *value == 255));
    }
}
