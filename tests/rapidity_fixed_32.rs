//! The 32-bit kernels against f64, over all 2^32 inputs with `SHIFTKEEL_EXHAUSTIVE=1`, else over every
//! 4,093rd and the ends. An f64 holds the exact value to 2^-18 of a unit; it is never rounded to the format.

#[path = "reference/sweep.rs"]
mod sweep;

use fixed::types::{I1F31, I4F28};
use shiftkeel::rapidity::bounds;
use shiftkeel::rapidity::fixed_32::*;
use sweep::{assert_tight, worst};

fn beta(bits: i32) -> f64 {
    f64::from(bits) / (1_u64 << 31) as f64
}

fn rapidity(bits: i32) -> f64 {
    f64::from(bits) / (1_u64 << 28) as f64
}

/// atanh without cancellation at either end.
fn inverse_tangent(b: f64) -> f64 {
    (0.5 * (2.0 * b.abs() / (1.0 - b.abs())).ln_1p()).copysign(b)
}

#[test]
fn rapidity_of_beta_within_its_bound_over_all_inputs() {
    let worst = worst(|bits| {
        let seen = rapidity_of_beta(I1F31::from_bits(bits)).to_bits();
        let exact = inverse_tangent(beta(bits)) * 2_f64.powi(28);
        if exact > f64::from(i32::MAX) {
            return if seen == i32::MAX { 0.0 } else { f64::INFINITY };
        }
        if exact < f64::from(i32::MIN) {
            return if seen == i32::MIN { 0.0 } else { f64::INFINITY };
        }
        (f64::from(seen) - exact).abs()
    });
    assert_tight("rapidity of beta, 32 bits", worst, bounds::RAPIDITY_OF_BETA_32);
}

#[test]
fn beta_of_rapidity_within_its_bound_over_all_inputs() {
    let worst = worst(|bits| {
        let seen = beta_of_rapidity(I4F28::from_bits(bits)).to_bits();
        (f64::from(seen) - rapidity(bits).tanh() * 2_f64.powi(31)).abs()
    });
    assert_tight("beta of rapidity, 32 bits", worst, bounds::BETA_OF_RAPIDITY_32);
}

fn factor_error(factor: ShiftFactor32, exact: f64) -> f64 {
    if factor.mantissa() >> 31 != 1 {
        return f64::INFINITY;
    }
    (f64::from(factor.mantissa()) - exact * 2_f64.powi(31 - factor.exponent())).abs()
}

#[test]
fn factor_of_rapidity_within_its_bound_over_all_inputs() {
    let worst = worst(|bits| factor_error(factor_of_rapidity(I4F28::from_bits(bits)), rapidity(bits).exp()));
    assert_tight("factor of rapidity, 32 bits", worst, bounds::FACTOR_OF_RAPIDITY_32);
}

/// Rapidities so close below a multiple of ln 2 that a mantissa of 32 bits rounds up to the power of two.
#[test]
fn factor_just_below_a_power_of_two() {
    let mut found = 0;
    for power in -11..=11 {
        let below = (f64::from(power) * core::f64::consts::LN_2 * 2_f64.powi(28)).floor() as i32;
        let factor = factor_of_rapidity(I4F28::from_bits(below));
        assert!(factor_error(factor, rapidity(below).exp()) <= bounds::FACTOR_OF_RAPIDITY_32, "{below}");
        found += i32::from(factor.mantissa() == 1 << 31 && power != 0);
    }
    assert!(found >= 1, "0xe9d1bd01 is one");
}

#[test]
fn factor_of_beta_within_its_bound_over_all_inputs() {
    let worst = worst(|bits| {
        let factor = factor_of_beta(I1F31::from_bits(bits));
        if bits == i32::MIN {
            return if factor.mantissa() == 0 { 0.0 } else { f64::INFINITY };
        }
        factor_error(factor, ((1.0 + beta(bits)) / (1.0 - beta(bits))).sqrt())
    });
    assert_tight("factor of beta, 32 bits", worst, bounds::FACTOR_OF_BETA_32);
}

#[test]
fn offset_of_rapidity_within_its_bound_over_all_inputs() {
    let worst = worst(|bits| {
        let offset = offset_of_rapidity(I4F28::from_bits(bits));
        if bits == 0 {
            return if (offset.mantissa(), offset.exponent()) == (0, 0) { 0.0 } else { f64::INFINITY };
        }
        if offset.mantissa().unsigned_abs() >> 28 != 1 {
            return f64::INFINITY;
        }
        (f64::from(offset.mantissa()) - rapidity(bits).exp_m1() * 2_f64.powi(28 - offset.exponent())).abs()
    });
    assert_tight("offset of rapidity, 32 bits", worst, bounds::OFFSET_OF_RAPIDITY_32);
}

#[test]
fn the_other_way_is_the_mirror() {
    for bits in (1..=i32::MAX).step_by(65_537) {
        assert_eq!(rapidity_of_beta(I1F31::from_bits(-bits)).to_bits(), {
            let there = rapidity_of_beta(I1F31::from_bits(bits)).to_bits();
            if there == i32::MAX { i32::MIN } else { -there }
        });
        let there = beta_of_rapidity(I4F28::from_bits(bits));
        assert_eq!(beta_of_rapidity(I4F28::from_bits(-bits)), -there);
    }
}
