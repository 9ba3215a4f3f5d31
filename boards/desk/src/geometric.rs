//! Instantaneous geometry: where the spacecraft is now, and how fast it comes.
//!
//! No light time, no clocks, SGP4's own velocity. It differs from what is heard by up to 0.15 Hz at 437 MHz;
//! [`crate::vacuum`] adds what is missing.

use crate::SPEED_OF_LIGHT;
use crate::frames::{EarthRotation, Look, Site};
use crate::orbit::{Orbit, OrbitError};
use crate::vector::State;
use clap::ValueEnum;

/// Which way the signal goes, and so at which end time is tagged.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Direction {
    /// Spacecraft to ground, tagged at ground reception.
    Down,
    /// Ground to spacecraft, tagged at ground transmission: the shift that the spacecraft hears.
    Up,
    /// Ground to spacecraft and coherently back, tagged at ground reception.
    TwoWay,
}

/// What a model says for one instant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sight {
    /// Elevation and azimuth.
    pub look: Look,
    /// Length of the signal's path (one way), m.
    pub range: f64,
    /// Its rate, m/s, positive = receding.
    pub range_rate: f64,
    /// ln(received / transmitted frequency), positive = approaching.
    pub rapidity: f64,
}

impl Sight {
    /// Received minus transmitted frequency in hertz, for a carrier in hertz.
    pub fn shift(&self, carrier: f64) -> f64 {
        carrier * self.rapidity.exp_m1()
    }
}

/// A spacecraft, a site, and the Earth that turns between them.
#[derive(Clone, Debug)]
pub struct GeometricModel {
    orbit: Orbit,
    site: Site,
    rotation: EarthRotation,
}

impl GeometricModel {
    /// With `dut1` = UT1 - UTC in seconds.
    pub fn new(orbit: Orbit, site: Site, dut1: f64) -> Self {
        let rotation = EarthRotation::new(orbit.reference(), dut1);
        Self { orbit, site, rotation }
    }

    /// The orbit.
    pub const fn orbit(&self) -> &Orbit {
        &self.orbit
    }

    /// The site.
    pub const fn site(&self) -> &Site {
        &self.site
    }

    /// The Earth's rotation.
    pub const fn rotation(&self) -> &EarthRotation {
        &self.rotation
    }

    /// Earth-fixed state of the spacecraft at `t` s from the reference epoch.
    ///
    /// # Errors
    /// When the orbit gives no position.
    pub fn earth_fixed(&self, t: f64) -> Result<State, OrbitError> {
        Ok(self.rotation.to_earth_fixed(self.orbit.state(t)?, t))
    }

    /// What is seen at `t` s from the reference epoch.
    ///
    /// # Errors
    /// When the orbit gives no position.
    pub fn sight(&self, t: f64, direction: Direction) -> Result<Sight, OrbitError> {
        Ok(sight_of(&self.site, self.earth_fixed(t)?, direction))
    }
}

/// What a site sees of an Earth-fixed state.
pub fn sight_of(site: &Site, state: State, direction: Direction) -> Sight {
    let line = state.position - site.earth_fixed();
    let range = line.length();
    let range_rate = line.dot(state.velocity) / range;
    let legs = if direction == Direction::TwoWay { -2.0 } else { -1.0 };
    let rapidity = legs * (range_rate / SPEED_OF_LIGHT).atanh();
    Sight { look: site.look(line), range, range_rate, rapidity }
}
