//! How a figure is spread over the trials: the Strehl ratio, as bars.

use super::canvas::{Canvas, Pen, Rect};
use super::frame::{Frame, GAP_PX, Sample, Side, heading, legend, plate};
use super::style::{
    BAR, BODY, HEIGHT, MARGIN, MEAN, MISSED, NARROW, PAPER, PREDICTED, REQUIREMENT, TEXT,
    TEXT_LIGHT,
};
use super::text::Anchor;
use super::ticks::{Ticks, rounded_up};
use crate::report::units::significant;
use crate::scenario::{Bound, Comparison, Figure};

/// Most bars that a picture shows apart.
const MOST_BINS: usize = 60;

/// Strehl ratios of the trials.
#[derive(Debug, Clone, Copy)]
pub struct HistogramPicture<'a> {
    /// Title of the study.
    pub title: &'a str,
    /// A value for each trial; those that are not finite are left out and counted.
    pub values: &'a [f64],
    /// Their mean, if it is defined.
    pub mean: Option<f64>,
    /// What is required; bounds on other figures are passed over.
    pub bounds: &'a [Bound],
    /// Mean by the closed form.
    pub predicted_mean: Option<f64>,
}

impl HistogramPicture<'_> {
    /// The picture, 1000 × 760 pixels.
    pub fn png(&self) -> Vec<u8> {
        let mut canvas = Canvas::new(NARROW, HEIGHT);
        let bins = Bins::of(self.values);
        let defined: usize = bins.counts.iter().sum();
        let undefined = self.values.len() - defined;
        let trials = match self.values.len() {
            1 => "1 trial".to_string(),
            count => format!("{count} trials"),
        };
        let mut what = format!("Strehl ratio, {trials}");
        if undefined > 0 {
            what += &format!(", undefined in {undefined}");
        }
        heading(&mut canvas, self.title, &what);
        let lines = self.lines(&bins);
        let shown = lines.iter().filter(|line| line.away.is_none());
        let (low, high) = shown.fold((bins.low, bins.high()), |(low, high), line| {
            (low.min(line.value), high.max(line.value))
        });
        let pad = 0.04 * (high - low);
        let most = bins.counts.iter().copied().max().unwrap_or(0);
        let frame = Frame {
            rect: Rect {
                left: MARGIN + 75.0,
                top: 136.0,
                right: NARROW as f64 - MARGIN - 10.0,
                bottom: 622.0,
            },
            across: (low - pad, high + pad),
            up: (0.0, rounded_up(1.05 * most as f64)),
        };
        self.missed(&mut canvas, &frame);
        let across = Ticks::between(frame.across.0, frame.across.1, 7);
        let mut up = Ticks::between(0.0, frame.up.1, 6);
        // Trials are counted in whole numbers.
        up.values
            .retain(|value| (value - value.round()).abs() < 1e-6);
        frame.grid(&mut canvas, &across, &up);
        bins.draw(&mut canvas, &frame);
        for line in lines.iter().filter(|line| line.away.is_none()) {
            let x = frame.x_px(line.value);
            canvas.stroke(&[(x, frame.rect.bottom), (x, frame.rect.top)], line.pen);
        }
        if defined == 0 {
            let ink = (TEXT_LIGHT, PAPER, 0.0);
            let text = "no trial has a Strehl ratio";
            plate(&mut canvas, text, frame.rect.centre(), frame.rect, ink);
        }
        frame.border(&mut canvas);
        frame.axis(&mut canvas, Side::Bottom, &across, TEXT);
        for value in &up.values {
            let below_middle = 0.5 * BODY.capital_px();
            let at = (frame.rect.left - GAP_PX, frame.y_px(*value) + below_middle);
            canvas.text(&format!("{value:.0}"), at, Anchor::Right, BODY, TEXT);
        }
        let above = (frame.rect.left, frame.rect.top - 14.0);
        canvas.text("trials", above, Anchor::Left, BODY, TEXT);
        let below = (frame.rect.centre().0, frame.rect.bottom + 60.0);
        canvas.text("Strehl ratio", below, Anchor::Middle, BODY, TEXT);
        let from = (frame.rect.left, HEIGHT as f64 - 24.0);
        let entries: Vec<(Sample, String)> = lines.into_iter().map(Line::explained).collect();
        legend(&mut canvas, from, frame.rect.width(), &entries);
        canvas.into_png()
    }

    /// A tint on the side of each bound that misses it.
    fn missed(&self, canvas: &mut Canvas, frame: &Frame) {
        for bound in self.strehl_bounds() {
            let x = frame
                .x_px(bound.value)
                .clamp(frame.rect.left, frame.rect.right);
            let side = match bound.comparison {
                Comparison::AtLeast => Rect {
                    right: x,
                    ..frame.rect
                },
                Comparison::AtMost => Rect {
                    left: x,
                    ..frame.rect
                },
            };
            canvas.fill_rect(side, MISSED, 1.0);
        }
    }

    fn strehl_bounds(&self) -> impl Iterator<Item = &Bound> {
        self.bounds
            .iter()
            .filter(|bound| bound.figure == Figure::Strehl && bound.value.is_finite())
    }

    /// The lines across the bars, in the order of the legend.
    fn lines(&self, bins: &Bins) -> Vec<Line> {
        let mean = self.mean.map(|value| (value, MEAN, "mean"));
        let predicted = self
            .predicted_mean
            .map(|value| (value, PREDICTED, "closed form"));
        let bounds = self.strehl_bounds().map(|bound| {
            let name = match bound.comparison {
                Comparison::AtLeast => "required ≥",
                Comparison::AtMost => "required ≤",
            };
            (bound.value, REQUIREMENT, name)
        });
        // A line far from every trial would squeeze the bars into one.
        let reach = 3.0 * (bins.high() - bins.low);
        mean.into_iter()
            .chain(predicted)
            .chain(bounds)
            .filter(|(value, _, _)| value.is_finite())
            .map(|(value, pen, name)| Line {
                value,
                pen,
                name,
                away: if value < bins.low - reach {
                    Some("far left")
                } else if value > bins.high() + reach {
                    Some("far right")
                } else {
                    None
                },
            })
            .collect()
    }
}

/// A value marked by a line.
#[derive(Debug, Clone, Copy)]
struct Line {
    value: f64,
    pen: Pen,
    name: &'static str,
    /// Where it lies, when it is too far away to be drawn.
    away: Option<&'static str>,
}

impl Line {
    /// Its entry in the legend.
    fn explained(self) -> (Sample, String) {
        let text = format!("{} {}", self.name, significant(self.value, 3));
        match self.away {
            Some(place) => (Sample::None, format!("{text} ({place})")),
            None => (Sample::Line(self.pen), text),
        }
    }
}

/// Counts of values in equal intervals.
#[derive(Debug, Clone, PartialEq)]
struct Bins {
    low: f64,
    width: f64,
    counts: Vec<usize>,
}

impl Bins {
    /// Width after Freedman and Diaconis (1981), 2·IQR/∛n, within limits.
    fn of(values: &[f64]) -> Bins {
        let mut sorted: Vec<f64> = values
            .iter()
            .copied()
            .filter(|value| value.is_finite())
            .collect();
        sorted.sort_by(f64::total_cmp);
        let (Some(&first), Some(&last)) = (sorted.first(), sorted.last()) else {
            return Bins {
                low: 0.0,
                width: 1.0,
                counts: vec![0],
            };
        };
        let spread = last - first;
        // Values that agree to rounding, or a single one: one bar with some air about it.
        let alike = spread <= 1e-9 * last.abs().max(first.abs());
        if alike || !spread.is_finite() {
            let width = 0.02 * last.abs().clamp(1e-3, 1e300);
            return Bins {
                low: last - 2.5 * width,
                width,
                counts: vec![0, 0, sorted.len(), 0, 0],
            };
        }
        let quantile = |share: f64| sorted[((sorted.len() - 1) as f64 * share).round() as usize];
        let cube_root = (sorted.len() as f64).cbrt();
        let rule = 2.0 * (quantile(0.75) - quantile(0.25)) / cube_root;
        // Never fewer than Sturges' count, which outliers cannot spoil.
        let least = ((sorted.len() as f64).log2().ceil() + 1.0).min(12.0) as usize;
        let count = ((spread / rule.max(spread * 1e-6)).ceil() as usize).clamp(least, MOST_BINS);
        let width = spread / count as f64;
        let mut counts = vec![0; count];
        for value in &sorted {
            let bin = ((value - first) / width) as usize;
            counts[bin.min(count - 1)] += 1;
        }
        Bins {
            low: first,
            width,
            counts,
        }
    }

    fn draw(&self, canvas: &mut Canvas, frame: &Frame) {
        for (index, count) in self.counts.iter().enumerate() {
            let left = frame.x_px(self.low + index as f64 * self.width);
            let right = frame.x_px(self.low + (index + 1) as f64 * self.width);
            // A hairline parts bars that are wide enough to spare it.
            let gap = if right - left > 6.0 { 1.0 } else { 0.0 };
            let bar = Rect {
                left: left.round() + gap,
                right: right.round().max(left.round() + gap + 1.0),
                top: frame.y_px(*count as f64),
                bottom: frame.rect.bottom,
            };
            canvas.fill_rect(bar, BAR, 1.0);
        }
    }

    fn high(&self) -> f64 {
        self.low + self.width * self.counts.len() as f64
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_finite_value_falls_in_a_bin() {
        let cases: [&[f64]; 7] = [
            &[0.5],
            &[0.5; 40],
            &[0.0, 0.0],
            &[0.1, 0.1, 0.1, 0.1, 0.9],
            &[0.1, 0.2, f64::NAN, f64::INFINITY],
            &[-1e308, 1e308],
            &[1.0, 1.0 + 1e-15],
        ];
        for values in cases {
            let finite = values.iter().filter(|value| value.is_finite()).count();
            let bins = Bins::of(values);
            assert_eq!(bins.counts.iter().sum::<usize>(), finite);
            assert!(bins.width > 0.0 && bins.counts.len() <= MOST_BINS);
        }
        assert_eq!(Bins::of(&[]).counts, [0]);
    }

    #[test]
    fn many_values_get_more_bins() {
        let values: Vec<f64> = (0..2000).map(|index| f64::from(index).sqrt()).collect();
        let (few, many) = (Bins::of(&values[..50]), Bins::of(&values));
        assert!(many.counts.len() > few.counts.len());
    }
}
