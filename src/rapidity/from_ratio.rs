//! Rapidities from frequency ratios: turnaround ratios, measured frequencies, crystals, gravity.

use super::logarithm::logarithm;
use super::wide_product::about_high_i64;
use super::{Rapidity, RapidityError};
use crate::frequency::Frequency;
use fixed::types::{I32F32, I48F16};

/// 2^119 / c^2: one unit of I48F16 m^2/s^2 over c^2 is 2^44 / c^2 steps of a rapidity.
const POTENTIAL_SCALE: i64 = 0x669f_b4e7_a09b_6647;

impl Rapidity {
    /// ln(numerator / denominator): the turnaround ratio of a coherent transponder, or any exact ratio
    /// of received over transmitted. Positive where the numerator is larger.
    ///
    /// # Accuracy
    /// [`super::bounds::RATIO`] units of 2^-60 for all pairs of integers (`tests/rapidity_ratio.rs`).
    ///
    /// # Errors
    /// `Zero`; `OutOfRange` where the ratio is not in (1/2980, 2980).
    ///
    /// # Cost
    /// Two 64-bit logarithms, no division. `const`: a fixed ratio costs nothing at run time.
    ///
    /// # Source
    /// Difference of logarithms.
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// const TURNAROUND: Rapidity = match Rapidity::from_ratio(880, 749) {
    ///     Ok(rapidity) => rapidity,
    ///     Err(_) => panic!("not a ratio"),
    /// };
    /// assert!((TURNAROUND.to_bits() - 185_831_259_203_167_273).abs() <= 1);
    /// ```
    pub const fn from_ratio(numerator: u64, denominator: u64) -> Result<Self, RapidityError> {
        if numerator == 0 || denominator == 0 {
            return Err(RapidityError::Zero);
        }
        match logarithm(numerator).minus(logarithm(denominator)).to_i4f60() {
            Some(bits) => Ok(Self::from_bits(bits)),
            None => Err(RapidityError::OutOfRange),
        }
    }

    /// ln(received / transmitted) of two frequencies.
    ///
    /// # Accuracy, errors, cost
    /// As [`Rapidity::from_ratio`].
    ///
    /// ```
    /// use shiftkeel::frequency::Frequency;
    /// use shiftkeel::rapidity::Rapidity;
    /// let transmitted = Frequency::from_hertz(437_000_000).unwrap();
    /// let received = Frequency::from_hertz(437_010_204).unwrap();
    /// assert!(Rapidity::from_frequencies(received, transmitted).unwrap() > Rapidity::ZERO);
    /// ```
    pub const fn from_frequencies(
        received: Frequency,
        transmitted: Frequency,
    ) -> Result<Self, RapidityError> {
        Self::from_ratio(received.to_bits(), transmitted.to_bits())
    }

    /// ln(1 + x 1e-9) of an offset in parts per billion, I32F32: a crystal that runs fast has a positive
    /// offset and a positive rapidity.
    ///
    /// # Accuracy
    /// [`super::bounds::PARTS_PER_BILLION`] units of 2^-60 for all inputs (`tests/rapidity_ratio.rs`).
    ///
    /// # Errors
    /// `OffsetBelowMinusOne` at -1e9 and below; `OutOfRange` where the rapidity reaches -8.
    ///
    /// # Cost
    /// Two 64-bit logarithms, no division.
    ///
    /// # Source
    /// The exact ratio (1e9 + x) / 1e9 as in [`Rapidity::from_ratio`].
    ///
    /// ```
    /// use fixed::types::I32F32;
    /// use shiftkeel::rapidity::Rapidity;
    /// // A crystal 2.5 ppm fast: ln(1 + 2.5e-6) = 2.499996875005e-6.
    /// let crystal = Rapidity::from_parts_per_billion(I32F32::from_num(2_500)).unwrap();
    /// assert!((crystal.to_bits() - 2_882_300_158_643).abs() <= 1);
    /// ```
    pub const fn from_parts_per_billion(offset: I32F32) -> Result<Self, RapidityError> {
        const ONE: i64 = 1_000_000_000 << 32;
        let bits = offset.to_bits();
        if bits <= -ONE {
            return Err(RapidityError::OffsetBelowMinusOne);
        }
        Self::from_ratio((ONE as u64).wrapping_add(bits as u64), ONE as u64)
    }

    /// Gravity: the difference of potential, far end minus near end, over c^2; `difference` in m^2/s^2,
    /// I48F16, positive where the far end is higher up, so that its clock runs faster and its carrier
    /// arrives blue. The potential itself is negative: -mu/r.
    ///
    /// # Accuracy
    /// [`super::bounds::POTENTIAL`] units of 2^-60 of the formula (`tests/rapidity_ratio.rs`). The formula is that of weak fields:
    /// its next term, the square, is 5e-19 at the Earth's surface.
    ///
    /// # Cost
    /// One product of 64 by 64 bits, no division.
    ///
    /// # Source
    /// Clock rates differ by exp(difference / c^2) in a weak static field.
    ///
    /// ```
    /// use fixed::types::I48F16;
    /// use shiftkeel::rapidity::Rapidity;
    /// // 100 m up at 9.80665 m/s^2: 1.0911e-14.
    /// let gravity = Rapidity::from_potential(I48F16::from_num(980.665));
    /// assert_eq!(gravity.to_bits(), 12_580);
    /// ```
    pub const fn from_potential(difference: I48F16) -> Self {
        Self::from_bits(about_high_i64(difference.to_bits(), POTENTIAL_SCALE).wrapping_add(1 << 10) >> 11)
    }
}
