//! The RF plan as constants, and the step that a rapidity asks for.

use fixed::types::I16F16;

use super::gain::Gain;
use super::plan::{Folded, scaled};
use super::ramp::RampUnits;
use super::{Injection, Permission, RfPlan, TuningError};
use crate::frequency::{ClockRatio, Frequency, PhaseStep, divide_nearest};
use crate::pass::PassTable;
use crate::rapidity::narrow::{first_order_range_rate, offset_of_rapidity};
use crate::rapidity::wide_product::shifted_right;
use crate::rapidity::{Delay, Motion, Rapidity};

/// log2 of the steepest rapidity rate that is followed, per second: 7.6e-6/s, twenty times that of an orbit at 550 km.
const STEEPEST: i32 = -17;

/// A channel that is steered every so many clocks: receiving (`RADIATES` false) or transmitting (true).
///
/// Immutable and `Copy`: one serves several oscillators. When a crystal offset changes, build it again
/// (set-up cost) with as many clocks an interval and go on with the same [`Sweep`](super::Sweep) or
/// [`Hold`](super::Hold): the phase stays continuous.
///
/// A channel does not know its table: when one is put in use, let [`Self::suits`] look at it.
///
/// An interval lasts as long as its clocks really take: with the clock's crystal fast by Kc,
/// `clocks / (clock exp(Kc))` seconds. Ask the table for the motion at those instants; below 0.1 ms by
/// [`PassTable::at_fine`](crate::pass::PassTable::at_fine).
#[derive(Clone, Copy, Debug)]
pub struct Channel<const RADIATES: bool> {
    /// W0 in 2^-64 cycle per clock.
    nominal: u64,
    /// s Wf for a narrow offset.
    by_offset: Gain,
    /// -s Wf/c for a range rate.
    by_range_rate: Gain,
    /// -s f0 / clocks (transmitting: +) for a difference of truncated delays.
    by_delay: Gain,
    /// Bits of a delay that are dropped before the difference.
    pub(super) delay_shift: u8,
    pub(super) ramp: RampUnits,
    /// Lowest and highest step from W0 that may be radiated; unused by a receiver.
    fence: (i64, i64),
    /// Nominal clock in hertz, for what a refusal says.
    clock_hertz: u64,
}

/// What an interval asks for.
pub(super) struct Asked {
    /// The mean step.
    pub(super) mean: u64,
    /// What the model's own step at the end is above it.
    pub(super) above: i64,
    /// Truncated delay at the end: the next interval's start.
    pub(super) delay: i32,
}

impl Channel<false> {
    /// A receiving channel, steered every `clocks` clocks (under a minute).
    ///
    /// # Errors
    /// See [`TuningError`].
    pub fn receive(plan: &RfPlan<'_>, clocks: u32) -> Result<Self, TuningError> {
        Self::new(plan, &plan.fold()?, clocks, 64)
    }
}

impl Channel<true> {
    /// A transmitting channel: the far end hears the carrier. Every step is held against the permission's band.
    ///
    /// A licence and the local rules come first; see [`Permission`].
    ///
    /// # Errors
    /// See [`TuningError`]; [`TuningError::OutsideFence`] when the carrier itself is not permitted.
    pub fn transmit(plan: &RfPlan<'_>, clocks: u32, permission: &Permission) -> Result<Self, TuningError> {
        let folded = plan.fold()?;
        let mut channel = Self::new(plan, &folded, clocks, 64)?;
        channel.fence = channel.fence_of(plan, &folded, permission)?;
        Ok(channel)
    }

    /// The band as steps from W0.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: frequencies in 2^-80 Hz are below 2^121, edges below 2^63"
    )]
    fn fence_of(
        &self,
        plan: &RfPlan<'_>,
        folded: &Folded,
        permission: &Permission,
    ) -> Result<(i64, i64), TuningError> {
        let below = (i128::from(permission.lowest().to_bits()) << 56) - folded.true_carrier;
        let above = folded.true_carrier - (i128::from(permission.highest().to_bits()) << 56);
        let outside = below.max(above);
        if outside > 0 {
            let hertz = u32::try_from(outside >> 80).unwrap_or(u32::MAX).saturating_add(1);
            return Err(TuningError::OutsideFence { hertz });
        }
        let half_clock = i128::from(plan.clock.to_bits()) << 55;
        let edge = |frequency: Frequency| {
            // In hertz of the oscillator's own clock: a fast clock radiates further off for the same step.
            let away = scaled(frequency, plan.clock_crystal.to_bits().saturating_neg())? - folded.carrier;
            if away.abs() >= half_clock {
                return Err(TuningError::FenceNotUsable);
            }
            // Within half a clock: below 2^63 of the word. Rounded inwards.
            let (whole, fraction) = divide_nearest(away.unsigned_abs(), plan.clock.to_bits());
            let size = ((whole << 8) as i64).saturating_add((fraction >> 56) as i64);
            Ok(if away < 0 { -size } else { size })
        };
        let (lowest, highest) = (edge(permission.lowest())?, edge(permission.highest())?);
        // High-side injection turns the band over.
        let mirrored = plan.injection == Injection::HighSide;
        Ok(if mirrored { (-highest, -lowest) } else { (lowest, highest) })
    }
}

impl<const RADIATES: bool> Channel<RADIATES> {
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: binary exponents, each within +-200; the shift is clamped to 30"
    )]
    fn new(plan: &RfPlan<'_>, folded: &Folded, clocks: u32, fraction_bits: i32) -> Result<Self, TuningError> {
        let clock = plan.clock.to_bits();
        let (seconds, rest) = divide_nearest(u128::from(clocks) << 24, clock);
        // The interval in 2^-64 s, and the power of two of a second that it is below.
        let interval = seconds << 64 | u128::from(rest);
        if clocks == 0 || seconds >= 60 || interval == 0 {
            return Err(TuningError::IntervalNotUsable);
        }
        let log_interval = 64 - interval.leading_zeros() as i32;
        let delay_shift = (log_interval + 13).clamp(0, 30);
        let by_delay = divide_nearest(folded.true_carrier as u128, u64::from(clocks));
        let by_offset = divide_nearest(folded.carrier as u128, clock);
        let log_gain = 128 - by_offset.0.leading_zeros() as i32 - 56;
        let per_metre = divide_nearest(folded.carrier as u128, 299_792_458).0;
        let by_range_rate = divide_nearest(per_metre, clock);
        let mirrored = plan.injection == Injection::HighSide;
        let delay_units = Delay::FRACTION_BITS as i32 - delay_shift;
        Ok(Self {
            nominal: nominal(folded, clock, fraction_bits)?,
            // The quotients are in 2^-56 cycle per clock, by the delay in 2^-80 Hz.
            by_offset: Gain::new(by_offset, fraction_bits - 44 - 56, mirrored),
            by_range_rate: Gain::new(by_range_rate, fraction_bits - 16 - 56, !mirrored),
            by_delay: Gain::new(by_delay, fraction_bits - delay_units - 80, mirrored == RADIATES),
            delay_shift: delay_shift as u8,
            ramp: RampUnits::new(clocks, fraction_bits + STEEPEST + log_gain + log_interval),
            fence: (0, 0),
            clock_hertz: clock >> 24,
        })
    }

    /// -1 for a transmitter, else 0.
    const TRANSMIT: i32 = -(RADIATES as i32);

    /// Checks that a table tells the motion of this channel's end. A receiver steers by the time at which the signal
    /// arrives (down and two-way tables of the ground, up tables of the spacecraft), a transmitter by the time at
    /// which it leaves. Ask once, when a table is put in use: a tick cannot tell, and the other end's motion is so
    /// alike (0.3 Hz off at 437 MHz for a low orbit, 5.5 Hz at 8.4 GHz) that nothing else shows.
    ///
    /// # Errors
    /// [`TuningError::OtherEnd`].
    ///
    /// ```
    /// use shiftkeel::frequency::Frequency;
    /// use shiftkeel::pass::PassTable;
    /// use shiftkeel::tuning::{Channel, RfPlan, TuningError};
    /// fn put_in_use(channel: &Channel<false>, words: &[u32]) -> Result<(), Box<dyn core::error::Error>> {
    ///     let table = PassTable::new(words)?;
    ///     channel.suits(&table)?;
    ///     Ok(())
    /// }
    /// # let carrier = Frequency::from_hertz(437_000_000).unwrap();
    /// # let channel = Channel::receive(&RfPlan::direct(carrier, carrier), 1).unwrap();
    /// assert!(put_in_use(&channel, &[]).is_err());
    /// ```
    pub fn suits(&self, table: &PassTable<'_>) -> Result<(), TuningError> {
        let received = table.direction().is_received_at(table.tagged_at());
        if received == RADIATES { Err(TuningError::OtherEnd) } else { Ok(()) }
    }

    /// The step W0 at no shift.
    pub fn nominal_step(&self) -> PhaseStep {
        PhaseStep::from_bits(self.nominal)
    }

    /// The step that a rapidity asks for: W0 + Wf expm1(L), with -L for a transmitter.
    ///
    /// # Accuracy
    /// 2^-44 of the carrier (0.025 mHz at 437 MHz), half of that for a rapidity that has 44 bits (a table's), and
    /// 2^-31 of the shift (`tests/channel.rs`).
    ///
    /// # Errors
    /// [`TuningError::TooFast`] beyond 2^-13 (less 2^-27) or saturated; [`TuningError::OutsideFence`] for a transmitter.
    #[inline]
    pub fn step(&self, rapidity: Rapidity) -> Result<PhaseStep, TuningError> {
        let narrow = narrowed(rapidity)?;
        let signed = (narrow ^ Self::TRANSMIT).wrapping_sub(Self::TRANSMIT);
        let offset = self.by_offset.times_coarse(offset_of_rapidity(signed));
        self.permitted(self.nominal.wrapping_add(offset))
    }

    /// The step for a range rate in m/s, positive = receding: the cheapest way from an estimate to the
    /// oscillator.
    ///
    /// # Accuracy
    /// 1.2 units of 2^-16 m/s (0.027 mHz at 437 MHz), 0.65 below 8 km/s, and 2^-31 of the shift
    /// (`tests/channel.rs`). Within 1.8 m/s of -32768 m/s the step stays.
    ///
    /// # Errors
    /// [`TuningError::OutsideFence`] for a transmitter; a receiver's step always exists.
    ///
    /// # Cost
    /// 32 instructions on a Cortex-M4F, 62 on a Cortex-M0 (`boards/emulated/costs.txt`).
    #[inline]
    pub fn step_for_range_rate(&self, range_rate: I16F16) -> Result<PhaseStep, TuningError> {
        let rate = (range_rate.to_bits() ^ Self::TRANSMIT).saturating_sub(Self::TRANSMIT);
        let offset = self.by_range_rate.times_coarse(first_order_range_rate(rate));
        self.permitted(self.nominal.wrapping_add(offset))
    }

    /// What a difference of delays in 2^-`guard` of [`Delay`]'s unit adds to the step of one interval, whole
    /// cycles per clock included; `None` where 128 bits do not hold the product. Set-up only.
    #[allow(clippy::arithmetic_side_effects, reason = "set-up: places below 64")]
    pub(super) fn steps_of_delay(&self, delay: i64, guard: u32) -> Option<i128> {
        // Below 1 Hz of clock the gain may have lost whole cycles.
        if self.clock_hertz == 0 {
            return None;
        }
        self.by_delay.times_wide(delay, guard + u32::from(self.delay_shift))
    }

    /// A delay without the bits that the channel does not use; differences of these never accumulate.
    #[inline]
    #[allow(
        clippy::cast_possible_truncation,
        reason = "cut on purpose: only wrapping differences of two are used"
    )]
    pub(super) fn truncated(&self, delay: Delay) -> i32 {
        shifted_right(delay.to_bits(), u32::from(self.delay_shift)) as i32
    }

    /// Largest error of an interval's mean step beyond the delays' own, in cycles per clock: W0 and two roundings
    /// down. For a proof; set-up only.
    pub fn mean_resolution(&self) -> f64 {
        libm::ldexp(2.5, -64)
    }

    /// What dropping bits of the delay can add to a difference, in seconds. For a proof; set-up only.
    #[allow(clippy::arithmetic_side_effects, reason = "set-up: two numbers below 64")]
    pub fn delay_resolution(&self) -> f64 {
        libm::ldexp(1.0, i32::from(self.delay_shift) - Delay::FRACTION_BITS as i32)
    }

    /// What rounding the ramp can add to the step within an interval, in cycles per clock, when the step changes
    /// by `change` cycles per clock.
    pub(super) fn ramp_resolution(&self, change: f64) -> f64 {
        libm::ldexp(f64::from(self.ramp.clocks), 1 - 64) + libm::ldexp(change, -29)
    }

    /// The mean step over an interval between two truncated delays: exact in phase.
    #[inline]
    pub(super) fn mean(&self, before: i32, after: i32) -> u64 {
        // A receiver's phase is that of time minus delay, a transmitter's that of time plus delay: the gain knows.
        self.nominal.wrapping_add(self.by_delay.times(after.wrapping_sub(before)))
    }

    /// What the coming interval asks for, given the truncated delay at its start and the motion at its end.
    #[inline]
    pub(super) fn asked(&self, before: i32, next: &Motion) -> Result<Asked, TuningError> {
        let own = self.step(next.rapidity)?.to_bits();
        let delay = self.truncated(next.delay);
        let mean = self.mean(before, delay);
        let above = own.wrapping_sub(mean);
        if self.ramp.follows(above.wrapping_neg()) {
            Ok(Asked { mean, above: above as i64, delay })
        } else {
            Err(TuningError::TooFast)
        }
    }

    /// The step again when a transmitter may radiate it (a receiver always may).
    #[inline]
    pub(super) fn permitted(&self, step: u64) -> Result<PhaseStep, TuningError> {
        if RADIATES {
            let (lowest, highest) = self.fence;
            let away = step.wrapping_sub(self.nominal) as i64;
            if away < lowest || away > highest {
                return Err(self.refusal(away));
            }
        }
        Ok(PhaseStep::from_bits(step))
    }

    #[cold]
    #[allow(
        clippy::arithmetic_side_effects,
        reason = "2^32 times a word, and 2^32 times the clock's upper 8 bits"
    )]
    fn refusal(&self, away: i64) -> TuningError {
        let (lowest, highest) = self.fence;
        let beyond = if away < lowest { lowest.abs_diff(away) } else { away.abs_diff(highest) };
        // Rounded up; a clock has up to 40 bits, so its two halves are multiplied apart.
        let beyond = (beyond >> 32) + 1;
        let low = (beyond * (self.clock_hertz & 0xFFFF_FFFF)) >> 32;
        let hertz = low + beyond * (self.clock_hertz >> 32);
        TuningError::OutsideFence { hertz: u32::try_from(hertz).unwrap_or(u32::MAX).saturating_add(1) }
    }
}

/// Bound on the upper word of a rapidity: 2^-13 less 2^-27, so that the offset, larger by its square, still fits.
const FASTEST: i32 = 32_766;

/// To 44 fraction bits, rounded to the nearest.
#[inline]
#[allow(clippy::cast_possible_truncation, reason = "the upper word was tested: 32 bits are left")]
pub(super) fn narrowed(rapidity: Rapidity) -> Result<i32, TuningError> {
    let above = (rapidity.to_bits() >> 32) as i32;
    if above.wrapping_add(FASTEST) as u32 >= (FASTEST as u32) << 1 {
        return Err(TuningError::TooFast);
    }
    Ok((rapidity.to_bits().wrapping_add(1 << 15) >> 16) as i32)
}

/// W0, modulo one cycle for a phase step, range-checked for a ratio.
#[allow(
    clippy::arithmetic_side_effects,
    clippy::cast_possible_truncation,
    reason = "set-up: a quotient of at most 2^127, of which whole cycles are cut off on purpose"
)]
fn nominal(folded: &Folded, clock: u64, fraction_bits: i32) -> Result<u64, TuningError> {
    let (whole, fraction) = divide_nearest(folded.nominal.unsigned_abs(), clock);
    if fraction_bits == 48 {
        if folded.nominal < 0 {
            return Err(TuningError::NegativeOutput);
        }
        let ratio = (whole + 128) >> 8;
        return u64::try_from(ratio).map_err(|_| TuningError::RatioTooHigh);
    }
    let size = ((whole << 8) as u64).wrapping_add((fraction >> 56) + (fraction >> 55 & 1));
    Ok(if folded.nominal < 0 { size.wrapping_neg() } else { size })
}

/// The same for a synthesiser that multiplies its reference: the word is a [`ClockRatio`].
#[derive(Clone, Copy, Debug)]
pub struct RatioChannel(Channel<false>);

impl RatioChannel {
    /// A receiving channel.
    ///
    /// # Errors
    /// See [`TuningError`]; [`TuningError::NegativeOutput`] and [`TuningError::RatioTooHigh`].
    pub fn receive(plan: &RfPlan<'_>, clocks: u32) -> Result<Self, TuningError> {
        let folded = plan.fold()?;
        // A shift of 2^-13 of the carrier must not wrap the ratio's 64 bits.
        if folded.carrier >> 84 >= i128::from(plan.clock.to_bits()) {
            return Err(TuningError::RatioTooHigh);
        }
        Channel::new(plan, &folded, clocks, 48).map(Self)
    }

    /// Checks a table as [`Channel::suits`].
    ///
    /// # Errors
    /// [`TuningError::OtherEnd`].
    pub fn suits(&self, table: &PassTable<'_>) -> Result<(), TuningError> {
        self.0.suits(table)
    }

    /// The ratio that a rapidity asks for.
    ///
    /// # Accuracy
    /// As [`Channel::step`], and 2.5 units of 2^-48 (W0 and two roundings down) (`tests/channel.rs`).
    ///
    /// # Errors
    /// [`TuningError::TooFast`]; [`TuningError::NegativeOutput`] and [`TuningError::RatioTooHigh`] when the shift
    /// takes the output there.
    pub fn ratio(&self, rapidity: Rapidity) -> Result<ClockRatio, TuningError> {
        self.in_format(self.0.step(rapidity)?.to_bits())
    }

    /// The mean ratio over an interval between two delays: exact in phase.
    ///
    /// # Errors
    /// As [`Self::ratio`].
    pub fn mean_ratio(&self, before: Delay, after: Delay) -> Result<ClockRatio, TuningError> {
        self.in_format(self.0.mean(self.0.truncated(before), self.0.truncated(after)))
    }

    /// The ratio, unless its distance from the nominal one has carried it round an end of the format.
    fn in_format(&self, ratio: u64) -> Result<ClockRatio, TuningError> {
        let away = ratio.wrapping_sub(self.0.nominal) as i64;
        match self.0.nominal.checked_add_signed(away) {
            Some(ratio) => Ok(ClockRatio::from_bits(ratio)),
            None if away < 0 => Err(TuningError::NegativeOutput),
            None => Err(TuningError::RatioTooHigh),
        }
    }
}
