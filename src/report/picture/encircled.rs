//! Encircled power against radius, with the spread over trials.

use super::canvas::{Canvas, Pen, Point, Rect};
use super::frame::{Frame, GAP_PX, Sample, Side, heading, legend, plate};
use super::style::{
    BAND, BODY, BUCKET, Colour, EMPHASIS, ENCIRCLED_80, HEIGHT, IDEAL, MARGIN, MEAN, NARROW, PAPER,
    TEXT,
};
use super::text::Anchor;
use super::ticks::Ticks;
use crate::quantity::Kind;
use crate::report::units::{readable, significant, unit_for};

/// Share of the radiated power within a circle about the aim point.
#[derive(Debug, Clone, Copy)]
pub struct EncircledPicture<'a> {
    /// Title of the study.
    pub title: &'a str,
    /// What is shown, e.g. `encircled power, 200 trials`.
    pub what: &'a str,
    /// Radii, ascending.
    pub radius_m: &'a [f64],
    /// Fraction within each radius without errors; NaN leaves a gap, here and below.
    pub ideal: &'a [f64],
    /// Fraction of the long exposure.
    pub long_exposure: &'a [f64],
    /// 5 % of the trials lie below.
    pub p05: &'a [f64],
    /// 95 % of the trials lie below.
    pub p95: &'a [f64],
    /// Radius of the bucket.
    pub bucket_radius_m: Option<f64>,
    /// Radius that holds 80 % of the long exposure.
    pub encircled_80_radius_m: Option<f64>,
}

impl EncircledPicture<'_> {
    /// The picture, 1000 × 760 pixels.
    pub fn png(&self) -> Vec<u8> {
        let mut canvas = Canvas::new(NARROW, HEIGHT);
        heading(&mut canvas, self.title, self.what);
        let widest_m = self
            .radius_m
            .iter()
            .copied()
            .filter(|radius_m| radius_m.is_finite())
            .fold(0.0, f64::max);
        let widest_m = if widest_m > 0.0 { widest_m } else { 1.0 };
        let unit = unit_for(widest_m, Kind::Length);
        let frame = Frame {
            rect: Rect {
                left: MARGIN + 75.0,
                top: 112.0,
                right: NARROW as f64 - MARGIN - 10.0,
                bottom: 622.0,
            },
            across: (0.0, widest_m / unit.factor),
            up: (0.0, 100.0),
        };
        let across = Ticks::between(0.0, frame.across.1, 8);
        let up = Ticks::between(0.0, 100.0, 6);

        self.band(&mut canvas, &frame, unit.factor);
        frame.grid(&mut canvas, &across, &up);
        let marked = self.marks(&mut canvas, &frame, unit.factor);
        canvas.clipped(frame.rect.grown(1.0), |canvas| {
            canvas.stroke(&self.curve(&frame, unit.factor, self.long_exposure), MEAN);
            canvas.stroke(&self.curve(&frame, unit.factor, self.ideal), IDEAL);
        });
        frame.border(&mut canvas);
        frame.axis(&mut canvas, Side::Bottom, &across, TEXT);
        self.percent_axis(&mut canvas, &frame, &up);
        let below = (frame.rect.centre().0, frame.rect.bottom + 60.0);
        let name = unit.label("radius about the aim point");
        canvas.text(&name, below, Anchor::Middle, BODY, TEXT);
        self.labels(&mut canvas, &frame, &marked);

        let mut entries = vec![
            (Sample::Line(IDEAL), "without errors".to_string()),
            (Sample::Line(MEAN), "long exposure".to_string()),
        ];
        if self.p05.iter().any(|share| share.is_finite()) {
            entries.push((Sample::Area(BAND), "5 to 95 % of the trials".to_string()));
        }
        let from = (frame.rect.left, HEIGHT as f64 - 24.0);
        legend(&mut canvas, from, frame.rect.width(), &entries);
        canvas.into_png()
    }

    fn curve(&self, frame: &Frame, factor: f64, fractions: &[f64]) -> Vec<Point> {
        self.radius_m
            .iter()
            .zip(fractions)
            .map(|(radius_m, fraction)| frame.at(radius_m / factor, 100.0 * fraction))
            .collect()
    }

    /// The band column by column: one shade, however steep it is.
    fn band(&self, canvas: &mut Canvas, frame: &Frame, factor: f64) {
        let low = self.curve(frame, factor, self.p05);
        let high = self.curve(frame, factor, self.p95);
        canvas.clipped(frame.rect, |canvas| {
            for column in frame.rect.left as usize..frame.rect.right as usize {
                let x = column as f64 + 0.5;
                let (Some(bottom), Some(top)) = (height_at(&low, x), height_at(&high, x)) else {
                    continue;
                };
                // At least a hairline, where trials agree.
                let spare = (0.5 * (1.0 - (bottom - top))).max(0.0);
                let rect = Rect {
                    left: x - 0.5,
                    right: x + 0.5,
                    top: top - spare,
                    bottom: bottom + spare,
                };
                canvas.fill_rect(rect, BAND, 1.0);
            }
        });
    }

    /// Lines at the marked radii; returns where their labels belong and what they say.
    fn marks(&self, canvas: &mut Canvas, frame: &Frame, factor: f64) -> Vec<(f64, Colour, String)> {
        let mut labels = Vec::new();
        if let Some(radius_m) = self.bucket_radius_m {
            let size = readable(radius_m, Kind::Length, 3);
            let text = match self.long_exposure_at(radius_m) {
                Some(fraction) => {
                    let percent = significant(100.0 * fraction, 3);
                    format!("bucket, radius {size}: {percent} %")
                }
                None => format!("bucket, radius {size}"),
            };
            labels.push((radius_m, BUCKET, text));
        }
        if let Some(radius_m) = self.encircled_80_radius_m {
            let size = readable(radius_m, Kind::Length, 3);
            labels.push((radius_m, ENCIRCLED_80, format!("80 % within radius {size}")));
        }
        labels.retain(|(radius_m, _, _)| {
            let x = radius_m / factor;
            (0.0..=frame.across.1).contains(&x)
        });
        labels
            .into_iter()
            .map(|(radius_m, pen, text)| {
                let x = frame.x_px(radius_m / factor);
                canvas.stroke(&[(x, frame.rect.bottom), (x, frame.rect.top)], pen);
                if let Some(fraction) = self.long_exposure_at(radius_m) {
                    let at = frame.at(radius_m / factor, 100.0 * fraction);
                    canvas.circle(at, 4.0, Pen::solid(pen.colour, 8.0));
                }
                (x, pen.colour, text)
            })
            .collect()
    }

    /// Labels low in the plot, where curves that rise early leave room, one above the other.
    fn labels(&self, canvas: &mut Canvas, frame: &Frame, marked: &[(f64, Colour, String)]) {
        for (index, (x, colour, text)) in marked.iter().enumerate() {
            let half = 0.5 * EMPHASIS.width_px(text) + 7.0;
            let right_of = x + half + 4.0;
            let middle = if right_of + half < frame.rect.right {
                right_of
            } else {
                x - half - 4.0
            };
            let at = (middle, frame.rect.bottom - 30.0 - 38.0 * index as f64);
            plate(
                canvas,
                text,
                at,
                frame.rect.grown(-4.0),
                (*colour, PAPER, 0.85),
            );
        }
    }

    fn long_exposure_at(&self, radius_m: f64) -> Option<f64> {
        let radii = self.radius_m.iter().copied();
        let points: Vec<Point> = radii.zip(self.long_exposure.iter().copied()).collect();
        height_at(&points, radius_m)
    }

    /// Percent signs on the numbers themselves.
    fn percent_axis(&self, canvas: &mut Canvas, frame: &Frame, ticks: &Ticks) {
        for value in &ticks.values {
            let at = (
                frame.rect.left - GAP_PX,
                frame.y_px(*value) + 0.5 * BODY.capital_px(),
            );
            let text = format!("{} %", ticks.label(*value));
            canvas.text(&text, at, Anchor::Right, BODY, TEXT);
        }
    }
}

/// Height of a line through points ascending in x; none in a gap and beyond its ends.
fn height_at(points: &[Point], x: f64) -> Option<f64> {
    let next = points.partition_point(|point| point.0 < x).max(1);
    let (from, to) = (points.get(next - 1)?, points.get(next)?);
    let run = to.0 - from.0;
    let share = if run > 0.0 { (x - from.0) / run } else { 0.0 };
    let height = from.1 + share * (to.1 - from.1);
    (height.is_finite() && (0.0..=1.0).contains(&share)).then_some(height)
}
