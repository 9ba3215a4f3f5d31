//! What arcs, tables and their makers must refuse, by name, and what must do no harm.

mod passes;
mod reference;

use passes::{CARRIER, MILLIHERTZ, crc_32, synthetic};
use reference::orbits::Random;
use reference::vectors;
use shiftkeel::pass::bake::{BakeError, BakeSettings, Request, audit, bake, bake_arc};
use shiftkeel::pass::{
    Arc, ArcError, Direction, Geometry, GeometryError, MAX_ARC_WORDS, PassTable, Site, TableError, TaggedAt,
};
use shiftkeel::time::GpsTime;

const WHOLE: [f64; 2] = [346.0, 1082.0];

fn geometry(words: &[u32]) -> Geometry {
    let arc = Arc::new(words).unwrap();
    let site = passes::site(&vectors::SYNTHETIC_SITE);
    Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, 0.0).unwrap()
}

fn request(geometry: &Geometry, lateness_partial: bool) -> Request {
    let (start, end) = geometry.above(0.0).unwrap();
    let (slope_tolerance, delay_tolerance) = (10.0 * MILLIHERTZ, 0.015 / CARRIER);
    Request { start, end, slope_tolerance, delay_tolerance, lateness_partial }
}

/// The synthetic pass at 10 mHz.
fn table(lateness_partial: bool) -> Vec<u32> {
    let words = synthetic(WHOLE);
    let geometry = geometry(&words);
    let mut buffer = [0; 512];
    let request = request(&geometry, lateness_partial);
    bake_arc(&mut buffer, &Arc::new(&words).unwrap(), &geometry, &request).unwrap().words().to_vec()
}

fn refused(words: &[u32]) -> TableError {
    PassTable::new(words).expect_err("a refusal")
}

/// Cut short at every length.
#[test]
fn a_cut_table_is_refused() {
    for lateness_partial in [false, true] {
        let words = table(lateness_partial);
        for length in 0..words.len() {
            assert_eq!(refused(&words[..length]), TableError::Short, "{length} of {} words", words.len());
        }
        // More words than the table has do not matter.
        let mut longer = words.clone();
        longer.push(7);
        assert_eq!(PassTable::new(&longer).unwrap().words(), words);
    }
}

/// Any single bit, anywhere.
#[test]
fn every_flipped_bit_is_seen() {
    for lateness_partial in [false, true] {
        let words = table(lateness_partial);
        for bit in 0..words.len() * 32 {
            let mut damaged = words.clone();
            damaged[bit / 32] ^= 1 << (bit % 32);
            let error = refused(&damaged);
            let expected = match bit {
                13..16 => matches!(error, TableError::NewerVersion { found: 3 | 5 | 9 }),
                16..32 => error == TableError::NotATable,
                _ => matches!(error, TableError::Damaged | TableError::Short),
            };
            assert!(expected, "bit {bit}: {error:?}");
        }
    }
}

/// Nothing, zeros, ones, an arc, words in the other byte order, a later version.
#[test]
fn foreign_words_are_refused() {
    assert_eq!(refused(&[]), TableError::Short);
    assert_eq!(refused(&[0; 100]), TableError::NotATable);
    assert_eq!(refused(&[u32::MAX; 100]), TableError::NotATable);
    assert_eq!(refused(&synthetic(WHOLE)), TableError::NotATable);
    let mut words = table(false);
    let swapped: Vec<u32> = words.iter().map(|word| word.swap_bytes()).collect();
    assert_eq!(refused(&swapped), TableError::NotATable);
    assert_eq!(Arc::new(&words).err(), Some(ArcError::NotAnArc));
    words[0] = words[0] & !(0xF << 12) | 2 << 12;
    assert_eq!(refused(&words), TableError::NewerVersion { found: 2 });
}

/// Header fields that no bake writes, with a right checksum: refused, or read without a panic and without
/// overflow at any instant. (Tests are built with overflow checks.)
#[test]
fn hostile_tables_do_no_harm() {
    let good = [table(false), table(true)];
    let mut random = Random::new(11);
    let (mut accepted, mut answers) = (0, 0);
    for round in 0..40_000 {
        let mut words = good[round % 2].clone();
        let length = words.len();
        for _ in 0..=random.bits() % 6 {
            // Header and directory more often than records; the first word keeps magic and version.
            let reach = if random.bits().is_multiple_of(2) { 20 } else { length - 1 };
            let place = random.bits() as usize % reach;
            words[place] = match random.bits() % 4 {
                0 => random.bits() as u32,
                1 => words[place] ^ 1 << (random.bits() % 32),
                2 => u32::MAX,
                _ => 1 << (random.bits() % 32),
            };
        }
        words[0] = words[0] & 0xFFF | good[0][0] & !0xFFF;
        // A table of any number of segments, not too often beyond the buffer.
        words.resize(600, random.bits() as u32);
        let directory = |segments: u32| segments.next_power_of_two().max(2) / 2;
        let segments = words[13] >> 16;
        let partial = if words[0] & 8 != 0 { 4 * segments + 5 } else { 0 };
        let sum = 15 + directory(segments.min(1 << 16)) + 6 * segments + 1 + partial;
        let Some(body) = words.get(..sum as usize) else {
            assert!(PassTable::new(&words).is_err());
            continue;
        };
        words[sum as usize] = crc_32(body);
        let Ok(table) = PassTable::new(&words) else { continue };
        accepted += 1;
        let (start, end) = (table.start().to_bits(), table.end().to_bits());
        let inside = |share: f64| start.saturating_add((share * (end as f64 - start as f64)) as i64);
        let others = [start, end, start.wrapping_sub(1), end.wrapping_add(1), i64::MIN, i64::MAX, 0];
        let shares = (0..8).map(|_| inside(random.between(0.0, 1.0))).collect::<Vec<_>>();
        for bits in others.into_iter().chain(shares) {
            let time = GpsTime::from_bits(bits);
            answers += usize::from(table.at(time).is_ok());
            let _ = table.at_fine(time, random.bits() as u32);
            for lateness in [0, 3 << 24, -(2 << 24), 8 << 24, i32::MIN, i32::MAX] {
                answers += usize::from(table.at_late(time, lateness).is_ok());
            }
        }
        let _ =
            (table.evaluation_noise(), table.rapidity_noise(), table.proven_slope(), table.proven_delay());
        let _ =
            (table.direction(), table.tagged_at(), table.site(), table.element_epoch(), table.smoothness());
    }
    println!("{accepted} hostile tables accepted, {answers} answers");
    assert!(accepted > 10_000 && answers > 100_000);
}

/// Sites and states that are none.
#[test]
fn geometry_refuses_nonsense() {
    let nan = f64::NAN;
    for [latitude, longitude, height] in [
        [90.001, 0.0, 0.0],
        [-90.001, 0.0, 0.0],
        [0.0, 360.001, 0.0],
        [0.0, -400.0, 0.0],
        [0.0, 0.0, -501.0],
        [0.0, 0.0, 100_001.0],
        [nan, 0.0, 0.0],
        [0.0, nan, 0.0],
        [0.0, 0.0, nan],
        [f64::INFINITY, 0.0, 0.0],
    ] {
        let site = Site::geodetic(latitude, longitude, height);
        assert_eq!(site, Err(GeometryError::SiteOffEarth), "{latitude} {longitude} {height}");
    }
    // The limits themselves are places.
    for [latitude, longitude, height] in [[90.0, -360.0, -500.0], [-90.0, 360.0, 100_000.0]] {
        assert!(Site::geodetic(latitude, longitude, height).is_ok());
    }
    let site = passes::site(&vectors::SYNTHETIC_SITE);
    for velocity in [[1000.1, 0.0, 0.0], [0.0, -600.0, 900.0], [nan, 0.0, 0.0], [0.0, 0.0, f64::INFINITY]] {
        assert_eq!(site.moving(velocity, GpsTime::default()), Err(GeometryError::SiteTooFast));
    }
    assert!(site.moving([1000.0, 0.0, 0.0], GpsTime::default()).is_ok());
    let words = synthetic(WHOLE);
    let arc = Arc::new(&words).unwrap();
    for lateness in [60.1, -60.1, nan, f64::INFINITY] {
        let refusal = Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, lateness).err();
        assert_eq!(refusal, Some(GeometryError::LatenessTooLarge), "{lateness}");
    }
    assert!(Geometry::new(&arc, &site, Direction::Up, TaggedAt::Spacecraft, -60.0).is_ok());
    let refusal = Geometry::new(&arc, &site, Direction::TwoWay, TaggedAt::Spacecraft, 0.0).err();
    assert_eq!(refusal, Some(GeometryError::TwoWayTag));
}

fn plain() -> BakeSettings {
    BakeSettings {
        start: GpsTime::default(),
        end: GpsTime::default().plus_seconds(600.0),
        slope_tolerance: 10.0 * MILLIHERTZ,
        delay_tolerance: 0.015 / CARRIER,
        roughness: 0.0,
        direction: Direction::Down,
        tagged_at: TaggedAt::Ground,
        object: 0,
        element_epoch: GpsTime::default(),
        site: [0; 3],
        arc_digest: 0,
    }
}

fn flyby(t: f64) -> f64 {
    ((7500.0 * (t - 300.0)).powi(2) + 5.5e5_f64.powi(2)).sqrt() / 299_792_458.0
}

/// Every refusal of the bake, each from an input that means it.
#[test]
fn bake_refuses_by_name() {
    let mut buffer = [0; 512];
    let mut refusal = |settings: &BakeSettings, delay: &dyn Fn(f64) -> f64| {
        bake(&mut buffer, settings, delay, None).expect_err("a refusal")
    };
    let later = |seconds: f64| GpsTime::default().plus_seconds(seconds);
    for end in [0.0, -1.0, 49.0 * 86_400.0] {
        let settings = BakeSettings { end: later(end), ..plain() };
        assert_eq!(refusal(&settings, &|_| panic!("asked")), BakeError::SpanNotUsable, "{end}");
    }
    let ends = [(GpsTime::from_bits(i64::MIN), GpsTime::from_bits(i64::MAX))];
    for (start, end) in ends.into_iter().chain([(ends[0].1, ends[0].0)]) {
        let settings = BakeSettings { start, end, ..plain() };
        assert_eq!(refusal(&settings, &|_| panic!("asked")), BakeError::SpanNotUsable);
    }
    for tolerance in [0.0, -1.0, 1e-13, f64::NAN] {
        let settings = BakeSettings { slope_tolerance: tolerance, ..plain() };
        assert_eq!(refusal(&settings, &flyby), BakeError::ToleranceNotUsable, "{tolerance}");
        let settings = BakeSettings { delay_tolerance: tolerance, ..plain() };
        assert_eq!(refusal(&settings, &flyby), BakeError::ToleranceNotUsable, "{tolerance}");
    }
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 64.0, -64.0] {
        assert_eq!(refusal(&plain(), &|_| bad), BakeError::DelayNotUsable, "{bad}");
        // In the middle only, between the places that a first look takes.
        let hole = |t: f64| if t > 301.0 && t < 311.0 { bad } else { flyby(t) };
        assert_eq!(refusal(&plain(), &hole), BakeError::DelayNotUsable, "{bad}");
    }
    // Faster than the format, everywhere or somewhere; a delay in milliseconds.
    assert_eq!(refusal(&plain(), &|t| 1.23e-4 * t), BakeError::TooFast);
    let coarse = BakeSettings { slope_tolerance: 1e-9, delay_tolerance: 1e-9, ..plain() };
    assert_eq!(refusal(&coarse, &|t| 1e-6 * t + 1.1e-7 * t * t), BakeError::TooFast);
    assert_eq!(refusal(&plain(), &|t| 1e3 * flyby(t)), BakeError::TooFast);
    // Noise, a step, a kink, a pole.
    let noise = |t: f64| flyby(t) + 1e-9 * (t * 1e7).sin();
    assert_eq!(refusal(&plain(), &noise), BakeError::TooManySegments);
    let step = |t: f64| flyby(t) + if t > 300.0 { 1e-6 } else { 0.0 };
    assert_eq!(refusal(&plain(), &step), BakeError::TooManySegments);
    assert_eq!(refusal(&plain(), &|t| 1e-6 * (t - 300.1).abs()), BakeError::TooManySegments);
    assert_eq!(refusal(&plain(), &|t| 1e-5 * (t - 300.1).abs().sqrt()), BakeError::TooManySegments);
    // Finer than the format.
    let settings = BakeSettings { slope_tolerance: 1.1e-13, ..plain() };
    assert_eq!(refusal(&settings, &flyby), BakeError::TooManySegments);

    let needed = bake(&mut buffer, &plain(), flyby, None).unwrap().words().len();
    for length in 0..needed {
        let mut small = vec![0; length];
        assert_eq!(
            bake(&mut small, &plain(), flyby, None).err(),
            Some(BakeError::BufferTooSmall),
            "{length}"
        );
    }
    assert!(bake(&mut vec![0; needed], &plain(), flyby, None).is_ok());
}

/// A delay near the end of its range that moves by 10 s, as fast as the format allows, in steps near the coarsest.
#[test]
fn the_largest_delays_are_baked() {
    let settings = BakeSettings {
        end: GpsTime::default().plus_seconds(86_400.0),
        slope_tolerance: 3e-9,
        delay_tolerance: 3e-9,
        ..plain()
    };
    let delay = |t: f64| 60.0 - 1.2e-4 * t - 1e-12 * t * t;
    let mut buffer = [0; 2048];
    let table = bake(&mut buffer, &settings, delay, None).unwrap();
    let seen = audit(&table, 11.0, delay).unwrap();
    let unit = 1.0 / (1u64 << 60) as f64;
    println!(
        "{} bytes, delay seen {:e} of {:e}",
        table.words().len() * 4,
        seen.worst_delay,
        f64::from(table.proven_delay()) * unit
    );
    assert!(seen.worst_delay <= f64::from(table.proven_delay()) * unit);
}

/// The lateness partial may fail too: no room, or a delay that is none.
#[test]
fn the_partial_is_refused_by_name() {
    let needed = table(true).len();
    let words = synthetic(WHOLE);
    let geometry = geometry(&words);
    let arc = Arc::new(&words).unwrap();
    for length in 0..needed {
        let mut small = vec![0; length];
        let error = bake_arc(&mut small, &arc, &geometry, &request(&geometry, true)).err();
        assert_eq!(error, Some(BakeError::BufferTooSmall), "{length}");
    }
    let mut buffer = [0; 512];
    let mut late = |_: f64, _: f64| f64::NAN;
    assert_eq!(bake(&mut buffer, &plain(), flyby, Some(&mut late)).err(), Some(BakeError::DelayNotUsable));
}

/// A span that reaches past the arc at either end.
#[test]
fn outside_the_arc_is_refused() {
    let words = synthetic(WHOLE);
    let geometry = geometry(&words);
    let arc = Arc::new(&words).unwrap();
    let mut buffer = [0; 512];
    let asked = request(&geometry, false);
    for (start, end) in [
        (arc.start().plus_seconds(-0.01), asked.end),
        (asked.start, arc.end().plus_seconds(0.01)),
        (arc.end().plus_seconds(1.0), arc.end().plus_seconds(2.0)),
    ] {
        let error = bake_arc(&mut buffer, &arc, &geometry, &Request { start, end, ..asked }).err();
        assert_eq!(error, Some(BakeError::OutsideArc));
    }
    let whole = Request { start: arc.start(), end: arc.end(), ..asked };
    assert!(bake_arc(&mut buffer, &arc, &geometry, &whole).is_ok());
}

/// Every refusal says in words what was wrong and what to do.
#[test]
fn refusals_speak() {
    let messages = [
        ArcError::Short.to_string(),
        ArcError::NotAnArc.to_string(),
        ArcError::NewerVersion { found: 2 }.to_string(),
        ArcError::Damaged.to_string(),
        ArcError::BufferTooSmall.to_string(),
        ArcError::SpanNotUsable.to_string(),
        ArcError::PositionNotUsable.to_string(),
        ArcError::TooCurved.to_string(),
        TableError::Short.to_string(),
        TableError::NotATable.to_string(),
        TableError::NewerVersion { found: 2 }.to_string(),
        TableError::Damaged.to_string(),
        TableError::Before.to_string(),
        TableError::After.to_string(),
        TableError::NoLateness.to_string(),
        BakeError::SpanNotUsable.to_string(),
        BakeError::ToleranceNotUsable.to_string(),
        BakeError::DelayNotUsable.to_string(),
        BakeError::TooFast.to_string(),
        BakeError::TooManySegments.to_string(),
        BakeError::BufferTooSmall.to_string(),
        BakeError::OutsideArc.to_string(),
        GeometryError::SiteOffEarth.to_string(),
        GeometryError::SiteTooFast.to_string(),
        GeometryError::LatenessTooLarge.to_string(),
        GeometryError::TwoWayTag.to_string(),
    ];
    for (k, message) in messages.iter().enumerate() {
        assert!(message.len() > 25 && !message.ends_with('.'), "{message}");
        assert!(!messages[..k].contains(message), "{message}");
    }
    assert_eq!(MAX_ARC_WORDS * 4, 232);
}
