//! What the oscillator's routines promise: the one place for these figures.
//!
//! The tests measure each, fail when the measured worst exceeds it, and fail when it is looser than 1.25 times
//! the measured worst.

/// Amplitude of the 32-bit outputs: 32767 * 2^16, so that rounding to 16 bits gives exactly +-32767.
pub const FULL_SCALE: i32 = 0x7FFF_0000;

/// Worst error of [`cosine_sine_quick`](super::cosine_sine_quick), in full scales, over all phases.
pub const QUICK_ERROR: f64 = 3.2e-7;

/// Worst error of [`cosine_sine_quick_i16`](super::cosine_sine_quick_i16), in units of the last place of an
/// amplitude of 32767, over all phases.
pub const QUICK_I16_ERROR: f64 = 0.511;

/// Worst error of [`cosine_sine_fine`](super::cosine_sine_fine), in full scales, over all phases: below 2^-28.7.
pub const FINE_ERROR: f64 = 2.2e-9;

/// Strongest spur of [`Nco::next_i16`](super::Nco::next_i16) in dB relative to the carrier, for words of 3 to 14 bits
/// from phase zero.
pub const QUICK_I16_SPUR_DBC: f64 = -100.0;

/// How far that spur may be above the one of exact values rounded to 16 bits, in dB, from phase zero.
pub const QUICK_I16_SPUR_EXCESS_DB: f64 = 0.1;

/// The same from any phase, where a value may lie so close to half a unit that it is rounded the other way; fewer
/// than one word in a hundred exceeds 1 dB, all of them of short period.
pub const QUICK_I16_SPUR_EXCESS_ANY_PHASE_DB: f64 = 2.5;

/// Strongest spur of [`Nco::next_i32`](super::Nco::next_i32) in dB relative to the carrier.
pub const FINE_SPUR_DBC: f64 = -177.0;

/// Amplitude of the mixer's oscillator: the length of its pair, the mean over all phases.
pub const MIXER_AMPLITUDE: f64 = 23165.6;

/// Farthest that the mixer's pair is from its place, in units of the last place of that amplitude, over all phases.
pub const MIXER_PAIR_ERROR: f64 = 2.5;

/// Strongest spur of the mixer's oscillator in dB relative to its carrier.
pub const MIXER_SPUR_DBC: f64 = -88.0;

/// Line at zero frequency of [`Nco::next_i16`](super::Nco::next_i16) and of the mixer's oscillator, in dB relative to
/// the carrier, for a word that no short period divides.
pub const ZERO_LINE_DBC: f64 = -147.5;
