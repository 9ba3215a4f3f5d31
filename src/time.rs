//! Time: GPS time in steps of 2^-30 s, without leap seconds.
//!
//! (interface; leap table and conversions follow)

/// An instant: GPS time since 1980-01-06T00:00:00 UTC, in units of 2^-30 s (0.93 ns), signed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct GpsTime(i64);

impl GpsTime {
    /// Fraction bits of a second.
    pub const FRACTION_BITS: u32 = 30;

    /// From units of 2^-30 s.
    pub const fn from_bits(bits: i64) -> Self {
        Self(bits)
    }

    /// In units of 2^-30 s.
    pub const fn to_bits(self) -> i64 {
        self.0
    }
}
