//! The synthetic pass as a table to steer from, and the independent reference beside it.
#![allow(dead_code)] // each test uses a part of it

use crate::passes;
use crate::reference::{Link, Tag, Vector, vectors};
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::pass::bake::{Request, bake_arc};
use shiftkeel::pass::{Arc, Direction, Geometry, PassTable, TaggedAt, Trajectory};
use shiftkeel::time::GpsTime;

/// 2^64.
pub const TURN: f64 = 18_446_744_073_709_551_616.0;

pub fn hertz(whole: u64) -> Frequency {
    Frequency::from_hertz(whole).unwrap()
}

/// A table of the synthetic pass, and what it was baked from.
pub struct Flight {
    words: Vec<u32>,
    trajectory: Trajectory,
    direction: Direction,
    /// Seconds from the pass epoch to the table's start.
    start: f64,
    /// What the table calls the delay less what the reference does: their spacecraft clocks begin at different
    /// times.
    clock_difference: f64,
}

impl Flight {
    /// Baked to so many millihertz and cycles at `carrier` hertz.
    pub fn baked(direction: Direction, carrier: f64, millihertz: f64, cycles: f64) -> Self {
        let words = passes::synthetic([346.0, 1082.0]);
        let arc = Arc::new(&words).unwrap();
        let site = passes::site(&vectors::SYNTHETIC_SITE);
        let geometry = Geometry::new(&arc, &site, direction, TaggedAt::Ground, 0.0).unwrap();
        let (start, end) = geometry.above(0.0).unwrap();
        let request = Request {
            start,
            end,
            slope_tolerance: millihertz * 1e-3 / carrier,
            delay_tolerance: cycles / carrier,
            lateness_partial: false,
        };
        let mut buffer = [0; 4096];
        let words = bake_arc(&mut buffer, &arc, &geometry, &request).unwrap().words().to_vec();
        let mut flight = Self {
            words,
            trajectory: arc.trajectory(),
            direction,
            start: start.seconds_since(passes::epoch()),
            clock_difference: 0.0,
        };
        let begin = start.seconds_since(geometry.origin());
        flight.clock_difference = geometry.delay_and_rapidity(begin).0 - flight.delay(0.0);
        flight
    }

    pub fn table(&self) -> PassTable<'_> {
        PassTable::new(&self.words).unwrap()
    }

    /// The reference's link to the arc's own positions, in seconds after the pass epoch.
    fn link(&self) -> (Link<impl Fn(f64) -> Vector, impl Fn(f64) -> Vector>, f64) {
        let middle = self.trajectory.middle().seconds_since(passes::epoch());
        let ground = vectors::SYNTHETIC_SITE.position();
        let trajectory = &self.trajectory;
        let place = move |t: f64| trajectory.at(t - middle).0;
        let mut link = Link::new(place, move |_| ground, vectors::SYNTHETIC_SITE.height_m);
        link.clock_epoch = middle;
        (link, self.start)
    }

    fn tag(&self) -> Tag {
        match self.direction {
            Direction::Down => Tag::DownlinkReception,
            Direction::Up => Tag::UplinkTransmission,
            Direction::TwoWay => Tag::TwoWayReception,
        }
    }

    /// The reference's delay at seconds after the table's start, on the table's clocks.
    pub fn delay(&self, seconds: f64) -> f64 {
        let (link, start) = self.link();
        link.delay(self.tag(), start + seconds) + self.clock_difference
    }

    /// The reference's rapidity at seconds after the table's start.
    pub fn rapidity(&self, seconds: f64) -> f64 {
        let (link, start) = self.link();
        link.rapidity(self.tag(), start + seconds)
    }

    /// The rapidity from the true positions, without the arc.
    pub fn rapidity_of_orbit(&self, seconds: f64) -> f64 {
        let grid = vectors::positions(vectors::SYNTHETIC);
        let link = crate::reference::link(|t| grid.at(t), vectors::SYNTHETIC_SITE);
        link.rapidity(self.tag(), self.start + seconds)
    }
}

/// Ticks of an oscillator's clock after the table's start.
#[derive(Clone, Copy)]
pub struct Ticks {
    pub start: GpsTime,
    /// Hertz, whole.
    pub clock: u64,
    /// Clocks an interval.
    pub clocks: u32,
}

impl Ticks {
    /// Seconds of an interval.
    pub fn interval(&self) -> f64 {
        f64::from(self.clocks) / self.clock as f64
    }

    /// How many intervals fit before the table's end.
    pub fn count(&self, table: &PassTable<'_>) -> u64 {
        (table.end().seconds_since(table.start()) / self.interval()) as u64
    }

    /// Seconds after the start.
    pub fn seconds(&self, tick: u64) -> f64 {
        tick as f64 * f64::from(self.clocks) / self.clock as f64
    }

    /// The instant on the grid and the rest in 2^-62 s.
    pub fn fine(&self, tick: u64) -> (GpsTime, u32) {
        let elapsed = (u128::from(tick * u64::from(self.clocks)) << 62) / u128::from(self.clock);
        (GpsTime::from_bits(self.start.to_bits() + (elapsed >> 32) as i64), elapsed as u32)
    }

    /// The instant rounded to the grid.
    pub fn grid(&self, tick: u64) -> GpsTime {
        let elapsed = (u128::from(tick * u64::from(self.clocks)) << 30) + u128::from(self.clock / 2);
        GpsTime::from_bits(self.start.to_bits() + (elapsed / u128::from(self.clock)) as i64)
    }
}

/// Difference of two steps in hertz of `clock`.
pub fn hertz_between(step: PhaseStep, other: PhaseStep, clock: u64) -> f64 {
    step.to_bits().wrapping_sub(other.to_bits()) as i64 as f64 / TURN * clock as f64
}

/// A phase in cycles, to the nearest whole one.
pub fn off_whole(cycles: f64) -> f64 {
    cycles - cycles.round()
}

/// Seen over bound; fails when the bound is exceeded, or when less than `least` of it was seen.
pub fn assert_proven(name: &str, seen: f64, bound: f64, least: f64) {
    println!("{name}: seen {seen:.4e}, bound {bound:.4e}, ratio {:.3}", seen / bound);
    assert!(seen <= bound, "{name}: {seen:e} exceeds {bound:e}");
    assert!(seen >= least * bound, "{name}: the bound {bound:e} is padded, only {seen:e} was seen");
}
