//! Multi-precision reference of the numeric tests: values carry 200 bits and are compared before any
//! rounding to a format of the crate.

#![allow(dead_code, reason = "each test program uses a part")]

use dashu_float::FBig;
use dashu_float::round::mode::HalfEven;
use dashu_int::IBig;

/// A binary number of 200 bits.
pub type Big = FBig<HalfEven, 2>;

const PRECISION: usize = 200;

/// `bits` 2^-`fraction_bits`, exactly.
pub fn big(bits: impl Into<IBig>, fraction_bits: isize) -> Big {
    Big::from_parts(bits.into(), -fraction_bits).with_precision(PRECISION).value()
}

/// Speed of light in m/s.
pub fn light() -> Big {
    big(299_792_458, 0)
}

/// Distance of `bits` 2^-`fraction_bits` from an exact value, in units of 2^-`fraction_bits`.
pub fn error_in_units(bits: impl Into<IBig>, fraction_bits: isize, exact: &Big) -> f64 {
    let difference = (big(bits, fraction_bits) - exact) << fraction_bits;
    difference.to_f64().value().abs()
}

/// A seeded generator (xorshift64*, Vigna 2016), so that a failure can be repeated.
pub struct Random(u64);

impl Random {
    pub fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(2).wrapping_add(1))
    }

    pub fn bits(&mut self) -> u64 {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        self.0.wrapping_mul(0x2545_f491_4f6c_dd1d)
    }

    /// A signed number whose size is spread evenly over the powers of two below 2^63.
    pub fn spread(&mut self) -> i64 {
        let size = self.bits() % 63;
        (self.bits() as i64) >> (63 - size - 1).min(63)
    }
}

/// How many random inputs a test takes: `quick`, or `full` with `SHIFTKEEL_EXHAUSTIVE=1`.
pub fn count(quick: u64, full: u64) -> u64 {
    if std::env::var_os("SHIFTKEEL_EXHAUSTIVE").is_some_and(|value| value == "1") { full } else { quick }
}

/// The measured worst case keeps the bound, and the bound is no looser than 1.25 times it.
pub fn assert_tight(name: &str, worst: f64, bound: f64) {
    println!("{name}: worst {worst:.6}, bound {bound}");
    assert!(worst <= bound, "{name}: worst {worst} exceeds the bound {bound}");
    assert!(bound <= 1.25 * worst, "{name}: the bound {bound} is looser than 1.25 times {worst}");
}

/// The largest error over `inputs`, with the input where it was seen in the message on the way.
pub fn worst<T: Copy + core::fmt::Debug>(
    name: &str,
    inputs: impl Iterator<Item = T>,
    mut error: impl FnMut(T) -> f64,
) -> f64 {
    let mut worst = 0.0;
    let mut at = None;
    for input in inputs {
        let seen = error(input);
        if seen > worst {
            worst = seen;
            at = Some(input);
        }
    }
    println!("{name}: worst {worst:.6} at {at:?}");
    worst
}
