//! A logged range rate, integrated: a closure for [`bake`](super::bake::bake) where there is no orbit.
//!
//! Each sample becomes a slope of the delay. Between two samples the slope is the cubic that has their values and
//! the derivatives of the polynomial through the five samples around each (Hermite interpolation); the delay is
//! its integral, exact but for rounding.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: indices of a log of at least five samples, each inside it"
)]
#![allow(
    clippy::cast_possible_truncation,
    reason = "set-up: the range is tested before, and a cast from a float saturates"
)]

use fixed::types::I16F16;

use super::geometry::{Direction, TaggedAt};
use crate::rapidity::SPEED_OF_LIGHT;
use crate::time::GpsTime;

/// Samples that a derivative is taken from.
const NEIGHBOURS: usize = 5;
/// Seconds that the quartic which continues a log past its ends reaches back, at most (or four samples).
const REACH: f64 = 16.0;
/// Fraction bits of the sum of whole intervals: integers, so that it does not depend on the way it was reached.
const SUM_FRACTION: i32 = 80;

/// Why a log was refused.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum LogError {
    /// Fewer than five samples.
    TooFew,
    /// A sample is not later than the one before it.
    NotIncreasing {
        /// Its index.
        index: usize,
    },
    /// A sample is later after the one before it than was allowed.
    Gap {
        /// Its index.
        index: usize,
    },
    /// A range rate is not a number or beyond 32.7 km/s.
    BeyondFormat,
    /// Two-way signals are tagged at the ground only.
    TwoWayTag,
}

impl core::fmt::Display for LogError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        match self {
            Self::TooFew => formatter.write_str("a log needs at least five samples; log for longer"),
            Self::NotIncreasing { index } => {
                write!(
                    formatter,
                    "sample {index} of the log is not later than the one before it; sort the log"
                )
            }
            Self::Gap { index } => {
                write!(formatter, "the log has a gap before sample {index}; split it there, or allow the gap")
            }
            Self::BeyondFormat => {
                formatter.write_str("a range rate is not a number or beyond 32.7 km/s; check its unit (m/s)")
            }
            Self::TwoWayTag => formatter.write_str("two-way signals are tagged at the ground only"),
        }
    }
}

impl core::error::Error for LogError {}

/// One entry of a log.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub struct RangeRateSample {
    /// When it holds, at the end at which time is read.
    pub time: GpsTime,
    /// Range rate in m/s, positive = receding, 32.7 km/s at most, steps of 15 um/s.
    pub range_rate: I16F16,
}

#[cfg(feature = "defmt")]
impl defmt::Format for RangeRateSample {
    fn format(&self, formatter: defmt::Formatter<'_>) {
        let range_rate = self.range_rate.to_bits();
        defmt::write!(formatter, "RangeRateSample({}, {=i32} * 2^-16 m/s)", self.time, range_rate);
    }
}

impl RangeRateSample {
    /// From m/s (positive = receding), rounded to the nearest 2^-16 m/s.
    ///
    /// # Errors
    /// [`LogError::BeyondFormat`].
    pub fn from_metres_per_second_nearest(time: GpsTime, range_rate: f64) -> Result<Self, LogError> {
        let scaled = libm::round(range_rate * 65_536.0);
        if !(-2_147_483_648.0..=2_147_483_647.0).contains(&scaled) {
            return Err(LogError::BeyondFormat);
        }
        Ok(Self { time, range_rate: I16F16::from_bits(scaled as i32) })
    }
}

/// A checked log with a place in it.
///
/// ```
/// use shiftkeel::pass::bake::{BakeSettings, bake};
/// use shiftkeel::pass::{Direction, RangeRateLog, RangeRateSample, TaggedAt};
/// use shiftkeel::time::GpsTime;
///
/// let start = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0)?;
/// // Receding, faster by 10 m/s every second.
/// let samples: [RangeRateSample; 61] = core::array::from_fn(|second| {
///     let speed = -300.0 + 10.0 * second as f64;
///     RangeRateSample::from_metres_per_second_nearest(start.plus_seconds(second as f64), speed).unwrap()
/// });
/// let mut log = RangeRateLog::new(&samples, 1.5, Direction::Down, TaggedAt::Ground)?;
/// // Half a minute of approach, half of recession: the delay falls and rises by 15 us and comes back.
/// assert!((log.delay(30.0) + 4500.0 / 299_792_458.0).abs() < 1e-11);
/// assert!(log.delay(60.0).abs() < 1e-10);
///
/// let settings = BakeSettings {
///     start,
///     end: log.end(),
///     slope_tolerance: 0.01 / 437e6,
///     delay_tolerance: 0.015 / 437e6,
///     roughness: log.roughness(0.0),
///     direction: Direction::Down,
///     tagged_at: TaggedAt::Ground,
///     object: 0,
///     element_epoch: start,
///     site: [0; 3],
///     arc_digest: 0,
/// };
/// let mut words = [0; 64];
/// let table = bake(&mut words, &settings, |seconds| log.delay(seconds), None)?;
/// assert_eq!(table.segment_count(), 1);
/// # Ok::<(), Box<dyn core::error::Error>>(())
/// ```
#[derive(Clone, Copy, Debug)]
pub struct RangeRateLog<'a> {
    samples: &'a [RangeRateSample],
    /// Legs of the signal: times that the rapidity counts.
    legs: f64,
    /// Whether time is read where the signal is received.
    at_receiver: bool,
    /// Interval of the last question, and the delay at its start in 2^-80 s.
    index: usize,
    sum: i128,
}

impl<'a> RangeRateLog<'a> {
    /// Checks a log: at least five samples, strictly increasing in time, no step above `largest_gap` seconds.
    /// `direction` and `tagged_at` are the table's: they decide which end's frequency the range rate moves.
    ///
    /// # Errors
    /// See [`LogError`].
    pub fn new(
        samples: &'a [RangeRateSample],
        largest_gap: f64,
        direction: Direction,
        tagged_at: TaggedAt,
    ) -> Result<Self, LogError> {
        if direction == Direction::TwoWay && tagged_at == TaggedAt::Spacecraft {
            return Err(LogError::TwoWayTag);
        }
        if samples.len() < NEIGHBOURS {
            return Err(LogError::TooFew);
        }
        for (before, pair) in samples.windows(2).enumerate() {
            let [earlier, later] = pair else { continue };
            if later.time <= earlier.time {
                return Err(LogError::NotIncreasing { index: before + 1 });
            }
            if !(0.0..=largest_gap).contains(&later.time.seconds_since(earlier.time)) {
                return Err(LogError::Gap { index: before + 1 });
            }
        }
        let legs = if direction == Direction::TwoWay { 2.0 } else { 1.0 };
        let at_receiver = direction.is_received_at(tagged_at);
        Ok(Self { samples, legs, at_receiver, index: 0, sum: 0 })
    }

    /// Time of the first sample: origin of the seconds that [`Self::delay`] takes.
    pub fn start(&self) -> GpsTime {
        self.sample(0).time
    }

    /// Time of the last sample.
    pub fn end(&self) -> GpsTime {
        self.sample(self.last()).time
    }

    /// Apparent delay in seconds, zero at the first sample, at `seconds` from it. Outside the log the slope goes on
    /// as the quartic through five samples of the last (or first) 16 s: smooth enough for what a bake asks past the
    /// end of its span.
    ///
    /// # Accuracy
    /// One sample a second of a pass at 550 km leaves 0.1 mHz at 437 MHz, of which the format's rounding is 0.02; samples
    /// h seconds apart err with h^4 (`tests/range_rate_log.rs`).
    ///
    /// # Cost
    /// A few hundred operations in f64, and as many for every sample between this question and the last one.
    pub fn delay(&mut self, seconds: f64) -> f64 {
        let end = self.seconds(self.last());
        let inside = seconds.clamp(0.0, end);
        self.move_to(inside);
        let within = libm::ldexp(self.sum as f64, -SUM_FRACTION) + self.integral(self.index, inside);
        if seconds < 0.0 {
            within + self.continuation(0, 1, seconds)
        } else if seconds > end {
            within + self.continuation(self.last(), -1, seconds - end)
        } else {
            within
        }
    }

    /// How far the slope may be from a smooth curve's, for [`BakeSettings`](super::bake::BakeSettings): `noise` in m/s
    /// is the largest error of a sample, what is lost between samples included; the rounding to 2^-16 m/s is added.
    /// The cubics overshoot by up to three times, at the ends of an evenly spaced log.
    pub fn roughness(&self, noise: f64) -> f64 {
        3.0 * self.legs * (noise + 1.0 / 131_072.0) / f64::from(SPEED_OF_LIGHT)
    }

    fn last(&self) -> usize {
        self.samples.len() - 1
    }

    fn sample(&self, index: usize) -> RangeRateSample {
        self.samples.get(index).copied().unwrap_or_default()
    }

    /// Seconds of a sample after the first.
    fn seconds(&self, index: usize) -> f64 {
        self.sample(index).time.seconds_since(self.sample(0).time)
    }

    /// Slope of the delay at a sample.
    fn slope(&self, index: usize) -> f64 {
        let beta = f64::from(self.sample(index).range_rate) / f64::from(SPEED_OF_LIGHT);
        let rapidity = -self.legs * libm::atanh(beta);
        if self.at_receiver { -libm::expm1(rapidity) } else { libm::expm1(-rapidity) }
    }

    /// Derivative of the slope at a sample: of the polynomial through the five samples around it.
    fn curvature(&self, index: usize) -> f64 {
        let first = index.saturating_sub(NEIGHBOURS / 2).min(self.samples.len() - NEIGHBOURS);
        let here = self.seconds(index);
        let others = || (first..first + NEIGHBOURS).filter(move |&other| other != index);
        let mut sum = 0.0;
        for other in others() {
            let there = self.seconds(other);
            // Derivative of Lagrange's polynomial of `other`, taken at `index`, where it is zero.
            let mut weight = 1.0 / (there - here);
            for third in others().filter(|&third| third != other) {
                let time = self.seconds(third);
                weight *= (here - time) / (there - time);
            }
            sum += weight * (self.slope(other) - self.slope(index));
        }
        sum
    }

    /// Integral of the slope from the start of an interval to `seconds`, which lies in it.
    fn integral(&self, index: usize, seconds: f64) -> f64 {
        let start = self.seconds(index);
        let step = self.seconds(index + 1) - start;
        let u = (seconds - start) / step;
        let (first, second) = (self.slope(index), self.slope(index + 1));
        let (rise, fall) = (self.curvature(index) * step, self.curvature(index + 1) * step);
        // The cubic's coefficients, integrated.
        let square = 3.0 * (second - first) - 2.0 * rise - fall;
        let cube = 2.0 * (first - second) + rise + fall;
        step * u * (first + u * (rise / 2.0 + u * (square / 3.0 + u * cube / 4.0)))
    }

    /// An interval's whole integral in 2^-80 s.
    fn whole(&self, index: usize) -> i128 {
        libm::round(libm::ldexp(self.integral(index, self.seconds(index + 1)), SUM_FRACTION)) as i128
    }

    /// Makes the interval that holds `seconds` (inside the log) the current one.
    fn move_to(&mut self, seconds: f64) {
        while self.index > 0 && seconds < self.seconds(self.index) {
            self.index -= 1;
            self.sum = self.sum.saturating_sub(self.whole(self.index));
        }
        while self.index + 2 < self.samples.len() && seconds >= self.seconds(self.index + 1) {
            self.sum = self.sum.saturating_add(self.whole(self.index));
            self.index += 1;
        }
    }

    /// Integral over `beyond` seconds past the sample at an end, `inwards` being the sign of the way back into the log:
    /// three points of Gauss, exact for the quartic.
    fn continuation(&self, end: usize, inwards: isize, beyond: f64) -> f64 {
        let at = |count: usize| end.saturating_add_signed(inwards * count as isize);
        let origin = self.seconds(end);
        let most = self.last() / (NEIGHBOURS - 1);
        let far = |spread: usize| (self.seconds(at((NEIGHBOURS - 1) * spread)) - origin).abs();
        let spread = (2..=most).take_while(|&spread| far(spread) <= REACH).last().unwrap_or(1);
        let nodes: [(f64, f64); NEIGHBOURS] = core::array::from_fn(|node| {
            let index = at(node * spread);
            (self.seconds(index) - origin, self.slope(index))
        });
        let place = 0.5 * libm::sqrt(0.6);
        let sum = 5.0 * (through(&nodes, beyond * (0.5 - place)) + through(&nodes, beyond * (0.5 + place)))
            + 8.0 * through(&nodes, beyond * 0.5);
        beyond * sum / 18.0
    }
}

/// The polynomial through (time, value) pairs, at a time (Neville's scheme).
fn through(nodes: &[(f64, f64); NEIGHBOURS], time: f64) -> f64 {
    let mut values = nodes.map(|(_, value)| value);
    let node = |index: usize| nodes.get(index).map_or(0.0, |node| node.0);
    for level in 1..NEIGHBOURS {
        for index in 0..NEIGHBOURS - level {
            let (first, last) = (node(index), node(index + level));
            let next = values.get(index + 1).copied().unwrap_or(0.0);
            if let Some(value) = values.get_mut(index) {
                *value += (next - *value) * (time - first) / (last - first);
            }
        }
    }
    let [value, ..] = values;
    value
}
