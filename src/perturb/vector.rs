//! Elementary functions on single-precision lanes, written so that the compiler turns
//! loops over them into vector instructions.
//!
//! `FUSED` says that the processor multiplies and adds in one instruction; without it
//! the two are kept apart, since emulating the fused form is slow. Polynomials are
//! Chebyshev fits rounded to single precision; the tests measure their errors.

/// a·b + c.
#[inline(always)]
pub fn fma<const FUSED: bool>(a: f32, b: f32, c: f32) -> f32 {
    if FUSED { a.mul_add(b, c) } else { a * b + c }
}

/// Polynomial with coefficients from the highest power down.
#[inline(always)]
fn horner<const FUSED: bool, const N: usize>(x: f32, coefficients: [f32; N]) -> f32 {
    let mut sum = coefficients[0];
    for &coefficient in &coefficients[1..] {
        sum = fma::<FUSED>(sum, x, coefficient);
    }
    sum
}

/// Natural logarithm of a positive, normal number; error below 2e-7 of max(1, |ln x|).
#[inline(always)]
pub fn ln<const FUSED: bool>(x: f32) -> f32 {
    // x = m·2^e with m in [√½, √2): the mantissa's bits above √½ decide.
    let shifted = x.to_bits().wrapping_sub(0x3f35_04f3);
    let exponent = (shifted as i32 >> 23) as f32;
    let mantissa = f32::from_bits((shifted & 0x007f_ffff).wrapping_add(0x3f35_04f3));
    let t = mantissa - 1.0;
    // (ln(1 + t) − t + t²/2)/t³
    let tail = horner::<FUSED, 9>(t, LN_TAIL);
    let square = t * t;
    let low = fma::<FUSED>(-0.5, square, square * t * tail);
    fma::<FUSED>(exponent, std::f32::consts::LN_2, t + low)
}

/// Cosine and sine of 2π·`turns` for |turns| ≤ 2^20; error below 2e-7.
#[inline(always)]
pub fn cos_sin_turns<const FUSED: bool>(turns: f32) -> (f32, f32) {
    // Adding and taking off 1.5·2^23/4 rounds to the nearest quarter turn.
    const ROUND: f32 = 3_145_728.0;
    let shifted = turns + ROUND;
    let quarter = shifted.to_bits();
    let rest = turns - (shifted - ROUND);
    let square = rest * rest;
    let sine = rest * horner::<FUSED, 5>(square, SIN_TURNS);
    let cosine = horner::<FUSED, 6>(square, COS_TURNS);
    // Odd quarters swap sine and cosine; the second bit flips signs.
    let odd = quarter & 1 != 0;
    let (c, s) = if odd { (sine, cosine) } else { (cosine, sine) };
    let flip_sine = (quarter & 2) << 30;
    let flip_cosine = (quarter.wrapping_add(1) & 2) << 30;
    (
        f32::from_bits(c.to_bits() ^ flip_cosine),
        f32::from_bits(s.to_bits() ^ flip_sine),
    )
}

/// e^x for |x| < 80; error below 2e-7 of the result.
#[inline(always)]
pub fn exp<const FUSED: bool>(x: f32) -> f32 {
    // 1.5·2^23 rounds to the nearest whole number.
    const ROUND: f32 = 12_582_912.0;
    let shifted = fma::<FUSED>(x, std::f32::consts::LOG2_E, ROUND);
    let whole = shifted - ROUND;
    // ln 2 in two parts keeps the remainder exact.
    let rest = fma::<FUSED>(whole, -0.693_359_4, x);
    let rest = fma::<FUSED>(whole, 2.121_944_4e-4, rest);
    let power = horner::<FUSED, 7>(rest, EXP);
    f32::from_bits(power.to_bits().wrapping_add(shifted.to_bits() << 23))
}

/// A standard normal pair from two words (Box and Muller, Ann. Math. Stat. 29, 610
/// (1958)); the largest magnitude that can occur is √(2 ln 2³²) = 6.66.
#[inline(always)]
pub fn normal_pair<const FUSED: bool>(radius_word: u32, azimuth_word: u32) -> (f32, f32) {
    // Half a step keeps the logarithm finite. 31 bits convert as a signed number.
    let uniform = ((radius_word >> 1) as i32 as f32 + 0.5) * (1.0 / 2_147_483_648.0);
    let radius = (-2.0 * ln::<FUSED>(uniform)).max(0.0).sqrt();
    let (cos, sin) = cos_sin_turns::<FUSED>(turns(azimuth_word));
    (radius * cos, radius * sin)
}

/// A word as a uniform number of turns in [−½, ½].
#[inline(always)]
pub fn turns(word: u32) -> f32 {
    word as i32 as f32 * (1.0 / 4_294_967_296.0)
}

/// (ln(1 + t) − t + t²/2)/t³ for t in [√½ − 1, √2 − 1].
const LN_TAIL: [f32; 9] = [
    0.069_716_12,
    -0.114_797_34,
    0.116_854_2,
    -0.124_256_87,
    0.142_490_58,
    -0.166_678_03,
    0.200_007_16,
    -0.249_999_97,
    0.333_333_3,
];

/// sin(2πx)/x in x² for |x| ≤ 1/8.
const SIN_TURNS: [f32; 5] = [41.467_014, -76.697_71, 81.605_2, -41.341_7, 6.283_185_5];

/// cos(2πx) in x² for |x| ≤ 1/8.
const COS_TURNS: [f32; 6] = [
    -26.054_466,
    60.238_056,
    -85.456_764,
    64.939_39,
    -19.739_208,
    1.0,
];

/// e^x for |x| ≤ ½ ln 2.
const EXP: [f32; 7] = [
    0.001_394_216,
    0.008_375_968,
    0.041_666_34,
    0.166_664_05,
    0.5,
    1.0,
    1.0,
];

#[cfg(test)]
mod tests {
    use super::*;

    /// Largest error over many arguments, of both the fused and the plain form.
    fn largest(from: f64, to: f64, error: impl Fn(f32) -> [f64; 2]) -> f64 {
        (0..=200_000)
            .map(|step| (from + (to - from) * f64::from(step) / 200_000.0) as f32)
            .flat_map(error)
            .fold(0.0, f64::max)
    }

    #[test]
    fn single_precision_functions_are_accurate_to_a_few_units_in_the_last_place() {
        let ln_error = largest(1e-10, 4.0, |x| {
            let exact = f64::from(x).ln();
            [ln::<true>(x), ln::<false>(x)]
                .map(|y| (f64::from(y) - exact).abs() / exact.abs().max(1.0))
        });
        assert!(ln_error < 2e-7, "ln: {ln_error:e}");
        let turn_error = largest(-3.0, 3.0, |x| {
            let exact = std::f64::consts::TAU * f64::from(x);
            [cos_sin_turns::<true>(x), cos_sin_turns::<false>(x)]
                .map(|(c, s)| (f64::from(c) - exact.cos()).hypot(f64::from(s) - exact.sin()))
        });
        assert!(turn_error < 2e-7, "cos, sin: {turn_error:e}");
        let exp_error = largest(-20.0, 20.0, |x| {
            [exp::<true>(x), exp::<false>(x)]
                .map(|y| (f64::from(y) / f64::from(x).exp() - 1.0).abs())
        });
        assert!(exp_error < 2e-7, "exp: {exp_error:e}");
    }

    #[test]
    fn normals_reach_into_the_tail_and_no_farther() {
        let (largest, _) = normal_pair::<true>(0, 0);
        assert!((largest - 6.66).abs() < 0.01, "{largest}");
        let (smallest, _) = normal_pair::<true>(u32::MAX, 0);
        assert!((0.0..1e-3).contains(&smallest), "{smallest}");
    }
}
