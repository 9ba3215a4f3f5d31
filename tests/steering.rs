//! A whole pass steered: table, channel, sweep or hold, oscillator, beside the independent reference.

mod passes;
mod reference;
mod steered;

use shiftkeel::frequency::{PhaseRamp, PhaseStep};
use shiftkeel::nco::Nco;
use shiftkeel::pass::{Direction, PassTable};
use shiftkeel::rapidity::{Delay, Motion, Rapidity};
use shiftkeel::tuning::{
    Bound, Channel, Conversion, Hold, Injection, Permission, Proven, ProvenPart, RatioChannel, RfPlan,
    Steering, Sweep, TuningError,
};
use steered::{Flight, TURN, Ticks, assert_proven, hertz, hertz_between, off_whole};

const CARRIER: u64 = 437_000_000;

/// +1 for what rises with an approaching motion: the received, or the mirrored emitted frequency.
fn sense<const RADIATES: bool>(plan: &RfPlan<'_>) -> f64 {
    let mirrored = plan.injection == Injection::HighSide;
    if mirrored == RADIATES { 1.0 } else { -1.0 }
}

/// The offset from the carrier that a rapidity asks of the oscillator, over the carrier.
fn offset<const RADIATES: bool>(plan: &RfPlan<'_>, rapidity: f64) -> f64 {
    let mirror = if plan.injection == Injection::HighSide { -1.0 } else { 1.0 };
    let towards = if RADIATES { -rapidity } else { rapidity };
    mirror * towards.exp_m1()
}

/// Worst errors of a steered pass.
#[derive(Clone, Copy, Debug, Default)]
struct Seen {
    /// Largest difference between an interval's start and the end of the one before, 2^-64 cycle per clock.
    gap: u64,
    /// Phase at tick ends against the table's own, cycles: over the whole pass, and over its first tenth.
    own_cycles: f64,
    own_cycles_early: f64,
    /// The same once what the steering says it lacks is given.
    told_cycles: f64,
    /// Against the reference, ends and interior.
    hertz: f64,
    cycles: f64,
    /// Mean frequency over the pass against the table's, hertz.
    mean_hertz: f64,
    retunes: u64,
}

/// One device over the pass: what it was given for an interval, and how far on it is.
trait Steered<const RADIATES: bool> {
    /// Steers, and returns start step, change over the interval, and whether the device was written.
    fn steer(&mut self, channel: &Channel<RADIATES>, next: &Motion, tick: u64) -> (PhaseStep, i64, bool);
    /// Moves the phase on by clocks.
    fn advance(&mut self, clocks: u64);
    fn phase(&self) -> u64;
    fn lacks(&self) -> i64;
    fn end(&self) -> PhaseStep;
}

#[derive(Clone)]
struct Ramping {
    sweep: Sweep,
    oscillator: Nco,
}

impl<const RADIATES: bool> Steered<RADIATES> for Ramping {
    fn steer(&mut self, channel: &Channel<RADIATES>, next: &Motion, _: u64) -> (PhaseStep, i64, bool) {
        let swept = self.sweep.step(channel, next).unwrap();
        self.oscillator.retune(swept.first, swept.ramp);
        (swept.start(), self.sweep.end().to_bits().wrapping_sub(swept.start().to_bits()) as i64, true)
    }
    fn advance(&mut self, clocks: u64) {
        self.oscillator.advance(clocks);
    }
    fn phase(&self) -> u64 {
        self.oscillator.phase()
    }
    fn lacks(&self) -> i64 {
        self.sweep.remainder()
    }
    fn end(&self) -> PhaseStep {
        self.sweep.end()
    }
}

#[derive(Clone)]
struct Holding<const BITS: u32> {
    hold: Hold<BITS>,
    oscillator: Nco,
    quiet: fn(u64) -> bool,
}

impl<const BITS: u32, const RADIATES: bool> Steered<RADIATES> for Holding<BITS> {
    fn steer(&mut self, channel: &Channel<RADIATES>, next: &Motion, tick: u64) -> (PhaseStep, i64, bool) {
        let before = self.hold.word();
        let held = self.hold.step(channel, next, (self.quiet)(tick)).unwrap();
        assert_eq!(held.retuned, held.word != before);
        assert_eq!((held.word, held.step), (self.hold.word(), self.hold.current()));
        self.oscillator.retune(held.step, PhaseRamp::ZERO);
        (held.step, 0, held.retuned)
    }
    fn advance(&mut self, clocks: u64) {
        self.oscillator.advance(clocks);
    }
    fn phase(&self) -> u64 {
        self.oscillator.phase()
    }
    fn lacks(&self) -> i64 {
        self.hold.remainder()
    }
    fn end(&self) -> PhaseStep {
        self.hold.current()
    }
}

/// Flies the pass; the reference is asked in every `stride`th interval.
fn fly<const RADIATES: bool>(
    flight: &Flight,
    plan: &RfPlan<'_>,
    channel: &Channel<RADIATES>,
    ticks: Ticks,
    device: &mut (impl Steered<RADIATES> + Clone),
    stride: u64,
) -> Seen {
    let table = flight.table();
    let carrier = plan.carrier.as_hertz_f64();
    let clocks = u64::from(ticks.clocks);
    let sense = sense::<RADIATES>(plan);
    let origin = table.at(table.start()).unwrap().delay.to_bits();
    let first_delay = origin as f64 / 2f64.powi(56);
    let nominal = channel.nominal_step();
    // Cycles beyond the nominal step's, modulo one.
    let gained =
        |phase: u64, clocks: u64| phase.wrapping_sub(nominal.to_bits().wrapping_mul(clocks)) as f64 / TURN;
    let mut seen = Seen::default();
    let mut last_end = None;
    let mut beyond = 0.0;
    let count = ticks.count(&table);
    for tick in 1..=count {
        let (time, rest) = ticks.fine(tick);
        let motion = table.at_fine(time, rest).unwrap();
        let (start, change, retuned) = device.steer(channel, &motion, tick);
        seen.retunes += u64::from(retuned);
        if let Some(end) = last_end.replace(device.end()) {
            seen.gap = seen.gap.max(start.to_bits().abs_diff(end.to_bits()));
        }
        if tick.is_multiple_of(stride) {
            for quarter in 0..=4 {
                let part = f64::from(quarter) / 4.0;
                let seconds = ticks.seconds(tick - 1) + part * ticks.interval();
                let step = start.to_bits().wrapping_add_signed((change as f64 * part) as i64);
                let truth = carrier * offset::<RADIATES>(plan, flight.rapidity(seconds));
                let hertz = hertz_between(PhaseStep::from_bits(step), nominal, ticks.clock) - truth;
                seen.hertz = seen.hertz.max(hertz.abs());
                let mut ahead = device.clone();
                let whole = (part * clocks as f64) as u64;
                ahead.advance(whole);
                let seconds = ticks.seconds(tick - 1) + whole as f64 / ticks.clock as f64;
                let truth = -sense * carrier * (flight.delay(seconds) - first_delay);
                let cycles = off_whole(gained(ahead.phase(), (tick - 1) * clocks + whole) - truth);
                seen.cycles = seen.cycles.max(cycles.abs());
            }
        }
        device.advance(clocks);
        let own = -sense * carrier * (motion.delay.to_bits() - origin) as f64 / 2f64.powi(56);
        let off = off_whole(gained(device.phase(), tick * clocks) - own);
        seen.own_cycles = seen.own_cycles.max(off.abs());
        if tick <= count / 10 {
            seen.own_cycles_early = seen.own_cycles;
        }
        let given = device.lacks() as f64 * clocks as f64 / TURN;
        seen.told_cycles = seen.told_cycles.max(off_whole(off + given).abs());
        beyond = off;
    }
    seen.mean_hertz = (beyond / ticks.seconds(count)).abs();
    seen
}

fn steering(ticks: Ticks, carrier: u64) -> Steering {
    Steering { carrier: carrier as f64, clock: ticks.clock as f64, clocks: ticks.clocks, time_error: 0.0 }
}

/// What a sweep's phase at a tick's end may differ from the table's own.
fn own_phase(proven: &Proven) -> f64 {
    [ProvenPart::Arithmetic, ProvenPart::Constants, ProvenPart::Ramp, ProvenPart::Word]
        .iter()
        .map(|&part| proven.part(part).cycles)
        .sum()
}

fn sweep_pass<const RADIATES: bool>(
    name: &str,
    flight: &Flight,
    plan: &RfPlan<'_>,
    channel: &Channel<RADIATES>,
    ticks: Ticks,
    stride: u64,
) -> (Seen, Proven) {
    let table = flight.table();
    let carrier = plan.carrier.as_hertz_f64() as u64;
    let proven = Proven::of_sweep(channel, &table, &steering(ticks, carrier));
    let motion = table.at(ticks.start).unwrap();
    let mut device = Ramping { sweep: Sweep::begin(channel, &motion).unwrap(), oscillator: Nco::at_phase(0) };
    let seen = fly(flight, plan, channel, ticks, &mut device, stride);
    println!("{name}: {seen:?}");
    for part in ProvenPart::ALL {
        println!("  {:<11} {:?}", part.name(), proven.part(part));
    }
    assert_eq!(seen.gap, 0, "{name}: ends must meet");
    assert_proven(&format!("{name} hertz"), seen.hertz, proven.total().hertz, 0.3);
    assert_proven(&format!("{name} cycles"), seen.cycles, proven.total().cycles, 0.3);
    assert_proven(&format!("{name} cycles against the table"), seen.own_cycles, own_phase(&proven), 0.1);
    // Nothing accumulates: what the steering says it lacks is all that is off, but the delay's place.
    let told = proven.part(ProvenPart::Arithmetic).cycles + proven.part(ProvenPart::Constants).cycles;
    assert!(seen.told_cycles <= told, "{name}: {} cycles off without being told", seen.told_cycles);
    let span = ticks.seconds(ticks.count(&table));
    assert!(seen.mean_hertz <= own_phase(&proven) / span, "{name}: mean off by {} Hz", seen.mean_hertz);
    (seen, proven)
}

fn ticks(table: &PassTable<'_>, clock: u64, clocks: u32) -> Ticks {
    Ticks { start: table.start(), clock, clocks }
}

/// A software oscillator at 48 kHz, steered every 10 ms, at 10 mHz and at 1 mHz tables.
#[test]
fn sweep_at_48_khz() {
    for (millihertz, cycles) in [(10.0, 0.015), (1.0, 0.002)] {
        let flight = Flight::baked(Direction::Down, CARRIER as f64, millihertz, cycles);
        let plan = RfPlan::direct(hertz(CARRIER), hertz(48_000));
        let channel = Channel::receive(&plan, 480).unwrap();
        let ticks = ticks(&flight.table(), 48_000, 480);
        let name = format!("48 kHz, 10 ms, {millihertz} mHz");
        sweep_pass(&name, &flight, &plan, &channel, ticks, 31);
    }
}

/// The same for intervals from 1 ms to 1 s, other clocks and carriers: a bound that keeps, and is not padded.
#[test]
fn sweep_at_other_rates() {
    for (carrier, clock, clocks, stride) in [
        (437_000_000, 250_000, 250, 997),
        (145_900_000, 8_000, 800, 17),
        (437_000_000, 1_000_000, 1_000_000, 1),
        (8_400_000_000, 1_000_000, 10_000, 5),
        (2_200_000_000, 100_000_000, 100_000_000, 1),
    ] {
        let flight = Flight::baked(Direction::Down, carrier as f64, carrier as f64 / 4.37e7, 0.02);
        let plan = RfPlan::direct(hertz(carrier), hertz(clock));
        let channel = Channel::receive(&plan, clocks).unwrap();
        let ticks = ticks(&flight.table(), clock, clocks);
        sweep_pass(
            &format!("{carrier} Hz at {clock} Hz, {clocks} clocks"),
            &flight,
            &plan,
            &channel,
            ticks,
            stride,
        );
    }
}

/// Uplink tagged at ground transmission with its permission, and two-way; both injection sides through a
/// conversion.
#[test]
fn sweep_of_transmitter_and_mirror() {
    let conversions = [Conversion { frequency: hertz(436_900_000), crystal: Rapidity::ZERO }];
    let permission = Permission::to_radiate(hertz(436_985_000), hertz(437_015_000)).unwrap();
    let (clock, clocks) = (1_000_000, 10_000);
    for injection in [Injection::LowSide, Injection::HighSide] {
        let plan =
            RfPlan { conversions: &conversions, injection, ..RfPlan::direct(hertz(CARRIER), hertz(clock)) };
        let flight = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
        let channel = Channel::transmit(&plan, clocks, &permission).unwrap();
        let ticks = ticks(&flight.table(), clock, clocks);
        sweep_pass(&format!("transmit {injection:?}"), &flight, &plan, &channel, ticks, 61);
        let flight = Flight::baked(Direction::TwoWay, CARRIER as f64, 10.0, 0.015);
        let channel = Channel::receive(&plan, clocks).unwrap();
        sweep_pass(&format!("two-way {injection:?}"), &flight, &plan, &channel, ticks, 61);
    }
}

/// What the arc leaves out is a part of its own: against the true positions, with 0.4 mm/s on each of three
/// axes as its bound.
#[test]
fn sweep_against_the_orbit() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let plan = RfPlan::direct(hertz(CARRIER), hertz(48_000));
    let channel = Channel::receive(&plan, 480).unwrap();
    let ticks = ticks(&table, 48_000, 480);
    let arc = Bound {
        hertz: 3f64.sqrt() * passes::VELOCITY_TOLERANCE / 299_792_458.0 * CARRIER as f64,
        cycles: f64::INFINITY,
    };
    let proven = Proven::of_sweep(&channel, &table, &steering(ticks, CARRIER)).with(ProvenPart::Arc, arc);
    let mut sweep = Sweep::begin(&channel, &table.at(ticks.start).unwrap()).unwrap();
    let mut worst = 0.0_f64;
    for tick in 1..=ticks.count(&table) {
        let (time, rest) = ticks.fine(tick);
        sweep.step(&channel, &table.at_fine(time, rest).unwrap()).unwrap();
        if tick.is_multiple_of(997) {
            let truth = CARRIER as f64 * flight.rapidity_of_orbit(ticks.seconds(tick)).exp_m1();
            worst = worst.max((hertz_between(sweep.end(), channel.nominal_step(), 48_000) - truth).abs());
        }
    }
    assert_proven("with the arc, hertz", worst, proven.total().hertz, 0.3);
}

/// The oscillator's phase, advanced at once or clock by clock, is what the sweep's own numbers say:
/// n (start + change / 2), and it ends at the sweep's end.
#[test]
fn oscillator_keeps_the_sweeps_model() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let channel = Channel::receive(&RfPlan::direct(hertz(CARRIER), hertz(48_000)), 480).unwrap();
    let ticks = ticks(&table, 48_000, 480);
    let mut sweep = Sweep::begin(&channel, &table.at(ticks.start).unwrap()).unwrap();
    let mut at_once = Nco::at_phase(12_345);
    let mut by_clock = at_once;
    for tick in 1..=ticks.count(&table) {
        let (time, rest) = ticks.fine(tick);
        let swept = sweep.step(&channel, &table.at_fine(time, rest).unwrap()).unwrap();
        let before = at_once.phase();
        at_once.retune(swept.first, swept.ramp);
        at_once.advance(480);
        assert_eq!(swept.change(480), swept.ramp.to_bits() * 480);
        let given = swept.start().to_bits().wrapping_mul(480).wrapping_add_signed(swept.change(480) * 240);
        assert_eq!(at_once.phase().wrapping_sub(before), given);
        // The step of the clock after the interval lies half a clock's ramp beyond its end.
        let end = at_once.step().to_bits().wrapping_sub((swept.ramp.to_bits() / 2) as u64);
        assert_eq!(end, sweep.end().to_bits());
        by_clock.retune(swept.first, swept.ramp);
        if (36_000..36_200).contains(&tick) {
            for _ in 0..480 {
                by_clock.tick();
            }
        } else {
            by_clock.advance(480);
        }
        assert_eq!(by_clock, at_once);
    }
}

/// The parts one by one, each where it rules: seen, and not padded.
#[test]
fn parts_of_the_proof() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    // Ramp: intervals of 4 s, the sweep against the table between its ends.
    let plan = RfPlan::direct(hertz(CARRIER), hertz(48_000));
    let channel = Channel::receive(&plan, 192_000).unwrap();
    let long = ticks(&table, 48_000, 192_000);
    let proven = Proven::of_sweep(&channel, &table, &steering(long, CARRIER));
    let mut sweep = Sweep::begin(&channel, &table.at(long.start).unwrap()).unwrap();
    let mut worst = 0.0_f64;
    for tick in 1..=long.count(&table) {
        let (time, rest) = long.fine(tick);
        let swept = sweep.step(&channel, &table.at_fine(time, rest).unwrap()).unwrap();
        for part in 0..=16_u64 {
            let between = Ticks { clocks: 12_000, ..long };
            let (time, rest) = between.fine((tick - 1) * 16 + part);
            let own = channel.step(table.at_fine(time, rest).unwrap().rapidity).unwrap();
            let step = swept.start().to_bits().wrapping_add_signed(swept.change(192_000) / 16 * part as i64);
            worst = worst.max(hertz_between(PhaseStep::from_bits(step), own, 48_000).abs());
        }
    }
    let rest = proven.part(ProvenPart::Arithmetic).hertz + proven.part(ProvenPart::Constants).hertz;
    assert_proven("ramp, hertz", worst, proven.part(ProvenPart::Ramp).hertz + rest, 0.3);

    // Time grid: instants on the grid of 2^-30 s beside exact ones, 2.3 ms apart.
    let channel = Channel::receive(&plan, 111).unwrap();
    let short = ticks(&table, 48_000, 111);
    let rounded = Steering { time_error: 2f64.powi(-31), ..steering(short, CARRIER) };
    let proven = Proven::of_sweep(&channel, &table, &rounded);
    let first = table.at(short.start).unwrap();
    let (mut fine, mut coarse) =
        (Sweep::begin(&channel, &first).unwrap(), Sweep::begin(&channel, &first).unwrap());
    let mut worst = 0.0_f64;
    for tick in 1..=short.count(&table) / 4 {
        let (time, rest) = short.fine(tick);
        fine.step(&channel, &table.at_fine(time, rest).unwrap()).unwrap();
        coarse.step(&channel, &table.at(short.grid(tick)).unwrap()).unwrap();
        worst = worst.max(hertz_between(fine.end(), coarse.end(), 48_000).abs());
    }
    let noise = proven.part(ProvenPart::Arithmetic).hertz;
    assert_proven("time grid, hertz", worst, proven.part(ProvenPart::TimeGrid).hertz + noise, 0.3);

    // Word and hold: 24 bits against 63, and 63 against the table at both ends of its intervals.
    let (clock, clocks) = (10_000_000, 100_000);
    let plan = RfPlan::direct(hertz(CARRIER), hertz(clock));
    let channel = Channel::receive(&plan, clocks).unwrap();
    let ticks = ticks(&table, clock, clocks);
    let proven = Proven::of_hold(&channel, &table, &steering(ticks, CARRIER), 24, 0.0, 0.0);
    let mut coarse = Hold::<24>::begin(&channel, &first, 0).unwrap();
    let mut fine = Hold::<63>::begin(&channel, &first, 0).unwrap();
    let (mut word, mut held) = (0.0_f64, 0.0_f64);
    let mut before = channel.step(first.rapidity).unwrap();
    for tick in 1..=ticks.count(&table) {
        let (time, rest) = ticks.fine(tick);
        let motion = table.at_fine(time, rest).unwrap();
        let mean = fine.step(&channel, &motion, false).unwrap().step;
        let given = coarse.step(&channel, &motion, false).unwrap().step;
        word = word.max(hertz_between(given, mean, clock).abs());
        let after = channel.step(motion.rapidity).unwrap();
        held =
            held.max(hertz_between(mean, before, clock).abs()).max(hertz_between(mean, after, clock).abs());
        before = after;
    }
    assert_proven("word, hertz", word, proven.part(ProvenPart::Word).hertz, 0.9);
    let noise = proven.part(ProvenPart::Arithmetic).hertz;
    assert_proven("hold, hertz", held, proven.part(ProvenPart::Hold).hertz + noise, 0.9);
}

fn hold_pass<const BITS: u32>(
    name: &str,
    ticks_of: (u64, u32),
    quiet: fn(u64) -> bool,
    deadband_hertz: f64,
    longest_quiet: f64,
    stride: u64,
) -> (Seen, Proven) {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 1.0, 0.015);
    let table = flight.table();
    let (clock, clocks) = ticks_of;
    let plan = RfPlan::direct(hertz(CARRIER), hertz(clock));
    let channel = Channel::receive(&plan, clocks).unwrap();
    let ticks = ticks(&table, clock, clocks);
    let steering = steering(ticks, CARRIER);
    let proven = Proven::of_hold(&channel, &table, &steering, BITS, deadband_hertz, longest_quiet);
    let deadband = (deadband_hertz / clock as f64 * TURN) as u64;
    let hold = Hold::<BITS>::begin(&channel, &table.at(ticks.start).unwrap(), deadband).unwrap();
    let mut device = Holding { hold, oscillator: Nco::at_phase(0), quiet };
    let seen = fly(&flight, &plan, &channel, ticks, &mut device, stride);
    println!("{name}: {seen:?}");
    for part in ProvenPart::ALL {
        println!("  {:<11} {:?}", part.name(), proven.part(part));
    }
    assert_proven(&format!("{name} hertz"), seen.hertz, proven.total().hertz, 0.3);
    if proven.total().cycles.is_finite() {
        assert_proven(&format!("{name} cycles"), seen.cycles, proven.total().cycles, 0.3);
        let told = proven.part(ProvenPart::Arithmetic).cycles + proven.part(ProvenPart::Constants).cycles;
        assert!(seen.told_cycles <= told, "{name}: {} cycles off without being told", seen.told_cycles);
        assert_proven(&format!("{name} cycles against the table"), seen.own_cycles, own_phase(&proven), 0.5);
    }
    (seen, proven)
}

/// A device with 32 bits at 100 MHz, written every millisecond: 0.10 Hz proven, and 0.001 cycle of the table's
/// own phase throughout.
#[test]
fn hold_of_32_bits() {
    let (seen, proven) = hold_pass::<32>("32 bits", (100_000_000, 100_000), |_| false, 0.0, 0.0, 4999);
    assert!(proven.total().hertz <= 0.10, "{:?}", proven.total());
    assert!(seen.own_cycles < 0.001);
    assert!(seen.mean_hertz < 1e-6);
}

/// Coarse devices have the exact mean frequency: places of 95 Hz and 6 Hz, a mean off by microhertz.
#[test]
fn coarse_devices() {
    let (seen, _) = hold_pass::<20>("20 bits", (100_000_000, 1_000_000), |_| false, 0.0, 0.0, 499);
    assert!(seen.mean_hertz < 1e-3, "{}", seen.mean_hertz);
    let (seen, _) = hold_pass::<24>("24 bits", (100_000_000, 1_000_000), |_| false, 0.0, 0.0, 499);
    assert!(seen.mean_hertz < 1e-4, "{}", seen.mean_hertz);
}

/// A deadband of 20 Hz: bounded, and written a few hundred times in place of 72,000.
#[test]
fn deadband() {
    let (all, _) = hold_pass::<32>("no deadband", (10_000_000, 100_000), |_| false, 0.0, 0.0, 499);
    let (seen, proven) = hold_pass::<32>("deadband", (10_000_000, 100_000), |_| false, 20.0, 0.0, 7);
    assert!(proven.total().cycles.is_infinite());
    // The shift runs through 20.4 kHz: a retune for each 20 Hz of it.
    assert!((900..=1100).contains(&seen.retunes), "{} retunes", seen.retunes);
    assert!(all.retunes > 70_000, "{} retunes", all.retunes);
}

/// Quiet windows of 0.5 s in each second, with and without a deadband: no retune inside, the bound keeps.
#[test]
fn quiet_windows() {
    // Intervals of 10 ms: the window is ticks 50 to 99 of each hundred.
    let quiet = |tick: u64| tick % 100 >= 50;
    let (seen, _) = hold_pass::<32>("quiet", (10_000_000, 100_000), quiet, 0.0, 0.5, 1);
    assert!(seen.retunes <= 726 * 50 + 50, "{} retunes", seen.retunes);
    hold_pass::<32>("quiet with deadband", (10_000_000, 100_000), quiet, 20.0, 0.5, 1);
    // Only the coarse place: the remainder carried from before the window is in the bound.
    hold_pass::<20>("quiet and coarse", (10_000_000, 100_000), |tick| tick % 10 == 9, 0.0, 0.01, 3);
}

/// Motion of a tick.
fn motion(table: &PassTable<'_>, ticks: Ticks, tick: u64) -> Motion {
    let (time, rest) = ticks.fine(tick);
    table.at_fine(time, rest).unwrap()
}

/// A rapidity that is saturated, or beyond 2^-13, is refused: nothing changes, and from the next good motion on
/// the steering begins again where it would have been.
#[test]
fn refused_motions_change_nothing() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let channel = Channel::receive(&RfPlan::direct(hertz(CARRIER), hertz(1_000_000)), 10_000).unwrap();
    let ticks = ticks(&table, 1_000_000, 10_000);
    let first = motion(&table, ticks, 0);
    let mut sweep = Sweep::begin(&channel, &first).unwrap();
    let mut hold = Hold::<28>::begin(&channel, &first, 0).unwrap();
    for tick in 1..=100 {
        sweep.step(&channel, &motion(&table, ticks, tick)).unwrap();
        hold.step(&channel, &motion(&table, ticks, tick), false).unwrap();
    }
    let good = motion(&table, ticks, 101);
    let (sweep_before, hold_before) = (sweep, hold);
    for rapidity in [i64::MAX, i64::MIN, 1 << 47, -(1 << 47), (1 << 47) - (1 << 33)] {
        let bad = Motion { rapidity: Rapidity::from_bits(rapidity), ..good };
        assert_eq!(sweep.step(&channel, &bad), Err(TuningError::TooFast));
        assert_eq!(hold.step(&channel, &bad, false), Err(TuningError::TooFast));
        assert_eq!(Sweep::begin(&channel, &bad).err(), Some(TuningError::TooFast));
        assert_eq!(Hold::<28>::begin(&channel, &bad, 0).err(), Some(TuningError::TooFast));
    }
    let saturated = Rapidity::from_bits(i64::MAX) + good.rapidity;
    assert!(saturated.is_saturated());
    assert_eq!(channel.step(saturated), Err(TuningError::TooFast));
    assert_eq!(format!("{sweep:?} {hold:?}"), format!("{sweep_before:?} {hold_before:?}"));
    // The same motion, good, gives what it would have given without the refusals.
    let mut never_refused = (sweep_before, hold_before);
    assert_eq!(sweep.step(&channel, &good), never_refused.0.step(&channel, &good));
    assert_eq!(hold.step(&channel, &good, false), never_refused.1.step(&channel, &good, false));
    // The shift of two intervals is not put into one: begin again. The pass is still far from its closest
    // approach, the shift 10 kHz.
    let before = (sweep.end(), hold.word());
    assert_eq!(sweep.step(&channel, &motion(&table, ticks, 103)), Err(TuningError::TooFast));
    assert_eq!(hold.step(&channel, &motion(&table, ticks, 103), false), Err(TuningError::TooFast));
    assert_eq!((sweep.end(), hold.word()), before);
    let after_gap = motion(&table, ticks, 103);
    sweep = Sweep::begin(&channel, &after_gap).unwrap();
    hold = Hold::begin(&channel, &after_gap, 0).unwrap();
    assert_eq!((sweep.remainder(), hold.remainder()), (0, 0));
    for tick in 104..=120 {
        let next = motion(&table, ticks, tick);
        let own = channel.step(next.rapidity).unwrap();
        sweep.step(&channel, &next).unwrap();
        assert!(hertz_between(sweep.end(), own, 1_000_000).abs() < 0.005);
        let held = hold.step(&channel, &next, false).unwrap();
        assert!(hertz_between(held.step, own, 1_000_000).abs() < 0.01);
    }
}

/// A crystal that is measured anew in the middle of the pass: a new channel, the same steering. Ends still meet,
/// the phase goes on from where it was, and after two intervals nothing of the change is left.
#[test]
fn a_changed_crystal_keeps_the_phase() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let (clock, clocks) = (1_000_000, 10_000);
    let ticks = ticks(&table, clock, clocks);
    let conversions =
        |crystal: i64| [Conversion { frequency: hertz(436_900_000), crystal: Rapidity::from_bits(crystal) }];
    // Half a part in a billion: 0.2 Hz.
    let moved = conversions((1 << 60) / 2_000_000_000);
    let still = conversions(0);
    let plan = |conversions| RfPlan { conversions, ..RfPlan::direct(hertz(CARRIER), hertz(clock)) };
    let before = Channel::receive(&plan(&still), clocks).unwrap();
    let after = Channel::receive(&plan(&moved), clocks).unwrap();
    let apart = hertz_between(after.nominal_step(), before.nominal_step(), clock);
    assert!((apart + 436.9e6 / 2e9).abs() < 1e-6, "{apart}");
    let first = motion(&table, ticks, 0);
    let mut sweep = Sweep::begin(&before, &first).unwrap();
    let mut oscillator = Nco::at_phase(0);
    let (mut expected, mut last) = (0u64, first);
    let change_at = ticks.count(&table) / 2;
    for tick in 1..change_at + 200 {
        let channel = if tick <= change_at { &before } else { &after };
        let next = motion(&table, ticks, tick);
        let end = sweep.end();
        let swept = sweep.step(channel, &next).unwrap();
        assert_eq!(swept.start(), end);
        oscillator.retune(swept.first, swept.ramp);
        oscillator.advance(clocks.into());
        // The model: each interval's nominal step, and the table's delay.
        let cycles = -(CARRIER as f64) * (next.delay.to_bits() - last.delay.to_bits()) as f64 / 2f64.powi(56);
        expected = expected
            .wrapping_add(channel.nominal_step().to_bits().wrapping_mul(clocks.into()))
            .wrapping_add((off_whole(cycles) * TURN) as i64 as u64);
        last = next;
        let off = oscillator.phase().wrapping_sub(expected) as i64 as f64 / TURN;
        let own = hertz_between(sweep.end(), channel.step(next.rapidity).unwrap(), clock);
        let settled = tick <= change_at || tick > change_at + 2;
        let (most_cycles, most_hertz) = if settled { (2e-5, 0.003) } else { (0.003, 0.3) };
        assert!(off.abs() < most_cycles, "tick {tick}: {off} cycles");
        assert!(own.abs() < most_hertz, "tick {tick}: {own} Hz");
    }
}

/// The same table steers a symbol clock, and says when to send: at 9600 symbols/s the far end's symbols are
/// followed to a millionth of one, and sent a delay early they arrive on time.
#[test]
fn symbol_clock_and_transmit_time() {
    const SYMBOLS: u64 = 9600;
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let (clock, clocks) = (48_000, 480);
    let ticks = ticks(&table, clock, clocks);
    let plan = RfPlan::direct(hertz(SYMBOLS), hertz(clock));
    let channel = Channel::receive(&plan, clocks).unwrap();
    let mut sweep = Sweep::begin(&channel, &motion(&table, ticks, 0)).unwrap();
    let mut oscillator = Nco::at_phase(0);
    let mut worst = 0.0_f64;
    for tick in 1..=ticks.count(&table) {
        let swept = sweep.step(&channel, &motion(&table, ticks, tick)).unwrap();
        oscillator.retune(swept.first, swept.ramp);
        oscillator.advance(clocks.into());
        if tick.is_multiple_of(101) {
            let seconds = ticks.seconds(tick);
            let symbols = SYMBOLS as f64 * (seconds - flight.delay(seconds) + flight.delay(0.0));
            worst = worst.max(off_whole(oscillator.phase() as f64 / TURN - off_whole(symbols)).abs());
        }
    }
    assert!(worst < 1e-6, "{worst} symbols");
    // Timing advance: uplink, tagged at ground transmission. What leaves at t arrives at t + delay(t).
    let uplink = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
    let table = uplink.table();
    for tick in (0..ticks.count(&table)).step_by(997) {
        let advance = motion(&table, Ticks { start: table.start(), ..ticks }, tick).delay.to_bits() as f64
            / 2f64.powi(56);
        assert!((advance - uplink.delay(ticks.seconds(tick))).abs() < 0.015 / CARRIER as f64);
    }
}

/// A synthesiser that multiplies its reference: ratios and mean ratios over the pass against the reference.
#[test]
fn synthesiser_over_the_pass() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let (clock, clocks) = (26_000_000, 260_000);
    let ticks = ticks(&table, clock, clocks);
    let plan = RfPlan::direct(hertz(CARRIER), hertz(clock));
    let channel = RatioChannel::receive(&plan, clocks).unwrap();
    let place = clock as f64 / 2f64.powi(48);
    let nominal = channel.ratio(Rapidity::ZERO).unwrap().to_bits();
    let in_hertz = |bits: u64| bits.wrapping_sub(nominal) as i64 as f64 * place;
    let (mut worst, mut sum) = (0.0_f64, 0.0);
    let mut last = motion(&table, ticks, 0);
    let first = last;
    let count = ticks.count(&table);
    for tick in 1..=count {
        let next = motion(&table, ticks, tick);
        let mean = in_hertz(channel.mean_ratio(last.delay, next.delay).unwrap().to_bits());
        sum += mean * ticks.interval();
        if tick.is_multiple_of(101) {
            let ratio = in_hertz(channel.ratio(next.rapidity).unwrap().to_bits());
            let truth = CARRIER as f64 * flight.rapidity(ticks.seconds(tick)).exp_m1();
            worst = worst.max((ratio - truth).abs());
            let middle =
                CARRIER as f64 * flight.rapidity(ticks.seconds(tick) - ticks.interval() / 2.0).exp_m1();
            assert!((mean - middle).abs() < 0.004, "{mean} {middle}");
        }
        last = next;
    }
    assert!(worst < 0.0037, "{worst} Hz");
    let cycles = -(CARRIER as f64) * (last.delay.to_bits() - first.delay.to_bits()) as f64 / 2f64.powi(56);
    // Half a place of the ratio at rest and up to one rounded down at each interval, in cycles over the pass.
    let places = 1.5 * place * ticks.seconds(count);
    assert!((sum - cycles).abs() < places + 1e-6, "{} cycles, places {places}", sum - cycles);
    assert_eq!(channel.mean_ratio(Delay::from_bits(5), Delay::from_bits(5)), channel.ratio(Rapidity::ZERO));
}
