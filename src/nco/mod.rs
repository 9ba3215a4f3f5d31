//! The oscillator: a phase accumulator that ramps, cosine and sine, and a mixer to zero.
//!
//! [`Nco`] keeps the phase in 64 bits and makes 16-bit pairs with the quick routine or 32-bit pairs with the
//! fine one; each is also there on its own, for a phase from elsewhere. Everywhere the cosine comes first
//! (`re`), then the sine (`im`).
//!
//! | routine | result | table | worst error, of full scale |
//! |---|---|---|---|
//! | [`cosine_sine_quick`] | 32 bits | 1 KiB | [`bounds::QUICK_ERROR`] |
//! | [`cosine_sine_quick_i16`] | 16 bits | the same | [`bounds::QUICK_I16_ERROR`] of the last place |
//! | [`cosine_sine_fine`] | 32 bits | none | [`bounds::FINE_ERROR`] |
//!
//! [`Mixer`] multiplies samples by the conjugate of an oscillator, with a still cheaper pair of its own, and adds
//! them up: spurs below [`bounds::MIXER_SPUR_DBC`], 1 KiB of table.
//!
//! All are integer arithmetic with the same bits on every target, and cost the same for every phase.

mod accumulator;
pub mod bounds;
mod fine;
mod mixer;
mod quick;
mod tables;

pub use crate::frequency::PhaseRamp;
pub use accumulator::Nco;
pub use fine::cosine_sine_fine;
pub use mixer::Mixer;
pub use quick::{cosine_sine_quick, cosine_sine_quick_i16};
