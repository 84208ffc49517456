//! The look that all pictures share: sizes, colours with a fixed meaning, colour maps.

use super::canvas::Pen;
use super::text::Font;

/// An sRGB colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Colour(pub [u8; 3]);

/// Height of every picture in pixels.
pub(super) const HEIGHT: usize = 760;
/// Width of a picture of two panels.
pub(super) const WIDE: usize = 1500;
/// Width of a picture of one panel.
pub(super) const NARROW: usize = 1000;
/// Space at the left and right edge of every picture.
pub(super) const MARGIN: f64 = 30.0;

pub(super) const TITLE: Font = Font {
    em_px: 26.0,
    bold: true,
};
pub(super) const SUBTITLE: Font = Font {
    em_px: 22.0,
    bold: false,
};
pub(super) const BODY: Font = Font {
    em_px: 20.0,
    bold: false,
};
pub(super) const EMPHASIS: Font = Font {
    em_px: 20.0,
    bold: true,
};

pub(super) const PAPER: Colour = Colour([255, 255, 255]);
pub(super) const TEXT: Colour = Colour([48, 48, 52]);
pub(super) const TEXT_LIGHT: Colour = Colour([112, 112, 118]);
pub(super) const AXIS: Colour = Colour([96, 96, 102]);
pub(super) const GRID: Colour = Colour([228, 228, 231]);

/// Written and drawn over dark pictures.
pub(super) const ON_DARK: Colour = Colour([255, 255, 255]);
/// Beneath whatever is drawn over a picture.
pub(super) const CASING: Colour = Colour([12, 12, 20]);

/// 5 to 95 % of the trials.
pub(super) const BAND: Colour = Colour([190, 215, 233]);
/// Bars that count trials.
pub(super) const BAR: Colour = Colour([150, 190, 219]);
/// Side of a requirement that misses it.
pub(super) const MISSED: Colour = Colour([252, 238, 230]);
/// An element that radiates nothing.
pub(super) const DARK: Colour = Colour([20, 20, 20]);
/// An element that radiates at a random phase.
pub(super) const UNLOCKED: Colour = Colour([0, 140, 62]);

/// The array without errors.
pub(super) const IDEAL: Pen = Pen {
    colour: Colour([48, 48, 52]),
    width_px: 2.5,
    dash_px: &[14.0, 7.0],
    casing: None,
};
/// The mean over trials, or the long exposure.
pub(super) const MEAN: Pen = Pen {
    colour: Colour([0, 94, 162]),
    width_px: 3.5,
    dash_px: &[],
    casing: None,
};
/// The closed form.
pub(super) const PREDICTED: Pen = Pen {
    colour: Colour([140, 60, 130]),
    width_px: 3.0,
    dash_px: &[12.0, 6.0, 3.0, 6.0],
    casing: None,
};
/// A bound that is required.
pub(super) const REQUIREMENT: Pen = Pen {
    colour: Colour([200, 78, 0]),
    width_px: 3.5,
    dash_px: &[],
    casing: None,
};
/// The bucket, on paper.
pub(super) const BUCKET: Pen = Pen {
    colour: Colour([0, 128, 150]),
    width_px: 3.0,
    dash_px: &[18.0, 8.0],
    casing: None,
};
/// The bucket, over a map.
pub(super) const BUCKET_ON_MAP: Pen = Pen {
    colour: Colour([90, 225, 255]),
    width_px: 2.5,
    dash_px: &[18.0, 8.0],
    casing: Some(CASING),
};
/// The circle that holds 80 % of the power, on paper.
pub(super) const ENCIRCLED_80: Pen = Pen {
    colour: Colour([46, 125, 50]),
    width_px: 3.0,
    dash_px: &[3.0, 7.0],
    casing: None,
};
/// The circle that holds 80 % of the power, over a map.
pub(super) const ENCIRCLED_80_ON_MAP: Pen = Pen {
    colour: Colour([150, 255, 150]),
    width_px: 2.5,
    dash_px: &[3.0, 7.0],
    casing: Some(CASING),
};
/// The envelope of the array.
pub(super) const ENVELOPE: Pen = Pen {
    colour: Colour([150, 150, 156]),
    width_px: 1.5,
    dash_px: &[],
    casing: None,
};

/// Irradiance from none (0) to the peak (1).
///
/// Black is no light, lightness grows evenly with the value, and the hot end is
/// a light yellow: it reads as a beam, in grey and without red or green too.
pub(super) fn irradiance(share: f64) -> Colour {
    let share = if share.is_nan() { 0.0 } else { share };
    let colour = colorous::INFERNO.eval_continuous(share.clamp(0.0, 1.0));
    Colour([colour.r, colour.g, colour.b])
}

/// Phase in half turns, from −1 to 1; the ends meet.
///
/// Lightness falls evenly from a pale grey at zero to a dark one at ±π, so that
/// the size of the phase reads in grey; the hue, orange above and blue below
/// zero, tells its sign to colour-blind readers too.
pub(super) fn phase(half_turns: f64) -> Colour {
    let size = half_turns.abs().min(1.0);
    let lightness = 0.91 - 0.61 * size;
    let chroma = 0.155 * (std::f64::consts::PI * size).sin().max(0.0).powf(0.8);
    let hue: f64 = if half_turns > 0.0 { 52.0 } else { 255.0 };
    let hue = hue.to_radians();
    from_oklab(lightness, chroma * hue.cos(), chroma * hue.sin())
}

/// OKLab (B. Ottosson, 2020) to sRGB, clipped to the gamut.
fn from_oklab(lightness: f64, a: f64, b: f64) -> Colour {
    let long = (lightness + 0.396_337_777_4 * a + 0.215_803_757_3 * b).powi(3);
    let medium = (lightness - 0.105_561_345_8 * a - 0.063_854_172_8 * b).powi(3);
    let short = (lightness - 0.089_484_177_5 * a - 1.291_485_548_0 * b).powi(3);
    let linear = [
        4.076_741_662_1 * long - 3.307_711_591_3 * medium + 0.230_969_929_2 * short,
        -1.268_438_004_6 * long + 2.609_757_401_1 * medium - 0.341_319_396_5 * short,
        -0.004_196_086_3 * long - 0.703_418_614_7 * medium + 1.707_614_701_0 * short,
    ];
    Colour(linear.map(|value| {
        let value = value.clamp(0.0, 1.0);
        let encoded = if value <= 0.003_130_8 {
            12.92 * value
        } else {
            1.055 * value.powf(1.0 / 2.4) - 0.055
        };
        (255.0 * encoded).round() as u8
    }))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Lightness as a grey print shows it.
    fn grey(Colour([red, green, blue]): Colour) -> f64 {
        0.299 * f64::from(red) + 0.587 * f64::from(green) + 0.114 * f64::from(blue)
    }

    #[test]
    fn colour_maps_are_monotone_in_grey() {
        for step in 0..20 {
            let (low, high) = (f64::from(step) / 20.0, f64::from(step + 1) / 20.0);
            assert!(grey(irradiance(high)) > grey(irradiance(low)));
            assert!(grey(phase(high)) < grey(phase(low)));
            assert!(grey(phase(-high)) < grey(phase(-low)));
        }
    }

    #[test]
    fn the_ends_of_the_phase_map_meet() {
        assert_eq!(phase(1.0), phase(-1.0));
        assert_ne!(phase(0.5), phase(-0.5));
    }
}
