//! GPS time at its edges: leap seconds, the calendar, Unix time, timers.

mod reference;

use fugit::{Duration, ExtU64};
use reference::orbits::Random;
use shiftkeel::time::{GpsTime, TimeError};

fn whole(time: GpsTime) -> i64 {
    assert_eq!(time.to_bits() & ((1 << 30) - 1), 0);
    time.to_bits() >> 30
}

/// Unix seconds of a calendar date by counting days one by one: slow, with no formula in common with the crate.
fn unix_of(year: i64, month: usize, day: i64) -> i64 {
    let leap = |year: i64| year % 4 == 0 && (year % 100 != 0 || year % 400 == 0);
    let years: i64 = (1970..year).map(|y| if leap(y) { 366 } else { 365 }).sum();
    let lengths = [31, if leap(year) { 29 } else { 28 }, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
    (years + lengths[..month - 1].iter().sum::<i64>() + day - 1) * 86_400
}

/// Dates at whose start a leap second had just been inserted, and GPS - UTC from then on. Source: IERS Bulletin C, the
/// list of all since 1981, from memory.
const LEAPS: [(u16, u8, i64); 18] = [
    (1981, 7, 1),
    (1982, 7, 2),
    (1983, 7, 3),
    (1985, 7, 4),
    (1988, 1, 5),
    (1990, 1, 6),
    (1991, 1, 7),
    (1992, 7, 8),
    (1993, 7, 9),
    (1994, 7, 10),
    (1996, 1, 11),
    (1997, 7, 12),
    (1999, 1, 13),
    (2006, 1, 14),
    (2009, 1, 15),
    (2012, 7, 16),
    (2015, 7, 17),
    (2017, 1, 18),
];

/// GPS minus UTC before, in and after every leap second; 18 s since 2017.
#[test]
fn leap_seconds_are_where_they_were() {
    for (year, month, after) in LEAPS {
        let unix = unix_of(i64::from(year), usize::from(month), 1);
        let gps_less_unix = |unix: i64| whole(GpsTime::from_unix(unix, 0).unwrap()) - (unix - 315_964_800);
        assert_eq!(gps_less_unix(unix - 1), after - 1, "{year}-{month}");
        assert_eq!(gps_less_unix(unix), after, "{year}-{month}");
        // The inserted second itself: between 23:59:59 and 00:00:00.
        let (year_before, month_before, day) =
            if month == 1 { (year - 1, 12, 31) } else { (year, month - 1, 30) };
        let utc = |second| GpsTime::from_utc(year_before, month_before, day, [23, 59, second], 0).unwrap();
        assert_eq!(whole(utc(60)), whole(utc(59)) + 1);
        assert_eq!(whole(GpsTime::from_utc(year, month, 1, [0; 3], 0).unwrap()), whole(utc(60)) + 1);
        // Unix time has no name of its own for it.
        assert_eq!(utc(59).to_unix(), Ok((unix - 1, 0)));
        assert_eq!(utc(60).to_unix(), Ok((unix, 0)));
        assert_eq!(GpsTime::from_unix(unix, 0).unwrap().to_unix(), Ok((unix, 0)));
    }
    // GPS - UTC = 18 s today: GPS week 2421 began on 2026-05-31 at 18 s before midnight UTC.
    let time = GpsTime::from_utc(2026, 5, 31, [0; 3], 0).unwrap();
    assert_eq!(whole(time) - 18, 2421 * 604_800);
}

/// 2016-12-31T23:59:60 is a second like any other (the last one inserted so far).
#[test]
fn the_last_leap_second_lasts_a_second() {
    let utc = |day, month, year, time, nanoseconds| GpsTime::from_utc(year, month, day, time, nanoseconds);
    let middle = utc(31, 12, 2016, [23, 59, 60], 500_000_000).unwrap();
    assert_eq!(middle.seconds_since(utc(31, 12, 2016, [23, 59, 59], 0).unwrap()), 1.5);
    assert_eq!(utc(1, 1, 2017, [0; 3], 0).unwrap().seconds_since(middle), 0.5);
    assert_eq!(middle.to_unix(), Ok((1_483_228_800, 500_000_000)));
    for (day, month, year) in [(31, 12, 2017), (30, 6, 2016), (31, 12, 2026), (28, 2, 2017)] {
        assert_eq!(utc(day, month, year, [23, 59, 60], 0), Err(TimeError::NotInCalendar));
    }
    for time in [[22, 59, 60], [23, 58, 60], [0, 0, 60]] {
        assert_eq!(utc(31, 12, 2016, time, 0), Err(TimeError::NotInCalendar), "{time:?}");
    }
}

/// Every day from 1980 to 2150, against counting.
#[test]
fn the_calendar_is_gregorian() {
    let lengths = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
    let mut days = 0;
    for year in 1980..2150u16 {
        for month in 1..=12u8 {
            let leap = year % 4 == 0 && (year % 100 != 0 || year % 400 == 0);
            let length = lengths[usize::from(month) - 1] + u8::from(month == 2 && leap);
            for day in 1..=length {
                let unix = unix_of(i64::from(year), usize::from(month), i64::from(day));
                let time = GpsTime::from_utc(year, month, day, [0; 3], 0);
                assert_eq!(time, GpsTime::from_unix(unix, 0), "{year}-{month}-{day}");
                days += 1;
            }
            let over = GpsTime::from_utc(year, month, length + 1, [0; 3], 0);
            assert_eq!(over, Err(TimeError::NotInCalendar), "{year}-{month}-{}", length + 1);
        }
    }
    assert_eq!(days, 62_092);
    assert_eq!(GpsTime::from_utc(1980, 1, 6, [0; 3], 0), Ok(GpsTime::default()));
}

/// What no calendar or clock has, and what lies outside the format.
#[test]
fn nonsense_is_refused_by_name() {
    let utc = GpsTime::from_utc;
    for refused in [
        utc(2026, 0, 1, [0; 3], 0),
        utc(2026, 13, 1, [0; 3], 0),
        utc(2026, 255, 1, [0; 3], 0),
        utc(2026, 6, 0, [0; 3], 0),
        utc(2026, 6, 31, [0; 3], 0),
        utc(2026, 2, 29, [0; 3], 0),
        utc(2100, 2, 29, [0; 3], 0),
        utc(2026, 6, 1, [24, 0, 0], 0),
        utc(2026, 6, 1, [0, 60, 0], 0),
        utc(2026, 6, 1, [0, 0, 61], 0),
        utc(2026, 6, 1, [0, 0, 0], 1_000_000_000),
        GpsTime::from_unix(1_780_315_200, u32::MAX),
        GpsTime::from_gps_seconds(0, 1_000_000_000),
    ] {
        assert_eq!(refused, Err(TimeError::NotInCalendar));
    }
    for refused in [
        utc(1980, 1, 5, [23, 59, 59], 999_999_999),
        utc(0, 1, 1, [0; 3], 0),
        utc(1970, 1, 1, [0; 3], 0),
        utc(2253, 1, 1, [0; 3], 0),
        utc(u16::MAX, 12, 31, [0; 3], 0),
        GpsTime::from_unix(0, 0),
        GpsTime::from_unix(315_964_799, 999_999_999),
        GpsTime::from_unix(i64::MIN, 0),
        GpsTime::from_unix(i64::MAX, 0),
        GpsTime::from_gps_seconds(1 << 33, 0),
        GpsTime::from_gps_seconds(i64::MIN, 0),
        GpsTime::from_gps_seconds(i64::MAX, 0),
    ] {
        assert_eq!(refused, Err(TimeError::OutOfRange));
    }
    assert_eq!(GpsTime::from_bits(-1).to_unix(), Err(TimeError::OutOfRange));
    assert!(utc(2000, 2, 29, [23, 59, 59], 999_999_999).is_ok());
    assert!(utc(2252, 1, 1, [0; 3], 0).is_ok());
    let [first, second] = [TimeError::OutOfRange, TimeError::NotInCalendar].map(|error| error.to_string());
    assert!(first.contains("1980-01-06") && second.contains("UTC"));
}

/// Unix time there and back, to the nanosecond, over the whole range; and back and there to one step.
#[test]
fn unix_time_comes_back() {
    let mut random = Random::new(21);
    for _ in 0..200_000 {
        let unix = random.between(315_964_800.0, 8.9e9) as i64;
        let nanoseconds = (random.bits() % 1_000_000_000) as u32;
        let time = GpsTime::from_unix(unix, nanoseconds).unwrap();
        assert_eq!(time.to_unix(), Ok((unix, nanoseconds)));
        let bits = (random.bits() >> 1) as i64 >> random.between(0.0, 30.0) as u32;
        let time = GpsTime::from_bits(bits % (8 << 60));
        if let Ok((unix, nanoseconds)) = time.to_unix()
            && let Ok(again) = GpsTime::from_unix(unix, nanoseconds)
        {
            let apart = (again.to_bits() - time.to_bits()).abs();
            // Inside a leap second Unix time names the next second too.
            assert!(apart <= 1 || apart == 1 << 30, "{bits}: {apart}");
        }
    }
    for nanoseconds in [0, 1, 2, 499_999_999, 500_000_000, 999_999_998, 999_999_999] {
        let time = GpsTime::from_unix(1_780_315_200, nanoseconds).unwrap();
        assert_eq!(time.to_unix(), Ok((1_780_315_200, nanoseconds)));
    }
    assert_eq!(GpsTime::from_bits((1 << 30) - 1).to_unix(), Ok((315_964_800, 999_999_999)));
}

/// Timers of any rate, exactly where the rate allows, to half a step elsewhere, saturating at the end.
#[test]
fn timers_add_up() {
    let start = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0).unwrap();
    assert_eq!(start.plus(1500u64.millis::<1, 1000>()).seconds_since(start), 1.5);
    assert_eq!(
        start.plus(Duration::<u64, 1, 32_768>::from_ticks(32_768 * 3 + 1)).seconds_since(start),
        3.0 + 1.0 / 32_768.0
    );
    assert_eq!(start.plus(Duration::<u64, 60, 1>::from_ticks(2)).seconds_since(start), 120.0);
    // 84 MHz: 2^30 / 84e6 = 12.78 steps a tick.
    let mut random = Random::new(22);
    for _ in 0..10_000 {
        let ticks = random.bits() >> 20;
        let added = start.plus(Duration::<u64, 1, 84_000_000>::from_ticks(ticks)).to_bits() - start.to_bits();
        let doubled_error = 2 * ((i128::from(added) * 84_000_000) - (i128::from(ticks) << 30));
        assert!(doubled_error.abs() <= 84_000_000, "{ticks}: {added}");
    }
    let end = GpsTime::from_bits(i64::MAX);
    assert_eq!(start.plus(Duration::<u64, 1, 1>::from_ticks(u64::MAX)), end);
    assert_eq!(start.plus(Duration::<u64, { u64::MAX }, 1>::from_ticks(u64::MAX)), end);
    assert_eq!(end.plus(Duration::<u64, 1, 1000>::from_ticks(1)), end);
}

/// Seconds there and back; far apart they saturate rather than wrap.
#[test]
fn differences_are_exact_and_saturate() {
    let start = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0).unwrap();
    let mut random = Random::new(23);
    for _ in 0..100_000 {
        let bits = (random.bits() as i64) >> 11;
        let later = GpsTime::from_bits(start.to_bits() + bits);
        let seconds = later.seconds_since(start);
        assert_eq!(seconds * (1u64 << 30) as f64, bits as f64);
        assert_eq!(start.plus_seconds(seconds), later);
    }
    let (first, last) = (GpsTime::from_bits(i64::MIN), GpsTime::from_bits(i64::MAX));
    assert_eq!(last.seconds_since(first), 2.0_f64.powi(33));
    assert_eq!(first.seconds_since(last), -(2.0_f64.powi(33)));
    assert_eq!(start.plus_seconds(1e300), last);
    assert_eq!(GpsTime::default().plus_seconds(-1e300), first);
    assert_eq!(start.plus_seconds(f64::NAN), start);
}
