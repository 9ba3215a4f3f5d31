//! The radios that the programs steer.

use shiftkeel::frequency::Frequency;
use shiftkeel::rapidity::Rapidity;
use shiftkeel::tuning::{Channel, Conversion, Injection, Permission, RfPlan, TuningError};

/// Steered every 10 ms.
pub const RATE: u32 = 100;
/// Clock of the receiver's software oscillator.
pub const RECEIVER_CLOCK: u32 = 4_000_000;
/// Clock of the transmitter's synthesiser.
pub const TRANSMITTER_CLOCK: u32 = 400_000_000;

const fn hertz(hertz: u64) -> Frequency {
    match Frequency::from_hertz(hertz) {
        Some(frequency) => frequency,
        None => panic!("frequency above the format"),
    }
}

/// 437 MHz, converted twice with the last oscillator above the carrier, both crystals off.
///
/// # Errors
/// None with a crystal below 976 ppm.
pub fn receiver(crystal: Rapidity) -> Result<Channel<false>, TuningError> {
    let plan = RfPlan {
        carrier: hertz(437_000_000),
        translation: None,
        conversions: &[
            Conversion { frequency: hertz(391_600_000), crystal },
            Conversion { frequency: hertz(46_100_000), crystal: Rapidity::from_bits(-1_000_000_000_000) },
        ],
        injection: Injection::HighSide,
        clock: hertz(RECEIVER_CLOCK as u64),
        clock_crystal: crystal,
    };
    Channel::receive(&plan, RECEIVER_CLOCK / RATE)
}

/// 145.9 MHz, straight from the synthesiser, with a permission for 20 kHz round it.
///
/// # Errors
/// None with a crystal below 68 ppm, where the carrier still lies inside the permission.
pub fn transmitter(crystal: Rapidity) -> Result<Channel<true>, TuningError> {
    let plan = RfPlan {
        clock_crystal: crystal,
        ..RfPlan::direct(hertz(145_900_000), hertz(TRANSMITTER_CLOCK as u64))
    };
    let permission = Permission::to_radiate(hertz(145_890_000), hertz(145_910_000))?;
    Channel::transmit(&plan, TRANSMITTER_CLOCK / RATE, &permission)
}
