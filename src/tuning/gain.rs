//! A constant factor from a 32-bit number to 2^-64 cycle per clock.

use crate::rapidity::wide_product::{high_u32_i32, product_u32_i32, shifted_right};

/// A positive factor in fixed point: (`high` 2^32 + `middle` + `low` 2^-32) 2^-`right`.
///
/// Below 2^32 the factor is scaled so that `middle` is full and `high` empty; above, `right` is 0. Whole cycles
/// drop out of the result, so the upper part needs no more than the lower half of its product.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Gain {
    high: u32,
    middle: u32,
    low: u32,
    right: u8,
}

impl Gain {
    /// (`whole` + `fraction` 2^-64) 2^`exponent`, below 2^64; the factor must not be zero.
    pub(super) fn new((whole, fraction): (u128, u64), exponent: i32) -> Self {
        // The factor's bits 95 to 0 stand for the three words; `right` starts at zero.
        let shifted = |places: i32| -> u128 {
            // floor((whole + fraction 2^-64) 2^places), below 2^96.
            if places <= 0 {
                whole.checked_shr(places.unsigned_abs()).unwrap_or(0)
            } else if places <= 64 {
                whole.checked_shl(places as u32).unwrap_or(0) | u128::from(fraction) >> (64 - places)
            } else {
                whole.checked_shl(places as u32).unwrap_or(0)
                    | u128::from(fraction).checked_shl(places as u32 - 64).unwrap_or(0)
            }
        };
        let mut right = 0;
        let mut words = shifted(exponent + 32);
        while right < 31 && words < 1 << 63 {
            right += 1;
            words = shifted(exponent + 32 + right);
        }
        Self {
            high: (words >> 64) as u32,
            middle: (words >> 32) as u32,
            low: words as u32,
            right: right as u8,
        }
    }

    /// The factor times `x`, modulo 2^64, rounded down by at most two units of the last place; the factor itself
    /// is good to 2^-63.
    #[inline]
    pub(super) fn times(&self, x: i32) -> u64 {
        self.shifted(self.product(x).wrapping_add(i64::from(high_u32_i32(self.low, x))))
    }

    /// The factor without its lowest word times `x`: relative error 2^-31, at about half of the cost.
    #[inline]
    pub(super) fn times_coarse(&self, x: i32) -> u64 {
        self.shifted(self.product(x))
    }

    #[inline]
    fn product(&self, x: i32) -> i64 {
        let above = (x as u32).wrapping_mul(self.high);
        product_u32_i32(self.middle, x).wrapping_add((u64::from(above) << 32) as i64)
    }

    #[inline]
    fn shifted(&self, product: i64) -> u64 {
        shifted_right(product, u32::from(self.right)) as u64
    }
}
