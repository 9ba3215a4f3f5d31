//! The 64-bit phase accumulator with a ramp.

use num_complex::Complex;

use super::{cosine_sine_fine, cosine_sine_quick_i16};
use crate::frequency::{PhaseRamp, PhaseStep};

/// A numerically controlled oscillator: phase in 2^-64 cycle, a step per clock, and a ramp of the step.
///
/// At every clock the output is that of the current phase; then the step is added to the phase, and the ramp
/// to the step, all modulo one cycle. So `n` clocks after a retune the phase is exactly
/// `phase + n * first_step + ramp * n (n - 1) / 2` and the step is `first_step + n * ramp`.
///
/// ```
/// use shiftkeel::frequency::{PhaseRamp, PhaseStep};
/// use shiftkeel::nco::Nco;
///
/// let mut oscillator = Nco::at_phase(0);
/// // A quarter of a cycle per clock.
/// oscillator.retune(PhaseStep::from_bits(1 << 62), PhaseRamp::ZERO);
/// assert_eq!(oscillator.next_i16().re, 32767);
/// assert_eq!(oscillator.next_i16().im, 32767);
/// assert_eq!(oscillator.phase(), 1 << 63);
///
/// // A retune leaves the phase alone: the signal is continuous.
/// oscillator.retune(PhaseStep::from_bits(5), PhaseRamp::from_bits(-2));
/// oscillator.advance(1000);
/// assert_eq!(oscillator.phase(), (1u64 << 63).wrapping_add(5 * 1000).wrapping_sub(1000 * 999));
/// assert_eq!(oscillator.step(), PhaseStep::from_bits(5u64.wrapping_sub(2000)));
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Nco {
    phase: u64,
    step: u64,
    ramp: u64,
}

impl Nco {
    /// An oscillator that stands still at `phase`, in 2^-64 cycle.
    pub const fn at_phase(phase: u64) -> Self {
        Self { phase, step: 0, ramp: 0 }
    }

    /// Sets the step of the next clock, and how much each later step exceeds the one before. The phase is
    /// untouched, so the output is continuous.
    pub const fn retune(&mut self, first_step: PhaseStep, ramp_per_clock: PhaseRamp) {
        self.step = first_step.to_bits();
        self.ramp = ramp_per_clock.to_bits() as u64;
    }

    /// The phase of the next output, in 2^-64 cycle.
    pub const fn phase(&self) -> u64 {
        self.phase
    }

    /// The upper half of the phase, in 2^-32 cycle: what the outputs are made from.
    pub const fn phase_u32(&self) -> u32 {
        (self.phase >> 32) as u32
    }

    /// The step that the next clock adds.
    pub const fn step(&self) -> PhaseStep {
        PhaseStep::from_bits(self.step)
    }

    /// What every clock adds to the step.
    pub const fn ramp(&self) -> PhaseRamp {
        PhaseRamp::from_bits(self.ramp as i64)
    }

    /// Shifts the phase by `cycles` in 2^-64 cycle (two's complement for a shift backwards).
    pub const fn shift_phase(&mut self, cycles: u64) {
        self.phase = self.phase.wrapping_add(cycles);
    }

    /// Moves on by `clocks` at once: exactly where as many single clocks end.
    ///
    /// # Cost
    /// Three 64-bit products; independent of `clocks`.
    #[inline]
    pub const fn advance(&mut self, clocks: u64) {
        // n (n - 1) / 2 modulo 2^64: the even one of the two factors is halved before the product wraps.
        let odd = clocks & 1;
        let half = clocks >> 1;
        let pairs = half.wrapping_mul(clocks.wrapping_sub(1).wrapping_add(odd));
        self.phase = self
            .phase
            .wrapping_add(clocks.wrapping_mul(self.step))
            .wrapping_add(pairs.wrapping_mul(self.ramp));
        self.step = self.step.wrapping_add(clocks.wrapping_mul(self.ramp));
    }

    /// One clock.
    #[inline]
    pub const fn tick(&mut self) {
        self.phase = self.phase.wrapping_add(self.step);
        self.step = self.step.wrapping_add(self.ramp);
    }

    /// The output of this clock in 16 bits, cosine first, by [`cosine_sine_quick_i16`]; then one clock.
    #[inline]
    pub const fn next_i16(&mut self) -> Complex<i16> {
        let output = cosine_sine_quick_i16(self.phase_u32());
        self.tick();
        output
    }

    /// The output of this clock in 32 bits, cosine first, by [`cosine_sine_fine`]; then one clock.
    #[inline]
    pub const fn next_i32(&mut self) -> Complex<i32> {
        let output = cosine_sine_fine(self.phase_u32());
        self.tick();
        output
    }

    /// Fills a block with the outputs of as many clocks, as [`next_i16`](Self::next_i16) gives them.
    ///
    /// ```
    /// use num_complex::Complex;
    /// use shiftkeel::frequency::PhaseStep;
    /// use shiftkeel::nco::{Nco, PhaseRamp};
    ///
    /// let mut oscillator = Nco::at_phase(0);
    /// oscillator.retune(PhaseStep::from_bits(1 << 61), PhaseRamp::ZERO);
    /// let mut block = [Complex::new(0, 0); 3];
    /// oscillator.fill_i16(&mut block);
    /// assert_eq!(block, [Complex::new(32767, 0), Complex::new(23170, 23170), Complex::new(0, 32767)]);
    /// ```
    pub fn fill_i16(&mut self, block: &mut [Complex<i16>]) {
        let mut running = *self;
        for output in block {
            *output = running.next_i16();
        }
        *self = running;
    }

    /// Fills a block with the outputs of as many clocks, as [`next_i32`](Self::next_i32) gives them.
    pub fn fill_i32(&mut self, block: &mut [Complex<i32>]) {
        let mut running = *self;
        for output in block {
            *output = running.next_i32();
        }
        *self = running;
    }
}
