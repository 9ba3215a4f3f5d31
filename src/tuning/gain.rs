//! A constant factor from a 32-bit number to 2^-64 cycle per clock.

/// A positive factor as a 64-bit mantissa with its top bit set and a shift, exact to 2^-63.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Gain {
    high: u32,
    low: u32,
    left: u8,
    right: u8,
}

impl Gain {
    /// (`whole` + `fraction` 2^-64) 2^`exponent`; the factor must not be zero.
    pub(super) fn new(whole: u128, fraction: u64, exponent: i32) -> Self {
        let bits = 128 - whole.leading_zeros() as i32;
        let (mantissa, shift) = if bits >= 64 {
            ((whole >> (bits - 64)) as u64, bits - 64)
        } else {
            let joined = whole << 64 | u128::from(fraction);
            let zeros = joined.leading_zeros() as i32;
            (((joined << zeros) >> 64) as u64, -zeros)
        };
        // The product below is taken over 2^32 of the mantissa.
        let shift = shift + 32 + exponent;
        Self {
            high: (mantissa >> 32) as u32,
            low: mantissa as u32,
            left: shift.clamp(0, 63) as u8,
            right: (-shift).clamp(0, 63) as u8,
        }
    }

    /// The factor times `x`, modulo 2^64, rounded down by at most [`Self::resolution`]; the factor itself is good
    /// to 2^-63.
    #[inline]
    pub(super) fn times(&self, x: i32) -> u64 {
        let x = i64::from(x);
        let product =
            x.wrapping_mul(i64::from(self.high)).wrapping_add(x.wrapping_mul(i64::from(self.low)) >> 32);
        self.shift(product)
    }

    /// The factor's upper half times `x`: relative error 2^-31, half the cost.
    #[inline]
    pub(super) fn times_coarse(&self, x: i32) -> u64 {
        self.shift(i64::from(x).wrapping_mul(i64::from(self.high)))
    }

    /// Units of 2^-64 by which [`Self::times`] may round down before its last place.
    pub(super) fn resolution(&self) -> f64 {
        libm::ldexp(1.0, i32::from(self.left) - i32::from(self.right))
    }

    #[inline]
    fn shift(&self, product: i64) -> u64 {
        ((product << self.left) >> self.right) as u64
    }
}
