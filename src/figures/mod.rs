//! One irradiance map → figures of merit.
//!
//! Each figure is defined once, by its key:
//!
//! | figure | definition |
//! | --- | --- |
//! | `strehl` | irradiance at the aim point over that of the array without errors |
//! | `strehl_peak` | highest irradiance of the map over the highest without errors |
//! | `aim_irradiance`, `peak_irradiance` | at the aim point; highest in the map, between pixels |
//! | `offset` | distance of the peak from the aim point |
//! | `radiated_power` | power P of the lit elements |
//! | `bucket_power`, `bucket_fraction` | power inside the bucket; that over P |
//! | `encircled_50/80/86_diameter` | circle about the aim point that holds 50 %, 80 %, 1 − e⁻² of P |
//! | `fwhm`, `fwhm_x`, `fwhm_y` | full width at half of the peak: by area, along u, along v |
//! | `second_moment_x/y` | 4σ widths after ISO 11146-1 |
//! | `side_lobe_ratio` | second-highest local maximum over the highest |
//! | `combining_efficiency` | aim irradiance over that without errors scaled to P |
//! | `beam_quality` | √(bucket fraction of a filled circle of diameter D over this one's) |
//! | `window_fraction` | share of P inside the map |

mod encircled;
mod interpolate;
pub mod lobes;
pub mod spot;

use crate::array::Array;
use crate::farfield::{Grid, Map};
use crate::scenario::Figure;
use encircled::{Encircled, Spectrum};
use interpolate::Interpolant;
use std::f64::consts::PI;

/// Values of every figure; `None` where it is undefined.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Figures {
    values: [Option<f64>; Figure::ALL.len()],
}

impl Figures {
    /// The value of a figure.
    pub fn get(&self, figure: Figure) -> Option<f64> {
        self.values[figure as usize]
    }

    fn set(&mut self, figure: Figure, value: Option<f64>) {
        self.values[figure as usize] = value.filter(|value| value.is_finite());
    }
}

/// What the figures of the array without errors are compared with.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reference {
    /// Irradiance at the aim point; `None` when too faint to compare with.
    pub aim_w_m2: Option<f64>,
    /// Highest irradiance.
    pub peak_w_m2: f64,
    /// Power with every element lit.
    pub power_w: f64,
}

/// Figures and encircled powers of one map.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// The figures.
    pub figures: Figures,
    /// Share of P within each of [`Reader::radius_m`].
    pub encircled: Vec<f64>,
}

/// Reads figures from maps of one grid.
#[derive(Debug)]
pub struct Reader {
    grid: Grid,
    interpolant: Interpolant,
    encircled: Encircled,
    bucket_radius_m: Option<f64>,
    filled_bucket_fraction: Option<f64>,
    reference: Option<Reference>,
}

/// Memory for reading, reused from map to map.
#[derive(Debug)]
pub struct Workspace {
    spectrum: Spectrum,
}

/// The faintest aim irradiance without errors, over P·(emitting area)/(λ·range)², that Strehl ratios refer to.
const FAINTEST_AIM: f64 = 1e-9;

impl Reader {
    /// Prepare for maps of `grid`; without a reference yet, Strehl ratios are undefined.
    pub fn new(array: &Array, grid: Grid, bucket_diameter_m: Option<f64>) -> Reader {
        let samples_per_spot = array.spot_m() / grid.pixel_m;
        let bucket_radius_m = bucket_diameter_m.map(|diameter| diameter / 2.0);
        Reader {
            grid,
            interpolant: Interpolant::new(samples_per_spot),
            encircled: Encircled::new(grid.pixels, grid.pixel_m, samples_per_spot),
            bucket_radius_m,
            filled_bucket_fraction: bucket_radius_m
                .map(|radius| filled_circle_fraction(PI * radius / array.spot_m())),
            reference: None,
        }
    }

    /// Radii of every encircled-power curve, from 0 to half the window.
    pub fn radius_m(&self) -> &[f64] {
        &self.encircled.radius_m
    }

    /// Memory for [`Reader::read`].
    pub fn workspace(&self) -> Workspace {
        Workspace {
            spectrum: self.encircled.spectrum(),
        }
    }

    /// Take the map of the array without errors as the reference, and read it.
    pub fn set_reference(&mut self, array: &Array, ideal: &Map) -> Reading {
        let power_w = array.power_w();
        let faintest = FAINTEST_AIM * power_w * array.emitting_area_m2()
            / (array.wavelength_m * array.range_m).powi(2);
        let aim_w_m2 = ideal.aim_w_m2();
        self.reference = Some(Reference {
            aim_w_m2: (aim_w_m2 >= faintest).then_some(aim_w_m2),
            peak_w_m2: self.peaks(ideal).0.irradiance_w_m2,
            power_w,
        });
        self.read(ideal, power_w, &mut self.workspace())
    }

    /// The reference, once set.
    pub fn reference(&self) -> Option<Reference> {
        self.reference
    }

    /// The highest point of a map, and the second-highest local maximum.
    fn peaks(&self, map: &Map) -> (spot::Peak, Option<spot::Peak>) {
        let peaks = spot::highest_peaks(map, &self.interpolant);
        let pixels = self.grid.pixels;
        let (place, highest) =
            map.irradiance_w_m2
                .iter()
                .enumerate()
                .fold((0, f64::MIN), |best, (place, &value)| {
                    if value > best.1 { (place, value) } else { best }
                });
        let on_border = spot::Peak {
            x: (place % pixels) as f64,
            y: (place / pixels) as f64,
            irradiance_w_m2: highest,
        };
        match peaks.first() {
            Some(first) if first.irradiance_w_m2 >= highest => (*first, peaks.get(1).copied()),
            // The highest pixel lies on the map's border, where nothing can be interpolated.
            other => (on_border, other.copied()),
        }
    }

    /// Read the figures of a map that carries `power_w` in all.
    pub fn read(&self, map: &Map, power_w: f64, workspace: &mut Workspace) -> Reading {
        let mut figures = Figures::default();
        figures.set(Figure::RadiatedPower, Some(power_w));
        let aim = map.aim_w_m2();
        let (peak, second) = self.peaks(map);
        figures.set(Figure::AimIrradiance, Some(aim));
        figures.set(Figure::PeakIrradiance, Some(peak.irradiance_w_m2));
        if let Some(reference) = self.reference {
            figures.set(Figure::Strehl, reference.aim_w_m2.map(|full| aim / full));
            figures.set(
                Figure::StrehlPeak,
                reference
                    .aim_w_m2
                    .map(|_| peak.irradiance_w_m2 / reference.peak_w_m2),
            );
            let share = power_w / reference.power_w;
            figures.set(
                Figure::CombiningEfficiency,
                reference.aim_w_m2.map(|full| aim / (full * share)),
            );
        }
        if peak.irradiance_w_m2 > 0.0 {
            self.read_spot(map, peak, second, &mut figures);
        }
        let encircled = self.read_power(map, power_w, workspace, &mut figures);
        Reading { figures, encircled }
    }

    fn read_spot(
        &self,
        map: &Map,
        peak: spot::Peak,
        second: Option<spot::Peak>,
        figures: &mut Figures,
    ) {
        let pixel_m = self.grid.pixel_m;
        let centre = self.grid.centre() as f64;
        let offset = (peak.x - centre).hypot(peak.y - centre) * pixel_m;
        figures.set(Figure::Offset, Some(offset));
        let widths = spot::half_widths(map, &self.interpolant, peak);
        let in_metres = |width: Option<f64>| width.map(|width| width * pixel_m);
        figures.set(Figure::Fwhm, in_metres(widths.of_area));
        figures.set(Figure::FwhmX, in_metres(widths.along_x));
        figures.set(Figure::FwhmY, in_metres(widths.along_y));
        let moments = widths
            .of_area
            .and_then(|fwhm| spot::second_moments(map, &self.interpolant, peak, fwhm));
        figures.set(
            Figure::SecondMomentX,
            in_metres(moments.map(|width| width.0)),
        );
        figures.set(
            Figure::SecondMomentY,
            in_metres(moments.map(|width| width.1)),
        );
        figures.set(
            Figure::SideLobeRatio,
            second.map(|second| second.irradiance_w_m2 / peak.irradiance_w_m2),
        );
    }

    /// Bucket, circles and window; returns the encircled curve as shares of P.
    fn read_power(
        &self,
        map: &Map,
        power_w: f64,
        workspace: &mut Workspace,
        figures: &mut Figures,
    ) -> Vec<f64> {
        let spectrum = &mut workspace.spectrum;
        self.encircled.transform(map, spectrum);
        let curve_w = self.encircled.curve_w(spectrum);
        let fits = |radius: &f64| *radius <= self.grid.width_m() / 2.0 * (1.0 + 1e-9);
        let bucket_w = self
            .bucket_radius_m
            .filter(fits)
            .map(|radius| self.encircled.power_w(spectrum, radius).max(0.0));
        figures.set(Figure::BucketPower, bucket_w);
        if power_w <= 0.0 {
            return vec![0.0; curve_w.len()];
        }
        let fraction = bucket_w.map(|bucket| bucket / power_w);
        figures.set(Figure::BucketFraction, fraction);
        let quality = self
            .filled_bucket_fraction
            .zip(fraction)
            .map(|(filled, here)| (filled / here).sqrt());
        figures.set(Figure::BeamQuality, quality);
        for (figure, share) in [
            (Figure::Encircled50Diameter, 0.5),
            (Figure::Encircled80Diameter, 0.8),
            (Figure::Encircled86Diameter, 1.0 - (-2.0f64).exp()),
        ] {
            figures.set(
                figure,
                self.encircled
                    .diameter_m(spectrum, &curve_w, share * power_w),
            );
        }
        let inside_w = map.irradiance_w_m2.iter().sum::<f64>() * self.grid.pixel_m.powi(2);
        figures.set(Figure::WindowFraction, Some(inside_w / power_w));
        curve_w.iter().map(|within| within / power_w).collect()
    }
}

/// Share of the power of a uniformly filled circle of diameter D, focused at the target,
/// within radius R: 1 − J₀²(v) − J₁²(v), v = πRD/(λ·range) (Rayleigh 1881; Born & Wolf,
/// *Principles of Optics*, section 8.5.2).
pub fn filled_circle_fraction(v: f64) -> f64 {
    1.0 - libm::j0(v).powi(2) - libm::j1(v).powi(2)
}
