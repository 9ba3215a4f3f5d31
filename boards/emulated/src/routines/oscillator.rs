//! The library's oscillator.

use super::{Report, line, sample};
use crate::count::in_memory;
use num_complex::Complex;
use shiftkeel::frequency::PhaseStep;
use shiftkeel::nco::{Mixer, Nco, PhaseRamp, cosine_sine_fine, cosine_sine_quick, cosine_sine_quick_i16};

/// Cosine and sine of a phase, over the whole turn.
pub fn cosine_and_sine(report: Report) {
    let phase = sample::scrambled;
    line(report, "nco::cosine_sine_quick", phase, |phase| {
        let output = cosine_sine_quick(phase);
        (output.re, output.im)
    });
    line(report, "nco::cosine_sine_quick_i16", phase, |phase| {
        let output = cosine_sine_quick_i16(phase);
        (output.re, output.im)
    });
    line(report, "nco::cosine_sine_fine", phase, |phase| {
        let output = cosine_sine_fine(phase);
        (output.re, output.im)
    });
}

/// The oscillator itself, its state in memory between calls.
pub fn oscillator(report: Report) {
    let mut oscillator = Nco::at_phase(0);
    oscillator.retune(PhaseStep::from_bits(0x0123_4567_89ab_cdef), PhaseRamp::from_bits(-77));
    let start = oscillator;
    let none = |_| ();
    line(report, "nco::Nco::tick", none, |()| {
        let oscillator = in_memory(&mut oscillator);
        oscillator.tick();
        oscillator.phase_u32()
    });
    oscillator = start;
    line(report, "nco::Nco::next_i16", none, |()| {
        let output = in_memory(&mut oscillator).next_i16();
        (output.re, output.im)
    });
    oscillator = start;
    line(report, "nco::Nco::next_i32", none, |()| {
        let output = in_memory(&mut oscillator).next_i32();
        (output.re, output.im)
    });
    oscillator = start;
    line(
        report,
        "nco::Nco::advance",
        |index| sample::scrambled(index).into(),
        |clocks: u64| {
            let oscillator = in_memory(&mut oscillator);
            oscillator.advance(clocks);
            oscillator.phase()
        },
    );
    oscillator = start;
    let mut block = [Complex::new(0, 0); 256];
    line(report, "nco::Nco::fill_i16,256-outputs", none, |()| {
        let block: &mut [_; 256] = in_memory(&mut block);
        in_memory(&mut oscillator).fill_i16(block);
    });
    let mut mixer = Mixer::new(start);
    let mut samples: [Complex<i16>; 128] = core::array::from_fn(|index| {
        let bits = sample::scrambled(index as u32);
        Complex::new(bits as i16, (bits >> 16) as i16)
    });
    line(report, "nco::Mixer::mix,128-samples", none, |()| {
        let samples: &mut [_; 128] = in_memory(&mut samples);
        let mixer = in_memory(&mut mixer);
        mixer.mix(samples);
        let sum = mixer.dump();
        (sum.re, sum.im)
    });
    mixer = Mixer::new(start);
    let mut real: [i16; 128] = core::array::from_fn(|index| sample::scrambled(index as u32) as i16);
    line(report, "nco::Mixer::mix_real,128-samples", none, |()| {
        let samples: &mut [_; 128] = in_memory(&mut real);
        let mixer = in_memory(&mut mixer);
        mixer.mix_real(samples);
        let sum = mixer.dump();
        (sum.re, sum.im)
    });
}
