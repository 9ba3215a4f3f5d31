//! A second reference for the crate: light time and clocks in f64, for any closure of position.
//!
//! Nothing here reads the crate. Use it from an integration test with `mod reference;`, from elsewhere with
//! `#[path = ".../tests/reference/mod.rs"] mod reference;`.
//!
//! Times are coordinate seconds (a clock at rest on the geoid) after an epoch of the caller's choice; keep them
//! below about 1e4 s, so that f64 does not round the spacecraft's place. Positions are Earth-fixed, in metres.
//! Both ends are turned into an inertial frame, each by the Earth's angle at its own event; light time is solved
//! there; its derivative is taken numerically, so that this file and the Python generator (which differentiates by
//! formula) share no step. Positive rapidity = approaching.
#![allow(dead_code)] // each test uses a part of it

pub mod orbits;
pub mod vectors;

/// m/s, exact.
pub const SPEED_OF_LIGHT: f64 = 299_792_458.0;
/// m^3/s^2, WGS-84.
pub const EARTH_GM: f64 = 3.986004418e14;
/// Second zonal coefficient of the geopotential, EGM-96.
pub const EARTH_J2: f64 = 1.08262668e-3;
/// m, WGS-84.
pub const EQUATOR_RADIUS: f64 = 6_378_137.0;
/// WGS-84.
pub const FLATTENING: f64 = 1.0 / 298.257223563;
/// rad/s: derivative of the 1982 sidereal time in 2026 (the frame of the vectors is TEME).
pub const EARTH_RATE: f64 = 7.292115855419934e-5;
/// IAU 2000, resolution B1.9: rate of a clock on the geoid against one far away.
pub const L_G: f64 = 6.969290134e-10;
/// m/s^2, conventional.
pub const GRAVITY: f64 = 9.80665;

/// Cartesian, metres or metres per second.
pub type Vector = [f64; 3];

pub fn dot(a: Vector, b: Vector) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

pub fn minus(a: Vector, b: Vector) -> Vector {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

pub fn length(a: Vector) -> f64 {
    dot(a, a).sqrt()
}

/// Turns by +angle (rad) about the Earth's axis.
pub fn rotate(a: Vector, angle: f64) -> Vector {
    let (s, c) = angle.sin_cos();
    [c * a[0] - s * a[1], s * a[0] + c * a[1], a[2]]
}

/// Of eighth-order central differences.
const WEIGHTS: [f64; 4] = [4.0 / 5.0, -1.0 / 5.0, 4.0 / 105.0, -1.0 / 280.0];

/// Derivative by eighth-order central differences: reaches 4 steps to either side.
pub fn derivative(f: impl Fn(f64) -> f64, t: f64, step: f64) -> f64 {
    let mut sum = 0.0;
    for (k, weight) in WEIGHTS.iter().enumerate() {
        let reach = step * (k + 1) as f64;
        sum += weight * (f(t + reach) - f(t - reach));
    }
    sum / step
}

/// The same for a vector.
pub fn vector_derivative(f: impl Fn(f64) -> Vector, t: f64, step: f64) -> Vector {
    let mut sum = [0.0; 3];
    for (k, weight) in WEIGHTS.iter().enumerate() {
        let reach = step * (k + 1) as f64;
        let change = minus(f(t + reach), f(t - reach));
        sum = [0, 1, 2].map(|axis| sum[axis] + weight * change[axis]);
    }
    sum.map(|total| total / step)
}

/// Direction of the signal, and the event that the time belongs to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Tag {
    /// Spacecraft to ground, time of reception on the ground.
    DownlinkReception,
    /// Ground to spacecraft, time of transmission on the ground.
    UplinkTransmission,
    /// Ground to spacecraft and back, time of reception on the ground; no turnaround ratio.
    TwoWayReception,
    /// Spacecraft to ground, time of transmission at the spacecraft.
    DownlinkTransmission,
    /// Ground to spacecraft, time of reception at the spacecraft.
    UplinkReception,
}

impl Tag {
    pub const ALL: [Tag; 5] = [
        Tag::DownlinkReception,
        Tag::UplinkTransmission,
        Tag::TwoWayReception,
        Tag::DownlinkTransmission,
        Tag::UplinkReception,
    ];

    /// As in the headers of the vector files.
    pub fn name(self) -> &'static str {
        match self {
            Tag::DownlinkReception => "downlink_reception",
            Tag::UplinkTransmission => "uplink_transmission",
            Tag::TwoWayReception => "two_way_reception",
            Tag::DownlinkTransmission => "downlink_transmission",
            Tag::UplinkReception => "uplink_reception",
        }
    }
}

/// A place on the ground: WGS-84 degrees and ellipsoidal metres.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Site {
    pub latitude_deg: f64,
    pub longitude_deg: f64,
    pub height_m: f64,
}

impl Site {
    /// Earth-fixed, metres.
    pub fn position(&self) -> Vector {
        let (sin_lat, cos_lat) = self.latitude_deg.to_radians().sin_cos();
        let (sin_lon, cos_lon) = self.longitude_deg.to_radians().sin_cos();
        let squared = FLATTENING * (2.0 - FLATTENING);
        let normal = EQUATOR_RADIUS / (1.0 - squared * sin_lat * sin_lat).sqrt();
        let across = (normal + self.height_m) * cos_lat;
        [across * cos_lon, across * sin_lon, (normal * (1.0 - squared) + self.height_m) * sin_lat]
    }

    /// The geodetic normal.
    pub fn up(&self) -> Vector {
        let (sin_lat, cos_lat) = self.latitude_deg.to_radians().sin_cos();
        let (sin_lon, cos_lon) = self.longitude_deg.to_radians().sin_cos();
        [cos_lat * cos_lon, cos_lat * sin_lon, sin_lat]
    }

    /// Geometric elevation in degrees of an Earth-fixed position.
    pub fn elevation_deg(&self, of: Vector) -> f64 {
        let line = minus(of, self.position());
        (dot(line, self.up()) / length(line)).asin().to_degrees()
    }
}

/// A spacecraft and a ground end, each an Earth-fixed position by time.
pub struct Link<S, G> {
    spacecraft: S,
    ground: G,
    height_m: f64,
    /// rad/s.
    pub earth_rate: f64,
    /// Set to zero for a point-mass potential.
    pub j2: f64,
    /// Time at which the spacecraft's clock agrees with the ground's, s.
    pub clock_epoch: f64,
    /// Step of numerical derivatives, s; they ask for positions up to 4 steps (and the light time) beyond `t`.
    pub step: f64,
}

/// A link to a fixed site.
pub fn link<S: Fn(f64) -> Vector>(spacecraft: S, site: Site) -> Link<S, impl Fn(f64) -> Vector> {
    let position = site.position();
    Link::new(spacecraft, move |_| position, site.height_m)
}

impl<S: Fn(f64) -> Vector, G: Fn(f64) -> Vector> Link<S, G> {
    /// `height_m`: of the ground end, for its clock.
    pub fn new(spacecraft: S, ground: G, height_m: f64) -> Self {
        Self {
            spacecraft,
            ground,
            height_m,
            earth_rate: EARTH_RATE,
            j2: EARTH_J2,
            clock_epoch: 0.0,
            step: 0.5,
        }
    }

    fn spacecraft_inertial(&self, t: f64) -> Vector {
        rotate((self.spacecraft)(t), self.earth_rate * t)
    }

    fn ground_inertial(&self, t: f64) -> Vector {
        rotate((self.ground)(t), self.earth_rate * t)
    }

    /// Light time between `here` at t and `there` at t + sign * light time. Each round of the fixed point
    /// gains a factor c/v, so six reach f64 at any speed of an orbit.
    fn leg(here: impl Fn(f64) -> Vector, there: impl Fn(f64) -> Vector, sign: f64, t: f64) -> f64 {
        let start = here(t);
        let mut time = 0.0;
        for _ in 0..6 {
            time = length(minus(there(t + sign * time), start)) / SPEED_OF_LIGHT;
        }
        time
    }

    /// Coordinate time between the two events, s (for two-way: between the two ground events).
    pub fn light_time(&self, tag: Tag, t: f64) -> f64 {
        let ground = |x: f64| self.ground_inertial(x);
        let spacecraft = |x: f64| self.spacecraft_inertial(x);
        match tag {
            Tag::DownlinkReception => Self::leg(ground, spacecraft, -1.0, t),
            Tag::UplinkTransmission => Self::leg(ground, spacecraft, 1.0, t),
            Tag::DownlinkTransmission => Self::leg(spacecraft, ground, 1.0, t),
            Tag::UplinkReception => Self::leg(spacecraft, ground, -1.0, t),
            Tag::TwoWayReception => {
                let down = Self::leg(ground, spacecraft, -1.0, t);
                down + Self::leg(spacecraft, ground, -1.0, t - down)
            }
        }
    }

    /// The time at the spacecraft that belongs to the tagged time.
    pub fn spacecraft_time(&self, tag: Tag, t: f64) -> f64 {
        match tag {
            Tag::DownlinkReception | Tag::TwoWayReception => t - self.light_time(Tag::DownlinkReception, t),
            Tag::UplinkTransmission => t + self.light_time(tag, t),
            Tag::DownlinkTransmission | Tag::UplinkReception => t,
        }
    }

    /// Rate of the spacecraft's clock against the ground's, less one.
    pub fn clock_rate(&self, t: f64) -> f64 {
        let square = SPEED_OF_LIGHT * SPEED_OF_LIGHT;
        let position = (self.spacecraft)(t);
        let speed = length(vector_derivative(|x| self.spacecraft_inertial(x), t, self.step));
        let r = length(position);
        let (sine, scale) = (position[2] / r, EQUATOR_RADIUS / r);
        let oblate = self.j2 * scale * scale * (3.0 * sine * sine - 1.0) / 2.0;
        let potential = EARTH_GM / r * (1.0 - oblate);
        let spacecraft = L_G - (speed * speed / 2.0 + potential) / square;
        // A ground end at rest is slowed by height alone; one that moves adds its motion over the turning Earth.
        let place = (self.ground)(t);
        let moving = vector_derivative(&self.ground, t, self.step);
        let turning = self.earth_rate * (place[0] * moving[1] - place[1] * moving[0]);
        let ground = (GRAVITY * self.height_m - turning - dot(moving, moving) / 2.0) / square;
        (spacecraft - ground) / (1.0 + ground)
    }

    /// Offset of the spacecraft's clock from the ground's, s: Simpson's rule over panels of at most 30 s
    /// (below 1e-17 s for orbits of an hour and more).
    pub fn clock_offset(&self, t: f64) -> f64 {
        let span = t - self.clock_epoch;
        let panels = (span.abs() / 30.0).ceil() as usize;
        if panels == 0 {
            return 0.0;
        }
        let half = span / (2 * panels) as f64;
        let mut sum = self.clock_rate(self.clock_epoch) + self.clock_rate(t);
        for k in 1..2 * panels {
            let weight = if k % 2 == 1 { 4.0 } else { 2.0 };
            sum += weight * self.clock_rate(self.clock_epoch + half * k as f64);
        }
        sum * half / 3.0
    }

    /// Apparent delay, s, clock terms included (two-way: they cancel).
    pub fn delay(&self, tag: Tag, t: f64) -> f64 {
        let clock = || self.clock_offset(self.spacecraft_time(tag, t));
        let light_time = self.light_time(tag, t);
        match tag {
            Tag::DownlinkReception | Tag::DownlinkTransmission => light_time - clock(),
            Tag::UplinkTransmission | Tag::UplinkReception => light_time + clock(),
            Tag::TwoWayReception => light_time,
        }
    }

    /// ln(received / transmitted frequency), each by its own end's clock.
    pub fn rapidity(&self, tag: Tag, t: f64) -> f64 {
        let slope = derivative(|x| self.light_time(tag, x), t, self.step);
        let clock = || self.clock_rate(self.spacecraft_time(tag, t)).ln_1p();
        match tag {
            Tag::DownlinkReception => (-slope).ln_1p() + clock(),
            Tag::UplinkReception => (-slope).ln_1p() - clock(),
            Tag::UplinkTransmission => -slope.ln_1p() - clock(),
            Tag::DownlinkTransmission => -slope.ln_1p() + clock(),
            Tag::TwoWayReception => (-slope).ln_1p(),
        }
    }

    /// Change of the rapidity, per second; asks for positions up to 8 steps beyond `t`.
    pub fn rapidity_rate(&self, tag: Tag, t: f64) -> f64 {
        derivative(|x| self.rapidity(tag, x), t, self.step)
    }

    /// Geometric distance at t, m.
    pub fn range(&self, t: f64) -> f64 {
        length(minus((self.spacecraft)(t), (self.ground)(t)))
    }
}

/// The Earth-fixed closure of a spacecraft that runs `lateness` seconds behind in its orbit: in inertial space it is
/// where the original was that long ago, while the Earth has turned on.
pub fn late<S: Fn(f64) -> Vector>(spacecraft: S, lateness: f64, earth_rate: f64) -> impl Fn(f64) -> Vector {
    move |t| rotate(spacecraft(t - lateness), -earth_rate * lateness)
}
