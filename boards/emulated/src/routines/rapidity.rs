//! The library's rapidities.

use super::{Report, line, sample};
use fixed::types::{I16F16, I32F32};
use shiftkeel::rapidity::{Rapidity, narrow};

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

/// A range rate as I16F16 bits.
fn metres_per_second(index: u32) -> i32 {
    (sample::range_rate(index) * 65536.0) as i32
}
