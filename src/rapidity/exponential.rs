//! Exponential in 64 bits: factor, offset from one and velocity ratio of a rapidity.
//!
//! exp(x) = 2^k 2^(j/128) (1 + q) with q = exp(r) - 1, where x = (128 k + j) ln 2 / 128 + r and
//! |r| < 2^-8.5. The table holds 71 bits of 2^(j/128), and sums carry 8 bits below the word, so that what
//! is left of a difference from one still has 60 good bits.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "constants of a format less one another: shifts by 1 to 15 places"
)]
#![allow(clippy::indexing_slicing, reason = "seven bits index 128 entries")]
#![allow(
    clippy::cast_possible_truncation,
    reason = "a word is cut out on purpose, and counts of bits are below 64"
)]

use super::coefficients::{EXPONENTIAL_RESTS, EXPONENTIALS, RECIPROCALS};
use super::wide_product::{about_high_i64, high_i32, high_i64_i32, high_u64};

/// 128 / ln 2 with 18 fraction bits.
const STEPS: i32 = 48_408_813;
/// ln 2 / 128 with 70 fraction bits ...
const STEP_HIGH: i64 = 6_393_154_322_601_327_829;
/// ... and the next 32.
const STEP_LOW: i64 = 3_841_055_180;

/// `high` 2^(exponent - 63) + `low` 2^(exponent - 71), where `high` 2^-63 is in [0.997, 1.995).
#[derive(Clone, Copy)]
pub(crate) struct Power {
    pub high: u64,
    low: u64,
    pub exponent: i32,
}

/// exp(x) of x with 60 or 59 fraction bits.
const fn power<const FRACTION_BITS: u32>(x: i64) -> Power {
    // x >> 32 times 128/ln 2 has FRACTION_BITS - 46 fraction bits in the high word.
    let steps = high_i32((x >> 32) as i32, STEPS);
    let steps = steps.wrapping_add(1 << (FRACTION_BITS - 47)) >> (FRACTION_BITS - 46);
    power_near(steps, x << (70 - FRACTION_BITS), 0)
}

/// 128 / ln 2 times a number, in whole steps, of a number with 32 fraction bits in a word.
pub(crate) const fn steps_of_half(x: i32) -> i32 {
    high_i32(x, STEPS).wrapping_add(1 << 17) >> 18
}

/// 2^(`more`/128) exp(x) of x modulo 2^-6 with 70 fraction bits, where x is within 0.7 of `steps` ln 2 / 128.
pub(crate) const fn power_near(steps: i32, x: i64, more: i32) -> Power {
    let whole = x.wrapping_sub((steps as i64).wrapping_mul(STEP_HIGH));
    // Both terms wrap; their difference, below 2^-8.5, does not.
    let low = (steps as i64).wrapping_mul(STEP_LOW).wrapping_add(1 << 31) >> 32;
    let remainder = whole.wrapping_sub(low);
    power_of(steps.wrapping_add(more), remainder)
}

/// 2^(steps/128) exp(r), r with 70 fraction bits, |r| < 2^-8.5.
///
/// Error in units of 2^-70 2^exponent: r 0.5, its product with the series 0.5 and 0.4, all three times the table
/// (1 to 2); the last product 1; the table 0.5. At most 4.3, 2.9 near a power of two from above.
const fn power_of(steps: i32, remainder: i64) -> Power {
    let index = (steps & 0x7f) as usize;
    let table = EXPONENTIALS[index];
    let bend = about_high_i64(remainder, series(remainder)).wrapping_add(1 << 5) >> 6;
    // exp(r) - 1 with 71 fraction bits, its product with the table with 70, below 2^62.6.
    let offset = remainder.wrapping_add(bend) << 1;
    let product = high_u64(table, offset as u64).wrapping_sub(table & (offset >> 63) as u64) as i64;
    let low = (((product & 0x7f) << 1) as u64).wrapping_add(EXPONENTIAL_RESTS[index] as u64);
    Power {
        high: table.wrapping_add((product >> 7) as u64).wrapping_add(low >> 8),
        low: low & 0xff,
        exponent: steps >> 7,
    }
}

/// (exp(r) - 1)/r - 1 with 70 fraction bits, of r with 70 fraction bits, |r| < 2^-8.5; error below 2^-63, below
/// 2^-65 for |r| < 2^-8.9.
///
/// r (1/2 + r (1/6 + r (1/24 + r (1/120 + r/720)))); the first left out, r^6/5040, is 2^-63.3 and 2^-65.7. A step of
/// a scale loses at most one unit of it, and each product with r divides that by 2^8.5.
const fn series(remainder: i64) -> i64 {
    // The high word has 38 fraction bits, so its product with 27 has 33.
    let high = (remainder >> 32) as i32;
    let tail = 71_582_788_i32.wrapping_add(high_i32(high, 186_414)); // 2^33/120 + r 2^27/720
    let tail = 384_307_168_202_282_325_i64.wrapping_add(high_i64_i32(remainder, tail) >> 8); // 2^63/24
    let sixth = 1_537_228_672_809_129_301_i64.wrapping_add(about_high_i64(remainder, tail) >> 6); // 2^63/6
    let half = (1_i64 << 62).wrapping_add(about_high_i64(remainder, sixth) >> 6); // 2^63/2
    about_high_i64(remainder, half) << 1
}

/// A value rounded to 61 significant bits: `mantissa` 2^(exponent - 60), mantissa in [2^60, 2^61).
pub(crate) struct Rounded {
    pub mantissa: u64,
    pub exponent: i32,
}

/// `value` 2^(exponent - 63), `value` not zero, to the nearest.
const fn rounded(value: u64, exponent: i32) -> Rounded {
    let shift = value.leading_zeros();
    let value = value << shift;
    let mantissa = (value >> 3).wrapping_add((value >> 2) & 1);
    let carry = mantissa >> 61;
    Rounded {
        mantissa: mantissa >> carry,
        exponent: exponent.wrapping_sub(shift as i32).wrapping_add(carry as i32),
    }
}

/// exp(x) of x with 60 fraction bits.
///
/// Error: at most 0.52 units of the mantissa: rounding 0.5, `power_of` 2^-67; `low` is cut off before rounding, which
/// changes nothing.
pub(crate) const fn factor(x: i64) -> Rounded {
    factor_of_power(power::<60>(x))
}

/// A power, rounded.
pub(crate) const fn factor_of_power(power: Power) -> Rounded {
    let shift = (power.high >> 63) ^ 1;
    let value = power.high << shift;
    // 1.995 2^60 at most where the shift is 0, else just below 2^61, which rounding may reach.
    let mantissa = (value >> 3).wrapping_add((value >> 2) & 1);
    let carry = mantissa >> 61;
    Rounded {
        mantissa: mantissa >> carry,
        exponent: power.exponent.wrapping_sub(shift as i32).wrapping_add(carry as i32),
    }
}

/// |exp(x) - 1| of x with 60 fraction bits, x not zero.
///
/// Error: at most 0.85 units of the mantissa. Small ones: rounding 0.5, the last product 0.25, the series 0.03.
/// Others: rounding 0.5; `power_of` 2.9 2^-70 on a value of 2^-7 with units of 2^-67, 0.36 (0.27 below one), less for
/// all larger ones.
pub(crate) const fn offset_magnitude(x: i64) -> Rounded {
    /// A little above 2^-7, so that exp(x) - 1 is 2^-7 and more in size from here on.
    const SMALL: u64 = (1 << 53) + (1 << 46);
    if x.unsigned_abs() < SMALL {
        return small_offset_magnitude(x);
    }
    let normal = offset_of_power(power::<60>(x), x < 0);
    rounded(normal.value, normal.exponent)
}

/// `value` 2^(exponent - 63) with the top bit set.
#[derive(Clone, Copy)]
pub(crate) struct Normal {
    pub value: u64,
    pub exponent: i32,
}

/// |P - 1| of a power, at least 2^-7.1; `negative` where P is below one.
pub(crate) const fn offset_of_power(power: Power, negative: bool) -> Normal {
    if power.exponent <= -2 {
        // 1 - P in (1/2, 1), with 64 fraction bits; the one is 2^64 and falls off.
        let shift = power.exponent.unsigned_abs().wrapping_sub(1);
        return Normal { value: power.high.unbounded_shr(shift).wrapping_neg(), exponent: -1 };
    }
    // P - 1 in units of 2^(exponent - 63): in the word for exponents from -1 (where the one is 2^64 and falls
    // off) up; beyond 63 the one is too small to matter.
    let one = 1_u64.unbounded_shl(63_u32.wrapping_sub(power.exponent as u32));
    let difference = power.high.wrapping_sub(one);
    let (high, low) = if negative {
        ((!difference).wrapping_add((power.low == 0) as u64), 256_u64.wrapping_sub(power.low) & 0xff)
    } else {
        (difference, power.low)
    };
    let shift = high.leading_zeros();
    Normal {
        value: high << shift | ((low << shift) >> 8),
        exponent: power.exponent.wrapping_sub(shift as i32),
    }
}

/// |exp(x) - 1| for |x| < 2^-6.9.
const fn small_offset_magnitude(x: i64) -> Rounded {
    let shift = x.unsigned_abs().leading_zeros().wrapping_sub(1);
    let value = small_offset(x << 8, (x.unsigned_abs() << shift) as i64);
    rounded(value, 3_i32.wrapping_sub(shift as i32))
}

/// `magnitude` (exp(x) - 1)/x for |x| < 2^-6.9, where `magnitude` is in [2^62, 2^63) and `quarter` is x/4 with 70
/// fraction bits: (1 + p)(1 + q1/2)(1 + q2/2), where q1 = exp(x/4) - 1 = x/4 (1 + p) and
/// q2 = exp(x/2) - 1 = 2 q1 + q1^2.
pub(crate) const fn small_offset(quarter: i64, magnitude: i64) -> u64 {
    let p = series(quarter);
    let first = quarter.wrapping_add(about_high_i64(quarter, p) >> 6);
    let second = (first << 1).wrapping_add(about_high_i64(first, first) >> 6);
    let bend = one_plus_product(one_plus_product(p, first >> 1), second >> 1);
    magnitude.wrapping_add(about_high_i64(magnitude, bend).wrapping_add(1 << 5) >> 6) as u64
}

/// (1 + a)(1 + b) - 1, all with 70 fraction bits and below 2^-7.
const fn one_plus_product(a: i64, b: i64) -> i64 {
    a.wrapping_add(b).wrapping_add(about_high_i64(a, b) >> 6)
}

/// tanh(|x|) with 63 fraction bits of x with 60.
///
/// tanh = 2/(1 + X) - 1 with X = exp(-2|x|); 1/(1 + X) = r (1 + y), where r is a table's reciprocal,
/// z = r (1 + X) - 1 is exact to 2^-70 and y = -z + z^2 - z^3 + ...
///
/// Error: at most 0.6 units of 2^-63: rounding of the last sum 0.5, X 2^-68, z 2^-68, y 2^-67.
pub(crate) const fn tanh_magnitude(x: i64) -> u64 {
    let magnitude = x.saturating_abs();
    let tanh = tanh_of_power(power::<59>(magnitude.wrapping_neg()));
    if x == 0 { 0 } else { tanh }
}

/// (1 - X)/(1 + X) with 63 fraction bits of a power below one.
pub(crate) const fn tanh_of_power(power: Power) -> u64 {
    // X = high 2^(exponent - 63); its part below 2^-63, 7 bits of it.
    let shift = power.exponent.unsigned_abs();
    let below = power.high & (1_u64 << shift).wrapping_sub(1);
    let fraction = (below << 8 | power.low) >> shift.wrapping_add(1);
    // 1 + X, which only X = 1 takes to 2, where the word ends.
    reciprocal((1_u64 << 63).saturating_add(power.high >> shift), fraction).wrapping_sub(1 << 63)
}

/// 1/d with 64 fraction bits of d in [1, 2) with 63 fraction bits and 7 more.
pub(crate) const fn reciprocal(d: u64, fraction: u64) -> u64 {
    let r = RECIPROCALS[((d >> 56) & 0x7f) as usize] as u64;
    let z = ((d >> 32).wrapping_mul(r) << 23)
        .wrapping_add((d as u32 as u64).wrapping_mul(r) >> 9)
        .wrapping_add(fraction.wrapping_mul(r) >> 16) as i64;
    let y = reciprocal_offset(z);
    // r (1 + y) with 64 fraction bits; r has 16, y has 70.
    let high = (y >> 32).wrapping_mul(r as i64) << 10;
    let low = (y as u32 as i64).wrapping_mul(r as i64).wrapping_add(1 << 21) >> 22;
    (r << 48).wrapping_add(high.wrapping_add(low) as u64)
}

/// 1/(1 + z) - 1 with 70 fraction bits, |z| < 2^-8; error below 2^-67.
///
/// -z + z^2 (1 - z (1 - z (1 - z (1 - z (1 - z (1 - z))))))
const fn reciprocal_offset(z: i64) -> i64 {
    let high = (z >> 32) as i32;
    let tail = (1_i32 << 18).wrapping_sub(high_i32(high, 1 << 12)); // 1 - z
    let tail = (1_i32 << 24).wrapping_sub(high_i32(high, tail)); // 1 - z (...)
    let tail = (1_i32 << 30).wrapping_sub(high_i32(high, tail));
    let inner = (1_i64 << 62).wrapping_sub(high_i64_i32(z, tail) >> 6);
    let inner = (1_i64 << 62).wrapping_sub(about_high_i64(z, inner) >> 6);
    let inner = (1_i64 << 62).wrapping_sub(about_high_i64(z, inner) >> 6);
    let square = about_high_i64(z, z); // 76 fraction bits
    (about_high_i64(square, inner) >> 4).wrapping_sub(z)
}
