//! Cosine and sine by a table and a turn of second order: the cheap pair.

use num_complex::Complex;

use super::tables::HALF_WAVE;

/// Cosine (`re`) and sine (`im`) of a phase, quickly.
///
/// `phase` is in 2^-32 cycle, wrapping. Both results are in units of
/// [`FULL_SCALE`](super::bounds::FULL_SCALE) (32767 * 2^16), and within +-(2^31 - 1).
///
/// # Accuracy
/// Within [`QUICK_ERROR`](super::bounds::QUICK_ERROR) of full scale over all 2^32 phases (`tests/nco_sine.rs`).
///
/// # Cost
/// About 27 instructions on a Cortex-M4F and 42 on a Cortex-M0 (`boards/emulated/costs.txt`), the same for every
/// phase; 1 KiB of table. Products of 32 bits only.
///
/// # Source
/// From the nearest of 512 steps of the circle, where cosine and sine are C and S, the rest d of the angle turns
/// the pair to (C - d (S + C d/2), S + d (C - S d/2)). |d| is below pi/512, so what is left out is below
/// d^3/6 = 3.9e-8; the rest of the error is that of C and S to 17 bits in the brackets, and of d to 2^-22.
///
/// ```
/// use shiftkeel::nco::{bounds, cosine_sine_quick};
/// // An eighth of a cycle: both are the square root of one half.
/// let pair = cosine_sine_quick(1 << 29);
/// let cosine = f64::from(pair.re) / f64::from(bounds::FULL_SCALE);
/// assert!((cosine - 0.5_f64.sqrt()).abs() < bounds::QUICK_ERROR);
/// ```
#[inline]
pub const fn cosine_sine_quick(phase: u32) -> Complex<i32> {
    // What the rest of the angle loses by rounding down, on average: 64/2 for its own bits, the rest for d's.
    let phase = phase.wrapping_add(113);
    let sine_place = phase.wrapping_add(1 << 22);
    let cosine_place = sine_place.wrapping_add(1 << 30);
    let (sine, cosine) = (from_table(sine_place), from_table(cosine_place));
    // The rest of the angle in 2^-17 of a step, then in 2^-22 rad: 25736 / 2^15 is pi / 4.
    let rest = ((phase << 9) as i32 >> 15).wrapping_mul(25_736) >> 16;
    // 16 bits and the sign; with a rest below 25736 the products fit.
    let (short_sine, short_cosine) = (sine >> 15, cosine >> 15);
    let sine_slope = short_cosine.wrapping_sub(short_sine.wrapping_mul(rest) >> 23);
    // The sign inside makes the rounding down of both shifts cancel, as it does above.
    let cosine_slope = short_sine.wrapping_sub(0i32.wrapping_sub(short_cosine.wrapping_mul(rest)) >> 23);
    Complex {
        re: cosine.wrapping_sub(rest.wrapping_mul(cosine_slope) >> 7),
        im: sine.wrapping_add(rest.wrapping_mul(sine_slope) >> 7),
    }
}

/// The same pair rounded to 16 bits: within +-32767.
///
/// `phase` is in 2^-32 cycle, wrapping.
///
/// # Accuracy
/// Within [`QUICK_I16_ERROR`](super::bounds::QUICK_I16_ERROR) of the last place over all 2^32 phases
/// (`tests/nco_sine.rs`); its strongest spur is that of exact values rounded, within 1 dB
/// (`tests/nco_spectrum.rs`).
///
/// # Cost
/// Four to seven instructions more than [`cosine_sine_quick`].
///
/// ```
/// use num_complex::Complex;
/// use shiftkeel::nco::cosine_sine_quick_i16;
/// assert_eq!(cosine_sine_quick_i16(0), Complex::new(32767, 0));
/// assert_eq!(cosine_sine_quick_i16(1 << 30), Complex::new(0, 32767));
/// ```
#[inline]
pub const fn cosine_sine_quick_i16(phase: u32) -> Complex<i16> {
    let pair = cosine_sine_quick(phase);
    Complex { re: round_to_i16(pair.re), im: round_to_i16(pair.im) }
}

/// Sine at the step of the circle that `place` lies in; in the second half the complement, half a unit of 2^-31
/// from the negative.
#[inline(always)]
#[allow(clippy::indexing_slicing, reason = "eight bits index 256 entries")]
const fn from_table(place: u32) -> i32 {
    HALF_WAVE[(place << 1 >> 24) as usize] as i32 ^ (place as i32 >> 31)
}

/// The upper half, rounded to nearest. The pair never comes closer than 2^15 to the end of its range.
#[inline(always)]
const fn round_to_i16(value: i32) -> i16 {
    (value.wrapping_add(1 << 15) >> 16) as i16
}
