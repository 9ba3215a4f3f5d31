//! UTC instants: reading and writing ISO 8601 text, and seconds between them.

use chrono::{DateTime, NaiveDate, NaiveDateTime, SecondsFormat, TimeDelta, Utc};

/// Why a time could not be read.
#[derive(Debug, thiserror::Error)]
#[error(
    "'{text}' is not an ISO 8601 time; write it like 2026-06-01T12:00:00Z (UTC, fractions of a second allowed)"
)]
pub struct NotATime {
    text: String,
}

/// Reads an ISO 8601 time.
///
/// Without a zone it is UTC; `Z` and offsets such as `+02:00` are understood, and so are a space instead
/// of the `T`, a missing time of day (midnight) and ordinal dates (`2026-152T12:00:00`).
///
/// # Errors
/// [`NotATime`] with the text when it is none of these.
///
/// ```
/// use shiftkeel_desk::instant::{read, write};
/// assert_eq!(write(read("2026-06-01T14:00:00.25+02:00").unwrap()), "2026-06-01T12:00:00.250Z");
/// assert_eq!(read("2026-152").unwrap(), read("2026-06-01 00:00").unwrap());
/// assert!(read("1 June").is_err());
/// ```
pub fn read(text: &str) -> Result<DateTime<Utc>, NotATime> {
    let trimmed = text.trim();
    if let Ok(time) = DateTime::parse_from_rfc3339(&trimmed.replacen(' ', "T", 1)) {
        return Ok(time.with_timezone(&Utc));
    }
    let bare = trimmed.strip_suffix(['Z', 'z']).unwrap_or(trimmed).replacen(' ', "T", 1);
    let formats = ["%Y-%m-%dT%H:%M:%S%.f", "%Y-%m-%dT%H:%M", "%Y-%jT%H:%M:%S%.f", "%Y-%jT%H:%M"];
    let time = formats.iter().find_map(|format| NaiveDateTime::parse_from_str(&bare, format).ok());
    let date = || {
        let date = ["%Y-%m-%d", "%Y-%j"].iter().find_map(|form| NaiveDate::parse_from_str(&bare, form).ok());
        date.and_then(|day| day.and_hms_opt(0, 0, 0))
    };
    let found = time.or_else(date).ok_or_else(|| NotATime { text: text.to_string() })?;
    Ok(found.and_utc())
}

/// Writes a time with milliseconds, or with nanoseconds when milliseconds do not hold it.
pub fn write(time: DateTime<Utc>) -> String {
    let whole = time.timestamp_subsec_nanos().is_multiple_of(1_000_000);
    time.to_rfc3339_opts(if whole { SecondsFormat::Millis } else { SecondsFormat::Nanos }, true)
}

/// Seconds from `from` to `to`, exact to a nanosecond within a hundred days, to a microsecond beyond.
pub fn seconds_between(from: DateTime<Utc>, to: DateTime<Utc>) -> f64 {
    let difference = to - from;
    difference.num_seconds() as f64 + f64::from(difference.subsec_nanos()) * 1e-9
}

/// The instant `seconds` after `from`, to the nearest nanosecond; `None` beyond the calendar.
pub fn after(from: DateTime<Utc>, seconds: f64) -> Option<DateTime<Utc>> {
    if !seconds.is_finite() || seconds.abs() > 1e12 {
        return None;
    }
    let whole = seconds.floor();
    let nanoseconds = ((seconds - whole) * 1e9).round();
    let delta = TimeDelta::new(whole as i64, 0)?.checked_add(&TimeDelta::nanoseconds(nanoseconds as i64))?;
    from.checked_add_signed(delta)
}
