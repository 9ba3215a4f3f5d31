//! How far off the oscillator may be: proven, assumed and excluded, three types that do not add up by accident.
//!
//! Everything here is set-up arithmetic in f64; nothing runs per tick.

use super::Channel;
use crate::pass::{MotionExtremes, PassTable};

/// A bound, or an estimate, in the two units that a radio cares for.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Bound {
    /// Of the frequency, in hertz.
    pub hertz: f64,
    /// Of the phase, in cycles; infinite where the phase is not steered.
    pub cycles: f64,
}

impl Bound {
    fn plus(self, other: Self) -> Self {
        Self { hertz: self.hertz + other.hertz, cycles: self.cycles + other.cycles }
    }
}

/// Parts of the proven error.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum ProvenPart {
    /// The arc's polynomials against the orbit.
    Arc,
    /// The table's polynomials against the arc seen from the site.
    Table,
    /// Instants rounded to the 2^-30 s grid, where the caller does not give the rest.
    TimeGrid,
    /// Fixed-point evaluation of table and channel.
    Arithmetic,
    /// Rounded constants.
    Constants,
    /// The device's word.
    Word,
    /// What a straight ramp does not follow.
    Ramp,
    /// What a held word does not follow: interval, deadband, quiet windows.
    Hold,
}

impl ProvenPart {
    /// All parts, in the order of a print.
    pub const ALL: [Self; 8] = [
        Self::Arc,
        Self::Table,
        Self::TimeGrid,
        Self::Arithmetic,
        Self::Constants,
        Self::Word,
        Self::Ramp,
        Self::Hold,
    ];

    /// Name in print.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Arc => "arc",
            Self::Table => "table",
            Self::TimeGrid => "time grid",
            Self::Arithmetic => "arithmetic",
            Self::Constants => "constants",
            Self::Word => "word",
            Self::Ramp => "ramp",
            Self::Hold => "hold",
        }
    }
}

/// How far the oscillator may be from what the model says, part by part. No instant may exceed the total.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Proven {
    parts: [Bound; ProvenPart::ALL.len()],
}

/// What the proof needs to know of a steering besides channel and table.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Steering {
    /// RF carrier in hertz.
    pub carrier: f64,
    /// Oscillator clock in hertz.
    pub clock: f64,
    /// Clocks per interval.
    pub clocks: u32,
    /// Largest error of the instants at which the table is asked, in seconds (2^-31 on the plain grid).
    pub time_error: f64,
}

impl Steering {
    fn interval(&self) -> f64 {
        f64::from(self.clocks) / self.clock
    }
}

impl Proven {
    /// One part.
    pub fn part(&self, part: ProvenPart) -> Bound {
        self.parts.get(part as usize).copied().unwrap_or_default()
    }

    /// The same with one part replaced.
    pub fn with(mut self, part: ProvenPart, bound: Bound) -> Self {
        if let Some(slot) = self.parts.get_mut(part as usize) {
            *slot = bound;
        }
        self
    }

    /// Sum of all parts: what no instant exceeds.
    pub fn total(&self) -> Bound {
        self.parts.iter().fold(Bound::default(), |sum, &part| sum.plus(part))
    }

    /// What table, arithmetic and constants contribute to any steering.
    fn of_table<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        table: &PassTable<'_>,
        steering: &Steering,
        extremes: &MotionExtremes,
    ) -> Self {
        let unit = libm::ldexp(1.0, -60);
        let carrier = steering.carrier;
        let interval = steering.interval();
        let table_part = Bound {
            hertz: carrier * f64::from(table.proven_slope()) * unit,
            cycles: carrier * f64::from(table.proven_delay()) * unit,
        };
        // Both ends of an interval are rounded, and the time at which the slope is taken.
        let delay_shift = extremes.slope * steering.time_error;
        let time_grid = Bound {
            hertz: carrier * (2.0 * delay_shift / interval + extremes.rate * steering.time_error),
            cycles: carrier * delay_shift,
        };
        let noise = Self::noise(channel, table);
        let arithmetic = Bound { hertz: carrier * noise / interval, cycles: carrier * noise };
        // W0 and the gain's places over the whole table, the gain itself to 2^-62 of the shift. The crystals'
        // exponentials (2^-60) belong to the crystals' own uncertainty.
        let span = table.end().seconds_since(table.start());
        let places = steering.clock * channel.mean_resolution();
        let gain = carrier * extremes.slope * libm::ldexp(1.0, -62);
        let constants = Bound { hertz: places + gain, cycles: (places + gain) * span };
        Self::default()
            .with(ProvenPart::Table, table_part)
            .with(ProvenPart::TimeGrid, time_grid)
            .with(ProvenPart::Arithmetic, arithmetic)
            .with(ProvenPart::Constants, constants)
    }

    /// What evaluation and the delay's dropped bits add to the difference of two delays, in seconds.
    fn noise<const RADIATES: bool>(channel: &Channel<RADIATES>, table: &PassTable<'_>) -> f64 {
        f64::from(table.evaluation_noise()) * libm::ldexp(1.0, -60) + channel.delay_resolution()
    }

    fn adding(self, part: ProvenPart, more: Bound) -> Self {
        self.with(part, self.part(part).plus(more))
    }

    /// What a straight ramp that lands by the sweep's rule does not follow.
    fn ramp<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        steering: &Steering,
        extremes: &MotionExtremes,
    ) -> Bound {
        let interval = steering.interval();
        // A chord misses a curve by h^2/8 of its second derivative, and the phase of a trapezoid by h^3/12.
        let bend = steering.carrier * extremes.jerk * interval * interval;
        let change = steering.carrier * extremes.rate * interval / steering.clock;
        let unit = steering.clock * channel.ramp_resolution(change);
        Bound {
            hertz: bend * (1.0 / 8.0 + 1.0 / 12.0) + 2.0 * unit,
            cycles: (bend / 12.0 + 1.5 * unit) * interval,
        }
    }

    /// Of a [`Sweep`](super::Sweep) fed from a table, arc not included.
    ///
    /// # Source
    /// An error x of what goes into `s1 = m + e + (w - s0) / 2` leaves (s1 - w, e) off by x (1, 1/2) when it is in
    /// the mean, by x (1/2, -1/4) then x (-1/2, -1/4) in the own step, by x (-1, 1/2) then x (1, 1/2) in the ramp's
    /// rounding, and nothing later. A phase between two ends is off by those at the ends and an eighth of the
    /// interval times the difference of the steps' errors.
    pub fn of_sweep<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        table: &PassTable<'_>,
        steering: &Steering,
    ) -> Self {
        let extremes = table.extremes();
        let interval = steering.interval();
        // The rapidity's evaluation, and a unit of 2^-44 for rounding it and for its offset.
        let rapidity = f64::from(table.rapidity_noise()) * libm::ldexp(1.0, -60);
        let own = steering.carrier * (rapidity + libm::ldexp(1.0, -44));
        let coarse_gain = steering.carrier * extremes.slope * libm::ldexp(1.0, -31);
        let of_own = |hertz: f64| Bound { hertz, cycles: 0.75 * hertz * interval };
        let of_means = Bound { hertz: 0.0, cycles: 0.75 * steering.carrier * Self::noise(channel, table) };
        Self::of_table(channel, table, steering, &extremes)
            .adding(ProvenPart::Arithmetic, of_own(own))
            .adding(ProvenPart::Arithmetic, of_means)
            .adding(ProvenPart::Constants, of_own(coarse_gain))
            .with(ProvenPart::Ramp, Self::ramp(channel, steering, &extremes))
    }

    /// Of a [`Sweep`](super::Sweep) fed by [`Stretch`](super::Stretch)es of `ticks` ticks from a table, arc not
    /// included.
    ///
    /// # Source
    /// What the quartic misses of the table, by its fifth derivative and its joints, counts with the table's part. An
    /// error x in each of the five delays (the evaluation's) becomes at most 2.21 x in between and 32/3 x over a
    /// quarter of the stretch in the slope at the ends, the sums of the sizes of the weights.
    pub fn of_stretch<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        table: &PassTable<'_>,
        steering: &Steering,
        ticks: u32,
    ) -> Self {
        let extremes = table.extremes();
        let (carrier, interval, ticks) = (steering.carrier, steering.interval(), f64::from(ticks));
        let quarter = interval * ticks / 4.0;
        let (value, slope) = table.off_quartic(quarter);
        // Half a unit in each difference, and as much again from the first, which takes it back by the end.
        let units = ticks + ticks * ticks / 2.0 + ticks * ticks * ticks / 6.0;
        let rounding = units * libm::ldexp(1.0, -74) / interval;
        // Two evaluations differ by the noise: each is off by half of it from a common middle.
        let noise = f64::from(table.evaluation_noise()) * libm::ldexp(0.5, -60);
        let hertz = carrier * (32.0 / 3.0 * noise / quarter + rounding)
            + steering.clock * units * libm::ldexp(1.0, -64);
        let arithmetic = Bound { hertz, cycles: carrier * 3.21 * noise + 0.75 * hertz * interval };
        let shift = extremes.slope * steering.time_error;
        let time_grid = Bound {
            hertz: carrier * (32.0 / 3.0 * shift / quarter + extremes.rate * steering.time_error),
            cycles: carrier * 2.21 * shift,
        };
        Self::of_table(channel, table, steering, &extremes)
            .adding(ProvenPart::Table, Bound { hertz: carrier * slope, cycles: carrier * value })
            .with(ProvenPart::Arithmetic, arithmetic)
            .with(ProvenPart::TimeGrid, time_grid)
            .with(ProvenPart::Ramp, Self::ramp(channel, steering, &extremes))
    }

    /// Of a [`Hold`](super::Hold) with words of `bits` bits fed from a table, arc not included. `deadband` in
    /// hertz, `quiet` the longest quiet window in seconds; with either the phase is not steered.
    pub fn of_hold<const RADIATES: bool>(
        channel: &Channel<RADIATES>,
        table: &PassTable<'_>,
        steering: &Steering,
        bits: u32,
        deadband: f64,
        quiet: f64,
    ) -> Self {
        let extremes = table.extremes();
        let interval = steering.interval();
        let place = steering.clock * libm::ldexp(1.0, (bits as i32).wrapping_neg());
        let steered = deadband == 0.0 && quiet == 0.0;
        // Half a place of rounding, and half a place carried from the last interval.
        let word = Bound {
            hertz: if deadband == 0.0 { place } else { place / 2.0 },
            cycles: place / 2.0 * interval,
        };
        let drift = steering.carrier * extremes.rate;
        let bend = steering.carrier * extremes.jerk * interval * interval;
        let hold = Bound {
            hertz: drift * (interval / 2.0 + quiet) + bend / 24.0 + deadband,
            cycles: if steered {
                (drift / 8.0) * interval * interval + bend * interval / 24.0
            } else {
                f64::INFINITY
            },
        };
        Self::of_table(channel, table, steering, &extremes)
            .with(ProvenPart::Word, word)
            .with(ProvenPart::Hold, hold)
    }
}

/// One-sigma inputs that no arithmetic can prove. Defaults are common practice, without a source.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Assumptions {
    /// Setting of the clock against true time, seconds.
    pub clock_setting: f64,
    /// Latency from word to output that is not accounted for, seconds.
    pub latency: f64,
    /// Crystals of both ends, parts per billion of the carrier.
    pub crystals: f64,
    /// Along-track error of the elements at their age, seconds of lateness.
    pub lateness: f64,
    /// Site, metres.
    pub site: f64,
    /// UT1 - UTC, seconds.
    pub earth_orientation: f64,
}

impl Default for Assumptions {
    fn default() -> Self {
        Self {
            clock_setting: 1e-3,
            latency: 1e-4,
            crystals: 2500.0,
            lateness: 0.13,
            site: 10.0,
            earth_orientation: 0.05,
        }
    }
}

/// What the assumptions may cost, one sigma each, in hertz.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Assumed {
    /// Name and hertz of each part.
    pub parts: [(&'static str, f64); 6],
}

/// Ground speed of a low orbit and of the equator, m/s: turns metres and seconds of rotation into lateness.
const GROUND_SPEED: f64 = 7000.0;
const EQUATOR_SPEED: f64 = 465.0;

impl Assumed {
    /// At a carrier, for a pass whose steepest rapidity rate is `rate` per second. A time error costs carrier
    /// times rate; a crystal error costs carrier times its part, not the intermediate frequency's.
    pub fn of(assumptions: &Assumptions, carrier: f64, rate: f64) -> Self {
        let per_second = carrier * rate;
        Self {
            parts: [
                ("clock setting", per_second * assumptions.clock_setting),
                ("latency", per_second * assumptions.latency),
                ("crystals", carrier * assumptions.crystals * 1e-9),
                ("element age", per_second * assumptions.lateness),
                ("site", per_second * assumptions.site / GROUND_SPEED),
                (
                    "Earth orientation",
                    per_second * assumptions.earth_orientation * EQUATOR_SPEED / GROUND_SPEED,
                ),
            ],
        }
    }

    /// Root of the sum of squares: the parts are independent.
    pub fn total(&self) -> f64 {
        libm::sqrt(self.parts.iter().fold(0.0, |sum, (_, hertz)| sum + hertz * hertz))
    }
}

/// What the model leaves out, as an estimate in hertz.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Excluded {
    /// Smooth ionosphere of 20 to 50 TEC units at zenith; falls with the carrier.
    pub ionosphere: f64,
    /// Troposphere above 10 degrees; grows with the carrier.
    pub troposphere: f64,
}

impl Excluded {
    /// At a carrier, scaled from 1.5 Hz and 0.18 Hz at 437 MHz (recomputed for the project's check values).
    pub fn of(carrier: f64) -> Self {
        Self { ionosphere: 1.5 * 437e6 / carrier, troposphere: 0.18 * carrier / 437e6 }
    }
}
