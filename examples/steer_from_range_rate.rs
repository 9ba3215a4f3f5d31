//! Steer a synthesiser from range-rate estimates: the cheapest way from a velocity to a tuning word.
//!
//! A receiver at 437 MHz with one conversion to 10.7 MHz, the local oscillator above the carrier, and a
//! synthesiser with 28 bits at 75 MHz. Range rates come ten times a second in 2^-16 m/s, positive = receding.
//! Both oscillators hang on one crystal, 0.8 ppm fast. Shaped like firmware: `retune` is what a timer
//! interrupt would call. Run with `cargo run --release --example steer_from_range_rate`.

use fixed::types::{I16F16, I32F32};
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::rapidity::Rapidity;
use shiftkeel::tuning::{Channel, Conversion, Injection, RfPlan, TuningError};

const CLOCK: u64 = 75_000_000;
/// Clocks from one retune to the next: 0.1 s.
const CLOCKS: u32 = 7_500_000;

/// What the firmware keeps.
struct Receiver {
    channel: Channel<false>,
    word: u32,
}

impl Receiver {
    fn new(crystal: Rapidity) -> Result<Self, TuningError> {
        let hertz = |whole| Frequency::from_hertz(whole).ok_or(TuningError::CarrierNotUsable);
        let conversions = [Conversion { frequency: hertz(447_700_000)?, crystal }];
        let plan = RfPlan {
            conversions: &conversions,
            injection: Injection::HighSide,
            clock_crystal: crystal,
            ..RfPlan::direct(hertz(437_000_000)?, hertz(CLOCK)?)
        };
        Ok(Self { channel: Channel::receive(&plan, CLOCKS)?, word: 0 })
    }

    /// One tick: the word to write, if it is another than the last. Without an estimate the last word stays.
    fn retune(&mut self, range_rate: Option<I16F16>) -> Option<u32> {
        // A receiver's step exists for every range rate of the format.
        let step = self.channel.step_for_range_rate(range_rate?).ok()?;
        let word = step.to_word_nearest::<28>() as u32;
        let changed = word != self.word;
        self.word = word;
        changed.then_some(word)
    }
}

/// An invented pass: range rate in m/s at `t` seconds from the closest approach, 600 km away at 7.4 km/s.
fn range_rate(t: f64) -> f64 {
    let along = 7400.0 * t;
    7400.0 * along / (along * along + 600e3 * 600e3).sqrt()
}

fn main() -> Result<(), TuningError> {
    let crystal =
        Rapidity::from_parts_per_billion(I32F32::from_num(800)).map_err(|_| TuningError::CrystalTooFar)?;
    let mut receiver = Receiver::new(crystal)?;
    let true_clock = CLOCK as f64 * (1.0 + 800e-9);
    let true_oscillator = 447.7e6 * (1.0 + 800e-9);
    println!("   t     range rate    word       synthesiser      carrier it receives, less the true one");
    let (mut writes, mut worst) = (0, 0.0_f64);
    for tick in -3000..=3000 {
        let t = f64::from(tick) / 10.0;
        // Every seventh estimate is missing.
        let estimate = (tick % 7 != 0).then(|| I16F16::from_num(range_rate(t)));
        let Some(word) = receiver.retune(estimate) else { continue };
        writes += 1;
        let made = PhaseStep::from_word::<28>(word.into()).to_bits() as f64 / 2f64.powi(64) * true_clock;
        let beta = range_rate(t) / 299_792_458.0;
        let carrier = 437e6 * ((1.0 - beta) / (1.0 + beta)).sqrt();
        let off = true_oscillator - made - carrier;
        worst = worst.max(off.abs());
        if (tick + 1) % 600 == 0 {
            println!("{t:7.1} s {:9.3} m/s  {word:#09x}  {made:14.3} Hz  {off:7.3} Hz", range_rate(t));
        }
    }
    println!(
        "{writes} writes; right after a write at most {worst:.3} Hz off, half a place of the word being 0.140 Hz"
    );
    assert!(worst < 0.141, "the word is the nearest");
    Ok(())
}
