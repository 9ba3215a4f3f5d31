//! What a follower refuses.

use core::fmt;

/// Why a setting or an input was refused. The state is as it was before.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum FollowError {
    /// A number is not a number or infinite.
    NotFinite,
    /// A range rate is at or beyond the speed of light.
    BeyondLight,
    /// A value does not fit its format: a range rate of 32 768 m/s or more, a time step of 2^31 s or more.
    BeyondFormat,
    /// Measurement sigma, update interval, gate, latency, longest coast or acceleration limit is out of range.
    Setting,
    /// Gains or tracking index that cannot follow stably, or fixed gains for dynamics that have none.
    Gains,
    /// M of N without a majority, with M below 2, or with N above what the state can hold.
    Confirmation,
    /// The tick is before the last one.
    TimeBackwards,
    /// The tick, or the estimate, has the time of the one before.
    ZeroInterval,
    /// The estimate is tagged later than the tick.
    FutureEstimate,
    /// The estimate is tagged before the last one.
    EstimateBackwards,
    /// The estimate is older than the latency that the settings allow.
    LateEstimate,
}

impl fmt::Display for FollowError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::NotFinite => "value is NaN or infinite: drop the estimate and step without one",
            Self::BeyondLight => "range rate is at or beyond the speed of light: check its unit",
            Self::BeyondFormat => {
                "value is beyond the format (range rate below 32768 m/s, steps below 2^31 s)"
            }
            Self::Setting => "setting of the velocity filter is out of range: see its documentation",
            Self::Gains => "gains or tracking index are not stable, or do not suit the dynamics",
            Self::Confirmation => "confirmation M of N needs N/2 < M, 2 <= M <= N <= 8",
            Self::TimeBackwards => "tick is before the last one: pass times that grow, or start a new state",
            Self::ZeroInterval => "tick or estimate has the time of the one before: pass times that grow",
            Self::FutureEstimate => "estimate is tagged later than the tick: check the clock that tags it",
            Self::EstimateBackwards => {
                "estimate is tagged before the last one: pass estimates in their order"
            }
            Self::LateEstimate => "estimate is older than the latency in the settings: drop it or allow more",
        })
    }
}

impl core::error::Error for FollowError {}
