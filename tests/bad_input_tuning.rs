//! What tuning refuses, what it says, and what firmware goes on with: plans, permissions, tables, time.

mod passes;
mod reference;
mod steered;

use fixed::types::{I16F16, I32F32};
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::pass::bake::{BakeSettings, bake};
use shiftkeel::pass::{Direction, TableError, TaggedAt};
use shiftkeel::rapidity::{Delay, Motion, Rapidity};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{
    Channel, Conversion, Hold, Injection, Permission, RatioChannel, RfPlan, Sweep, Translation, TuningError,
};
use steered::{Flight, TURN, Ticks, hertz, hertz_between};

const CARRIER: u64 = 437_000_000;

fn refused(plan: &RfPlan<'_>, clocks: u32) -> Option<TuningError> {
    let error = Channel::receive(plan, clocks).err();
    let ratio = RatioChannel::receive(plan, clocks).err();
    assert_eq!(error, ratio, "a synthesiser refuses the same plans");
    if let Some(error) = error {
        assert!(error.to_string().len() > 20, "a message that says what to do");
    }
    error
}

#[test]
fn frequencies_beyond_the_format() {
    assert_eq!(Frequency::from_hertz(1 << 40), None);
    assert_eq!(Frequency::from_millihertz_nearest(u64::MAX), None);
    let clock = hertz(100_000_000);
    assert_eq!(
        refused(&RfPlan::direct(Frequency::default(), clock), 1000),
        Some(TuningError::CarrierNotUsable)
    );
    // The last frequency of the format fits; a translation lifts it out, or takes a carrier to zero and below.
    let last = Frequency::from_bits(u64::MAX);
    assert!(Channel::receive(&RfPlan::direct(last, clock), 1000).is_ok());
    let translated = |carrier, frequency, downwards| RfPlan {
        translation: Some(Translation { frequency, downwards, crystal: Rapidity::ZERO }),
        ..RfPlan::direct(carrier, clock)
    };
    for (carrier, by, downwards) in [
        (last, hertz(1), false),
        (hertz(145_000_000), hertz(145_000_000), true),
        (hertz(145_000_000), hertz(435_000_000), true),
    ] {
        assert_eq!(refused(&translated(carrier, by, downwards), 1000), Some(TuningError::CarrierNotUsable));
    }
}

#[test]
fn clocks_and_intervals() {
    let carrier = hertz(CARRIER);
    assert_eq!(refused(&RfPlan::direct(carrier, Frequency::default()), 1000), Some(TuningError::ClockZero));
    let plan = RfPlan::direct(carrier, hertz(48_000));
    assert_eq!(refused(&plan, 0), Some(TuningError::IntervalNotUsable));
    assert_eq!(refused(&plan, 60 * 48_000), Some(TuningError::IntervalNotUsable));
    assert_eq!(refused(&plan, u32::MAX), Some(TuningError::IntervalNotUsable));
    assert_eq!(refused(&plan, 60 * 48_000 - 1), None);
    assert_eq!(refused(&plan, 1), None);
}

#[test]
fn crystals_beyond_976_ppm() {
    let far = Rapidity::from_parts_per_billion(I32F32::from_num(978_000)).unwrap();
    let near = Rapidity::from_parts_per_billion(I32F32::from_num(976_000)).unwrap();
    let plan = RfPlan::direct(hertz(CARRIER), hertz(1_000_000));
    for (crystal, expected) in [
        (far, Some(TuningError::CrystalTooFar)),
        (far.saturating_neg(), Some(TuningError::CrystalTooFar)),
        (Rapidity::from_bits(i64::MAX), Some(TuningError::CrystalTooFar)),
        (Rapidity::from_bits(i64::MIN), Some(TuningError::CrystalTooFar)),
        (near, None),
        (near.saturating_neg(), None),
    ] {
        assert_eq!(refused(&RfPlan { clock_crystal: crystal, ..plan }, 1000), expected);
        let conversions = [Conversion { frequency: hertz(436_000_000), crystal }];
        assert_eq!(refused(&RfPlan { conversions: &conversions, ..plan }, 1000), expected);
        let translation = Some(Translation { frequency: hertz(1000), downwards: true, crystal });
        assert_eq!(refused(&RfPlan { translation, ..plan }, 1000), expected);
    }
    // Each in range, but not their difference.
    let conversions = [Conversion { frequency: hertz(436_000_000), crystal: near }];
    let plan = RfPlan { conversions: &conversions, clock_crystal: near.saturating_neg(), ..plan };
    assert_eq!(refused(&plan, 1000), Some(TuningError::CrystalTooFar));
}

/// A synthesiser cannot make a negative frequency, nor 65536 times its reference: not at rest, and not when the
/// shift takes it there.
#[test]
fn ratios_beyond_a_synthesiser() {
    let clock = hertz(10_000_000);
    let conversions = [Conversion { frequency: hertz(436_995_000), crystal: Rapidity::ZERO }];
    let low = RfPlan { conversions: &conversions, ..RfPlan::direct(hertz(CARRIER), clock) };
    let high = RfPlan { injection: Injection::HighSide, ..low };
    assert_eq!(RatioChannel::receive(&high, 1000).err(), Some(TuningError::NegativeOutput));
    let fast = RfPlan::direct(hertz(655_360_000_000), clock);
    assert_eq!(RatioChannel::receive(&fast, 1000).err(), Some(TuningError::RatioTooHigh));
    let many = RfPlan::direct(hertz(1_000_000_000_000), hertz(1000));
    assert_eq!(RatioChannel::receive(&many, 1000).err(), Some(TuningError::RatioTooHigh));

    // 5 kHz at rest; receding at 7 km/s the carrier is 10 kHz lower.
    let channel = RatioChannel::receive(&low, 10_000).unwrap();
    let receding = Rapidity::from_range_rate(I16F16::from_num(7000));
    assert_eq!(channel.ratio(receding), Err(TuningError::NegativeOutput));
    assert!(channel.ratio(receding.saturating_neg()).is_ok());
    let later = |seconds: f64| Delay::from_bits((seconds * 2f64.powi(56)) as i64);
    assert_eq!(channel.mean_ratio(later(0.0), later(1e-3 * 2.3e-5)), Err(TuningError::NegativeOutput));
    assert!(channel.mean_ratio(later(1e-3 * 2.3e-5), later(0.0)).is_ok());
    assert_eq!(channel.ratio(Rapidity::from_bits(i64::MIN)), Err(TuningError::TooFast));
    // Just below the end of the format, approaching.
    let channel = RatioChannel::receive(&RfPlan::direct(hertz(655_359_000_000), clock), 10_000).unwrap();
    assert_eq!(channel.ratio(receding.saturating_neg()), Err(TuningError::RatioTooHigh));
    assert!(channel.ratio(receding).is_ok());
    // A phase accumulator takes the negative frequency.
    assert!(Channel::receive(&high, 1000).is_ok());
}

/// A permission is a band; an edge half the clock away from the carrier or further could not be told from its
/// alias; a carrier outside is refused by how far.
#[test]
fn permissions() {
    let allow = |low, high| Permission::to_radiate(hertz(low), hertz(high));
    assert_eq!(allow(438_000_000, 437_000_000), Err(TuningError::FenceNotUsable));
    let one = allow(CARRIER, CARRIER).unwrap();
    assert_eq!((one.lowest(), one.highest()), (hertz(CARRIER), hertz(CARRIER)));
    let plan = RfPlan::direct(hertz(CARRIER), hertz(48_000));
    let transmit = |low, high| Channel::transmit(&plan, 480, &allow(low, high).unwrap()).err();
    assert_eq!(transmit(CARRIER - 23_999, CARRIER + 23_999), None);
    assert_eq!(transmit(CARRIER - 24_000, CARRIER + 10), Some(TuningError::FenceNotUsable));
    assert_eq!(transmit(CARRIER - 10, CARRIER + 24_000), Some(TuningError::FenceNotUsable));
    assert_eq!(transmit(435_000_000, 436_999_990), Some(TuningError::OutsideFence { hertz: 11 }));
    assert_eq!(transmit(CARRIER + 7, 438_000_000), Some(TuningError::OutsideFence { hertz: 8 }));
    assert_eq!(transmit(144_000_000, 146_000_000), Some(TuningError::OutsideFence { hertz: 291_000_001 }));
    // Hertz that no u32 holds.
    let far = allow(900_000_000_000, 900_000_000_001).unwrap();
    assert_eq!(
        Channel::transmit(&plan, 480, &far).err(),
        Some(TuningError::OutsideFence { hertz: u32::MAX })
    );
    assert!(TuningError::OutsideFence { hertz: 11 }.to_string().contains("11 Hz"));
    // Only the carrier itself: the step at rest is allowed, one hertz of shift is not.
    let channel = Channel::transmit(&plan, 480, &one).unwrap();
    assert!(channel.step(Rapidity::ZERO).is_ok());
    for shift in [3, -3] {
        let rapidity = Rapidity::from_parts_per_billion(I32F32::from_num(shift)).unwrap();
        assert_eq!(channel.step(rapidity), Err(TuningError::OutsideFence { hertz: 2 }));
    }
}

/// The fence is held at every retune, whatever the clock, the injection side and the clock's crystal: what is
/// radiated stays inside, what is refused would have been outside, and the hertz are the true ones rounded up.
#[test]
fn fence_on_the_emission() {
    let far = Rapidity::from_parts_per_billion(I32F32::from_num(900_000)).unwrap();
    let (mut radiated, mut refused) = (0, 0);
    for clock in [30_011, 1_000_003, 100_000_000, 9_000_000_000] {
        for injection in [Injection::LowSide, Injection::HighSide] {
            for crystal in [Rapidity::ZERO, far, far.saturating_neg()] {
                // One crystal for clock and conversion, so that nothing else moves.
                let conversions = [Conversion { frequency: hertz(436_900_000), crystal }];
                let plan = RfPlan {
                    conversions: &conversions,
                    injection,
                    clock_crystal: crystal,
                    ..RfPlan::direct(hertz(CARRIER), hertz(clock))
                };
                let (low, high) = (436_993_000.0, 437_004_000.0);
                let permission = Permission::to_radiate(hertz(low as u64), hertz(high as u64)).unwrap();
                let channel = Channel::transmit(&plan, 1000, &permission).unwrap();
                let receiver = Channel::receive(&plan, 1000).unwrap();
                let true_clock = clock as f64 * (crystal.to_bits() as f64 / 2f64.powi(60)).exp();
                let sign = if injection == Injection::LowSide { 1.0 } else { -1.0 };
                for ppb in (-30_000..30_000).step_by(37) {
                    let rapidity = Rapidity::from_parts_per_billion(I32F32::from_num(ppb)).unwrap();
                    let emitted = CARRIER as f64 * (-rapidity.to_bits() as f64 / 2f64.powi(60)).exp();
                    match channel.step(rapidity) {
                        Ok(step) => {
                            assert!(emitted > low - 1e-3 && emitted < high + 1e-3, "{emitted}");
                            let away = step.to_bits().wrapping_sub(channel.nominal_step().to_bits()) as i64;
                            let radiates = CARRIER as f64 + sign * away as f64 / TURN * true_clock;
                            assert!((radiates - emitted).abs() < 1e-3, "{radiates} {emitted}");
                            radiated += 1;
                        }
                        Err(TuningError::OutsideFence { hertz }) => {
                            let beyond = (low - emitted).max(emitted - high);
                            assert!(beyond > -1e-3, "{emitted} is inside");
                            // Rounded up, in hertz of the nominal clock: a crystal 900 ppm off moves it as much.
                            let crystals = if crystal == Rapidity::ZERO { 0.0 } else { 1e-3 * beyond };
                            let more = f64::from(hertz) - beyond;
                            assert!((-1e-3 - crystals..=4.2 + crystals).contains(&more), "{hertz} {beyond}");
                            refused += 1;
                        }
                        Err(other) => panic!("{other}"),
                    }
                    assert!(receiver.step(rapidity).is_ok(), "a receiver has no fence");
                    let rate = I16F16::from_num(-f64::from(ppb) * 0.299_792_458);
                    let by_rate = channel.step_for_range_rate(rate);
                    let inside = emitted > low + 0.1 && emitted < high - 0.1;
                    let outside = emitted < low - 0.1 || emitted > high + 0.1;
                    assert!(if by_rate.is_ok() { !outside } else { !inside });
                }
            }
        }
    }
    assert!(radiated > 10_000 && refused > 10_000, "{radiated} {refused}");
}

/// A transmitter over the pass with too narrow a band: radiates only inside, says by how much it would be
/// outside, and takes the steering up again where the band allows it.
#[test]
fn transmitter_leaves_and_enters_its_band() {
    let flight = Flight::baked(Direction::Up, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let (clock, clocks) = (1_000_000, 10_000);
    let ticks = Ticks { start: table.start(), clock, clocks };
    for injection in [Injection::LowSide, Injection::HighSide] {
        let plan = RfPlan { injection, ..RfPlan::direct(hertz(CARRIER), hertz(clock)) };
        let permission = Permission::to_radiate(hertz(CARRIER - 6000), hertz(CARRIER + 5000)).unwrap();
        let channel = Channel::transmit(&plan, clocks, &permission).unwrap();
        let sign = if injection == Injection::LowSide { 1.0 } else { -1.0 };
        let away = |step: PhaseStep| sign * hertz_between(step, channel.nominal_step(), clock);
        let motion = |tick| {
            let (time, rest) = ticks.fine(tick);
            table.at_fine(time, rest).unwrap()
        };
        let mut sweep: Option<(Sweep, Hold<32>)> = None;
        let (mut on_air, mut silent) = (0, 0);
        for tick in 0..=ticks.count(&table) {
            let motion = motion(tick);
            let wanted = CARRIER as f64 * (-(motion.rapidity.to_bits() as f64) / 2f64.powi(60)).exp_m1();
            let outcome = match &mut sweep {
                Some((sweep, hold)) => hold.step(&channel, &motion, false).and_then(|held| {
                    assert!((-6000.0..=5000.0).contains(&away(held.step)));
                    sweep.step(&channel, &motion)?;
                    Ok(())
                }),
                None => Sweep::begin(&channel, &motion).and_then(|fresh| {
                    sweep = Some((fresh, Hold::begin(&channel, &motion, 0)?));
                    Ok(())
                }),
            };
            match outcome {
                Ok(()) => {
                    assert!((-6000.01..=5000.01).contains(&wanted), "{wanted}");
                    assert!((-6000.0..=5000.0).contains(&away(sweep.unwrap().0.end())));
                    on_air += 1;
                }
                Err(TuningError::OutsideFence { hertz }) => {
                    let beyond = (-6000.0 - wanted).max(wanted - 5000.0);
                    // The word for the middle of an interval may be half of one's drift, 1 Hz, behind.
                    assert!((beyond - f64::from(hertz)).abs() < 2.5, "{beyond} {hertz}");
                    sweep = None;
                    silent += 1;
                }
                Err(other) => panic!("{other}"),
            }
        }
        assert!(on_air > 5000 && silent > 50_000, "{on_air} {silent}");
    }
}

/// A fence that a new channel brings counts for the step at which the interval starts, too.
#[test]
fn a_narrowed_fence_counts_at_once() {
    let plan = RfPlan::direct(hertz(CARRIER), hertz(1_000_000));
    let allow = |high| Permission::to_radiate(hertz(CARRIER - 20_000), hertz(high)).unwrap();
    let wide = Channel::transmit(&plan, 1000, &allow(CARRIER + 20_000)).unwrap();
    let narrow = Channel::transmit(&plan, 1000, &allow(CARRIER + 4000)).unwrap();
    let at = |ppb: i32| Motion {
        rapidity: Rapidity::from_parts_per_billion(I32F32::from_num(ppb)).unwrap(),
        ..Motion::default()
    };
    // 10 ppm receding: sent 4370 Hz higher.
    let mut sweep = Sweep::begin(&wide, &at(-10_000)).unwrap();
    let before = sweep.end();
    let next = Motion { delay: Delay::from_bits((1e-8 * 2f64.powi(56)) as i64), ..at(-10_000) };
    assert!(sweep.clone().step(&wide, &next).is_ok());
    assert!(matches!(sweep.step(&narrow, &next), Err(TuningError::OutsideFence { hertz: 370..=372 })));
    assert_eq!(sweep.end(), before);
    // The start alone is outside, by 1 Hz; the end is inside by as much.
    let between = Channel::transmit(&plan, 1000, &allow(CARRIER + 4369)).unwrap();
    let slower = Motion { delay: Delay::from_bits((9.998e-9 * 2f64.powi(56)) as i64), ..at(-9996) };
    assert!(between.step(slower.rapidity).is_ok());
    assert!(matches!(sweep.step(&between, &slower), Err(TuningError::OutsideFence { hertz: 2..=3 })));
    assert_eq!(sweep.end(), before);
    assert!(sweep.step(&wide, &slower).is_ok());
    // The motion's own step at the end is inside, but the end that meets the phase would lie outside; one that
    // does not is radiated.
    let after = |seconds: f64| Motion { delay: Delay::from_bits((seconds * 2f64.powi(56)) as i64), ..slower };
    assert!(matches!(
        sweep.step(&between, &after(9.998e-9 + 9.998e-9)),
        Err(TuningError::OutsideFence { hertz: 1..=2 })
    ));
    assert!(sweep.step(&between, &after(9.998e-9 + 9.996e-9)).is_ok());
    let mut hold = Hold::<32>::begin(&wide, &at(-10_000), 0).unwrap();
    assert!(matches!(hold.step(&narrow, &next, false), Err(TuningError::OutsideFence { .. })));
    assert!(matches!(hold.step(&narrow, &next, true), Err(TuningError::OutsideFence { .. })));
}

/// A table of another epoch answers Before or After; the oscillator goes on with its last good word, and begins
/// again when the right table is there. So it is with a tick that comes a second time, or goes backwards.
#[test]
fn wrong_table_and_wrong_time() {
    let flight = Flight::baked(Direction::Down, CARRIER as f64, 10.0, 0.015);
    let table = flight.table();
    let channel = Channel::receive(&RfPlan::direct(hertz(CARRIER), hertz(1_000_000)), 10_000).unwrap();
    let ticks = Ticks { start: table.start(), clock: 1_000_000, clocks: 10_000 };
    let motion = |tick| {
        let (time, rest) = ticks.fine(tick);
        table.at_fine(time, rest)
    };
    let day = table.start().plus_seconds(86_400.0);
    assert_eq!(table.at(day), Err(TableError::After));
    assert_eq!(table.at(table.start().plus_seconds(-86_400.0)), Err(TableError::Before));
    assert_eq!(table.at(table.start().plus_seconds(-1e-9)), Err(TableError::Before));

    // The loop of a firmware: begin when there is a motion, step while there is, else keep the word.
    let mut hold: Option<Hold<32>> = None;
    let mut word = None;
    let mut kept = 0;
    for tick in 0..400 {
        // Between ticks 100 and 200 the clock is a day off.
        let asked = if (100..200).contains(&tick) { table.at(day) } else { motion(tick) };
        hold = match (asked, hold) {
            (Ok(motion), Some(mut running)) => {
                word = Some(running.step(&channel, &motion, false).unwrap().word);
                Some(running)
            }
            (Ok(motion), None) => {
                let fresh = Hold::begin(&channel, &motion, 0).unwrap();
                word = Some(fresh.word());
                Some(fresh)
            }
            (Err(error), _) => {
                assert_eq!(error, TableError::After);
                kept += 1;
                None
            }
        };
        let shown = PhaseStep::from_word::<32>(word.unwrap());
        let last_good = if (100..200).contains(&tick) { 99 } else { tick };
        let own = channel.step(motion(last_good).unwrap().rapidity).unwrap();
        assert!(hertz_between(shown, own, 1_000_000).abs() < 0.01, "tick {tick}");
    }
    assert_eq!(kept, 100);

    // A tick twice: no time has passed for the table, and its delay alone would ask for the step at rest, 10 kHz
    // away.
    let mut sweep = Sweep::begin(&channel, &motion(10).unwrap()).unwrap();
    sweep.step(&channel, &motion(11).unwrap()).unwrap();
    let end = sweep.end();
    assert_eq!(sweep.step(&channel, &motion(11).unwrap()), Err(TuningError::TooFast));
    assert_eq!(sweep.step(&channel, &motion(10).unwrap()), Err(TuningError::TooFast));
    assert_eq!(sweep.end(), end);
    assert!(sweep.step(&channel, &motion(12).unwrap()).is_ok());
    // And so does a device that holds its word; it neither doubles the shift after a missed tick nor drops it.
    let mut hold = Hold::<32>::begin(&channel, &motion(10).unwrap(), 0).unwrap();
    hold.step(&channel, &motion(11).unwrap(), false).unwrap();
    let word = hold.word();
    for tick in [11, 10, 13, 20] {
        for quiet in [false, true] {
            assert_eq!(hold.step(&channel, &motion(tick).unwrap(), quiet), Err(TuningError::TooFast));
        }
    }
    assert_eq!(hold.word(), word);
    assert!(hold.step(&channel, &motion(12).unwrap(), false).is_ok());
}

/// A table belongs to one end of the signal: a receiver is asked with the time of reception, a transmitter with that
/// of transmission.
#[test]
fn tables_of_the_other_end() {
    let plan = RfPlan::direct(hertz(CARRIER), hertz(1_000_000));
    let receiver = Channel::receive(&plan, 10_000).unwrap();
    let synthesiser = RatioChannel::receive(&plan, 10_000).unwrap();
    let permission = Permission::to_radiate(hertz(CARRIER - 20_000), hertz(CARRIER + 20_000)).unwrap();
    let transmitter = Channel::transmit(&plan, 10_000, &permission).unwrap();
    for (direction, tagged_at, is_received) in [
        (Direction::Down, TaggedAt::Ground, true),
        (Direction::Down, TaggedAt::Spacecraft, false),
        (Direction::Up, TaggedAt::Ground, false),
        (Direction::Up, TaggedAt::Spacecraft, true),
        (Direction::TwoWay, TaggedAt::Ground, true),
    ] {
        let start = GpsTime::default();
        let settings = BakeSettings {
            start,
            end: start.plus_seconds(60.0),
            slope_tolerance: 1e-11,
            delay_tolerance: 1e-11,
            roughness: 0.0,
            direction,
            tagged_at,
            object: 0,
            element_epoch: start,
            site: [0; 3],
            arc_digest: 0,
        };
        let mut words = [0; 64];
        let table = bake(&mut words, &settings, |seconds| 2e-3 + 1e-6 * seconds, None).unwrap();
        let (suits, refused) = (Ok(()), Err(TuningError::OtherEnd));
        assert_eq!(receiver.suits(&table), if is_received { suits } else { refused });
        assert_eq!(synthesiser.suits(&table), receiver.suits(&table));
        assert_eq!(transmitter.suits(&table), if is_received { refused } else { suits });
    }
    assert!(TuningError::OtherEnd.to_string().contains("reception"));
}

/// 8.4 GHz, a clock of 48 kHz and intervals of 10 s: a low orbit may change the step by half a cycle per clock in one,
/// which could as well go the other way round. Changes up to 3/8 are followed, and exactly; more is refused.
#[test]
fn changes_near_half_a_cycle_per_clock() {
    const CLOCKS: u32 = 480_000;
    let channel = Channel::receive(&RfPlan::direct(hertz(8_400_000_000), hertz(48_000)), CLOCKS).unwrap();
    // Delay a t^2 / 2, so the shift over the carrier is -a t, and the step changes by as much in every interval.
    let motion = |change: f64, seconds: f64| {
        let acceleration = change * 48_000.0 / (8.4e9 * 10.0);
        let delay = acceleration * seconds * seconds / 2.0;
        Motion {
            delay: Delay::from_bits((delay * 2f64.powi(56)).round() as i64),
            rapidity: Rapidity::from_bits(((-acceleration * seconds).ln_1p() * 2f64.powi(60)).round() as i64),
            ..Motion::default()
        }
    };
    for change in [-0.37, -0.26, -0.1, 0.1, 0.26, 0.37] {
        let mut sweep = Sweep::begin(&channel, &motion(change, 0.0)).unwrap();
        let mut hold = Hold::<32>::begin(&channel, &motion(change, 0.0), 0).unwrap();
        for interval in 1..=10 {
            let next = motion(change, 10.0 * f64::from(interval));
            let swept = sweep.step(&channel, &next).unwrap();
            let made = swept.change(CLOCKS) as f64 / TURN;
            assert!((made + change).abs() < 1e-6, "{made} {change}");
            let held = hold.step(&channel, &next, false).unwrap();
            let middle = -change * (f64::from(interval) - 0.5);
            let away = held.step.to_bits().wrapping_sub(channel.nominal_step().to_bits()) as i64;
            let missed = away as f64 / TURN - middle;
            assert!((missed - missed.round()).abs() < 1e-6, "{missed}");
        }
    }
    for change in [-0.6, -0.5, -0.38, 0.38, 0.5, 0.6] {
        let mut sweep = Sweep::begin(&channel, &motion(change, 0.0)).unwrap();
        assert_eq!(sweep.step(&channel, &motion(change, 10.0)), Err(TuningError::TooFast), "{change}");
        let mut hold = Hold::<32>::begin(&channel, &motion(change, 0.0), 0).unwrap();
        assert_eq!(hold.step(&channel, &motion(change, 10.0), false), Err(TuningError::TooFast), "{change}");
    }
}

/// Range rates at the ends of their format give steps, and receivers never refuse.
#[test]
fn range_rates_at_the_ends() {
    let plan = RfPlan::direct(hertz(CARRIER), hertz(1_000_000_000));
    let channel = Channel::receive(&plan, 1000).unwrap();
    let permission = Permission::to_radiate(hertz(436_900_000), hertz(437_100_000)).unwrap();
    let transmitter = Channel::transmit(&plan, 1000, &permission).unwrap();
    for (rate, beta) in [(I16F16::MAX, 32_768.0 / 299_792_458.0), (I16F16::MIN, -32_768.0 / 299_792_458.0)] {
        let beta: f64 = beta;
        let factor = ((1.0 - beta) / (1.0 + beta)).sqrt();
        let step = channel.step_for_range_rate(rate).unwrap();
        let off = hertz_between(step, channel.nominal_step(), 1_000_000_000) - 437e6 * (factor - 1.0);
        // The last 1.8 m/s of the format stay at its end: 2.6 Hz.
        assert!(off.abs() < 2.7, "{off}");
        let sent = transmitter.step_for_range_rate(rate).unwrap();
        let off =
            hertz_between(sent, transmitter.nominal_step(), 1_000_000_000) - 437e6 * (1.0 / factor - 1.0);
        assert!(off.abs() < 2.7, "{off}");
    }
}
