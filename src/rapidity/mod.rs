//! Rapidity: the natural logarithm of received over transmitted frequency.

mod motion;
pub use motion::{Delay, Motion, RapidityRate};

use fixed::types::I4F60;

/// ln(received frequency / transmitted frequency), signed, I4F60: range (-8, 8), steps of 8.7e-19.
/// Positive = approaching = blue shift. Sums saturate.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Rapidity(I4F60);

impl Rapidity {
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
