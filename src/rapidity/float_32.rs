//! The same five functions for single-precision floats, correctly rounded.
//!
//! Integer inside: no float is added or multiplied, so every target gives the same bits, with or without a
//! floating-point unit. Results are the floats nearest to the exact values, subnormals included; zeros keep their sign where the function is odd; there is one NaN.
//!
//! | function | of | gives |
//! |---|---|---|
//! | [`rapidity_of_beta`] | b | atanh(b) |
//! | [`beta_of_rapidity`] | r | tanh(r) |
//! | [`factor_of_rapidity`] | r | exp(r) |
//! | [`factor_of_beta`] | b | sqrt((1 + b)/(1 - b)) |
//! | [`offset_of_rapidity`] | r | exp(r) - 1 |
//!
//! A first try in 32-bit arithmetic serves all but one float in 128; the rest go on in 64 bits.
//!
//! A float near one has 24 bits, 26 Hz at 437 MHz: carry offsets, never factors, in floats.
#![allow(clippy::cast_possible_truncation, reason = "25 bits at most are left after the shift")]

use super::exponential::{
    Normal, Power, offset_of_power, power_near, reciprocal, small_offset, steps_of_half, tanh_of_power,
};
use super::float_quick;
use super::logarithm::logarithm;
use super::wide_product::{about_high_i64, high_i32, high_u64};

/// The one NaN of this module.
const NAN: f32 = f32::from_bits(0x7fc0_0000);

/// Size of a normal float: `mantissa` 2^`exponent`, mantissa in [2^23, 2^24).
#[derive(Clone, Copy)]
pub(super) struct Parts {
    pub(super) mantissa: u32,
    pub(super) exponent: i32,
}

/// Size of a normal float.
const fn parts(x: f32) -> Parts {
    let bits = x.to_bits();
    Parts { mantissa: bits & 0x7f_ffff | 0x80_0000, exponent: ((bits >> 23 & 0xff) as i32).wrapping_sub(150) }
}

/// The sign bit of a float.
const fn sign(x: f32) -> u32 {
    x.to_bits() & 0x8000_0000
}

/// `value` 2^(exponent - 63), top bit set, as the nearest float, with a sign bit.
const fn nearest(normal: Normal, sign: u32) -> f32 {
    let Normal { value, exponent } = normal;
    // Bits to cut off: 40, below the normal floats more.
    let cut = 40_i32.wrapping_add(non_negative((-126_i32).wrapping_sub(exponent)));
    if cut > 64 {
        return f32::from_bits(sign);
    }
    let kept = value.unbounded_shr(cut as u32);
    let half = (value >> (cut.wrapping_sub(1) as u32)) & 1;
    let biased = non_negative(exponent.wrapping_add(126)) as u32;
    let bits = (biased << 23).wrapping_add(kept as u32).wrapping_add(half as u32);
    f32::from_bits(sign | if exponent > 127 || bits > 0x7f80_0000 { 0x7f80_0000 } else { bits })
}

/// `x`, or zero where it is negative.
const fn non_negative(x: i32) -> i32 {
    x & !(x >> 31)
}

/// exp(x) of a signed x, 2^-26 <= |x| < 127, given as `mantissa` 2^`exponent` of a float, times 2^`DOUBLINGS`.
const fn power<const DOUBLINGS: i32>(parts: Parts, sign: u32) -> Power {
    /// 128 / ln 2 with 22 fraction bits.
    const STEPS: i32 = 774_541_002;
    let mantissa = if sign == 0 { parts.mantissa as i32 } else { (parts.mantissa as i32).wrapping_neg() };
    let exponent = parts.exponent.wrapping_add(DOUBLINGS);
    // With 24 fraction bits, cut off, in a word.
    let coarse = if exponent >= -24 {
        mantissa << (exponent.wrapping_add(24) as u32 & 31)
    } else {
        mantissa >> ((-24_i32).wrapping_sub(exponent) as u32 & 31)
    };
    let steps = high_i32(coarse, STEPS).wrapping_add(1 << 13) >> 14;
    // With 70 fraction bits, exactly; the whole part beyond the word falls off.
    power_near(steps, (mantissa as i64) << (exponent.wrapping_add(70) as u32 & 63), 0)
}

/// exp(x) - 1 in size, 2^-26 <= |x| < 127, of `parts` times 2^`DOUBLINGS`.
const fn offset<const DOUBLINGS: i32>(parts: Parts, sign: u32) -> Normal {
    let exponent = parts.exponent.wrapping_add(DOUBLINGS);
    if exponent >= -30 {
        // 2^-7 and more.
        return offset_of_power(power::<DOUBLINGS>(parts, sign), sign != 0);
    }
    let quarter = (parts.mantissa as i64) << (exponent.wrapping_add(68) as u32 & 63);
    let quarter = if sign == 0 { quarter } else { quarter.wrapping_neg() };
    let value = small_offset(quarter, (parts.mantissa as i64) << 39);
    normal(value, exponent.wrapping_add(24))
}

/// `value` 2^(exponent - 63) with its top bit set.
const fn normal(value: u64, exponent: i32) -> Normal {
    let shift = value.leading_zeros();
    Normal { value: value << shift, exponent: exponent.wrapping_sub(shift as i32) }
}

/// A power as a normal value.
const fn normal_power(power: Power) -> Normal {
    normal(power.high, power.exponent)
}

/// Frequency factor of a rapidity: exp(r), positive = approaching = above one.
///
/// Any float: infinity gives infinity, minus infinity 0, NaN the one NaN; from 88.73 on the result is infinite,
/// below -103.98 zero.
///
/// # Accuracy
/// Correctly rounded for all 2^32 floats (`tests/rapidity_float_32.rs`).
///
/// # Cost
/// At most 9 products of 32 bits; for one float in 128 those of the 64-bit way besides. No division, no floating
/// point.
///
/// # Source
/// As [`Rapidity::to_factor`](super::Rapidity::to_factor), with 60 good bits.
///
/// ```
/// use shiftkeel::rapidity::float_32::factor_of_rapidity;
/// assert_eq!(factor_of_rapidity(1.0), 2.7182817);
/// assert_eq!(factor_of_rapidity(f32::NEG_INFINITY), 0.0);
/// ```
pub const fn factor_of_rapidity(rapidity: f32) -> f32 {
    /// 2^-25, below which the nearest float is one; 87, up to which all results are normal.
    const LEAST: u32 = 0x3300_0000;
    const MOST: u32 = 0x42ae_0000;
    let bits = rapidity.to_bits();
    let (size, sign) = (bits & 0x7fff_ffff, sign(rapidity));
    let parts = parts(rapidity);
    if size.wrapping_sub(LEAST) < MOST - LEAST
        && let Some(factor) = float_quick::factor_of_rapidity(parts, sign)
    {
        return factor;
    }
    if size > 0x7f80_0000 {
        return NAN;
    }
    if size >= 0x42d0_0000 {
        return if sign == 0 { f32::INFINITY } else { 0.0 }; // 104 and more
    }
    if size < LEAST {
        return 1.0;
    }
    nearest(normal_power(power::<0>(parts, sign)), 0)
}

/// Offset from one of the frequency factor: exp(r) - 1, positive = approaching.
///
/// Any float: infinity gives infinity, minus infinity -1, NaN the one NaN, zero itself.
///
/// # Accuracy
/// Correctly rounded for all 2^32 floats (`tests/rapidity_float_32.rs`).
///
/// # Cost
/// At most 9 products of 32 bits; for one float in 128 those of the 64-bit way besides. No division, no floating
/// point.
///
/// # Source
/// As [`Rapidity::to_offset`](super::Rapidity::to_offset).
///
/// ```
/// use shiftkeel::rapidity::float_32::offset_of_rapidity;
/// assert_eq!(offset_of_rapidity(-2.3349487e-5), -2.3349214e-5); // receding at 7 km/s
/// assert_eq!(offset_of_rapidity(-0.0).to_bits(), (-0.0_f32).to_bits());
/// ```
pub const fn offset_of_rapidity(rapidity: f32) -> f32 {
    /// 2^-25, below which the nearest float is the rapidity; 18, from which on it is -1 the other way.
    const LEAST: u32 = 0x3300_0000;
    const MOST: u32 = 0x4190_0000;
    /// 15/256, where the quick power series ends.
    const SMALL: u32 = 0x3d70_0000;
    let bits = rapidity.to_bits();
    let (size, sign) = (bits & 0x7fff_ffff, sign(rapidity));
    let parts = parts(rapidity);
    if size.wrapping_sub(LEAST) < MOST - LEAST {
        return match float_quick::offset_of_rapidity(parts, sign, size < SMALL) {
            Some(offset) => offset,
            None => nearest(offset::<0>(parts, sign), sign),
        };
    }
    if size > 0x7f80_0000 {
        return NAN;
    }
    if size < LEAST {
        return rapidity;
    }
    if sign != 0 {
        return -1.0;
    }
    if size >= 0x42c0_0000 {
        return f32::INFINITY; // 96 and more
    }
    nearest(offset::<0>(parts, sign), sign)
}

/// Velocity ratio of a rapidity: tanh(r), positive = approaching.
///
/// Any float: infinities give +-1, NaN the one NaN, zero itself.
///
/// # Accuracy
/// Correctly rounded for all 2^32 floats (`tests/rapidity_float_32.rs`).
///
/// # Cost
/// At most 14 products of 32 bits; for one float in 128 those of the 64-bit way besides. No division, no floating
/// point.
///
/// # Source
/// Below 1/8 E/(2 + E) with E = exp(2|r|) - 1; above (1 - X)/(1 + X) with X = exp(-2|r|).
///
/// ```
/// use shiftkeel::rapidity::float_32::beta_of_rapidity;
/// assert_eq!(beta_of_rapidity(0.5), 0.46211717);
/// assert_eq!(beta_of_rapidity(f32::NEG_INFINITY), -1.0);
/// ```
pub const fn beta_of_rapidity(rapidity: f32) -> f32 {
    const NEGATIVE: u32 = 1 << 31;
    let bits = rapidity.to_bits();
    let (size, sign) = (bits & 0x7fff_ffff, sign(rapidity));
    if size > 0x7f80_0000 {
        return NAN;
    }
    if size < 0x3980_0000 {
        return rapidity; // below 2^-12, where r^3/3 is less than half a unit
    }
    if size >= 0x4118_0000 {
        return f32::from_bits(sign | 0x3f80_0000); // 9.5 and more
    }
    let parts = parts(rapidity);
    if let Some(beta) = float_quick::beta_of_rapidity(parts, sign) {
        return beta;
    }
    if size >= 0x3e00_0000 {
        return nearest(normal(tanh_of_power(power::<1>(parts, NEGATIVE)), 0), sign);
    }
    // E/2 / (1 + E/2), where 1 + E/2 is below 1.15.
    let double = offset::<1>(parts, 0);
    let half = Normal { value: double.value, exponent: double.exponent.wrapping_sub(1) };
    let one_more = (1_u64 << 63).wrapping_add(half.value >> half.exponent.unsigned_abs());
    nearest(normal(high_u64(half.value, reciprocal(one_more, 0)), half.exponent), sign)
}

/// ln((1 + b)/(1 - b)) / 2 of 2^-26 <= b < 1: `exponent` ln 2 / 2 + `fraction` 2^-64.
const fn half_logarithm(parts: Parts) -> super::logarithm::Logarithm {
    const ONE: u64 = 1 << 63;
    let beta = (parts.mantissa as u64) << (parts.exponent.wrapping_add(63) as u32 & 63);
    logarithm(ONE.wrapping_add(beta)).minus(logarithm(ONE.wrapping_sub(beta)))
}

/// Frequency factor of a velocity ratio: sqrt((1 + b)/(1 - b)), positive = approaching = above one.
///
/// 1 gives infinity, -1 zero; beyond, and for NaN, the one NaN.
///
/// # Accuracy
/// Correctly rounded for all 2^32 floats (`tests/rapidity_float_32.rs`).
///
/// # Cost
/// At most 20 products of 32 bits; for one float in 128 those of the 64-bit way besides. No division, no floating
/// point.
///
/// # Source
/// exp(atanh(b)), the logarithm with 63 fraction bits and its multiple of ln 2 / 2 exactly.
///
/// ```
/// use shiftkeel::rapidity::float_32::factor_of_beta;
/// assert_eq!(factor_of_beta(0.5), 1.7320508);
/// assert_eq!(factor_of_beta(-1.0), 0.0);
/// ```
pub const fn factor_of_beta(beta: f32) -> f32 {
    let bits = beta.to_bits();
    let (size, sign) = (bits & 0x7fff_ffff, sign(beta));
    if size > 0x3f80_0000 {
        return NAN;
    }
    if size == 0x3f80_0000 {
        return if sign == 0 { f32::INFINITY } else { 0.0 };
    }
    if size < 0x3280_0000 {
        return 1.0; // below 2^-26
    }
    let parts = parts(beta);
    if let Some(factor) = float_quick::factor_of_beta(parts, sign) {
        return factor;
    }
    let half = half_logarithm(parts);
    let (exponent, fraction) = if sign == 0 {
        (half.exponent, half.fraction)
    } else {
        (half.exponent.wrapping_neg(), half.fraction.wrapping_neg())
    };
    // The fraction has 64 bits of the half; half of ln 2 is 64 steps.
    let steps = steps_of_half((fraction >> 32) as i32);
    nearest(normal_power(power_near(steps, fraction << 6, exponent << 6)), 0)
}

/// Rapidity of a velocity ratio: atanh(b), positive = approaching.
///
/// 1 gives infinity, -1 minus infinity; beyond, and for NaN, the one NaN; zero itself.
///
/// # Accuracy
/// Correctly rounded for all 2^32 floats (`tests/rapidity_float_32.rs`).
///
/// # Cost
/// At most 13 products of 32 bits; for one float in 128 those of the 64-bit way besides. No division, no floating
/// point.
///
/// # Source
/// Below 1/32 the power series b + b^3/3 + ... + b^13/13; above, (ln(1 + b) - ln(1 - b))/2.
///
/// ```
/// use shiftkeel::rapidity::float_32::rapidity_of_beta;
/// assert_eq!(rapidity_of_beta(0.5), 0.54930615);
/// assert!(rapidity_of_beta(1.5).is_nan());
/// ```
pub const fn rapidity_of_beta(beta: f32) -> f32 {
    let bits = beta.to_bits();
    let (size, sign) = (bits & 0x7fff_ffff, sign(beta));
    if size > 0x3f80_0000 {
        return NAN;
    }
    if size == 0x3f80_0000 {
        return f32::from_bits(sign | 0x7f80_0000);
    }
    if size < 0x3980_0000 {
        return beta; // below 2^-12, where b^3/3 is less than half a unit
    }
    let parts = parts(beta);
    if let Some(rapidity) = float_quick::rapidity_of_beta(parts, sign) {
        return rapidity;
    }
    if size < 0x3d00_0000 {
        return nearest(small_rapidity(parts), sign);
    }
    /// ln 2 / 2 with 63 and with 60 fraction bits.
    const HALF_LN_2: u64 = 3_196_577_161_300_663_915;
    const HALF_LN_2_SHORT: u64 = 399_572_145_162_582_989;
    let half = half_logarithm(parts);
    let exponent = half.exponent as u64;
    let rapidity = if exponent <= 1 {
        normal(exponent.wrapping_mul(HALF_LN_2).wrapping_add((half.fraction >> 1) as u64), 0)
    } else {
        normal(exponent.wrapping_mul(HALF_LN_2_SHORT).wrapping_add((half.fraction >> 4) as u64), 3)
    };
    nearest(rapidity, sign)
}

/// atanh(b) of 2^-12 <= b < 2^-5: b (1 + u/3 + u^2/5 + ... + u^6/13) with u = b^2, within 2^-61.
const fn small_rapidity(parts: Parts) -> Normal {
    let beta = (parts.mantissa as i64) << (parts.exponent.wrapping_add(68) as u32 & 63);
    let square = about_high_i64(beta, beta); // 72 fraction bits
    // With 63 fraction bits; the product with the square has 71.
    let series = 709_490_156_681_136_600_i64; // 2^63/13
    let series = 838_488_366_986_797_801_i64.wrapping_add(about_high_i64(square, series) >> 8); // 2^63/11
    let series = 1_024_819_115_206_086_201_i64.wrapping_add(about_high_i64(square, series) >> 8); // 2^63/9
    let series = 1_317_624_576_693_539_401_i64.wrapping_add(about_high_i64(square, series) >> 8); // 2^63/7
    let series = 1_844_674_407_370_955_162_i64.wrapping_add(about_high_i64(square, series) >> 8); // 2^63/5
    let series = 3_074_457_345_618_258_603_i64.wrapping_add(about_high_i64(square, series) >> 8); // 2^63/3
    let bend = about_high_i64(square, series); // 71 fraction bits
    let magnitude = (parts.mantissa as i64) << 39;
    let value = magnitude.wrapping_add(about_high_i64(magnitude, bend) >> 7);
    normal(value as u64, parts.exponent.wrapping_add(24))
}
