//! What a tuning call refuses.

/// Why a channel could not be built, or a tick not be steered.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum TuningError {
    /// The oscillator clock is zero.
    ClockZero,
    /// The carrier is zero, or above 1.09 THz after translation.
    CarrierNotUsable,
    /// A transponder's downlink would not be a positive frequency, or is a factor 16 or more from its uplink.
    TransponderNotUsable,
    /// A crystal's offset, or its difference to the clock's, is beyond 2^-10 (976 parts per million).
    CrystalTooFar,
    /// An interval of no clocks, or of a minute or more.
    IntervalNotUsable,
    /// A synthesiser was asked for a frequency below zero: the conversions exceed the carrier, or the injection
    /// side is wrong.
    NegativeOutput,
    /// A synthesiser was asked for 65536 times its reference or more.
    RatioTooHigh,
    /// The permitted band is empty, or an edge of it is half the oscillator clock or more away from the carrier.
    FenceNotUsable,
    /// The emitted frequency lies outside the permitted band, by this many hertz (rounded up).
    OutsideFence {
        /// Hertz beyond the nearer edge.
        hertz: u32,
    },
    /// The table is asked with the time of the signal's other end: a receiver's with that of transmission, or a
    /// transmitter's with that of reception.
    OtherEnd,
    /// The rapidity is saturated or beyond 2^-13 (36 km/s); or it and the delay do not belong together, because an
    /// interval was missed, came twice, or the table is another; or the step changes by 3/8 of a cycle per clock or more
    /// in an interval: the last word stays.
    TooFast,
    /// Every tick of a stretch was steered and no next one laid: the last word stays.
    UsedUp,
}

impl core::fmt::Display for TuningError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::ClockZero => "oscillator clock of zero: give the clock in hertz",
            Self::CarrierNotUsable => "carrier of zero or above 1.09 THz: give the RF carrier in hertz, not an offset",
            Self::TransponderNotUsable => {
                "transponder's downlink not above zero, or a factor 16 from its uplink: check the constant and the sense"
            }
            Self::CrystalTooFar => "crystal offset beyond 976 ppm: check its unit (parts per billion)",
            Self::IntervalNotUsable => "an interval must have at least one clock and last under a minute",
            Self::NegativeOutput => {
                "the synthesiser would have to make a negative frequency: check the conversions and the injection side"
            }
            Self::RatioTooHigh => "output 65536 times the reference or more: check the clock",
            Self::FenceNotUsable => "permitted band empty, or an edge half the oscillator clock or more from the carrier: narrow it",
            Self::OutsideFence { hertz } => {
                return write!(formatter, "emission {hertz} Hz outside the permitted band: not radiated");
            }
            Self::OtherEnd => {
                "table of the other end: bake it for reception here (receiver) or transmission from here (transmitter)"
            }
            Self::TooFast => {
                "motion beyond 2^-13 (36 km/s), not one interval after the last, or above 3/8 cycle per clock in it: last word kept; begin again, or steer more often"
            }
            Self::UsedUp => "no tick of the stretch is left: last word kept; lay the next one in time",
        })
    }
}

impl core::error::Error for TuningError {}
