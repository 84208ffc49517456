//! Display units: SI inside, readable numbers outside.
//!
//! A value is shown in the unit that puts it between 1 and 999, rounded to a
//! number of significant digits; an axis takes one unit for all its numbers.

use crate::quantity::Kind;

/// A unit that numbers are shown in.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unit {
    /// Symbol, empty for a pure number.
    pub symbol: &'static str,
    /// SI value of one unit.
    pub factor: f64,
}

impl Unit {
    /// `name (unit)`, or the bare name for a pure number.
    pub fn label(&self, name: &str) -> String {
        if self.symbol.is_empty() {
            name.to_string()
        } else {
            format!("{name} ({})", self.symbol)
        }
    }
}

/// The unit in which `max_abs` (in SI) lies between 1 and 999, for numbers up to that size.
///
/// Zero and undefined values take the SI unit.
pub fn unit_for(max_abs: f64, kind: Kind) -> Unit {
    let ladder = ladder(kind);
    let size = max_abs.abs();
    if !(size.is_finite() && size > 0.0) {
        return si(ladder);
    }
    // The slack keeps a value that is one unit but for rounding in that unit.
    ladder
        .iter()
        .rev()
        .find(|(_, factor)| size >= factor * (1.0 - 1e-12))
        .or(ladder.first())
        .map_or(si(ladder), |&(symbol, factor)| Unit { symbol, factor })
}

/// A value in SI with its unit, rounded: `46.2 cm`, `2.53 kW/m²`, `9.68 µrad`.
pub fn readable(value: f64, kind: Kind, significant_digits: usize) -> String {
    if !value.is_finite() {
        return significant(value, significant_digits);
    }
    // Rounding comes first: 999.7 µm is 1.00 mm in three digits.
    let size = rounded(value, significant_digits).abs();
    let ladder = ladder(kind);
    let below_all = ladder.first().is_some_and(|(_, least)| size < *least);
    let unit = if below_all {
        // A power of ten says more than a small share of the smallest unit.
        si(ladder)
    } else {
        unit_for(size, kind)
    };
    let number = significant(value / unit.factor, significant_digits);
    joined(number, unit.symbol)
}

/// A number rounded to `digits` significant digits, with a true minus sign.
///
/// Very large and very small numbers are written with a power of ten;
/// an undefined one is a dash.
pub fn significant(value: f64, digits: usize) -> String {
    if value.is_nan() {
        return "–".to_string();
    }
    if value.is_infinite() {
        return if value > 0.0 { "∞" } else { "−∞" }.to_string();
    }
    let decimals = digits.clamp(1, 15) - 1;
    let scientific = format!("{value:.decimals$e}");
    let Some((mantissa, exponent)) = scientific.split_once('e') else {
        return scientific;
    };
    let exponent: i32 = exponent.parse().unwrap_or(0);
    if value.abs() <= 0.0 {
        return "0".to_string();
    }
    if (-4..6).contains(&exponent) {
        let decimals = (decimals as i32 - exponent).max(0) as usize;
        return fixed(rounded(value, digits), decimals);
    }
    let mantissa = mantissa.replace('-', "−");
    format!("{mantissa}·10{}", superscript(exponent))
}

/// A number with a fixed count of decimals and a true minus sign; never `−0`.
pub fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().all(|byte| matches!(byte, b'0' | b'.')) => rest.to_string(),
        Some(rest) => format!("−{rest}"),
        None => text,
    }
}

/// Units of a kind, ascending.
fn ladder(kind: Kind) -> &'static [(&'static str, f64)] {
    match kind {
        Kind::Length => &[
            ("pm", 1e-12),
            ("nm", 1e-9),
            ("µm", 1e-6),
            ("mm", 1e-3),
            ("cm", 1e-2),
            ("m", 1.0),
            ("km", 1e3),
            ("Mm", 1e6),
            ("Gm", 1e9),
            ("au", 149_597_870_700.0),
        ],
        Kind::Angle | Kind::Phase => &[
            ("prad", 1e-12),
            ("nrad", 1e-9),
            ("µrad", 1e-6),
            ("mrad", 1e-3),
            ("rad", 1.0),
        ],
        Kind::Power => &[
            ("pW", 1e-12),
            ("nW", 1e-9),
            ("µW", 1e-6),
            ("mW", 1e-3),
            ("W", 1.0),
            ("kW", 1e3),
            ("MW", 1e6),
            ("GW", 1e9),
            ("TW", 1e12),
        ],
        Kind::Irradiance => &[
            ("pW/m²", 1e-12),
            ("nW/m²", 1e-9),
            ("µW/m²", 1e-6),
            ("mW/m²", 1e-3),
            ("W/m²", 1.0),
            ("kW/m²", 1e3),
            ("MW/m²", 1e6),
            ("GW/m²", 1e9),
            ("TW/m²", 1e12),
        ],
        Kind::Frequency => &[
            ("mHz", 1e-3),
            ("Hz", 1.0),
            ("kHz", 1e3),
            ("MHz", 1e6),
            ("GHz", 1e9),
        ],
        Kind::Time => &[
            ("ns", 1e-9),
            ("µs", 1e-6),
            ("ms", 1e-3),
            ("s", 1.0),
            ("min", 60.0),
            ("h", 3600.0),
            ("d", 86_400.0),
            ("yr", 365.25 * 86_400.0),
        ],
        Kind::Ratio => &[("", 1.0)],
    }
}

/// The SI unit of a ladder.
fn si(ladder: &[(&'static str, f64)]) -> Unit {
    let symbol = ladder
        .iter()
        .find(|(_, factor)| (factor - 1.0).abs() < 1e-9)
        .map_or("", |(symbol, _)| *symbol);
    Unit {
        symbol,
        factor: 1.0,
    }
}

fn joined(number: String, symbol: &str) -> String {
    if symbol.is_empty() {
        number
    } else {
        format!("{number} {symbol}")
    }
}

/// The value rounded to `digits` significant digits, decimal to the last bit.
fn rounded(value: f64, digits: usize) -> f64 {
    if !value.is_finite() {
        return value;
    }
    let decimals = digits.clamp(1, 15) - 1;
    format!("{value:.decimals$e}").parse().unwrap_or(value)
}

fn superscript(exponent: i32) -> String {
    exponent
        .to_string()
        .chars()
        .map(|digit| match digit {
            '-' => '⁻',
            '1' => '¹',
            '2' => '²',
            '3' => '³',
            '0' => '⁰',
            // ⁴ to ⁹ stand in a row in Unicode.
            other => char::from_u32(0x2070 + other.to_digit(10).unwrap_or(0)).unwrap_or(other),
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_are_shown_between_1_and_999() {
        let cases = [
            (0.462, Kind::Length, "46.2 cm"),
            (2530.0, Kind::Irradiance, "2.53 kW/m²"),
            (9.68e-6, Kind::Angle, "9.68 µrad"),
            (999.7e-6, Kind::Length, "1.00 mm"),
            (0.009_999, Kind::Length, "1.00 cm"),
            (-0.05, Kind::Length, "−5.00 cm"),
            (149_597_870_700.0, Kind::Length, "1.00 au"),
            (0.0, Kind::Power, "0 W"),
            (999.9, Kind::Power, "1.00 kW"),
            (59.99, Kind::Time, "1.00 min"),
            (0.83, Kind::Ratio, "0.830"),
            (3.2e-16, Kind::Power, "3.20·10⁻¹⁶ W"),
            (f64::NAN, Kind::Power, "–"),
        ];
        for (value, kind, expected) in cases {
            assert_eq!(readable(value, kind, 3), expected);
        }
    }

    #[test]
    fn numbers_keep_their_significant_digits() {
        assert_eq!(significant(0.083_456, 2), "0.083");
        assert_eq!(significant(12_345.0, 2), "12000");
        assert_eq!(significant(-1.5e-7, 2), "−1.5·10⁻⁷");
        assert_eq!(significant(1e300, 1), "1·10³⁰⁰");
        assert_eq!(significant(5e-324, 2), "4.9·10⁻³²⁴");
        assert_eq!(fixed(-0.001, 1), "0.0");
    }

    #[test]
    fn an_axis_takes_the_unit_of_its_largest_number() {
        assert_eq!(unit_for(5000.0, Kind::Length).symbol, "km");
        assert_eq!(unit_for(-33e-9, Kind::Angle).symbol, "nrad");
        assert_eq!(unit_for(f64::NAN, Kind::Length).symbol, "m");
        assert_eq!(unit_for(1e-3, Kind::Length).symbol, "mm");
    }
}
