//! Time: GPS time in steps of 2^-30 s, without leap seconds inside.
//!
//! A radio that follows a motion needs time that neither jumps nor repeats; GPS time does that. UTC exists
//! only at the edges, where the leap table below turns it into GPS time and back. One step (0.93 ns) moves a
//! low orbit's shift at 437 MHz by at most 0.13 microhertz.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: years have 16 bits and seconds 33, so days, seconds and their scaled sums stay far inside 64"
)]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: tested before, or a cast from a float, which saturates"
)]
#![allow(
    clippy::indexing_slicing,
    reason = "set-up: a month from 1 to 12, and a count below the table's length"
)]

use fugit::Duration;

/// An instant: seconds since 1980-01-06T00:00:00 UTC counted without leap seconds, signed, in units of
/// 2^-30 s (0.93 ns), 1708 to 2252.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct GpsTime(i64);

/// Why a time could not be converted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum TimeError {
    /// Before GPS time began, 1980-01-06, or after the format's end, 2252.
    OutOfRange,
    /// A month, day, hour, minute, second or fraction that the calendar does not have.
    NotInCalendar,
}

impl core::fmt::Display for TimeError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::OutOfRange => "time outside 1980-01-06 to 2252; check the year and the scale (UTC, GPS, TAI)",
            Self::NotInCalendar => {
                "no such date or time of day in UTC; a 60th second exists only where a leap second was inserted"
            }
        })
    }
}

impl core::error::Error for TimeError {}

const SECOND: i64 = 1 << GpsTime::FRACTION_BITS;
/// Unix seconds (UTC, leap seconds not counted) of the GPS epoch.
const GPS_EPOCH_UNIX: i64 = 315_964_800;
const DAY: i64 = 86_400;

/// Days since 1970-01-01 at whose first instant (UTC) GPS minus UTC grew by one second.
///
/// Source: the leap seconds announced by the IERS (Bulletin C), from memory; the last one took effect on
/// 2017-01-01 and makes GPS - UTC = 18 s. To add one, append the day on which it takes effect.
const LEAP_DAYS: [u16; 18] = [
    4199, 4564, 4929, 5660, 6574, 7305, 7670, 8217, 8582, 8947, 9496, 10043, 10592, 13149, 14245, 15522,
    16617, 17167,
];

impl GpsTime {
    /// Fraction bits of a second.
    pub const FRACTION_BITS: u32 = 30;

    /// From units of 2^-30 s.
    pub const fn from_bits(bits: i64) -> Self {
        Self(bits)
    }

    /// In units of 2^-30 s.
    pub const fn to_bits(self) -> i64 {
        self.0
    }

    /// From GPS seconds and nanoseconds (below 10^9), rounded to the nearest 2^-30 s.
    ///
    /// # Errors
    /// [`TimeError::NotInCalendar`] for 10^9 nanoseconds or more, [`TimeError::OutOfRange`] beyond 2^33 s.
    pub const fn from_gps_seconds(seconds: i64, nanoseconds: u32) -> Result<Self, TimeError> {
        if nanoseconds >= 1_000_000_000 {
            return Err(TimeError::NotInCalendar);
        }
        if seconds < -(1 << 33) || seconds >= (1 << 33) - 1 {
            return Err(TimeError::OutOfRange);
        }
        let fraction = (((nanoseconds as u64) << 30) + 500_000_000) / 1_000_000_000;
        Ok(Self((seconds << 30) + fraction as i64))
    }

    /// From UTC as Unix seconds (POSIX: leap seconds not counted) and nanoseconds, 1980 on.
    ///
    /// # Errors
    /// [`TimeError::OutOfRange`] before the GPS epoch or beyond the format.
    pub const fn from_unix(seconds: i64, nanoseconds: u32) -> Result<Self, TimeError> {
        if seconds < GPS_EPOCH_UNIX {
            return Err(TimeError::OutOfRange);
        }
        Self::from_gps_seconds(seconds - GPS_EPOCH_UNIX + leap_seconds_at_unix(seconds), nanoseconds)
    }

    /// From a UTC calendar date and time of day. Second 60 is accepted where a leap second was inserted.
    ///
    /// # Errors
    /// [`TimeError::NotInCalendar`] for a field the calendar does not have, [`TimeError::OutOfRange`].
    ///
    /// # Source
    /// GPS - UTC was 18 s from 2017 on, as in every GPS navigation message since.
    /// ```
    /// use shiftkeel::time::GpsTime;
    /// let time = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0)?;
    /// assert_eq!(time.to_bits() >> 30, 1_464_350_418);
    /// assert_eq!(time.to_unix(), Ok((1_780_315_200, 0)));
    /// # Ok::<(), shiftkeel::time::TimeError>(())
    /// ```
    pub const fn from_utc(
        year: u16,
        month: u8,
        day: u8,
        [hour, minute, second]: [u8; 3],
        nanoseconds: u32,
    ) -> Result<Self, TimeError> {
        let days = days_from_civil(year as i64, month as i64, day as i64);
        let lengths = [31, if is_leap_year(year) { 29 } else { 28 }, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
        if month < 1 || month > 12 || day < 1 || hour > 23 || minute > 59 || second > 60 {
            return Err(TimeError::NotInCalendar);
        }
        if day > lengths[month as usize - 1] {
            return Err(TimeError::NotInCalendar);
        }
        let midnight = days * DAY;
        let inserted = leap_seconds_at_unix(midnight + DAY) > leap_seconds_at_unix(midnight);
        if second == 60 && !(inserted && hour == 23 && minute == 59) {
            return Err(TimeError::NotInCalendar);
        }
        if midnight < GPS_EPOCH_UNIX {
            return Err(TimeError::OutOfRange);
        }
        let of_day = hour as i64 * 3600 + minute as i64 * 60 + second as i64;
        Self::from_gps_seconds(
            midnight - GPS_EPOCH_UNIX + leap_seconds_at_unix(midnight) + of_day,
            nanoseconds,
        )
    }

    /// UTC as Unix seconds and nanoseconds (to the nearest, so that [`Self::from_unix`] comes back to the
    /// nanosecond). Inside a leap second the Unix count repeats.
    ///
    /// # Errors
    /// [`TimeError::OutOfRange`] before 1980-01-06.
    pub const fn to_unix(self) -> Result<(i64, u32), TimeError> {
        if self.0 < 0 {
            return Err(TimeError::OutOfRange);
        }
        let gps = self.0 >> 30;
        let nanoseconds = (((self.0 & (SECOND - 1)) as u64 * 1_000_000_000 + (1 << 29)) >> 30) as u32;
        let mut leap = 0;
        while leap < LEAP_DAYS.len() {
            let starts = LEAP_DAYS[leap] as i64 * DAY - GPS_EPOCH_UNIX + leap as i64;
            if gps <= starts {
                break;
            }
            leap += 1;
        }
        Ok((gps + GPS_EPOCH_UNIX - leap as i64, nanoseconds))
    }

    /// Seconds from `earlier` to `self`, as f64: exact up to 2^23 s (97 days) apart, saturating at 2^33 s.
    pub fn seconds_since(self, earlier: Self) -> f64 {
        self.0.saturating_sub(earlier.0) as f64 * (1.0 / SECOND as f64)
    }

    /// This instant plus `seconds`, rounded to the nearest 2^-30 s, saturating.
    pub fn plus_seconds(self, seconds: f64) -> Self {
        Self(self.0.saturating_add(libm::round(seconds * SECOND as f64) as i64))
    }

    /// This instant plus a firmware timer's duration, rounded to the nearest 2^-30 s.
    ///
    /// # Cost
    /// One 128-bit division: for set-up, not for every tick.
    pub const fn plus<const NUMERATOR: u64, const DENOMINATOR: u64>(
        self,
        duration: Duration<u64, NUMERATOR, DENOMINATOR>,
    ) -> Self {
        const { assert!(DENOMINATOR != 0, "a timer's tick has a denominator") };
        let Some(scaled) = (duration.as_ticks() as u128 * NUMERATOR as u128).checked_mul(1 << 30) else {
            return Self(i64::MAX);
        };
        let bits = scaled.saturating_add((DENOMINATOR / 2) as u128) / DENOMINATOR as u128;
        if bits > i64::MAX as u128 { Self(i64::MAX) } else { Self(self.0.saturating_add(bits as i64)) }
    }
}

const fn is_leap_year(year: u16) -> bool {
    year.is_multiple_of(4) && !year.is_multiple_of(100) || year.is_multiple_of(400)
}

/// Days from 1970-01-01 to a Gregorian date (counting years from March, as calendar arithmetic commonly does).
const fn days_from_civil(year: i64, month: i64, day: i64) -> i64 {
    let (year, month) = if month > 2 { (year, month - 3) } else { (year - 1, month + 9) };
    365 * year + year / 4 - year / 100 + year / 400 + (153 * month + 2) / 5 + day - 1 - 719_468
}

/// GPS minus UTC at a Unix time, in seconds.
const fn leap_seconds_at_unix(unix: i64) -> i64 {
    let mut leap = 0;
    while leap < LEAP_DAYS.len() && LEAP_DAYS[leap] as i64 * DAY <= unix {
        leap += 1;
    }
    leap as i64
}
