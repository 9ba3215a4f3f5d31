//! What the age of an element set may cost.
//!
//! An estimate, not a bound: about 1 km along the track near the epoch, a growth that depends on the orbit, and
//! the part of the drag that nobody foresees. One figure decides: beyond 3 km the elements count as old, which
//! is about three days for a low orbit without drag.

use crate::elements::ElementSet;
use crate::orbit::{GRAVITATIONAL_PARAMETER, Orbit};
use crate::{SPEED_OF_LIGHT, instant};
use chrono::{DateTime, Utc};
use std::f64::consts::TAU;

/// Error along the track at the epoch, m (about 1 km; common practice).
const ERROR_AT_EPOCH: f64 = 1_000.0;
/// Growth for low orbits, m a day (0.5 to 3 km a day with drag; common practice, the lower end without).
const GROWTH_LOW: f64 = 600.0;
/// Growth for orbits slower than 6.4 revolutions a day, where there is no air (common practice).
const GROWTH_HIGH: f64 = 100.0;
/// Part of the drag that changes unforeseen with the Sun's activity (common practice, 10 to 30 %).
const DRAG_UNFORESEEN: f64 = 0.2;
/// Error at which elements count as old, m.
const OLD_ERROR: f64 = 3_000.0;
/// Elements of any orbit count as old after this, days.
const OLDEST: f64 = 14.0;

/// What the age of an element set means at one time.
#[derive(Clone, Debug, PartialEq)]
pub struct ElementAge {
    /// Days from the element epoch, negative before it.
    pub days: f64,
    /// Days after which this set counts as old.
    pub limit_days: f64,
    /// Estimated error along the track, m.
    pub along_track: f64,
    /// The same as a time, s: how early or late the spacecraft may be.
    pub lateness: f64,
    /// Largest rate of the range rate of an overhead pass, m/s^2.
    pub steepest: f64,
}

impl ElementAge {
    /// Age of `set` at `time`, from its mean motion, the rate of it, and its drag term.
    pub fn new(set: &ElementSet, time: DateTime<Utc>) -> Self {
        let days = instant::seconds_between(set.epoch, time) / 86_400.0;
        let error = |days: f64| along_track_error(set, days);
        let limit_days = if error(OLDEST) <= OLD_ERROR { OLDEST } else { bisect(error) };
        let motion = set.mean.mean_motion * TAU / 86_400.0;
        let axis = (GRAVITATIONAL_PARAMETER / (motion * motion)).cbrt();
        let speed = motion * axis;
        let surface = crate::frames::EARTH_RADIUS_WGS84;
        // At perigee, where an overhead pass is steepest: v^2 R / (r h).
        let near = (axis * (1.0 - set.mean.eccentricity)).max(surface + 100_000.0);
        let fast = GRAVITATIONAL_PARAMETER * (2.0 / near - 1.0 / axis);
        let along_track = error(days);
        Self {
            days,
            limit_days,
            along_track,
            lateness: along_track / speed,
            steepest: fast * surface / (near * (near - surface)),
        }
    }

    /// Whether the elements count as old.
    pub fn is_old(&self) -> bool {
        self.days.abs() > self.limit_days
    }

    /// What it may cost at closest approach of an overhead pass, in hertz, for a carrier in hertz.
    pub fn cost(&self, carrier: f64) -> f64 {
        carrier / SPEED_OF_LIGHT * self.steepest * self.lateness
    }

    /// A warning when the elements are old: how old, what it may cost, what to do.
    pub fn warning(&self, object: &str, carrier: Option<f64>) -> Option<String> {
        if !self.is_old() {
            return None;
        }
        let side = if self.days < 0.0 { "before their epoch" } else { "old" };
        let example = if carrier.is_none() { " (no carrier was given)" } else { "" };
        let hertz = carrier.unwrap_or(437.0e6);
        Some(format!(
            "the elements of {object} are {:.1} days {side}, more than the {:.1} days that this orbit allows: \
             it may be {:.0} km ({:.1} s) off along its track, up to {:.0} Hz at {} MHz{example}; \
             fetch newer elements",
            self.days.abs(),
            self.limit_days,
            self.along_track * 1e-3,
            self.lateness,
            self.cost(hertz),
            hertz * 1e-6,
        ))
    }
}

/// Estimated error along the track `days` from the epoch, m.
fn along_track_error(set: &ElementSet, days: f64) -> f64 {
    let days = days.abs();
    let growth = if set.mean.mean_motion > 6.4 { GROWTH_LOW } else { GROWTH_HIGH };
    let motion = set.mean.mean_motion * TAU / 86_400.0;
    let axis = (GRAVITATIONAL_PARAMETER / (motion * motion)).cbrt();
    // The printed rate is half the acceleration of the mean anomaly, in revolutions a day squared; the second
    // rate is a sixth of its jerk.
    let rate = set.mean.mean_motion_dot.abs() + set.mean.mean_motion_ddot.abs() * days;
    let by_rate = rate * days * days * TAU * axis;
    let by_drag_term = drag_displacement(set, days).unwrap_or(0.0);
    ERROR_AT_EPOCH + growth * days + DRAG_UNFORESEEN * by_rate.max(by_drag_term)
}

/// How far the drag term moves the spacecraft in so many days, m: SGP4 with it and without it.
fn drag_displacement(set: &ElementSet, days: f64) -> Option<f64> {
    let mut without = set.clone();
    without.mean.drag_term = 0.0;
    let place = |set: &ElementSet| Orbit::new(set, set.epoch).ok()?.state(days * 86_400.0).ok();
    Some((place(set)?.position - place(&without)?.position).length())
}

/// The days at which the error reaches the limit.
fn bisect(error: impl Fn(f64) -> f64) -> f64 {
    let (mut young, mut old) = (0.0, OLDEST);
    for _ in 0..30 {
        let middle = (young + old) / 2.0;
        if error(middle) > OLD_ERROR { old = middle } else { young = middle }
    }
    old
}
