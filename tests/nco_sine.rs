//! Worst errors of the cosine and sine routines over their phases, against f64.
//!
//! By default a prime stride covers every segment, offset and quadrant; `SHIFTKEEL_EXHAUSTIVE=1` takes all
//! 2^32 phases on all cores.

use std::f64::consts::TAU;

use num_complex::Complex;
use shiftkeel::nco::{bounds, cosine_sine_fine, cosine_sine_quick, cosine_sine_quick_i16};

const FULL_SCALE: f64 = bounds::FULL_SCALE as f64;

fn stride() -> usize {
    if std::env::var_os("SHIFTKEEL_EXHAUSTIVE").is_some() { 1 } else { 1009 }
}

/// Worst of `error(phase, cosine, sine)` over the phases, on all cores. The reference turns a unit vector by
/// f64 rotations within blocks of at most 1024 and starts each block from `sin_cos`: good to 1e-13.
fn worst(error: impl Fn(u32, f64, f64) -> f64 + Sync) -> f64 {
    let stride = stride();
    let threads = std::thread::available_parallelism().map_or(2, usize::from);
    let (turn_sine, turn_cosine) = (stride as f64 / 4_294_967_296.0 * TAU).sin_cos();
    let share = (1usize << 32) / threads;
    let range = |thread: usize| {
        let mut worst = 0.0f64;
        let mut phase = thread * share;
        let end = if thread + 1 == threads { 1 << 32 } else { (thread + 1) * share };
        while phase < end {
            let (mut sine, mut cosine) = (phase as f64 / 4_294_967_296.0 * TAU).sin_cos();
            for _ in 0..1024 {
                if phase >= end {
                    break;
                }
                worst = worst.max(error(phase as u32, cosine, sine));
                (cosine, sine) =
                    (cosine * turn_cosine - sine * turn_sine, sine * turn_cosine + cosine * turn_sine);
                phase += stride;
            }
        }
        worst
    };
    std::thread::scope(|scope| {
        let workers: Vec<_> = (0..threads).map(|thread| scope.spawn(move || range(thread))).collect();
        workers.into_iter().map(|worker| worker.join().unwrap()).fold(0.0, f64::max)
    })
}

/// A bound must hold, and must not be padded: at most 1.25 times the worst that was seen.
fn assert_tight(what: &str, seen: f64, bound: f64) {
    println!("{what}: seen {seen:e}, bound {bound:e}, seen/bound {:.3}", seen / bound);
    assert!(seen <= bound, "{what}: {seen:e} exceeds the stated {bound:e}");
    assert!(bound <= 1.25 * seen, "{what}: stated {bound:e} is padded, worst seen {seen:e}");
}

fn in_full_scales(pair: Complex<i32>, cosine: f64, sine: f64) -> f64 {
    let error = |value: i32, exact: f64| (f64::from(value) / FULL_SCALE - exact).abs();
    error(pair.re, cosine).max(error(pair.im, sine))
}

#[test]
fn quick_is_within_its_bound() {
    let seen = worst(|phase, cosine, sine| in_full_scales(cosine_sine_quick(phase), cosine, sine));
    assert_tight("quick, 32 bits", seen, bounds::QUICK_ERROR);
}

#[test]
fn quick_i16_is_within_its_bound() {
    let seen = worst(|phase, cosine, sine| {
        let pair = cosine_sine_quick_i16(phase);
        let error = |value: i16, exact: f64| (f64::from(value) - 32767.0 * exact).abs();
        error(pair.re, cosine).max(error(pair.im, sine))
    });
    assert_tight("quick, 16 bits", seen, bounds::QUICK_I16_ERROR);
}

#[test]
fn fine_is_within_its_bound() {
    let seen = worst(|phase, cosine, sine| in_full_scales(cosine_sine_fine(phase), cosine, sine));
    assert_tight("fine, 32 bits", seen, bounds::FINE_ERROR);
}

#[test]
fn axes_are_exact() {
    let full = bounds::FULL_SCALE;
    for (quadrant, (cosine, sine)) in [(1, 0), (0, 1), (-1, 0), (0, -1)].into_iter().enumerate() {
        let phase = (quadrant as u32) << 30;
        // Table entries of the second half are complements: one unit of 2^-31 off.
        let quick = cosine_sine_quick(phase);
        assert!((quick.re - cosine * full).abs() <= 1 && (quick.im - sine * full).abs() <= 1, "{quick}");
        assert_eq!(cosine_sine_quick_i16(phase), Complex::new(cosine as i16 * 32767, sine as i16 * 32767));
    }
}

#[test]
fn the_fine_pair_has_exact_symmetries() {
    for phase in (0..1u64 << 32).step_by(99_991).map(|phase| phase as u32).chain([0, u32::MAX, 1 << 31]) {
        let here = cosine_sine_fine(phase);
        assert_eq!(cosine_sine_fine(phase.wrapping_add(1 << 31)), -here);
        assert_eq!(cosine_sine_fine(phase.wrapping_add(1 << 30)), Complex::new(-here.im, here.re));
    }
}
