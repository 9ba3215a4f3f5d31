//! Chebyshev series in f64 on [-1, 1]: interpolation, evaluation, derivative, change to monomials.
//!
//! Only set-up code comes here. Every operation is an IEEE one or `libm`'s, called directly, in one fixed
//! order, so host and board get the same bits.
//!
//! Source: J. C. Mason and D. C. Handscomb, Chebyshev Polynomials, 2003 (chapters 2 and 6), from memory.
#![allow(clippy::arithmetic_side_effects, reason = "set-up: orders and counts of points, below 100")]

use core::f64::consts::PI;

/// The `index`-th of `count` Chebyshev points of the first kind, from +1 down to -1.
pub(super) fn point(index: usize, count: usize) -> f64 {
    libm::cos(PI * (2 * index + 1) as f64 / (2 * count) as f64)
}

/// Coefficients of the interpolant through `values` at the points of [`point`], in place of `series`.
///
/// The cosines come from one short table by symmetry of the index, so the cost is one `cos` per angle.
pub(super) fn interpolate<const N: usize>(values: &[f64; N], cosines: &Cosines<N>) -> [f64; N] {
    let mut series = [0.0; N];
    for (order, coefficient) in series.iter_mut().enumerate() {
        let mut sum = 0.0;
        for (index, value) in values.iter().enumerate() {
            sum += value * cosines.at(order * (2 * index + 1));
        }
        *coefficient = sum * if order == 0 { 1.0 } else { 2.0 } / N as f64;
    }
    series
}

/// cos(pi m / 2N) for every integer m.
pub(super) struct Cosines<const N: usize>([f64; N]);

impl<const N: usize> Cosines<N> {
    pub(super) fn new() -> Self {
        Self(core::array::from_fn(|index| libm::cos(PI * index as f64 / (2 * N) as f64)))
    }

    /// cos(pi `multiple` / 2N): folded into the first quadrant.
    pub(super) fn at(&self, multiple: usize) -> f64 {
        let folded = multiple % (4 * N);
        let half = if folded > 2 * N { 4 * N - folded } else { folded };
        if half == N {
            0.0
        } else if half < N {
            self.0.get(half).copied().unwrap_or(0.0)
        } else {
            -self.0.get(2 * N - half).copied().unwrap_or(0.0)
        }
    }
}

/// Value and derivative (per unit of the argument) of a series at `x`.
pub(super) fn evaluate(series: &[f64], x: f64) -> (f64, f64) {
    let (mut next, mut after) = (0.0, 0.0);
    let (mut slope_next, mut slope_after) = (0.0, 0.0);
    for &coefficient in series.iter().skip(1).rev() {
        let slope = 2.0 * x * slope_next - slope_after + 2.0 * next;
        (slope_after, slope_next) = (slope_next, slope);
        let value = 2.0 * x * next - after + coefficient;
        (after, next) = (next, value);
    }
    let constant = series.first().copied().unwrap_or(0.0);
    (x * next - after + constant, next + x * slope_next - slope_after)
}

/// Coefficient of T_`order` in the monomial x^`power`.
pub(super) fn of_monomial(power: usize, order: usize) -> f64 {
    if order > power || !(power - order).is_multiple_of(2) {
        return 0.0;
    }
    let mut binomial = 1.0;
    for step in 0..(power - order) / 2 {
        binomial *= (power - step) as f64 / (step + 1) as f64;
    }
    binomial * if order == 0 { 1.0 } else { 2.0 } / (1u64 << power) as f64
}
