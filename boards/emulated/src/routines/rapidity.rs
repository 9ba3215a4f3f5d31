//! The library's rapidities.

use super::{Report, line, sample};
use fixed::types::{I1F31, I1F63, I4F28, I16F16, I32F32};
use shiftkeel::rapidity::{Rapidity, compose_beta_32, fixed_32, float_32, narrow};

/// Speeds to rapidities.
pub fn from_speeds(report: Report) {
    line(report, "Rapidity::from_range_rate", metres_per_second, |rate| {
        Rapidity::from_range_rate(I16F16::from_bits(rate)).to_bits()
    });
    let millimetres = |index| (sample::range_rate(index) * 1000.0) as i32;
    line(report, "Rapidity::from_range_rate_mm_per_s", millimetres, |rate| {
        Rapidity::from_range_rate_mm_per_s(rate).to_bits()
    });
    let wide = |index| (sample::signed(index, 2.9e8) * 4_294_967_296.0) as i64;
    line(report, "Rapidity::from_range_rate_wide", wide, |rate| {
        Rapidity::from_range_rate_wide(I32F32::from_bits(rate)).unwrap_or_default().to_bits()
    });
    let float = |index| sample::range_rate(index) as f32;
    line(report, "Rapidity::from_range_rate_f32", float, |rate| {
        Rapidity::from_range_rate_f32(rate).unwrap_or_default().to_bits()
    });
}

/// Over the full range: velocity ratios, exact ratios, and back.
pub fn conversions(report: Report) {
    let beta = |index| (sample::signed(index, 0.99) * (1u64 << 63) as f64) as i64;
    let beta_32 = |index| (sample::signed(index, 0.99) * (1u64 << 31) as f64) as i32;
    let rapidity = |index| (sample::signed(index, 7.9) * (1u64 << 60) as f64) as i64;
    line(report, "Rapidity::from_beta", beta, |beta| {
        Rapidity::from_beta(I1F63::from_bits(beta)).unwrap_or_default().to_bits()
    });
    line(report, "Rapidity::from_beta_32", beta_32, |beta| {
        Rapidity::from_beta_32(I1F31::from_bits(beta)).unwrap_or_default().to_bits()
    });
    let ratio = |index| {
        let scrambled = |salt: u32| u64::from(sample::scrambled(index ^ salt)) << 20 | 1 << 50;
        (scrambled(0), scrambled(0x8000_0000))
    };
    line(report, "Rapidity::from_ratio", ratio, |(numerator, denominator)| {
        Rapidity::from_ratio(numerator, denominator).unwrap_or_default().to_bits()
    });
    line(report, "Rapidity::to_factor", rapidity, |rapidity| {
        let factor = Rapidity::from_bits(rapidity).to_factor();
        (factor.mantissa(), factor.exponent())
    });
    line(report, "Rapidity::to_offset", rapidity, |rapidity| {
        let offset = Rapidity::from_bits(rapidity).to_offset();
        (offset.mantissa(), offset.exponent())
    });
    line(report, "Rapidity::to_beta", rapidity, |rapidity| Rapidity::from_bits(rapidity).to_beta().to_bits());
    line(report, "Rapidity::to_beta_32", rapidity, |rapidity| {
        Rapidity::from_bits(rapidity).to_beta_32().to_bits()
    });
    let pair = |index| (beta_32(index), beta_32(sample::scrambled(index) % 256));
    line(report, "compose_beta_32", pair, |(first, second)| {
        compose_beta_32(I1F31::from_bits(first), I1F31::from_bits(second)).unwrap_or_default().to_bits()
    });
}

/// The narrow conversions: 44 fraction bits, all of i32.
pub fn narrow_conversions(report: Report) {
    let any = |index| (sample::signed(index, 2_147_483_647.0)) as i32;
    line(report, "narrow::rapidity_of_beta", any, narrow::rapidity_of_beta);
    line(report, "narrow::beta_of_rapidity", any, narrow::beta_of_rapidity);
    line(report, "narrow::offset_of_rapidity", any, narrow::offset_of_rapidity);
    line(report, "narrow::rapidity_of_offset", any, narrow::rapidity_of_offset);
    line(report, "narrow::rapidity_of_slope", any, narrow::rapidity_of_slope);
    line(report, "narrow::slope_of_rapidity", any, narrow::slope_of_rapidity);
    line(report, "narrow::first_order_range_rate", metres_per_second, narrow::first_order_range_rate);
}

/// The 32-bit conversions over their whole range.
pub fn fixed_32_conversions(report: Report) {
    let any = |index| sample::signed(index, 2_147_483_647.0) as i32;
    line(report, "fixed_32::rapidity_of_beta", any, |beta| {
        fixed_32::rapidity_of_beta(I1F31::from_bits(beta)).to_bits()
    });
    line(report, "fixed_32::beta_of_rapidity", any, |rapidity| {
        fixed_32::beta_of_rapidity(I4F28::from_bits(rapidity)).to_bits()
    });
    line(report, "fixed_32::factor_of_rapidity", any, |rapidity| {
        let factor = fixed_32::factor_of_rapidity(I4F28::from_bits(rapidity));
        (factor.mantissa(), factor.exponent())
    });
    line(report, "fixed_32::factor_of_beta", any, |beta| {
        let factor = fixed_32::factor_of_beta(I1F31::from_bits(beta));
        (factor.mantissa(), factor.exponent())
    });
    line(report, "fixed_32::offset_of_rapidity", any, |rapidity| {
        let offset = fixed_32::offset_of_rapidity(I4F28::from_bits(rapidity));
        (offset.mantissa(), offset.exponent())
    });
}

/// The f32 conversions over the range of the alternatives' rows.
pub fn float_32_conversions(report: Report) {
    let wide = |index| sample::signed(index, 0.99) as f32;
    line(report, "float_32::rapidity_of_beta", wide, float_32::rapidity_of_beta);
    line(report, "float_32::beta_of_rapidity", wide, float_32::beta_of_rapidity);
    line(report, "float_32::factor_of_rapidity", wide, float_32::factor_of_rapidity);
    line(report, "float_32::factor_of_beta", wide, float_32::factor_of_beta);
    line(report, "float_32::offset_of_rapidity", wide, float_32::offset_of_rapidity);
}

/// A range rate as I16F16 bits.
fn metres_per_second(index: u32) -> i32 {
    (sample::range_rate(index) * 65536.0) as i32
}
