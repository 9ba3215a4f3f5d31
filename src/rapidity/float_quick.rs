//! Quick first tries of the float functions, in 32-bit arithmetic good to about 2^-35.
//!
//! A result so close to the middle between two floats that its error could move it across is not given; then the
//! functions of [`super::float_32`] go on in 64 bits. That happens for one float in 128.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "constants of a format less one another: shifts by 8 to 13 places"
)]
#![allow(clippy::indexing_slicing, reason = "seven bits index 128 entries")]
#![allow(
    clippy::cast_possible_truncation,
    reason = "a word is cut out on purpose, or the bound beside it keeps the value inside"
)]

use super::coefficients::{LOGARITHMS, RECIPROCALS};
use super::fixed_32::{
    Power32, STEP_HIGH, STEP_LOW, STEPS, logarithm_of_one_plus, offset_of_power, power_from_steps, small_bend,
};
use super::float_32::Parts;
use super::wide_product::{high_i32, high_square_i32, middle_u32_u16, product_i32};

/// `value` 2^(exponent - 31), good to half a unit and cut off, as the nearest float, where the value is not within a
/// unit of the middle between two. The top bit of the value is set; the float is a normal one.
#[inline(always)]
const fn clear(value: u32, exponent: i32, sign: u32) -> Option<f32> {
    // The eight bits cut off are 127 or 128: in doubt.
    if value.wrapping_add(1) & 0xfe == 0x80 {
        return None;
    }
    let biased = exponent.wrapping_add(126) as u32;
    let kept = (value >> 8).wrapping_add((value >> 7) & 1);
    Some(f32::from_bits(sign | (biased << 23).wrapping_add(kept)))
}

/// Top word of `value` 2^(exponent - 63), shifted up until its top bit is set; the high word is not zero.
#[inline(always)]
const fn clear_top(value: u64, exponent: i32, sign: u32) -> Option<f32> {
    let (high, low) = ((value >> 32) as u32, value as u32);
    let shift = high.leading_zeros() & 31;
    clear(high << shift | (low >> 1) >> (31 - shift), exponent.wrapping_sub(shift as i32), sign)
}

/// A power as a float.
#[inline(always)]
const fn clear_power(power: Power32) -> Option<f32> {
    let (high, low) = ((power.mantissa >> 32) as u32, power.mantissa as u32);
    let short = high >> 31 == 0;
    let value = if short { high << 1 | low >> 31 } else { high };
    clear(value, power.exponent.wrapping_sub(short as i32), 0)
}

/// exp(x) of |x| < 127, times 2^`DOUBLINGS`, from 2^-25 where it may be `SMALL`, else from 2^-5; within 2^-37.
#[inline(always)]
const fn power<const DOUBLINGS: i32, const SMALL: bool>(parts: Parts, sign: u32) -> Power32 {
    /// 128 / ln 2 with 22 fraction bits.
    const STEPS: i32 = 774_541_002;
    let mantissa = if sign == 0 { parts.mantissa as i32 } else { (parts.mantissa as i32).wrapping_neg() };
    let exponent = parts.exponent.wrapping_add(DOUBLINGS);
    // With 24 fraction bits, then with 39; what lies beyond the word falls off.
    let coarse = (mantissa << 7) >> ((-17_i32).wrapping_sub(exponent) as u32 & 31);
    let fine = if !SMALL || exponent >= -39 {
        mantissa << (exponent.wrapping_add(39) as u32 & 31)
    } else {
        mantissa >> ((-39_i32).wrapping_sub(exponent) as u32 & 31)
    };
    let steps = high_i32(coarse, STEPS).wrapping_add(1 << 13) >> 14;
    let remainder =
        fine.wrapping_sub(steps.wrapping_mul(STEP_HIGH)).wrapping_sub(steps.wrapping_mul(STEP_LOW) >> 16);
    power_from_steps::<false>(steps, remainder)
}

/// exp(r), 2^-25 <= |r| < 87.
#[inline(always)]
pub(super) const fn factor_of_rapidity(parts: Parts, sign: u32) -> Option<f32> {
    let power = power::<0, true>(parts, sign);
    clear_power(power)
}

/// `mantissa` 2^`exponent` with `BITS` fraction bits in a word, cut off, at most 2^(BITS - 31) in size.
#[inline(always)]
const fn fixed<const BITS: i32>(parts: Parts) -> i32 {
    // The largest exponent is 7 - BITS.
    let cut = (7 - BITS).wrapping_sub(parts.exponent) as u32;
    (parts.mantissa << 7).unbounded_shr(cut) as i32
}

/// x (1 + bend), the bend with 36 fraction bits, |bend| < 1/8.
#[inline(always)]
const fn scaled(parts: Parts, bend: i32, sign: u32) -> Option<f32> {
    let mantissa = (parts.mantissa << 7) as i32;
    // 62 fraction bits.
    let value = (((mantissa as i64) << 32).wrapping_add(product_i32(mantissa, bend) >> 4)) as u64;
    clear_top(value, parts.exponent.wrapping_add(24), sign)
}

/// exp(r) - 1, 2^-25 <= |r| < 18, `small` where |r| < 0.0586.
#[inline(always)]
pub(super) const fn offset_of_rapidity(parts: Parts, sign: u32, small: bool) -> Option<f32> {
    if small {
        let r = fixed::<35>(parts);
        return scaled(parts, small_bend(if sign == 0 { r } else { r.wrapping_neg() }), sign);
    }
    let power = power::<0, false>(parts, sign);
    let (value, exponent) = offset_of_power(power, sign != 0);
    clear_top(value, exponent, sign)
}

/// tanh(r), 2^-12 <= |r| < 9.5.
#[inline(always)]
pub(super) const fn beta_of_rapidity(parts: Parts, sign: u32) -> Option<f32> {
    if parts.exponent <= -27 {
        // Below 1/8 r (1 - u/3 + 2 u^2/15 - 17 u^3/315 + 62 u^4/2835 - 1382 u^5/155925), u = r^2.
        let r = fixed::<34>(parts);
        let square = high_square_i32(r); // 36 fraction bits; each step adds 4 to the scale
        let series = 22_932_i32.wrapping_add(high_i32(square, -581)); // 2^20 62/2835 - u 2^16 1382/155925
        let series = (-905_437_i32).wrapping_add(high_i32(square, series));
        let series = 35_791_394_i32.wrapping_add(high_i32(square, series));
        let series = (-1_431_655_765_i32).wrapping_add(high_i32(square, series));
        return scaled(parts, high_i32(square, series), sign);
    }
    let power = power::<1, false>(parts, 1 << 31);
    let sum = (1_u64 << 63).saturating_add(power.mantissa >> power.exponent.unsigned_abs());
    let (reciprocal, z) = reduced(sum);
    // y = 1/(1 + z) - 1 = -z + z^2 (1 - z + z^2), and r (1 + y) with 16 + 39 fraction bits.
    let square = high_square_i32(z); // 46 fraction bits
    let slope = (z >> 7).wrapping_sub(square >> 14); // 32 fraction bits
    let y = (square.wrapping_sub(high_i32(square, slope)) >> 7).wrapping_sub(z);
    let half = ((reciprocal as i64) << 39).wrapping_add(product_i32(y, reciprocal));
    // 2/(1 + X) - 1 with 54 fraction bits, then with 63.
    clear_top((half.wrapping_sub(1 << 54) as u64) << 9, 0, sign)
}

/// A reciprocal r with 16 fraction bits and r m - 1 with 39, of m in [1, 2) with 63 fraction bits.
#[inline(always)]
const fn reduced(m: u64) -> (i32, i32) {
    let reciprocal = RECIPROCALS[((m >> 56) & 0x7f) as usize];
    let low = ((m as u32 >> 16).wrapping_mul(reciprocal as u32) >> 24) as i32;
    (reciprocal as i32, (middle_u32_u16((m >> 32) as u32, reciprocal) as i32).wrapping_add(low))
}

/// ln((1 + b)/(1 - b)) / 2, 2^-26 <= b < 1: the number of ln 2 / 2, and the rest with 40 fraction bits.
#[inline(always)]
const fn half_logarithm(parts: Parts) -> (i32, i64) {
    const ONE: u64 = 1 << 63;
    let beta = (parts.mantissa as u64) << (parts.exponent.wrapping_add(63) as u32 & 63);
    let (above, below) = (ONE.wrapping_add(beta), ONE.wrapping_sub(beta));
    let exponent = below.leading_zeros();
    let below = below << exponent;
    // 39 fraction bits of the logarithm are 40 of its half.
    let table = LOGARITHMS[((above >> 56) & 0x7f) as usize]
        .wrapping_sub(LOGARITHMS[((below >> 56) & 0x7f) as usize]) as i64
        >> 24;
    let series = (logarithm_of_one_plus(reduced(above).1) as i64)
        .wrapping_sub(logarithm_of_one_plus(reduced(below).1) as i64);
    (exponent as i32, table.wrapping_add(series))
}

/// atanh(b), 2^-12 <= |b| < 1.
#[inline(always)]
pub(super) const fn rapidity_of_beta(parts: Parts, sign: u32) -> Option<f32> {
    if parts.exponent <= -27 {
        // Below 1/8 b (1 + u/3 + u^2/5 + u^3/7 + u^4/9 + u^5/11), u = b^2.
        let b = fixed::<34>(parts);
        let square = high_square_i32(b); // 36 fraction bits; each step adds 4 to the scale
        let series = 116_508_i32.wrapping_add(high_i32(square, 5_958)); // 2^20/9 + u 2^16/11
        let series = 2_396_745_i32.wrapping_add(high_i32(square, series));
        let series = 53_687_091_i32.wrapping_add(high_i32(square, series));
        let series = 1_431_655_765_i32.wrapping_add(high_i32(square, series));
        return scaled(parts, high_i32(square, series), sign);
    }
    /// ln 2 / 2 with 40 fraction bits.
    const HALF_LN_2: i64 = 381_061_692_393;
    let (exponent, fraction) = half_logarithm(parts);
    let value = (exponent as i64).wrapping_mul(HALF_LN_2).wrapping_add(fraction) as u64;
    clear_top(value << 20, 3, sign)
}

/// sqrt((1 + b)/(1 - b)), 2^-26 <= |b| < 1.
#[inline(always)]
pub(super) const fn factor_of_beta(parts: Parts, sign: u32) -> Option<f32> {
    let (exponent, fraction) = half_logarithm(parts);
    let (exponent, fraction) =
        if sign == 0 { (exponent, fraction) } else { (exponent.wrapping_neg(), fraction.wrapping_neg()) };
    let steps = ((fraction >> 24) as i32).wrapping_mul(STEPS).wrapping_add(1 << 22) >> 23;
    let remainder = ((fraction >> 1) as i32)
        .wrapping_sub(steps.wrapping_mul(STEP_HIGH))
        .wrapping_sub(steps.wrapping_mul(STEP_LOW) >> 16);
    // Half of ln 2 is 64 steps.
    let power = power_from_steps::<true>(steps.wrapping_add(exponent << 6), remainder);
    clear_power(power)
}
