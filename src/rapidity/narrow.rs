//! Narrow kernels: rapidities, velocity ratios and offsets below 2^-13 in 32 bits.
//!
//! Everything that orbits the Earth moves slower than 2^-13 of the speed of light (36.6 km/s), and there
//! the logarithm, the exponential and their kin differ from a straight line by so little that two or
//! three 32-bit products give them to half a unit in the last place. All raw functions here take and
//! return an `i32` with 44 fraction bits: range +-2^-13, steps of 5.7e-14 (0.025 mHz at 437 MHz).
//!
//! Rules that hold for all of them:
//! - no branch but the end of the format (one instruction where the core saturates by itself), no loop, no table, no division; only 32-bit products;
//! - results that would leave the format stay at its end (`i32::MIN`, `i32::MAX`), which can happen
//!   only within 2^17 steps of that end;
//! - the worst error over all 2^32 inputs of each is in [`super::bounds`]: half a unit and 0.002.
//!
//! | function | of | gives |
//! |---|---|---|
//! | [`rapidity_of_beta`] | b | atanh(b) |
//! | [`beta_of_rapidity`] | r | tanh(r) |
//! | [`offset_of_rapidity`] | r | exp(r) - 1 |
//! | [`rapidity_of_offset`] | z | ln(1 + z) |
//! | [`rapidity_of_slope`] | s | ln(1 - s) |
//! | [`slope_of_rapidity`] | r | 1 - exp(r) |
//! | [`first_order_range_rate`] | v | v', where exp(-atanh(v/c)) - 1 = -v'/c |
#![allow(clippy::cast_possible_truncation, reason = "cut only to be compared with the whole")]

use super::Rapidity;
pub use super::bounds::{
    FIRST_ORDER_RANGE_RATE as MAX_FIRST_ORDER_ERROR,
    FIRST_ORDER_RANGE_RATE_BELOW_8_KM_S as MAX_FIRST_ORDER_ERROR_BELOW_8_KM_S,
};

/// Fraction bits of every raw value in this module but the speeds.
pub const FRACTION_BITS: u32 = 44;

/// x^2 with 13 more fraction bits than x/2 x would have: x^2 2^-32 of the bits, 0 to 2^30, at most
/// 2 too small. The square of the low half is below one unit and left out.
const fn square_high(x: i32) -> i32 {
    let high = x >> 16;
    let low = x & 0xffff;
    // |high| <= 2^15 and low < 2^16, so no product here leaves 32 bits.
    high.wrapping_mul(high).wrapping_add(high.wrapping_mul(low) >> 15)
}

/// x^3/3 in units in the last place, to the nearest, within 0.002.
const fn third_of_cube(x: i32) -> i32 {
    // Half a step of the high half, so that what is cut off is as often above as below.
    let high = (x >> 16).wrapping_add((x >> 15) & 1);
    let square = high.wrapping_mul(high) >> 14;
    // 43691 = 2^17 / 3; square <= 2^16, so the product stays below 2^32.
    let third = ((square as u32).wrapping_mul(43_691) >> 16) as i32;
    high.wrapping_mul(third).wrapping_add(1 << 26) >> 27
}

/// Rapidity of a velocity ratio: atanh(b).
///
/// `beta` is v/c with 44 fraction bits, positive = approaching; so is the result. |beta| < 2^-13.
///
/// # Accuracy
/// [`super::bounds::NARROW_RAPIDITY_OF_BETA`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 3 products of 32 bits, no branch.
///
/// # Source
/// atanh(b) = b + b^3/3 + b^5/5 + ...; below 2^-13 the last is under 2^-23 units.
///
/// ```
/// use shiftkeel::rapidity::narrow::rapidity_of_beta;
/// // 7 km/s: b^3/3 is 4.24e-15, less than a tenth of a step.
/// assert_eq!(rapidity_of_beta(410_768_513), 410_768_513);
/// assert_eq!(rapidity_of_beta(1 << 30), (1 << 30) + 1);
/// ```
pub const fn rapidity_of_beta(beta: i32) -> i32 {
    beta.saturating_add(third_of_cube(beta))
}

/// Velocity ratio of a rapidity: tanh(r), the inverse of [`rapidity_of_beta`].
///
/// `rapidity` and the result have 44 fraction bits, positive = approaching.
///
/// # Accuracy
/// [`super::bounds::NARROW_BETA_OF_RAPIDITY`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 3 products of 32 bits, no branch.
///
/// # Source
/// tanh(r) = r - r^3/3 + 2 r^5/15 - ...; below 2^-13 the last is under 2^-23 units.
///
/// ```
/// use shiftkeel::rapidity::narrow::beta_of_rapidity;
/// assert_eq!(beta_of_rapidity(1 << 30), (1 << 30) - 1);
/// ```
pub const fn beta_of_rapidity(rapidity: i32) -> i32 {
    rapidity.wrapping_sub(third_of_cube(rapidity))
}

/// x^2/2 (1 + x k) in units in the last place, to the nearest; `k16` is k with 16 fraction bits, |k| <= 2/3.
const fn half_of_square(x: i32, k16: i32) -> i32 {
    let square = square_high(x);
    // x k with 28 fraction bits over the bits of x^2: |high k| <= 2^14.5, square >> 14 <= 2^16.
    let slope = (x >> 16).wrapping_mul(k16) >> 16;
    let bend = (square >> 14).wrapping_mul(slope) >> 14;
    square.wrapping_add(bend).wrapping_add(1 << 12) >> 13
}

/// 1/3 with 16 fraction bits.
const THIRD: i32 = 21_845;
/// 2/3 with 16 fraction bits.
const TWO_THIRDS: i32 = 43_691;

/// Offset from one of the frequency ratio: exp(r) - 1.
///
/// `rapidity` and the result have 44 fraction bits, positive = approaching. An offset beyond the format
/// stays at its end.
///
/// # Accuracy
/// [`super::bounds::NARROW_OFFSET_OF_RAPIDITY`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 4 products of 32 bits, no branch.
///
/// # Source
/// exp(r) - 1 = r + r^2/2 (1 + r/3) + r^4/24 + ...; below 2^-13 the last is under 2^-12 units.
///
/// ```
/// use shiftkeel::rapidity::narrow::offset_of_rapidity;
/// // Receding at 7 km/s: -z = -2.3349486668e-5 gives -2.3349214071e-5 (to a step of 5.7e-14).
/// assert_eq!(offset_of_rapidity(-410_768_514), -410_763_718);
/// ```
pub const fn offset_of_rapidity(rapidity: i32) -> i32 {
    rapidity.saturating_add(half_of_square(rapidity, THIRD))
}

/// Rapidity of an offset from one: ln(1 + z), the inverse of [`offset_of_rapidity`].
///
/// `offset` is (received / transmitted frequency) - 1 with 44 fraction bits; so is the result.
///
/// # Accuracy
/// [`super::bounds::NARROW_RAPIDITY_OF_OFFSET`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 4 products of 32 bits, no branch.
///
/// # Source
/// ln(1 + z) = z - z^2/2 (1 - 2z/3) - z^4/4 + ...; below 2^-13 the last is under 2^-10 units.
///
/// ```
/// use shiftkeel::rapidity::narrow::rapidity_of_offset;
/// assert_eq!(rapidity_of_offset(-410_763_718), -410_768_514);
/// ```
pub const fn rapidity_of_offset(offset: i32) -> i32 {
    offset.saturating_sub(half_of_square(offset, -TWO_THIRDS))
}

/// Rapidity of the slope of the delay: ln(1 - s).
///
/// `slope` is d(delay)/dt with 44 fraction bits, positive = the path grows longer = receding; the
/// result is a rapidity, so it has the other sign.
///
/// # Accuracy
/// [`super::bounds::NARROW_RAPIDITY_OF_SLOPE`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 4 products of 32 bits, no branch.
///
/// # Source
/// ln(1 - s) = -s - s^2/2 (1 + 2s/3) - s^4/4 - ...
///
/// ```
/// use shiftkeel::rapidity::narrow::rapidity_of_slope;
/// assert_eq!(rapidity_of_slope(410_763_718), -410_768_514);
/// ```
pub const fn rapidity_of_slope(slope: i32) -> i32 {
    half_of_square(slope, TWO_THIRDS).wrapping_neg().saturating_sub(slope)
}

/// Slope of the delay that gives a rapidity: 1 - exp(r), the inverse of [`rapidity_of_slope`].
///
/// `rapidity` and the result have 44 fraction bits; a receding (negative) rapidity has a positive slope.
///
/// # Accuracy
/// [`super::bounds::NARROW_SLOPE_OF_RAPIDITY`] units in the last place over all inputs
/// (`tests/rapidity_narrow.rs`).
///
/// # Cost
/// 4 products of 32 bits, no branch.
///
/// # Source
/// 1 - exp(r) = -r - r^2/2 (1 + r/3) - ...
///
/// ```
/// use shiftkeel::rapidity::narrow::slope_of_rapidity;
/// assert_eq!(slope_of_rapidity(-410_768_514), 410_763_718);
/// ```
pub const fn slope_of_rapidity(rapidity: i32) -> i32 {
    half_of_square(rapidity, THIRD).wrapping_neg().saturating_sub(rapidity)
}

/// The range rate that makes the first-order formula exact: v - v^2/(2c) + v^3/(2c^2).
///
/// `range_rate` is in m/s with 16 fraction bits (I16F16: to 32.7 km/s), positive = receding; so is the
/// result v', and the received carrier is off by exactly `-v'/c`, that is exp(-atanh(v/c)) - 1. A
/// channel that folds carrier/c into one constant needs one more product per tick. Within 1.8 m/s of
/// -32768 m/s the result stays at the end of the format.
///
/// # Accuracy
/// [`super::bounds::FIRST_ORDER_RANGE_RATE`] units of 2^-16 m/s (1.5e-5 m/s, 22 uHz at 437 MHz) over all inputs,
/// [`super::bounds::FIRST_ORDER_RANGE_RATE_BELOW_8_KM_S`] below 8 km/s (`tests/rapidity_narrow.rs`). The formula without
/// the correction is off by 0.119 Hz at 437 MHz and 7 km/s.
///
/// # Cost
/// 4 products of 32 bits, no branch.
///
/// # Source
/// exp(-atanh b) - 1 = sqrt((1 - b)/(1 + b)) - 1 = -(b - b^2/2 + b^3/2 - 3b^4/8 + ...); the last is
/// under 0.002 units.
///
/// ```
/// use shiftkeel::rapidity::narrow::first_order_range_rate;
/// // 7 km/s: c * 2.3349214070971851744e-5 = 6999.918277 m/s.
/// assert_eq!(first_order_range_rate(7000 << 16), 458_746_644);
/// ```
pub const fn first_order_range_rate(range_rate: i32) -> i32 {
    let square = square_high(range_rate);
    // The correction is square 2^15/c (1 - v/c) = square (1 - d) 2^-13 with
    // d = 1 - 2^28/c + 2^28/c v/c; with 18 fraction bits 27419.1 + 205/2^18 per m/s.
    let deficit = 27_419_i32.wrapping_add((range_rate >> 16).wrapping_mul(205) >> 18);
    let less = (square >> 14).wrapping_mul(deficit) >> 4;
    // 2^12 rounds to the nearest; 857 less, because the shift of the square has cut off a tenth of a unit.
    let correction = square.wrapping_sub(less).wrapping_add(3_239) >> 13;
    range_rate.saturating_sub(correction)
}

/// A rapidity below 2^-13 (36.6 km/s) in 32 bits: ln(received / transmitted frequency), signed, 44
/// fraction bits, positive = approaching.
///
/// ```
/// use shiftkeel::rapidity::{Rapidity, narrow::NarrowRapidity};
/// let receding = NarrowRapidity::from_bits(-410_768_514);
/// assert_eq!(receding.to_rapidity(), Rapidity::from_bits(-410_768_514 << 16));
/// assert_eq!(NarrowRapidity::from_rapidity_nearest(Rapidity::from_bits(1 << 47)), None);
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct NarrowRapidity(i32);

impl NarrowRapidity {
    /// No shift.
    pub const ZERO: Self = Self(0);

    /// From bits: rapidity times 2^44.
    pub const fn from_bits(bits: i32) -> Self {
        Self(bits)
    }

    /// The bits: rapidity times 2^44.
    pub const fn to_bits(self) -> i32 {
        self.0
    }

    /// The same rapidity in the wide format, exactly.
    pub const fn to_rapidity(self) -> Rapidity {
        Rapidity::from_bits((self.0 as i64) << (Rapidity::FRACTION_BITS - FRACTION_BITS))
    }

    /// The nearest narrow rapidity; `None` where it is 2^-13 or more.
    pub const fn from_rapidity_nearest(rapidity: Rapidity) -> Option<Self> {
        let shift = Rapidity::FRACTION_BITS - FRACTION_BITS;
        let bits = rapidity.to_bits().saturating_add(1 << (shift - 1)) >> shift;
        if bits == bits as i32 as i64 { Some(Self(bits as i32)) } else { None }
    }

    /// From a velocity ratio with 44 fraction bits, positive = approaching: [`rapidity_of_beta`].
    pub const fn from_beta_bits(beta: i32) -> Self {
        Self(rapidity_of_beta(beta))
    }

    /// The velocity ratio with 44 fraction bits, positive = approaching: [`beta_of_rapidity`].
    pub const fn to_beta_bits(self) -> i32 {
        beta_of_rapidity(self.0)
    }

    /// From (received / transmitted frequency) - 1 with 44 fraction bits: [`rapidity_of_offset`].
    pub const fn from_offset_bits(offset: i32) -> Self {
        Self(rapidity_of_offset(offset))
    }

    /// (received / transmitted frequency) - 1 with 44 fraction bits: [`offset_of_rapidity`].
    pub const fn to_offset_bits(self) -> i32 {
        offset_of_rapidity(self.0)
    }

    /// From the slope of the delay with 44 fraction bits, positive = receding: [`rapidity_of_slope`].
    pub const fn from_slope_bits(slope: i32) -> Self {
        Self(rapidity_of_slope(slope))
    }

    /// The slope of the delay with 44 fraction bits, positive = receding: [`slope_of_rapidity`].
    pub const fn to_slope_bits(self) -> i32 {
        slope_of_rapidity(self.0)
    }
}
