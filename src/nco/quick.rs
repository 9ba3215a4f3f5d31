//! Cosine and sine by a quarter-wave table of straight lines: the cheap pair.

use num_complex::Complex;

use super::tables::QUARTER_WAVE;

/// Cosine (`re`) and sine (`im`) of a phase, quickly.
///
/// `phase` is in 2^-32 cycle, wrapping. Both results are in units of
/// [`FULL_SCALE`](super::bounds::FULL_SCALE) (32767 * 2^16), so they lie within +-(2^31 - 1). Half a cycle later
/// both are exactly the bitwise complement, and a quarter later the cosine is exactly what the sine was, so
/// there is no offset and no even harmonic, and both rails are equally strong.
///
/// # Accuracy
/// Within [`QUICK_ERROR`](super::bounds::QUICK_ERROR) of full scale over all 2^32 phases (`tests/nco_sine.rs`).
///
/// # Cost
/// About 25 instructions on a Cortex-M4F and 40 on a Cortex-M0, independent of the phase; 1 KiB of table.
/// 32-bit products only.
///
/// # Source
/// Each of the 256 segments of the quarter wave is the straight line of least worst error, (pi/512)^2 / 4
/// off; value and slope share one word.
///
/// ```
/// use shiftkeel::nco::{bounds, cosine_sine_quick};
/// // An eighth of a cycle: both are the square root of one half.
/// let pair = cosine_sine_quick(1 << 29);
/// let cosine = f64::from(pair.re) / f64::from(bounds::FULL_SCALE);
/// assert!((cosine - 0.5_f64.sqrt()).abs() < bounds::QUICK_ERROR);
/// assert_eq!(cosine_sine_quick((1 << 29) + (1 << 31)).re, !pair.re);
/// ```
#[inline]
pub const fn cosine_sine_quick(phase: u32) -> Complex<i32> {
    // All ones in the second and fourth quadrant, where the quarter wave runs backwards.
    let backwards = ((phase << 1) as i32 >> 31) as u32;
    let sine_is_negative = phase as i32 >> 31;
    let quarter = (phase << 2) ^ backwards;
    Complex {
        re: magnitude(!quarter) ^ sine_is_negative ^ backwards as i32,
        im: magnitude(quarter) ^ sine_is_negative,
    }
}

/// The same pair rounded to 16 bits: within +-32767.
///
/// `phase` is in 2^-32 cycle, wrapping. Half a cycle later both are exactly the negative.
///
/// # Accuracy
/// Within [`QUICK_I16_ERROR`](super::bounds::QUICK_I16_ERROR) of the last place over all 2^32 phases (`tests/nco_sine.rs`).
///
/// # Cost
/// Four instructions more than [`cosine_sine_quick`].
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

/// Sine of a quarter wave; `quarter` in 2^-32 of the quarter; result 0 to 2^31 - 1.
#[inline(always)]
#[allow(clippy::indexing_slicing)] // Eight bits index 256 entries.
const fn magnitude(quarter: u32) -> i32 {
    let entry = QUARTER_WAVE[(quarter >> 24) as usize];
    let offset = quarter << 8 >> 12;
    // 12 by 20 bits: the product fits. The slope's bits are left in the word as part of the value; the table's
    // generator has counted them in.
    let rise = (entry & 0xFFF).wrapping_mul(offset) >> 7;
    (entry.wrapping_add(rise) >> 1) as i32
}

/// The upper half, rounded to nearest. The pair never comes closer than 2^15 to the end of its range.
#[inline(always)]
const fn round_to_i16(value: i32) -> i16 {
    (value.wrapping_add(1 << 15) >> 16) as i16
}
