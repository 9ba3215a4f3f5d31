//! Natural logarithm in 64 bits: the core of every constructor that starts from a ratio.
//!
//! ln(m) = -ln(r) + ln(1 + z) with z = m r - 1, where r is one of 128 reciprocals that keeps |z| below
//! 2^-8, and ln(1 + z) is the power series. No division.
#![allow(clippy::indexing_slicing, reason = "seven bits index 128 entries")]
#![allow(clippy::cast_possible_truncation, reason = "the lower word is cut out on purpose")]

use super::coefficients::{LOGARITHMS, RECIPROCALS};
use super::wide_product::{about_high_i64, high_i32, high_i64_i32};

/// ln 2 with 60 fraction bits, cut to an even number ...
const LN_2_HIGH: i64 = 799_144_290_325_165_978;
/// ... and what is missing, with 71 fraction bits.
const LN_2_REST: i64 = 1_509;

/// A logarithm in two parts, so that sums and differences round only once:
/// `exponent` ln 2 + `fraction` 2^-63.
#[derive(Clone, Copy)]
pub(crate) struct Logarithm {
    pub exponent: i32,
    pub fraction: i64,
}

/// ln(x) of a positive integer; of 0 like of 1.
///
/// Error of the fraction: at most 1.1 units of 2^-63: the table 0.5, the last shift 0.5, the series 0.1 (the term
/// left out, z^8/8, is 2^-67).
pub(crate) const fn logarithm(x: u64) -> Logarithm {
    let x = x | ((x == 0) as u64);
    let shift = x.leading_zeros();
    let mantissa = x << shift;
    let index = ((mantissa >> 56) & 0x7f) as usize;
    let reciprocal = RECIPROCALS[index] as u64;
    // z with 70 fraction bits: m r 2^-(63 + 16) - 1, where the one lies beyond the word and falls off.
    let high = (mantissa >> 32).wrapping_mul(reciprocal) << 23;
    let low = (mantissa as u32 as u64).wrapping_mul(reciprocal) >> 9;
    let z = high.wrapping_add(low) as i64;
    let series = logarithm_of_one_plus(z).wrapping_add(1 << 6) >> 7;
    Logarithm {
        exponent: 63_i32.wrapping_sub(shift as i32),
        fraction: (LOGARITHMS[index] as i64).wrapping_add(series),
    }
}

/// ln(1 + z), both with 70 fraction bits, |z| < 2^-8; error below 2^-66.7.
///
/// z - z^2 (1/2 - z (1/3 - z (1/4 - z (1/5 - z (1/6 - z/7))))). A step of a scale loses at most one unit of it, and
/// each product with z divides that by 2^8: 2^-39, 2^-47, 2^-55 in turn, and 2^-71 after the square.
const fn logarithm_of_one_plus(z: i64) -> i64 {
    // The high word of z has 38 fraction bits, so each product with it adds 6 to the scale.
    let high = (z >> 32) as i32;
    let tail = 22_369_621_i32.wrapping_sub(high_i32(high, 299_593)); // 2^27/6 - z 2^21/7
    let tail = 1_717_986_918_i32.wrapping_sub(high_i32(high, tail)); // 2^33/5 - ...
    let tail = high_i32(high, tail); // z (1/5 - ...) with 39 fraction bits
    // 2^63/3 - z/4 + z (...)
    let third = 3_074_457_345_618_258_603_i64.wrapping_sub(z >> 9).wrapping_add(high_i64_i32(z, tail) >> 14);
    let half = (1_i64 << 62).wrapping_sub(about_high_i64(z, third) >> 6); // 2^63/2 - ...
    let square = about_high_i64(z, z); // 76 fraction bits
    z.wrapping_sub(about_high_i64(square, half) >> 5)
}

/// ln((1 + b)/(1 - b)) of a velocity ratio with 63 fraction bits; `None` at -1.
pub(crate) const fn logarithm_of_beta(beta: i64) -> Option<Logarithm> {
    const ONE: u64 = 1 << 63;
    if beta == i64::MIN {
        return None;
    }
    Some(logarithm(ONE.wrapping_add(beta as u64)).minus(logarithm(ONE.wrapping_sub(beta as u64))))
}

impl Logarithm {
    /// The difference: the logarithm of the ratio.
    pub(crate) const fn minus(self, other: Self) -> Self {
        Self {
            exponent: self.exponent.wrapping_sub(other.exponent),
            fraction: self.fraction.wrapping_sub(other.fraction),
        }
    }

    /// The same value with a fraction of at most half of ln 2, so that two fractions can be added.
    pub(crate) const fn centred(self) -> Self {
        const LN_2: i64 = 6_393_154_322_601_327_830; // 63 fraction bits
        if self.fraction > LN_2 / 2 {
            Self { exponent: self.exponent.wrapping_add(1), fraction: self.fraction.wrapping_sub(LN_2) }
        } else if self.fraction < -LN_2 / 2 {
            Self { exponent: self.exponent.wrapping_sub(1), fraction: self.fraction.wrapping_add(LN_2) }
        } else {
            self
        }
    }

    /// The value with 60 fraction bits, to the nearest; `None` where it does not lie in (-8, 8).
    pub(crate) const fn to_i4f60(self) -> Option<i64> {
        if self.exponent.unsigned_abs() > 12 {
            return None;
        }
        let exponent = self.exponent as i64;
        let rest = exponent.wrapping_mul(LN_2_REST).wrapping_add(1 << 7) >> 8;
        let fraction = self.fraction.wrapping_add(rest).wrapping_add(4) >> 3;
        // |exponent| ln 2 + |fraction| < 9.1: a sum beyond 8 wraps to the other sign and no further.
        let sum = exponent.wrapping_mul(LN_2_HIGH).wrapping_add(fraction);
        if (exponent > 1 && sum < 0) || (exponent < -1 && sum >= 0) { None } else { Some(sum) }
    }

    /// Half of the value with 60 fraction bits, to the nearest; `None` where it does not lie in (-8, 8).
    pub(crate) const fn half_to_i4f60(self) -> Option<i64> {
        if self.exponent.unsigned_abs() > 24 {
            return None;
        }
        let exponent = self.exponent as i64;
        let rest = exponent.wrapping_mul(LN_2_REST).wrapping_add(1 << 7) >> 8;
        let fraction = self.fraction.wrapping_add(rest).wrapping_add(8) >> 4;
        let sum = exponent.wrapping_mul(LN_2_HIGH / 2).wrapping_add(fraction);
        if (exponent > 1 && sum < 0) || (exponent < -1 && sum >= 0) { None } else { Some(sum) }
    }
}
