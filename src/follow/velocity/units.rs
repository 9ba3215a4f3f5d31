//! Between fixed-point rapidity, delay and time, and f32 metres and seconds.
//!
//! Levels (rapidity, delay, time) stay in fixed point; only differences and rates are f32. All f32
//! work in the filter is + - * / and square root, each correctly rounded everywhere, so the bits are
//! the same with and without a floating-point unit.

use crate::time::GpsTime;

/// One, in I4F60 rapidity.
const RAPIDITY_ONE: f32 = (1u64 << 60) as f32;
/// 2^60 / c: I4F60 rapidity per m/s.
const RAPIDITY_PER_SPEED: f32 = RAPIDITY_ONE / 299_792_458.0;
/// c / 2^60: m/s per step of I4F60 rapidity.
const SPEED_PER_RAPIDITY: f32 = 299_792_458.0 / RAPIDITY_ONE;
/// 2^56 / c: steps of delay per metre.
const DELAY_PER_METRE: f32 = (1u64 << 56) as f32 / 299_792_458.0;
/// Seconds per step of time.
const SECONDS_PER_STEP: f32 = 1.0 / (1u64 << GpsTime::FRACTION_BITS) as f32;

/// Steps of time from one instant to another, saturating.
pub(super) const fn steps(from: GpsTime, to: GpsTime) -> i64 {
    to.to_bits().saturating_sub(from.to_bits())
}

/// Seconds from one instant to another.
pub(super) fn seconds(from: GpsTime, to: GpsTime) -> f32 {
    steps(from, to) as f32 * SECONDS_PER_STEP
}

/// Receding speed of a rapidity difference, m/s (differences are small: c times the rapidity).
pub(super) fn speed_from_rapidity(bits: i64) -> f32 {
    bits as f32 * -SPEED_PER_RAPIDITY
}

/// Rapidity, or its rate, of a receding speed or acceleration.
#[allow(clippy::cast_possible_truncation, reason = "a float becomes the nearest integer in range")]
pub(super) fn rapidity_from_speed(speed: f32) -> i64 {
    (speed * -RAPIDITY_PER_SPEED) as i64
}

/// Delay of a distance.
#[allow(clippy::cast_possible_truncation, reason = "a float becomes the nearest integer in range")]
pub(super) fn delay_from_metres(metres: f32) -> i64 {
    (metres * DELAY_PER_METRE) as i64
}

/// Delay gathered over a time by a rapidity that starts at `level` and grows by `growth`, behind a
/// table of rapidity `ahead`. The slope is exp(ahead) (1 - exp(level)) = -level - level^2/2 - level^3/6 -
/// level ahead + ...; the first term is without the growth (its distance is added by the caller), the
/// others are means over a straight growth: mean(level^2) = middle^2 + growth^2/12.
#[allow(clippy::cast_possible_truncation, reason = "below 2^-10, which `step` checks, they fit")]
pub(super) fn delay_of_level(level: i64, growth: i64, ahead: i64, steps: i64) -> i64 {
    // With 41 fraction bits rapidities below 2^-10 fit 32; a product of two has 82, then 60.
    let product = |a: i32, b: i32| i64::from(a).wrapping_mul(i64::from(b)) >> 22;
    let middle = (level.wrapping_add(growth >> 1) >> 19) as i32;
    let grown = (growth >> 19) as i32;
    let square = product(middle, middle);
    let cube = product(middle, (square >> 19) as i32);
    // (middle^2 + growth^2/12)/2 + middle^3/6 + middle ahead; 1/6 and 1/24 with 16 fraction bits.
    let cross = product(middle, (ahead >> 19) as i32).wrapping_add(square >> 1);
    let small = cube.wrapping_mul(10_923).wrapping_add(product(grown, grown).wrapping_mul(2_731)) >> 16;
    let slope = level.wrapping_add(cross).wrapping_add(small);
    // 2^60 rapidity times 2^30 s is 2^90; delay has 56 fraction bits. The product in three parts.
    let (low, high) = (steps & 0xffff_ffff, steps >> 32);
    let below = (slope & 0xffff_ffff).cast_unsigned().wrapping_mul(low.cast_unsigned()) >> 32;
    let above = (slope >> 32).wrapping_mul(low).wrapping_add(slope.wrapping_mul(high));
    (above.wrapping_add(below.cast_signed()) >> 2).wrapping_neg()
}
