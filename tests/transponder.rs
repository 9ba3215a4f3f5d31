//! Linear transponder pairs against the transponder's own rule, in 200 bits.

#[path = "reference/multiprecision.rs"]
mod reference;

use fixed::types::I32F32;
use reference::{Big, Random, big};
use shiftkeel::frequency::Frequency;
use shiftkeel::rapidity::Rapidity;
use shiftkeel::tuning::{Channel, LinearTransponder, Permission, RfPlan, Still, TuningError};

fn hertz(whole: u64) -> Frequency {
    Frequency::from_hertz(whole).unwrap()
}

fn of(frequency: Frequency) -> Big {
    big(frequency.to_bits(), 24)
}

fn factor(rapidity: Rapidity) -> Big {
    big(rapidity.to_bits(), 60).exp()
}

/// The pairs looked at: transponder and uplink at the spacecraft.
fn transponders() -> Vec<(LinearTransponder, Frequency)> {
    let exact = LinearTransponder {
        constant: hertz(581_900_000),
        inverting: true,
        downlink_below: false,
        crystal: Rapidity::ZERO,
    };
    let crystal = Rapidity::from_parts_per_billion(I32F32::from_num(-1800)).unwrap();
    vec![
        // Up 145.95, down 435.95 MHz, turned over; and the other way round.
        (exact, hertz(145_950_000)),
        (LinearTransponder { crystal, ..exact }, hertz(435_950_000)),
        // Up 2400.25, down 10489.75 MHz.
        (
            LinearTransponder { constant: hertz(8_089_500_000), inverting: false, ..exact },
            hertz(2_400_250_000),
        ),
        // Up 1268, down 146 MHz.
        (
            LinearTransponder {
                constant: hertz(1_122_000_000),
                inverting: false,
                downlink_below: true,
                crystal,
            },
            hertz(1_268_000_000),
        ),
    ]
}

/// What the transponder makes of an uplink at the spacecraft, exactly.
fn down_of(transponder: &LinearTransponder, up: &Big) -> Big {
    let constant = of(transponder.constant) * factor(transponder.crystal);
    match (transponder.inverting, transponder.downlink_below) {
        (true, _) => constant - up,
        (false, false) => up + constant,
        (false, true) => up - constant,
    }
}

/// Whatever stands still, the three carriers belong together: transmit f_up exp(-L), let the transponder answer
/// what arrives, and the receiver's f_down exp(L) is what comes down. And the dial that shall stand still does.
#[test]
fn pairs_follow_the_transponders_rule() {
    let mut random = Random::new(11);
    let (mut worst, mut refused) = (0.0_f64, 0);
    for (transponder, up) in transponders() {
        for still in [Still::Spacecraft, Still::OwnEar, Still::OwnTransmitter] {
            let pair = transponder.pair(up, still).unwrap();
            assert_eq!(pair.up, up);
            let down_error = (of(pair.down) - down_of(&transponder, &of(up))).to_f64().value();
            assert!(down_error.abs() <= 2f64.powi(-24), "{down_error} Hz");
            for _ in 0..3000 {
                // Links up to 12 km/s, the two alike but not equal.
                let down_link = random.bits() as i64 >> 19;
                let up_link = down_link + (random.bits() as i64 >> 36);
                let (up_link, down_link) = (Rapidity::from_bits(up_link), Rapidity::from_bits(down_link));
                let Ok((to_send, to_receive)) = pair.rapidities(up_link, down_link) else {
                    // Refused only where the moved dial leaves 2^-13 of its carrier.
                    let (fast, slow) = match still {
                        Still::OwnEar => (pair.down, pair.up),
                        _ => (pair.up, pair.down),
                    };
                    let shift = up_link.to_bits().abs().max(down_link.to_bits().abs()) as f64 / 2f64.powi(60);
                    assert!(shift * fast.as_hertz_f64() / slow.as_hertz_f64() > 0.999 / 8192.0);
                    refused += 1;
                    continue;
                };
                let sent = of(pair.up) / factor(to_send);
                let tuned = of(pair.down) * factor(to_receive);
                let arrives = &sent * factor(up_link);
                let comes_down = (down_of(&transponder, &arrives)) * factor(down_link);
                // The transponder's own place is kept to 2^-24 Hz.
                let off = (tuned - comes_down).to_f64().value().abs() - 2f64.powi(-23);
                let (mover, other) = match still {
                    Still::Spacecraft => (pair.down, pair.up),
                    Still::OwnEar => {
                        assert_eq!(to_receive, Rapidity::ZERO);
                        (pair.up, pair.down)
                    }
                    Still::OwnTransmitter => {
                        assert_eq!(to_send, Rapidity::ZERO);
                        (pair.down, pair.up)
                    }
                };
                if still == Still::Spacecraft {
                    assert!((arrives - of(up)).to_f64().value().abs() < 1e-12);
                    assert!(off < 1e-9, "{off} Hz");
                    continue;
                }
                // In hertz: 2^-44 of each carrier; the ratio's last place counts with the shift.
                let unit = 1.01 * (mover.as_hertz_f64() + other.as_hertz_f64()) / 2f64.powi(44);
                let shift = up_link.to_bits().abs().max(down_link.to_bits().abs()) as f64 / 2f64.powi(60);
                worst = worst.max((off - mover.as_hertz_f64() * shift * 2f64.powi(-29)) / unit);
            }
        }
    }
    println!("worst {worst:.4} of the bound, {refused} refused");
    assert!((0.6..=1.0).contains(&worst), "{worst} of the bound");
    assert!((1..2000).contains(&refused), "{refused} refused");
}

/// A turned-over passband: when everything approaches, the own ear stands still by sending higher, not lower,
/// than a place in the passband alone would ask; one that is not turned over, by sending lower.
#[test]
fn senses() {
    let [inverting, _, straight, _] = transponders().try_into().unwrap();
    let approaching = Rapidity::from_parts_per_billion(I32F32::from_num(20_000)).unwrap();
    for ((transponder, up), higher) in [(inverting, true), (straight, false)] {
        let pair = transponder.pair(up, Still::OwnEar).unwrap();
        let (to_send, _) = pair.rapidities(approaching, approaching).unwrap();
        // A transmitter sends exp(-L).
        assert_eq!(to_send < approaching, higher);
        // First order: the other link's shift in hertz, moved over.
        let moved = (to_send.to_bits() - approaching.to_bits()) as f64 / 2f64.powi(60) * up.as_hertz_f64();
        let shift = 20e-6 * pair.down.as_hertz_f64();
        assert!((moved.abs() - shift).abs() < 1e-4 * shift, "{moved} {shift}");
    }
}

/// Both channels of a pair through the oscillators: a station whose own ear stands still receives its own
/// signal where it listens, to a millihertz.
#[test]
fn through_the_channels() {
    let (transponder, up) = transponders()[0];
    let pair = transponder.pair(up, Still::OwnEar).unwrap();
    let clock = hertz(1_000_000_000);
    let permission = Permission::to_radiate(hertz(145_900_000), hertz(146_000_000)).unwrap();
    let transmitter = Channel::transmit(&RfPlan::direct(pair.up, clock), 1000, &permission).unwrap();
    let receiver = Channel::receive(&RfPlan::direct(pair.down, clock), 1000).unwrap();
    let in_hertz = |bits: u64| bits as f64 / 2f64.powi(64) * 1e9;
    for ppb in [-23_000, -4_000, 0, 10_000, 23_000] {
        let link = Rapidity::from_parts_per_billion(I32F32::from_num(ppb)).unwrap();
        let (to_send, to_receive) = pair.rapidities(link, link).unwrap();
        let sent = in_hertz(transmitter.step(to_send).unwrap().to_bits());
        let tuned = in_hertz(receiver.step(to_receive).unwrap().to_bits());
        let ratio = (link.to_bits() as f64 / 2f64.powi(60)).exp();
        let heard = (581_900_000.0 - sent * ratio) * ratio;
        assert!((heard - tuned).abs() < 1e-3, "{heard} {tuned}");
        assert!((tuned - 435_950_000.0).abs() < 1e-6);
    }
}

/// Pairs that cannot be: a downlink of zero or below, carriers a factor 16 apart, a crystal out of range.
#[test]
fn refused_pairs() {
    let (transponder, _) = transponders()[0];
    let refused = |transponder: LinearTransponder, up| transponder.pair(hertz(up), Still::OwnEar).err();
    let unusable = Some(TuningError::TransponderNotUsable);
    assert_eq!(refused(transponder, 581_900_000), unusable);
    assert_eq!(refused(transponder, 600_000_000), unusable);
    assert_eq!(refused(transponder, 0), unusable);
    assert_eq!(refused(transponder, 30_000_000), unusable);
    let below = LinearTransponder { inverting: false, downlink_below: true, ..transponder };
    assert_eq!(refused(below, 500_000_000), unusable);
    let far = LinearTransponder { crystal: Rapidity::from_bits(1 << 50), ..transponder };
    assert_eq!(refused(far, 145_950_000), Some(TuningError::CrystalTooFar));
    let pair = transponder.pair(hertz(145_950_000), Still::OwnTransmitter).unwrap();
    let saturated = Rapidity::from_bits(i64::MAX);
    assert_eq!(pair.rapidities(saturated, Rapidity::ZERO), Err(TuningError::TooFast));
}
