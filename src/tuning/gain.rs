//! A constant factor from a 32-bit number to 2^-64 cycle per clock.

use crate::rapidity::wide_product::{high_i32, product_i32, shifted_right};

/// A signed factor in fixed point, modulo 2^64: (`high` 2^32 + `middle` + `low` 2^-32) 2^-`right`.
///
/// A factor below 2^31 is scaled so that `middle` is full and `high` empty; above, `right` is 0. Whole cycles
/// drop out of the result, so the upper part needs no more than the lower half of its product.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Gain {
    high: u32,
    middle: i32,
    low: i32,
    right: u8,
}

impl Gain {
    /// (`whole` + `fraction` 2^-64) 2^`exponent`, below 2^63 and not zero, with a minus sign where `negative`.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: binary exponents within +-200; words are cut out on purpose"
    )]
    #[inline(never)]
    pub(super) fn new((whole, fraction): (u128, u64), exponent: i32, negative: bool) -> Self {
        // The factor is `bits` 2^places of the lowest word, to at least 64 bits.
        let (bits, places) = if whole >> 64 == 0 {
            (whole << 64 | u128::from(fraction), exponent + 32 - 64)
        } else {
            (whole, exponent + 32)
        };
        let length = 128 - bits.leading_zeros() as i32 + places;
        let right = (63 - length).clamp(0, 31);
        let places = places + right;
        // Of what is above 2^96 only whole cycles would come.
        let words = bits.unbounded_shl(places.max(0) as u32).unbounded_shr((-places).max(0) as u32);
        let words = if negative { words.wrapping_neg() } else { words };
        // Signed words: each takes up the sign of the one below.
        let low = words as i32;
        let words = (words >> 32).wrapping_add(u128::from(low < 0));
        let middle = words as i32;
        let words = (words >> 32).wrapping_add(u128::from(middle < 0));
        Self { high: words as u32, middle, low, right: right as u8 }
    }

    /// The factor times `x`, modulo 2^64, rounded down by at most two units of the last place; the factor itself
    /// is good to 2^-62.
    #[inline]
    pub(super) fn times(&self, x: i32) -> u64 {
        self.shifted(self.product(x).wrapping_add(i64::from(high_i32(self.low, x))))
    }

    /// The factor without its lowest word times `x`: good to 2^-31, at about half of the cost.
    #[inline]
    pub(super) fn times_coarse(&self, x: i32) -> u64 {
        self.shifted(self.product(x))
    }

    /// The factor times `x` 2^-`places`, to the nearest; `None` where 128 bits do not hold the product.
    #[allow(clippy::arithmetic_side_effects, reason = "set-up: three words make 96 bits; shifts below 128")]
    pub(super) fn times_wide(&self, x: i64, places: u32) -> Option<i128> {
        let factor =
            (i128::from(self.high as i32) << 64) + (i128::from(self.middle) << 32) + i128::from(self.low);
        let product = factor.checked_mul(i128::from(x))?;
        Some(((product >> (31 + u32::from(self.right) + places)) + 1) >> 1)
    }

    #[inline]
    fn product(&self, x: i32) -> i64 {
        let above = (x as u32).wrapping_mul(self.high);
        product_i32(self.middle, x).wrapping_add((u64::from(above) << 32) as i64)
    }

    #[inline]
    fn shifted(&self, product: i64) -> u64 {
        shifted_right(product, u32::from(self.right)) as u64
    }
}
