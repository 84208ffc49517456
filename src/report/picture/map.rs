//! The irradiance on the target: the whole window in decibels, the core on a linear scale.

use super::canvas::{Canvas, Pen, Rect};
use super::frame::{Frame, PLATE_HEIGHT_PX, Sample, Side, colour_bar, heading, legend, plate};
use super::resample::Samples;
use super::style::{
    BODY, BUCKET_ON_MAP, CASING, Colour, EMPHASIS, ENCIRCLED_80_ON_MAP, HEIGHT, MARGIN, ON_DARK,
    TEXT, TEXT_LIGHT, WIDE, irradiance,
};
use super::text::Anchor;
use super::ticks::Ticks;
use crate::farfield::map::Map;
use crate::quantity::Kind;
use crate::report::units::{readable, unit_for};

/// Range of the logarithmic scale.
const RANGE_DB: f64 = 40.0;
/// Half width of the core, in spots λ·range/D.
const CORE_SPOTS: f64 = 4.0;

/// A smaller circle would be a blot.
const SMALLEST_CIRCLE_PX: f64 = 5.0;
/// Least distance of a circle's name from the aim point.
const LEAST_AWAY_PX: f64 = 70.0;

const SIDE: usize = 472;
const TOP: f64 = 166.0;
/// Left edge of the panels.
const LEFT: [f64; 2] = [MARGIN + 75.0, MARGIN + 815.0];

/// One irradiance map.
#[derive(Debug, Clone, Copy)]
pub struct MapPicture<'a> {
    /// Title of the study.
    pub title: &'a str,
    /// What the map shows, e.g. `long exposure, mean of 200 trials`.
    pub what: &'a str,
    /// The map.
    pub map: &'a Map,
    /// Its highest irradiance, interpolated between pixels; `None` takes the brightest pixel.
    pub peak_irradiance_w_m2: Option<f64>,
    /// Distance of the target, for angles.
    pub range_m: f64,
    /// Diameter of the bucket, if there is one.
    pub bucket_diameter_m: Option<f64>,
    /// Diameter of the circle that holds 80 % of the power; `None` when it lies beyond the window.
    pub encircled_80_diameter_m: Option<f64>,
    /// Diffraction spot λ·range/D.
    pub spot_m: f64,
}

impl MapPicture<'_> {
    /// The picture, 1500 × 760 pixels.
    pub fn png(&self) -> Vec<u8> {
        let mut canvas = Canvas::new(WIDE, HEIGHT);
        heading(&mut canvas, self.title, self.what);
        let peak = self.peak_w_m2();
        let window_m = positive(self.map.grid.width_m() / 2.0).unwrap_or(1.0);
        let core_m = self.core_half_width_m(window_m);
        let decibels = |value: f64| {
            let below = 10.0 * (value / peak.unwrap_or(1.0)).log10();
            irradiance(1.0 + below / RANGE_DB)
        };
        let linear = |value: f64| irradiance(value / peak.unwrap_or(1.0));
        let wide = self.panel(&mut canvas, LEFT[0], window_m, "Whole window", &decibels);
        let core = self.panel(&mut canvas, LEFT[1], core_m, "Core, linear scale", &linear);
        if peak.is_none() {
            for frame in [&wide, &core] {
                let ink = (ON_DARK, CASING, 0.0);
                plate(
                    &mut canvas,
                    "no light",
                    frame.rect.centre(),
                    frame.rect,
                    ink,
                );
            }
        }
        self.bars(&mut canvas, peak);
        self.circles(&mut canvas, &wide, &core);
        canvas.into_png()
    }

    /// The peak, or `None` for a map without light.
    fn peak_w_m2(&self) -> Option<f64> {
        let brightest = self
            .map
            .irradiance_w_m2
            .iter()
            .copied()
            .filter(|value| value.is_finite())
            .fold(0.0, f64::max);
        let brightest = positive(brightest)?;
        Some(
            self.peak_irradiance_w_m2
                .and_then(positive)
                .unwrap_or(brightest),
        )
    }

    /// A few spots, or what it takes to show the circles with a margin; not beyond the window.
    fn core_half_width_m(&self, window_m: f64) -> f64 {
        let spots_m = positive(CORE_SPOTS * self.spot_m).unwrap_or(window_m);
        [self.bucket_diameter_m, self.encircled_80_diameter_m]
            .into_iter()
            .flatten()
            .filter_map(positive)
            .map(|diameter_m| 0.5 * diameter_m)
            .filter(|radius_m| *radius_m <= window_m)
            .fold(spots_m, |half_m, radius_m| half_m.max(1.2 * radius_m))
            .min(window_m)
    }

    /// One panel with its axes; the frame counts in metres.
    fn panel(
        &self,
        canvas: &mut Canvas,
        left: f64,
        half_width_m: f64,
        caption: &str,
        colour_of: &dyn Fn(f64) -> Colour,
    ) -> Frame {
        let rect = Rect::sized(left, TOP, SIDE as f64, SIDE as f64);
        let samples = Samples::of(self.map, half_width_m, SIDE);
        canvas.paint(rect, |column, row| {
            colour_of(samples.at(SIDE - 1 - row.min(SIDE - 1), column))
        });
        let frame = Frame::about_zero(rect, half_width_m);
        frame.border(canvas);

        let metres = unit_for(half_width_m, Kind::Length);
        let shown = half_width_m / metres.factor;
        let at_target = Frame::about_zero(rect, shown);
        let ticks = Ticks::between(-shown, shown, 5);
        at_target.axis(canvas, Side::Left, &ticks, TEXT);
        at_target.axis(canvas, Side::Bottom, &ticks, TEXT);
        let name = metres.label("u and v at the target");
        let below = rect.bottom + 58.0;
        canvas.text(&name, (rect.centre().0, below), Anchor::Middle, BODY, TEXT);

        let mut room_px = rect.width();
        if let Some(half_width_rad) = positive(half_width_m / self.range_m) {
            let radians = unit_for(half_width_rad, Kind::Angle);
            let shown = half_width_rad / radians.factor;
            let seen = Frame::about_zero(rect, shown);
            let ticks = Ticks::between(-shown, shown, 5);
            seen.axis(canvas, Side::Top, &ticks, TEXT_LIGHT);
            seen.axis(canvas, Side::Right, &ticks, TEXT_LIGHT);
            let name = radians.label("angle");
            let at = (rect.right + 40.0, TOP - 45.0);
            canvas.text(&name, at, Anchor::Right, BODY, TEXT_LIGHT);
            room_px -= BODY.width_px(&name) - 20.0;
        }
        let caption = EMPHASIS.shortened(caption, room_px);
        canvas.text(&caption, (left, TOP - 45.0), Anchor::Left, EMPHASIS, TEXT);
        frame
    }

    fn bars(&self, canvas: &mut Canvas, peak: Option<f64>) {
        let bar = |canvas: &mut Canvas, panel: usize, low: f64, high: f64, unit: &str| {
            let left = LEFT[panel] + SIDE as f64 + 92.0;
            let frame = Frame {
                rect: Rect::sized(left, TOP, 20.0, SIDE as f64),
                across: (0.0, 1.0),
                up: (low, high),
            };
            colour_bar(canvas, &frame, irradiance);
            frame.axis(canvas, Side::Right, &Ticks::between(low, high, 9), TEXT);
            let above = (left + 26.0, TOP - 12.0);
            canvas.text(unit, above, Anchor::Middle, BODY, TEXT);
        };
        bar(canvas, 0, -RANGE_DB, 0.0, "dB");
        match peak {
            Some(peak) => {
                let unit = unit_for(peak, Kind::Irradiance);
                bar(canvas, 1, 0.0, peak / unit.factor, unit.symbol);
                let text = format!("0 dB = {}", readable(peak, Kind::Irradiance, 3));
                let at = (LEFT[0] + SIDE as f64 + 170.0, TOP + SIDE as f64 + 58.0);
                canvas.text(&text, at, Anchor::Right, BODY, TEXT);
            }
            None => bar(canvas, 1, 0.0, 0.0, "W/m²"),
        }
    }

    /// The circles in both panels, named in the core and explained below.
    fn circles(&self, canvas: &mut Canvas, wide: &Frame, core: &Frame) {
        let window_m = wide.across.1;
        let mut entries = Vec::new();
        let bucket = self.bucket_diameter_m.and_then(positive);
        let encircled = self.encircled_80_diameter_m.and_then(positive);
        // One name stands above its circle and the other below: they cannot meet.
        let circles = [
            (bucket, BUCKET_ON_MAP, "bucket", "bucket", -1.0),
            (
                encircled,
                ENCIRCLED_80_ON_MAP,
                "80 %",
                "80 % of the power",
                1.0,
            ),
        ];
        for (diameter_m, pen, name, meaning, downwards) in circles {
            let Some(diameter_m) = diameter_m else {
                continue;
            };
            let size = readable(diameter_m, Kind::Length, 3);
            if 0.5 * diameter_m > window_m {
                let note = format!("{meaning}: {size} across, beyond the window");
                entries.push((Sample::None, note));
                continue;
            }
            entries.push((Sample::Line(pen), format!("{meaning}: {size} across")));
            let radius_px =
                |frame: &Frame| 0.5 * diameter_m / frame.across.1 * 0.5 * frame.rect.width();
            for frame in [wide, core] {
                let (centre, radius_px) = (frame.rect.centre(), radius_px(frame));
                if radius_px > SMALLEST_CIRCLE_PX {
                    canvas.clipped(frame.rect, |canvas| canvas.circle(centre, radius_px, pen));
                }
            }
            // The name of a small circle keeps off the light that it marks.
            let radius_px = radius_px(core);
            let away_px = radius_px.max(LEAST_AWAY_PX) + 5.0;
            let (x, y) = core.rect.centre();
            if radius_px + 10.0 < LEAST_AWAY_PX {
                let line = [(x, y + downwards * radius_px), (x, y + downwards * away_px)];
                canvas.stroke(
                    &line,
                    Pen {
                        dash_px: &[],
                        width_px: 1.5,
                        ..pen
                    },
                );
            }
            let at = (x, y + downwards * (away_px + 0.5 * PLATE_HEIGHT_PX));
            plate(
                canvas,
                name,
                at,
                core.rect.grown(-6.0),
                (pen.colour, CASING, 0.7),
            );
        }
        if encircled.is_none() {
            let note = "80 % of the power: circle lies beyond the window";
            entries.push((Sample::None, note.to_string()));
        }
        let from = (LEFT[0], HEIGHT as f64 - 24.0);
        legend(canvas, from, WIDE as f64 - MARGIN - LEFT[0], &entries);
    }
}

fn positive(value: f64) -> Option<f64> {
    (value.is_finite() && value > 0.0).then_some(value)
}
