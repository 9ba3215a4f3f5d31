//! Settings of the velocity filter: immutable, shared by any number of states.

use crate::follow::FollowError;
use libm::sqrtf;

/// Most estimates that a confirmation can look back on.
pub const LONGEST_CONFIRMATION: u8 = 8;

/// How range rate moves between estimates.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum Dynamics {
    /// Range rate and a constant range acceleration. For what a table leaves over.
    AlphaBeta,
    /// Range rate, range acceleration and a constant jerk. For motion of no known kind.
    AlphaBetaGamma,
    /// Range rate, range acceleration and inverse range on a circular path past the site. For a pass
    /// without a table: jerk follows from the three, so a gap is bridged on the pass's own curve.
    Pass(PassDynamics),
}

/// What is known beforehand of a pass.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct PassDynamics {
    /// Angular rate of the path about the Earth's centre, rad/s, 0 to 0.002; 0 is a straight line.
    /// 1.1e-3 suits orbits from 400 to 700 km.
    pub orbit_rate: f32,
    /// Nearest range that is expected, m, from 1e4.
    pub nearest_range: f32,
    /// Farthest range that is expected, m, at most 1e8.
    pub farthest_range: f32,
    /// How far the geometry's range wanders from the model's, as a part of itself per square root
    /// of a second; from 0 to 0.1. 0.003 covers what a near-circular orbit and the Earth's turning leave out.
    pub range_wander: f32,
}

impl PassDynamics {
    /// A low orbit of 400 to 1200 km seen from the ground.
    pub const LOW_ORBIT: Self =
        Self { orbit_rate: 1.1e-3, nearest_range: 3.5e5, farthest_range: 4.0e6, range_wander: 0.003 };
}

/// Gains: from a tracking index (then they follow the actual interval, start up fast and come with
/// an honest uncertainty), or given.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum Gains {
    /// Kalata's tracking index: sigma of the manoeuvre (jerk for alpha-beta and pass, jerk increment
    /// for alpha-beta-gamma) times interval squared over the measurement's sigma. Above 0, at most 1000.
    TrackingIndex(f32),
    /// Fixed gains: level, rate times interval, curvature times interval squared. Alpha-beta needs gamma 0.
    Fixed {
        /// Part of the innovation added to the level.
        alpha: f32,
        /// Part added to the rate, per interval.
        beta: f32,
        /// Part added to the curvature, per interval squared.
        gamma: f32,
    },
}

/// Steady alpha and beta of a tracking index.
///
/// # Accuracy
/// 1e-6 for indices from 0.01 to 2 (`tests/velocity_filter.rs`, published rows).
///
/// # Source
/// P. R. Kalata, "The tracking index: a generalized parameter for alpha-beta and alpha-beta-gamma
/// target trackers", 1984: `r = (4 + L - sqrt(8 L + L^2)) / 4`, `alpha = 1 - r^2`, `beta = 2 (1 - r)^2`.
///
/// ```
/// let (alpha, beta) = shiftkeel::follow::velocity::steady_alpha_beta(1.0);
/// assert!((alpha - 0.75).abs() < 1e-6 && (beta - 0.5).abs() < 1e-6);
/// ```
pub fn steady_alpha_beta(index: f32) -> (f32, f32) {
    // 1 - r itself is computed without a difference of near numbers.
    let fall = (sqrtf(index * (8.0 + index)) - index) * 0.25;
    (fall * (2.0 - fall), 2.0 * fall * fall)
}

/// Immutable settings of a velocity filter.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct VelocitySettings {
    pub(super) dynamics: Dynamics,
    pub(super) gains: Gains,
    /// Measurement variance, (m/s)^2.
    pub(super) variance: f32,
    /// Update interval, s.
    pub(super) interval: f32,
    /// Variance of the manoeuvre in one interval.
    pub(super) manoeuvre: f32,
    /// Predicted variance above which one estimate is not believed alone.
    pub(super) unsure: f32,
    /// Gate squared, in innovation variances.
    pub(super) gate_squared: f32,
    pub(super) confirm: u8,
    pub(super) confirm_of: u8,
    /// Latency and longest coast in steps of time.
    pub(super) latency: i64,
    pub(super) longest_coast: i64,
    pub(super) acceleration_limit: f32,
}

impl VelocitySettings {
    /// For a low pass without a table: the model of the pass may be off by a jerk whose
    /// variance, times the time it lasts, is 1e-5 m^2/s^5. `sigma` and `interval` as for [`Self::new`].
    ///
    /// # Accuracy
    /// Estimates of 0.1 m/s at 10 Hz: 0.023 m/s rms; 20 s of coasting at most 1.7 m/s off in 95 % of the
    /// runs (`tests/velocity_filter.rs`).
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn for_pass(sigma: f32, interval: f32, pass: PassDynamics) -> Result<Self, FollowError> {
        Self::of_jerk(sigma, interval, Dynamics::Pass(pass), 1e-5)
    }

    /// For what a table leaves over, with elements that are off by some tenths of a second: as
    /// [`Self::for_pass`] with a jerk of 2e-4 m^2/s^5 and alpha-beta dynamics.
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn for_table(sigma: f32, interval: f32) -> Result<Self, FollowError> {
        Self::of_jerk(sigma, interval, Dynamics::AlphaBeta, 2e-4)
    }

    /// The tracking index of a jerk density: jerk^2 T = density, index = jerk T^2 / sigma.
    fn of_jerk(sigma: f32, interval: f32, dynamics: Dynamics, density: f32) -> Result<Self, FollowError> {
        within(sigma, 1e-6, 1e4)?;
        within(interval, 1e-3, 1e3)?;
        let index = sqrtf(density * interval) * interval / sigma;
        Self::new(sigma, interval, dynamics, Gains::TrackingIndex(index))
    }

    /// Settings with a gate of 5 sigma, confirmation 6 of 8, latency 0, longest coast 60 s and an
    /// acceleration limit of 200 m/s^2.
    ///
    /// `sigma`: standard deviation of one estimate, m/s, 1e-6 to 1e4. `interval`: usual time between
    /// estimates, s, 1e-3 to 1e3.
    ///
    /// # Errors
    /// [`FollowError::NotFinite`], [`FollowError::Setting`], [`FollowError::Gains`].
    pub fn new(sigma: f32, interval: f32, dynamics: Dynamics, gains: Gains) -> Result<Self, FollowError> {
        within(sigma, 1e-6, 1e4)?;
        within(interval, 1e-3, 1e3)?;
        if let Dynamics::Pass(pass) = dynamics {
            check_pass(&pass)?;
        }
        let (index, alpha) = check_gains(&dynamics, &gains)?;
        let variance = sigma * sigma;
        let manoeuvre = index * sigma / (interval * interval);
        let steady = variance * alpha / (1.0 - alpha);
        let settings = Self {
            dynamics,
            gains,
            variance,
            interval,
            manoeuvre: manoeuvre * manoeuvre,
            unsure: if 4.0 * steady > variance { 4.0 * steady } else { variance },
            gate_squared: 25.0,
            confirm: 6,
            confirm_of: 8,
            latency: 0,
            longest_coast: 0,
            acceleration_limit: 200.0,
        };
        settings.with_longest_coast(60.0)
    }

    /// With an innovation gate of `sigmas` (1 to 100).
    ///
    /// # Errors
    /// [`FollowError::NotFinite`], [`FollowError::Setting`].
    pub fn with_gate(self, sigmas: f32) -> Result<Self, FollowError> {
        within(sigmas, 1.0, 100.0)?;
        Ok(Self { gate_squared: sigmas * sigmas, ..self })
    }

    /// With a new level accepted when `confirm` of the last `of` estimates agree with one another
    /// (a majority, at least 2, `of` at most 8).
    ///
    /// # Errors
    /// [`FollowError::Confirmation`].
    pub fn with_confirmation(self, confirm: u8, of: u8) -> Result<Self, FollowError> {
        if of > LONGEST_CONFIRMATION || confirm > of || confirm <= of / 2 || confirm < 2 {
            return Err(FollowError::Confirmation);
        }
        Ok(Self { confirm, confirm_of: of, ..self })
    }

    /// With estimates that may be tagged up to `seconds` (0 to 60) before the tick that brings them.
    ///
    /// # Errors
    /// [`FollowError::NotFinite`], [`FollowError::Setting`].
    pub fn with_latency(self, seconds: f32) -> Result<Self, FollowError> {
        within(seconds, 0.0, 60.0)?;
        Ok(Self { latency: time_steps(seconds), ..self })
    }

    /// With predictions for up to `seconds` (1e-3 to 1e4) after the last used estimate, none later.
    ///
    /// # Errors
    /// [`FollowError::NotFinite`]; [`FollowError::Setting`], also where the path of a pass would turn
    /// by more than half a radian, or the uncertainty would leave `f32`.
    pub fn with_longest_coast(self, seconds: f32) -> Result<Self, FollowError> {
        within(seconds, 1e-3, 1e4)?;
        let count = seconds / self.interval;
        let spread = sqrtf(self.manoeuvre) * (1.0 + count) * seconds * seconds;
        let turn = if let Dynamics::Pass(pass) = self.dynamics { pass.orbit_rate * seconds } else { 0.0 };
        if spread > 1e12 || turn > 0.5 {
            return Err(FollowError::Setting);
        }
        Ok(Self { longest_coast: time_steps(seconds), ..self })
    }

    /// With a range acceleration of at most `limit` m/s^2 (1e-6 to 1e4): how far estimates may run
    /// apart while they still agree, and what is assumed before the first.
    ///
    /// # Errors
    /// [`FollowError::NotFinite`], [`FollowError::Setting`].
    pub fn with_acceleration_limit(self, limit: f32) -> Result<Self, FollowError> {
        within(limit, 1e-6, 1e4)?;
        Ok(Self { acceleration_limit: limit, ..self })
    }
}

/// Steps of time; saturates.
#[allow(clippy::cast_possible_truncation, reason = "a float becomes the nearest integer in range")]
pub(super) fn time_steps(seconds: f32) -> i64 {
    (seconds * (1u32 << 30) as f32) as i64
}

fn within(value: f32, least: f32, most: f32) -> Result<(), FollowError> {
    if !value.is_finite() {
        return Err(FollowError::NotFinite);
    }
    if value < least || value > most { Err(FollowError::Setting) } else { Ok(()) }
}

fn check_pass(pass: &PassDynamics) -> Result<(), FollowError> {
    within(pass.orbit_rate, 0.0, 2e-3)?;
    within(pass.nearest_range, 1e4, 1e8)?;
    within(pass.farthest_range, pass.nearest_range, 1e8)?;
    within(pass.range_wander, 0.0, 0.1)
}

/// The tracking index (own, or that of the given gains) and alpha.
fn check_gains(dynamics: &Dynamics, gains: &Gains) -> Result<(f32, f32), FollowError> {
    match *gains {
        Gains::TrackingIndex(index) => {
            within(index, f32::MIN_POSITIVE, 1e3).map_err(|_| FollowError::Gains)?;
            Ok((index, steady_alpha_beta(index).0))
        }
        Gains::Fixed { alpha, beta, gamma } => {
            let last = match dynamics {
                Dynamics::AlphaBeta if gamma == 0.0 => beta,
                Dynamics::AlphaBetaGamma if gamma > 0.0 => gamma,
                _ => return Err(FollowError::Gains),
            };
            // Jury's conditions for z^3 + (a + b + g/2 - 3) z^2 + (3 - 2a - b + g/2) z + (a - 1).
            let sum = alpha + beta + 0.5 * gamma - 3.0;
            let rest = 3.0 - 2.0 * alpha - beta + 0.5 * gamma;
            let end = alpha - 1.0;
            let inner = alpha * (2.0 - alpha) - (end * sum - rest).abs();
            let stable = alpha > 0.0 && alpha < 1.0 && beta > 0.0 && 4.0 - 2.0 * alpha - beta > 0.0;
            if !stable || (gamma > 0.0 && inner <= 0.0) {
                return Err(FollowError::Gains);
            }
            // Kalata's relation: index^2 = (last gain)^2 / (1 - alpha).
            Ok((last / sqrtf(1.0 - alpha), alpha))
        }
    }
}
