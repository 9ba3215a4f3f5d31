//! A linear transponder, turned over: the station hears itself where it listens, while both links move.
//!
//! **This shows the arithmetic of a transmitter. A licence and the local rules decide what may be transmitted,
//! with which power and where; check the emission with a receiver before connecting an antenna; nothing here is
//! fit for safety-of-life navigation.** No transmitting channel exists without a `Permission` that names its band,
//! and every word is held against it.
//!
//! Uplink 145.95 MHz, downlink 435.95 MHz, sum 581.9 MHz, all invented. The own receiver's dial stands still, the
//! transmitter moves for both links; both synthesisers have 32 bits at 1 GHz. Run with
//! `cargo run --release --example hold_transponder_pair`.

use fixed::types::I16F16;
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::rapidity::Rapidity;
use shiftkeel::tuning::{
    Channel, LinearTransponder, Permission, RfPlan, Still, TransponderPair, TuningError,
};

const CLOCK: f64 = 1e9;

/// What the firmware keeps.
struct Station {
    pair: TransponderPair,
    transmitter: Channel<true>,
    receiver: Channel<false>,
}

/// Words for the coming interval. A transmitter without one is silent.
struct Words {
    transmit: Result<u32, TuningError>,
    receive: u32,
}

impl Station {
    fn new() -> Result<Self, TuningError> {
        let hertz = |whole| Frequency::from_hertz(whole).ok_or(TuningError::CarrierNotUsable);
        let transponder = LinearTransponder {
            constant: hertz(581_900_000)?,
            inverting: true,
            downlink_below: false,
            crystal: Rapidity::ZERO,
        };
        let pair = transponder.pair(hertz(145_950_000)?, Still::OwnEar)?;
        // The end of the pass below asks for a little more, and is not radiated.
        let permission = Permission::to_radiate(hertz(145_943_500)?, hertz(145_963_500)?)?;
        let clock = hertz(CLOCK as u64)?;
        let transmitter = Channel::transmit(&RfPlan::direct(pair.up, clock), 1_000_000, &permission)?;
        let receiver = Channel::receive(&RfPlan::direct(pair.down, clock), 1_000_000)?;
        Ok(Self { pair, transmitter, receiver })
    }

    /// One tick, given the motion of both links in the middle of the coming interval.
    fn tick(&self, up: Rapidity, down: Rapidity) -> Result<Words, TuningError> {
        let (to_send, to_receive) = self.pair.rapidities(up, down)?;
        let word = |step: PhaseStep| step.to_word_nearest::<32>() as u32;
        let transmit = self.transmitter.step(to_send).map(word);
        Ok(Words { transmit, receive: word(self.receiver.step(to_receive)?) })
    }
}

/// An invented pass: range rate in m/s at `t` seconds from the closest approach, 600 km away at 7.4 km/s.
fn range_rate(t: f64) -> f64 {
    let along = 7400.0 * t;
    7400.0 * along / (along * along + 600e3 * 600e3).sqrt()
}

fn main() -> Result<(), TuningError> {
    let station = Station::new()?;
    let hertz = |word: u32| PhaseStep::from_word::<32>(word.into()).to_bits() as f64 / 2f64.powi(64) * CLOCK;
    println!("   t       transmit Hz       receive Hz    own signal, heard off the dial");
    for t in (-300..=300).step_by(50).map(f64::from) {
        let link = Rapidity::from_range_rate(I16F16::from_num(range_rate(t)));
        let words = station.tick(link, link)?;
        let receive = hertz(words.receive);
        match words.transmit {
            Ok(word) => {
                let beta = range_rate(t) / 299_792_458.0;
                let factor = ((1.0 - beta) / (1.0 + beta)).sqrt();
                let heard = (581.9e6 - hertz(word) * factor) * factor;
                println!("{t:5.0} s {:15.3} {receive:16.3} {:9.3} Hz", hertz(word), heard - receive);
                assert!((heard - receive).abs() < 0.3, "two places of 0.23 Hz, half of each");
            }
            Err(refusal) => println!("{t:5.0} s    silent       {receive:16.3}    {refusal}"),
        }
    }
    Ok(())
}
