//! The accumulator's phase over retunes and ramps, against exact wide integers.

use num_complex::Complex;
use shiftkeel::frequency::PhaseStep;
use shiftkeel::nco::{Nco, PhaseRamp, cosine_sine_fine, cosine_sine_quick_i16};

#[path = "reference/nco_words.rs"]
mod words;
use words::words;

/// Phase and step after `n` clocks by the formula, in 128 bits with the modulus taken last; `n` below 2^32.
fn after(phase: u64, step: u64, ramp: i64, n: u64) -> (u64, u64) {
    let pairs = i128::from(n) * (i128::from(n) - 1) / 2;
    let travelled = (pairs as u128).wrapping_mul(i128::from(ramp) as u128) as u64;
    let turned = (u128::from(n) * u128::from(step)) as u64;
    let new_step = (i128::from(step) + i128::from(n) * i128::from(ramp)) as u64;
    ((u128::from(phase) + u128::from(turned) + u128::from(travelled)) as u64, new_step)
}

#[test]
fn single_clocks_and_one_advance_end_where_the_formula_says() {
    let mut words = words(1);
    for n in [0, 1, 2, 3, 4, 7, 100, 4097] {
        for _ in 0..50 {
            let (phase, step) = (words.next().unwrap(), words.next().unwrap());
            let ramp = words.next().unwrap() as i64 >> (words.next().unwrap() % 64);
            let mut single = Nco::at_phase(phase);
            single.retune(PhaseStep::from_bits(step), PhaseRamp::from_bits(ramp));
            let mut at_once = single;
            for _ in 0..n {
                single.tick();
            }
            at_once.advance(n);
            assert_eq!(single, at_once);
            assert_eq!((single.phase(), single.step().to_bits()), after(phase, step, ramp, n));
            assert_eq!(single.ramp().to_bits(), ramp);
        }
    }
}

#[test]
fn long_advances_follow_the_formula_and_add_up() {
    let mut words = words(2);
    for _ in 0..1000 {
        let (phase, step, ramp) =
            (words.next().unwrap(), words.next().unwrap(), words.next().unwrap() as i64);
        let (first, second) = (words.next().unwrap(), words.next().unwrap());
        let mut whole = Nco::at_phase(phase);
        whole.retune(PhaseStep::from_bits(step), PhaseRamp::from_bits(ramp));
        let mut parts = whole;
        let n = first >> 32;
        whole.advance(n);
        assert_eq!((whole.phase(), whole.step().to_bits()), after(phase, step, ramp, n));
        // Any two lengths, also those whose sum wraps, since everything is modulo 2^64.
        let mut whole = parts;
        parts.advance(first);
        parts.advance(second);
        whole.advance(first.wrapping_add(second));
        if first.checked_add(second).is_some() {
            assert_eq!(whole, parts);
        }
    }
    // The longest advance there is, at the largest ramp: minus one clock modulo 2^64 of steps.
    let mut oscillator = Nco::at_phase(0);
    oscillator.retune(PhaseStep::from_bits(1), PhaseRamp::from_bits(i64::MIN));
    oscillator.advance(u64::MAX);
    // n = -1: phase = -1 + (1 << 63) * n (n - 1) / 2 = -1 + (1 << 63) * 1 (odd), as (-1)(-2)/2 is (2^64-1)(2^63-1).
    assert_eq!(oscillator.phase(), u64::MAX.wrapping_add(1 << 63));
}

#[test]
fn a_retune_leaves_the_phase_and_the_output_alone() {
    let mut words = words(3);
    let mut oscillator = Nco::at_phase(words.next().unwrap());
    let mut expected = oscillator.phase();
    for _ in 0..200 {
        let (step, ramp) = (words.next().unwrap(), words.next().unwrap() as i64 >> 30);
        oscillator.retune(PhaseStep::from_bits(step), PhaseRamp::from_bits(ramp));
        assert_eq!(oscillator.phase(), expected);
        let n = words.next().unwrap() % 50;
        for clock in 0..n {
            let (phase, _) = after(expected, step, ramp, clock);
            assert_eq!(oscillator.phase_u32(), (phase >> 32) as u32);
            assert_eq!(oscillator.next_i16(), cosine_sine_quick_i16((phase >> 32) as u32));
        }
        expected = after(expected, step, ramp, n).0;
    }
}

#[test]
fn blocks_equal_single_outputs() {
    let mut words = words(4);
    for length in [0, 1, 2, 63, 64, 257] {
        let mut oscillator = Nco::at_phase(words.next().unwrap());
        let ramp = PhaseRamp::from_bits(words.next().unwrap() as i64 >> 20);
        oscillator.retune(PhaseStep::from_bits(words.next().unwrap()), ramp);
        let mut single = oscillator;
        let mut fine = oscillator;
        let mut block = vec![Complex::new(0i16, 0); length];
        oscillator.fill_i16(&mut block);
        for (index, output) in block.iter().enumerate() {
            assert_eq!(*output, cosine_sine_quick_i16(single.phase_u32()), "output {index}");
            single.tick();
        }
        assert_eq!(oscillator, single);
        let mut single = fine;
        let mut block = vec![Complex::new(0i32, 0); length];
        fine.fill_i32(&mut block);
        for output in &block {
            assert_eq!(*output, cosine_sine_fine(single.phase_u32()));
            assert_eq!(*output, single.next_i32());
        }
        assert_eq!(fine, single);
    }
}
