//! Back from a rapidity: frequency factor, offset from one, velocity ratio.
#![allow(clippy::arithmetic_side_effects, reason = "64 bits times 61, and a shift of at least 49 places")]
#![allow(clippy::cast_possible_truncation, reason = "the bits above are tested before")]

use super::exponential::{
    factor, factor_of_power, offset_magnitude, power_near, steps_of_half, tanh_magnitude,
};
use super::logarithm::logarithm_of_beta;
use super::{Rapidity, RapidityError};
use crate::frequency::Frequency;
use fixed::types::{I1F31, I1F63, I40F24};

/// Received over transmitted frequency: `mantissa` 2^(`exponent` - 60), mantissa in [2^60, 2^61), so that
/// the relative error is the same over the whole range.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct ShiftFactor {
    mantissa: u64,
    exponent: i32,
}

impl ShiftFactor {
    /// Fraction bits of the mantissa.
    pub const FRACTION_BITS: u32 = 60;

    /// The factor without its power of two: in [1, 2), 60 fraction bits.
    pub const fn mantissa(self) -> u64 {
        self.mantissa
    }

    /// The power of two: -12 to 11 of a rapidity, -32 to 32 of a velocity ratio.
    pub const fn exponent(self) -> i32 {
        self.exponent
    }

    /// Factor of a velocity ratio v/c, I1F63, positive = approaching = a factor above one:
    /// sqrt((1 + b)/(1 - b)), without the step of a rapidity in between.
    ///
    /// # Accuracy
    /// [`super::bounds::FACTOR_OF_BETA`] units of the mantissa (`tests/rapidity_back.rs`).
    ///
    /// # Errors
    /// `NotBelowLight` at -1.
    ///
    /// # Cost
    /// Two 64-bit logarithms and an exponential, no division.
    ///
    /// # Source
    /// exp((ln(1 + b) - ln(1 - b))/2), the logarithm with 63 fraction bits and its multiple of ln 2 exactly.
    ///
    /// ```
    /// use fixed::types::I1F63;
    /// use shiftkeel::rapidity::ShiftFactor;
    /// let two = ShiftFactor::from_beta(I1F63::lit("0.6")).unwrap();
    /// assert!(two.mantissa() - (1 << 60) <= 1 && two.exponent() == 1);
    /// ```
    pub const fn from_beta(beta: I1F63) -> Result<Self, RapidityError> {
        let Some(logarithm) = logarithm_of_beta(beta.to_bits()) else {
            return Err(RapidityError::NotBelowLight);
        };
        // The fraction of the logarithm has 63 bits, that of its half 64; half of ln 2 is 64 steps.
        let steps = steps_of_half((logarithm.fraction >> 32) as i32);
        let factor = factor_of_power(power_near(steps, logarithm.fraction << 6, logarithm.exponent << 6));
        Ok(Self { mantissa: factor.mantissa, exponent: factor.exponent })
    }

    /// The frequency times the factor, to the nearest 2^-24 Hz; `None` above the format of a frequency.
    ///
    /// ```
    /// use shiftkeel::frequency::Frequency;
    /// use shiftkeel::rapidity::Rapidity;
    /// // A coherent transponder at rest: 749 up, 880 down, times 9.5625 MHz.
    /// let up = Frequency::from_hertz(7_162_312_500).unwrap();
    /// let down = Rapidity::from_ratio(880, 749).unwrap().to_factor().of(up).unwrap();
    /// assert_eq!(down, Frequency::from_hertz(8_415_000_000).unwrap());
    /// ```
    pub const fn of(self, frequency: Frequency) -> Option<Frequency> {
        let shift = 60_u32.wrapping_sub(self.exponent as u32); // 28 to 92
        let product = frequency.to_bits() as u128 * self.mantissa as u128; // below 2^125
        let bits = product.wrapping_add(1 << (shift - 1)) >> shift;
        if bits >> 64 == 0 { Some(Frequency::from_bits(bits as u64)) } else { None }
    }
}

/// (Received over transmitted frequency) - 1: `mantissa` 2^(`exponent` - 60), the size of the mantissa in
/// [2^60, 2^61) or zero, so that small shifts are as exact as large ones.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct ShiftOffset {
    mantissa: i64,
    exponent: i32,
}

impl ShiftOffset {
    /// Fraction bits of the mantissa.
    pub const FRACTION_BITS: u32 = 60;

    /// The offset without its power of two, signed: size in [1, 2) or zero, 60 fraction bits.
    pub const fn mantissa(self) -> i64 {
        self.mantissa
    }

    /// The power of two: -60 to 11; 0 where the mantissa is zero.
    pub const fn exponent(self) -> i32 {
        self.exponent
    }

    /// The frequency times the offset: the shift in hertz, signed, positive = received above transmitted,
    /// to the nearest 2^-24 Hz; `None` where it is 550 GHz or more.
    ///
    /// ```
    /// use fixed::types::I16F16;
    /// use shiftkeel::frequency::Frequency;
    /// use shiftkeel::rapidity::Rapidity;
    /// // 437 MHz, receding at 7 km/s: -10,203.606549 Hz.
    /// let carrier = Frequency::from_hertz(437_000_000).unwrap();
    /// let shift = Rapidity::from_range_rate(I16F16::from_num(7000)).to_offset().of(carrier).unwrap();
    /// assert_eq!((shift * 1000).to_num::<i64>(), -10_203_607); // towards minus infinity
    /// ```
    pub const fn of(self, frequency: Frequency) -> Option<I40F24> {
        let shift = 60_u32.wrapping_sub(self.exponent as u32); // 49 to 120
        let product = frequency.to_bits() as u128 * self.mantissa.unsigned_abs() as u128; // below 2^125
        let bits = product.wrapping_add(1 << (shift - 1)) >> shift;
        if bits >> 63 != 0 {
            return None;
        }
        let bits = bits as i64;
        Some(I40F24::from_bits(if self.mantissa < 0 { bits.wrapping_neg() } else { bits }))
    }
}

impl Rapidity {
    /// The factor exp(r): received over transmitted frequency.
    ///
    /// # Accuracy
    /// [`super::bounds::TO_FACTOR`] units of the mantissa (`tests/rapidity_back.rs`).
    ///
    /// # Cost
    /// 5 products of 64 by 64 bits, 3 of 64 by 32, 2 of 32 by 32; no division.
    ///
    /// # Source
    /// exp(x) = 2^k 2^(j/128) exp(r), the last by its power series.
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// let two = Rapidity::from_ratio(3, 1).unwrap().to_factor();
    /// assert_eq!(two.exponent(), 1);
    /// assert!(two.mantissa().abs_diff(3 << 59) <= 2); // 1.5
    /// ```
    pub const fn to_factor(self) -> ShiftFactor {
        let factor = factor(self.to_bits());
        ShiftFactor { mantissa: factor.mantissa, exponent: factor.exponent }
    }

    /// The offset exp(r) - 1 of the frequency factor, without the loss of digits that forming the factor
    /// first would bring.
    ///
    /// # Accuracy
    /// [`super::bounds::TO_OFFSET`] units of the mantissa (`tests/rapidity_back.rs`).
    ///
    /// # Cost
    /// About that of [`Rapidity::to_factor`].
    ///
    /// # Source
    /// exp(2x) - 1 = (exp(x) - 1)(2 + exp(x) - 1), twice, below 2^-7; above, the factor with 8 more bits
    /// less one.
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// let offset = Rapidity::from_bits(1).to_offset(); // the smallest rapidity
    /// assert_eq!((offset.mantissa(), offset.exponent()), ((1 << 60) + 1, -60)); // 2^60 + 0.50000...
    /// ```
    pub const fn to_offset(self) -> ShiftOffset {
        let bits = self.to_bits();
        if bits == 0 {
            return ShiftOffset { mantissa: 0, exponent: 0 };
        }
        let size = offset_magnitude(bits);
        let mantissa = size.mantissa as i64;
        ShiftOffset {
            mantissa: if bits < 0 { mantissa.wrapping_neg() } else { mantissa },
            exponent: size.exponent,
        }
    }

    /// The velocity ratio tanh(r) with 63 fraction bits, positive = approaching.
    ///
    /// # Accuracy
    /// [`super::bounds::TO_BETA`] units of 2^-63 (`tests/rapidity_back.rs`).
    ///
    /// # Cost
    /// 9 products of 64 by 64 bits, 4 of 64 by 32, 10 of 32 by 32; no division.
    ///
    /// # Source
    /// tanh(r) = 2/(1 + exp(-2r)) - 1; the reciprocal by table and power series.
    ///
    /// ```
    /// use fixed::types::I1F63;
    /// use shiftkeel::rapidity::Rapidity;
    /// let beta = Rapidity::from_ratio(2, 1).unwrap().to_beta();
    /// assert!((beta - I1F63::lit("0.6")).abs() < I1F63::from_bits(8)); // to a step of the rapidity
    /// ```
    pub const fn to_beta(self) -> I1F63 {
        let bits = self.to_bits();
        let size = tanh_magnitude(bits) as i64;
        I1F63::from_bits(if bits < 0 { size.wrapping_neg() } else { size })
    }

    /// The velocity ratio tanh(r) with 31 fraction bits, positive = approaching; a step is 0.14 m/s.
    ///
    /// # Accuracy
    /// [`super::bounds::TO_BETA_SHORT`] units of 2^-31 (`tests/rapidity_back.rs`).
    ///
    /// # Cost
    /// That of [`Rapidity::to_beta`].
    ///
    /// ```
    /// use fixed::types::I1F31;
    /// use shiftkeel::rapidity::Rapidity;
    /// let beta = Rapidity::from_ratio(1, 2).unwrap().to_beta_32();
    /// assert_eq!(beta, I1F31::from_num(-0.6));
    /// ```
    pub const fn to_beta_32(self) -> I1F31 {
        let bits = self.to_bits();
        // tanh(8) is 2.2e-7 below one, 483 steps: rounding up cannot leave the format.
        let size = (tanh_magnitude(bits).wrapping_add(1 << 31) >> 32) as i32;
        I1F31::from_bits(if bits < 0 { size.wrapping_neg() } else { size })
    }
}

/// Velocity ratio of two motions along one line, (a + b)/(1 + a b), with 31 fraction bits, signed.
///
/// # Accuracy
/// [`super::bounds::COMPOSE_BETA`] units of 2^-31 for all pairs (`tests/rapidity_back.rs`).
///
/// # Errors
/// `NotBelowLight` where an argument is -1, or where the result rounds to +-1.
///
/// # Cost
/// 32 steps of a division bit by bit: for set-up code. In a tick, add rapidities.
///
/// # Source
/// Composition of velocities; the sum of the rapidities atanh a + atanh b.
///
/// ```
/// use fixed::types::I1F31;
/// use shiftkeel::rapidity::compose_beta_32;
/// let half = I1F31::from_num(0.5);
/// assert_eq!(compose_beta_32(half, half), Ok(I1F31::from_num(0.8)));
/// ```
pub const fn compose_beta_32(first: I1F31, second: I1F31) -> Result<I1F31, RapidityError> {
    let (a, b) = (first.to_bits() as i64, second.to_bits() as i64);
    if a == i32::MIN as i64 || b == i32::MIN as i64 {
        return Err(RapidityError::NotBelowLight);
    }
    let sum = a.wrapping_add(b);
    // (1 + a b) 2^62, positive; |a + b| 2^62 is less, as both are inside (-1, 1).
    let denominator = (1_u64 << 62).wrapping_add(a.wrapping_mul(b) as u64);
    let mut remainder = sum.unsigned_abs() << 31;
    let mut quotient = 0_u64;
    let mut step = 0_u32;
    while step < 32 {
        // remainder < denominator < 2^63, so doubling stays in the word.
        remainder <<= 1;
        let fits = remainder >= denominator;
        if fits {
            remainder = remainder.wrapping_sub(denominator);
        }
        quotient = quotient << 1 | fits as u64;
        step = step.wrapping_add(1);
    }
    let size = (quotient.wrapping_add(1) >> 1) as i64;
    if size >> 31 != 0 {
        return Err(RapidityError::NotBelowLight);
    }
    let size = size as i32;
    Ok(I1F31::from_bits(if sum < 0 { size.wrapping_neg() } else { size }))
}
