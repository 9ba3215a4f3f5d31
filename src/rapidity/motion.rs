//! What a source of motion tells at an instant.

use super::Rapidity;

/// Apparent one-way (or two-way) delay of the signal, signed, in units of 2^-56 s (1.4e-17 s,
/// 6e-9 cycle at 437 MHz), range +-128 s.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Delay(i64);

impl Delay {
    /// Fraction bits of a second.
    pub const FRACTION_BITS: u32 = 56;

    /// From units of 2^-56 s.
    pub const fn from_bits(bits: i64) -> Self {
        Self(bits)
    }

    /// In units of 2^-56 s.
    pub const fn to_bits(self) -> i64 {
        self.0
    }
}

/// Change of rapidity per second, I4F60 per second.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct RapidityRate(i64);

impl RapidityRate {
    /// From units of 2^-60 per second.
    pub const fn from_bits(bits: i64) -> Self {
        Self(bits)
    }

    /// In units of 2^-60 per second.
    pub const fn to_bits(self) -> i64 {
        self.0
    }
}

/// Delay, rapidity and rapidity rate at one instant.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Motion {
    /// Apparent delay of the signal.
    pub delay: Delay,
    /// ln(received / transmitted frequency).
    pub rapidity: Rapidity,
    /// Change of the rapidity per second.
    pub rate: RapidityRate,
}
