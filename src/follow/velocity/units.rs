//! Between fixed-point rapidity, delay and time, and f32 metres and seconds.
//!
//! Levels (rapidity, delay, time) stay in fixed point; only differences and rates are f32. All f32
//! work in the filter is + - * / and square root, each correctly rounded everywhere, so the bits are
//! the same with and without a floating-point unit.

use crate::time::GpsTime;

/// One, in I4F60 rapidity.
pub(super) const RAPIDITY_ONE: f32 = (1u64 << 60) as f32;
/// 2^60 / c: I4F60 rapidity per m/s.
const RAPIDITY_PER_SPEED: f32 = RAPIDITY_ONE / 299_792_458.0;
/// c / 2^60: m/s per step of I4F60 rapidity.
const SPEED_PER_RAPIDITY: f32 = 299_792_458.0 / RAPIDITY_ONE;
/// 2^56 / c: steps of delay per metre.
const DELAY_PER_METRE: f32 = (1u64 << 56) as f32 / 299_792_458.0;
/// Seconds per step of time.
const SECONDS_PER_STEP: f32 = 1.0 / (1u64 << GpsTime::FRACTION_BITS) as f32;

/// Product of two i64 shifted right, rounded down, wrapping.
pub(super) const fn mul_shift(a: i64, b: i64, shift: u32) -> i64 {
    ((a as i128 * b as i128) >> shift) as i64
}

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
pub(super) fn rapidity_from_speed(speed: f32) -> i64 {
    (speed * -RAPIDITY_PER_SPEED) as i64
}

/// Delay of a distance.
pub(super) fn delay_from_metres(metres: f32) -> i64 {
    (metres * DELAY_PER_METRE) as i64
}

/// Delay gathered over a time by a rapidity that starts at `level` and grows by that of `growth` (m/s),
/// behind a table of rapidity `ahead`. The slope is exp(ahead) (1 - exp(level)) = -level - level^2/2 -
/// level^3/6 - level ahead + ...: the first term exact and without the growth (its distance is added
/// by the caller), the others (below 1e-4 of it) in f32, as means over a straight growth.
pub(super) fn delay_of_level(level: i64, growth: f32, ahead: i64, steps: i64) -> i64 {
    let start = level as f32 * (1.0 / RAPIDITY_ONE);
    let grown = growth * (-1.0 / 299_792_458.0);
    let mean = start + 0.5 * grown;
    let square = start * (start + grown) + grown * grown * (1.0 / 3.0);
    let rest = square * (0.5 + mean * (1.0 / 6.0)) + mean * (ahead as f32 * (1.0 / RAPIDITY_ONE));
    // 2^60 rapidity times 2^30 s is 2^90; delay has 56 fraction bits.
    let slope = level.saturating_add((rest * RAPIDITY_ONE) as i64);
    mul_shift(slope, steps, 34).saturating_neg()
}
