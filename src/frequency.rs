//! Frequencies in hertz, and the words that oscillators take.
//!
//! A frequency is stored as hertz with 24 fraction bits: 60 nHz steps up to 1 THz. It never passes
//! through `f32`, whose 24 bits would already be 16 Hz wide at 437 MHz.

use fixed::types::{U0F64, U40F24};

/// A frequency in hertz, unsigned, 40 integer and 24 fraction bits (0 to 1.0995 THz, steps of 60 nHz).
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Frequency(U40F24);

impl Frequency {
    /// The bits: hertz times 2^24.
    pub const fn to_bits(self) -> u64 {
        self.0.to_bits()
    }

    /// From bits: hertz times 2^24.
    pub const fn from_bits(bits: u64) -> Self {
        Self(U40F24::from_bits(bits))
    }

    /// From whole hertz, below 2^40. `None` above the format.
    pub const fn from_hertz(hertz: u64) -> Option<Self> {
        if hertz >> 40 != 0 { None } else { Some(Self::from_bits(hertz << 24)) }
    }

    /// From whole millihertz, rounded to the nearest 2^-24 Hz. `None` above the format.
    pub const fn from_millihertz_nearest(millihertz: u64) -> Option<Self> {
        let bits = (((millihertz as u128) << 24) + 500) / 1000;
        if bits >> 64 != 0 { None } else { Some(Self::from_bits(bits as u64)) }
    }
}

impl From<U40F24> for Frequency {
    fn from(hertz: U40F24) -> Self {
        Self(hertz)
    }
}

impl From<Frequency> for U40F24 {
    fn from(frequency: Frequency) -> Self {
        frequency.0
    }
}

/// What a phase accumulator adds at every clock: cycles per clock modulo one, in units of 2^-64 cycle.
/// A negative intermediate frequency wraps.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub struct PhaseStep(U0F64);

impl PhaseStep {
    /// The bits: cycles per clock times 2^64, modulo 2^64.
    pub const fn to_bits(self) -> u64 {
        self.0.to_bits()
    }

    /// From bits: cycles per clock times 2^64, modulo 2^64.
    pub const fn from_bits(bits: u64) -> Self {
        Self(U0F64::from_bits(bits))
    }
}
