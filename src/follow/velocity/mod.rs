//! A filter for range-rate estimates: late, uneven, noisy, sometimes wildly wrong, sometimes missing.
//!
//! [`VelocitySettings`] hold what does not change, [`VelocityFilter`] what does; one call of
//! [`VelocityFilter::step`] a tick, with or without an estimate, and [`VelocityFilter::predict`] for
//! any instant after it. The recursion is Kalman's: its process noise comes from the tracking index,
//! so that it starts up fast, weighs every estimate by the interval that really passed, ends at
//! Kalata's gains, and states an uncertainty that grows while it coasts.
//!
//! One estimate alone is believed only while the filter is sure: inside the gate, and predicted about
//! as well as it is measured. After a gap or a jump, M of the last N must agree with one another. So
//! a lone outlier is never followed.
//!
//! | [`Dynamics`] | for | rms while estimates come | error after 20 s of silence |
//! |---|---|---|---|
//! | `AlphaBeta` ([`VelocitySettings::for_table`]) | what a table leaves over | 0.027 m/s | 1.6 m/s |
//! | `AlphaBetaGamma` | motion of no known kind | 0.042 m/s | 77 m/s at the worst place |
//! | `Pass` ([`VelocitySettings::for_pass`]) | a pass without a table | 0.023 m/s | 1.7 m/s at the worst place |
//!
//! (Estimates of 0.1 m/s at 10 Hz, one in twenty off by 100 m/s, a pass at 579 km, the table 0.2 s early:
//! `tests/velocity_filter.rs`. Only `Pass` states an uncertainty of silence that is right at every place of
//! a pass: the error of the others there is the motion's own next derivative, which they do not know.)
//!
//! With a table ahead, filter what the table leaves: give [`Estimate::beyond`] the table's rapidity at
//! the estimate's time, set [`Tick::ahead`] to the table's rapidity at the tick, and add the table's
//! motion to the prediction ([`VelocityFilter::predict`] integrates the delay so that the sum fits).
//!
//! ```
//! use shiftkeel::follow::velocity::*;
//! use shiftkeel::time::GpsTime;
//! let settings = VelocitySettings::new(0.1, 0.1, Dynamics::AlphaBeta, Gains::TrackingIndex(0.1))?;
//! let mut filter = VelocityFilter::new();
//! for tick in 1..=20 {
//!     let now = GpsTime::from_bits(tick * (1 << 30) / 10);
//!     let estimate = Estimate::from_metres_per_second(now, -7000.0 + tick as f32)?;
//!     filter.step(&settings, Tick::with_estimate(now, estimate))?;
//! }
//! let motion = filter.predict(&settings, GpsTime::from_bits(2 << 30)).unwrap();
//! assert!((motion.rapidity.to_bits() as f64 / 2f64.powi(60) - 6980.0 / 299_792_458.0).abs() < 1e-12);
//! # Ok::<(), shiftkeel::follow::FollowError>(())
//! ```

mod candidates;
mod dynamics;
mod estimate;
mod settings;
mod units;

pub use estimate::Estimate;
pub use settings::{
    Dynamics, Gains, LONGEST_CONFIRMATION, PassDynamics, VelocitySettings, steady_alpha_beta,
};

use crate::follow::FollowError;
use crate::rapidity::{Delay, Motion, Rapidity, RapidityRate};
use crate::time::GpsTime;
use candidates::{Agreement, Candidate, Candidates};
use dynamics::{Covariance, Track};
use libm::sqrtf;
use units::{delay_from_metres, delay_of_level, rapidity_from_speed, seconds, steps};

/// Bits of the largest rapidity that is followed: 2^-10, 293 km/s.
const WIDEST: u32 = 50;

/// One step's input.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Tick {
    /// The instant of the step; later than the last one.
    pub now: GpsTime,
    /// An estimate that has arrived, tagged with its own time, not later than `now`.
    pub estimate: Option<Estimate>,
    /// Rapidity of a table ahead at `now`; zero without one.
    pub ahead: Rapidity,
}

impl Tick {
    /// A tick on which nothing arrived.
    pub const fn without_estimate(now: GpsTime) -> Self {
        Self { now, estimate: None, ahead: Rapidity::ZERO }
    }

    /// A tick that brings an estimate.
    pub const fn with_estimate(now: GpsTime, estimate: Estimate) -> Self {
        Self { now, estimate: Some(estimate), ahead: Rapidity::ZERO }
    }
}

/// What a step did.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum Outcome {
    /// No estimate.
    Coasted,
    /// The estimate was used.
    Used,
    /// The estimate waits for others that agree with it.
    Waiting,
    /// Enough estimates agreed: they were used, together with those that had waited.
    Confirmed,
    /// Enough estimates agreed on a level outside the gate, or on the first level: a new start from them.
    Restarted,
}

/// How far a prediction may be off: expanded uncertainty with a coverage factor of 2 (about 95 %).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Uncertainty {
    /// In m/s.
    pub metres_per_second: f32,
}

impl Uncertainty {
    /// The same as a rapidity, not negative.
    pub fn rapidity(self) -> Rapidity {
        Rapidity::from_bits(rapidity_from_speed(-self.metres_per_second))
    }
}

/// State of a velocity filter: 304 bytes, `Copy`, for settings of any kind.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub struct VelocityFilter {
    /// At the last estimate that was used, or later while coasting.
    track: Track,
    covariance: Covariance,
    /// At the last step: what predictions start from.
    steered: Track,
    delay: i64,
    ahead: i64,
    last_estimate: GpsTime,
    last_used: GpsTime,
    /// Newest first.
    candidates: Candidates,
    stepped: bool,
    measured: bool,
    known: bool,
}

impl VelocityFilter {
    /// Nothing known, delay zero.
    pub fn new() -> Self {
        Self::default()
    }

    /// Advances to `tick.now`, taking in its estimate. While nothing comes, step at least once an
    /// interval: the uncertainty of a pass is worked out in such steps.
    ///
    /// # Errors
    /// The state stays as it was: [`FollowError::TimeBackwards`], [`FollowError::ZeroInterval`],
    /// [`FollowError::FutureEstimate`], [`FollowError::EstimateBackwards`],
    /// [`FollowError::LateEstimate`], [`FollowError::BeyondFormat`] (a rapidity of 2^-10, 293 km/s, or
    /// more; 2^31 s or more since the last step).
    ///
    /// # Cost
    /// Instructions with an estimate, alpha-beta / alpha-beta-gamma / pass: about 1700 / 1700 / 2400 on a
    /// Cortex-M4F, 11 000 / 17 000 / 49 000 on a Cortex-M0; half of it or less without one. A restart or
    /// confirmation replays up to eight estimates once.
    pub fn step(&mut self, settings: &VelocitySettings, tick: Tick) -> Result<Outcome, FollowError> {
        self.check(settings, &tick)?;
        let delay = self.predict(settings, tick.now).map_or(self.delay, |motion| motion.delay.to_bits());
        if self.known && steps(self.last_used, tick.now) > settings.longest_coast {
            self.known = false;
            self.candidates = Candidates::default();
        }
        let outcome = match tick.estimate {
            None => Outcome::Coasted,
            Some(estimate) => self.observe(settings, estimate),
        };
        self.coast(settings, tick.now);
        // The delay goes on from where it was; only its slope follows the new level.
        let unknown = Track { time: tick.now, ..Track::default() };
        self.steered = if self.known { self.track.at(&settings.dynamics, tick.now) } else { unknown };
        self.delay = delay;
        self.ahead = tick.ahead.to_bits();
        self.stepped = true;
        Ok(outcome)
    }

    /// The motion at `at`; `None` before the first confirmed level, before the last step, and once the
    /// longest coast has passed.
    ///
    /// The delay is the integral of the rapidity from the first level on, without jumps: where a step
    /// corrects the level, only the slope changes.
    ///
    /// # Accuracy
    /// Delay against the integral of the rapidity: 1e-4 cycles at 437 MHz over 20 s in ticks of 10 ms, 0.02
    /// cycles over 20 s in one prediction (`tests/velocity_filter.rs`).
    ///
    /// # Cost
    /// Instructions, alpha-beta / alpha-beta-gamma / pass: about 380 / 380 / 530 on a Cortex-M4F, 2200 / 3000 /
    /// 10 400 on a Cortex-M0.
    pub fn predict(&self, settings: &VelocitySettings, at: GpsTime) -> Option<Motion> {
        let from = &self.steered;
        if !self.serves(settings, at) {
            return None;
        }
        let advance = from.advance(&settings.dynamics, seconds(from.time, at));
        let growth = rapidity_from_speed(advance.speed);
        let gone = delay_of_level(from.level, growth, self.ahead, steps(from.time, at));
        let bent = delay_from_metres(advance.distance);
        Some(Motion {
            delay: Delay::from_bits(self.delay.wrapping_add(gone).wrapping_add(bent)),
            rapidity: Rapidity::from_bits(from.level.saturating_add(growth)),
            rate: RapidityRate::from_bits(rapidity_from_speed(advance.acceleration)),
        })
    }

    /// The stated uncertainty of the prediction at `at`; `None` where there is no prediction.
    ///
    /// # Accuracy
    /// At the end of a silence of 20 s anywhere in the published pass it covers the error in more than 95 %
    /// of the runs and is at most 3 times what 95 % of them keep within (`tests/velocity_filter.rs`).
    ///
    /// # Cost
    /// Instructions, alpha-beta / alpha-beta-gamma / pass: 300 / 340 / 780 on a Cortex-M4F, 3900 / 7900 /
    /// 30 000 on a Cortex-M0.
    pub fn uncertainty(&self, settings: &VelocitySettings, at: GpsTime) -> Option<Uncertainty> {
        if !self.serves(settings, at) {
            return None;
        }
        let (_, later) = self.covariance.advanced(settings, &self.track, at);
        Some(Uncertainty { metres_per_second: 2.0 * sqrtf(later.vv) })
    }

    /// Gains that the last used estimate had: level, rate times interval, third times interval squared.
    /// After a run of even intervals, the steady gains of the tracking index.
    pub fn gains(&self, settings: &VelocitySettings) -> [f32; 3] {
        if let Gains::Fixed { alpha, beta, gamma } = settings.gains {
            return [alpha, beta, gamma];
        }
        // Posterior covariance over the measurement's variance is the gain.
        let (p, t) = (&self.covariance, settings.interval);
        [p.vv / settings.variance, p.va / settings.variance * t, p.vx / settings.variance * t * t]
    }

    /// Whether there is a level to predict from, and `at` is neither before the last step nor after
    /// the longest coast.
    fn serves(&self, settings: &VelocitySettings, at: GpsTime) -> bool {
        self.known && at >= self.steered.time && steps(self.last_used, at) <= settings.longest_coast
    }

    fn check(&self, settings: &VelocitySettings, tick: &Tick) -> Result<(), FollowError> {
        if self.stepped {
            after(self.steered.time, tick.now, FollowError::TimeBackwards)?;
        }
        followed(tick.ahead)?;
        let Some(estimate) = tick.estimate else { return Ok(()) };
        followed(estimate.rapidity())?;
        let age = steps(estimate.time(), tick.now);
        if age < 0 {
            return Err(FollowError::FutureEstimate);
        }
        if age > settings.latency {
            return Err(FollowError::LateEstimate);
        }
        if self.measured {
            after(self.last_estimate, estimate.time(), FollowError::EstimateBackwards)?;
        }
        Ok(())
    }

    fn observe(&mut self, settings: &VelocitySettings, estimate: Estimate) -> Outcome {
        self.last_estimate = estimate.time();
        self.measured = true;
        let (track, covariance) = if self.known {
            self.covariance.advanced(settings, &self.track, estimate.time())
        } else {
            Track::start(settings, estimate.time(), Rapidity::ZERO)
        };
        let residual = estimate.residual(Rapidity::from_bits(track.level));
        let sum = covariance.vv + settings.variance;
        let inside = self.known && residual * residual <= settings.gate_squared * sum;
        self.candidates.push(Candidate::new(estimate, residual));
        if inside && covariance.vv <= settings.unsure {
            self.take(settings, track, covariance, residual);
            self.candidates.settle_newest();
            return Outcome::Used;
        }
        let along = Agreement::predicted(settings, &covariance);
        if inside && self.candidates.confirms(settings, &along) {
            return self.replay(settings, along, true);
        }
        match self.candidates.line(settings) {
            Some(line) => self.replay(settings, line, false),
            None => Outcome::Waiting,
        }
    }

    /// Uses an estimate that is `residual` from a prediction.
    fn take(&mut self, settings: &VelocitySettings, track: Track, covariance: Covariance, residual: f32) {
        let (gain, covariance) = match settings.gains {
            Gains::TrackingIndex(_) => {
                let inverse = 1.0 / (covariance.vv + settings.variance);
                let gain = [covariance.vv * inverse, covariance.va * inverse, covariance.vx * inverse];
                (gain, covariance.updated(gain, settings.variance))
            }
            Gains::Fixed { alpha, beta, gamma } => {
                let passed = seconds(self.last_used, track.time);
                let rate = 1.0 / if passed > settings.interval { passed } else { settings.interval };
                let gain = [alpha, beta * rate, gamma * rate * rate];
                (gain, covariance.updated_by_any(gain, settings.variance))
            }
        };
        self.track = track.corrected(&settings.dynamics, gain.map(|part| part * residual));
        self.covariance = covariance;
        self.last_used = track.time;
        self.known = true;
    }

    /// Uses all that wait and agree, in their order; from a new start unless they are inside the gate.
    fn replay(&mut self, settings: &VelocitySettings, agreement: Agreement, inside: bool) -> Outcome {
        let mut fresh = !inside;
        for candidate in self.candidates.waiting(settings.confirm_of, agreement) {
            if fresh {
                fresh = false;
                (self.track, self.covariance) = Track::start(settings, candidate.time, candidate.level);
                self.last_used = candidate.time;
                continue;
            }
            let (track, covariance) = self.covariance.advanced(settings, &self.track, candidate.time);
            let residual = candidate.estimate().residual(Rapidity::from_bits(track.level));
            self.take(settings, track, covariance, residual);
        }
        self.candidates.settle(settings.confirm_of, agreement);
        if inside { Outcome::Confirmed } else { Outcome::Restarted }
    }

    /// While nothing comes, moves on in steps of an interval, but never past an estimate that waits
    /// or may still come.
    fn coast(&mut self, settings: &VelocitySettings, now: GpsTime) {
        let due = GpsTime::from_bits(now.to_bits().saturating_sub(settings.latency));
        // Estimates that have waited four times as long as N take cannot be confirmed any more.
        let span = settings.interval * f32::from(settings.confirm_of) * 4.0;
        self.candidates
            .forget_before(GpsTime::from_bits(due.to_bits().saturating_sub(settings::time_steps(span))));
        let to = self.candidates.oldest_waiting(due);
        if self.known && seconds(self.track.time, to) >= settings.interval {
            (self.track, self.covariance) = self.covariance.advanced(settings, &self.track, to);
        }
    }
}

/// Refuses a rapidity beyond the format that the delay is worked out in.
fn followed(rapidity: Rapidity) -> Result<(), FollowError> {
    if rapidity.to_bits().unsigned_abs() >> WIDEST != 0 { Err(FollowError::BeyondFormat) } else { Ok(()) }
}

/// Refuses a time that is not after an earlier one, or further from it than the format.
fn after(earlier: GpsTime, later: GpsTime, backwards: FollowError) -> Result<(), FollowError> {
    match steps(earlier, later) {
        0 => Err(FollowError::ZeroInterval),
        passed if passed < 0 => Err(backwards),
        passed if passed >> 61 != 0 => Err(FollowError::BeyondFormat),
        _ => Ok(()),
    }
}
