//! What can be wrong with the arguments of a constructor.

use core::fmt;

/// Why a value is not a rapidity.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum RapidityError {
    /// The float is not a number.
    NotANumber,
    /// The float is infinite.
    Infinite,
    /// The speed is that of light or more.
    NotBelowLight,
    /// The frequency, count or factor is zero.
    Zero,
    /// The offset takes away the whole frequency, or more.
    OffsetBelowMinusOne,
    /// The rapidity would not lie in (-8, 8).
    OutOfRange,
}

impl fmt::Display for RapidityError {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(match self {
            Self::NotANumber => "the speed is not a number; pass a finite speed in m/s",
            Self::Infinite => "the speed is infinite; pass a finite speed in m/s",
            Self::NotBelowLight => {
                "the speed is not below that of light; check that it is in m/s, or as a ratio in (-1, 1)"
            }
            Self::Zero => "a frequency or count of zero has no ratio; pass two positive ones",
            Self::OffsetBelowMinusOne => {
                "the offset leaves no frequency; parts per billion must be above -1e9"
            }
            Self::OutOfRange => {
                "the rapidity is not in (-8, 8), a frequency factor of 2980; check the units of the arguments"
            }
        })
    }
}

impl core::error::Error for RapidityError {}
