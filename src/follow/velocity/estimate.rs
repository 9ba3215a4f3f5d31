//! A measured range rate with its own time.

use super::units::speed_from_rapidity;
use crate::follow::FollowError;
use crate::rapidity::Rapidity;
use crate::time::GpsTime;
use fixed::types::I16F16;

/// Speed of light, m/s.
const LIGHT: f32 = 299_792_458.0;

/// A range rate, held as rapidity, and the instant at which it was true.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Estimate {
    time: GpsTime,
    rapidity: Rapidity,
}

impl Estimate {
    /// From a rapidity (positive = approaching) and its time.
    pub const fn from_rapidity(time: GpsTime, rapidity: Rapidity) -> Self {
        Self { time, rapidity }
    }

    /// From a range rate in m/s, positive = receding, I16F16 (to 32.7 km/s, steps of 15 um/s);
    /// [`Rapidity`] has constructors from other forms.
    pub const fn from_range_rate(time: GpsTime, range_rate: I16F16) -> Self {
        Self::from_rapidity(time, Rapidity::from_range_rate(range_rate))
    }

    /// From a range rate in m/s, positive = receding, `f32`, magnitude below 32 768 m/s.
    ///
    /// # Errors
    /// [`FollowError::NotFinite`] for NaN and infinities, [`FollowError::BeyondLight`] at or beyond
    /// the speed of light, [`FollowError::BeyondFormat`] from 32 768 m/s up to there.
    pub fn from_metres_per_second(time: GpsTime, range_rate: f32) -> Result<Self, FollowError> {
        if !range_rate.is_finite() {
            return Err(FollowError::NotFinite);
        }
        if range_rate.abs() >= LIGHT {
            return Err(FollowError::BeyondLight);
        }
        let fixed = I16F16::checked_from_num(range_rate).ok_or(FollowError::BeyondFormat)?;
        Ok(Self::from_range_rate(time, fixed))
    }

    /// What is left when a table is ahead: this estimate minus the table's rapidity at the
    /// estimate's own time. Exact; saturates at the ends of the format.
    #[must_use]
    pub fn beyond(self, table: Rapidity) -> Self {
        let left = self.rapidity.to_bits().saturating_sub(table.to_bits());
        Self { rapidity: Rapidity::from_bits(left), ..self }
    }

    /// The instant at which the estimate was true.
    pub const fn time(self) -> GpsTime {
        self.time
    }

    /// The estimate as rapidity, positive = approaching.
    pub const fn rapidity(self) -> Rapidity {
        self.rapidity
    }

    /// How far this estimate is from a prediction, m/s, positive = receding faster than predicted.
    pub(super) fn residual(self, predicted: Rapidity) -> f32 {
        speed_from_rapidity(self.rapidity.to_bits().saturating_sub(predicted.to_bits()))
    }
}
