//! Each stage held against the one before it, so that each part of the bound has its own measured figure.
//!
//! | part | what is compared |
//! |---|---|
//! | arc | the arc seen from the site, with the orbit itself |
//! | table | the delays that the crate reads from the table, and their slope over a tenth of a second, with those of the arc seen from the site |
//! | arithmetic | the mean step that the crate computes for an interval, with the same from exact delays, less what the table is off there |
//! | word | the step that is made, with the mean step that was wanted |
//! | ramp, hold | the steering rule in f64 on exact delays, with the frequency and phase of these delays |
//!
//! The constants have no stage of their own: what they do is inside the figure of the arithmetic.

use super::curve::Curve;
use super::oscillator::{Carrier, Interval, Oscillator};
use shiftkeel::pass::bake::Audit;
use shiftkeel::tuning::Bound;

/// Largest error seen.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Seen {
    /// Of the frequency, Hz.
    pub hertz: f64,
    /// Of the phase, cycles.
    pub cycles: f64,
}

impl Seen {
    /// Takes in an error of the frequency.
    pub fn frequency(&mut self, hertz: f64) {
        self.hertz = larger(self.hertz, hertz);
    }

    /// Takes in an error of the phase.
    pub fn phase(&mut self, cycles: f64) {
        self.cycles = larger(self.cycles, cycles);
    }

    /// Whether it is inside a bound.
    pub fn is_within(&self, bound: &Bound) -> bool {
        self.hertz <= bound.hertz && self.cycles <= bound.cycles
    }
}

/// The larger in size; what is not a number counts as infinite and so is never inside a bound.
fn larger(so_far: f64, error: f64) -> f64 {
    if error.is_nan() { f64::INFINITY } else { so_far.max(error.abs()) }
}

/// A phase error brought to half a cycle.
pub fn wrapped(cycles: f64) -> f64 {
    cycles - cycles.round()
}

/// A motion as a radio hears it: the sign of a transmitter turned.
#[derive(Clone, Copy, Debug)]
pub struct Heard<'a> {
    /// The motion.
    pub curve: &'a Curve,
    /// Carrier, Hz.
    pub carrier: f64,
    /// 1 for a receiver, -1 for a transmitter.
    pub sign: f64,
}

impl Heard<'_> {
    /// What the oscillator is to be beside the carrier, Hz.
    pub fn shift(&self, t: f64) -> f64 {
        self.shift_of(self.curve.at(t)[1])
    }

    /// The same for a rapidity.
    pub fn shift_of(&self, rapidity: f64) -> f64 {
        self.carrier * (self.sign * rapidity).exp_m1()
    }

    /// Cycles beside those of the unshifted carrier.
    pub fn cycles(&self, t: f64) -> f64 {
        self.cycles_of(self.curve.delay(t))
    }

    /// The same for a delay.
    pub fn cycles_of(&self, delay: f64) -> f64 {
        -self.sign * self.carrier * delay
    }
}

/// The steering rule in f64 on exact delays: no rounding, no words.
#[derive(Clone, Copy, Debug)]
pub struct Rule {
    ramps: bool,
    interval: f64,
    /// Shift at the end of the last interval of a ramp; the held one of a word.
    end: f64,
    /// Phase that is lacking at the end of the last interval, cycles.
    lacking: f64,
}

/// An interval of the rule: shift at its start, its change, and the phase that is lacking at its start.
#[derive(Clone, Copy, Debug)]
pub struct Ruled {
    start: f64,
    change: f64,
    lacking: f64,
}

impl Rule {
    /// Begins at `t`.
    pub fn begin(oscillator: &Oscillator, heard: &Heard<'_>, t: f64) -> Self {
        Self {
            ramps: oscillator.bits.is_none(),
            interval: oscillator.interval(),
            end: heard.shift(t),
            lacking: 0.0,
        }
    }

    /// The interval between two instants; `stays`: the word was kept.
    pub fn step(&mut self, heard: &Heard<'_>, from: f64, to: f64, stays: bool) -> Ruled {
        let mean = (heard.cycles(to) - heard.cycles(from)) / self.interval;
        let lacking = self.lacking;
        if !self.ramps {
            self.end = if stays { self.end } else { mean };
            return Ruled { start: self.end, change: 0.0, lacking };
        }
        let start = self.end;
        let wanted = mean + lacking / self.interval;
        let change = wanted + (heard.shift(to) - start) / 2.0 - start;
        self.end = start + change;
        self.lacking = (wanted - start - change / 2.0) * self.interval;
        Ruled { start, change, lacking }
    }
}

impl Ruled {
    /// Shift at a part of the interval.
    fn shift(&self, part: f64) -> f64 {
        self.start + self.change * part
    }

    /// Cycles made since its start.
    fn cycles(&self, part: f64, interval: f64) -> f64 {
        interval * part * (self.start + self.change * part / 2.0)
    }
}

/// What each stage was off by.
#[derive(Clone, Copy, Debug, Default)]
pub struct Stages {
    /// Arc against orbit.
    pub arc: Seen,
    /// Table against arc.
    pub table: Seen,
    /// The crate's mean step against exact delays.
    pub arithmetic: Seen,
    /// Step made against step wanted.
    pub word: Seen,
    /// Steering rule against the motion.
    pub rule: Seen,
    /// Phase of the oscillator at interval ends against the table's own, cycles.
    pub own_cycles: f64,
    /// What the table's slope was off by at the last tick.
    slope_error: f64,
}

/// What the stages are measured with.
#[derive(Clone, Copy, Debug)]
pub struct Bench<'a> {
    /// The orbit.
    pub truth: Heard<'a>,
    /// The arc.
    pub arc: Heard<'a>,
    /// Carrier and clock.
    pub carrier: Carrier,
    /// The oscillator.
    pub oscillator: Oscillator,
    /// Slope jumps above this between two ticks mean that two segments meet there, Hz.
    pub joint: f64,
}

impl Stages {
    /// Begins: the table by the crate's own audit, the arc at the first instant `t`.
    pub fn begin(bench: &Bench<'_>, audit: &Audit, t: f64, read: [f64; 2]) -> Self {
        let carrier = bench.truth.carrier;
        let table = Seen { hertz: carrier * audit.worst_slope, cycles: carrier * audit.worst_delay };
        let mut stages = Self { table, ..Self::default() };
        stages.slope_error = stages.read(bench, t, read);
        stages
    }

    /// The arc at an instant, and what the slope that was read there (delay and rapidity) is off, Hz.
    fn read(&mut self, bench: &Bench<'_>, t: f64, read: [f64; 2]) -> f64 {
        let (truth, arc) = (bench.truth.curve.at(t), bench.arc.curve.at(t));
        let scale = bench.truth.carrier;
        self.arc.frequency(scale * (arc[1] - truth[1]));
        self.arc.phase(scale * (arc[0] - truth[0]));
        bench.arc.shift_of(read[1]) - bench.arc.shift_of(arc[1])
    }

    /// An interval between two instants.
    pub fn interval(&mut self, bench: &Bench<'_>, made: &Interval, (from, to): (f64, f64), read: [f64; 2]) {
        let slope_error = self.read(bench, to, read);
        let before = std::mem::replace(&mut self.slope_error, slope_error);
        if bench.oscillator.steers_phase() {
            let exact = (bench.arc.cycles(to) - bench.arc.cycles(from)) / bench.oscillator.interval();
            let off = bench.carrier.folded(bench.carrier.shift_of(made.mean) - exact);
            if (slope_error - before).abs() <= bench.joint {
                self.arithmetic.frequency(off - (slope_error + before) / 2.0);
            }
            if bench.oscillator.bits.is_some() {
                let unit = (-64f64).exp2();
                let step = made.made.wrapping_sub(made.mean) as i64 as f64 * unit;
                self.word.frequency(step * bench.oscillator.hertz());
                self.word.phase(made.remainder as f64 * unit * f64::from(bench.oscillator.clocks));
            }
        }
    }

    /// The rule at a part of an interval that begins at `from`.
    pub fn ruled(&mut self, bench: &Bench<'_>, ruled: &Ruled, from: f64, part: f64) {
        let interval = bench.oscillator.interval();
        let t = from + part * interval;
        self.rule.frequency(ruled.shift(part) - bench.arc.shift(t));
        if bench.oscillator.steers_phase() {
            let model = bench.arc.cycles(t) - bench.arc.cycles(from);
            self.rule.phase(ruled.cycles(part, interval) - model - ruled.lacking);
        }
    }
}
