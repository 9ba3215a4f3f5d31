//! What a channel makes of rapidities, range rates and delays, against the formula in 200 bits.
//!
//! cycles per clock = s ((f0 + T exp(K_T)) exp(+-L - Kc) - sum LO_i exp(K_i - Kc)) / clock

#![allow(clippy::excessive_precision, reason = "published values, as they were printed")]

#[path = "reference/multiprecision.rs"]
mod reference;

use fixed::types::{I16F16, I32F32};
use reference::{Big, Random, big, count, light};
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::rapidity::{Delay, Motion, Rapidity, narrow};
use shiftkeel::tuning::{
    Channel, Conversion, Hold, Injection, Permission, RatioChannel, RfPlan, Translation, TuningError,
};

fn hertz(whole: u64) -> Frequency {
    Frequency::from_hertz(whole).unwrap()
}

/// A worst case beside the bound that the documentation states: kept, and not looser than 1.6 times.
fn assert_bound(name: &str, worst: f64, bound: f64) {
    println!("{name}: worst {worst:.4}, bound {bound}");
    assert!(worst <= bound, "{name}: worst {worst} exceeds the bound {bound}");
    assert!(bound <= 1.6 * worst, "{name}: the bound {bound} is looser than 1.6 times {worst}");
}

/// Two steps of either injection side: each other's negative but for a place, both being rounded down.
fn assert_mirrored(high: u64, low: u64) {
    assert!(high.wrapping_add(low) as i64 <= 0 && high.wrapping_add(low) as i64 >= -2, "{high} {low}");
}

/// A plan that owns its conversions.
#[derive(Clone, Debug)]
struct Plan {
    carrier: Frequency,
    translation: Option<Translation>,
    conversions: Vec<Conversion>,
    injection: Injection,
    clock: Frequency,
    clock_crystal: Rapidity,
    clocks: u32,
}

/// Which crystals a random plan has.
#[derive(Clone, Copy, PartialEq)]
enum Crystals {
    Exact,
    One,
    Separate,
}

/// From `least` to `most`, evenly in the logarithm, with random low bits.
fn spread(random: &mut Random, least: f64, most: f64) -> f64 {
    let part = random.bits() as f64 / 2f64.powi(64);
    least * (most / least).powf(part)
}

impl Plan {
    /// Carriers from 1 MHz to 240 GHz, clocks from 8 kHz to 1 GHz, intervals from 0.1 ms to 10 s, up to three
    /// conversions, crystals within +-480 ppm.
    fn random(random: &mut Random, crystals: Crystals) -> Self {
        let frequency = |value: f64| Frequency::from_bits((value * 2f64.powi(24)) as u64);
        let one = random.bits() as i64 >> 14;
        let crystal = |random: &mut Random| {
            Rapidity::from_bits(match crystals {
                Crystals::Exact => 0,
                Crystals::One => one,
                Crystals::Separate => random.bits() as i64 >> (15 + random.bits() % 12),
            })
        };
        let carrier = spread(random, 1e6, 240e9);
        let clock = spread(random, 8e3, 1e9);
        let seconds = spread(random, 1e-4, 10.0);
        let clock_crystal = crystal(random);
        let translation = random.bits().is_multiple_of(3).then(|| Translation {
            frequency: frequency(spread(random, 1e3, 0.9 * carrier)),
            downwards: random.bits() & 1 == 0,
            crystal: crystal(random),
        });
        let conversions = (0..random.bits() % 4)
            .map(|_| Conversion {
                frequency: frequency(spread(random, 1e5, carrier)),
                crystal: crystal(random),
            })
            .collect();
        Self {
            carrier: frequency(carrier),
            translation,
            conversions,
            injection: if random.bits() & 1 == 0 { Injection::LowSide } else { Injection::HighSide },
            clock: frequency(clock),
            clock_crystal,
            clocks: (seconds * clock).clamp(1.0, 4e9) as u32,
        }
    }

    fn rf(&self) -> RfPlan<'_> {
        RfPlan {
            carrier: self.carrier,
            translation: self.translation,
            conversions: &self.conversions,
            injection: self.injection,
            clock: self.clock,
            clock_crystal: self.clock_crystal,
        }
    }

    fn sign(&self) -> i64 {
        if self.injection == Injection::LowSide { 1 } else { -1 }
    }

    fn clock(&self) -> Big {
        big(self.clock.to_bits(), 24)
    }

    /// Carrier with its translation, true hertz.
    fn true_carrier(&self) -> Big {
        let mut sum = big(self.carrier.to_bits(), 24);
        if let Some(shift) = self.translation {
            let size = big(shift.frequency.to_bits(), 24) * big(shift.crystal.to_bits(), 60).exp();
            sum += if shift.downwards { -size } else { size };
        }
        sum
    }

    /// Local oscillators, true hertz.
    fn conversions(&self) -> Big {
        self.conversions.iter().fold(big(0, 0), |sum, conversion| {
            sum + big(conversion.frequency.to_bits(), 24) * big(conversion.crystal.to_bits(), 60).exp()
        })
    }

    /// exp(-Kc).
    fn over_clock(&self) -> Big {
        big(-self.clock_crystal.to_bits(), 60).exp()
    }

    /// Cycles per clock at no shift.
    fn nominal(&self) -> Big {
        (self.true_carrier() - self.conversions()) * self.over_clock() / self.clock() * big(self.sign(), 0)
    }

    /// Cycles per clock that an offset `factor - 1` adds.
    fn added(&self, offset: &Big) -> Big {
        self.true_carrier() * self.over_clock() / self.clock() * big(self.sign(), 0) * offset
    }

    /// All that a rounded exp(K) can be off by is a part of this: hertz in the plan.
    fn hertz_in_plan(&self) -> f64 {
        let conversions: f64 = self.conversions.iter().map(|c| c.frequency.as_hertz_f64()).sum();
        let translation = self.translation.map_or(0.0, |shift| shift.frequency.as_hertz_f64());
        self.carrier.as_hertz_f64() + translation + conversions
    }

    fn carrier_hertz(&self) -> f64 {
        self.true_carrier().to_f64().value()
    }

    fn seconds(&self) -> f64 {
        f64::from(self.clocks) / self.clock.as_hertz_f64()
    }
}

/// `step` less `exact` cycles per clock, modulo one cycle, in hertz of `clock`.
fn off_in_hertz(step: PhaseStep, exact: &Big, clock: Frequency) -> f64 {
    let difference = big(step.to_bits(), 64) - exact;
    let turns = difference.round();
    (difference - turns).to_f64().value() * clock.as_hertz_f64()
}

fn plans(seed: u64, quick: u64) -> impl Iterator<Item = (Plan, Random)> {
    let mut random = Random::new(seed);
    (0..count(quick, 50 * quick)).map(move |number| {
        let crystals = [Crystals::Exact, Crystals::One, Crystals::Separate][number as usize % 3];
        let plan = Plan::random(&mut random, crystals);
        (plan, Random::new(random.bits()))
    })
}

/// W0: to half of 2^-64 cycle per clock where all crystals are exact, else also to the rounding of exp(K).
#[test]
fn steps_at_no_shift() {
    let (mut exact_worst, mut worst) = (0.0_f64, 0.0_f64);
    for (plan, _) in plans(1, 3000) {
        let channel = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let off = off_in_hertz(channel.nominal_step(), &plan.nominal(), plan.clock).abs();
        let unit = plan.clock.as_hertz_f64() / 2f64.powi(64);
        let exact_crystals = plan.clock_crystal == Rapidity::ZERO
            && plan.conversions.iter().all(|conversion| conversion.crystal == Rapidity::ZERO)
            && plan.translation.is_none_or(|translation| translation.crystal == Rapidity::ZERO);
        if exact_crystals {
            exact_worst = exact_worst.max(off / unit);
        } else {
            worst = worst.max((off - unit / 2.0) / (plan.hertz_in_plan() / 2f64.powi(60)));
        }
    }
    assert_bound("W0 with exact crystals, 2^-64 cycle per clock", exact_worst, 0.501);
    assert_bound("W0 beyond that, 2^-60 of all frequencies in the plan", worst, 1.002);
}

/// Largest rapidity that a channel takes, in 2^-44: 2^-13 less 2^-27, where the offset leaves 32 bits.
const FASTEST: i64 = (1 << 31) - (1 << 17) - (1 << 4);

/// Rapidities of every size below 2^-13, and the ends of what a channel takes.
fn rapidities(random: &mut Random, narrow: bool) -> impl Iterator<Item = Rapidity> + use<> {
    let ends = [FASTEST, -FASTEST, 0, 1, -1].map(|bits| bits << 16);
    let numbers: Vec<i64> = (0..20)
        .map(|_| (random.bits() as i64 >> (16 + random.bits() % 20)).clamp(-FASTEST << 16, FASTEST << 16))
        .collect();
    ends.into_iter()
        .chain(numbers)
        .map(move |bits| Rapidity::from_bits(if narrow { bits >> 16 << 16 } else { bits }))
}

/// `Channel::step`: its offset from W0 in units of 2^-44 of the carrier, after 2^-31 of the shift is taken off.
fn worst_step(narrow: bool, seed: u64) -> (f64, f64) {
    let (mut worst, mut whole) = (0.0_f64, 0.0_f64);
    for (plan, mut random) in plans(seed, 300) {
        let channel = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let nominal = big(channel.nominal_step().to_bits(), 64);
        for rapidity in rapidities(&mut random, narrow) {
            let offset: Big = big(rapidity.to_bits(), 60).exp_m1();
            let exact = &nominal + plan.added(&offset);
            let off = off_in_hertz(channel.step(rapidity).unwrap(), &exact, plan.clock).abs();
            let unit = plan.carrier_hertz() / 2f64.powi(44);
            let shift = offset.to_f64().value().abs() * 2f64.powi(-31) * plan.carrier_hertz();
            // One place of the step is the floor.
            let place = plan.clock.as_hertz_f64() / 2f64.powi(64);
            worst = worst.max((off - shift - place) / unit);
            whole = whole.max((off - place) / (unit + shift));
        }
    }
    (worst, whole)
}

#[test]
fn steps_of_rapidities() {
    // A rapidity rounded to 44 bits, and the kernel.
    let (worst, _) = worst_step(false, 2);
    assert_bound("step, 2^-44 of the carrier", worst, 1.01);
    let (worst, whole) = worst_step(true, 3);
    assert_bound("step of a 44-bit rapidity, 2^-44 of the carrier", worst, 0.51);
    assert_bound("step of a 44-bit rapidity, with 2^-31 of the shift", whole, 0.9);
}

/// `Channel::step_for_range_rate`, in units of 2^-16 m/s.
#[test]
fn steps_of_range_rates() {
    let (mut worst, mut slow) = (0.0_f64, 0.0_f64);
    for (plan, mut random) in plans(4, 300) {
        let channel = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let nominal = big(channel.nominal_step().to_bits(), 64);
        let ends = [i32::MAX, 0, 1, -1, 7000 << 16, -7500 << 16, -32_700 << 16];
        let numbers: Vec<i32> = (0..20).map(|_| random.bits() as i32 >> (random.bits() % 6)).collect();
        for bits in ends.into_iter().chain(numbers) {
            // The last 1.8 m/s before -32768 m/s stay at the end of the format.
            let bits = bits.max(-32_766 << 16);
            let beta: Big = big(bits, 16) / light();
            let one = big(1, 0);
            let offset: Big = ((&one - &beta) / (&one + &beta)).sqrt() - &one;
            let exact = &nominal + plan.added(&offset);
            let step = channel.step_for_range_rate(I16F16::from_bits(bits)).unwrap();
            let off = off_in_hertz(step, &exact, plan.clock).abs();
            let unit = plan.carrier_hertz() / 299_792_458.0 / 65_536.0;
            let shift = offset.to_f64().value().abs() * 2f64.powi(-31) * plan.carrier_hertz();
            let place = plan.clock.as_hertz_f64() / 2f64.powi(64);
            // Held within the kernel's bound and the gain's 2^-31 of the shift together.
            let slowly = bits.unsigned_abs() < 8000 << 16;
            let kernel = if slowly {
                narrow::MAX_FIRST_ORDER_ERROR_BELOW_8_KM_S
            } else {
                narrow::MAX_FIRST_ORDER_ERROR
            };
            assert!(off <= kernel * unit + shift + place, "{bits}: {off} Hz");
            let error = (off - place) / unit;
            worst = worst.max(error);
            if slowly {
                slow = slow.max(error);
            }
        }
    }
    // The gain's share of 32.7 km/s is one unit, of 8 km/s a quarter.
    assert_bound("range rate, 2^-16 m/s", worst, narrow::MAX_FIRST_ORDER_ERROR + 1.0);
    assert_bound(
        "range rate below 8 km/s, 2^-16 m/s",
        slow,
        narrow::MAX_FIRST_ORDER_ERROR_BELOW_8_KM_S + 0.25,
    );
}

/// High-side injection is the mirror image, to the rounding of its last place; transmitting is receiving with the other sign.
#[test]
fn mirrors() {
    let mut emitted = 0;
    for (mut plan, mut random) in plans(5, 600) {
        plan.injection = Injection::LowSide;
        let low = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let widest = plan.clock.to_bits() as f64 * 0.49;
        let band = |away: f64| Frequency::from_bits((plan.carrier_hertz() * 2f64.powi(24) + away) as u64);
        let permission = Permission::to_radiate(band(-widest), band(widest)).unwrap();
        let transmitter = Channel::transmit(&plan.rf(), plan.clocks, &permission);
        let mut high_plan = plan.clone();
        high_plan.injection = Injection::HighSide;
        let high = Channel::receive(&high_plan.rf(), plan.clocks).unwrap();
        let mirrored = Channel::transmit(&high_plan.rf(), plan.clocks, &permission);
        for rapidity in rapidities(&mut random, false) {
            let step = low.step(rapidity).unwrap().to_bits();
            assert_mirrored(high.step(rapidity).unwrap().to_bits(), step);
            let rate = I16F16::from_bits(random.bits() as i32);
            assert_mirrored(
                high.step_for_range_rate(rate).unwrap().to_bits(),
                low.step_for_range_rate(rate).unwrap().to_bits(),
            );
            // Below a band of half the clock, a transmitter's carrier may not reach down to zero.
            let (Ok(transmitter), Ok(mirrored)) = (&transmitter, &mirrored) else { continue };
            let sent = transmitter.step(rapidity);
            assert_eq!(sent.is_ok(), mirrored.step(rapidity).is_ok());
            if let Ok(sent) = sent {
                // A tie of the rounding to 44 bits goes up on either side.
                let received = low.step(Rapidity::from_bits(-((rapidity.to_bits() + (1 << 15)) >> 16 << 16)));
                assert_eq!(Ok(sent), received);
                assert_mirrored(mirrored.step(rapidity).unwrap().to_bits(), sent.to_bits());
                emitted += 1;
            }
        }
    }
    assert!(emitted > 1000, "only {emitted} emissions were looked at");
}

/// One crystal for everything: the conversions come out at their nominal sum.
#[test]
fn one_crystal() {
    let mut worst = 0.0_f64;
    let mut random = Random::new(6);
    for _ in 0..300 {
        let mut plan = Plan::random(&mut random, Crystals::One);
        plan.translation = None;
        let channel = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let sum = plan.conversions.iter().fold(big(0, 0), |sum, one| sum + big(one.frequency.to_bits(), 24));
        let exact =
            (big(plan.carrier.to_bits(), 24) * plan.over_clock() - sum) / plan.clock() * big(plan.sign(), 0);
        let off = off_in_hertz(channel.nominal_step(), &exact, plan.clock).abs();
        let place = plan.clock.as_hertz_f64() / 2f64.powi(64);
        worst = worst.max((off - place) / (plan.carrier.as_hertz_f64() / 2f64.powi(60)));
    }
    assert!(worst <= 2.0, "one crystal: {worst} of 2^-60");
}

/// Mean steps over an interval between two delays: within one place of the delay that the channel keeps,
/// 2^-42 of the interval and never finer than 2^-56 s. What it is off by does not accumulate: here a hundred
/// intervals together are off by no more.
#[test]
fn mean_steps() {
    let (mut worst, mut together) = (0.0_f64, 0.0_f64);
    for (plan, mut random) in plans(7, 300) {
        let channel = Channel::receive(&plan.rf(), plan.clocks).unwrap();
        let origin = random.bits() as i64 >> 8;
        let largest = plan.seconds() * 2f64.powi(56 - 13) * 0.998;
        let mut delay = origin;
        // Delay and rapidity of one motion; the two must belong together.
        let at = |delay: i64, slope: f64| Motion {
            delay: Delay::from_bits(delay),
            rapidity: Rapidity::from_bits(((-slope).ln_1p() * 2f64.powi(60)) as i64),
            ..Motion::default()
        };
        let mut hold = Hold::<63>::begin(&channel, &at(origin, 0.0), 0).unwrap();
        let resolution = (plan.seconds() / 2f64.powi(42)).max(2f64.powi(-56));
        let nominal = plan.nominal();
        let unit = plan.true_carrier();
        let clocks = big(plan.clocks, 0);
        let mut given = 0u64;
        for interval in 1..=100 {
            let before = delay;
            delay += (largest * (random.bits() as i64 as f64 / 2f64.powi(63))) as i64;
            let carried = hold.remainder();
            let true_seconds = plan.seconds() * plan.over_clock().to_f64().value();
            let slope = (delay - before) as f64 / 2f64.powi(56) / true_seconds;
            let held = hold.step(&channel, &at(delay, slope), false).unwrap();
            let mean = held.step.to_bits().wrapping_add_signed(hold.remainder()).wrapping_sub(carried as u64);
            given = given.wrapping_add(mean);
            let exact =
                |before: i64, after: i64| &unit * big(before - after, 56) / &clocks * big(plan.sign(), 0);
            let slack = plan.clock.as_hertz_f64() * plan.seconds();
            // In seconds of delay; W0 and the gain's places are held elsewhere.
            let constants = |intervals: f64| {
                intervals * (slack * 2f64.powi(-48) + plan.hertz_in_plan() * plan.seconds() * 2f64.powi(-59))
                    / plan.carrier_hertz()
            };
            let seconds = |step: u64, exact: &Big| {
                (off_in_hertz(PhaseStep::from_bits(step), exact, plan.clock) * plan.seconds()
                    / plan.carrier_hertz())
                .abs()
            };
            worst =
                worst.max((seconds(mean, &(&nominal + exact(before, delay))) - constants(1.0)) / resolution);
            if interval == 100 {
                let all = &nominal * big(100, 0) + exact(origin, delay);
                together = together.max((seconds(given, &all) - constants(100.0)) / resolution);
            }
        }
    }
    assert_bound("mean step, places of the delay", worst, 1.0);
    assert!(together <= 1.0, "a hundred intervals: {together} places of the delay");
}

/// Ratios of a synthesiser that multiplies, in units of 2^-48.
#[test]
fn ratios() {
    let (mut worst, mut looked) = (0.0_f64, 0);
    for (mut plan, mut random) in plans(8, 1500) {
        plan.injection = Injection::LowSide;
        let channel = match RatioChannel::receive(&plan.rf(), plan.clocks) {
            Ok(channel) => channel,
            Err(TuningError::NegativeOutput) => {
                assert!(plan.nominal() < big(0, 0));
                continue;
            }
            Err(TuningError::RatioTooHigh) => {
                assert!(plan.nominal() > big(65_535, 0));
                continue;
            }
            Err(other) => panic!("{other}"),
        };
        for rapidity in rapidities(&mut random, true) {
            let offset: Big = big(rapidity.to_bits(), 60).exp_m1();
            let exact = plan.nominal() + plan.added(&offset);
            let value = exact.to_f64().value();
            match channel.ratio(rapidity) {
                Ok(ratio) => {
                    let off = (big(ratio.to_bits(), 48) - &exact).to_f64().value().abs();
                    let gain = plan.carrier_hertz() / plan.clock.as_hertz_f64();
                    let kernel =
                        gain * (0.51 * 2f64.powi(-44) + offset.to_f64().value().abs() * 2f64.powi(-31));
                    let constants = plan.hertz_in_plan() / plan.clock.as_hertz_f64() * 2f64.powi(-59);
                    worst = worst.max((off - kernel - constants) * 2f64.powi(48));
                    looked += 1;
                }
                Err(TuningError::NegativeOutput) => assert!(value < 1e-6, "{value} is a frequency"),
                Err(TuningError::RatioTooHigh) => assert!(value > 65_535.9, "{value} is in the format"),
                Err(other) => panic!("{other}"),
            }
        }
    }
    assert!(looked > 5000, "only {looked} ratios were looked at");
    println!("ratio, 2^-48: worst {worst:.4}, bound 2.5");
    assert!((1.0..=2.5).contains(&worst), "{worst}");
}

/// 437 MHz receding at 7 km/s is received at 436989796.393450985 Hz (computed with 25 to 40 digits); either
/// classical form is 0.1191 Hz off. To 0.1 mHz, and each step is what a transmitter must send when approaching.
#[test]
fn published_carrier() {
    let expected = 436_989_796.393_450_985;
    let clock = hertz(1_000_000_000);
    let rate = I16F16::from_num(7000);
    let plan = RfPlan::direct(hertz(437_000_000), clock);
    let in_hertz = |step: PhaseStep| step.to_bits() as f64 / 2f64.powi(64) * 1e9;
    let channel = Channel::receive(&plan, 1_000_000).unwrap();
    let permission = Permission::to_radiate(hertz(436_000_000), hertz(438_000_000)).unwrap();
    let transmitter = Channel::transmit(&plan, 1_000_000, &permission).unwrap();
    let approaching = I16F16::from_num(-7000);
    for step in [
        channel.step(Rapidity::from_range_rate(rate)),
        channel.step_for_range_rate(rate),
        transmitter.step(Rapidity::from_range_rate(approaching)),
        transmitter.step_for_range_rate(approaching),
    ] {
        let seen = in_hertz(step.unwrap());
        assert!((seen - expected).abs() < 1e-4, "{seen}");
        assert!((seen - 436_989_796.274_327_889).abs() > 0.119);
        assert!((seen - 436_989_796.512_574_082).abs() > 0.119);
    }
}

/// The same at 8.4 GHz through two conversions to an intermediate frequency, the second from above: the
/// classical forms would be 2.290 Hz off. And a synthesiser's ratio for the same carrier.
#[test]
fn published_carrier_through_conversions() {
    let shift = -8_400_000_000.0 * 2.334_921_407_097_185_174_4e-5;
    let conversion = |whole| Conversion { frequency: hertz(whole), crystal: Rapidity::ZERO };
    let conversions = [conversion(7_000_000_000), conversion(1_410_700_000)];
    let plan = RfPlan {
        conversions: &conversions,
        injection: Injection::HighSide,
        ..RfPlan::direct(hertz(8_400_000_000), hertz(100_000_000))
    };
    let rapidity = Rapidity::from_range_rate(I16F16::from_num(7000));
    let step = Channel::receive(&plan, 1000).unwrap().step(rapidity).unwrap();
    let seen = step.to_bits() as f64 / 2f64.powi(64) * 1e8;
    assert!((seen - (10_700_000.0 - shift)).abs() < 1e-3, "{seen}");
    let plan = RfPlan::direct(hertz(8_400_000_000), hertz(10_000_000));
    let ratio = RatioChannel::receive(&plan, 1000).unwrap().ratio(rapidity).unwrap();
    let (whole, fraction) = ratio.parts();
    let seen = (f64::from(whole) - 840.0 + fraction as f64 / 2f64.powi(48)) * 1e7;
    assert!((seen - shift).abs() < 1e-3, "{seen}");
}

/// A crystal one part in a million fast makes an intermediate frequency read low by 437 Hz, not by the 0.5 Hz
/// of the intermediate frequency itself; and a clock that is fast needs a smaller step.
#[test]
fn crystals_count_at_the_carrier() {
    let million = Rapidity::from_parts_per_billion(I32F32::from_num(1000)).unwrap();
    let read = |radio: Rapidity, clock: Rapidity| {
        let conversions = [Conversion { frequency: hertz(436_500_000), crystal: radio }];
        let plan = RfPlan {
            conversions: &conversions,
            clock_crystal: clock,
            ..RfPlan::direct(hertz(437_000_000), hertz(4_000_000))
        };
        let step = Channel::receive(&plan, 4000).unwrap().nominal_step();
        step.to_bits() as f64 / 2f64.powi(64) * 4e6
    };
    assert!((read(Rapidity::ZERO, Rapidity::ZERO) - 500_000.0).abs() < 1e-9);
    assert!((read(million, Rapidity::ZERO) - (500_000.0 - 436.5)).abs() < 1e-6);
    assert!((read(Rapidity::ZERO, million) - 500_000.0 / 1.000001).abs() < 1e-6);
    assert!((read(million, million) - (437_000_000.0 / 1.000001 - 436_500_000.0)).abs() < 1e-6);
}
