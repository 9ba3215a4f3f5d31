//! The permission to radiate.

use super::TuningError;
use crate::frequency::Frequency;

/// Permission to radiate on a band of frequencies: the value without which no transmitting channel exists.
///
/// **A licence and the local rules decide what may be transmitted, with which power and where.** Name only what
/// they allow. Check the emission with a receiver or analyser before connecting an antenna. Nothing here is
/// fit for safety-of-life navigation.
///
/// ```
/// use shiftkeel::frequency::Frequency;
/// use shiftkeel::tuning::Permission;
/// let low = Frequency::from_hertz(435_000_000).unwrap();
/// let high = Frequency::from_hertz(438_000_000).unwrap();
/// assert!(Permission::to_radiate(low, high).is_ok());
/// assert!(Permission::to_radiate(high, low).is_err());
/// ```
///
/// No transmitting channel without one:
/// ```compile_fail,E0061
/// use shiftkeel::frequency::Frequency;
/// use shiftkeel::tuning::{Channel, RfPlan};
/// let carrier = Frequency::from_hertz(437_000_000).unwrap();
/// let clock = Frequency::from_hertz(100_000_000).unwrap();
/// let channel = Channel::transmit(&RfPlan::direct(carrier, clock), 1000);
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Permission {
    lowest: Frequency,
    highest: Frequency,
}

impl Permission {
    /// Allows emission from `lowest` to `highest`, both included.
    ///
    /// # Errors
    /// [`TuningError::FenceNotUsable`] when the band is empty.
    pub const fn to_radiate(lowest: Frequency, highest: Frequency) -> Result<Self, TuningError> {
        if lowest.to_bits() > highest.to_bits() {
            return Err(TuningError::FenceNotUsable);
        }
        Ok(Self { lowest, highest })
    }

    /// Lowest permitted frequency.
    pub const fn lowest(&self) -> Frequency {
        self.lowest
    }

    /// Highest permitted frequency.
    pub const fn highest(&self) -> Frequency {
        self.highest
    }
}
