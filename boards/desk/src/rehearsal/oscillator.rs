//! The crate's channel, steering and oscillator behind one face, whichever way they are set up.

use crate::geometric::Direction;
use anyhow::{Context, ensure};
use shiftkeel::frequency::{Frequency, PhaseRamp, PhaseStep};
use shiftkeel::pass::PassTable;
use shiftkeel::rapidity::Motion;
use shiftkeel::tuning::{Bound, Channel, Hold, Permission, Proven, RfPlan, Steering, Sweep, TuningError};

/// The oscillator and how it is steered.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Oscillator {
    /// Clock, Hz.
    pub clock: Frequency,
    /// Clocks of one interval.
    pub clocks: u32,
    /// Bits of the word of a device that holds one word over an interval; none for an oscillator that ramps.
    pub bits: Option<u32>,
    /// Change below which a held word stays, Hz.
    pub deadband: f64,
    /// Every so many seconds, for so many seconds, no retuning.
    pub quiet: Option<(f64, f64)>,
}

impl Oscillator {
    /// From a clock and an interval in seconds.
    ///
    /// # Errors
    /// When the interval is no whole number of clocks, or the parts contradict one another.
    pub fn new(
        clock: f64,
        tick: f64,
        bits: Option<u32>,
        deadband: f64,
        quiet: Option<(f64, f64)>,
    ) -> anyhow::Result<Self> {
        ensure!(
            (1.0..=1e10).contains(&clock),
            "--clock {clock} is not an oscillator clock; give hertz from 1 to 1e10, such as 48000"
        );
        let clocks = (clock * tick).round();
        ensure!(
            (1.0..4e9).contains(&clocks) && tick < 60.0,
            "--tick {tick} is not usable: an interval lasts at least one clock and less than a minute"
        );
        ensure!(
            (clocks / clock - tick).abs() <= 1e-9 * tick,
            "--tick {tick} is {} clocks; an interval is a whole number of clocks, such as {} s",
            clock * tick,
            clocks / clock
        );
        ensure!(
            bits.is_none_or(|bits| (8..=63).contains(&bits)),
            "--bits runs from 8 to 63, the width of the device's word"
        );
        ensure!(
            deadband >= 0.0 && deadband < clock / 2.0,
            "--deadband {deadband} is not a change in hertz of 0 or more"
        );
        if let Some((every, length)) = quiet {
            ensure!(
                length >= 0.0 && every > length && every.is_finite(),
                "--quiet {every},{length}: a window comes every EVERY seconds and is shorter than that"
            );
        }
        ensure!(
            bits.is_some() || (deadband == 0.0 && quiet.is_none()),
            "--deadband and --quiet are for a device that holds its word; give its width with --bits"
        );
        let millihertz = (clock * 1e3).round() as u64;
        let clock =
            Frequency::from_millihertz_nearest(millihertz).context("the clock is beyond the format")?;
        Ok(Self { clock, clocks: clocks as u32, bits, deadband, quiet })
    }

    /// Clock in hertz.
    pub fn hertz(&self) -> f64 {
        self.clock.as_hertz_f64()
    }

    /// Length of an interval, s.
    pub fn interval(&self) -> f64 {
        f64::from(self.clocks) / self.hertz()
    }

    /// Whether the phase is steered, not only the frequency.
    pub fn steers_phase(&self) -> bool {
        self.deadband == 0.0 && self.quiet.is_none()
    }

    /// Whether the device must not be retuned in the interval that begins with this tick.
    pub fn is_quiet(&self, tick: u64) -> bool {
        self.quiet.is_some_and(|(every, length)| (tick as f64 * self.interval()).rem_euclid(every) < length)
    }
}

/// A channel that receives or transmits.
#[derive(Clone, Copy, Debug)]
pub enum Tuning {
    /// Receives.
    Receive(Channel<false>),
    /// Transmits, inside a fence round the carrier: nothing is radiated here.
    Transmit(Channel<true>),
}

impl Tuning {
    /// The channel of a carrier, crystals exact.
    ///
    /// # Errors
    /// The crate's own.
    pub fn new(
        carrier: Frequency,
        direction: Direction,
        oscillator: &Oscillator,
    ) -> Result<Self, TuningError> {
        let plan = RfPlan::direct(carrier, oscillator.clock);
        if direction == Direction::Up {
            // The fence of the rehearsal: 40 ppm to each side, less where the clock is slow.
            let reach = (carrier.to_bits() / 25_000).min(oscillator.clock.to_bits() / 100 * 49);
            let edge = |bits| Frequency::from_bits(bits);
            let permission =
                Permission::to_radiate(edge(carrier.to_bits() - reach), edge(carrier.to_bits() + reach))?;
            return Channel::transmit(&plan, oscillator.clocks, &permission).map(Self::Transmit);
        }
        Channel::receive(&plan, oscillator.clocks).map(Self::Receive)
    }

    /// Checks that the table tells the motion of this channel's end.
    ///
    /// # Errors
    /// [`TuningError::OtherEnd`].
    pub fn suits(&self, table: &PassTable<'_>) -> Result<(), TuningError> {
        match self {
            Self::Receive(channel) => channel.suits(table),
            Self::Transmit(channel) => channel.suits(table),
        }
    }

    /// The proven error, arc not included.
    pub fn proven(&self, table: &PassTable<'_>, carrier: f64, oscillator: &Oscillator) -> Proven {
        let steering =
            Steering { carrier, clock: oscillator.hertz(), clocks: oscillator.clocks, time_error: 0.0 };
        // A window that begins inside an interval keeps the whole interval quiet.
        let quiet = oscillator.quiet.map_or(0.0, |(_, length)| length + oscillator.interval());
        match (self, oscillator.bits) {
            (Self::Receive(channel), None) => Proven::of_sweep(channel, table, &steering),
            (Self::Transmit(channel), None) => Proven::of_sweep(channel, table, &steering),
            (Self::Receive(channel), Some(bits)) => {
                Proven::of_hold(channel, table, &steering, bits, oscillator.deadband, quiet)
            }
            (Self::Transmit(channel), Some(bits)) => {
                Proven::of_hold(channel, table, &steering, bits, oscillator.deadband, quiet)
            }
        }
    }
}

impl Tuning {
    /// What the channel's own rounding may do to the mean step of an interval, and to the phase with what is
    /// carried forward, whatever motion it is fed with.
    pub fn rounding(&self, carrier: f64, oscillator: &Oscillator) -> Bound {
        let (delay, places) = match self {
            Self::Receive(channel) => (channel.delay_resolution(), channel.mean_resolution()),
            Self::Transmit(channel) => (channel.delay_resolution(), channel.mean_resolution()),
        };
        let cycles = carrier * delay;
        Bound { hertz: cycles / oscillator.interval() + places * oscillator.hertz(), cycles }
    }
}

/// What an interval's oscillator is given, and what the crate wanted it to be.
#[derive(Clone, Copy, Debug)]
pub struct Interval {
    /// Step of the first clock.
    pub first: PhaseStep,
    /// Change at every clock.
    pub ramp: PhaseRamp,
    /// Mean step that the crate computed from the delays, in 2^-64 cycle per clock.
    pub mean: u64,
    /// Mean step that is made, in the same unit.
    pub made: u64,
    /// Whether a new word was needed.
    pub retuned: bool,
    /// What the phase lacks at the end, per clock, in 2^-64 cycle.
    pub remainder: i64,
}

/// The crate's steering in progress.
pub struct Run {
    tuning: Tuning,
    clocks: u32,
    state: State,
    remainder: i64,
}

enum State {
    Sweep(Sweep),
    Hold(Box<dyn Holding>),
}

impl Run {
    /// Begins at the motion of the first interval's start.
    ///
    /// # Errors
    /// The crate's own.
    pub fn begin(tuning: Tuning, oscillator: &Oscillator, motion: &Motion) -> Result<Self, TuningError> {
        let state = match (oscillator.bits, &tuning) {
            (None, Tuning::Receive(channel)) => State::Sweep(Sweep::begin(channel, motion)?),
            (None, Tuning::Transmit(channel)) => State::Sweep(Sweep::begin(channel, motion)?),
            (Some(bits), _) => {
                let deadband = (oscillator.deadband / oscillator.hertz() * 64f64.exp2()) as u64;
                State::Hold(holding(bits, &tuning, motion, deadband)?)
            }
        };
        Ok(Self { tuning, clocks: oscillator.clocks, state, remainder: 0 })
    }

    /// Steers the coming interval, given the motion at its end.
    ///
    /// # Errors
    /// The crate's own.
    pub fn step(&mut self, motion: &Motion, quiet: bool) -> Result<Interval, TuningError> {
        let before = self.remainder;
        let interval = match &mut self.state {
            State::Sweep(sweep) => {
                let swept = match &self.tuning {
                    Tuning::Receive(channel) => sweep.step(channel, motion)?,
                    Tuning::Transmit(channel) => sweep.step(channel, motion)?,
                };
                let change = swept.ramp.to_bits().wrapping_mul(i64::from(self.clocks));
                let made = swept.start().to_bits().wrapping_add((change >> 1) as u64);
                let (first, ramp) = (swept.first, swept.ramp);
                Interval { first, ramp, mean: 0, made, retuned: true, remainder: sweep.remainder() }
            }
            State::Hold(hold) => hold.step(&self.tuning, motion, quiet)?,
        };
        self.remainder = interval.remainder;
        // wanted = mean + what was left over; what is left over now = wanted - made.
        let wanted = interval.made.wrapping_add(interval.remainder as u64);
        Ok(Interval { mean: wanted.wrapping_sub(before as u64), ..interval })
    }
}

/// A device's steering, whatever the width of its word.
trait Holding {
    fn step(&mut self, tuning: &Tuning, motion: &Motion, quiet: bool) -> Result<Interval, TuningError>;
}

impl<const BITS: u32> Holding for Hold<BITS> {
    fn step(&mut self, tuning: &Tuning, motion: &Motion, quiet: bool) -> Result<Interval, TuningError> {
        let held = match tuning {
            Tuning::Receive(channel) => Self::step(self, channel, motion, quiet)?,
            Tuning::Transmit(channel) => Self::step(self, channel, motion, quiet)?,
        };
        Ok(Interval {
            first: held.step,
            ramp: PhaseRamp::ZERO,
            mean: 0,
            made: held.step.to_bits(),
            retuned: held.retuned,
            remainder: self.remainder(),
        })
    }
}

fn holding(
    bits: u32,
    tuning: &Tuning,
    motion: &Motion,
    deadband: u64,
) -> Result<Box<dyn Holding>, TuningError> {
    macro_rules! of_width {
        ($($width:literal)*) => {
            match bits {
                $($width => match tuning {
                    Tuning::Receive(channel) => Box::new(Hold::<$width>::begin(channel, motion, deadband)?) as Box<dyn Holding>,
                    Tuning::Transmit(channel) => Box::new(Hold::<$width>::begin(channel, motion, deadband)?),
                },)*
                _ => match tuning {
                    Tuning::Receive(channel) => Box::new(Hold::<63>::begin(channel, motion, deadband)?),
                    Tuning::Transmit(channel) => Box::new(Hold::<63>::begin(channel, motion, deadband)?),
                },
            }
        };
    }
    Ok(
        of_width!(8 9 10 11 12 13 14 15 16 17 18 19 20 21 22 23 24 25 26 27 28 29 30 31 32 33 34 35 36 37 38 39 40
        41 42 43 44 45 46 47 48 49 50 51 52 53 54 55 56 57 58 59 60 61 62),
    )
}

/// Exact phases of a carrier at a clock: integer and fraction apart, so that no digit is lost over a pass.
#[derive(Clone, Copy, Debug)]
pub struct Carrier {
    /// Hertz in 2^-24.
    bits: u64,
    /// Clock in 2^-24 Hz.
    clock: u64,
}

impl Carrier {
    /// A carrier into an oscillator at `clock`.
    pub const fn new(carrier: Frequency, clock: Frequency) -> Self {
        Self { bits: carrier.to_bits(), clock: clock.to_bits() }
    }

    /// Hertz.
    pub fn hertz(&self) -> f64 {
        Frequency::from_bits(self.bits).as_hertz_f64()
    }

    /// Cycles that the unshifted carrier has made after `clocks` clocks, modulo one.
    pub fn cycles(&self, clocks: u64) -> f64 {
        let rest = u128::from(clocks) * u128::from(self.bits) % u128::from(self.clock);
        rest as f64 / self.clock as f64
    }

    /// How far a step is from the unshifted carrier, Hz, modulo the clock (below half of it in size).
    pub fn shift_of(&self, step: u64) -> f64 {
        let rest = u128::from(self.bits % self.clock) << 64;
        let nominal = (rest / u128::from(self.clock)) as u64;
        step.wrapping_sub(nominal) as i64 as f64 * (-64f64).exp2() * self.clock_hertz()
    }

    /// A difference of frequencies brought to less than half a clock in size.
    pub fn folded(&self, hertz: f64) -> f64 {
        hertz - self.clock_hertz() * (hertz / self.clock_hertz()).round()
    }

    fn clock_hertz(&self) -> f64 {
        Frequency::from_bits(self.clock).as_hertz_f64()
    }

    /// Seconds that `clocks` clocks (may have a fraction) last.
    pub fn seconds(&self, clocks: f64) -> f64 {
        clocks / self.clock_hertz()
    }

    /// `clocks` clocks in 2^-30 s, and the rest in 2^-62 s; up to 2^41 clocks.
    pub fn grid(&self, clocks: u64) -> (i64, u32) {
        let elapsed = (u128::from(clocks) << 86) / u128::from(self.clock);
        ((elapsed >> 32) as i64, elapsed as u32)
    }

    /// Whole intervals of `clocks` clocks in a span of 2^-30 s.
    pub fn intervals(&self, span: i64, clocks: u32) -> u64 {
        let clocks_of_span = (span.max(0) as u128 * u128::from(self.clock)) >> 54;
        (clocks_of_span / u128::from(clocks)) as u64
    }
}
