//! What a user would otherwise write, with the general libraries.

use super::{Report, line, sample};

const LIGHT: f64 = 299_792_458.0;
const CARRIER: f64 = 437.0e6;
const OSCILLATOR: f64 = 436.0e6;
const CLOCK: f64 = 4.0e6;
const TWO_TO_64: f64 = 18_446_744_073_709_551_616.0;
const TWO_TO_32: f32 = 4_294_967_296.0;

/// Cycles per clock, into a word that wraps.
fn word(cycles: f64) -> u64 {
    ((cycles - libm::floor(cycles)) * TWO_TO_64) as u64
}

fn step_by_square_root(range_rate: f64) -> u64 {
    let beta = range_rate * (1.0 / LIGHT);
    let factor = libm::sqrt((1.0 - beta) / (1.0 + beta));
    word((CARRIER * factor - OSCILLATOR) * (1.0 / CLOCK))
}

fn step_by_rapidity(range_rate: f64) -> u64 {
    let offset = libm::expm1(-libm::atanh(range_rate * (1.0 / LIGHT)));
    word((CARRIER * offset + (CARRIER - OSCILLATOR)) * (1.0 / CLOCK))
}

fn step_by_first_order(range_rate: f64) -> u64 {
    let shift = range_rate * (-CARRIER / LIGHT);
    word((shift + (CARRIER - OSCILLATOR)) * (1.0 / CLOCK))
}

/// The offset in f32, added to the unshifted word in integers: the best that f32 can do.
fn step_by_rapidity_f32(range_rate: f32) -> u32 {
    let offset = libm::expm1f(-libm::atanhf(range_rate * (1.0 / LIGHT) as f32));
    let change = (offset * ((CARRIER / CLOCK) as f32 * TWO_TO_32)) as i32;
    const UNSHIFTED: u32 = ((CARRIER - OSCILLATOR) / CLOCK * 4_294_967_296.0) as u32;
    UNSHIFTED.wrapping_add(change as u32)
}

/// Range rate to phase step.
pub fn range_rate(report: Report) {
    let rate = sample::range_rate;
    let rate_f32 = |index| sample::range_rate(index) as f32;
    line(report, "step/libm-f64-square-root", rate, step_by_square_root);
    line(report, "step/libm-f64-atanh-expm1", rate, step_by_rapidity);
    line(report, "step/f64-first-order", rate, step_by_first_order);
    line(report, "step/libm-f32-atanh-expm1", rate_f32, step_by_rapidity_f32);
}

/// Single functions: over the range of orbital motion and over a wide one.
pub fn functions(report: Report) {
    let small = |index| sample::signed(index, 5.0e-5);
    let small_f32 = |index| sample::signed(index, 5.0e-5) as f32;
    let wide = |index| sample::signed(index, 0.99);
    let wide_f32 = |index| sample::signed(index, 0.99) as f32;
    line(report, "atanh/libm-f64", wide, libm::atanh);
    line(report, "atanh/libm-f64-orbital", small, libm::atanh);
    line(report, "tanh/libm-f64", wide, libm::tanh);
    line(report, "exp/libm-f64", wide, libm::exp);
    line(report, "expm1/libm-f64", wide, libm::expm1);
    line(report, "expm1/libm-f64-orbital", small, libm::expm1);
    line(report, "log1p/libm-f64", wide, libm::log1p);
    line(report, "log/libm-f64", |index| 1.0 + sample::signed(index, 0.99), libm::log);
    line(report, "sqrt/libm-f64", |index| 1.0 + sample::signed(index, 0.99), libm::sqrt);
    line(report, "atanh/libm-f32", wide_f32, libm::atanhf);
    line(report, "atanh/libm-f32-orbital", small_f32, libm::atanhf);
    line(report, "tanh/libm-f32", wide_f32, libm::tanhf);
    line(report, "exp/libm-f32", wide_f32, libm::expf);
    line(report, "expm1/libm-f32", wide_f32, libm::expm1f);
    line(report, "expm1/libm-f32-orbital", small_f32, libm::expm1f);
    line(report, "log1p/libm-f32", wide_f32, libm::log1pf);
    line(report, "exp/micromath-f32", wide_f32, |x| micromath::F32(x).exp().0);
    line(
        report,
        "exp/cordic-i4f28",
        |index| fixed_angle(sample::signed(index, 0.99)),
        |bits| cordic::exp(fixed::types::I4F28::from_bits(bits)).to_bits(),
    );
}

fn fixed_angle(radians: f64) -> i32 {
    (radians * 268_435_456.0) as i32
}

/// Cosine and sine of a phase, over the whole turn.
pub fn cosine_and_sine(report: Report) {
    let radians = |index| sample::signed(index, core::f64::consts::PI);
    let radians_f32 = move |index| radians(index) as f32;
    line(report, "cossin/libm-f64", radians, |x| {
        let (sine, cosine) = libm::sincos(x);
        (cosine, sine)
    });
    line(report, "cossin/libm-f32", radians_f32, |x| {
        let (sine, cosine) = libm::sincosf(x);
        (cosine, sine)
    });
    line(report, "cossin/micromath-f32", radians_f32, |x| {
        let (sine, cosine) = micromath::F32(x).sin_cos();
        (cosine.0, sine.0)
    });
    line(
        report,
        "cossin/cordic-i4f28",
        move |index| fixed_angle(radians(index)),
        |bits| {
            let (sine, cosine) = cordic::sin_cos(fixed::types::I4F28::from_bits(bits));
            (cosine.to_bits(), sine.to_bits())
        },
    );
    line(report, "cossin/idsp", |index| sample::scrambled(index) as i32, idsp::cossin);
}
