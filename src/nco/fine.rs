//! Cosine and sine by polynomials: the exact pair, without a table.

use num_complex::Complex;

use super::tables::{FINE_COSINE, FINE_SINE};
use crate::rapidity::wide_product::high_i32;

/// Cosine (`re`) and sine (`im`) of a phase, finely.
///
/// `phase` is in 2^-32 cycle, wrapping. Both results are in units of
/// [`FULL_SCALE`](super::bounds::FULL_SCALE) (32767 * 2^16), so they lie within +-(2^31 - 1). Half a cycle later
/// both are exactly the negative, and a quarter later the cosine is exactly the negative of what the sine was.
///
/// # Accuracy
/// Within [`FINE_ERROR`](super::bounds::FINE_ERROR) of full scale over all 2^32 phases (`tests/nco_sine.rs`).
///
/// # Cost
/// Seven high halves of 32-bit products; about 43 instructions on a Cortex-M4F and 186 on a Cortex-M0,
/// independent of the phase. No table.
///
/// # Source
/// Minimax polynomials of degree 7 and 8 within an eighth of a cycle of the nearest axis, by Remez' exchange.
///
/// ```
/// use shiftkeel::nco::{bounds, cosine_sine_fine};
/// // A twelfth of a cycle: the sine is one half.
/// let pair = cosine_sine_fine(0x1555_5555);
/// let sine = f64::from(pair.im) / f64::from(bounds::FULL_SCALE);
/// assert!((sine - 0.5).abs() < bounds::FINE_ERROR);
/// ```
#[inline]
pub const fn cosine_sine_fine(phase: u32) -> Complex<i32> {
    // The signed distance u from the nearest axis, -1 to 1 for an eighth of a cycle, in 2^-31; exact.
    let distance = (phase << 2) as i32;
    // v = 1 - 2 u^2 in 2^-30: centred, so that the coefficients fall quickly.
    let square = (1i32 << 30).wrapping_sub(high_i32(distance, distance) << 1);
    let cosine = minus_cosine(square);
    let sine = minus_sine(distance, square);
    // In the quadrants round the second and fourth axis the two change places. Then each gets its sign: the
    // cosine turns positive round axes 0 and 3, the sine round 0 and 1.
    let quadrant = phase.wrapping_add(1 << 29);
    let exchange = (cosine ^ sine) & ((quadrant << 1) as i32 >> 31);
    let cosine_turns = quadrant.wrapping_add(3 << 30) as i32 >> 31;
    let sine_turns = quadrant.wrapping_add(2 << 30) as i32 >> 31;
    Complex {
        re: ((cosine ^ exchange) ^ cosine_turns).wrapping_sub(cosine_turns),
        im: ((sine ^ exchange) ^ sine_turns).wrapping_sub(sine_turns),
    }
}

// Both are computed as their negatives in v = 1 - 2 u^2: then every coefficient and every partial sum is
// negative, and a compiler that can tell uses the signed product throughout.

/// -cos(u pi/4) in 2^-31 from v, by Horner's rule; a high half of a product with v costs two bits a step.
#[inline(always)]
const fn minus_cosine(square: i32) -> i32 {
    let [c0, c1, c2, c3, c4] = FINE_COSINE;
    // The last share is so small that a product of 16 bits each is enough: 2^-14 times 2^-37, shifted to 2^-37.
    let sum = c3.wrapping_add((square >> 16).wrapping_mul(c4) >> 14);
    let sum = c2.wrapping_add(high_i32(square, sum));
    let sum = c1.wrapping_add(high_i32(square, sum));
    c0.wrapping_add(high_i32(square, sum))
}

/// -sin(u pi/4) in 2^-31 from u and v: -u/2, and u times the polynomial.
#[inline(always)]
const fn minus_sine(distance: i32, square: i32) -> i32 {
    let [s0, s1, s2, s3] = FINE_SINE;
    // As above: 2^-14 times 2^-32, shifted to 2^-36.
    let sum = s2.wrapping_add((square >> 16).wrapping_mul(s3) >> 10);
    let sum = s1.wrapping_add(high_i32(square, sum));
    let sum = s0.wrapping_add(high_i32(square, sum));
    high_i32(distance, sum).wrapping_sub(distance >> 1)
}
