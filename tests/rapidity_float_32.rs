//! The float functions: nearest float to the exact value for all 2^32 floats with `SHIFTKEEL_EXHAUSTIVE=1`, else
//! for every 4,093rd and the ends.
//!
//! The reference is f64, good to 2^-48; where both ends of that interval do not round to the same float, 200 bits
//! decide.

#[path = "reference/multiprecision.rs"]
mod reference;
#[path = "reference/sweep.rs"]
mod sweep;

use reference::{Big, big};
use shiftkeel::rapidity::float_32::*;
use sweep::worst;

/// The float nearest to a value known as an f64 and, on demand, in 200 bits.
fn nearest(rough: f64, exact: impl FnOnce() -> Big) -> f32 {
    let slack = 2_f64.powi(-48);
    let (low, high) = ((rough * (1.0 - slack)) as f32, (rough * (1.0 + slack)) as f32);
    if low.to_bits() == high.to_bits() || !rough.is_finite() {
        return rough as f32;
    }
    let middle = (f64::from(low) + f64::from(high)) / 2.0;
    let middle = Big::try_from(middle).expect("finite");
    let (down, up) = if low < high { (low, high) } else { (high, low) };
    if exact() > middle { up } else { down }
}

/// The float as a number of 200 bits.
fn number(x: f32) -> Big {
    Big::try_from(x).expect("finite").with_precision(200).value()
}

/// Asserts that `function` gives the nearest float for all floats of the sweep; NaN must be the one NaN.
fn assert_correctly_rounded(
    name: &str,
    function: fn(f32) -> f32,
    rough: fn(f64) -> f64,
    exact: fn(Big) -> Big,
) {
    let wrong = worst(|bits| {
        let x = f32::from_bits(bits as u32);
        let rough = rough(f64::from(x));
        let seen = function(x).to_bits();
        let expected =
            if rough.is_nan() { 0x7fc0_0000 } else { nearest(rough, || exact(number(x))).to_bits() };
        if seen == expected { 0.0 } else { 1.0 }
    });
    assert_eq!(wrong, 0.0, "{name} is not the nearest float at the place above");
}

#[test]
fn factor_of_rapidity_is_correctly_rounded() {
    assert_correctly_rounded("exp", factor_of_rapidity, f64::exp, |x| x.exp());
}

#[test]
fn offset_of_rapidity_is_correctly_rounded() {
    assert_correctly_rounded("exp - 1", offset_of_rapidity, f64::exp_m1, |x| x.exp_m1());
}

#[test]
fn beta_of_rapidity_is_correctly_rounded() {
    assert_correctly_rounded("tanh", beta_of_rapidity, f64::tanh, |x| x.tanh());
}

#[test]
fn rapidity_of_beta_is_correctly_rounded() {
    let rough = |b: f64| match b.abs() {
        1.0 => b * f64::INFINITY,
        0.0 => b,
        size => (0.5 * (2.0 * size / (1.0 - size)).ln_1p()).copysign(b),
    };
    assert_correctly_rounded("atanh", rapidity_of_beta, rough, |b| b.atanh());
}

#[test]
fn factor_of_beta_is_correctly_rounded() {
    let rough = |b: f64| ((1.0 + b) / (1.0 - b)).sqrt();
    assert_correctly_rounded("sqrt((1 + b)/(1 - b))", factor_of_beta, rough, |b| {
        ((big(1, 0) + &b) / (big(1, 0) - b)).sqrt()
    });
}

#[test]
fn special_floats() {
    let nan = 0x7fc0_0000;
    for odd in [f32::NAN, -f32::NAN, f32::from_bits(0x7f80_0001), f32::from_bits(0xffff_ffff)] {
        for function in
            [factor_of_rapidity, offset_of_rapidity, beta_of_rapidity, rapidity_of_beta, factor_of_beta]
        {
            assert_eq!(function(odd).to_bits(), nan);
        }
    }
    for function in [offset_of_rapidity, beta_of_rapidity, rapidity_of_beta] {
        assert_eq!(function(0.0).to_bits(), 0.0_f32.to_bits());
        assert_eq!(function(-0.0).to_bits(), (-0.0_f32).to_bits());
        for subnormal in [1, 0x8000_0001, 0x007f_ffff, 0x807f_ffff].map(f32::from_bits) {
            assert_eq!(function(subnormal).to_bits(), subnormal.to_bits());
        }
    }
    for function in [factor_of_rapidity, factor_of_beta] {
        assert_eq!(function(0.0), 1.0);
        assert_eq!(function(-0.0), 1.0);
    }
    assert_eq!(factor_of_rapidity(f32::INFINITY), f32::INFINITY);
    assert_eq!(factor_of_rapidity(f32::NEG_INFINITY).to_bits(), 0);
    assert_eq!(offset_of_rapidity(f32::INFINITY), f32::INFINITY);
    assert_eq!(offset_of_rapidity(f32::NEG_INFINITY), -1.0);
    assert_eq!(beta_of_rapidity(f32::INFINITY), 1.0);
    assert_eq!(beta_of_rapidity(f32::NEG_INFINITY), -1.0);
    assert_eq!(rapidity_of_beta(1.0), f32::INFINITY);
    assert_eq!(rapidity_of_beta(-1.0), f32::NEG_INFINITY);
    assert_eq!(rapidity_of_beta(f32::INFINITY).to_bits(), nan);
    assert_eq!(rapidity_of_beta(1.0000001).to_bits(), nan);
    assert_eq!(factor_of_beta(1.0), f32::INFINITY);
    assert_eq!(factor_of_beta(-1.0).to_bits(), 0);
    assert_eq!(factor_of_beta(-1.0000001).to_bits(), nan);
}
