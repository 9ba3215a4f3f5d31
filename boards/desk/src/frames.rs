//! Frames: TEME to the pseudo-Earth-fixed frame, geodetic sites, elevation and azimuth.
//!
//! TEME is taken as inertial over a pass. Polar motion is left out: it moves a site by up to 15 m.

use crate::instant;
use crate::vector::{State, Vector};
use chrono::{DateTime, NaiveDate, Utc};
use std::f64::consts::{FRAC_PI_2, TAU};

/// Equatorial radius of WGS-84, m.
pub const EARTH_RADIUS_WGS84: f64 = 6_378_137.0;
/// Flattening of WGS-84.
pub const FLATTENING_WGS84: f64 = 1.0 / 298.257_223_563;

/// Rate at which the pseudo-Earth-fixed frame turns in TEME when velocities are turned over, rad/s.
///
/// It is 7e-12 rad/s less than [`sidereal_rate`], by the precession of the equinox that TEME follows: 0.03 mm/s
/// for a site. Published velocities use it (AIAA 2006-6753, appendix C).
pub const EARTH_ROTATION: f64 = 7.292_115_146_706_979e-5;

/// The Earth's rotation from a reference epoch on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EarthRotation {
    angle: f64,
    rate: f64,
}

impl EarthRotation {
    /// Rotation at `reference`, with `dut1` = UT1 - UTC in seconds.
    ///
    /// # Accuracy
    /// The angle is taken as linear from there on; after ten days that is 1e-12 rad off.
    ///
    /// # Source
    /// Greenwich mean sidereal time of the IAU 1982 convention (Aoki et al., Astron. Astrophys. 105, 359).
    pub fn new(reference: DateTime<Utc>, dut1: f64) -> Self {
        let noon = NaiveDate::from_ymd_opt(2000, 1, 1).and_then(|day| day.and_hms_opt(12, 0, 0));
        let j2000 = noon.unwrap_or_default().and_utc();
        let seconds = instant::seconds_between(j2000, reference) + dut1;
        Self { angle: sidereal_angle(seconds), rate: sidereal_rate(seconds) }
    }

    /// Greenwich mean sidereal time `t` s after the reference epoch, rad, not reduced to one turn.
    pub fn angle(&self, t: f64) -> f64 {
        self.angle + self.rate * t
    }

    /// Rate of the angle, rad/s.
    pub const fn rate(&self) -> f64 {
        self.rate
    }

    /// A TEME state at `t` in the pseudo-Earth-fixed frame, its velocity as seen from the turning Earth.
    pub fn to_earth_fixed(&self, state: State, t: f64) -> State {
        let position = state.position.turned_about_z(-self.angle(t));
        let velocity = state.velocity.turned_about_z(-self.angle(t)) - position.swept_about_z(EARTH_ROTATION);
        State { position, velocity }
    }

    /// An Earth-fixed position at `t` in TEME, with the velocity that the Earth's rotation gives it.
    pub fn to_inertial(&self, position: Vector, t: f64) -> State {
        let position = position.turned_about_z(self.angle(t));
        State { position, velocity: position.swept_about_z(self.rate) }
    }
}

/// Julian centuries of UT1 from J2000.
fn centuries(ut1_seconds: f64) -> f64 {
    ut1_seconds / (36_525.0 * 86_400.0)
}

/// Greenwich mean sidereal time (IAU 1982) in [0, 2 pi), from UT1 seconds since 2000-01-01T12:00.
pub fn sidereal_angle(ut1_seconds: f64) -> f64 {
    let t = centuries(ut1_seconds);
    // The turns of whole days drop out; what is left of the day is kept exact.
    let of_day = (ut1_seconds + 43_200.0).rem_euclid(86_400.0);
    let seconds = 24_110.548_41 + (8_640_184.812_866 + (0.093_104 - 6.2e-6 * t) * t) * t + of_day;
    (seconds * TAU / 86_400.0).rem_euclid(TAU)
}

/// Rate of [`sidereal_angle`], rad per UT1 second.
pub fn sidereal_rate(ut1_seconds: f64) -> f64 {
    let t = centuries(ut1_seconds);
    let excess = (8_640_184.812_866 + (2.0 * 0.093_104 - 3.0 * 6.2e-6 * t) * t) / (36_525.0 * 86_400.0);
    (1.0 + excess) * TAU / 86_400.0
}

/// Why a site cannot be used.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SiteError {
    /// Not three numbers.
    #[error(
        "'{text}' is not a site; write LATITUDE,LONGITUDE,HEIGHT in degrees, degrees and metres, such as \
         45.0,7.5,300 (south and west negative)"
    )]
    NotASite {
        /// What was given.
        text: String,
    },
    /// Beyond the poles.
    #[error("latitude {degrees} is off the Earth: it runs from -90 (south pole) to 90 degrees (north pole)")]
    Latitude {
        /// What was given.
        degrees: f64,
    },
    /// Beyond a turn.
    #[error(
        "longitude {degrees} is off the Earth: it runs from -180 (west) to 180, or from 0 to 360 degrees east"
    )]
    Longitude {
        /// What was given.
        degrees: f64,
    },
    /// Neither ground nor air.
    #[error("height {metres} m is off the Earth: a site lies between -1000 and 50000 m above the ellipsoid")]
    Height {
        /// What was given.
        metres: f64,
    },
}

/// A place fixed to the Earth, in geodetic coordinates of WGS-84.
///
/// The crate's own `Site` is not used: this model is what the crate's is held against, so it shares no code with it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Site {
    latitude: f64,
    longitude: f64,
    height: f64,
}

impl Site {
    /// From degrees (north and east positive) and metres above the ellipsoid.
    ///
    /// # Errors
    /// When it is not on the Earth.
    pub fn from_degrees(latitude: f64, longitude: f64, height: f64) -> Result<Self, SiteError> {
        if !(-90.0..=90.0).contains(&latitude) {
            return Err(SiteError::Latitude { degrees: latitude });
        }
        if !(-180.0..=360.0).contains(&longitude) {
            return Err(SiteError::Longitude { degrees: longitude });
        }
        if !(-1000.0..=50_000.0).contains(&height) {
            return Err(SiteError::Height { metres: height });
        }
        Ok(Self { latitude: latitude.to_radians(), longitude: longitude.to_radians(), height })
    }

    /// Geodetic latitude, rad, north positive.
    pub const fn latitude(&self) -> f64 {
        self.latitude
    }

    /// Longitude, rad, east positive.
    pub const fn longitude(&self) -> f64 {
        self.longitude
    }

    /// Height above the ellipsoid, m.
    pub const fn height(&self) -> f64 {
        self.height
    }

    /// Earth-fixed position, m.
    ///
    /// # Source
    /// IOGP guidance note 7-2, geographic/geocentric conversion.
    pub fn earth_fixed(&self) -> Vector {
        let squared = FLATTENING_WGS84 * (2.0 - FLATTENING_WGS84);
        let (sine, cosine) = self.latitude.sin_cos();
        let curvature = EARTH_RADIUS_WGS84 / (1.0 - squared * sine * sine).sqrt();
        let out = (curvature + self.height) * cosine;
        let (east, along) = self.longitude.sin_cos();
        Vector::new(out * along, out * east, (curvature * (1.0 - squared) + self.height) * sine)
    }

    /// Unit vector of the plumb line away from the ellipsoid, Earth-fixed.
    pub fn up(&self) -> Vector {
        let (sine, cosine) = self.latitude.sin_cos();
        let (east, along) = self.longitude.sin_cos();
        Vector::new(cosine * along, cosine * east, sine)
    }

    /// Elevation and azimuth of an Earth-fixed direction as seen from here.
    pub fn look(&self, direction: Vector) -> Look {
        let (sine, cosine) = self.latitude.sin_cos();
        let (east_sine, east_cosine) = self.longitude.sin_cos();
        let east = direction.y * east_cosine - direction.x * east_sine;
        let outward = direction.x * east_cosine + direction.y * east_sine;
        let north = direction.z * cosine - outward * sine;
        let up = outward * cosine + direction.z * sine;
        let flat = east.hypot(north);
        let elevation = if flat == 0.0 && up == 0.0 { FRAC_PI_2 } else { up.atan2(flat) };
        let azimuth = if flat == 0.0 { 0.0 } else { east.atan2(north).rem_euclid(TAU) };
        Look { elevation, azimuth }
    }
}

impl std::str::FromStr for Site {
    type Err = SiteError;

    fn from_str(text: &str) -> Result<Self, SiteError> {
        let numbers: Vec<f64> = text.split(',').filter_map(|part| part.trim().parse().ok()).collect();
        match (numbers.as_slice(), text.split(',').count()) {
            (&[latitude, longitude, height], 3) => Self::from_degrees(latitude, longitude, height),
            _ => Err(SiteError::NotASite { text: text.to_string() }),
        }
    }
}

/// Where a spacecraft stands in the sky.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Look {
    /// Above the horizontal plane, rad.
    pub elevation: f64,
    /// From north over east, rad, in [0, 2 pi).
    pub azimuth: f64,
}
