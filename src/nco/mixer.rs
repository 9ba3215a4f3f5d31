//! Mixing a block of samples to zero and adding it up.

use core::hint::black_box;

use num_complex::Complex;

use super::Nco;
use super::tables::MIXER_WAVE;
use crate::frequency::PhaseStep;
use crate::nco::PhaseRamp;

/// Samples between two looks at the 64-bit phase. Within them phase, step and ramp are the upper 32 bits,
/// rounded, which at the end is less than 128 * 129 / 2 * 2^-33 = 9.7e-7 cycle off (-104 dB).
const CHUNK: usize = 128;

/// Multiplies samples by the conjugate of an oscillator and adds the products up in 64 bits, until they are
/// taken out: a carrier at the oscillator's frequency comes out at zero.
///
/// Sample `x` contributes `x * (cosine - j sine)` with an amplitude of
/// [`MIXER_AMPLITUDE`](super::bounds::MIXER_AMPLITUDE). No product is rounded, so none leaves an offset that a loop
/// could lock to. At full scale 2^32 samples fit between two dumps.
///
/// # Accuracy
/// The oscillator here is cheaper than the one of [`Nco::next_i16`]: no spur above
/// [`MIXER_SPUR_DBC`](super::bounds::MIXER_SPUR_DBC) (`tests/nco_spectrum.rs`). Phase and step between blocks are
/// exactly those of [`Nco`].
///
/// # Cost
/// About 30 instructions for a complex sample on a Cortex-M4F and 58 on a Cortex-M0, oscillator included, in
/// blocks of 128 or more; independent of the data. 1 KiB of table.
///
/// # Source
/// The oscillator's pair is that of the middle of one of 256 cells of the circle, turned by the rest d of the
/// angle to first order, (c - s d, s + c d).
///
/// ```
/// use num_complex::Complex;
/// use shiftkeel::frequency::PhaseStep;
/// use shiftkeel::nco::{Mixer, Nco, PhaseRamp, bounds};
///
/// // A carrier at a quarter of the sampling rate.
/// let carrier = [(1000, 0), (0, 1000), (-1000, 0), (0, -1000)].map(|(i, q)| Complex::new(i, q));
/// let mut mixer = Mixer::new(Nco::at_phase(0));
/// mixer.retune(PhaseStep::from_bits(1 << 62), PhaseRamp::ZERO);
/// mixer.mix(&carrier);
/// let sum = mixer.dump();
/// let expected = 4000.0 * bounds::MIXER_AMPLITUDE;
/// assert!((sum.re as f64 / expected - 1.0).abs() < 1e-4);
/// assert!((sum.im as f64 / expected).abs() < 1e-4);
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default)]
pub struct Mixer {
    oscillator: Nco,
    sum: Complex<i64>,
}

impl Mixer {
    /// A mixer with nothing added up yet.
    pub const fn new(oscillator: Nco) -> Self {
        Self { oscillator, sum: Complex { re: 0, im: 0 } }
    }

    /// The oscillator as the next sample will find it.
    pub const fn oscillator(&self) -> &Nco {
        &self.oscillator
    }

    /// Retunes the oscillator; its phase and the sum are untouched. See [`Nco::retune`].
    pub const fn retune(&mut self, first_step: PhaseStep, ramp_per_clock: PhaseRamp) {
        self.oscillator.retune(first_step, ramp_per_clock);
    }

    /// Shifts the oscillator's phase. See [`Nco::shift_phase`].
    pub const fn shift_phase(&mut self, cycles: u64) {
        self.oscillator.shift_phase(cycles);
    }

    /// Returns the sum since the last dump, and starts again from zero.
    pub const fn dump(&mut self) -> Complex<i64> {
        core::mem::replace(&mut self.sum, Complex { re: 0, im: 0 })
    }

    /// Mixes complex samples to zero and adds them to the sum. Any values, any length.
    pub fn mix(&mut self, samples: &[Complex<i16>]) {
        self.mix_with(samples, |sample, (cosine, sine)| {
            let (i, q) = (sample.re as i32, sample.im as i32);
            // The pair's length is below 2^14.5, so this is below 2^30 and two of them fit.
            (
                i.wrapping_mul(cosine).wrapping_add(q.wrapping_mul(sine)),
                q.wrapping_mul(cosine).wrapping_sub(i.wrapping_mul(sine)),
            )
        });
    }

    /// Mixes real samples to zero and adds them to the sum. Any values, any length.
    pub fn mix_real(&mut self, samples: &[i16]) {
        self.mix_with(samples, |&sample, (cosine, sine)| {
            let sample = sample as i32;
            (sample.wrapping_mul(cosine), 0i32.wrapping_sub(sample.wrapping_mul(sine)))
        });
    }

    #[inline(always)]
    fn mix_with<Sample>(&mut self, samples: &[Sample], product: impl Fn(&Sample, (i32, i32)) -> (i32, i32)) {
        for chunk in samples.chunks(CHUNK) {
            let mut turning = Turning::of(&self.oscillator);
            let (mut re, mut im) = (self.sum.re, self.sum.im);
            let mut pairs = chunk.chunks_exact(2);
            for pair in &mut pairs {
                // Keeps the compiler from unrolling and interleaving, which costs a third more in spills.
                black_box(());
                let [first, second] = pair else { continue };
                let (re_first, im_first) = product(first, turning.next());
                black_box(());
                let (re_second, im_second) = product(second, turning.next());
                re = re.wrapping_add(re_first.wrapping_add(re_second) as i64);
                im = im.wrapping_add(im_first.wrapping_add(im_second) as i64);
            }
            for last in pairs.remainder() {
                let (re_last, im_last) = product(last, turning.next());
                re = re.wrapping_add(re_last as i64);
                im = im.wrapping_add(im_last as i64);
            }
            self.sum = Complex { re, im };
            // With a constant the products of the usual case become shifts.
            if chunk.len() == CHUNK {
                self.oscillator.advance(CHUNK as u64);
            } else {
                self.oscillator.advance(chunk.len() as u64);
            }
        }
    }
}

/// The oscillator within a chunk: the upper halves of phase, step and ramp.
struct Turning {
    phase: u32,
    step: u32,
    ramp: u32,
}

impl Turning {
    fn of(oscillator: &Nco) -> Self {
        let upper = |bits: u64| (bits.wrapping_add(1 << 31) >> 32) as u32;
        Self {
            phase: upper(oscillator.phase()),
            step: upper(oscillator.step().to_bits()),
            ramp: upper(oscillator.ramp().to_bits() as u64),
        }
    }

    /// Cosine and sine of the phase, then one clock.
    #[inline(always)]
    #[allow(clippy::indexing_slicing, reason = "eight bits index 256 entries")]
    #[allow(clippy::cast_possible_truncation, reason = "the lower half is cut out on purpose")]
    fn next(&mut self) -> (i32, i32) {
        // The sine above, the cosine below.
        let entry = MIXER_WAVE[(self.phase >> 24) as usize] as i32;
        let (cosine, sine) = (entry as i16 as i32, entry >> 16);
        // From the cell's middle, in 2^-16 rad: 201 / 2^13 is 2 pi / 256.
        let rest = ((self.phase << 8 >> 16) as i32).wrapping_mul(201).wrapping_sub(201 << 15) >> 13;
        // The table is half a unit too high, so that rounding down rounds to nearest; for the sine the cosine
        // below counts as a fraction.
        let turned = (
            (entry << 16).wrapping_sub(sine.wrapping_mul(rest)) >> 16,
            entry.wrapping_add(cosine.wrapping_mul(rest)) >> 16,
        );
        self.phase = self.phase.wrapping_add(self.step);
        self.step = self.step.wrapping_add(self.ramp);
        turned
    }
}
