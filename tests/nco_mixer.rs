//! The mixer against the products it stands for: exact sums, no offset, continuity, and the longest inputs.

use std::f64::consts::TAU;

use num_complex::Complex;
use shiftkeel::frequency::PhaseStep;
use shiftkeel::nco::{Mixer, Nco, PhaseRamp, bounds};

#[path = "reference/nco_words.rs"]
mod words;
use words::words;

fn mixer(phase: u64, step: u64, ramp: i64) -> Mixer {
    let mut mixer = Mixer::new(Nco::at_phase(phase));
    mixer.retune(PhaseStep::from_bits(step), PhaseRamp::from_bits(ramp));
    mixer
}

/// What the mixer multiplies sample `n` of a block with: the answer to a single one among zeros.
fn oscillator(mixer: &Mixer, n: usize) -> Complex<i64> {
    let mut block = vec![Complex::new(0i16, 0); n + 1];
    block[n].re = 1;
    let mut mixer = *mixer;
    mixer.mix(&block);
    mixer.dump()
}

fn times(sample: Complex<i16>, oscillator: Complex<i64>) -> Complex<i64> {
    Complex::new(i64::from(sample.re), i64::from(sample.im)) * oscillator
}

#[test]
fn the_sum_is_that_of_the_single_products_to_the_bit() {
    let mut words = words(1);
    for length in [1, 2, 3, 127, 128, 129, 300] {
        let ramp = words.next().unwrap() as i64 >> 24;
        let start = mixer(words.next().unwrap(), words.next().unwrap(), ramp);
        let samples: Vec<_> = (0..length)
            .map(|_| words.next().unwrap())
            .map(|word| Complex::new(word as i16, (word >> 16) as i16))
            .collect();
        let expected: Complex<i64> =
            samples.iter().enumerate().map(|(n, &sample)| times(sample, oscillator(&start, n))).sum();
        let mut mixer = start;
        mixer.mix(&samples);
        assert_eq!(mixer.dump(), expected, "{length} complex samples");
        assert_eq!(mixer.dump(), Complex::new(0, 0), "a dump starts from zero");
        // Real samples are complex ones without a quadrature part.
        let real: Vec<i16> = samples.iter().map(|sample| sample.re).collect();
        let complex: Vec<_> = real.iter().map(|&sample| Complex::new(sample, 0)).collect();
        let (mut of_real, mut of_complex) = (start, start);
        of_real.mix_real(&real);
        of_complex.mix(&complex);
        assert_eq!(of_real, of_complex, "{length} real samples");
    }
}

#[test]
fn the_oscillator_moves_on_as_any_other() {
    let mut words = words(2);
    for length in [0, 1, 2, 127, 128, 129, 1000] {
        let mut mixer = mixer(words.next().unwrap(), words.next().unwrap(), words.next().unwrap() as i64);
        let mut expected = *mixer.oscillator();
        expected.advance(length as u64);
        mixer.mix(&vec![Complex::new(0, 0); length]);
        assert_eq!(*mixer.oscillator(), expected);
    }
}

fn distance(pair: Complex<i64>, phase: u64) -> f64 {
    let angle = phase as f64 / 2.0f64.powi(64) * TAU;
    let exact = Complex::from_polar(bounds::MIXER_AMPLITUDE, angle);
    (Complex::new(pair.re as f64, -(pair.im as f64)) - exact).norm()
}

/// The upper 24 bits of the phase are all that the pair depends on: these are all pairs there are.
#[test]
fn the_pair_is_within_its_bound_at_every_phase() {
    let mut worst = 0.0f64;
    for upper in 0..1u64 << 24 {
        let phase = upper << 40 | 1 << 39;
        let mut mixer = Mixer::new(Nco::at_phase(phase));
        mixer.mix_real(&[1]);
        worst = worst.max(distance(mixer.dump(), phase));
    }
    println!("worst distance of the mixer's pair: {worst:.3} units of {}", bounds::MIXER_AMPLITUDE);
    assert!(worst <= bounds::MIXER_PAIR_ERROR);
    assert!(bounds::MIXER_PAIR_ERROR <= 1.25 * worst, "the stated bound is padded");
}

#[test]
fn the_pair_follows_the_exact_phase_through_blocks_and_ramps() {
    let mut words = words(3);
    for _ in 0..2000 {
        // Ramps up to 2^-21 cycle per clock squared: 31 Hz/s at 8 kHz, 30 kHz/s at 250 kHz.
        let ramp = words.next().unwrap() as i64 >> 20;
        let start = mixer(words.next().unwrap(), words.next().unwrap(), ramp);
        let n = (words.next().unwrap() % 300) as usize;
        let mut exact = *start.oscillator();
        exact.advance(n as u64);
        // Within a block of 128 phase, step and ramp are rounded to 2^-32: together 9.7e-7 cycle.
        let limit = bounds::MIXER_PAIR_ERROR + 9.7e-7 * TAU * bounds::MIXER_AMPLITUDE;
        assert!(distance(oscillator(&start, n), exact.phase()) <= limit);
    }
}

/// The last pair of a block, on average over phases, so that the rounding of the pairs does not hide the phase.
#[test]
fn the_phase_at_the_end_of_a_block_is_as_close_as_stated() {
    // Steps and ramps whose lower halves are as far as can be from what a rounded upper half keeps.
    let lower = [0x7FFF_FFFFu64, 0x8000_0000, 0xFFFF_FFFF];
    let pairs = lower.iter().flat_map(|&step| lower.map(|ramp| (step, ramp)));
    let mut worst = 0.0f64;
    for (step, ramp) in pairs {
        let turns = words(5).take(4000).map(|phase| {
            let start = mixer(phase, 0x1234_5678 << 32 | step, ramp as i64);
            let mut exact = *start.oscillator();
            exact.advance(127);
            let pair = oscillator(&start, 127);
            let angle = exact.phase() as f64 / 2.0f64.powi(64) * TAU;
            let turned = Complex::new(pair.re as f64, -(pair.im as f64)) * Complex::from_polar(1.0, -angle);
            turned.arg() / TAU
        });
        worst = worst.max((turns.sum::<f64>() / 4000.0).abs());
    }
    // Half a unit of 2^-32 in the phase, in each of 127 steps, and in the ramp in each of 127 * 126 / 2.
    let bound = (0.5 + 63.5 + 4000.5) / 2.0f64.powi(32);
    println!("phase at the end of a block: seen {worst:e} cycle, bound {bound:e}");
    // Rounded pairs leave a few parts in 10^8 in the mean.
    assert!(worst < bound + 5e-8 && bound < 1.25 * worst);
}

#[test]
fn the_largest_samples_do_not_overflow() {
    // The corner of the square of samples lies on the diagonal: every product has its largest magnitude there.
    for corner in [(i16::MIN, i16::MIN), (i16::MAX, i16::MIN), (i16::MIN, i16::MAX), (i16::MAX, i16::MAX)] {
        let sample = Complex::new(corner.0, corner.1);
        // Every cell of the circle at many places, and a step of zero so that both of a pair are at their worst.
        for phase in (0..1u64 << 16).map(|place| place << 48 | 0x7FFF_FFFF) {
            let start = mixer(phase, 0, 0);
            let expected = times(sample, oscillator(&start, 0)) * 3;
            let mut mixer = start;
            mixer.mix(&[sample; 3]);
            assert_eq!(mixer.dump(), expected, "sample {sample} at phase {phase:#x}");
        }
    }
}

/// With nothing at the oscillator's frequency nothing comes out: white noise of a single bit, the harshest case
/// for products that are rounded, averages to zero as fast as noise does.
#[test]
fn there_is_no_offset() {
    let mut words = words(4);
    let mut mixer = mixer(words.next().unwrap(), words.next().unwrap(), 0);
    let length = 1 << 22;
    let mut noise = words.flat_map(|word| (0..32).map(move |k| word >> (2 * k)));
    let mut sum = Complex::new(0i64, 0);
    for _ in 0..length / 1024 {
        // -1, 0, 0 or 1: noise of zero mean with half a unit squared of power in each rail.
        let value = |bits: u64| (bits & 1) as i16 - (bits >> 1 & 1) as i16;
        let block: Vec<_> = (0..1024)
            .map(|_| Complex::new(value(noise.next().unwrap()), value(noise.next().unwrap())))
            .collect();
        mixer.mix(&block);
        sum += mixer.dump();
    }
    let mean = |sum: i64| sum as f64 / length as f64 / bounds::MIXER_AMPLITUDE;
    // One sigma of the mean is sqrt(1/2 / length); rounding each product down would shift it by half a unit
    // of whatever it is rounded to. Five sigma: 1.7e-3 of a sample's last place.
    let limit = 5.0 * (0.5 / length as f64).sqrt();
    println!("offset {:e}, {:e} of a sample's last place, limit {limit:e}", mean(sum.re), mean(sum.im));
    assert!(mean(sum.re).abs() < limit && mean(sum.im).abs() < limit);
    // Without any signal the sum is exactly zero.
    mixer.mix(&[Complex::new(0, 0); 1000]);
    assert_eq!(mixer.dump(), Complex::new(0, 0));
}
