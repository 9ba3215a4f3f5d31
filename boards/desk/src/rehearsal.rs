//! A rehearsal: the crate steers an oscillator through a pass, tick by tick, beside an independent reference.
//!
//! | module | holds |
//! |---|---|
//! | [`curve`] | a motion held as polynomials |
//! | [`oscillator`] | the crate's channel, steering and oscillator |
//! | [`stages`] | each stage against the one before it |
//! | [`estimates`] | steering by range-rate estimates instead of a table |
//! | [`lateness`] | a spacecraft that is later than its elements say |
//! | [`alternatives`] | what is commonly done instead |
//! | [`plot`] | the picture |
//! | [`report`] | what is printed, and `summary.json` |
//!
//! The reference is the vacuum model of the orbit itself, in f64, not the arc.

pub mod alternatives;
pub mod curve;
pub mod estimates;
pub mod lateness;
pub mod oscillator;
pub mod plot;
pub mod report;
pub mod stages;

use crate::baking::Baked;
use crate::geometric::Direction;
use crate::vacuum::VacuumModel;
use anyhow::{Context, ensure};
use curve::Curve;
use estimates::{Course, Followed, Stream};
use oscillator::{Carrier, Oscillator, Run, Tuning};
use shiftkeel::frequency::Frequency;
use shiftkeel::nco::Nco;
use shiftkeel::pass::PassTable;
use shiftkeel::pass::bake::audit;
use shiftkeel::rapidity::Motion;
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{Proven, ProvenPart};
use stages::{Bench, Heard, Rule, Seen, Stages, wrapped};

/// Parts of an interval that are looked at, beside its last clock.
const LOOKS: u32 = 4;
/// Time over which the audit of the table takes a slope, s: long enough that the rounding of two delays does not
/// show in it, short beside what a polynomial of a table does.
const AUDIT_STEP: f64 = 0.1;
/// Steps of the audit at most.
const MOST_AUDITED: f64 = 50_000.0;
/// Columns of the picture.
const COLUMNS: usize = 720;

/// What was seen in one column of the picture.
#[derive(Clone, Copy, Debug)]
pub struct Column {
    /// Time, s from the reference epoch.
    pub time: f64,
    /// Shift, Hz.
    pub shift: f64,
    /// Least and largest frequency error, Hz.
    pub hertz: [f64; 2],
    /// Least and largest phase error, cycles.
    pub cycles: [f64; 2],
}

impl Column {
    /// Columns over a span (first instant and length), nothing seen yet.
    fn empty(truth: &Heard<'_>, (origin, length): (f64, f64), count: usize) -> Vec<Self> {
        let column = |at: usize| {
            let time = origin + length * (at as f64 + 0.5) / count as f64;
            let none = [f64::INFINITY, f64::NEG_INFINITY];
            Self { time, shift: truth.shift(time), hertz: none, cycles: none }
        };
        (0..count).map(column).collect()
    }

    /// Takes in a frequency error and a band for the third panel.
    fn take(&mut self, hertz: f64, [least, most]: [f64; 2]) {
        self.hertz = [self.hertz[0].min(hertz), self.hertz[1].max(hertz)];
        self.cycles = [self.cycles[0].min(least), self.cycles[1].max(most)];
    }
}

/// What a rehearsal found.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// Intervals steered.
    pub ticks: u64,
    /// Instants at which the oscillator was looked at.
    pub instants: u64,
    /// Worst error of the oscillator against the reference.
    pub worst: Seen,
    /// The same as a root of the mean square, Hz.
    pub rms_hertz: f64,
    /// When the frequency was worst, s from the reference epoch.
    pub worst_time: f64,
    /// What it may be at most.
    pub proven: Proven,
    /// Part by part what was seen.
    pub stages: Stages,
    /// Words written to the device, or ramps started.
    pub retunes: u64,
    /// First and last instant, s from the reference epoch.
    pub span: (f64, f64),
    /// What the reference's polynomials are off from the reference, Hz and cycles.
    pub reference_noise: Seen,
    /// For the picture.
    pub columns: Vec<Column>,
}

impl Outcome {
    /// Whether no instant was outside.
    pub fn is_within(&self) -> bool {
        self.worst.is_within(&self.proven.total())
    }
}

/// All that a rehearsal of a table needs.
pub struct Rehearsal<'a> {
    /// Arc and pass, and the table unless another is given.
    pub baked: &'a Baked,
    /// The table.
    pub table: PassTable<'a>,
    /// The oscillator.
    pub oscillator: Oscillator,
    /// The orbit as the site sees it.
    pub truth: Curve,
    /// The arc as the site sees it.
    pub arc: Curve,
    /// What the held truth is off from the model asked directly.
    pub reference_noise: Seen,
}

impl<'a> Rehearsal<'a> {
    /// Gets ready: asks the models.
    ///
    /// # Errors
    /// When the orbit cannot be followed, or the table is not for this pass and direction.
    pub fn new(baked: &'a Baked, table: PassTable<'a>, oscillator: Oscillator) -> anyhow::Result<Self> {
        ensure!(
            table.direction() == crate::baking::signal(baked.order.direction),
            "the table is baked for another direction; give the one it is for with --direction"
        );
        let reference = baked.pass.reference_gps()?;
        let span = (table.start().seconds_since(reference), table.end().seconds_since(reference));
        ensure!(
            span.0 < baked.pass.end && span.1 > baked.pass.start,
            "the table is for another time: it ends {:.0} s before, or begins after, this pass",
            baked.pass.start - span.1
        );
        let model = truth_model(baked, 0.0)?;
        let both = |t: f64| Ok::<_, crate::orbit::OrbitError>([model.delay(t)?, model.rapidity(t)?]);
        let truth = Curve::hold(span.0, span.1, both)?;
        let geometry = baked.geometry(0.0)?;
        let arc = Curve::hold(span.0, span.1, |t| {
            let (delay, rapidity) = geometry.delay_and_rapidity(t);
            Ok::<_, std::convert::Infallible>([delay, rapidity])
        })?;
        let [delay, rapidity] = truth.largest_departure(span, 200, both)?;
        let carrier = baked.order.carrier;
        let reference_noise = Seen { hertz: carrier * rapidity, cycles: carrier * delay };
        Ok(Self { baked, table, oscillator, truth, arc, reference_noise })
    }

    /// The carrier and the clock, exact.
    fn carrier(&self) -> anyhow::Result<(Frequency, Carrier)> {
        let millihertz = (self.baked.order.carrier * 1e3).round();
        let frequency = Frequency::from_millihertz_nearest(millihertz as u64)
            .context("the carrier is beyond the format")?;
        Ok((frequency, Carrier::new(frequency, self.oscillator.clock)))
    }

    /// A motion as this radio hears it.
    pub fn heard<'c>(&self, curve: &'c Curve) -> Heard<'c> {
        let sign = if self.baked.order.direction == Direction::Up { -1.0 } else { 1.0 };
        Heard { curve, carrier: self.baked.order.carrier, sign }
    }

    /// Steers through the whole table; `progress` is called now and then with the part that is done.
    ///
    /// # Errors
    /// When the crate refuses a tick, which it should not.
    pub fn run(&self, mut progress: impl FnMut(f64)) -> anyhow::Result<Outcome> {
        let (frequency, carrier) = self.carrier()?;
        let tuning = Tuning::new(frequency, self.baked.order.direction, &self.oscillator)?;
        tuning.suits(&self.table)?;
        let proven = tuning
            .proven(&self.table, carrier.hertz(), &self.oscillator)
            .with(ProvenPart::Arc, self.baked.arc_bound);
        let bench = Bench {
            truth: self.heard(&self.truth),
            arc: self.heard(&self.arc),
            carrier,
            oscillator: self.oscillator,
            joint: carrier.hertz() * (-40f64).exp2(),
        };
        let start = self.table.start();
        let origin = start.seconds_since(self.baked.pass.reference_gps()?);
        let span = self.table.end().to_bits().wrapping_sub(start.to_bits());
        let ticks = carrier.intervals(span, self.oscillator.clocks);
        ensure!(ticks > 0, "the table is shorter than one interval of {} s", self.oscillator.interval());
        let motion = self.table.at(start)?;
        let mut walk = Walk {
            bench,
            run: Run::begin(tuning, &self.oscillator, &motion)?,
            oscillator: Nco::at_phase(phase_of(bench.arc.cycles_of(read(&motion)[0]))),
            rule: Rule::begin(&self.oscillator, &bench.arc, origin),
            outcome: self.empty(ticks, origin, proven),
            squares: 0.0,
            origin,
        };
        let geometry = self.baked.geometry(0.0)?;
        let length = walk.outcome.span.1 - origin;
        let audit = audit(&self.table, AUDIT_STEP.max(length / MOST_AUDITED), |t| {
            geometry.delay_and_rapidity(origin + t).0
        })?;
        walk.outcome.stages = Stages::begin(&bench, &audit, origin, read(&motion));
        for tick in 1..=ticks {
            let clocks = u64::from(self.oscillator.clocks);
            let (grid, fraction) = carrier.grid(tick * clocks);
            let motion = self.table.at_fine(GpsTime::from_bits(start.to_bits() + grid), fraction)?;
            walk.tick(tick, &motion)?;
            if tick % 4096 == 0 {
                progress(tick as f64 / ticks as f64);
            }
        }
        walk.outcome.rms_hertz = (walk.squares / walk.outcome.instants as f64).sqrt();
        walk.outcome.columns.retain(|column| column.hertz[0] <= column.hertz[1]);
        Ok(walk.outcome)
    }

    /// Steers by a stream of estimates instead of the table, over the table's span.
    ///
    /// # Errors
    /// When the crate refuses a setting or a tick, or nothing could be steered.
    pub fn follow(&self, stream: &Stream) -> anyhow::Result<Followed> {
        let (frequency, carrier) = self.carrier()?;
        let tuning = Tuning::new(frequency, self.baked.order.direction, &self.oscillator)?;
        let start = self.table.start();
        let span = self.table.end().to_bits().wrapping_sub(start.to_bits());
        let course = Course {
            truth: self.heard(&self.truth),
            carrier,
            oscillator: self.oscillator,
            start,
            origin: start.seconds_since(self.baked.pass.reference_gps()?),
            ticks: carrier.intervals(span, self.oscillator.clocks),
            proven: tuning.rounding(carrier.hertz(), &self.oscillator),
        };
        ensure!(
            course.ticks > 0,
            "the pass is shorter than one interval of {} s",
            self.oscillator.interval()
        );
        estimates::follow(&course, stream, |motion| Ok(Run::begin(tuning, &self.oscillator, motion)?))
    }

    fn empty(&self, ticks: u64, origin: f64, proven: Proven) -> Outcome {
        let length = ticks as f64 * self.oscillator.interval();
        Outcome {
            ticks,
            instants: 0,
            worst: Seen::default(),
            rms_hertz: 0.0,
            worst_time: origin,
            proven,
            stages: Stages::default(),
            retunes: 0,
            span: (origin, origin + length),
            reference_noise: self.reference_noise,
            columns: Column::empty(&self.heard(&self.truth), (origin, length), COLUMNS.min(ticks as usize)),
        }
    }
}

/// The vacuum model of the pass, for a spacecraft that is `lateness` s late.
///
/// # Errors
/// When the orbit cannot be followed.
pub fn truth_model(baked: &Baked, lateness: f64) -> anyhow::Result<VacuumModel> {
    let pass = &baked.pass;
    let orbit = pass.orbit.clone().late_by(lateness);
    let window = (pass.start - 10.0, pass.end + 10.0);
    Ok(VacuumModel::new(orbit, pass.site, baked.order.dut1, baked.order.direction, window)?)
}

/// Delay and rapidity that the crate read, in seconds and as a number.
fn read(motion: &Motion) -> [f64; 2] {
    [motion.delay.to_bits() as f64 * (-56f64).exp2(), motion.rapidity.to_bits() as f64 * (-60f64).exp2()]
}

/// A phase in 2^-64 cycle.
fn phase_of(cycles: f64) -> u64 {
    ((cycles - cycles.floor()) * 64f64.exp2()) as u64
}

/// The state of a run.
struct Walk<'a> {
    bench: Bench<'a>,
    run: Run,
    oscillator: Nco,
    rule: Rule,
    outcome: Outcome,
    squares: f64,
    origin: f64,
}

impl Walk<'_> {
    /// One interval: steered by the crate, then looked at from its first clock to its last.
    fn tick(&mut self, tick: u64, motion: &Motion) -> anyhow::Result<()> {
        let carrier = self.bench.carrier;
        let clocks = u64::from(self.bench.oscillator.clocks);
        let before = (tick - 1) * clocks;
        let origin = self.origin;
        let time = |clocks: f64| origin + carrier.seconds(clocks);
        let (from, to) = (time(before as f64), time((before + clocks) as f64));
        let quiet = self.bench.oscillator.is_quiet(tick - 1);
        let made = self
            .run
            .step(motion, quiet)
            .with_context(|| format!("interval {tick}, {:.3} s into the pass", to - self.origin))?;
        self.outcome.retunes += u64::from(made.retuned);
        let ruled =
            self.rule.step(&self.bench.arc, from, to, !made.retuned && !self.bench.oscillator.steers_phase());
        self.outcome.stages.interval(&self.bench, &made, (from, to), read(motion));
        self.oscillator.retune(made.first, made.ramp);
        for look in 0..=u64::from(LOOKS) {
            let clock = (clocks * look / u64::from(LOOKS)).min(clocks - 1);
            let mut then = self.oscillator;
            then.advance(clock);
            // A clock's step is what the oscillator does in its middle; the phase is that of its start.
            let middle = time((before + clock) as f64 + 0.5);
            let shift = carrier.shift_of(then.step().to_bits());
            self.frequency(middle, carrier.folded(shift - self.bench.truth.shift(middle)));
            self.phase(before + clock, then.phase());
            self.outcome.stages.ruled(&self.bench, &ruled, from, (clock as f64 + 0.5) / clocks as f64);
        }
        self.oscillator.advance(clocks);
        self.phase(before + clocks, self.oscillator.phase());
        if self.bench.oscillator.steers_phase() {
            let own = carrier.cycles(before + clocks) + self.bench.arc.cycles_of(read(motion)[0]);
            let off = wrapped(self.oscillator.phase() as f64 * (-64f64).exp2() - own);
            self.outcome.stages.own_cycles = self.outcome.stages.own_cycles.max(off.abs());
        }
        Ok(())
    }

    /// Takes in an error of the frequency.
    fn frequency(&mut self, time: f64, hertz: f64) {
        let outcome = &mut self.outcome;
        let before = outcome.worst.hertz;
        outcome.worst.frequency(hertz);
        if outcome.worst.hertz > before {
            outcome.worst_time = time;
        }
        outcome.instants += 1;
        self.squares += hertz * hertz;
        let column = self.column(time);
        column.hertz = [column.hertz[0].min(hertz), column.hertz[1].max(hertz)];
    }

    /// Takes in a phase after so many clocks.
    fn phase(&mut self, clocks: u64, phase: u64) {
        if !self.bench.oscillator.steers_phase() {
            return;
        }
        let carrier = self.bench.carrier;
        let time = self.origin + carrier.seconds(clocks as f64);
        let model = carrier.cycles(clocks) + self.bench.truth.cycles(time);
        let cycles = wrapped(phase as f64 * (-64f64).exp2() - model);
        self.outcome.worst.phase(cycles);
        let column = self.column(time);
        column.cycles = [column.cycles[0].min(cycles), column.cycles[1].max(cycles)];
    }

    fn column(&mut self, time: f64) -> &mut Column {
        let outcome = &mut self.outcome;
        let length = outcome.span.1 - outcome.span.0;
        let place = (time - outcome.span.0) / length * outcome.columns.len() as f64;
        let last = outcome.columns.len() - 1;
        &mut outcome.columns[(place as usize).min(last)]
    }
}
