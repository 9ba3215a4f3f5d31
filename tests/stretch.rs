//! A whole pass steered by stretches laid ahead, beside the table that they are laid from and the reference.

mod passes;
mod reference;
mod steered;

use shiftkeel::frequency::PhaseStep;
use shiftkeel::nco::Nco;
use shiftkeel::pass::{Direction, TableError};
use shiftkeel::rapidity::{Motion, Rapidity};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{
    Channel, Conversion, Injection, Permission, Proven, ProvenPart, RfPlan, Steering, Stretch, StretchError,
    Stride, Sweep, TuningError,
};
use steered::{Flight, TURN, Ticks, assert_proven, hertz, hertz_between, off_whole};

const CARRIER: u64 = 437_000_000;

/// The interval in 2^-58 s.
fn interval(ticks: Ticks) -> u64 {
    let clock = u128::from(ticks.clock);
    (((u128::from(ticks.clocks) << 58) + clock / 2) / clock) as u64
}

/// First and last tick of a stretch.
fn ends(ticks: Ticks, tick: u64, stride: &Stride) -> [(GpsTime, u32); 2] {
    [ticks.fine(tick), ticks.fine(tick + u64::from(stride.ticks()))]
}

fn seconds(motion: &Motion) -> f64 {
    motion.delay.to_bits() as f64 / 2f64.powi(56)
}

#[derive(Debug, Default)]
struct Seen {
    hertz: f64,
    cycles: f64,
    /// Phase at the ends of stretches against the table's own.
    own_cycles: f64,
    /// Slope told against the table's, as hertz; rate, as hertz per second; delay, as cycles.
    told_hertz: f64,
    told_rate: f64,
    told_cycles: f64,
}

/// Flies the pass by stretches as long as fit, the reference asked in every `stride`th interval, and holds all
/// against the proof.
fn fly<const RADIATES: bool>(
    name: &str,
    flight: &Flight,
    plan: &RfPlan<'_>,
    channel: &Channel<RADIATES>,
    (clock, clocks): (u64, u32),
    log_ticks: u8,
    every: u64,
) -> (Seen, Proven) {
    let table = flight.table();
    let ticks = Ticks { start: table.start(), clock, clocks };
    let carrier = plan.carrier.as_hertz_f64();
    let mirror = if plan.injection == Injection::HighSide { -1.0 } else { 1.0 };
    // A receiver's phase falls with the delay, a transmitter's rises.
    let sense = if RADIATES { mirror } else { -mirror };
    let stride = Stride::new(interval(ticks), log_ticks).unwrap();
    let nominal = channel.nominal_step();
    let gained =
        |phase: u64, clocks: u64| phase.wrapping_sub(nominal.to_bits().wrapping_mul(clocks)) as f64 / TURN;
    let lay = |tick: u64| Stretch::lay(&table, channel, &stride, ends(ticks, tick, &stride));
    let mut stretch = lay(0).unwrap();
    let first = stretch.motion();
    let mut sweep = Sweep::begin(channel, &first).unwrap();
    let mut oscillator = Nco::at_phase(0);
    let mut seen = Seen::default();
    let mut tick = 0;
    loop {
        let end = sweep.end();
        let (motion, swept) = match stretch.tick(&mut sweep, channel) {
            Ok(steered) => steered,
            Err(error) => {
                assert_eq!((error, stretch.left()), (TuningError::UsedUp, 0));
                match lay(tick) {
                    Ok(next) => stretch.go_on(&next).unwrap(),
                    Err(error) => {
                        assert_eq!(error, StretchError::Table(TableError::After), "{name}");
                        break;
                    }
                }
                continue;
            }
        };
        assert_eq!(swept.start(), end, "{name}: ends must meet");
        oscillator.retune(swept.first, swept.ramp);
        let change = swept.change(clocks);
        assert_eq!(swept.start().to_bits().wrapping_add_signed(change), sweep.end().to_bits());
        if tick.is_multiple_of(every) {
            for quarter in 0..=4 {
                let part = f64::from(quarter) / 4.0;
                let at = ticks.seconds(tick) + part * ticks.interval();
                let step = swept.start().to_bits().wrapping_add_signed((change as f64 * part) as i64);
                let rapidity = flight.rapidity(at);
                let truth = mirror * carrier * (if RADIATES { -rapidity } else { rapidity }).exp_m1();
                let off = hertz_between(PhaseStep::from_bits(step), nominal, clock) - truth;
                seen.hertz = seen.hertz.max(off.abs());
                let mut ahead = oscillator;
                let whole = (part * f64::from(clocks)) as u64;
                ahead.advance(whole);
                let at = ticks.seconds(tick) + whole as f64 / clock as f64;
                let truth = sense * carrier * (flight.delay(at) - seconds(&first));
                let off = off_whole(gained(ahead.phase(), tick * u64::from(clocks) + whole) - truth);
                seen.cycles = seen.cycles.max(off.abs());
            }
        }
        oscillator.advance(clocks.into());
        tick += 1;
        let (time, rest) = ticks.fine(tick);
        let own = table.at_fine(time, rest).unwrap();
        let told = motion.rapidity.to_bits() - own.rapidity.to_bits();
        seen.told_hertz = seen.told_hertz.max(told.abs() as f64 / 2f64.powi(60) * carrier);
        let told = motion.rate.to_bits() - own.rate.to_bits();
        seen.told_rate = seen.told_rate.max(told.abs() as f64 / 2f64.powi(60) * carrier);
        seen.told_cycles = seen.told_cycles.max((seconds(&motion) - seconds(&own)).abs() * carrier);
        if stretch.left() == 0 {
            let truth = sense * carrier * (seconds(&own) - seconds(&first));
            let off = off_whole(gained(oscillator.phase(), tick * u64::from(clocks)) - truth);
            seen.own_cycles = seen.own_cycles.max(off.abs());
        }
    }
    // All but what is shorter than a stretch was flown.
    assert!(tick + u64::from(stride.ticks()) > ticks.count(&table), "{name}: {tick} ticks");
    let steering = Steering { carrier, clock: clock as f64, clocks, time_error: 0.0 };
    let proven = Proven::of_stretch(channel, &table, &steering, stride.ticks());
    println!("{name}: {seen:?}");
    for part in ProvenPart::ALL {
        println!("  {:<11} {:?}", part.name(), proven.part(part));
    }
    // What is told is off from the table's by what the quartic misses, the proof's addition to the table's part, and
    // by both roundings. The rate has no proof: some millihertz per second at 437 MHz.
    let by_table = Proven::of_sweep(channel, &table, &steering).part(ProvenPart::Table);
    let added = proven.part(ProvenPart::Table).hertz - by_table.hertz;
    let rounding = f64::from(table.rapidity_noise()) / 2f64.powi(60) * carrier;
    assert!(
        seen.told_hertz <= added + rounding + proven.part(ProvenPart::Arithmetic).hertz,
        "{name}: rapidity"
    );
    let added = proven.part(ProvenPart::Table).cycles - by_table.cycles;
    assert!(seen.told_cycles <= added + proven.part(ProvenPart::Arithmetic).cycles, "{name}: delay");
    assert!(seen.told_rate < 0.02 * carrier / 437e6, "{name}: rate");
    let total = proven.total();
    assert_proven(&format!("{name} hertz"), seen.hertz, total.hertz, 0.3);
    assert_proven(&format!("{name} cycles"), seen.cycles, total.cycles, 0.3);
    // Where stretches meet the phase is the table's, less what the sweep carries into the next interval.
    // The f64s above tell 2^-30 cycle of the millions of a pass.
    let own =
        proven.part(ProvenPart::Ramp).cycles + proven.part(ProvenPart::Constants).cycles + 2f64.powi(-30);
    assert_proven(&format!("{name} cycles against the table"), seen.own_cycles, own, 0.3);
    (seen, proven)
}

/// A software oscillator at 48 kHz, steered every 10 ms.
#[test]
fn stretches_at_48_khz() {
    for (millihertz, cycles, log_ticks) in
        [(10.0, 0.015, 7), (10.0, 0.015, 8), (10.0, 0.015, 6), (1.0, 0.002, 7)]
    {
        let flight = Flight::baked(Direction::Down, CARRIER as f64, millihertz, cycles);
        let plan = RfPlan::direct(hertz(CARRIER), hertz(48_000));
        let channel = Channel::receive(&plan, 480).unwrap();
        let name = format!("48 kHz, 10 ms, {millihertz} mHz, 2^{log_ticks} ticks");
        let (_, proven) = fly(&name, &flight, &plan, &channel, (48_000, 480), log_ticks, 31);
        assert!(proven.total().hertz <= 0.011 && proven.total().cycles <= 0.02, "{:?}", proven.total());
    }
}

/// The same from 1 ms to 100 ms, other clocks and carriers.
#[test]
fn stretches_at_other_rates() {
    for (carrier, clock, clocks, log_ticks, every) in [
        (437_000_000, 250_000, 250, 8, 997),
        (437_000_000, 48_000, 4_800, 4, 7),
        (145_900_000, 8_000, 800, 4, 17),
        (8_400_000_000, 1_000_000, 10_000, 7, 31),
        (2_200_000_000, 100_000_000, 50_000_000, 2, 1),
    ] {
        let flight = Flight::baked(Direction::Down, carrier as f64, carrier as f64 / 4.37e7, 0.02);
        let plan = RfPlan::direct(hertz(carrier), hertz(clock));
        let channel = Channel::receive(&plan, clocks).unwrap();
        let name = format!("{carrier} Hz at {clock} Hz, {clocks} clocks, 2^{log_ticks} ticks");
        fly(&name, &flight, &plan, &channel, (clock, clocks), log_ticks, every);
    }
}

/// Uplink tagged at ground transmission with its permission, and two-way; both injection sides.
#[test]
fn stretches_of_transmitter_and_mirror() {
    let conversions = [Conversion { frequency: hertz(436_900_000), crystal: Rapidity::ZERO }];
    let permission = Permission::to_radiate(hertz(436_985_000), hertz(437_015_000)).unwrap();
    for injection in [Injection::LowSide, Injection::HighSide] {
        let plan = RfPlan {
            conversions: &conversions,
            injection,
            ..RfPlan::direct(hertz(CARRIER), hertz(1_000_000))
        };
        let flight = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
        let channel = Channel::transmit(&plan, 10_000, &permission).unwrap();
        let name = format!("transmit {injection:?}");
        fly(&name, &flight, &plan, &channel, (1_000_000, 10_000), 7, 61);
        let flight = Flight::baked(Direction::TwoWay, CARRIER as f64, 10.0, 0.015);
        let channel = Channel::receive(&plan, 10_000).unwrap();
        fly(&format!("two-way {injection:?}"), &flight, &plan, &channel, (1_000_000, 10_000), 7, 61);
    }
}

/// Where the table's segments meet within a stretch, the steps stay within what the proof adds to the table's part.
#[test]
fn a_joint_within_a_stretch() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let channel = Channel::receive(&RfPlan::direct(hertz(CARRIER), hertz(48_000)), 480).unwrap();
    let stride = Stride::new((1 << 58) / 100, 7).unwrap();
    let steering = Steering { carrier: CARRIER as f64, clock: 48e3, clocks: 480, time_error: 0.0 };
    let table_part = |proven: Proven| proven.part(ProvenPart::Table).hertz;
    let added = table_part(Proven::of_stretch(&channel, &table, &steering, 128))
        - table_part(Proven::of_sweep(&channel, &table, &steering));
    // Segments begin at whole multiples of 32 s of this table; which of these are joints does not matter.
    let (mut at_joints, mut elsewhere) = (0.0_f64, 0.0_f64);
    for part in 0..200_u64 {
        let joint = 3200 * (1 + part / 10);
        let begin = joint - 13 * (part % 10) - 1;
        for (begin, worst) in [(begin, &mut at_joints), (begin + 1600, &mut elsewhere)] {
            let ticks = Ticks { start: table.start(), clock: 48_000, clocks: 480 };
            let mut stretch = Stretch::lay(&table, &channel, &stride, ends(ticks, begin, &stride)).unwrap();
            let mut sweep = Sweep::begin(&channel, &stretch.motion()).unwrap();
            for tick in 1..=128 {
                stretch.tick(&mut sweep, &channel).unwrap();
                let (time, rest) = ticks.fine(begin + tick);
                let own = channel.step(table.at_fine(time, rest).unwrap().rapidity).unwrap();
                *worst = worst.max(hertz_between(sweep.end(), own, 48_000).abs());
            }
        }
    }
    // What the table's own rapidity is off by is no part of this.
    let rapidity = f64::from(table.rapidity_noise()) / 2f64.powi(60) * CARRIER as f64;
    assert_proven("joint, hertz", at_joints, added + rapidity, 0.3);
    assert!(elsewhere < 0.3 * at_joints, "{elsewhere} {at_joints}");
}

struct Ready {
    flight: Flight,
    channel: Channel<false>,
    stride: Stride,
}

impl Ready {
    fn new() -> Self {
        Self {
            flight: Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015),
            channel: Channel::receive(&RfPlan::direct(hertz(CARRIER), hertz(48_000)), 480).unwrap(),
            stride: Stride::new((1 << 58) / 100, 6).unwrap(),
        }
    }
    fn ticks(&self) -> Ticks {
        Ticks { start: self.flight.table().start(), clock: 48_000, clocks: 480 }
    }
    fn lay(&self, tick: u64) -> Result<Stretch<false>, StretchError> {
        Stretch::lay(
            &self.flight.table(),
            &self.channel,
            &self.stride,
            ends(self.ticks(), tick, &self.stride),
        )
    }
    fn motion(&self, tick: u64) -> Motion {
        let (time, rest) = self.ticks().fine(tick);
        self.flight.table().at_fine(time, rest).unwrap()
    }
}

/// A stretch with no tick left refuses and changes nothing; one for another instant is not taken; from the last tick the
/// table goes on, tick by tick, as if it had always.
#[test]
fn a_stretch_is_used_up() {
    let ready = Ready::new();
    let mut stretch = ready.lay(1000).unwrap();
    let mut sweep = Sweep::begin(&ready.channel, &ready.motion(1000)).unwrap();
    let mut by_table = sweep;
    for tick in 1..=64 {
        assert_eq!(u64::from(stretch.left()), 65 - tick);
        stretch.tick(&mut sweep, &ready.channel).unwrap();
        by_table.step(&ready.channel, &ready.motion(1000 + tick)).unwrap();
    }
    let before = format!("{stretch:?} {sweep:?}");
    for _ in 0..3 {
        assert_eq!(stretch.tick(&mut sweep, &ready.channel), Err(TuningError::UsedUp));
    }
    for wrong in [1063, 1065, 1000, 40_000] {
        assert_eq!(stretch.go_on(&ready.lay(wrong).unwrap()), Err(TuningError::TooFast), "{wrong}");
    }
    assert_eq!(format!("{stretch:?} {sweep:?}"), before);
    // Without being told where the stretch ended the sweep refuses: the shift of 64 intervals in one.
    let mut untold = sweep;
    assert_eq!(untold.step(&ready.channel, &ready.motion(1065)), Err(TuningError::TooFast));
    sweep.resume(&ready.channel, &stretch.motion());
    for tick in 1065..1070 {
        sweep.step(&ready.channel, &ready.motion(tick)).unwrap();
        by_table.step(&ready.channel, &ready.motion(tick)).unwrap();
        let off = hertz_between(sweep.end(), by_table.end(), 48_000);
        assert!(off.abs() < 0.001, "{off} Hz");
    }
    let mut next = ready.lay(1064).unwrap();
    stretch.go_on(&next).unwrap();
    assert_eq!(stretch.motion(), next.motion());
    let mut same = sweep;
    assert_eq!(stretch.tick(&mut sweep, &ready.channel), next.tick(&mut same, &ready.channel));
}

/// Instants and tables that do not fit are refused, and say why.
#[test]
fn stretches_that_are_not_laid() {
    let ready = Ready::new();
    let table = ready.flight.table();
    let count = ready.ticks().count(&table);
    assert!(ready.lay(count - 64).is_ok());
    assert_eq!(ready.lay(count - 63).err(), Some(StretchError::Table(TableError::After)));
    let early = Ticks { start: GpsTime::from_bits(table.start().to_bits() - 1), ..ready.ticks() };
    let laid = Stretch::lay(&table, &ready.channel, &ready.stride, ends(early, 0, &ready.stride));
    assert_eq!(laid.err(), Some(StretchError::Table(TableError::Before)));
    // The ends are not 64 ticks apart: one short, or turned round.
    let [from, to] = ends(ready.ticks(), 100, &ready.stride);
    for wrong in [[from, ready.ticks().fine(163)], [to, from], [from, from]] {
        let laid = Stretch::lay(&table, &ready.channel, &ready.stride, wrong);
        assert_eq!(laid.err(), Some(StretchError::StrideNotUsable));
    }
    for (interval, log_ticks) in [(0, 6), (1, 6), (60 << 58, 6), (u64::MAX, 6), (1 << 51, 1), (1 << 51, 9)] {
        assert_eq!(Stride::new(interval, log_ticks), Err(StretchError::StrideNotUsable));
    }
    // Of the other end's time.
    let uplink = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
    let [from, to] = ends(Ticks { start: uplink.table().start(), ..ready.ticks() }, 0, &ready.stride);
    let laid = Stretch::lay(&uplink.table(), &ready.channel, &ready.stride, [from, to]);
    assert_eq!(laid.err(), Some(StretchError::OtherEnd));
    let permission = Permission::to_radiate(hertz(436_000_000), hertz(438_000_000)).unwrap();
    let plan = RfPlan::direct(hertz(CARRIER), hertz(10_000_000));
    let transmitter = Channel::transmit(&plan, 100_000, &permission).unwrap();
    let laid = Stretch::lay(&table, &transmitter, &ready.stride, ends(ready.ticks(), 0, &ready.stride));
    assert_eq!(laid.err(), Some(StretchError::OtherEnd));
    // 40 s: the delay changes by more than 0.49 ms, which no quartic follows.
    let long = Stride::new((1 << 58) / 100 * 16, 8).unwrap();
    let slow = Ticks { clocks: 7680, ..ready.ticks() };
    let laid = Stretch::lay(&table, &ready.channel, &long, ends(slow, 0, &long));
    assert_eq!(laid.err(), Some(StretchError::TooFast));
}

/// A transmitter is held to its band at every tick: refused, the sweep is as before, the stretch goes on with the time, and
/// once the emission is inside again the steering begins again.
#[test]
fn a_fence_within_a_stretch() {
    let flight = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let ticks = Ticks { start: table.start(), clock: 1_000_000, clocks: 10_000 };
    let stride = Stride::new((1 << 58) / 100, 8).unwrap();
    // The emission rises through the closest approach: find a stretch, and a fence in its middle.
    let begin = ticks.count(&table) / 2;
    let at = |tick: u64| table.at_fine(ticks.fine(tick).0, ticks.fine(tick).1).unwrap().rapidity;
    let emitted = |tick: u64| CARRIER as f64 * (-(at(tick).to_bits() as f64) / 2f64.powi(60)).exp();
    assert!(emitted(begin + 200) > emitted(begin) + 10.0);
    let lowest = emitted(begin + 100).ceil() as u64;
    let permission = Permission::to_radiate(hertz(lowest.min(CARRIER)), hertz(437_015_000)).unwrap();
    let plan = RfPlan::direct(hertz(CARRIER), hertz(1_000_000));
    let open = Permission::to_radiate(hertz(436_985_000), hertz(437_015_000)).unwrap();
    let free = Channel::transmit(&plan, 10_000, &open).unwrap();
    let Ok(fenced) = Channel::transmit(&plan, 10_000, &permission) else { panic!("the carrier is inside") };
    let mut stretch = Stretch::lay(&table, &fenced, &stride, ends(ticks, begin, &stride)).unwrap();
    let mut sweep = Sweep::begin(&free, &stretch.motion()).unwrap();
    let before = format!("{sweep:?}");
    let mut inside = 0;
    for tick in 1..=256 {
        match stretch.tick(&mut sweep, &fenced) {
            Err(TuningError::OutsideFence { hertz }) => {
                assert_eq!(format!("{sweep:?}"), before);
                // The sweep still stands where it began.
                assert!((f64::from(hertz) - (lowest as f64 - emitted(begin))).abs() < 2.0, "{hertz} Hz");
                assert!(emitted(begin + tick - 1) < lowest as f64 + 1.0);
                if let Ok(begun) = Sweep::begin(&fenced, &stretch.motion()) {
                    sweep = begun;
                }
            }
            Err(error) => panic!("{error}"),
            Ok(_) => {
                assert!(emitted(begin + tick) >= lowest as f64);
                inside += 1;
            }
        }
        assert_eq!(u64::from(stretch.left()), 256 - tick);
    }
    assert!((100..=160).contains(&inside), "{inside} ticks inside");
}
