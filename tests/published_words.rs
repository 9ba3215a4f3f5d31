//! Tuning words of real devices against their data sheets, and a synthesiser's ratio.
//!
//! Word = round(f 2^N / clock). Marks: [S] seen in the source, [M] source recalled and not seen, [V] recomputed
//! with exact fractions.

use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::rapidity::Rapidity;
use shiftkeel::tuning::{Channel, RatioChannel, RfPlan};

fn hertz(whole: u64) -> Frequency {
    Frequency::from_hertz(whole).unwrap()
}

/// The word by the direct division, by a channel at rest, and the same again from the word.
fn check<const BITS: u32>(output: u64, clock: u64, expected: u64) {
    let step = PhaseStep::of(hertz(output), hertz(clock)).unwrap();
    let word = step.to_word_nearest::<BITS>();
    assert_eq!(word, expected, "{output} Hz at {clock} Hz, {BITS} bits: 0x{word:X}");
    let channel = Channel::receive(&RfPlan::direct(hertz(output), hertz(clock)), 1000).unwrap();
    let at_rest = channel.step(Rapidity::ZERO).unwrap();
    assert_eq!(at_rest, step);
    assert_eq!(at_rest.to_word_nearest::<BITS>(), expected);
    // Nearest: the residual is at most half a place, and one word further it would be more.
    let half_place = 1u64 << (63 - BITS);
    assert!(step.residual::<BITS>(word).unsigned_abs() <= half_place);
    assert!(step.residual::<BITS>(word + 1).unsigned_abs() >= half_place);
    assert!(step.residual::<BITS>(word - 1).unsigned_abs() >= half_place);
    assert_eq!(PhaseStep::from_word::<BITS>(word).to_word_nearest::<BITS>(), word);
}

/// Words of 28 bits. AN-1070 [M]: 400 Hz at 25 MHz, where truncation would give 0x10C6. [S]: 7 MHz at 75 MHz,
/// with its frames 0x4B18 and 0x45F9; 7.04 MHz at 100 MHz.
#[test]
fn words_of_28_bits() {
    check::<28>(400, 25_000_000, 0x10C7);
    let truncated = PhaseStep::of(hertz(400), hertz(25_000_000)).unwrap().to_bits() >> 36;
    assert_eq!(truncated, 0x10C6);
    check::<28>(7_000_000, 75_000_000, 0x17E_4B18);
    check::<28>(7_040_000, 100_000_000, 0x120_5BC0);
    // Low 14 bits first, then the high 14, each behind the prefix of the first frequency register.
    let word = PhaseStep::of(hertz(7_000_000), hertz(75_000_000)).unwrap().to_word_nearest::<28>();
    assert_eq!([0x4000 | word & 0x3FFF, 0x4000 | word >> 14], [0x4B18, 0x45F9]);
    // AN-1070's start-up frames for 400 Hz [M].
    let word = PhaseStep::of(hertz(400), hertz(25_000_000)).unwrap().to_word_nearest::<28>();
    assert_eq!([0x4000 | word & 0x3FFF, 0x4000 | word >> 14], [0x50C7, 0x4000]);
}

/// Words of 32 bits. [S]: 5 MHz at 25 MHz; 2 MHz at 125 MHz; 10 MHz at 180 MHz (AD9851 data sheet, whose bytes
/// W1..W4 are 0E 38 E3 8E). AD9910 [M, seen in driver tests]: 41 MHz at 122.88 MHz. [V]: 10 MHz at 125 MHz.
#[test]
fn words_of_32_bits() {
    check::<32>(5_000_000, 25_000_000, 0x3333_3333);
    check::<32>(2_000_000, 125_000_000, 0x0418_9375);
    check::<32>(10_000_000, 180_000_000, 0x0E38_E38E);
    let word = PhaseStep::of(hertz(10_000_000), hertz(180_000_000)).unwrap().to_word_nearest::<32>();
    assert_eq!((word as u32).to_be_bytes(), [0x0E, 0x38, 0xE3, 0x8E]);
    check::<32>(41_000_000, 122_880_000, 0x556A_AAAB);
    check::<32>(10_000_000, 125_000_000, 0x147A_E148);
}

/// Words of 48 bits: 19.44 MHz (AD9912 data sheet [S]) and 155.52 MHz (AD9548 data sheet [S]) at 1 GHz; [V]
/// 10.7 MHz at 100 MHz.
#[test]
fn words_of_48_bits() {
    check::<48>(19_440_000, 1_000_000_000, 0x04FA_0514_3BF7);
    check::<48>(155_520_000, 1_000_000_000, 0x27D0_28A1_DFB9);
    check::<48>(10_700_000, 100_000_000, 0x1B64_5A1C_AC08);
}

/// Fractional-N multiplication, values of AN619 (36, 24 + 2/3, 45 + 1/2 and 35 + 2/125) [M]; 25 MHz times
/// 35 + 2/125 is 875.4 MHz, six times 145.9 MHz exactly [V].
#[test]
fn ratios_of_synthesisers() {
    for (output, clock, whole, numerator, denominator) in [
        (900_000_000, 25_000_000, 36, 0_u128, 1),
        (740_000_000, 30_000_000, 24, 2, 3),
        (1_137_500_000, 25_000_000, 45, 1, 2),
        (6 * 145_900_000, 25_000_000, 35, 2, 125),
    ] {
        let plan = RfPlan::direct(hertz(output), hertz(clock));
        let ratio = RatioChannel::receive(&plan, 1000).unwrap().ratio(Rapidity::ZERO).unwrap();
        let fraction = ((numerator << 48) + denominator / 2) / denominator;
        assert_eq!(ratio.parts(), (whole, fraction as u64), "{output} Hz from {clock} Hz");
    }
}

/// A step beyond half a cycle is a negative frequency; whole cycles per clock drop out; a clock of zero has none.
#[test]
fn steps_wrap() {
    let clock = hertz(48_000);
    let step = |output| PhaseStep::of(hertz(output), clock).unwrap();
    assert_eq!(step(437_000_000 / 48_000 * 48_000), PhaseStep::from_bits(0));
    assert_eq!(step(36_000), PhaseStep::from_bits(3 << 62));
    assert_eq!(step(36_000).to_bits() as i64, -(1 << 62));
    // -1/3 of the clock rounds to the nearest as well, and a word may round up to a whole cycle, which is none.
    assert_eq!(step(32_000).to_word_nearest::<8>(), 171);
    assert_eq!(PhaseStep::from_bits(u64::MAX).to_word_nearest::<8>(), 0);
    assert_eq!(PhaseStep::of(hertz(1), Frequency::default()), None);
}
