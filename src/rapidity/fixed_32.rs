//! Full-range kernels in 32 bits: velocity ratios in I1F31, rapidities in I4F28.
//!
//! For general use, and for the floats of [`super::float_32`]. One step of I4F28 is 3.7e-9, 1.6 Hz at
//! 437 MHz: steering uses [`super::narrow`] or [`Rapidity`](super::Rapidity) instead.
//!
//! | function | of | gives |
//! |---|---|---|
//! | [`rapidity_of_beta`] | b | atanh(b) |
//! | [`beta_of_rapidity`] | r | tanh(r) |
//! | [`factor_of_rapidity`] | r | exp(r) |
//! | [`factor_of_beta`] | b | sqrt((1 + b)/(1 - b)) |
//! | [`offset_of_rapidity`] | r | exp(r) - 1 |
//!
//! No division, no loop. The worst error over all 2^32 inputs of each is in [`super::bounds`].
#![allow(
    clippy::arithmetic_side_effects,
    reason = "constants of a format less one another: shifts by 11 to 19 places"
)]
#![allow(clippy::indexing_slicing, reason = "seven bits index 128 entries")]
#![allow(
    clippy::cast_possible_truncation,
    reason = "a word is cut out on purpose, or the bound beside it keeps the value inside"
)]

use super::coefficients::{EXPONENTIALS, LOGARITHMS, RECIPROCALS};
use super::wide_product::{high_i32, high_square_i32, middle_u32_u16, product_i32};
use fixed::types::{I1F31, I4F28};

/// Received over transmitted frequency: `mantissa` 2^(`exponent` - 31), mantissa in [2^31, 2^32).
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct ShiftFactor32 {
    mantissa: u32,
    exponent: i32,
}

impl ShiftFactor32 {
    /// Fraction bits of the mantissa.
    pub const FRACTION_BITS: u32 = 31;

    /// The factor without its power of two: in [1, 2), 31 fraction bits.
    pub const fn mantissa(self) -> u32 {
        self.mantissa
    }

    /// The power of two.
    pub const fn exponent(self) -> i32 {
        self.exponent
    }
}

/// (Received over transmitted frequency) - 1: `mantissa` 2^(`exponent` - 28), the size of the mantissa in
/// [2^28, 2^29) or zero: 29 significant bits, as many as a rapidity of one has.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct ShiftOffset32 {
    mantissa: i32,
    exponent: i32,
}

impl ShiftOffset32 {
    /// Fraction bits of the mantissa.
    pub const FRACTION_BITS: u32 = 28;

    /// The offset without its power of two, signed: size in [1, 2) or zero, 28 fraction bits.
    pub const fn mantissa(self) -> i32 {
        self.mantissa
    }

    /// The power of two; 0 where the mantissa is zero.
    pub const fn exponent(self) -> i32 {
        self.exponent
    }
}

/// 128 / ln 2 with 7 fraction bits.
pub(super) const STEPS: i32 = 23_637;
/// ln 2 / 128 with 39 fraction bits, taken modulo 2^-7 ...
pub(super) const STEP_HIGH: i32 = 2_977_044_471_u32 as i32;
/// ... and the next 16.
pub(super) const STEP_LOW: i32 = 53_711;

/// `x` where `sign` is 0, -`x` where it is -1.
#[inline(always)]
const fn signed(x: i32, sign: i32) -> i32 {
    (x ^ sign).wrapping_sub(sign)
}

/// Row of the table of reciprocals and m r - 1 with 39 fraction bits, |z| < 2^-8, of m in [1, 2) with 31
/// fraction bits.
#[inline(always)]
const fn reduced(mantissa: u32) -> (usize, i32) {
    let index = ((mantissa >> 24) & 0x7f) as usize;
    // m r has 47 fraction bits; its one lies at 2^39 and falls off the word.
    (index, middle_u32_u16(mantissa, RECIPROCALS[index]) as i32)
}

/// ln(1 + z) with 39 fraction bits of z with 39, |z| < 2^-8; within one unit.
///
/// z - z^2/2 (1 - 2z/3 + z^2/2); the first left out, z^5/5, is a fifth of a unit.
#[inline(always)]
pub(super) const fn logarithm_of_one_plus(z: i32) -> i32 {
    let square = high_square_i32(z); // 46 fraction bits
    let slope = high_i32(z, 22_369_621).wrapping_sub(square >> 15); // z 2^25 2/3; 32 fraction bits
    let bent = square.wrapping_sub(high_i32(square, slope));
    z.wrapping_sub(bent.wrapping_add(1 << 7) >> 8)
}

/// ln((1 + b)/(1 - b)) / 2 for 0 <= b < 1 with 31 fraction bits: `exponent` ln 2 / 2 + `fraction` 2^-40.
struct HalfLogarithm {
    exponent: i32,
    fraction: i64,
}

#[inline(always)]
const fn half_logarithm_of_ratio(beta: u32) -> HalfLogarithm {
    const ONE: u32 = 1 << 31;
    let denominator = ONE.wrapping_sub(beta);
    let exponent = denominator.leading_zeros();
    let (above, z_above) = reduced(ONE.wrapping_add(beta));
    let (below, z_below) = reduced(denominator << exponent);
    // 39 fraction bits of the logarithm are 40 of its half.
    let table = LOGARITHMS[above].wrapping_sub(LOGARITHMS[below]) as i64 >> 24;
    let series = (logarithm_of_one_plus(z_above) as i64).wrapping_sub(logarithm_of_one_plus(z_below) as i64);
    HalfLogarithm { exponent: exponent as i32, fraction: table.wrapping_add(series) }
}

/// Rapidity of a velocity ratio: atanh(b).
///
/// `beta` is v/c, I1F31, positive = approaching; so is the rapidity, I4F28. From |b| = tanh(8) on, 483 steps
/// below one, and at -1 the result is the end of the format.
///
/// # Accuracy
/// [`super::bounds::RAPIDITY_OF_BETA_32`] units in the last place over all inputs
/// (`tests/rapidity_fixed_32.rs`).
///
/// # Cost
/// 10 products of 32 bits, 1.3 KiB of tables.
///
/// # Source
/// atanh(b) = (ln(1 + b) - ln(1 - b))/2, each by a table's reciprocal r: -ln r + ln(1 + (m r - 1)).
///
/// ```
/// use fixed::types::{I1F31, I4F28};
/// use shiftkeel::rapidity::fixed_32::rapidity_of_beta;
/// assert_eq!(rapidity_of_beta(I1F31::from_num(0.5)).to_bits(), 147_453_245); // ln(3)/2
/// assert_eq!(rapidity_of_beta(I1F31::MAX), I4F28::MAX);
/// ```
pub const fn rapidity_of_beta(beta: I1F31) -> I4F28 {
    /// 2^31 tanh(8), rounded up.
    const END: u32 = 2_147_483_165;
    /// ln 2 / 2 with 28 fraction bits, and what is missing with 40.
    const HALF_LN_2: i32 = 93_032_639;
    const HALF_LN_2_REST: i32 = 3_049;
    let bits = beta.to_bits();
    let sign = bits >> 31;
    let size = bits.unsigned_abs();
    if size >= END {
        return I4F28::from_bits(i32::MAX ^ sign);
    }
    let half = half_logarithm_of_ratio(size);
    let rest = half.exponent.wrapping_mul(HALF_LN_2_REST) as i64;
    let fraction = half.fraction.wrapping_add(rest).wrapping_add(1 << 11) >> 12;
    let result = half.exponent.wrapping_mul(HALF_LN_2).wrapping_add(fraction as i32);
    I4F28::from_bits(signed(result, sign))
}

/// `mantissa` 2^(exponent - 63), where `mantissa` 2^-63 is in [0.997, 1.995).
pub(super) struct Power32 {
    pub(super) mantissa: u64,
    pub(super) exponent: i32,
}

/// 2^(steps/128) exp(r), r with 39 fraction bits, |r| < 2^-8.3; within 1.7 units of 2^-39 of the value, 1.4 where
/// the table's word is rounded to the `NEAREST`.
#[inline(always)]
pub(super) const fn power_from_steps<const NEAREST: bool>(steps: i32, remainder: i32) -> Power32 {
    // -(1/3 + r/12) with 25 fraction bits, the twelfth as 1/16 + 1/64; negative, so that all products are of two
    // signed words. Then r (1 + r/3 + r^2/12) with 39 fraction bits.
    let third = (-11_184_811_i32).wrapping_sub(remainder >> 18).wrapping_sub(remainder >> 20);
    let bent = remainder.wrapping_sub(high_i32(remainder, high_i32(remainder, third)));
    // exp(r) - 1 = r + r/2 (...).
    let offset = remainder.wrapping_add(high_i32(remainder, bent) >> 8);
    let table = EXPONENTIALS[(steps & 0x7f) as usize];
    // table (exp(r) - 1) with 30 + 39 fraction bits.
    let short = ((table >> 32) as u32).wrapping_add(NEAREST as u32) >> 1;
    let product = product_i32(short as i32, offset);
    Power32 { mantissa: table.wrapping_add((product >> 6) as u64), exponent: steps >> 7 }
}

/// exp(x) of x with 28 or 27 fraction bits.
#[inline(always)]
const fn power<const FRACTION_BITS: u32, const NEAREST: bool>(x: i32) -> Power32 {
    let steps = (x >> 16).wrapping_mul(STEPS).wrapping_add(1 << (FRACTION_BITS - 10)) >> (FRACTION_BITS - 9);
    let remainder = (x << (39 - FRACTION_BITS))
        .wrapping_sub(steps.wrapping_mul(STEP_HIGH))
        .wrapping_sub(steps.wrapping_mul(STEP_LOW) >> 16);
    power_from_steps::<NEAREST>(steps, remainder)
}

/// A power rounded to 32 bits.
#[inline(always)]
const fn rounded(power: Power32) -> ShiftFactor32 {
    let (high, low) = ((power.mantissa >> 32) as u32, power.mantissa as u32);
    // Rounded first, so that what lies just below one becomes one and is not doubled beyond the word.
    let whole = high.wrapping_add(low >> 31);
    if whole >> 31 == 0 {
        let mantissa = whole.wrapping_add(high).wrapping_add((low >> 30) & 1);
        ShiftFactor32 { mantissa, exponent: power.exponent.wrapping_sub(1) }
    } else {
        ShiftFactor32 { mantissa: whole, exponent: power.exponent }
    }
}

/// Frequency factor of a rapidity: exp(r).
///
/// `rapidity` is I4F28, positive = approaching = a factor above one.
///
/// # Accuracy
/// [`super::bounds::FACTOR_OF_RAPIDITY_32`] units of the mantissa over all inputs
/// (`tests/rapidity_fixed_32.rs`).
///
/// # Cost
/// 7 products of 32 bits, 1 KiB of tables.
///
/// # Source
/// exp(x) = 2^k 2^(j/128) exp(r) with r below 2^-8.3 and exp(r) - 1 = r + r^2/2 (1 + r/3 + r^2/12).
///
/// ```
/// use fixed::types::I4F28;
/// use shiftkeel::rapidity::fixed_32::factor_of_rapidity;
/// let factor = factor_of_rapidity(I4F28::from_num(1));
/// assert_eq!((factor.mantissa(), factor.exponent()), (2_918_732_889, 1)); // e = 1.3591 * 2
/// ```
pub const fn factor_of_rapidity(rapidity: I4F28) -> ShiftFactor32 {
    rounded(power::<28, false>(rapidity.to_bits()))
}

/// Frequency factor of a velocity ratio: sqrt((1 + b)/(1 - b)).
///
/// `beta` is v/c, I1F31, positive = approaching = a factor above one. At -1 the factor is zero (mantissa 0).
///
/// # Accuracy
/// [`super::bounds::FACTOR_OF_BETA_32`] units of the mantissa over all inputs
/// (`tests/rapidity_fixed_32.rs`).
///
/// # Cost
/// 17 products of 32 bits, 2.3 KiB of tables.
///
/// # Source
/// exp(atanh(b)), the logarithm with 39 fraction bits and its multiple of ln 2 / 2 exactly.
///
/// ```
/// use fixed::types::I1F31;
/// use shiftkeel::rapidity::fixed_32::factor_of_beta;
/// let factor = factor_of_beta(I1F31::from_num(0.6)); // 2
/// assert_eq!(factor.exponent(), 1);
/// assert!(factor.mantissa() - (1 << 31) < 4); // 0.6 in 31 bits is 0.2 steps high
/// ```
pub const fn factor_of_beta(beta: I1F31) -> ShiftFactor32 {
    let bits = beta.to_bits();
    if bits == i32::MIN {
        return ShiftFactor32 { mantissa: 0, exponent: 0 };
    }
    let sign = bits >> 31;
    let half = half_logarithm_of_ratio(bits.unsigned_abs());
    let coarse = signed((half.fraction >> 8) as i32, sign);
    let steps = (coarse >> 16).wrapping_mul(STEPS).wrapping_add(1 << 22) >> 23;
    // The whole steps of the fraction lie beyond the word and fall off.
    let remainder = signed((half.fraction.wrapping_add(1) >> 1) as i32, sign)
        .wrapping_sub(steps.wrapping_mul(STEP_HIGH))
        .wrapping_sub(steps.wrapping_mul(STEP_LOW) >> 16);
    // Half of ln 2 is 64 steps.
    rounded(power_from_steps::<true>(steps.wrapping_add(signed(half.exponent << 6, sign)), remainder))
}

/// Velocity ratio of a rapidity: tanh(r).
///
/// `rapidity` is I4F28, positive = approaching; so is the result, I1F31.
///
/// # Accuracy
/// [`super::bounds::BETA_OF_RAPIDITY_32`] units in the last place over all inputs
/// (`tests/rapidity_fixed_32.rs`).
///
/// # Cost
/// 12 products of 32 bits, 1.3 KiB of tables.
///
/// # Source
/// tanh(r) = 2/(1 + X) - 1, X = exp(-2|r|); the reciprocal is one of a table times 1 - z + z^2 - z^3 + z^4.
///
/// ```
/// use fixed::types::{I1F31, I4F28};
/// use shiftkeel::rapidity::fixed_32::beta_of_rapidity;
/// assert_eq!(beta_of_rapidity(I4F28::from_num(-0.5)).to_bits(), -992_389_039);
/// ```
pub const fn beta_of_rapidity(rapidity: I4F28) -> I1F31 {
    let bits = rapidity.to_bits();
    let sign = bits >> 31;
    let power = power::<27, false>(bits.saturating_abs().wrapping_neg());
    // X with 63 fraction bits, 39 of them good.
    let x = power.mantissa >> power.exponent.unsigned_abs();
    let sum = (1_u64 << 63).saturating_add(x);
    let (index, z) = reduced((sum >> 32) as u32);
    let reciprocal = RECIPROCALS[index] as u32;
    let z = z.wrapping_add(((sum as u32 >> 16).wrapping_mul(reciprocal) >> 24) as i32);
    // y = 1/(1 + z) - 1 = -z + z^2 (1 - z + z^2).
    let square = high_square_i32(z); // 46 fraction bits
    let slope = (z >> 7).wrapping_sub(square >> 14); // 32 fraction bits
    let bent = square.wrapping_sub(high_i32(square, slope));
    let y = (bent.wrapping_add(1 << 5) >> 7).wrapping_sub(z);
    // r y with 38 fraction bits; what is cut off does not matter to the rounding.
    let product = high_i32(y, (reciprocal << 15) as i32);
    let size =
        ((reciprocal << 16) as i32).wrapping_add(product.wrapping_add(1 << 5) >> 6).wrapping_add(i32::MIN);
    let size = if bits == 0 { 0 } else { size };
    I1F31::from_bits(signed(size, sign))
}

/// `value` 2^(exponent - 63) to the nearest 29 bits, with a sign of 0 or -1; the high word is not zero.
#[inline(always)]
const fn rounded_offset(value: u64, exponent: i32, sign: i32) -> ShiftOffset32 {
    let (high, low) = ((value >> 32) as u32, value as u32);
    let shift = high.leading_zeros() & 31;
    let top = high << shift | (low >> 1) >> (31 - shift);
    let mantissa = (top >> 3).wrapping_add((top >> 2) & 1);
    let carry = mantissa >> 29;
    ShiftOffset32 {
        mantissa: signed((mantissa >> carry) as i32, sign),
        exponent: exponent.wrapping_sub(shift as i32).wrapping_add(carry as i32),
    }
}

/// |P - 1| of a power as `value` 2^(exponent - 63), at least 0.056; `negative` where P is below one. P is from 2^-30
/// to 2^31.
#[inline(always)]
pub(super) const fn offset_of_power(power: Power32, negative: bool) -> (u64, i32) {
    let (high, low) = ((power.mantissa >> 32) as u32, power.mantissa as u32);
    if negative {
        // 1 - P with 64 fraction bits; the one is 2^64 and falls off.
        let shift = power.exponent.wrapping_add(1).wrapping_neg() as u32 & 31;
        let low = low >> shift | (high << 1) << (31 - shift);
        ((((high >> shift) as u64) << 32 | low as u64).wrapping_neg(), -1)
    } else {
        let one = (1_u32 << 31) >> (power.exponent as u32 & 31);
        ((high.wrapping_sub(one) as u64) << 32 | low as u64, power.exponent)
    }
}

/// Offset from one of the frequency factor: exp(r) - 1.
///
/// `rapidity` is I4F28, positive = approaching = a positive offset.
///
/// # Accuracy
/// [`super::bounds::OFFSET_OF_RAPIDITY_32`] units of the mantissa over all inputs
/// (`tests/rapidity_fixed_32.rs`).
///
/// # Cost
/// 7 products of 32 bits, 1 KiB of tables; two branches, on the size and the sign of the rapidity.
///
/// # Source
/// Below 0.0586 r (1 + r/2 + r^2/6 + ... + r^5/720), above the factor with 7 more bits less one.
///
/// ```
/// use fixed::types::I4F28;
/// use shiftkeel::rapidity::fixed_32::offset_of_rapidity;
/// let offset = offset_of_rapidity(I4F28::from_bits(-1)); // the smallest
/// assert_eq!((offset.mantissa(), offset.exponent()), (1 - (1 << 29), -29));
/// ```
pub const fn offset_of_rapidity(rapidity: I4F28) -> ShiftOffset32 {
    /// 0.0586, so that r/2 + r^2/6 fits a word with 36 fraction bits.
    const SMALL: i32 = 15 << 20;
    let bits = rapidity.to_bits();
    if (bits.wrapping_add(SMALL) as u32) < 2 * SMALL as u32 {
        return small_offset(bits);
    }
    let power = power::<28, true>(bits);
    let (value, exponent) = offset_of_power(power, bits < 0);
    rounded_offset(value, exponent, bits >> 31)
}

/// (exp(r) - 1)/r - 1 with 36 fraction bits of r with 35, |r| up to 0.0586; within 2 units.
///
/// r/2 + r^2 (1/6 + r (1/24 + r (1/120 + r/720))); the first left out, r^6/5040, is half a unit.
#[inline(always)]
pub(super) const fn small_bend(r: i32) -> i32 {
    // All with the other sign, so that all products are of two signed words. Each step adds 3 to the scale:
    // 2^27/120 + r 2^24/720, 2^30/24 + ..., 2^33/6 + ...
    let tail = (-1_118_481_i32).wrapping_sub(high_i32(r, 23_302));
    let tail = (-44_739_243_i32).wrapping_add(high_i32(r, tail));
    let sixth = (-1_431_655_765_i32).wrapping_add(high_i32(r, tail));
    // r/2 + r^2 (...) with 36 fraction bits.
    r.wrapping_sub(high_i32(r, high_i32(r, sixth)).wrapping_sub(1 << 2) >> 3)
}

/// exp(r) - 1 for |r| up to 0.0586.
#[inline(always)]
const fn small_offset(bits: i32) -> ShiftOffset32 {
    if bits == 0 {
        return ShiftOffset32 { mantissa: 0, exponent: 0 };
    }
    let bend = small_bend(bits << 7);
    let size = bits.unsigned_abs();
    let shift = size.leading_zeros().wrapping_sub(1) & 31;
    let normal = size << shift;
    // The product has 30 + 36 fraction bits, the value 30; what is cut off does not matter to the rounding.
    let value = normal.wrapping_add((high_i32(normal as i32, bend) >> 4) as u32);
    rounded_offset((value as u64) << 32, 3_i32.wrapping_sub(shift as i32), bits >> 31)
}
