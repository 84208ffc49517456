//! Quantities: a number and a unit.
//!
//! Units that are powers of ten are read in decimal, so that `"1064 nm"` is the
//! double nearest to 1.064e-6 and not a product of two rounded numbers; for the
//! same reason [`exact`] can write any value so that it reads back unchanged.

use std::f64::consts::{PI, TAU};

/// Kind of a quantity.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Metres.
    Length,
    /// Radians.
    Angle,
    /// Radians of optical phase, or a path error.
    Phase,
    /// Watts.
    Power,
    /// Watts per square metre.
    Irradiance,
    /// Hertz.
    Frequency,
    /// Seconds.
    Time,
    /// A pure number.
    Ratio,
}

impl Kind {
    const ALL: [Kind; 8] = [
        Kind::Length,
        Kind::Angle,
        Kind::Phase,
        Kind::Power,
        Kind::Irradiance,
        Kind::Frequency,
        Kind::Time,
        Kind::Ratio,
    ];

    /// Name with its article, as messages use it.
    pub fn with_article(self) -> &'static str {
        match self {
            Kind::Length => "a length",
            Kind::Angle => "an angle",
            Kind::Phase => "a phase",
            Kind::Power => "a power",
            Kind::Irradiance => "an irradiance",
            Kind::Frequency => "a frequency",
            Kind::Time => "a time",
            Kind::Ratio => "a ratio",
        }
    }

    fn units(self) -> &'static [Unit] {
        match self {
            Kind::Length => LENGTH,
            Kind::Angle => ANGLE,
            Kind::Phase => PHASE,
            Kind::Power => POWER,
            Kind::Irradiance => IRRADIANCE,
            Kind::Frequency => FREQUENCY,
            Kind::Time => TIME,
            Kind::Ratio => RATIO,
        }
    }
}

/// How many SI units one unit is.
#[derive(Debug, Clone, Copy)]
enum Scale {
    /// A power of ten, applied in decimal.
    Ten(i64),
    /// Any other factor.
    Times(f64),
}

/// A unit and its scale.
type Unit = (&'static str, Scale);

const LENGTH: &[Unit] = &[
    ("nm", Scale::Ten(-9)),
    ("um", Scale::Ten(-6)),
    ("µm", Scale::Ten(-6)),
    ("mm", Scale::Ten(-3)),
    ("cm", Scale::Ten(-2)),
    ("m", Scale::Ten(0)),
    ("km", Scale::Ten(3)),
    ("Mm", Scale::Ten(6)),
    ("Gm", Scale::Ten(9)),
    // IAU 2012 Resolution B2.
    ("au", Scale::Times(149_597_870_700.0)),
];
const ANGLE: &[Unit] = &[
    ("nrad", Scale::Ten(-9)),
    ("urad", Scale::Ten(-6)),
    ("µrad", Scale::Ten(-6)),
    ("mrad", Scale::Ten(-3)),
    ("rad", Scale::Ten(0)),
    ("arcsec", Scale::Times(PI / 648_000.0)),
    ("arcmin", Scale::Times(PI / 10_800.0)),
    ("deg", Scale::Times(PI / 180.0)),
];
const PHASE: &[Unit] = &[
    ("rad", Scale::Ten(0)),
    ("deg", Scale::Times(PI / 180.0)),
    ("waves", Scale::Times(TAU)),
];
const POWER: &[Unit] = &[
    ("mW", Scale::Ten(-3)),
    ("W", Scale::Ten(0)),
    ("kW", Scale::Ten(3)),
    ("MW", Scale::Ten(6)),
    ("GW", Scale::Ten(9)),
];
const IRRADIANCE: &[Unit] = &[
    ("W/m^2", Scale::Ten(0)),
    ("kW/m^2", Scale::Ten(3)),
    ("MW/m^2", Scale::Ten(6)),
    ("W/cm^2", Scale::Ten(4)),
    ("mW/cm^2", Scale::Ten(1)),
];
const FREQUENCY: &[Unit] = &[
    ("Hz", Scale::Ten(0)),
    ("kHz", Scale::Ten(3)),
    ("MHz", Scale::Ten(6)),
    ("GHz", Scale::Ten(9)),
];
const TIME: &[Unit] = &[
    ("s", Scale::Ten(0)),
    ("min", Scale::Times(60.0)),
    ("h", Scale::Times(3_600.0)),
    ("d", Scale::Times(86_400.0)),
    ("yr", Scale::Times(31_557_600.0)),
];
const RATIO: &[Unit] = &[("%", Scale::Ten(-2))];
const DECIBEL: &[Unit] = &[("dB", Scale::Ten(0))];

/// A text that is not the quantity asked for.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{found}; {allowed}")]
pub struct QuantityError {
    /// What stands there and what is wrong with it.
    pub found: String,
    /// What would be accepted.
    pub allowed: String,
    /// The nearest unit accepted, where a spelling mistake is likely.
    pub nearest: Option<String>,
}

/// Reads a quantity of `kind`, in SI units.
///
/// A ratio may be a plain number. A phase is taken in its own units only;
/// [`parse_phase`] also takes a path error.
pub fn parse(text: &str, kind: Kind) -> Result<f64, QuantityError> {
    convert(text, kind.with_article(), kind.units(), kind == Kind::Ratio).map(|(value, _)| value)
}

/// Reads a phase in radians; a length is a path error, 2π · length/wavelength.
pub fn parse_phase(text: &str, wavelength_m: f64) -> Result<f64, QuantityError> {
    let accepted = [PHASE, LENGTH].concat();
    let (value, unit) = convert(text, Kind::Phase.with_article(), &accepted, false)?;
    let is_path = unit >= PHASE.len();
    Ok(if is_path {
        TAU * value / wavelength_m
    } else {
        value
    })
}

/// Reads a level in decibels, such as `"10 dB"`.
pub fn parse_decibels(text: &str) -> Result<f64, QuantityError> {
    convert(text, "a level", DECIBEL, false).map(|(value, _)| value)
}

/// What a quantity of `kind` may be written in, as a sentence for messages.
pub fn accepted(kind: Kind) -> String {
    match kind {
        Kind::Phase => accepted_text(kind.with_article(), &[PHASE, LENGTH].concat(), false),
        _ => accepted_text(kind.with_article(), kind.units(), kind == Kind::Ratio),
    }
}

fn accepted_text(what: &str, units: &[Unit], plain: bool) -> String {
    if plain {
        return format!("{what} is a plain number or a string in %");
    }
    let names: Vec<&str> = units.iter().map(|(name, _)| *name).collect();
    match names.as_slice() {
        [one] => format!("{what} needs the unit {one}"),
        _ => format!("{what} needs one of {}", names.join(", ")),
    }
}

/// The value in SI units and the index of its unit in `units`.
fn convert(
    text: &str,
    what: &str,
    units: &[Unit],
    plain: bool,
) -> Result<(f64, usize), QuantityError> {
    let fail = |problem: &str, nearest: Option<String>| QuantityError {
        found: format!("found \"{text}\", {problem}"),
        allowed: accepted_text(what, units, plain),
        nearest,
    };
    let Some(number) = Number::split(text.trim()) else {
        return Err(fail("which does not start with a finite number", None));
    };
    // The Greek letter and the micro sign look alike and both stand on keyboards.
    let unit = number.unit.replace('\u{3bc}', "\u{b5}");
    let (index, scale) = if unit.is_empty() && plain {
        (0, Scale::Ten(0))
    } else if unit.is_empty() {
        return Err(fail("a number with a missing unit", None));
    } else if let Some(index) = units.iter().position(|(name, _)| *name == unit) {
        (index, units[index].1)
    } else if let Some(other) = kind_of(&unit) {
        return Err(fail(&format!("a unit of the wrong kind ({other})"), None));
    } else {
        return Err(fail("an unknown unit", nearest_unit(&unit, units)));
    };
    number
        .in_si(scale)
        .map(|value| (value, index))
        .ok_or_else(|| fail("a number too large to hold", None))
}

/// Name of the kind that `unit` belongs to.
fn kind_of(unit: &str) -> Option<&'static str> {
    let holds = |units: &[Unit]| units.iter().any(|(name, _)| *name == unit);
    if holds(DECIBEL) {
        return Some("a level");
    }
    let kind = Kind::ALL.into_iter().find(|kind| holds(kind.units()))?;
    Some(kind.with_article())
}

fn nearest_unit(unit: &str, units: &[Unit]) -> Option<String> {
    // A distance of one turns any letter into `m`: something must be in common.
    let related = |name: &&str| unit.chars().any(|letter| name.contains(letter));
    units
        .iter()
        .map(|(name, _)| *name)
        .filter(related)
        .map(|name| (strsim::osa_distance(unit, name), name))
        .filter(|(distance, name)| {
            *distance <= 1 && name.chars().count() + 1 >= unit.chars().count()
        })
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, name)| name.to_string())
}

/// The parts of a number as written, followed by its unit.
#[derive(Debug)]
struct Number<'a> {
    mantissa: &'a str,
    exponent: i64,
    unit: &'a str,
}

impl<'a> Number<'a> {
    fn split(text: &'a str) -> Option<Self> {
        let sign = usize::from(text.starts_with(['+', '-']));
        let whole = digits(&text[sign..]);
        let mut end = sign + whole;
        let mut fraction = 0;
        if text[end..].starts_with('.') {
            fraction = digits(&text[end + 1..]);
            end += 1 + fraction;
        }
        if whole + fraction == 0 {
            return None;
        }
        let mantissa = &text[..end];
        let mut exponent = 0;
        // An `e` without digits begins a unit, not an exponent.
        if let Some(rest) = text[end..].strip_prefix(['e', 'E']) {
            let sign = usize::from(rest.starts_with(['+', '-']));
            let length = digits(&rest[sign..]);
            if length > 0 {
                exponent = rest[..sign + length].parse().ok()?;
                end += 1 + sign + length;
            }
        }
        let unit = text[end..].trim_start();
        Some(Number {
            mantissa,
            exponent,
            unit,
        })
    }

    /// The value in SI units; `None` when it overflows.
    fn in_si(&self, scale: Scale) -> Option<f64> {
        let (shift, factor) = match scale {
            Scale::Ten(shift) => (shift, 1.0),
            Scale::Times(factor) => (0, factor),
        };
        let exponent = self.exponent.checked_add(shift)?;
        let number: f64 = format!("{}e{exponent}", self.mantissa).parse().ok()?;
        Some(number * factor).filter(|value| value.is_finite())
    }
}

fn digits(text: &str) -> usize {
    text.bytes().take_while(u8::is_ascii_digit).count()
}

/// A text with a readable unit that [`parse`] reads back to the same bits.
///
/// The value must be finite.
pub fn exact(value: f64, kind: Kind) -> String {
    if kind == Kind::Ratio {
        return format!("{value:?}");
    }
    let reads_back = |text: &str| parse(text, kind).is_ok_and(|back| same_bits(back, value));
    let friendly = kind.units().iter().filter_map(|(name, scale)| match scale {
        Scale::Times(factor) => short(value / factor, name, reads_back),
        Scale::Ten(_) => None,
    });
    decimal(value, kind.units())
        .into_iter()
        .chain(friendly)
        .min_by_key(String::len)
        .unwrap_or_else(|| format!("{value:e}"))
}

/// As [`exact`], for [`parse_phase`]: a path error where that is the shorter text.
pub fn exact_phase(value_rad: f64, wavelength_m: f64) -> String {
    let reads_back =
        |text: &str| parse_phase(text, wavelength_m).is_ok_and(|back| same_bits(back, value_rad));
    let phase = exact(value_rad, Kind::Phase);
    match short(value_rad / TAU * wavelength_m * 1e9, "nm", reads_back) {
        Some(path) if path.len() < phase.len() => path,
        _ => phase,
    }
}

fn same_bits(left: f64, right: f64) -> bool {
    left.to_bits() == right.to_bits()
}

/// In the largest power-of-ten unit that leaves a digit before the point.
///
/// The shortest decimal digits that identify the value are the same in every
/// such unit; only the point moves, so nothing is rounded.
fn decimal(value: f64, units: &[Unit]) -> Option<String> {
    let scientific = format!("{:e}", value.abs());
    let (mantissa, exponent) = scientific.split_once('e')?;
    let exponent: i64 = exponent.parse().ok()?;
    let digits = mantissa.replace('.', "");
    // Steps of a thousand, one spelling each.
    let steps = || {
        units.iter().filter_map(|(name, scale)| match scale {
            Scale::Ten(shift) if name.is_ascii() && shift % 3 == 0 => Some((*name, *shift)),
            _ => None,
        })
    };
    let (unit, shift) = if digits == "0" {
        steps().find(|(_, shift)| *shift == 0)?
    } else {
        steps()
            .filter(|(_, shift)| *shift <= exponent)
            .max_by_key(|(_, shift)| *shift)
            .or_else(|| steps().min_by_key(|(_, shift)| *shift))?
    };
    let sign = if value.is_sign_negative() { "-" } else { "" };
    let number = place_point(&digits, exponent - shift);
    Some(format!("{sign}{number} {unit}"))
}

/// `digits` with the point so that the first has the weight 10^`exponent`.
fn place_point(digits: &str, exponent: i64) -> String {
    let count = digits.len() as i64;
    match exponent {
        -3..=-1 => format!("0.{}{digits}", "0".repeat((-exponent - 1) as usize)),
        0..=5 if exponent + 1 >= count => {
            format!("{digits}{}", "0".repeat((exponent + 1 - count) as usize))
        }
        0..=5 => {
            let (whole, fraction) = digits.split_at(exponent as usize + 1);
            format!("{whole}.{fraction}")
        }
        _ if count == 1 => format!("{digits}e{exponent}"),
        _ => format!("{}.{}e{exponent}", &digits[..1], &digits[1..]),
    }
}

/// `number` to at most six decimals with `unit`, if `reads_back` accepts it.
fn short(number: f64, unit: &str, reads_back: impl Fn(&str) -> bool) -> Option<String> {
    if !(1e-2..1e6).contains(&number.abs()) {
        return None;
    }
    (0..=6)
        .map(|decimals| format!("{number:.decimals$} {unit}"))
        .find(|text| reads_back(text))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn reads(text: &str, kind: Kind, expected: f64) {
        let value = parse(text, kind).unwrap_or_else(|error| panic!("{text}: {error}"));
        assert_eq!(value.to_bits(), expected.to_bits(), "{text}: {value:e}");
    }

    #[track_caller]
    fn refuses(text: &str, kind: Kind, fragment: &str) -> QuantityError {
        let error = parse(text, kind).expect_err(text);
        assert!(error.to_string().contains(fragment), "{error}");
        error
    }

    #[test]
    fn powers_of_ten_are_the_nearest_double() {
        reads("1064 nm", Kind::Length, 1.064e-6);
        reads("1.064µm", Kind::Length, 1.064e-6);
        reads("1.064 \u{3bc}m", Kind::Length, 1.064e-6);
        reads("0.3 um", Kind::Length, 0.3e-6);
        reads("1.5e11 m", Kind::Length, 1.5e11);
        reads(" 384.4 Mm ", Kind::Length, 384.4e6);
        reads(".7 urad", Kind::Angle, 0.7e-6);
        reads("2 %", Kind::Ratio, 0.02);
        reads("0.97", Kind::Ratio, 0.97);
        reads("3 kW/m^2", Kind::Irradiance, 3e3);
        reads("3 mW/cm^2", Kind::Irradiance, 30.0);
        reads("80 MHz", Kind::Frequency, 8e7);
        reads("1 GW", Kind::Power, 1e9);
    }

    #[test]
    fn other_units_are_factors() {
        reads("1 au", Kind::Length, 149_597_870_700.0);
        reads("180 deg", Kind::Angle, PI);
        reads("60 arcmin", Kind::Angle, 60.0 * (PI / 10_800.0));
        reads("1 yr", Kind::Time, 365.25 * 86_400.0);
        reads("0.5 waves", Kind::Phase, PI);
        let quarter = parse_phase("250 nm", 1e-6).expect("a path error");
        assert!((quarter - PI / 2.0).abs() < 1e-15);
        let level = parse_decibels("-10 dB").expect("a level");
        assert_eq!(level.to_bits(), (-10.0_f64).to_bits());
    }

    #[test]
    fn says_what_is_wrong_with_a_unit() {
        refuses("1064", Kind::Length, "missing unit");
        refuses(
            "3 furlongs",
            Kind::Length,
            "unknown unit; a length needs one of nm, um",
        );
        refuses("3 kW", Kind::Length, "wrong kind (a power)");
        refuses("10 dB", Kind::Ratio, "wrong kind (a level)");
        refuses("10 mrad", Kind::Phase, "wrong kind (an angle)");
        let error = refuses("3 nmm", Kind::Length, "unknown unit");
        assert_eq!(error.nearest.as_deref(), Some("nm"));
        let error = refuses("3 kW/m2", Kind::Irradiance, "unknown unit");
        assert_eq!(error.nearest.as_deref(), Some("kW/m^2"));
        let error = refuses("3 x", Kind::Length, "unknown unit");
        assert_eq!(error.nearest, None);
    }

    #[test]
    fn refuses_what_is_no_finite_number() {
        for text in [
            "", "m", "nan m", "NaN", "inf m", "-inf m", ". m", "e5 m", "--1 m",
        ] {
            refuses(text, Kind::Length, "finite number");
        }
        refuses("0x10 m", Kind::Length, "unknown unit");
        refuses("1e400 m", Kind::Length, "too large");
        refuses("1e308 km", Kind::Length, "too large");
        refuses("1e99999999999999999999 m", Kind::Length, "finite number");
    }

    #[test]
    fn writes_readable_texts() {
        for (value, kind, text) in [
            (1.55e-6, Kind::Length, "1.55 um"),
            (0.0, Kind::Length, "0 m"),
            (384.4e6, Kind::Length, "384.4 Mm"),
            (4.8e-6, Kind::Angle, "4.8 urad"),
            (-0.02, Kind::Angle, "-20 mrad"),
            (0.1, Kind::Phase, "0.1 rad"),
            (2e4, Kind::Power, "20 kW"),
            (3e3, Kind::Irradiance, "3 kW/m^2"),
            (31_557_600.0, Kind::Time, "1 yr"),
            (25.0, Kind::Time, "25 s"),
            (PI / 180.0, Kind::Angle, "1 deg"),
            (1e30, Kind::Length, "1e21 Gm"),
            (0.9, Kind::Ratio, "0.9"),
        ] {
            assert_eq!(exact(value, kind), text);
        }
        let phase = parse_phase("40 nm", 1.064e-6).expect("a path error");
        assert_eq!(exact_phase(phase, 1.064e-6), "40 nm");
    }

    /// A stream of well-mixed bits (splitmix64).
    fn bits(state: &mut u64) -> u64 {
        *state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = *state;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        mixed ^ (mixed >> 31)
    }

    #[test]
    fn any_value_survives_writing_and_reading() {
        let mut state = 1;
        for _ in 0..20_000 {
            // Any finite double, and a rounded one as people write them.
            let any = f64::from_bits(bits(&mut state));
            let exponent = (bits(&mut state) % 40) as i32 - 20;
            let rounded = (bits(&mut state) % 10_000) as f64 * 10_f64.powi(exponent);
            for value in [any, rounded] {
                if !value.is_finite() {
                    continue;
                }
                for kind in Kind::ALL {
                    reads(&exact(value, kind), kind, value);
                }
                let phase = exact_phase(value, 1.55e-6);
                let back = parse_phase(&phase, 1.55e-6).expect("a phase");
                assert_eq!(back.to_bits(), value.to_bits(), "{phase}");
            }
        }
    }
}
