//! From an arc and a site to delay, rapidity, rate and elevation, in f64.
//!
//! Light time is solved in the inertial frame that coincides with the Earth-fixed one at the ground's instant,
//! so the rotation of the Earth during the flight needs no separate term. The spacecraft's clock runs at
//! `1 + y` of the ground's, `y = L_G - (v^2/2 + U)/c^2`, and its integral is part of the apparent delay.
//!
//! Source: G. Petit and B. Luzum (eds.), IERS Conventions (2010), chapter 10, for the clock; light time as in
//! any textbook on orbit determination; both from memory.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: the only integers are the clock series' orders, up to 9, and 128 grid places"
)]

use super::arc::{Arc, Trajectory};
use super::chebyshev::{self, Cosines};
use super::site::{EARTH_RADIUS, Site, Vector};
use crate::time::GpsTime;

/// Speed of light, m/s, exact.
const LIGHT: f64 = 299_792_458.0;
/// Rotation of the Earth, rad/s.
const EARTH_ROTATION: f64 = 7.292_115_146_706_979e-5;
/// Gravitational parameter, m^3/s^2.
const EARTH_GRAVITY: f64 = 3.986_004_418e14;
const EARTH_OBLATENESS: f64 = 1.082_626_68e-3;
/// Rate of geocentric coordinate time against a clock on the geoid (L_G).
const GEOID_RATE: f64 = 6.969_290_134e-10;
/// Gravity at the surface, m/s^2: enough for a site's height.
const SURFACE_GRAVITY: f64 = 9.81;
/// Fixed-point steps of the light-time solution: each gains a factor v/c, so four leave under 1e-20 s.
const LIGHT_TIME_STEPS: usize = 4;
/// Points at which the spacecraft clock's rate is taken over the arc.
const CLOCK_POINTS: usize = 8;

/// Which way the signal runs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Direction {
    /// Spacecraft to ground.
    Down,
    /// Ground to spacecraft.
    Up,
    /// Ground to spacecraft and coherently back; the spacecraft's clock cancels.
    TwoWay,
}

impl Direction {
    /// Whether time read at `tagged_at` is that of the signal's reception, not of its transmission.
    ///
    /// ```
    /// use shiftkeel::pass::{Direction, TaggedAt};
    /// assert!(Direction::Down.is_received_at(TaggedAt::Ground));
    /// assert!(!Direction::Up.is_received_at(TaggedAt::Ground));
    /// ```
    pub fn is_received_at(self, tagged_at: TaggedAt) -> bool {
        (self == Self::Up) == (tagged_at == TaggedAt::Spacecraft)
    }
}

/// At which end the time that a table is asked with is read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum TaggedAt {
    /// Reception (down, two-way) or transmission (up) at the ground.
    Ground,
    /// Transmission (down) or reception (up) at the spacecraft.
    Spacecraft,
}

/// Why a geometry was refused.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum GeometryError {
    /// Latitude beyond +-90, longitude beyond +-360 degrees, height outside -500 m to 100 km, or not a number.
    SiteOffEarth,
    /// A velocity of the site above 1 km/s, or not a number.
    SiteTooFast,
    /// A lateness above 60 s, or not a number.
    LatenessTooLarge,
    /// Two-way signals are tagged at the ground only.
    TwoWayTag,
}

impl core::fmt::Display for GeometryError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::SiteOffEarth => {
                "site off the Earth: latitude within 90, longitude within 360 degrees (west and south negative), height from -500 m to 100 km"
            }
            Self::SiteTooFast => "site velocity above 1 km/s or not a number; give m/s east, north, up",
            Self::LatenessTooLarge => "lateness above 60 s or not a number; get newer elements",
            Self::TwoWayTag => "a two-way signal is tagged at the ground only",
        })
    }
}

impl core::error::Error for GeometryError {}

/// Where the spacecraft stands in the sky of the site.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Look {
    /// Elevation in radians above the plane of the ellipsoid, no refraction.
    pub elevation: f64,
    /// Azimuth in radians from north through east, 0 to 2 pi.
    pub azimuth: f64,
    /// Geometric range in metres.
    pub range: f64,
}

/// What the geometry tells at an instant.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Passage {
    /// Apparent delay in seconds, clock term included; its slope is the shift. Zero of the spacecraft's clock
    /// is at the middle of the arc.
    pub delay: f64,
    /// ln(received / transmitted frequency), positive = approaching.
    pub rapidity: f64,
    /// Change of the rapidity per second.
    pub rate: f64,
    /// Elevation in radians at the tagged instant, without light time.
    pub elevation: f64,
}

/// An arc seen from a site in one direction.
#[derive(Clone, Copy, Debug)]
pub struct Geometry {
    trajectory: Trajectory,
    site: Site,
    direction: Direction,
    tagged_at: TaggedAt,
    lateness: f64,
    /// Integral of the clock's relative rate over the arc, as a series; zero at the middle.
    clock: [f64; CLOCK_POINTS + 1],
    site_offset: f64,
}

fn dot(a: &Vector, b: &Vector) -> f64 {
    a.iter().zip(b).fold(0.0, |sum, (x, y)| sum + x * y)
}

fn minus(a: &Vector, b: &Vector) -> Vector {
    let [ax, ay, az] = *a;
    let [bx, by, bz] = *b;
    [ax - bx, ay - by, az - bz]
}

/// Position turned about the Earth's axis by `angle` (positive eastwards).
fn turned(vector: &Vector, angle: f64) -> Vector {
    let [x, y, z] = *vector;
    let (sine, cosine) = (libm::sin(angle), libm::cos(angle));
    [cosine * x - sine * y, sine * x + cosine * y, z]
}

/// Velocity that the Earth's rotation gives to an Earth-fixed place.
fn carried(place: &Vector) -> Vector {
    let [x, y, _] = *place;
    [-EARTH_ROTATION * y, EARTH_ROTATION * x, 0.0]
}

impl Geometry {
    /// Joins arc and site. `lateness`: how many seconds later than its elements the spacecraft is in its orbit
    /// (the Earth turns on meanwhile).
    ///
    /// # Accuracy
    /// Rapidity within 2e-15 and delay within 1e-14 s of an independently written model on the same positions; with
    /// what an arc leaves 0.5 mHz at 437 MHz over all reference orbits (`tests/geometry.rs`). Differences in the
    /// clock of a moving site are left out (1e-12 at 250 m/s).
    ///
    /// # Errors
    /// [`GeometryError::LatenessTooLarge`], [`GeometryError::TwoWayTag`].
    pub fn new(
        arc: &Arc<'_>,
        site: &Site,
        direction: Direction,
        tagged_at: TaggedAt,
        lateness: f64,
    ) -> Result<Self, GeometryError> {
        if !(-60.0..=60.0).contains(&lateness) {
            return Err(GeometryError::LatenessTooLarge);
        }
        if direction == Direction::TwoWay && tagged_at == TaggedAt::Spacecraft {
            return Err(GeometryError::TwoWayTag);
        }
        let trajectory = arc.trajectory();
        let [_, _, height] = site.geodetic;
        let clock = clock_series(&trajectory, SURFACE_GRAVITY * height / (LIGHT * LIGHT));
        let site_offset = trajectory.middle().seconds_since(site.epoch);
        let site_offset = if site.velocity == [0.0; 3] { 0.0 } else { site_offset };
        Ok(Self { trajectory, site: *site, direction, tagged_at, lateness, clock, site_offset })
    }

    /// The same geometry with another lateness (not checked again: within +-60 s).
    pub(super) fn with_lateness(&self, lateness: f64) -> Self {
        Self { lateness, ..*self }
    }

    /// How late the spacecraft is taken to be, in seconds.
    pub fn lateness(&self) -> f64 {
        self.lateness
    }

    /// Direction of the signal.
    pub fn direction(&self) -> Direction {
        self.direction
    }

    /// End at which time is read.
    pub fn tagged_at(&self) -> TaggedAt {
        self.tagged_at
    }

    /// The ground end.
    pub fn site(&self) -> &Site {
        &self.site
    }

    /// Origin of the seconds that the other functions take: the middle of the arc.
    pub fn origin(&self) -> GpsTime {
        self.trajectory.middle()
    }

    /// Half of the arc's span in seconds.
    pub fn half_span(&self) -> f64 {
        self.trajectory.half_span()
    }

    /// Earth-fixed position and velocity of the (late) spacecraft.
    fn spacecraft(&self, seconds: f64) -> (Vector, Vector) {
        let (position, velocity) = self.trajectory.at(seconds - self.lateness);
        if self.lateness == 0.0 {
            return (position, velocity);
        }
        let angle = -EARTH_ROTATION * self.lateness;
        (turned(&position, angle), turned(&velocity, angle))
    }

    /// Integral of the spacecraft clock's relative rate.
    fn clock(&self, seconds: f64) -> (f64, f64) {
        let half = self.trajectory.half_span();
        let (value, slope) = chebyshev::evaluate(&self.clock, (seconds - self.lateness) / half);
        (value, slope / half)
    }

    /// Range between the ground at `ground` and the spacecraft at `space`, and its two partial derivatives.
    fn range(&self, ground: f64, space: f64) -> (f64, f64, f64) {
        let (position, velocity) = self.spacecraft(space);
        let angle = EARTH_ROTATION * (space - ground);
        let (position, velocity) = (turned(&position, angle), turned(&velocity, angle));
        let site = self.site.at(ground + self.site_offset);
        let line = minus(&position, &site);
        let range = libm::sqrt(dot(&line, &line));
        let turning = dot(&line, &carried(&position)) / range;
        let by_space = dot(&line, &velocity) / range + turning;
        let by_ground = -turning - dot(&line, &self.site.velocity) / range;
        (range, by_ground, by_space)
    }

    /// One leg: light time with one end's instant known, and d(space time)/d(ground time).
    fn leg(&self, known: f64, at_ground: bool, down: bool) -> (f64, f64) {
        let sign = if at_ground == down { -1.0 } else { 1.0 };
        let ends = |light_time: f64| {
            let other = known + sign * light_time;
            if at_ground { (known, other) } else { (other, known) }
        };
        let mut light_time = 0.0;
        for _ in 0..LIGHT_TIME_STEPS {
            let (ground, space) = ends(light_time);
            light_time = self.range(ground, space).0 / LIGHT;
        }
        let (ground, space) = ends(light_time);
        let (_, by_ground, by_space) = self.range(ground, space);
        let ratio = if down {
            (LIGHT - by_ground) / (LIGHT + by_space)
        } else {
            (LIGHT + by_ground) / (LIGHT - by_space)
        };
        (light_time, ratio)
    }

    /// Apparent delay and rapidity at `seconds` from [`Self::origin`], read at the tagged end.
    pub fn delay_and_rapidity(&self, seconds: f64) -> (f64, f64) {
        let at_ground = self.tagged_at == TaggedAt::Ground;
        if self.direction == Direction::TwoWay {
            let (down, down_ratio) = self.leg(seconds, true, true);
            let at_spacecraft = seconds - down;
            let (up, up_ratio) = self.leg(at_spacecraft, false, false);
            return (down + up, libm::log(down_ratio / up_ratio));
        }
        let down = self.direction == Direction::Down;
        let (light_time, ratio) = self.leg(seconds, at_ground, down);
        let space = match (at_ground, down) {
            (true, true) => seconds - light_time,
            (true, false) => seconds + light_time,
            (false, _) => seconds,
        };
        let (clock, rate) = self.clock(space);
        let towards = libm::log(ratio) + libm::log1p(rate);
        if down { (light_time - clock, towards) } else { (light_time + clock, -towards) }
    }

    /// Delay, rapidity, rate and elevation at an instant read at the tagged end. Outside the arc the
    /// polynomials run on, which is sensible for a fraction of a second only.
    pub fn passage(&self, time: GpsTime) -> Passage {
        let seconds = time.seconds_since(self.origin());
        let (delay, rapidity) = self.delay_and_rapidity(seconds);
        let around = 0.25;
        let later = self.delay_and_rapidity(seconds + around).1;
        let earlier = self.delay_and_rapidity(seconds - around).1;
        let rate = (later - earlier) / (2.0 * around);
        Passage { delay, rapidity, rate, elevation: self.look(seconds).elevation }
    }

    /// Elevation, azimuth and range at `seconds` from [`Self::origin`], both ends at the same instant.
    pub fn look(&self, seconds: f64) -> Look {
        let (position, _) = self.spacecraft(seconds);
        let line = minus(&position, &self.site.at(seconds + self.site_offset));
        let range = libm::sqrt(dot(&line, &line));
        let azimuth = libm::atan2(dot(&line, &self.site.east), dot(&line, &self.site.north));
        let turn = 2.0 * core::f64::consts::PI;
        Look {
            // Straight overhead, rounding may leave the quotient above one.
            elevation: libm::asin((dot(&line, &self.site.up) / range).clamp(-1.0, 1.0)),
            azimuth: if azimuth < 0.0 { azimuth + turn } else { azimuth },
            range,
        }
    }

    /// First and last instant of the arc at which the spacecraft stands above `elevation` (radians), found on a
    /// grid of 1/128 of the arc and narrowed to a microsecond; `None` when it never does.
    pub fn above(&self, elevation: f64) -> Option<(GpsTime, GpsTime)> {
        const STEPS: i32 = 128;
        let half = self.trajectory.half_span();
        let place = |step: i32| half * (2.0 * f64::from(step) / f64::from(STEPS) - 1.0);
        let is_up = |seconds: f64| self.look(seconds).elevation >= elevation;
        let first = (0..=STEPS).find(|&step| is_up(place(step)))?;
        let last = (0..=STEPS).rev().find(|&step| is_up(place(step)))?;
        let narrow = |mut inside: f64, mut outside: f64| {
            for _ in 0..30 {
                let between = (inside + outside) / 2.0;
                if is_up(between) {
                    inside = between;
                } else {
                    outside = between;
                }
            }
            inside
        };
        let rise = if first == 0 { place(0) } else { narrow(place(first), place(first - 1)) };
        let set = if last == STEPS { place(STEPS) } else { narrow(place(last), place(last + 1)) };
        Some((self.origin().plus_seconds(rise), self.origin().plus_seconds(set)))
    }
}

/// Integral over the arc of the spacecraft clock's rate against the ground's, as a Chebyshev series.
fn clock_series(trajectory: &Trajectory, site_rate: f64) -> [f64; CLOCK_POINTS + 1] {
    let half = trajectory.half_span();
    let mut rates = [0.0; CLOCK_POINTS];
    for (index, rate) in rates.iter_mut().enumerate() {
        let (position, velocity) = trajectory.at(half * chebyshev::point(index, CLOCK_POINTS));
        let [x, y, z] = position;
        let [_, _, climb] = velocity;
        let [east, north, _] = carried(&position);
        let inertial = [velocity[0] + east, velocity[1] + north, climb];
        let radius = libm::sqrt(x * x + y * y + z * z);
        let ratio = EARTH_RADIUS / radius;
        let sine = z / radius;
        let oblate = EARTH_OBLATENESS * ratio * ratio * (1.5 * sine * sine - 0.5);
        let potential = EARTH_GRAVITY / radius * (1.0 - oblate);
        let energy = dot(&inertial, &inertial) / 2.0 + potential;
        *rate = (GEOID_RATE - energy / (LIGHT * LIGHT) - site_rate) * half;
    }
    let rates = chebyshev::interpolate(&rates, &Cosines::<CLOCK_POINTS>::new());
    let rate = |order: usize| rates.get(order).copied().unwrap_or(0.0);
    let mut integral = [0.0; CLOCK_POINTS + 1];
    for (order, term) in integral.iter_mut().enumerate().skip(1) {
        let below = if order == 1 { 2.0 * rate(0) } else { rate(order - 1) };
        *term = (below - rate(order + 1)) / (2 * order) as f64;
    }
    let at_middle = chebyshev::evaluate(&integral, 0.0).0;
    if let Some(constant) = integral.first_mut() {
        *constant = -at_middle;
    }
    integral
}
