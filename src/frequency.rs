//! Frequencies in hertz, and the words that oscillators take.
//!
//! A frequency is stored as hertz with 24 fraction bits: 60 nHz steps up to 1 THz. It never passes
//! through `f32`, whose 24 bits would already be 16 Hz wide at 437 MHz.

use fixed::types::{U0F64, U16F48, U40F24};

/// A frequency in hertz, unsigned, 40 integer and 24 fraction bits (0 to 1.0995 THz, steps of 60 nHz).
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Frequency(U40F24);

#[cfg(feature = "defmt")]
impl defmt::Format for Frequency {
    fn format(&self, formatter: defmt::Formatter<'_>) {
        defmt::write!(formatter, "Frequency({=u64} * 2^-24 Hz)", self.to_bits());
    }
}

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
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "88 bits in 128; the bits above 64 are tested"
    )]
    pub const fn from_millihertz_nearest(millihertz: u64) -> Option<Self> {
        let bits = (((millihertz as u128) << 24) + 500) / 1000;
        if bits >> 64 != 0 { None } else { Some(Self::from_bits(bits as u64)) }
    }

    /// Hertz as f64, for set-up and reports: relative error 2^-53.
    pub fn as_hertz_f64(self) -> f64 {
        self.to_bits() as f64 * (1.0 / 16_777_216.0)
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
///
/// A device with fewer bits gets the step rounded to the nearest, never truncated:
/// ```
/// use shiftkeel::frequency::{Frequency, PhaseStep};
/// let clock = Frequency::from_hertz(25_000_000).unwrap();
/// let step = PhaseStep::of(Frequency::from_hertz(400).unwrap(), clock).unwrap();
/// assert_eq!(step.to_word_nearest::<28>(), 0x10C7); // truncation would give 0x10C6
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub struct PhaseStep(U0F64);

#[cfg(feature = "defmt")]
impl defmt::Format for PhaseStep {
    fn format(&self, formatter: defmt::Formatter<'_>) {
        defmt::write!(formatter, "PhaseStep({=u64} * 2^-64 cycle per clock)", self.to_bits());
    }
}

impl PhaseStep {
    /// The bits: cycles per clock times 2^64, modulo 2^64.
    pub const fn to_bits(self) -> u64 {
        self.0.to_bits()
    }

    /// From bits: cycles per clock times 2^64, modulo 2^64.
    pub const fn from_bits(bits: u64) -> Self {
        Self(U0F64::from_bits(bits))
    }

    /// The step of an output frequency at a clock, rounded to the nearest 2^-64; `None` for a clock of zero.
    /// Whole cycles per clock drop out.
    ///
    /// # Cost
    /// One long division: set-up only.
    pub const fn of(output: Frequency, clock: Frequency) -> Option<Self> {
        if clock.to_bits() == 0 {
            return None;
        }
        let (_, fraction) = divide_nearest(output.to_bits() as u128, clock.to_bits());
        Some(Self::from_bits(fraction))
    }

    /// The word of a device with `BITS` bits (1 to 63), rounded to the nearest, modulo 2^`BITS`.
    #[allow(clippy::arithmetic_side_effects, reason = "`BITS` is from 1 to 63, at compile time")]
    pub const fn to_word_nearest<const BITS: u32>(self) -> u64 {
        const { assert!(BITS >= 1 && BITS <= 63, "a phase word has 1 to 63 bits") };
        self.to_bits().wrapping_add(1 << (63 - BITS)) >> (64 - BITS)
    }

    /// The step that a device with `BITS` bits makes of a word.
    #[allow(clippy::arithmetic_side_effects, reason = "`BITS` is from 1 to 63, at compile time")]
    pub const fn from_word<const BITS: u32>(word: u64) -> Self {
        const { assert!(BITS >= 1 && BITS <= 63, "a phase word has 1 to 63 bits") };
        Self::from_bits(word << (64 - BITS))
    }

    /// This step less the one that `word` makes in a device with `BITS` bits, in 2^-64 cycle per clock, signed:
    /// times the clock it is the residual in hertz.
    pub const fn residual<const BITS: u32>(self, word: u64) -> i64 {
        self.to_bits().wrapping_sub(Self::from_word::<BITS>(word).to_bits()) as i64
    }
}

impl From<U0F64> for PhaseStep {
    fn from(cycles: U0F64) -> Self {
        Self(cycles)
    }
}

impl From<PhaseStep> for U0F64 {
    fn from(step: PhaseStep) -> Self {
        step.0
    }
}

/// Change of a phase step at every clock, signed, in units of 2^-64 cycle per clock squared.
///
/// 140 Hz/s at a 48 kHz clock is 1.12e12 units; at 100 MHz it is 258,000, and a word of 48 bits per clock
/// could hold 4 of them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct PhaseRamp(i64);

impl PhaseRamp {
    /// No ramp.
    pub const ZERO: Self = Self(0);

    /// From units of 2^-64 cycle per clock squared.
    pub const fn from_bits(bits: i64) -> Self {
        Self(bits)
    }

    /// In units of 2^-64 cycle per clock squared.
    pub const fn to_bits(self) -> i64 {
        self.0
    }
}

/// Output over reference frequency of a synthesiser that multiplies: 16 integer and 48 fraction bits.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct ClockRatio(U16F48);

#[cfg(feature = "defmt")]
impl defmt::Format for ClockRatio {
    fn format(&self, formatter: defmt::Formatter<'_>) {
        defmt::write!(formatter, "ClockRatio({=u64} * 2^-48)", self.to_bits());
    }
}

impl ClockRatio {
    /// The bits: ratio times 2^48.
    pub const fn to_bits(self) -> u64 {
        self.0.to_bits()
    }

    /// From bits: ratio times 2^48.
    pub const fn from_bits(bits: u64) -> Self {
        Self(U16F48::from_bits(bits))
    }

    /// Integer part and the 48-bit fraction.
    pub const fn parts(self) -> (u16, u64) {
        ((self.to_bits() >> 48) as u16, self.to_bits() & ((1 << 48) - 1))
    }
}

/// Quotient of `numerator` over `denominator` (not zero): integer part and the fraction in 2^-64, rounded to
/// the nearest (a fraction that rounds up to one carries).
///
/// Shift and subtract, one bit a turn: the one long division of the crate, for set-up. It is small rather than
/// fast: the compiler's 128-bit division costs 2 KiB of flash on a Cortex-M0.
#[allow(
    clippy::arithmetic_side_effects,
    reason = "a count to 192; the quotient is not above the numerator, so it may carry"
)]
#[inline(never)]
pub(crate) const fn divide_nearest(numerator: u128, denominator: u64) -> (u128, u64) {
    // The quotient's bits enter from below as the numerator's leave at the top.
    let mut quotient = numerator;
    let mut fraction = 0u64;
    let mut rest = 0u64;
    let mut bit = 0;
    while bit < 192 {
        let doubled = rest << 1 | (quotient >> 127) as u64;
        let subtract = rest >> 63 != 0 || doubled >= denominator;
        rest = if subtract { doubled.wrapping_sub(denominator) } else { doubled };
        quotient = quotient << 1 | (fraction >> 63) as u128;
        fraction = fraction << 1 | subtract as u64;
        bit += 1;
    }
    if rest >= denominator.div_ceil(2) {
        fraction = fraction.wrapping_add(1);
        if fraction == 0 {
            quotient += 1;
        }
    }
    (quotient, fraction)
}
