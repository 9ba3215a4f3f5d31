//! The ground end: a place on the WGS-84 ellipsoid, fixed or moving.
//!
//! Source: National Imagery and Mapping Agency, TR8350.2, World Geodetic System 1984, from memory.

use super::geometry::GeometryError;
use crate::time::GpsTime;

/// Semi-major axis of the WGS-84 ellipsoid, m.
pub(super) const EARTH_RADIUS: f64 = 6_378_137.0;
/// WGS-84 first eccentricity squared.
const ECCENTRICITY_SQUARED: f64 = 6.694_379_990_141_317e-3;

pub(super) type Vector = [f64; 3];

/// Where the ground end is: WGS-84 geodetic coordinates, fixed or moving at a constant velocity.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Site {
    position: Vector,
    pub(super) velocity: Vector,
    pub(super) east: Vector,
    pub(super) north: Vector,
    pub(super) up: Vector,
    pub(super) epoch: GpsTime,
    pub(super) geodetic: [f64; 3],
}

impl Site {
    /// A fixed site: latitude and longitude in degrees (north and east positive), height in metres above the
    /// WGS-84 ellipsoid.
    ///
    /// # Errors
    /// [`GeometryError::SiteOffEarth`].
    pub fn geodetic(latitude: f64, longitude: f64, height: f64) -> Result<Self, GeometryError> {
        let on_earth = latitude.abs() <= 90.0 && longitude.abs() <= 360.0 && (-500.0..=1e5).contains(&height);
        if !on_earth {
            return Err(GeometryError::SiteOffEarth);
        }
        let radians = core::f64::consts::PI / 180.0;
        let (sine_latitude, cosine_latitude) = (libm::sin(latitude * radians), libm::cos(latitude * radians));
        let (sine_longitude, cosine_longitude) =
            (libm::sin(longitude * radians), libm::cos(longitude * radians));
        let normal = EARTH_RADIUS / libm::sqrt(1.0 - ECCENTRICITY_SQUARED * sine_latitude * sine_latitude);
        let level = (normal + height) * cosine_latitude;
        Ok(Self {
            position: [
                level * cosine_longitude,
                level * sine_longitude,
                (normal * (1.0 - ECCENTRICITY_SQUARED) + height) * sine_latitude,
            ],
            velocity: [0.0; 3],
            east: [-sine_longitude, cosine_longitude, 0.0],
            north: [-sine_latitude * cosine_longitude, -sine_latitude * sine_longitude, cosine_latitude],
            up: [cosine_latitude * cosine_longitude, cosine_latitude * sine_longitude, sine_latitude],
            epoch: GpsTime::default(),
            geodetic: [latitude, longitude, height],
        })
    }

    /// The same site moving at a constant Earth-fixed velocity (east, north, up in m/s), where it is at `epoch`.
    ///
    /// # Errors
    /// [`GeometryError::SiteTooFast`].
    pub fn moving(self, [east, north, up]: [f64; 3], epoch: GpsTime) -> Result<Self, GeometryError> {
        let speed = libm::sqrt(east * east + north * north + up * up);
        if !(0.0..=1000.0).contains(&speed) {
            return Err(GeometryError::SiteTooFast);
        }
        let mut velocity = [0.0; 3];
        for (index, component) in velocity.iter_mut().enumerate() {
            let part = |axis: &Vector| axis.get(index).copied().unwrap_or(0.0);
            *component = east * part(&self.east) + north * part(&self.north) + up * part(&self.up);
        }
        Ok(Self { velocity, epoch, ..self })
    }

    /// Latitude and longitude in degrees, height in metres, as given.
    pub fn geodetic_coordinates(&self) -> [f64; 3] {
        self.geodetic
    }

    /// Earth-fixed position in metres.
    pub fn earth_fixed(&self) -> [f64; 3] {
        self.position
    }

    /// Position in metres, so many seconds after the epoch.
    pub(super) fn at(&self, seconds_from_epoch: f64) -> Vector {
        let [x, y, z] = self.position;
        let [u, v, w] = self.velocity;
        [x + u * seconds_from_epoch, y + v * seconds_from_epoch, z + w * seconds_from_epoch]
    }
}
