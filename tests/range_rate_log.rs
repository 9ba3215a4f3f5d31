//! A table from a logged range rate: as good as the log allows, and refused when the log is none.

mod passes;
mod reference;

use passes::{CARRIER, MILLIHERTZ, epoch, worst};
use reference::orbits::Random;
use reference::{SPEED_OF_LIGHT, Vector, dot, length, minus, vector_derivative, vectors};
use shiftkeel::pass::bake::{BakeError, BakeSettings, bake};
use shiftkeel::pass::{Direction, LogError, RangeRateLog, RangeRateSample, TaggedAt};

/// Of the logs, seconds after the synthetic pass's epoch.
const SPAN: [f64; 2] = [345.0, 1085.0];

/// Range rate of the synthetic pass from the reference's positions, m/s.
fn range_rate(grid: &vectors::Grid, t: f64) -> f64 {
    let site: Vector = vectors::SYNTHETIC_SITE.position();
    let line = minus(grid.at(t), site);
    dot(line, vector_derivative(|t| grid.at(t), t, 0.5)) / length(line)
}

fn logged(step: f64) -> Vec<RangeRateSample> {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let [from, to] = SPAN;
    let count = ((to - from) / step) as usize;
    (0..=count)
        .map(|k| {
            let t = from + step * k as f64;
            let time = epoch().plus_seconds(t);
            RangeRateSample::from_metres_per_second_nearest(time, range_rate(&grid, t)).unwrap()
        })
        .collect()
}

fn settings(direction: Direction, tagged_at: TaggedAt, millihertz: f64) -> BakeSettings {
    BakeSettings {
        start: epoch().plus_seconds(351.0),
        end: epoch().plus_seconds(1077.0),
        slope_tolerance: millihertz * MILLIHERTZ,
        delay_tolerance: 0.015 / CARRIER,
        roughness: 0.0,
        direction,
        tagged_at,
        object: 90001,
        element_epoch: epoch(),
        site: [0; 3],
        arc_digest: 0,
    }
}

/// Rapidity of the reference's range rate.
fn truth(grid: &vectors::Grid, t: f64) -> f64 {
    -(range_rate(grid, t) / SPEED_OF_LIGHT).atanh()
}

const UNIT: f64 = 1.0 / (1u64 << 60) as f64;

/// A log at 1 Hz with the format's 2^-16 m/s makes a table whose rapidity is the geometric one within 2 mHz at 437 MHz
/// (and within what the table proves, the log's own 0.1 mHz beside it), in every direction: 1 + z of the two ends.
#[test]
fn a_log_of_one_hertz_makes_a_table() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let samples = logged(1.0);
    for (direction, tagged_at) in [
        (Direction::Down, TaggedAt::Ground),
        (Direction::Up, TaggedAt::Ground),
        (Direction::TwoWay, TaggedAt::Ground),
        (Direction::Down, TaggedAt::Spacecraft),
        (Direction::Up, TaggedAt::Spacecraft),
    ] {
        let mut log = RangeRateLog::new(&samples, 1.5, direction, tagged_at).unwrap();
        assert_eq!(log.start(), epoch().plus_seconds(SPAN[0]));
        assert_eq!(log.end(), epoch().plus_seconds(SPAN[1]));
        let legs = if direction == Direction::TwoWay { 2.0 } else { 1.0 };
        let settings =
            BakeSettings { roughness: log.roughness(2e-5), ..settings(direction, tagged_at, 10.0 * legs) };
        let offset = settings.start.seconds_since(log.start());
        let mut words = [0; 512];
        let table = bake(&mut words, &settings, |t| log.delay(t + offset), None).unwrap();
        let (mut rapidity, mut delay, mut instants) = (0.0_f64, 0.0_f64, 0);
        for k in 0..7250 {
            let t = 351.0 + 0.1 * f64::from(k);
            let motion = table.at(epoch().plus_seconds(t)).unwrap();
            rapidity = rapidity
                .max(worst([motion.rapidity.to_bits() as f64 * UNIT - legs * truth(&grid, t)].into_iter()));
            let kept = motion.delay.to_bits() as f64 / (1u64 << 56) as f64;
            delay = delay.max(worst([kept - log.delay(t - SPAN[0])].into_iter()));
            instants += 1;
        }
        assert_eq!(instants, 7250);
        let proven = f64::from(table.proven_slope()) * UNIT;
        println!(
            "{direction:?} {tagged_at:?}: {} bytes, {} segments, {:.3} mHz of {:.3} proven, {:.5} cycles",
            table.words().len() * 4,
            table.segment_count(),
            rapidity / MILLIHERTZ,
            proven / MILLIHERTZ,
            delay * CARRIER
        );
        assert!(table.words().len() * 4 <= 400);
        assert!(rapidity < legs * 2.0 * MILLIHERTZ, "{}", rapidity / MILLIHERTZ);
        assert!(rapidity <= proven + f64::from(table.rapidity_noise()) * UNIT + 0.1 * legs * MILLIHERTZ);
        assert!(delay <= f64::from(table.proven_delay()) * UNIT);
    }
}

/// Slope of the integrated log by differences over 20 ms, against the truth: the interpolation errs with the fourth power
/// of the spacing, and uneven spacing does no harm.
#[test]
fn the_integrated_log_has_the_logged_slope() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let off = |samples: &[RangeRateSample], largest_gap: f64| {
        let mut log = RangeRateLog::new(samples, largest_gap, Direction::Down, TaggedAt::Ground).unwrap();
        let origin = log.start().seconds_since(epoch());
        worst((0..7000).map(|k| {
            let t = 360.0 + 0.1013 * f64::from(k);
            let change = log.delay(t - origin + 1e-2) - log.delay(t - origin - 1e-2);
            change / 2e-2 + truth(&grid, t).exp_m1()
        }))
    };
    for (step, allowed) in [(0.5, 0.1), (1.0, 0.1), (2.0, 0.3), (5.0, 8.0)] {
        let seen = off(&logged(step), 1.01 * step) / MILLIHERTZ;
        println!("every {step} s: {seen:.3} mHz");
        assert!(seen < allowed, "{seen}");
    }
    let mut random = Random::new(31);
    let uneven: Vec<_> = logged(0.5).into_iter().filter(|_| !random.bits().is_multiple_of(3)).collect();
    let seen = off(&uneven, 10.0) / MILLIHERTZ;
    println!("{} of {} samples: {seen:.3} mHz", uneven.len(), logged(0.5).len());
    assert!(uneven.len() < 1200 && seen < 2.0, "{seen}");
}

/// Against the integral by Simpson's rule of 1 - sqrt((1 - b)/(1 + b)), and the change of the range itself: which differ by
/// the second order only.
#[test]
fn the_delay_is_the_integral() {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let samples = logged(1.0);
    let mut log = RangeRateLog::new(&samples, 1.5, Direction::Down, TaggedAt::Ground).unwrap();
    assert_eq!(log.delay(0.0), 0.0);
    let slope = |t: f64| {
        let b = range_rate(&grid, t) / SPEED_OF_LIGHT;
        1.0 - ((1.0 - b) / (1.0 + b)).sqrt()
    };
    let mut sum = 0.0;
    let range = |t: f64| length(minus(grid.at(t), vectors::SYNTHETIC_SITE.position()));
    let (mut off, mut second_order) = (0.0_f64, 0.0_f64);
    for k in 0..739 {
        let t = SPAN[0] + f64::from(k);
        sum += (slope(t) + 4.0 * slope(t + 0.5) + slope(t + 1.0)) / 6.0;
        let seen = log.delay(f64::from(k) + 1.0);
        off = off.max((seen - sum).abs());
        second_order = second_order.max((seen - (range(t + 1.0) - range(SPAN[0])) / SPEED_OF_LIGHT).abs());
    }
    println!("integral within {off:.1e} s, range within {second_order:.1e} s");
    assert!(off < 1e-12, "{off:e}");
    // The integral of b^2/2 over the pass: below 740 s (2.343e-5)^2 / 2.
    assert!(second_order < 740.0 * 2.343e-5 * 2.343e-5 / 2.0 && second_order > 1e-8);
}

/// The answer does not depend on the questions before it.
#[test]
fn order_does_not_matter() {
    let samples = logged(1.0);
    let fresh = RangeRateLog::new(&samples, 1.5, Direction::Up, TaggedAt::Ground).unwrap();
    let mut asked = fresh;
    let mut random = Random::new(32);
    for _ in 0..2000 {
        let seconds = random.between(-30.0, 770.0);
        let mut alone = fresh;
        assert_eq!(asked.delay(seconds), alone.delay(seconds), "{seconds}");
    }
}

/// Past both ends the delay goes on without a step or a kink, and near the truth for a while.
#[test]
fn ends_go_on_smoothly() {
    let samples = logged(1.0);
    let [first, last] = [100, 600];
    let grid = vectors::positions(vectors::SYNTHETIC);
    let mut log = RangeRateLog::new(&samples[first..=last], 1.5, Direction::Down, TaggedAt::Ground).unwrap();
    let origin = SPAN[0] + first as f64;
    let end = (last - first) as f64;
    let mut slope = |t: f64| (log.delay(t + 5e-3) - log.delay(t - 5e-3)) / 1e-2;
    for edge in [0.0, end] {
        let jump = slope(edge + 0.02) - slope(edge - 0.02);
        let expected = truth(&grid, origin + edge - 0.02) - truth(&grid, origin + edge + 0.02);
        assert!((jump - expected).abs() < 0.02 * MILLIHERTZ, "{jump:e} {expected:e}");
    }
    for (beyond, allowed) in [(1.0, 1e-3), (5.0, 5e-3), (20.0, 0.2)] {
        for t in [-beyond, end + beyond] {
            let off = (slope(t) + truth(&grid, origin + t).exp_m1()) * CARRIER;
            println!("{beyond} s past an end: {off:+.4} Hz");
            assert!(off.abs() < allowed, "{off}");
        }
    }
}

/// A noisy log (2 cm/s, 1 mm/s): the table follows it within what it then proves, and says how little that is.
#[test]
fn noise_is_stated_not_hidden() {
    let mut random = Random::new(33);
    let noise = 0.02;
    let samples: Vec<_> = logged(1.0)
        .into_iter()
        .map(|sample| {
            let speed = f64::from(sample.range_rate) + random.between(-noise, noise);
            RangeRateSample::from_metres_per_second_nearest(sample.time, speed).unwrap()
        })
        .collect();
    let mut log = RangeRateLog::new(&samples, 1.5, Direction::Down, TaggedAt::Ground).unwrap();
    let settings = BakeSettings {
        slope_tolerance: 4e-9,
        delay_tolerance: 4e-9,
        roughness: log.roughness(noise),
        ..settings(Direction::Down, TaggedAt::Ground, 0.0)
    };
    let mut words = [0; 512];
    let refusal = bake(&mut words, &settings, |t| log.delay(t + 6.0), None).err();
    // 36 x 3 x 2 cm/s is more than the header can state: refused rather than understated.
    assert_eq!(refusal, Some(BakeError::ToleranceNotUsable));
    // A twentieth of the noise can be stated.
    let samples: Vec<_> = logged(1.0)
        .into_iter()
        .map(|sample| {
            let speed = f64::from(sample.range_rate) + random.between(-noise / 20.0, noise / 20.0);
            RangeRateSample::from_metres_per_second_nearest(sample.time, speed).unwrap()
        })
        .collect();
    let mut log = RangeRateLog::new(&samples, 1.5, Direction::Down, TaggedAt::Ground).unwrap();
    let settings = BakeSettings { roughness: log.roughness(noise / 20.0), ..settings };
    let mut words = [0; 512];
    let table = bake(&mut words, &settings, |t| log.delay(t + 6.0), None).unwrap();
    let mut off = 0.0_f64;
    for k in 0..36_000 {
        let t = 0.02 * f64::from(k);
        let mut change = |from: f64, to: f64| {
            let at = |t: f64| {
                let time = table.start().plus_seconds(t);
                table.at(time).unwrap().delay.to_bits() as f64 / (1u64 << 56) as f64
            };
            at(to) - at(from) - (log.delay(to + 6.0) - log.delay(from + 6.0))
        };
        off = off.max(change(t, t + 0.01).abs() / 0.01);
    }
    let proven = f64::from(table.proven_slope()) * UNIT;
    println!("{} segments, {:.1} mHz of {:.1}", table.segment_count(), off / MILLIHERTZ, proven / MILLIHERTZ);
    assert!(off <= proven && proven <= 1.0 / CARRIER);
}

/// What is no log.
#[test]
fn bad_logs_are_refused_by_name() {
    let good = logged(1.0);
    let refusal = |samples: &[RangeRateSample]| {
        RangeRateLog::new(samples, 1.5, Direction::Down, TaggedAt::Ground).err()
    };
    for count in 0..5 {
        assert_eq!(refusal(&good[..count]), Some(LogError::TooFew), "{count} samples");
    }
    assert_eq!(refusal(&good[..5]), None);
    let mut samples = good.clone();
    samples[10].time = samples[9].time;
    assert_eq!(refusal(&samples), Some(LogError::NotIncreasing { index: 10 }));
    let mut samples = good.clone();
    samples.swap(20, 21);
    assert_eq!(refusal(&samples), Some(LogError::Gap { index: 20 }));
    let mut samples = good.clone();
    samples.reverse();
    assert_eq!(refusal(&samples), Some(LogError::NotIncreasing { index: 1 }));
    let mut samples = good.clone();
    samples.remove(30);
    assert_eq!(refusal(&samples), Some(LogError::Gap { index: 30 }));
    for largest_gap in [0.0, -1.0, 0.999, f64::NAN] {
        let refusal = RangeRateLog::new(&good, largest_gap, Direction::Down, TaggedAt::Ground).err();
        assert_eq!(refusal, Some(LogError::Gap { index: 1 }), "{largest_gap}");
    }
    let refusal = RangeRateLog::new(&good, 1.5, Direction::TwoWay, TaggedAt::Spacecraft).err();
    assert_eq!(refusal, Some(LogError::TwoWayTag));
    for speed in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 32_768.0, -32_768.1, 1e30] {
        let sample = RangeRateSample::from_metres_per_second_nearest(epoch(), speed);
        assert_eq!(sample, Err(LogError::BeyondFormat), "{speed}");
    }
    for speed in [-32_768.0, 32_767.999_98, 0.0, 7_024.52] {
        let sample = RangeRateSample::from_metres_per_second_nearest(epoch(), speed).unwrap();
        assert!((f64::from(sample.range_rate) - speed).abs() <= 1.0 / 131_072.0);
    }
    let log = RangeRateLog::new(&good, 1.5, Direction::Down, TaggedAt::Ground).unwrap();
    for noise in [-1.0, f64::NAN, 1.0] {
        let settings = BakeSettings {
            roughness: log.roughness(noise),
            ..settings(Direction::Down, TaggedAt::Ground, 10.0)
        };
        let refusal = bake(&mut [0; 512], &settings, |_| panic!("asked"), None).err();
        assert_eq!(refusal, Some(BakeError::ToleranceNotUsable), "{noise}");
    }
    let errors = [
        LogError::TooFew,
        LogError::NotIncreasing { index: 3 },
        LogError::Gap { index: 3 },
        LogError::BeyondFormat,
        LogError::TwoWayTag,
    ];
    for error in errors {
        assert!(error.to_string().len() > 25);
    }
}
