//! A fast reference for millions of inputs: fixed point with 120 fraction bits in an `i128`, plain power series,
//! written from the formulas. `tests/rapidity_many.rs` holds it against 200 bits of a library first.

/// Fraction bits of all values here.
pub const BITS: u32 = 120;
const ONE: i128 = 1 << BITS;

/// a b, to within two units of 2^-120; both below 128 in size.
pub fn times(a: i128, b: i128) -> i128 {
    let (x, y) = (a.unsigned_abs(), b.unsigned_abs());
    let (x1, x0) = (x >> 64, x & u128::from(u64::MAX));
    let (y1, y0) = (y >> 64, y & u128::from(u64::MAX));
    let middle = (x1 * y0 + ((x0 * y0) >> 64)) + x0 * y1;
    // The product 2^-64 is x1 y1 2^64 + middle; 56 more bits go.
    let size = (((x1 * y1) << 8) + (middle >> 56)) as i128;
    if (a < 0) != (b < 0) { -size } else { size }
}

/// numerator / denominator of two integers below 2^66 in size, |quotient| < 1.
fn ratio(numerator: i128, denominator: u128) -> i128 {
    let top = numerator.unsigned_abs() << 60;
    let rest = (top % denominator) << 60;
    let size = ((top / denominator) << 60) + rest / denominator;
    if numerator < 0 { -(size as i128) } else { size as i128 }
}

/// 1/d of 1 <= d <= 2, by Newton's steps from an f64.
fn reciprocal(d: i128) -> i128 {
    let rough = 1.0 / (d as f64 / ONE as f64);
    let mut y = (rough * 2_f64.powi(60)) as i128 * (1 << 60);
    for _ in 0..2 {
        y = times(y, 2 * ONE - times(d, y));
    }
    y
}

/// Constants and inverses, made once.
pub struct Series {
    ln_2: i128,
    /// 1/(2n + 1)
    odd: Vec<i128>,
    /// 1/n
    inverse: Vec<i128>,
}

impl Series {
    pub fn new() -> Self {
        let odd: Vec<_> =
            (0..64).map(|n| ratio(1, 2 * n + 1) + if n == 0 { ONE - ratio(1, 1) } else { 0 }).collect();
        let inverse: Vec<_> = (0..32_u128).map(|n| if n < 2 { ONE } else { ratio(1, n) }).collect();
        let mut series = Self { ln_2: 0, odd, inverse };
        series.ln_2 = 2 * series.area_tangent(ratio(1, 3));
        series
    }

    /// atanh(s) of |s| <= 1/3.
    fn area_tangent(&self, s: i128) -> i128 {
        let square = times(s, s);
        let sum = self.odd.iter().rev().take(64).fold(0, |sum, inverse| times(sum, square) + inverse);
        times(s, sum)
    }

    /// ln of an integer over its power of two, in [ln sqrt(1/2), ln sqrt 2], and that power of two.
    fn logarithm(&self, x: u64) -> (i128, i32) {
        let exponent = 63 - x.leading_zeros() as i32;
        let mantissa = i128::from(x) << (63 - exponent);
        let (mantissa, exponent) = if mantissa > 13_043_817_825_332_782_212 {
            (mantissa, exponent + 1)
        } else {
            (mantissa * 2, exponent)
        };
        let one = 1_i128 << 64;
        let s = ratio(mantissa - one, (mantissa + one) as u128);
        let square = times(s, s);
        let sum = self.odd[..26].iter().rev().fold(0, |sum, inverse| times(sum, square) + inverse);
        (2 * times(s, sum), exponent)
    }

    /// ln(numerator / denominator); both positive, the logarithm below 64.
    pub fn logarithm_of_ratio(&self, numerator: u64, denominator: u64) -> i128 {
        let (above, up) = self.logarithm(numerator);
        let (below, down) = self.logarithm(denominator);
        above - below + i128::from(up - down) * self.ln_2
    }

    /// exp(x) 2^-k in (0.7, 1.42) and k, of |x| < 64 with 120 fraction bits.
    pub fn exponential_of_series(&self, x: i128) -> (i128, i32) {
        let k = (x as f64 / ONE as f64 / core::f64::consts::LN_2).round() as i32;
        let r = (x - i128::from(k) * self.ln_2) >> 6;
        // exp(r) - 1 by its series, then six doublings.
        let mut sum = ONE;
        for n in (2..=15).rev() {
            sum = ONE + times(times(sum, r), self.inverse[n]);
        }
        let mut offset = times(sum, r);
        for _ in 0..6 {
            offset = times(offset, 2 * ONE + offset);
        }
        (ONE + offset, k)
    }

    /// The same of x with 60 fraction bits.
    pub fn exponential(&self, x: i128) -> (i128, i32) {
        self.exponential_of_series(x << 60)
    }

    /// (exp(x) - 1)/x of |x| < 1/8 with 60 fraction bits.
    pub fn offset_over_argument(&self, x: i64) -> i128 {
        let r = i128::from(x) << 60;
        (2..=26).rev().fold(ONE, |sum, n| ONE + times(times(sum, r), self.inverse[n]))
    }

    /// tanh(|x|) of x with 60 fraction bits.
    pub fn tangent(&self, x: i64) -> i128 {
        let (mantissa, k) = self.exponential(-2 * i128::from(x.unsigned_abs()));
        2 * reciprocal(ONE + (mantissa >> -k)) - ONE
    }
}
