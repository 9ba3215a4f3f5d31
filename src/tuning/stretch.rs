//! Steering ahead of time: a stretch of ticks laid out by the main loop, run by the interrupt with additions.
//!
//! Over a second or two the delay is a quartic to well below a millihertz. [`Stretch::lay`] asks the table at five
//! equally spaced ticks, both ends included, so that neighbouring stretches meet in delay and so in phase, and
//! turns the quartic through them into forward differences per tick, of the delay, the slope, the rate and the
//! steps. To go on by a tick is fourteen additions ([`Stretch::tick`]); then the sweep lands as in [`Sweep`].

use core::sync::atomic::{Ordering, compiler_fence};

use super::{Channel, Sweep, Swept, TuningError};
use crate::frequency::divide_nearest;
use crate::pass::{PassTable, TableError};
use crate::rapidity::narrow::rapidity_of_slope;
use crate::rapidity::{Delay, Motion, Rapidity, RapidityRate};
use crate::time::GpsTime;

/// Places between the delay's unit in a stretch, 2^-74 s, and [`Delay`]'s.
const GUARD: u32 = 18;
/// Places between the coefficients while a stretch is laid, 2^-123 s, and the delay's unit.
const COEFFICIENT_GUARD: u32 = 49;

/// How long the ticks of a stretch are, and how many it has.
///
/// Settings, made once; see [`Stretch`]. As many ticks as last one to two seconds is right for a low orbit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Stride {
    /// 2^-58 s.
    interval: u64,
    /// 1 / interval is `inverse` 2^(`scale` - 37) per second, `inverse` above 2^31.
    inverse: u32,
    scale: u8,
    log_ticks: u8,
}

/// Why a stretch was not laid.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum StretchError {
    /// Ticks below 2^-30 s or of a minute and more; not 4, 8, ... or 256 of them; or a stretch whose ends are not as far
    /// apart as its ticks take.
    StrideNotUsable,
    /// The table does not reach over the whole stretch.
    Table(TableError),
    /// The table's time is read at the other end of the link than this channel's.
    OtherEnd,
    /// The motion may be beyond 2^-13 (36 km/s) or 2^-17 per second within the stretch, or changes the delay by 0.49 ms.
    TooFast,
}

impl core::fmt::Display for StretchError {
    fn fmt(&self, formatter: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        formatter.write_str(match self {
            Self::StrideNotUsable => {
                "a stretch has 4, 8, ... or 256 ticks of 2^-30 s to a minute, and ends that far apart: check the instants"
            }
            Self::Table(error) => return error.fmt(formatter),
            Self::OtherEnd => {
                "table of the other end's time: receive needs the receiver's, transmit the transmitter's"
            }
            Self::TooFast => {
                "motion beyond 2^-13 (36 km/s), 2^-17 per second or 0.49 ms over the stretch: lay fewer ticks, or check the table"
            }
        })
    }
}

impl core::error::Error for StretchError {}

impl From<TableError> for StretchError {
    fn from(error: TableError) -> Self {
        Self::Table(error)
    }
}

impl Stride {
    /// 2^`log_ticks` (2 to 8) ticks of `interval`: what a channel's clocks really take, in 2^-58 s, rounded to the
    /// nearest.
    ///
    /// # Errors
    /// [`StretchError::StrideNotUsable`].
    ///
    /// # Cost
    /// One long division: set-up only.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "shifts below 64; the quotient is below 2^32"
    )]
    pub const fn new(interval: u64, log_ticks: u8) -> Result<Self, StretchError> {
        let scale = interval.leading_zeros();
        if scale > 35 || interval >= 60 << 58 || log_ticks < 2 || log_ticks > 8 {
            return Err(StretchError::StrideNotUsable);
        }
        let (inverse, _) = divide_nearest((1 << 95) - 1, interval << scale);
        Ok(Self { interval, inverse: inverse as u32, scale: scale as u8, log_ticks })
    }

    /// Something per tick, in 2^-123, as something per second in 2^-76.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: shifts within 128"
    )]
    const fn per_second(&self, per_tick: i128) -> i128 {
        (per_tick >> (52 - self.scale as u32)).wrapping_mul(self.inverse as i128) >> 32
    }

    /// Something per tick squared, in 2^-123, as something per second squared in 2^-60.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: shifts within 128"
    )]
    const fn per_second_squared(&self, per_tick: i128) -> i128 {
        let twice = 2 * self.scale as i32 - 73;
        let scaled = if twice < 0 { per_tick >> -twice } else { per_tick << twice };
        (scaled.wrapping_mul(self.inverse as i128) >> 32).wrapping_mul(self.inverse as i128) >> 32
    }

    /// Ticks of a stretch.
    pub const fn ticks(&self) -> u32 {
        1 << self.log_ticks
    }

    /// Five instants from the first to the last, in 2^-62 s; `None` when they are not the ticks of a stretch, within
    /// 2^-29 s, apart.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: instants are below 2^95"
    )]
    fn instants(&self, from: (GpsTime, u32), to: (GpsTime, u32)) -> Option<[i128; 5]> {
        let fine = |(time, rest): (GpsTime, u32)| i128::from(time.to_bits()) << 32 | i128::from(rest);
        let (from, to) = (fine(from), fine(to));
        let span = i128::from(self.interval) << (self.log_ticks + 4);
        let quarter = |quarters: i128| from + (((to - from) * quarters) >> 2);
        ((to - from - span).abs() >> 33 == 0).then(|| [from, quarter(1), quarter(2), quarter(3), to])
    }
}

/// A stretch of ticks, ready to be run, and how far it has run: 168 bytes.
///
/// The main loop lays the next one while the interrupt runs one, and hands it over by [`Self::go_on`] when no tick is
/// left. The tick's instructions are the same whatever the data: no look-up, no division, no loop.
///
/// Laid for one channel: after a crystal's change lay again. The table's time must be that of the channel's own end,
/// the receiver's or the transmitter's.
///
/// # Accuracy
/// Frequency and phase within [`Proven::of_stretch`](super::Proven::of_stretch); where stretches meet, the phase is the
/// table's, less the sweep's remainder (`tests/stretch.rs`).
///
/// # Cost
/// A tick with its oscillator's retune 184 instructions on a Cortex-M4F, 377 on a Cortex-M0; laying, 5,100 and 21,300
/// (`boards/emulated/costs.txt`).
///
/// ```
/// use shiftkeel::frequency::Frequency;
/// use shiftkeel::nco::Nco;
/// # use shiftkeel::pass::bake::{BakeSettings, bake};
/// # use shiftkeel::pass::{Direction, TaggedAt};
/// use shiftkeel::time::GpsTime;
/// use shiftkeel::tuning::{Channel, RfPlan, Stretch, Stride, Sweep, TuningError};
/// # let mut words = [0; 256];
/// # let settings = BakeSettings {
/// #     start: GpsTime::from_bits(0), end: GpsTime::from_bits(8 << 30),
/// #     slope_tolerance: 1e-11, delay_tolerance: 1e-11, roughness: 0.0,
/// #     direction: Direction::Down, tagged_at: TaggedAt::Ground,
/// #     object: 0, element_epoch: GpsTime::from_bits(0), site: [0; 3], arc_digest: 0,
/// # };
/// // 3 ms of delay, growing by 1e-5, and that by 3e-7 per second.
/// # let table = bake(&mut words, &settings, |s| 3e-3 + s * (1e-5 + 1.5e-7 * s), None)?;
/// let hertz = |hertz| Frequency::from_hertz(hertz).unwrap();
/// let channel = Channel::receive(&RfPlan::direct(hertz(437_000_000), hertz(48_000)), 480)?;
/// let stride = Stride::new((1 << 58) / 100, 6)?; // 64 ticks of 10 ms
/// let tick = |number: i64| {
///     let fine = (i128::from(number) << 62) / 100;
///     (GpsTime::from_bits((fine >> 32) as i64), fine as u32)
/// };
/// let lay = |from| Stretch::lay(&table, &channel, &stride, [tick(from), tick(from + 64)]);
/// let mut stretch = lay(0)?;
/// let mut sweep = Sweep::begin(&channel, &stretch.motion())?;
/// let mut oscillator = Nco::at_phase(0);
/// for number in 1..=704 {
///     let (_motion, swept) = stretch.tick(&mut sweep, &channel)?; // in the interrupt
///     oscillator.retune(swept.first, swept.ramp);
///     oscillator.advance(480);
///     if stretch.left() == 0 && number < 704 {
///         stretch.go_on(&lay(number)?)?; // laid by the main loop
///     }
/// }
/// assert_eq!(stretch.tick(&mut sweep, &channel), Err(TuningError::UsedUp));
/// // 7.04 s at 437 MHz: the phase is behind by the delay's growth, 7.783424e-5 s.
/// let behind = channel.nominal_step().to_bits().wrapping_mul(704 * 480).wrapping_sub(oscillator.phase());
/// let cycles = 437e6 * (1e-5 * 7.04 + 1.5e-7 * 7.04 * 7.04);
/// let off = behind as f64 / 2f64.powi(64) - cycles;
/// assert!((off - off.round()).abs() < 0.01);
/// # Ok::<(), Box<dyn core::error::Error>>(())
/// ```
#[derive(Clone, Copy, Debug)]
pub struct Stretch<const RADIATES: bool> {
    /// Delay at the start.
    base: i64,
    /// Each with its differences per tick: delay from the base in 2^-74 s, slope in 2^-76, rate in 2^-60 per
    /// second, mean step of the next interval, and what the own step at its end is above the mean.
    delay: [i64; 5],
    slope: [i64; 4],
    rate: [i64; 3],
    mean: [i64; 4],
    above: [i64; 3],
    /// Ticks that are left.
    left: u32,
}

impl<const RADIATES: bool> Stretch<RADIATES> {
    /// Lays the stretch between two ticks: instants on the grid and the rest in 2^-62 s.
    ///
    /// The last tick of one is the first of the next, to the bit: then nothing accumulates.
    ///
    /// # Errors
    /// See [`StretchError`]. A table is never extrapolated: where the table ends within the stretch, go on with a shorter one, or with
    /// [`PassTable::at_fine`] and [`Sweep::step`] after [`Sweep::resume`].
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: an instant is cut into its two words"
    )]
    pub fn lay(
        table: &PassTable<'_>,
        channel: &Channel<RADIATES>,
        stride: &Stride,
        [from, to]: [(GpsTime, u32); 2],
    ) -> Result<Self, StretchError> {
        channel.suits(table).map_err(|_| StretchError::OtherEnd)?;
        let mut delays = [0; 5];
        let instants = stride.instants(from, to).ok_or(StretchError::StrideNotUsable)?;
        for (delay, instant) in delays.iter_mut().zip(instants) {
            let time = GpsTime::from_bits((instant >> 32) as i64);
            *delay = table.at_fine(time, instant as u32)?.delay.to_bits();
        }
        let [base, .., end] = delays;
        let quartic =
            quartic(&delays).and_then(|quartic| stride.by_ticks(quartic)).ok_or(StretchError::TooFast)?;
        Self::of(channel, stride, base, end.wrapping_sub(base), quartic).ok_or(StretchError::TooFast)
    }

    /// From the quartic by powers of ticks.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: `by_ticks` has bounded the sums; steps are modulo whole cycles"
    )]
    fn of(
        channel: &Channel<RADIATES>,
        stride: &Stride,
        base: i64,
        change: i64,
        [a, b, c, d]: [i128; 4],
    ) -> Option<Self> {
        let delay = |sum: i128| (((sum >> (COEFFICIENT_GUARD - 1)) + 1) >> 1) as i64;
        let slope = |sum: i128| stride.per_second(sum) as i64;
        let rate = |sum: i128| -stride.per_second_squared(sum) as i64;
        // Modulo a whole cycle per clock, as all steps.
        let step = |sum: i64| channel.steps_of_delay(sum, GUARD);
        let (second, third, fourth) = (delay(2 * b + 6 * c + 14 * d), delay(6 * c + 36 * d), delay(24 * d));
        let steps = [step(second)?, step(third)?, step(fourth)?];
        let first = stride.first(i128::from(change) << GUARD, [second, third, fourth].map(i128::from)) as i64;
        let first_step = stride.first(channel.steps_of_delay(change, 0)?, steps);
        let [second_step, third_step, fourth_step] = steps.map(|step| step as i64);
        // At a tick's end the own step is above the mean by b + c (3k - 1) + d (6k^2 - 4k + 1), k counting ticks.
        let above = [b + 2 * c + 3 * d, 3 * c + 14 * d, 12 * d].map(delay);
        let [value, rise, bend] = above;
        let above = [step(value)?, step(rise)?, step(bend)?];
        Some(Self {
            base,
            delay: [1 << (GUARD - 1), first, second, third, fourth],
            slope: [
                slope(a).wrapping_add(1 << 31),
                slope(2 * b + 3 * c + 4 * d),
                slope(6 * c + 24 * d),
                slope(24 * d),
            ],
            rate: [rate(2 * b), rate(6 * c + 12 * d), rate(24 * d)],
            mean: [
                channel.nominal_step().to_bits().wrapping_add(first_step as u64) as i64,
                second_step,
                third_step,
                fourth_step,
            ],
            above: above.map(|step| step as i64),
            left: stride.ticks(),
        })
    }

    /// Ticks that are left.
    pub const fn left(&self) -> u32 {
        self.left
    }

    /// Goes on with the next stretch, which must begin where this one has got to.
    ///
    /// # Errors
    /// [`TuningError::TooFast`] when the delays are 2^-43 s or more apart, because the next was laid for another
    /// instant or from another table: both are as before. [`Sweep::begin`] at the next one's [`Self::motion`].
    pub fn go_on(&mut self, next: &Self) -> Result<(), TuningError> {
        let apart = next.motion().delay.to_bits().wrapping_sub(self.motion().delay.to_bits());
        // 2^-43 s
        if apart.unsigned_abs() >> 13 != 0 {
            return Err(TuningError::TooFast);
        }
        *self = *next;
        Ok(())
    }

    /// The motion at the end of the last tick, or at the stretch's start.
    #[inline]
    pub fn motion(&self) -> Motion {
        let ([delay, ..], [slope, ..], [rate, ..]) = (self.delay, self.slope, self.rate);
        let sign = i32::from(RADIATES).wrapping_neg();
        let slope = (slope >> 32) as i32;
        let rapidity = rapidity_of_slope((slope ^ sign).wrapping_sub(sign));
        let rapidity = (rapidity ^ sign).wrapping_sub(sign);
        Motion {
            delay: Delay::from_bits((delay >> GUARD).wrapping_add(self.base)),
            rapidity: Rapidity::from_bits(i64::from(rapidity) << 16),
            rate: RapidityRate::from_bits(rate),
        }
    }

    /// On by a tick.
    ///
    /// The fences keep the compiler from loading all of the numbers at once, of which a core's registers hold half.
    #[inline]
    fn advance(&mut self) {
        let [value, first, second, third] = self.mean;
        self.mean =
            [value.wrapping_add(first), first.wrapping_add(second), second.wrapping_add(third), third];
        compiler_fence(Ordering::SeqCst);
        let [value, first, second] = self.above;
        self.above = [value.wrapping_add(first), first.wrapping_add(second), second];
        compiler_fence(Ordering::SeqCst);
        let [value, first, second, third, fourth] = self.delay;
        self.delay = [
            value.wrapping_add(first),
            first.wrapping_add(second),
            second.wrapping_add(third),
            third.wrapping_add(fourth),
            fourth,
        ];
        compiler_fence(Ordering::SeqCst);
        let [value, first, second, third] = self.slope;
        self.slope =
            [value.wrapping_add(first), first.wrapping_add(second), second.wrapping_add(third), third];
        compiler_fence(Ordering::SeqCst);
        let [value, first, second] = self.rate;
        self.rate = [value.wrapping_add(first), first.wrapping_add(second), second];
    }

    /// Steers the coming interval, and tells the motion at its end.
    ///
    /// # Errors
    /// [`TuningError::UsedUp`] when no tick is left: stretch and sweep are as before. Else as [`Sweep::step`]: the
    /// sweep is as before, the stretch has moved on with the time; [`Sweep::begin`] again at [`Self::motion`].
    /// In either case the oscillator shall keep [`Sweep::end`] without a ramp, and a transmitter shall stop.
    ///
    /// # Source
    /// Newton's forward differences: a polynomial's next value is the sum of value and first difference, and so on.
    #[inline(always)] // as a call, its results would go through memory twice
    pub fn tick(
        &mut self,
        sweep: &mut Sweep,
        channel: &Channel<RADIATES>,
    ) -> Result<(Motion, Swept), TuningError> {
        self.left = self.left.checked_sub(1).ok_or(TuningError::UsedUp)?;
        let ([mean, ..], [above, ..]) = (self.mean, self.above);
        let swept = sweep.land(channel, mean as u64, above);
        compiler_fence(Ordering::SeqCst);
        self.advance();
        Ok((self.motion(), swept?))
    }
}

impl Stride {
    /// From quarters to ticks; `None` when slope or rate may be beyond what is steered, or the delay changes by 2^-11 s
    /// (0.49 ms) or more, anywhere in the stretch.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: terms below 2^124, see `quartic`"
    )]
    fn by_ticks(&self, [a, b, c, d]: [i128; 4]) -> Option<[i128; 4]> {
        let quarter = u32::from(self.log_ticks - 2);
        // From the sizes of the terms.
        let slope = a.abs() + 8 * b.abs() + 48 * c.abs() + 256 * d.abs();
        let bend = 2 * (b.abs() + 12 * c.abs() + 96 * d.abs());
        let slow = slope >> 110 == 0
            && self.per_second(slope >> quarter) < 32_766 << 48
            && self.per_second_squared(bend >> (2 * quarter)) < 1 << 43;
        slow.then_some((a >> quarter, b >> (2 * quarter), c >> (3 * quarter), d >> (4 * quarter)).into())
    }

    /// The first difference that, with the others, makes `change` over the stretch, rounded down: neighbours meet.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: at most 2^28 times numbers below 2^96"
    )]
    fn first(&self, change: i128, [second, third, fourth]: [i128; 3]) -> i128 {
        let n = 1u32 << self.log_ticks;
        let pairs = i128::from(n * (n - 1) / 2);
        let triples = i128::from(n * (n - 1) / 2 * (n - 2) / 3);
        let fours = i128::from(n * (n - 1) / 2 * (n - 2) / 3 * (n - 3) / 4);
        (change - pairs * second - triples * third - fours * fourth) >> self.log_ticks
    }
}

/// The quartic through five delays, in quarters of the stretch from its start: orders 1 to 4 in 2^-123 s. `None` when
/// they are 8 ms (2^-7 s) or more apart.
#[allow(
    clippy::arithmetic_side_effects,
    clippy::cast_possible_truncation,
    reason = "set-up: sums below 2^57"
)]
fn quartic(delays: &[i64; 5]) -> Option<[i128; 4]> {
    let [start, ..] = *delays;
    let mut from_start = [0; 5];
    for (from_start, delay) in from_start.iter_mut().zip(delays) {
        let size = delay.wrapping_sub(start);
        if size.unsigned_abs() >> (Delay::FRACTION_BITS - 7) != 0 {
            return None;
        }
        *from_start = size;
    }
    let [_, one, two, three, four] = from_start;
    let second = two - 2 * one;
    let third = three - 3 * two + 3 * one;
    let fourth = four - 4 * three + 6 * two - 4 * one;
    // Newton's form by powers, 24 times; 2^64 / 3 is a third, the other eight are in the unit.
    let over_24 = |sum: i64| i128::from(sum) * 0x5555_5555_5555_5555;
    Some([
        over_24(24 * one - 12 * second + 8 * third - 6 * fourth),
        over_24(12 * second - 12 * third + 11 * fourth),
        over_24(4 * third - 6 * fourth),
        over_24(fourth),
    ])
}
