//! Seeded random passes: Kepler orbits with secular J2 drift over random sites, for property tests.

use super::{EARTH_GM, EARTH_J2, EARTH_RATE, EQUATOR_RADIUS, Site, Vector, rotate};
use core::f64::consts::{PI, TAU};

/// SplitMix64 (Steele, Lea and Flood, 2014).
#[derive(Clone, Debug)]
pub struct Random(u64);

impl Random {
    pub fn new(seed: u64) -> Self {
        Self(seed)
    }

    pub fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Uniform in [low, high).
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.bits() >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// Kepler orbit whose node, perigee and anomaly drift by J2; time in seconds, angles in radians at time zero.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Orbit {
    pub semi_major_m: f64,
    pub eccentricity: f64,
    pub inclination: f64,
    pub node: f64,
    pub perigee: f64,
    pub anomaly: f64,
    /// Earth's angle at time zero.
    pub sidereal: f64,
}

/// Secular rates, rad/s.
struct Drift {
    node: f64,
    perigee: f64,
    anomaly: f64,
}

impl Orbit {
    fn drift(&self) -> Drift {
        let motion = (EARTH_GM / self.semi_major_m.powi(3)).sqrt();
        let parameter = self.semi_major_m * (1.0 - self.eccentricity * self.eccentricity);
        let factor = 1.5 * EARTH_J2 * (EQUATOR_RADIUS / parameter).powi(2) * motion;
        let (sine, cosine) = self.inclination.sin_cos();
        let flat = (1.0 - self.eccentricity * self.eccentricity).sqrt();
        Drift {
            node: -factor * cosine,
            perigee: factor * (2.0 - 2.5 * sine * sine),
            anomaly: motion + factor * flat * (1.0 - 1.5 * sine * sine),
        }
    }

    /// Eccentric anomaly: Newton from a start that converges for every eccentricity below one.
    fn eccentric(&self, mean: f64) -> f64 {
        let mean = (mean + PI).rem_euclid(TAU) - PI;
        let mut e = if self.eccentricity > 0.8 { PI.copysign(mean) } else { mean };
        for _ in 0..30 {
            let change = (e - self.eccentricity * e.sin() - mean) / (1.0 - self.eccentricity * e.cos());
            e -= change;
            if change.abs() < 1e-15 {
                break;
            }
        }
        e
    }

    /// Position (m) and velocity (m/s), inertial.
    pub fn inertial(&self, t: f64) -> (Vector, Vector) {
        let drift = self.drift();
        let e = self.eccentric(self.anomaly + drift.anomaly * t);
        let flat = (1.0 - self.eccentricity * self.eccentricity).sqrt();
        let (a, (sin_e, cos_e)) = (self.semi_major_m, e.sin_cos());
        let rate = drift.anomaly / (1.0 - self.eccentricity * cos_e);
        let place = [a * (cos_e - self.eccentricity), a * flat * sin_e, 0.0];
        // In the orbit's plane the perigee's drift is a turn of the plane's own axes.
        let motion = [
            -a * sin_e * rate - drift.perigee * place[1],
            a * flat * cos_e * rate + drift.perigee * place[0],
        ];
        let to_space = |v: Vector| {
            let v = rotate(v, self.perigee + drift.perigee * t);
            let (s, c) = self.inclination.sin_cos();
            rotate([v[0], c * v[1] - s * v[2], s * v[1] + c * v[2]], self.node + drift.node * t)
        };
        let position = to_space(place);
        let velocity = to_space([motion[0], motion[1], 0.0]);
        let turned =
            [velocity[0] - drift.node * position[1], velocity[1] + drift.node * position[0], velocity[2]];
        (position, turned)
    }

    /// Earth-fixed position, m.
    pub fn position(&self, t: f64) -> Vector {
        rotate(self.inertial(t).0, -(self.sidereal + EARTH_RATE * t))
    }

    /// Earth-fixed velocity (derivative of the Earth-fixed position), m/s.
    pub fn velocity(&self, t: f64) -> Vector {
        let (r, v) = self.inertial(t);
        let seen = [v[0] + EARTH_RATE * r[1], v[1] - EARTH_RATE * r[0], v[2]];
        rotate(seen, -(self.sidereal + EARTH_RATE * t))
    }

    /// The same orbit with time counted from `t`.
    fn from(&self, t: f64) -> Self {
        let drift = self.drift();
        Self {
            node: self.node + drift.node * t,
            perigee: self.perigee + drift.perigee * t,
            anomaly: self.anomaly + drift.anomaly * t,
            sidereal: self.sidereal + EARTH_RATE * t,
            ..*self
        }
    }
}

/// One pass: elevation is above zero between `rise` (in [0, 1)) and `set`, s.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pass {
    pub orbit: Orbit,
    pub site: Site,
    pub rise: f64,
    pub set: f64,
}

impl Pass {
    pub fn elevation_deg(&self, t: f64) -> f64 {
        self.site.elevation_deg(self.orbit.position(t))
    }
}

/// Endless passes, the same for the same seed.
pub struct Passes {
    random: Random,
    low_only: bool,
}

impl Passes {
    /// Nearly circular, 300 to 1500 km, any inclination.
    pub fn low(seed: u64) -> Self {
        Self { random: Random::new(seed), low_only: true }
    }

    /// Half as `low`; the rest eccentric (perigee 250 to 1000 km, eccentricity to 0.75) or 1500 to 36,000 km high.
    pub fn any(seed: u64) -> Self {
        Self { random: Random::new(seed), low_only: false }
    }

    fn shape(&mut self) -> (f64, f64) {
        let kind = if self.low_only { 0 } else { self.random.bits() % 4 };
        let r = &mut self.random;
        match kind {
            0 | 1 => (EQUATOR_RADIUS + r.between(320e3, 1500e3), r.between(0.0, 0.002)),
            2 => {
                let (perigee, eccentricity) =
                    (EQUATOR_RADIUS + r.between(250e3, 1000e3), r.between(0.002, 0.75));
                (perigee / (1.0 - eccentricity), eccentricity)
            }
            _ => (EQUATOR_RADIUS + r.between(1500e3, 36_000e3), r.between(0.0, 0.02)),
        }
    }

    /// A site within the circle of visibility at time zero, nearly uniform in distance from the point below.
    fn site_below(&mut self, orbit: &Orbit) -> Site {
        let place = orbit.position(0.0);
        let r = super::length(place);
        let distance = self.random.between(0.0, 0.97) * (EQUATOR_RADIUS / r).acos();
        let (bearing, height_m) = (self.random.between(0.0, TAU), self.random.between(-400.0, 4500.0));
        let (sin_lat, longitude) = (place[2] / r, place[1].atan2(place[0]));
        let cos_lat = (1.0 - sin_lat * sin_lat).sqrt();
        // Direct problem on the sphere.
        let sine = sin_lat * distance.cos() + cos_lat * distance.sin() * bearing.cos();
        let east = (bearing.sin() * distance.sin() * cos_lat).atan2(distance.cos() - sin_lat * sine);
        let longitude_deg = ((longitude + east).to_degrees() + 180.0).rem_euclid(360.0) - 180.0;
        Site { latitude_deg: sine.asin().to_degrees(), longitude_deg, height_m }
    }

    /// First time, going from zero by `step`, where the elevation is no longer above zero; none within a day.
    fn edge(pass: &Pass, step: f64) -> Option<f64> {
        let mut t = 0.0;
        while pass.elevation_deg(t + step) > 0.0 {
            t += step;
            if t.abs() > 86_400.0 {
                return None;
            }
        }
        let (mut inside, mut outside) = (t, t + step);
        for _ in 0..60 {
            let middle = (inside + outside) / 2.0;
            if pass.elevation_deg(middle) > 0.0 { inside = middle } else { outside = middle }
        }
        Some(inside)
    }
}

impl Iterator for Passes {
    type Item = Pass;

    fn next(&mut self) -> Option<Pass> {
        loop {
            let (semi_major_m, eccentricity) = self.shape();
            let r = &mut self.random;
            let orbit = Orbit {
                semi_major_m,
                eccentricity,
                inclination: r.between(0.0, PI),
                node: r.between(0.0, TAU),
                perigee: r.between(0.0, TAU),
                anomaly: r.between(0.0, TAU),
                sidereal: r.between(0.0, TAU),
            };
            let site = self.site_below(&orbit);
            let pass = Pass { orbit, site, rise: 0.0, set: 0.0 };
            if pass.elevation_deg(0.0) <= 0.0 {
                continue; // below the ellipsoid's horizon, or the site too low
            }
            let (Some(rise), Some(set)) = (Self::edge(&pass, -10.0), Self::edge(&pass, 10.0)) else {
                continue; // never sets within a day
            };
            // Shorter than a minute is of no use to a table; count time from just before the rise.
            if set - rise > 60.0 {
                let start = rise.floor();
                return Some(Pass { orbit: orbit.from(start), site, rise: rise - start, set: set - start });
            }
        }
    }
}
