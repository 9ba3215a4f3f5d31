//! Rapidities from speeds: range rate, velocity ratio, transverse motion.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "a float's exponent and its 24 bits, inside the ranges tested beside"
)]
#![allow(clippy::cast_possible_truncation, reason = "the lower word is cut out on purpose")]

use super::logarithm::{Logarithm, logarithm, logarithm_of_beta};
use super::wide_product::{about_high_i64, high_i32, high_u32_i32, product_i32, product_u32_i32};
use super::{Rapidity, RapidityError};
use fixed::types::{I1F31, I1F63, I16F16, I32F32};

/// Speed of light in m/s, exact by the definition of the metre.
pub const SPEED_OF_LIGHT: u32 = 299_792_458;

/// The speed of light in units of 2^-34 m/s.
const LIGHT: i64 = (SPEED_OF_LIGHT as i64) << 34;

/// 2^92 / c: one unit of I16F16 m/s over c is 2^44/c steps of a rapidity.
const RANGE_RATE_SCALE: u64 = 0xe539_3759_2fce_d957;

/// 2^102 / (1000 c): one mm/s over c is 2^60 / (1000 c) steps of a rapidity.
const MM_PER_S_SCALE: u64 = 0xeab9_90bd_a198_6bde;

/// floor(v scale / 2^32), at most one too small.
const fn scaled(v: i32, scale: u64) -> i64 {
    let low = high_u32_i32(scale as u32, v) as i64;
    product_u32_i32((scale >> 32) as u32, v).wrapping_add(low)
}

impl Rapidity {
    /// From a range rate in m/s, signed, I16F16 (to 32.7 km/s), positive = receding; the rapidity is
    /// then negative.
    ///
    /// # Accuracy
    /// [`super::bounds::RANGE_RATE`] units of 2^-60 over all inputs (`tests/rapidity_speed.rs`).
    ///
    /// # Cost
    /// 5 products of 32 by 32 bits, no division.
    ///
    /// # Source
    /// -atanh(v/c), atanh b = b + b^3/3 + b^5/5; at 32.7 km/s the last is 0.004 units.
    ///
    /// ```
    /// use fixed::types::I16F16;
    /// use shiftkeel::rapidity::Rapidity;
    /// // 7 km/s: atanh(v/c) = 2.3349486668114012054e-5.
    /// let receding = Rapidity::from_range_rate(I16F16::from_num(7000));
    /// assert_eq!(receding.to_bits(), -26_920_125_301_200);
    /// ```
    pub const fn from_range_rate(range_rate: I16F16) -> Self {
        // beta with 76 fraction bits, below 2^-13.1; its high word has 44.
        let beta = scaled(range_rate.to_bits(), RANGE_RATE_SCALE);
        let high = (beta >> 32) as i32;
        let cube = high_i32(high_i32(high, high), high); // 68 fraction bits
        let third = product_i32(cube, 1_431_655_765) >> 24; // 2^32/3; 76 fraction bits
        Self::from_bits((beta.wrapping_add(third).wrapping_add(1 << 15) >> 16).wrapping_neg())
    }

    /// From a range rate in mm/s, signed (to 2147 km/s), positive = receding; the rapidity is then
    /// negative.
    ///
    /// # Accuracy
    /// [`super::bounds::RANGE_RATE_MM_PER_S`] units of 2^-60 over all inputs (`tests/rapidity_speed.rs`).
    ///
    /// # Cost
    /// 4 products of 64 by 64 bits and 2 of 32 by 32, no division.
    ///
    /// # Source
    /// -atanh(v/c), atanh b = b + b^3 (1/3 + b^2/5 + b^4/7) + b^9/9; at 2147 km/s the last is 0.006 units.
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// assert_eq!(Rapidity::from_range_rate_mm_per_s(7_000_000).to_bits(), -26_920_125_301_200);
    /// ```
    pub const fn from_range_rate_mm_per_s(range_rate: i32) -> Self {
        // beta with 70 fraction bits, below 2^-7.1.
        let beta = scaled(range_rate, MM_PER_S_SCALE);
        let square = about_high_i64(beta, beta); // 76 fraction bits
        // 1/3 + b^2/5 + b^4/7 with 62 fraction bits; the products with the square have 74.
        let fifth = about_high_i64(square, 658_812_288_346_769_701) >> 12; // b^2 2^62/7
        let third = about_high_i64(square, 922_337_203_685_477_581_i64.wrapping_add(fifth)) >> 12; // ... 2^62/5
        let factor = 1_537_228_672_809_129_301_i64.wrapping_add(third); // ... 2^62/3
        let bend = about_high_i64(about_high_i64(square, factor), beta) >> 10; // 74 + 70 - 64 - 10 = 70 fraction bits
        Self::from_bits((beta.wrapping_add(bend).wrapping_add(1 << 9) >> 10).wrapping_neg())
    }

    /// From a range rate in m/s, signed, I32F32, any speed below that of light, positive = receding; the
    /// rapidity is then negative.
    ///
    /// # Accuracy
    /// [`super::bounds::RANGE_RATE_WIDE`] units of 2^-60 (`tests/rapidity_speed.rs`).
    ///
    /// # Errors
    /// `NotBelowLight`; `OutOfRange` within 68 m/s of the speed of light, where the rapidity reaches 8.
    ///
    /// # Cost
    /// Two 64-bit logarithms, no division.
    ///
    /// # Source
    /// -atanh(v/c) = ln((c - v)/(c + v)) / 2, both exact integers.
    ///
    /// ```
    /// use fixed::types::I32F32;
    /// use shiftkeel::rapidity::{Rapidity, RapidityError};
    /// let receding = Rapidity::from_range_rate_wide(I32F32::from_num(7000)).unwrap();
    /// assert!((receding.to_bits() + 26_920_125_301_200).abs() <= 1);
    /// let light = I32F32::from_num(299_792_458);
    /// assert_eq!(Rapidity::from_range_rate_wide(light), Err(RapidityError::NotBelowLight));
    /// ```
    pub const fn from_range_rate_wide(range_rate: I32F32) -> Result<Self, RapidityError> {
        let bits = range_rate.to_bits();
        if bits.unsigned_abs() >= LIGHT.unsigned_abs() >> 2 {
            return Err(RapidityError::NotBelowLight);
        }
        receding(bits << 2)
    }

    /// From a range rate in m/s as a float, any speed below that of light, positive = receding; the
    /// rapidity is then negative. The float is taken as the exact number it is and never multiplied in
    /// single precision.
    ///
    /// # Accuracy
    /// [`super::bounds::RANGE_RATE_F32`] units of 2^-60 (`tests/rapidity_speed.rs`); a float itself has 24 bits, 0.2 mm/s at 7 km/s.
    ///
    /// # Errors
    /// `NotANumber`, `Infinite`, `NotBelowLight`; `OutOfRange` within 68 m/s of the speed of light.
    ///
    /// # Cost
    /// Two 64-bit logarithms, no division, no floating point.
    ///
    /// # Source
    /// As [`Rapidity::from_range_rate_wide`].
    ///
    /// ```
    /// use shiftkeel::rapidity::{Rapidity, RapidityError};
    /// let receding = Rapidity::from_range_rate_f32(7000.0).unwrap();
    /// assert!((receding.to_bits() + 26_920_125_301_200).abs() <= 1);
    /// assert_eq!(Rapidity::from_range_rate_f32(f32::NAN), Err(RapidityError::NotANumber));
    /// ```
    pub const fn from_range_rate_f32(range_rate: f32) -> Result<Self, RapidityError> {
        let bits = range_rate.to_bits();
        let exponent = (bits >> 23) & 0xff;
        let fraction = bits & 0x7f_ffff;
        if exponent == 0xff {
            return Err(if fraction == 0 { RapidityError::Infinite } else { RapidityError::NotANumber });
        }
        if exponent > 155 {
            return Err(RapidityError::NotBelowLight); // 2^29 m/s or more
        }
        // The float is significand 2^(exponent - 150) m/s. Subnormals are far below half a unit: zero.
        let significand = (fraction | 0x80_0000) as i64;
        let magnitude = if exponent >= 116 {
            significand << (exponent - 116)
        } else if exponent > 116 - 26 {
            ((significand >> (115 - exponent)) + 1) >> 1
        } else {
            0
        };
        if magnitude >= LIGHT {
            return Err(RapidityError::NotBelowLight);
        }
        receding(if bits >> 31 == 0 { magnitude } else { -magnitude })
    }

    /// From a velocity ratio v/c, I1F63, open (-1, 1), positive = approaching: the same sign as the
    /// rapidity, and the opposite of a range rate.
    ///
    /// # Accuracy
    /// [`super::bounds::BETA`] units of 2^-60 (`tests/rapidity_speed.rs`).
    ///
    /// # Errors
    /// `NotBelowLight` at -1; `OutOfRange` where the rapidity reaches 8 (beta above 1 - 2.3e-7).
    ///
    /// # Cost
    /// Two 64-bit logarithms, no division.
    ///
    /// # Source
    /// atanh(b) = ln((1 + b)/(1 - b)) / 2.
    ///
    /// ```
    /// use fixed::types::I1F63;
    /// use shiftkeel::rapidity::Rapidity;
    /// let half = Rapidity::from_beta(I1F63::from_num(0.5)).unwrap();
    /// assert!((half.to_bits() - 633_306_866_415_404_364).abs() <= 1); // ln(3)/2 2^60
    /// ```
    pub const fn from_beta(beta: I1F63) -> Result<Self, RapidityError> {
        match logarithm_of_beta(beta.to_bits()) {
            Some(logarithm) => half(logarithm),
            None => Err(RapidityError::NotBelowLight),
        }
    }

    /// From a velocity ratio v/c, I1F31, open (-1, 1), positive = approaching.
    ///
    /// # Accuracy, errors, cost
    /// As [`Rapidity::from_beta`]; the 32 bits themselves are 0.14 m/s wide.
    ///
    /// ```
    /// use fixed::types::I1F31;
    /// use shiftkeel::rapidity::Rapidity;
    /// let half = Rapidity::from_beta_32(I1F31::from_num(-0.5)).unwrap();
    /// assert!((half.to_bits() + 633_306_866_415_404_364).abs() <= 1);
    /// ```
    pub const fn from_beta_32(beta: I1F31) -> Result<Self, RapidityError> {
        Self::from_beta(I1F63::from_bits((beta.to_bits() as i64) << 32))
    }

    /// Time dilation of a moving source: ln sqrt(1 - v^2/c^2), zero or negative; `speed` in m/s, I32F32,
    /// its sign does not matter.
    ///
    /// Add it to what the motion along the line of sight gives. The rapidity of a range rate already holds
    /// the dilation of the radial part: there pass the transverse speed (exact to b_r^2 b_t^2 / 2, 2e-19
    /// for a low orbit). A rapidity from the slope of a geometric delay holds none: there pass the whole
    /// speed.
    ///
    /// # Accuracy
    /// [`super::bounds::TRANSVERSE_SPEED`] units of 2^-60 (`tests/rapidity_speed.rs`).
    ///
    /// # Errors
    /// `NotBelowLight`; `OutOfRange` where the dilation reaches a factor of 2980.
    ///
    /// # Cost
    /// Three 64-bit logarithms, no division.
    ///
    /// # Source
    /// A transverse source is seen at f sqrt(1 - v^2/c^2); 1 - b^2 = (c - v)(c + v) / c^2.
    ///
    /// ```
    /// use fixed::types::I32F32;
    /// use shiftkeel::rapidity::Rapidity;
    /// // 3873.83 m/s, the speed of a navigation satellite: -8.3485e-11.
    /// let dilation = Rapidity::from_transverse_speed(I32F32::from_num(3873.83)).unwrap();
    /// assert_eq!(dilation.to_bits() / 10_000, -9625);
    /// ```
    pub const fn from_transverse_speed(speed: I32F32) -> Result<Self, RapidityError> {
        let bits = speed.to_bits();
        if bits.unsigned_abs() >= LIGHT.unsigned_abs() >> 2 {
            return Err(RapidityError::NotBelowLight);
        }
        let light = logarithm(LIGHT as u64);
        let slow = logarithm(LIGHT.wrapping_sub(bits << 2) as u64).minus(light).centred();
        let fast = light.minus(logarithm(LIGHT.wrapping_add(bits << 2) as u64)).centred();
        half(slow.minus(fast))
    }
}

/// -atanh(v/c) = ln((c - v)/(c + v))/2 of a receding speed in units of 2^-34 m/s, |v| < c.
const fn receding(speed: i64) -> Result<Rapidity, RapidityError> {
    let slow = logarithm(LIGHT.wrapping_sub(speed) as u64);
    half(slow.minus(logarithm(LIGHT.wrapping_add(speed) as u64)))
}

/// Half of a logarithm as a rapidity.
const fn half(logarithm: Logarithm) -> Result<Rapidity, RapidityError> {
    match logarithm.half_to_i4f60() {
        Some(bits) => Ok(Rapidity::from_bits(bits)),
        None => Err(RapidityError::OutOfRange),
    }
}
