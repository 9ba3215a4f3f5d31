//! The narrow kernels against power series in f64, over all 2^32 inputs with `SHIFTKEEL_EXHAUSTIVE=1`,
//! else over every 4,093rd and both ends.
//!
//! The reference is the difference between result and argument. It is at most 2^17 units, so that an f64
//! holds it to 2^-35 of a unit; it is never rounded to the format.

#[path = "reference/sweep.rs"]
mod sweep;

use shiftkeel::rapidity::narrow::*;
use shiftkeel::rapidity::{Rapidity, bounds, narrow};
use sweep::{ENDS, assert_tight, worst};

const UNIT: f64 = 1.0 / (1_u64 << 44) as f64;
/// Error of a kernel in units, where `sign * x + correction(x)` is the exact result in units and results
/// beyond the format count as its end.
fn kernel_error(kernel: fn(i32) -> i32, sign: f64, correction: fn(f64) -> f64, x: i32) -> f64 {
    let line = sign * f64::from(x);
    let correction = correction(f64::from(x) * UNIT) / UNIT;
    if line + correction > f64::from(i32::MAX) {
        return if kernel(x) == i32::MAX { 0.0 } else { f64::INFINITY };
    }
    if line + correction < f64::from(i32::MIN) {
        return if kernel(x) == i32::MIN { 0.0 } else { f64::INFINITY };
    }
    ((f64::from(kernel(x)) - line) - correction).abs()
}

#[test]
fn kernels_stay_within_their_bound_over_all_inputs() {
    type Case = (f64, &'static str, fn(i32) -> i32, f64, fn(f64) -> f64);
    let exponential: fn(f64) -> f64 = |x| x * x * (0.5 + x * (1.0 / 6.0 + x * (1.0 / 24.0 + x / 120.0)));
    let cases: [Case; 6] = [
        (bounds::NARROW_RAPIDITY_OF_BETA, "rapidity of beta", rapidity_of_beta, 1.0, |x| {
            x * x * x * (1.0 / 3.0 + x * x / 5.0)
        }),
        (bounds::NARROW_BETA_OF_RAPIDITY, "beta of rapidity", beta_of_rapidity, 1.0, |x| {
            -x * x * x * (1.0 / 3.0 - x * x * 2.0 / 15.0)
        }),
        (bounds::NARROW_OFFSET_OF_RAPIDITY, "offset of rapidity", offset_of_rapidity, 1.0, exponential),
        (bounds::NARROW_RAPIDITY_OF_OFFSET, "rapidity of offset", rapidity_of_offset, 1.0, |x| {
            -x * x * (0.5 - x * (1.0 / 3.0 - x * (0.25 - x / 5.0)))
        }),
        (bounds::NARROW_RAPIDITY_OF_SLOPE, "rapidity of slope", rapidity_of_slope, -1.0, |x| {
            -x * x * (0.5 + x * (1.0 / 3.0 + x * (0.25 + x / 5.0)))
        }),
        (bounds::NARROW_SLOPE_OF_RAPIDITY, "slope of rapidity", slope_of_rapidity, -1.0, |x| {
            -x * x * (0.5 + x * (1.0 / 6.0 + x * (1.0 / 24.0 + x / 120.0)))
        }),
    ];
    for (bound, name, kernel, sign, correction) in cases {
        assert_tight(name, worst(|x| kernel_error(kernel, sign, correction, x)), bound);
    }
}

const LIGHT: f64 = 299_792_458.0;

/// Error of the first-order range rate in units of 2^-16 m/s.
fn first_order_error(range_rate: i32) -> f64 {
    let v = f64::from(range_rate) / 65_536.0;
    let b = v / LIGHT;
    // v' - v = c (b^3/2 - b^2/2 - 3 b^4/8 + 3 b^5/8), from sqrt((1 - b)/(1 + b)) as a series.
    let correction = LIGHT * b * b * (-0.5 + b * (0.5 + b * (-0.375 + b * 0.375))) * 65_536.0;
    let exact = f64::from(range_rate) + correction;
    if exact < f64::from(i32::MIN) {
        return if first_order_range_rate(range_rate) == i32::MIN { 0.0 } else { f64::INFINITY };
    }
    ((f64::from(first_order_range_rate(range_rate)) - f64::from(range_rate)) - correction).abs()
}

#[test]
fn first_order_range_rate_stays_within_its_bounds_over_all_inputs() {
    assert_tight("first-order range rate", worst(first_order_error), MAX_FIRST_ORDER_ERROR);
    let slow = |v: i32| if v.unsigned_abs() < 8_000 << 16 { first_order_error(v) } else { 0.0 };
    assert_tight("first-order range rate below 8 km/s", worst(slow), MAX_FIRST_ORDER_ERROR_BELOW_8_KM_S);
}

#[test]
fn newtype_agrees_with_the_raw_kernels_and_the_wide_format() {
    for bits in ENDS {
        let narrow = NarrowRapidity::from_bits(bits);
        assert_eq!(NarrowRapidity::from_rapidity_nearest(narrow.to_rapidity()), Some(narrow));
        assert_eq!(narrow.to_rapidity().to_bits(), i64::from(bits) << 16);
        assert_eq!(narrow.to_offset_bits(), offset_of_rapidity(bits));
        assert_eq!(narrow.to_beta_bits(), beta_of_rapidity(bits));
        assert_eq!(narrow.to_slope_bits(), slope_of_rapidity(bits));
        assert_eq!(NarrowRapidity::from_beta_bits(bits).to_bits(), rapidity_of_beta(bits));
        assert_eq!(NarrowRapidity::from_offset_bits(bits).to_bits(), rapidity_of_offset(bits));
        assert_eq!(NarrowRapidity::from_slope_bits(bits).to_bits(), rapidity_of_slope(bits));
    }
}

#[test]
fn conversion_from_the_wide_format_rounds_to_nearest_and_refuses_what_does_not_fit() {
    let narrow =
        |bits: i64| NarrowRapidity::from_rapidity_nearest(Rapidity::from_bits(bits)).map(|r| r.to_bits());
    assert_eq!(narrow(0x7fff), Some(0));
    assert_eq!(narrow(0x8000), Some(1));
    assert_eq!(narrow(-0x8001), Some(-1));
    assert_eq!(narrow(((1_i64 << 31) << 16) - 0x8001), Some(i32::MAX));
    assert_eq!(narrow(((1_i64 << 31) << 16) - 0x8000), None);
    assert_eq!(narrow(-((1_i64 << 31) << 16)), Some(i32::MIN));
    assert_eq!(narrow(i64::MAX), None);
    assert_eq!(narrow(i64::MIN), None);
    assert_eq!(narrow::FRACTION_BITS, 44);
}
