//! Rapidity: the natural logarithm of received over transmitted frequency.
//!
//! A carrier is moved by many things at once, and each multiplies the frequency by a factor; their
//! logarithms add. Firmware therefore keeps signed 64-bit [`Rapidity`] numbers, adds what it knows, and
//! turns only the sum into a tuning word. Adding is exact; toward and away are the same magnitude with
//! opposite sign.
//!
//! | what | from |
//! |---|---|
//! | radial motion | [`Rapidity::from_range_rate`] and its kin, [`Rapidity::from_beta`] |
//! | time dilation | [`Rapidity::from_transverse_speed`] |
//! | gravity | [`Rapidity::from_potential`] |
//! | turnaround ratio | [`Rapidity::from_ratio`] |
//! | crystals | [`Rapidity::from_parts_per_billion`] |
//! | measured frequencies | [`Rapidity::from_frequencies`] |
//!
//! Back: [`Rapidity::to_factor`], [`Rapidity::to_offset`], [`Rapidity::to_beta`].
//!
//! | kernels | of | for |
//! |---|---|---|
//! | [`narrow`] | 32 bits, below 2^-13 (36.6 km/s) | every tick |
//! | [`fixed_32`] | 32 bits, full range, one step 1.6 Hz at 437 MHz | general use |
//! | [`float_32`] | `f32`, correctly rounded | general use |
//! | [`Rapidity`] | 64 bits, full range | set-up, exact sums |
//!
//! The worst error of each is in [`bounds`].
//!
//! ```
//! use fixed::types::{I16F16, I32F32};
//! use shiftkeel::rapidity::Rapidity;
//! let motion = Rapidity::from_range_rate(I16F16::from_num(-7000)); // approaching: positive
//! let crystal = Rapidity::from_parts_per_billion(I32F32::from_num(-300)).unwrap();
//! assert!(motion + crystal < motion);
//! ```

mod arithmetic;
pub mod bounds;
mod coefficients;
mod error;
mod exponential;
pub mod fixed_32;
pub mod float_32;
mod float_quick;
mod from_ratio;
mod from_speed;
mod logarithm;
mod motion;
pub mod narrow;
mod shift;
pub(crate) mod wide_product;

pub use error::RapidityError;
pub use from_speed::SPEED_OF_LIGHT;
pub use motion::{Delay, Motion, RapidityRate};
pub use shift::{ShiftFactor, ShiftOffset, compose_beta_32};

use fixed::types::I4F60;

/// ln(received frequency / transmitted frequency), signed, I4F60: range (-8, 8), steps of 8.7e-19.
/// Positive = approaching = blue shift. Sums are exact until they saturate, and stay saturated.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Rapidity(I4F60);

#[cfg(feature = "defmt")]
impl defmt::Format for Rapidity {
    fn format(&self, formatter: defmt::Formatter<'_>) {
        defmt::write!(formatter, "Rapidity({=i64})", self.to_bits());
    }
}

impl Rapidity {
    /// Fraction bits of the format.
    pub const FRACTION_BITS: u32 = 60;

    /// No shift.
    pub const ZERO: Self = Self(I4F60::ZERO);

    /// From bits: rapidity times 2^60.
    pub const fn from_bits(bits: i64) -> Self {
        Self(I4F60::from_bits(bits))
    }

    /// The bits: rapidity times 2^60.
    pub const fn to_bits(self) -> i64 {
        self.0.to_bits()
    }
}

impl From<I4F60> for Rapidity {
    fn from(rapidity: I4F60) -> Self {
        Self(rapidity)
    }
}

impl From<Rapidity> for I4F60 {
    fn from(rapidity: Rapidity) -> Self {
        rapidity.0
    }
}
