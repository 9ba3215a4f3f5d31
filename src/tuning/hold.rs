//! Steering an oscillator that keeps one word over an interval.
//!
//! The word is the mean over the coming interval, which is the word for its middle: half the worst error of
//! the word for its start, and none on average. What rounding to the device's bits leaves over is carried into
//! the next interval, so even a coarse device has the exact mean frequency and the exact phase.

use super::channel::Asked;
use super::{Channel, TuningError};
use crate::frequency::PhaseStep;
use crate::rapidity::Motion;

/// State of a holding oscillator's steering; `BITS` is the width of the device's word (1 to 63).
#[derive(Clone, Copy, Debug)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Hold<const BITS: u32> {
    word: u64,
    /// Step that was asked for and not given, in 2^-64 cycle per clock.
    remainder: i64,
    /// Delay at the end of the last interval, truncated by the channel.
    delay: i32,
    /// Change below which the word stays, in 2^-64 cycle per clock.
    deadband: u64,
}

/// What an interval's device is given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Held {
    /// The device's word.
    pub word: u64,
    /// The step that the word makes.
    pub step: PhaseStep,
    /// Whether the word differs from the last one: only then need the device be written.
    pub retuned: bool,
}

impl<const BITS: u32> Hold<BITS> {
    /// Starts (or starts again, after a gap, a refusal or another table) at the motion of the first interval's
    /// start. Write [`Self::word`] to the device: the first [`Self::step`] compares with it.
    ///
    /// `deadband`: distance of the word from the wanted mean step, in 2^-64 cycle per clock, below which it stays;
    /// 0 steers phase-exactly. With a deadband the frequency is bounded, the phase is not steered.
    ///
    /// # Errors
    /// As [`Channel::step`].
    pub fn begin<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        motion: &Motion,
        deadband: u64,
    ) -> Result<Self, TuningError> {
        let word = channel.step(motion.rapidity)?.to_word_nearest::<BITS>();
        Ok(Self { word, remainder: 0, delay: channel.truncated(motion.delay), deadband })
    }

    /// The word that the device should hold now.
    pub fn word(&self) -> u64 {
        self.word
    }

    /// The step that the device makes now.
    pub fn current(&self) -> PhaseStep {
        PhaseStep::from_word::<BITS>(self.word)
    }

    /// What the phase at the last interval's end lacks to the model's, per clock of the interval, in 2^-64 cycle;
    /// zero while a deadband or a quiet window keeps the word, when the phase is not steered.
    pub fn remainder(&self) -> i64 {
        self.remainder
    }

    /// Steers the coming interval, given the motion at its end. `quiet`: the device must not be retuned now (a
    /// packet is on the air); the word stays and the phase is taken up afresh afterwards.
    ///
    /// The motion is compared with that of the last call, one interval before: after a missed instant
    /// [`Self::begin`] again (the shift of two intervals in one, or of none, is refused as too
    /// fast). So is a step that changes by 3/8 of a cycle per clock or more in an interval (18 kHz at a clock of
    /// 48 kHz): steer more often.
    ///
    /// # Accuracy
    /// The frequency within [`Proven::of_hold`](super::Proven::of_hold); the phase at every interval's end, without
    /// deadband or quiet window, half a place of the word for one interval (`tests/steering.rs`).
    ///
    /// # Errors
    /// [`TuningError::TooFast`], [`TuningError::OutsideFence`]: the state is as before and the word stays; a
    /// transmitter shall stop radiating. [`Self::begin`] again at the next good motion.
    #[inline]
    pub fn step<const RADIATES: bool>(
        &mut self,
        channel: &Channel<RADIATES>,
        next: &Motion,
        quiet: bool,
    ) -> Result<Held, TuningError> {
        let Asked { mean, delay, .. } = channel.asked(self.delay, next)?;
        let away = mean.wrapping_sub(self.current().to_bits()) as i64;
        let stays = quiet | (away.unsigned_abs() < self.deadband);
        let wanted = PhaseStep::from_bits(mean.wrapping_add(self.remainder as u64));
        let word = if stays { self.word } else { wanted.to_word_nearest::<BITS>() };
        let step = channel.permitted(PhaseStep::from_word::<BITS>(word).to_bits())?;
        let steers_phase = !stays && self.deadband == 0;
        self.remainder = if steers_phase { wanted.residual::<BITS>(word) } else { 0 };
        self.delay = delay;
        let retuned = word != self.word;
        self.word = word;
        Ok(Held { word, step, retuned })
    }
}
