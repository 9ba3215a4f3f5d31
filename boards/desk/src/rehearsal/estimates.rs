//! Steering without a table: range-rate estimates, noisy, missing and sometimes wildly wrong, through the crate's
//! velocity filter.
//!
//! How far the filter is from the truth is statistical: it states an uncertainty, and that is assumed, not proven.
//! Proven stays that the oscillator does what the filter says: the mean step of every interval, and the phase.

use super::oscillator::{Carrier, Oscillator, Run};
use super::stages::{Heard, Seen, wrapped};
use super::{COLUMNS, Column, read};
use crate::SPEED_OF_LIGHT;
use anyhow::ensure;
use fixed::types::I16F16;
use shiftkeel::follow::velocity::{Estimate, PassDynamics, Tick, VelocityFilter, VelocitySettings};
use shiftkeel::nco::Nco;
use shiftkeel::rapidity::Motion;
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::Bound;

/// What estimates come.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stream {
    /// Estimates a second.
    pub rate: f64,
    /// Their standard deviation, m/s.
    pub noise: f64,
    /// No estimates from so many seconds after the start, for so many seconds.
    pub gap: Option<(f64, f64)>,
    /// Part of the estimates that is off by up to 3 km/s.
    pub outliers: f64,
    /// Seed of the noise.
    pub seed: u64,
}

/// How far an outlier is off at most, m/s.
const WILDEST: f64 = 3000.0;

impl Stream {
    /// Refuses what cannot be.
    ///
    /// # Errors
    /// With what to give instead.
    pub fn check(&self) -> anyhow::Result<()> {
        ensure!((1e-3..=1e3).contains(&self.rate), "{} estimates a second: give 0.001 to 1000", self.rate);
        ensure!((1e-6..=1e4).contains(&self.noise), "--noise {} m/s: give 1e-6 to 1e4", self.noise);
        ensure!(
            (0.0..=0.5).contains(&self.outliers),
            "--outliers {}: give a part from 0 to 0.5",
            self.outliers
        );
        if let Some((from, length)) = self.gap {
            ensure!(
                from >= 0.0 && length >= 0.0,
                "--gap {from},{length}: give two times in seconds, 0 or more"
            );
        }
        Ok(())
    }
}

/// What the steering by estimates was like.
#[derive(Clone, Debug)]
pub struct Followed {
    /// Intervals that were steered.
    pub ticks: u64,
    /// Intervals without a prediction: before the first level, or after too long a gap.
    pub unsteered: u64,
    /// Estimates that came.
    pub estimates: u64,
    /// Of them, wildly wrong.
    pub outliers: u64,
    /// The oscillator against what the filter said: mean step, and phase with what is carried forward.
    pub steering: Seen,
    /// What it may be at most.
    pub proven: Bound,
    /// Worst error against the truth, Hz.
    pub worst_hertz: f64,
    /// Root of the mean square of it, Hz.
    pub rms_hertz: f64,
    /// Stated uncertainty (about 95 %): median and largest, Hz.
    pub stated_hertz: [f64; 2],
    /// Part of the intervals in which the error at the end was inside it.
    pub inside: f64,
    /// First and last instant, s.
    pub span: (f64, f64),
    /// For the picture: the errors, and in place of the phase the stated uncertainty.
    pub columns: Vec<Column>,
}

/// What is followed and by what.
#[derive(Clone, Copy, Debug)]
pub struct Course<'a> {
    /// What is true.
    pub truth: Heard<'a>,
    /// Carrier and clock.
    pub carrier: Carrier,
    /// The oscillator.
    pub oscillator: Oscillator,
    /// First instant as GPS time.
    pub start: GpsTime,
    /// The same, s from the reference epoch.
    pub origin: f64,
    /// Intervals.
    pub ticks: u64,
    /// What the channel's own rounding may do: Hz and cycles.
    pub proven: Bound,
}

/// Follows the stream through the pass; `begin` starts the steering at a motion.
///
/// # Errors
/// When the crate refuses a setting or a tick.
pub fn follow(
    course: &Course<'_>,
    stream: &Stream,
    begin: impl Fn(&Motion) -> anyhow::Result<Run>,
) -> anyhow::Result<Followed> {
    let settings =
        VelocitySettings::for_pass(stream.noise as f32, (1.0 / stream.rate) as f32, PassDynamics::LOW_ORBIT)?;
    let length = course.ticks as f64 * course.oscillator.interval();
    let mut state = State {
        course: *course,
        filter: VelocityFilter::new(),
        settings,
        run: None,
        oscillator: Nco::default(),
        base: 0.0,
        source: Source { stream: *stream, random: Random(stream.seed), next: 0, sent: 0, wild: 0 },
        found: Followed {
            ticks: 0,
            unsteered: 0,
            estimates: 0,
            outliers: 0,
            steering: Seen::default(),
            proven: course.proven,
            worst_hertz: 0.0,
            rms_hertz: 0.0,
            stated_hertz: [0.0; 2],
            inside: 0.0,
            span: (course.origin, course.origin + length),
            columns: Column::empty(
                &course.truth,
                (course.origin, length),
                COLUMNS.min(course.ticks as usize),
            ),
        },
        squares: 0.0,
        stated: Vec::new(),
        inside: 0,
    };
    for tick in 0..course.ticks {
        state.tick(tick, &begin)?;
    }
    state.finish()
}

struct State<'a> {
    course: Course<'a>,
    filter: VelocityFilter,
    settings: VelocitySettings,
    run: Option<(Run, Motion)>,
    oscillator: Nco,
    /// Phase of the oscillator less that of the filter, as it began, cycles.
    base: f64,
    source: Source,
    found: Followed,
    squares: f64,
    stated: Vec<f64>,
    inside: u64,
}

impl State<'_> {
    /// One interval: estimates up to its start are taken in, then it is steered by what is predicted for its end.
    fn tick(&mut self, tick: u64, begin: &impl Fn(&Motion) -> anyhow::Result<Run>) -> anyhow::Result<()> {
        let carrier = self.course.carrier;
        let clocks = u64::from(self.course.oscillator.clocks);
        let instant =
            |tick: u64| GpsTime::from_bits(self.course.start.to_bits() + carrier.grid(tick * clocks).0);
        let (now, then) = (instant(tick), instant(tick + 1));
        let to = carrier.seconds(((tick + 1) * clocks) as f64);
        while let Some(estimate) = self.source.until(now, &self.course) {
            self.filter.step(&self.settings, Tick::with_estimate(estimate.time(), estimate))?;
        }
        let predict = |at| self.filter.predict(&self.settings, at);
        let (Some(here), Some(ahead)) = (predict(now), predict(then)) else {
            self.run = None;
            self.found.unsteered += 1;
            return Ok(());
        };
        let filter_cycles = |motion: &Motion| self.course.truth.cycles_of(read(motion)[0]);
        if self.run.is_none() {
            let phase = self.oscillator.phase() as f64 * (-64f64).exp2();
            self.base = wrapped(phase - carrier.cycles(tick * clocks) - filter_cycles(&here));
        }
        // The interval begins where the last one was told to end.
        let (run, before) = match &mut self.run {
            Some((run, before)) => (run, before),
            none => {
                let (run, before) = none.insert((begin(&here)?, here));
                (run, before)
            }
        };
        let made = run.step(&ahead, self.course.oscillator.is_quiet(tick))?;
        let before = std::mem::replace(before, ahead);
        if self.course.oscillator.steers_phase() {
            let exact = (filter_cycles(&ahead) - filter_cycles(&before)) / self.course.oscillator.interval();
            self.found.steering.frequency(carrier.folded(carrier.shift_of(made.mean) - exact));
        }
        self.oscillator.retune(made.first, made.ramp);
        self.oscillator.advance(clocks);
        if self.course.oscillator.steers_phase() {
            let carried = made.remainder.wrapping_mul(clocks as i64) as u64;
            let phase = self.oscillator.phase().wrapping_add(carried) as f64 * (-64f64).exp2();
            let model = carrier.cycles((tick + 1) * clocks) + filter_cycles(&ahead) + self.base;
            self.found.steering.phase(wrapped(phase - model));
        }
        self.found.ticks += 1;
        let step = self.oscillator.step().to_bits().wrapping_sub((made.ramp.to_bits() / 2) as u64);
        self.judge(self.course.origin + to, then, carrier.shift_of(step));
        Ok(())
    }

    /// The oscillator at an interval's end against the truth and the stated uncertainty.
    fn judge(&mut self, time: f64, then: GpsTime, shift: f64) {
        let course = &self.course;
        let error = course.carrier.folded(shift - course.truth.shift(time));
        let stated = self.filter.uncertainty(&self.settings, then).map_or(0.0, |stated| {
            course.truth.carrier * f64::from(stated.metres_per_second) / SPEED_OF_LIGHT
        });
        self.found.worst_hertz = self.found.worst_hertz.max(error.abs());
        self.squares += error * error;
        self.stated.push(stated);
        self.inside += u64::from(error.abs() <= stated);
        let span = self.found.span;
        let columns = &mut self.found.columns;
        let place = (time - span.0) / (span.1 - span.0) * columns.len() as f64;
        let last = columns.len() - 1;
        columns[(place as usize).min(last)].take(error, [-stated, stated]);
    }

    fn finish(mut self) -> anyhow::Result<Followed> {
        ensure!(
            self.found.ticks > 0,
            "the estimates never agreed on a level: {} came; give more of them, or less noise",
            self.source.sent
        );
        let count = self.found.ticks as f64;
        self.stated.sort_by(f64::total_cmp);
        let middle = self.stated[self.stated.len() / 2];
        let most = self.stated[self.stated.len() - 1];
        self.found.columns.retain(|column| column.hertz[0] <= column.hertz[1]);
        Ok(Followed {
            estimates: self.source.sent,
            outliers: self.source.wild,
            rms_hertz: (self.squares / count).sqrt(),
            stated_hertz: [middle, most],
            inside: self.inside as f64 / count,
            ..self.found
        })
    }
}

/// The stream in progress.
struct Source {
    stream: Stream,
    random: Random,
    next: u64,
    sent: u64,
    wild: u64,
}

impl Source {
    /// The next estimate whose time is not after `until`.
    fn until(&mut self, until: GpsTime, course: &Course<'_>) -> Option<Estimate> {
        loop {
            let seconds = (self.next as f64 + 0.5) / self.stream.rate;
            let time = course.start.plus_seconds(seconds);
            if time > until {
                return None;
            }
            self.next += 1;
            if self.stream.gap.is_some_and(|(from, length)| (from..from + length).contains(&seconds)) {
                continue;
            }
            let rapidity = course.truth.curve.at(course.origin + seconds)[1];
            let mut rate = -SPEED_OF_LIGHT * rapidity.tanh() + self.stream.noise * self.random.normal();
            if self.random.unit() < self.stream.outliers {
                rate += WILDEST * (2.0 * self.random.unit() - 1.0);
                self.wild += 1;
            }
            self.sent += 1;
            return Some(Estimate::from_range_rate(time, I16F16::saturating_from_num(rate)));
        }
    }
}

/// SplitMix64 (Steele, Lea and Flood, 2014).
struct Random(u64);

impl Random {
    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Uniform in [0, 1).
    fn unit(&mut self) -> f64 {
        (self.bits() >> 11) as f64 * (-53f64).exp2()
    }

    /// Normal, by Box and Muller's transform.
    fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.unit()).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.unit()).cos()
    }
}
