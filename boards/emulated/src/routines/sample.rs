//! Inputs: spread evenly over a domain, and scrambled so that neighbours differ in every bit.

use crate::count::INPUTS;

/// A number whose bits all look random, from an index: the finaliser of a 32-bit mixing hash.
pub fn scrambled(index: u32) -> u32 {
    let mut bits = index.wrapping_add(1).wrapping_mul(0x9e37_79b9);
    bits = (bits ^ (bits >> 16)).wrapping_mul(0x85eb_ca6b);
    bits = (bits ^ (bits >> 13)).wrapping_mul(0xc2b2_ae35);
    bits ^ (bits >> 16)
}

/// Evenly spread over [-limit, limit], the low bits scrambled; the first and last are the limits.
pub fn signed(index: u32, limit: f64) -> f64 {
    match index {
        0 => -limit,
        _ if index == INPUTS - 1 => limit,
        _ => {
            let low = f64::from(scrambled(index)) / 4_294_967_296.0;
            limit * ((f64::from(index) + low) * (2.0 / f64::from(INPUTS)) - 1.0)
        }
    }
}

/// A range rate in m/s, up to 8 km/s either way.
pub fn range_rate(index: u32) -> f64 {
    signed(index, 8000.0)
}
