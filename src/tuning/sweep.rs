//! Steering an oscillator that ramps: phase-exact, ends meeting.
//!
//! Over an interval of n clocks the step runs linearly from s0, where the last interval ended, to s1. With m
//! the mean step that the delays ask for, e what earlier intervals left over (per clock) and w the model's own
//! step at the end,
//!
//! `s1 = m + e + (w - s0) / 2`
//!
//! is the mean of the end that lands exactly on the model's phase and the model's own end. The first alone
//! rings for ever, the second alone drifts; together they give s1 = w + 2 e' with an e' that depends on this
//! interval only: the phase at its end is off by half of what a straight line between the model's own ends
//! cannot follow of the model inside it, and an error is forgotten after two intervals.

use super::channel::Asked;
use super::{Channel, TuningError};
use crate::frequency::{PhaseRamp, PhaseStep};
use crate::rapidity::Motion;

/// State of a ramping oscillator's steering.
///
/// ```
/// use shiftkeel::frequency::Frequency;
/// use shiftkeel::nco::Nco;
/// use shiftkeel::rapidity::Motion;
/// use shiftkeel::tuning::{Channel, RfPlan, Sweep};
/// # fn motion_at(_: u32) -> Motion { Motion::default() }
/// let carrier = Frequency::from_hertz(437_000_000).unwrap();
/// let clock = Frequency::from_hertz(48_000).unwrap();
/// let channel = Channel::receive(&RfPlan::direct(carrier, clock), 480)?; // steered every 10 ms
/// let mut sweep = Sweep::begin(&channel, &motion_at(0))?;
/// let mut oscillator = Nco::at_phase(0);
/// for tick in 1..10 {
///     let swept = sweep.step(&channel, &motion_at(tick))?;
///     oscillator.retune(swept.first, swept.ramp);
///     oscillator.advance(480);
/// }
/// assert_eq!(oscillator.phase(), channel.nominal_step().to_bits().wrapping_mul(480 * 9));
/// # Ok::<(), shiftkeel::tuning::TuningError>(())
/// ```
#[derive(Clone, Copy, Debug)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Sweep {
    /// Step at the end of the last interval.
    end: u64,
    /// Mean step that was asked for and not yet given, in 2^-64 cycle per clock.
    remainder: i64,
    /// Delay at the end of the last interval, truncated by the channel.
    delay: i32,
}

/// What an interval's oscillator is given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Swept {
    /// Step of the first clock (half a clock's ramp on), for an accumulator that adds, then ramps.
    pub first: PhaseStep,
    /// Change of the step at every clock.
    pub ramp: PhaseRamp,
}

impl Swept {
    /// Step at the interval's start: where the last one ended.
    pub const fn start(&self) -> PhaseStep {
        PhaseStep::from_bits(self.first.to_bits().wrapping_sub((self.ramp.to_bits() >> 1) as u64))
    }

    /// Change of the step over an interval of `clocks`, in 2^-64 cycle per clock: for a device that sweeps by step
    /// and dwell.
    pub const fn change(&self, clocks: u32) -> i64 {
        self.ramp.to_bits().wrapping_mul(clocks as i64)
    }
}

impl Sweep {
    /// Starts (or starts again, after a gap, a refusal or another table) at the motion of the first interval's start.
    ///
    /// # Errors
    /// As [`Channel::step`].
    pub fn begin<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        motion: &Motion,
    ) -> Result<Self, TuningError> {
        let end = channel.step(motion.rapidity)?.to_bits();
        Ok(Self { end, remainder: 0, delay: channel.truncated(motion.delay) })
    }

    /// The step at which the last interval ended.
    pub fn end(&self) -> PhaseStep {
        PhaseStep::from_bits(self.end)
    }

    /// What the phase at the last interval's end lacks to the model's, per clock of the interval, in 2^-64 cycle.
    pub fn remainder(&self) -> i64 {
        self.remainder
    }

    /// Goes on by [`Self::step`] from the motion at which a [`Stretch`](super::Stretch) was left.
    pub fn resume<const RADIATES: bool>(&mut self, channel: &Channel<RADIATES>, motion: &Motion) {
        self.delay = channel.truncated(motion.delay);
    }

    /// Steers the coming interval, given the motion at its end.
    ///
    /// The motion is compared with that of the last call, one interval before: after a missed instant
    /// [`Self::begin`] again (the shift of two intervals in one, or of none, is refused as too
    /// fast). So is a step that changes by 3/8 of a cycle per clock or more in an interval (18 kHz at a clock of
    /// 48 kHz): steer more often.
    ///
    /// # Accuracy
    /// Frequency and phase within [`Proven::of_sweep`](super::Proven::of_sweep) (`tests/steering.rs`).
    ///
    /// # Errors
    /// [`TuningError::TooFast`], [`TuningError::OutsideFence`]: the state is as before; the oscillator shall keep
    /// [`Self::end`] without a ramp, and a transmitter shall stop radiating. [`Self::begin`] again at the next
    /// good motion.
    #[inline]
    pub fn step<const RADIATES: bool>(
        &mut self,
        channel: &Channel<RADIATES>,
        next: &Motion,
    ) -> Result<Swept, TuningError> {
        let Asked { mean, above, delay } = channel.asked(self.delay, next)?;
        let swept = self.land(channel, mean, above)?;
        self.delay = delay;
        Ok(swept)
    }

    /// The same, given the mean step, and what the model's own step at the end is above it.
    #[inline(always)]
    pub(super) fn land<const RADIATES: bool>(
        &mut self,
        channel: &Channel<RADIATES>,
        mean: u64,
        above: i64,
    ) -> Result<Swept, TuningError> {
        let start = self.end;
        let wanted = mean.wrapping_sub(start).wrapping_add(self.remainder as u64) as i64;
        // own - start = mean + above - start
        let half = wanted.wrapping_sub(self.remainder).wrapping_add(above) >> 1;
        let change = wanted.wrapping_add(half);
        let (ramp, made) = channel.ramp.ramp(change);
        let end = start.wrapping_add(made as u64);
        // Both ends: the start may come from before a change of the channel.
        channel.permitted(start)?;
        channel.permitted(end)?;
        self.end = end;
        self.remainder = wanted.wrapping_sub(made >> 1);
        Ok(Swept {
            first: PhaseStep::from_bits(start.wrapping_add((ramp >> 1) as u64)),
            ramp: PhaseRamp::from_bits(ramp),
        })
    }
}
