//! SGP4 with WGS-72 constants in its AFSPC compatible mode, in seconds from a reference epoch.
//!
//! Published element sets are fitted with these constants and this mode; the other constructors of the
//! propagator give positions that are off by kilometres.

use crate::elements::ElementSet;
use crate::frames::EARTH_ROTATION;
use crate::instant;
use crate::vector::{State, Vector};
use chrono::{DateTime, Utc};
use std::f64::consts::TAU;

/// Earth radius of WGS-72, m; a spacecraft below it has decayed.
pub const EARTH_RADIUS_WGS72: f64 = 6_378_135.0;

/// Gravitational parameter of the Earth, m^3/s^2 (WGS-84, IERS Conventions 2010).
pub const GRAVITATIONAL_PARAMETER: f64 = 3.986_004_418e14;

/// Half step of the differences in [`Orbit::derivative`], s.
const DIFFERENCE_STEP: f64 = 0.5;

/// Why there is no position.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum OrbitError {
    /// The elements describe no orbit.
    #[error(
        "the elements of {object} describe no orbit that SGP4 can start from ({reason}); fetch them again"
    )]
    Unusable {
        /// Name or number.
        object: String,
        /// What the propagator said.
        reason: String,
    },
    /// Below the surface.
    #[error(
        "{object} has decayed: {height_km:.0} km below the Earth's surface at {time}, {days:.2} days from its \
         element epoch; use newer elements or an earlier time"
    )]
    Decayed {
        /// Name or number.
        object: String,
        /// When.
        time: String,
        /// How deep.
        height_km: f64,
        /// From the element epoch.
        days: f64,
    },
    /// The theory breaks down.
    #[error(
        "the orbit of {object} cannot be followed to {time}, {days:.2} days from its element epoch ({reason}): \
         it has probably decayed; use newer elements or a time nearer to their epoch"
    )]
    BeyondTheory {
        /// Name or number.
        object: String,
        /// When.
        time: String,
        /// From the element epoch.
        days: f64,
        /// Which of the published error conditions it is.
        reason: TheoryLimit,
    },
}

/// The published error conditions of SGP4, by their published numbers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum TheoryLimit {
    /// Not among the published ones: no finite position.
    #[error("no finite position")]
    NotFinite = 0,
    /// 1: mean eccentricity out of range.
    #[error("mean eccentricity out of range")]
    MeanEccentricity = 1,
    /// 3: perturbed eccentricity out of range.
    #[error("perturbed eccentricity out of range")]
    PerturbedEccentricity = 3,
    /// 4: semi-latus rectum below zero.
    #[error("semi-latus rectum below zero")]
    SemiLatusRectum = 4,
}

impl From<&sgp4::Error> for TheoryLimit {
    fn from(error: &sgp4::Error) -> Self {
        match error {
            sgp4::Error::OutOfRangeEccentricity { .. } => Self::MeanEccentricity,
            sgp4::Error::OutOfRangePerturbedEccentricity { .. } => Self::PerturbedEccentricity,
            sgp4::Error::NegativeSemiLatusRectum { .. } => Self::SemiLatusRectum,
        }
    }
}

/// An element set that is ready to be propagated.
#[derive(Clone, Debug)]
pub struct Orbit {
    constants: sgp4::Constants,
    label: String,
    reference: DateTime<Utc>,
    /// Seconds from the element epoch to the reference epoch.
    offset: f64,
    fastest: f64,
    period: f64,
}

impl Orbit {
    /// From an element set; times are then seconds from `reference`.
    ///
    /// # Errors
    /// [`OrbitError::Unusable`] when the elements describe no orbit.
    pub fn new(set: &ElementSet, reference: DateTime<Utc>) -> Result<Self, OrbitError> {
        let constants = sgp4::Constants::from_elements_afspc_compatibility_mode(&set.mean)
            .map_err(|error| OrbitError::Unusable { object: set.label(), reason: error.to_string() })?;
        let offset = instant::seconds_between(set.epoch, reference);
        Ok(Self {
            constants,
            label: set.label(),
            reference,
            offset,
            fastest: fastest(&set.mean),
            period: 86_400.0 / set.mean.mean_motion,
        })
    }

    /// The same orbit with a spacecraft that comes `seconds` later than its elements say.
    pub fn late_by(mut self, seconds: f64) -> Self {
        self.offset -= seconds;
        self
    }

    /// The reference epoch.
    pub const fn reference(&self) -> DateTime<Utc> {
        self.reference
    }

    /// Name or number of the object.
    pub fn label(&self) -> &str {
        &self.label
    }

    /// A speed that the object does not exceed in the Earth-fixed frame, m/s.
    pub const fn fastest(&self) -> f64 {
        self.fastest
    }

    /// Period of revolution at the element epoch, s.
    pub const fn period(&self) -> f64 {
        self.period
    }

    /// Position and SGP4's own velocity in TEME at `t` s from the reference epoch.
    ///
    /// # Errors
    /// When the object has decayed or the theory breaks down.
    pub fn state(&self, t: f64) -> Result<State, OrbitError> {
        let minutes = sgp4::MinutesSinceEpoch((self.offset + t) / 60.0);
        let found = self
            .constants
            .propagate_afspc_compatibility_mode(minutes)
            .map_err(|error| self.beyond_theory(t, (&error).into()))?;
        let metres = |[x, y, z]: [f64; 3]| Vector::new(x * 1e3, y * 1e3, z * 1e3);
        let position = metres(found.position);
        let radius = position.length();
        if !radius.is_finite() {
            return Err(self.beyond_theory(t, TheoryLimit::NotFinite));
        }
        if radius < EARTH_RADIUS_WGS72 {
            return Err(OrbitError::Decayed {
                object: self.label.clone(),
                time: self.time_text(t),
                height_km: (EARTH_RADIUS_WGS72 - radius) * 1e-3,
                days: (self.offset + t) / 86_400.0,
            });
        }
        Ok(State { position, velocity: metres(found.velocity) })
    }

    /// Position in TEME, and velocity as its derivative.
    ///
    /// SGP4's own velocity differs from the derivative of its position by up to some millimetres a second.
    /// Central differences of sixth order with a step of 0.5 s; the first term left out is
    /// `r n^7 h^6 / 140`, below 1e-14 m/s for any orbit, so only the noise of the position counts.
    ///
    /// # Accuracy
    /// Noise of 1e-8 m/s near the element epoch and 1e-6 m/s ten days from it (3e-15 of c), where time and phase
    /// are rounded more coarsely; `tests/vacuum_model.rs` measures it.
    ///
    /// # Errors
    /// As [`Orbit::state`].
    ///
    /// # Source
    /// Abramowitz and Stegun, table 25.2 (seven points), from memory.
    pub fn derivative(&self, t: f64) -> Result<State, OrbitError> {
        let h = DIFFERENCE_STEP;
        let at = |steps: f64| self.state(t + steps * h).map(|state| state.position);
        let pair = |steps: f64| Ok::<_, OrbitError>(at(steps)? - at(-steps)?);
        let sum = pair(1.0)? * 45.0 - pair(2.0)? * 9.0 + pair(3.0)?;
        Ok(State { position: at(0.0)?, velocity: sum * (1.0 / (60.0 * h)) })
    }

    fn time_text(&self, t: f64) -> String {
        instant::after(self.reference, (t * 1e3).round() * 1e-3)
            .map_or_else(|| format!("{t} s from {}", self.reference), instant::write)
    }

    fn beyond_theory(&self, t: f64, reason: TheoryLimit) -> OrbitError {
        OrbitError::BeyondTheory {
            object: self.label.clone(),
            time: self.time_text(t),
            days: (self.offset + t) / 86_400.0,
            reason,
        }
    }
}

/// Speed at perigee plus that of the turning frame at apogee, m/s, with 10 % for perturbations and drag.
fn fastest(mean: &sgp4::Elements) -> f64 {
    let motion = mean.mean_motion * TAU / 86_400.0;
    let axis = (GRAVITATIONAL_PARAMETER / (motion * motion)).cbrt();
    let shape = ((1.0 + mean.eccentricity) / (1.0 - mean.eccentricity)).sqrt();
    1.1 * (motion * axis * shape + EARTH_ROTATION * axis * (1.0 + mean.eccentricity))
}
