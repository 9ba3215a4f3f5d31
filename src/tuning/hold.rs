//! Steering an oscillator that keeps one word over an interval.
//!
//! The word is the mean over the coming interval, which is the word for its middle: half the worst error of
//! the word for its start, and none on average. What rounding to the device's bits leaves over is carried into
//! the next interval, so even a coarse device has the exact mean frequency and the exact phase.

use super::{Channel, TuningError};
use crate::frequency::PhaseStep;
use crate::rapidity::Motion;

/// State of a holding oscillator's steering; `BITS` is the width of the device's word (1 to 63).
#[derive(Clone, Copy, Debug)]
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
pub struct Held {
    /// The device's word.
    pub word: u64,
    /// The step that the word makes.
    pub step: PhaseStep,
    /// Whether the word differs from the last one: only then need the device be written.
    pub retuned: bool,
}

impl<const BITS: u32> Hold<BITS> {
    /// Starts (or starts again, after a gap or another table) at the motion of the first interval's start.
    ///
    /// `deadband`: change in 2^-64 cycle per clock below which the word stays; 0 steers phase-exactly. With a
    /// deadband the frequency is bounded, the phase is not steered.
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

    /// The step that the device makes now.
    pub fn current(&self) -> PhaseStep {
        PhaseStep::from_word::<BITS>(self.word)
    }

    /// What the phase at the last interval's end lacks to the model's, per clock of the interval, in 2^-64 cycle.
    pub fn remainder(&self) -> i64 {
        self.remainder
    }

    /// Steers the coming interval, given the motion at its end. `quiet`: the device must not be retuned now (a
    /// packet is on the air); the word stays and the phase is taken up afresh afterwards.
    ///
    /// # Errors
    /// [`TuningError::TooFast`], [`TuningError::OutsideFence`]: the state is as before and the word stays; a
    /// transmitter shall stop radiating.
    #[inline]
    pub fn step<const RADIATES: bool>(
        &mut self,
        channel: &Channel<RADIATES>,
        next: &Motion,
        quiet: bool,
    ) -> Result<Held, TuningError> {
        if next.rapidity.is_saturated() {
            return Err(TuningError::TooFast);
        }
        let delay = channel.truncated(next.delay);
        let mean = channel.mean(self.delay, delay);
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
