//! One segment: from its Chebyshev series to stored coefficients and the bound on what they leave.
#![allow(
    clippy::arithmetic_side_effects,
    reason = "set-up: orders and counts of points, below 100, and units of 2^-60 to 2^-20"
)]
#![allow(clippy::cast_possible_truncation, reason = "set-up: the field's limit is tested before")]

use super::super::chebyshev::{self, Cosines};
use super::super::table::{DEGREE, FIELDS, NOISE};
use super::{BakeSettings, LARGEST_ERROR, Units};

/// Chebyshev points of a segment.
pub(super) const POINTS: usize = 24;
/// Chebyshev points at which the residual is looked at: 1/cos(pi 23 / 128) = 1.183.
const RESIDUAL_POINTS: usize = 64;
/// Assumed ratio of successive coefficients beyond the fit, in 2^-16: one half.
pub(super) const SMOOTHNESS: u32 = 1 << 15;
/// Rounding noise of a Chebyshev coefficient in f64, relative to the delay.
const COEFFICIENT_NOISE: f64 = 1e-15;
/// The same in seconds, from places of some 1e7 m that a geometry computes with in f64 (5 nm).
const GEOMETRY_NOISE: f64 = 2e-17;
/// What interpolation at 24 Chebyshev points makes of a rough part whose slope is at most one (per half segment): of
/// the slope 34.7 (at the ends; the largest integral of the magnitude of the kernel that takes the part's slope to
/// the interpolant's, computed) and the part's own one; of the value 1 + 2.99 (Lebesgue's constant) times the
/// part's distance from polynomials, pi / 48 (Jackson); of a coefficient of order 20 on, 0.81 / 20.
pub(super) const ROUGH_SLOPE: f64 = 36.0;
const ROUGH_DELAY: f64 = 0.27;
const ROUGH_COEFFICIENT: f64 = 0.05;

/// Slope that the narrow kernel of the rapidity ends at.
pub(super) const STEEPEST: f64 = 1.0 / 8192.0;

/// One fitted segment.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Fit {
    pub(super) coefficients: [i32; DEGREE + 1],
    pub(super) slope_error: f64,
    pub(super) delay_error: f64,
}

/// Fits one segment; `None` when it is too long.
pub(super) fn fit(
    units: &Units,
    settings: &BakeSettings,
    first: u32,
    length: u32,
    delay: &mut impl FnMut(f64) -> f64,
) -> Option<(Fit, [i32; 2])> {
    let half = units.cell_seconds() * libm::ldexp(1.0, length as i32) / 2.0;
    let start = units.cell_seconds() * f64::from(first);
    let mut values = [0.0; POINTS];
    for (index, value) in values.iter_mut().enumerate() {
        *value = delay(start + half * (1.0 + chebyshev::point(index, POINTS))) - units.base;
    }
    let series = chebyshev::interpolate(&values, &Cosines::<POINTS>::new());
    let rough = settings.roughness * half;
    let tail = tail(&series, units.base, rough)?;
    let nodes = [units.node(delay(start))?, units.node(delay(start + 2.0 * half))?];
    let orders = FIELDS.map(|(coarser, width)| {
        (libm::ldexp(1.0, coarser - units.fraction), libm::ldexp(1.0, width as i32 - 1))
    });
    let storage = Storage { node_unit: libm::ldexp(1.0, 1 - units.fraction), orders: &orders };
    let (coefficients, left) = round(&series, &storage, nodes.map(f64::from))?;
    if !fits(&series, units, half) {
        return None;
    }
    let (delay_error, slope_error) = bound(&left);
    let noise = libm::ldexp(f64::from(NOISE), -16 - units.fraction);
    let slope_error = (slope_error + tail.1 + ROUGH_SLOPE * rough) / half;
    let delay_error = delay_error + tail.0 + ROUGH_DELAY * rough + noise;
    let met = slope_error <= settings.slope_tolerance.min(LARGEST_ERROR)
        && delay_error <= settings.delay_tolerance.min(LARGEST_ERROR);
    met.then_some((Fit { coefficients, slope_error, delay_error }, nodes))
}

/// Bounds on a series and on its derivative (per half segment).
fn bound(series: &[f64; POINTS]) -> (f64, f64) {
    let (mut most, mut steepest) = (0.0_f64, 0.0_f64);
    for index in 0..RESIDUAL_POINTS {
        let (value, slope) = chebyshev::evaluate(series, chebyshev::point(index, RESIDUAL_POINTS));
        most = most.max(value.abs());
        steepest = steepest.max(slope.abs());
    }
    let factor = 1.0 / libm::cos(core::f64::consts::PI * (POINTS - 1) as f64 / (2 * RESIDUAL_POINTS) as f64);
    (most * factor, steepest * factor)
}

/// Bound on what lies beyond the interpolant: value and slope (per half segment); `None` when the
/// coefficients do not decay as the header states.
fn tail(series: &[f64; POINTS], base: f64, rough: f64) -> Option<(f64, f64)> {
    let most = |from: usize, to: usize| {
        series.get(from..to).unwrap_or(&[]).iter().fold(0.0_f64, |most, value| most.max(value.abs()))
    };
    let last = most(POINTS - 4, POINTS);
    let noise =
        (base.abs() + most(0, POINTS)) * COEFFICIENT_NOISE + GEOMETRY_NOISE + ROUGH_COEFFICIENT * rough;
    // Ten orders earlier the same ratio must have held: (1/2)^10, with a factor two for the phase.
    if last > noise && last * 512.0 > most(POINTS - 14, POINTS - 10) {
        return None;
    }
    let (mut value, mut slope, mut term) = (0.0, 0.0, 2.0 * last);
    for order in POINTS..POINTS + 64 {
        // Twice: the term itself, and the lower order that it looks like at the interpolant's points.
        term *= f64::from(SMOOTHNESS) / 65536.0;
        value += term;
        slope += term * (order * order) as f64;
    }
    Some((value, slope))
}

/// How coefficients and nodes are stored.
pub(super) struct Storage<'a> {
    /// Unit of a node.
    pub(super) node_unit: f64,
    /// Unit and largest magnitude of each coefficient from order 0 on; 0 and 1 are not used.
    pub(super) orders: &'a [(f64, f64)],
}

/// Rounds the coefficients from the top; returns them and the series of what is left.
pub(super) fn round(
    series: &[f64; POINTS],
    storage: &Storage<'_>,
    nodes: [f64; 2],
) -> Option<([i32; DEGREE + 1], [f64; POINTS])> {
    let mut left = *series;
    let mut target = cut_for_slope(series, storage.orders.len() - 1);
    let mut coefficients = [0; DEGREE + 1];
    let mut sums = [0.0; 2];
    let take = |left: &mut [f64; POINTS], target: &mut [f64; POINTS], power: usize, size: f64| {
        for (order, (left, target)) in left.iter_mut().zip(target).enumerate().take(power + 1) {
            let part = size * chebyshev::of_monomial(power, order);
            *left -= part;
            *target -= part;
        }
    };
    for (power, &(unit, limit)) in storage.orders.iter().enumerate().skip(2).rev() {
        let leading = *target.get(power)? / chebyshev::of_monomial(power, power);
        let rounded = libm::round(leading / unit);
        if !(0.0..limit).contains(&rounded.abs()) {
            return None;
        }
        *coefficients.get_mut(power)? = rounded as i32;
        *sums.get_mut(power % 2)? += rounded * unit;
        take(&mut left, &mut target, power, rounded * unit);
    }
    // Orders 0 and 1 as the evaluation derives them from the nodes.
    let [start, end] = nodes;
    let [even, odd] = sums;
    take(&mut left, &mut target, 1, (end - start) / 2.0 * storage.node_unit - odd);
    take(&mut left, &mut target, 0, (end + start) / 2.0 * storage.node_unit - even);
    Some((coefficients, left))
}

/// The series of a degree whose derivative is the derivative's series cut one order lower.
fn cut_for_slope(series: &[f64; POINTS], degree: usize) -> [f64; POINTS] {
    let mut slopes = [0.0; POINTS + 1];
    for order in (1..POINTS).rev() {
        let above = slopes.get(order + 1).copied().unwrap_or(0.0);
        let own = series.get(order).copied().unwrap_or(0.0);
        if let Some(slope) = slopes.get_mut(order - 1) {
            *slope = above + 2.0 * order as f64 * own;
        }
    }
    let mut cut = [0.0; POINTS];
    for (order, term) in cut.iter_mut().enumerate().take(degree + 1).skip(1) {
        let kept =
            |index: usize| if index < degree { slopes.get(index).copied().unwrap_or(0.0) } else { 0.0 };
        *term = (kept(order - 1) - kept(order + 1)) / (2 * order) as f64;
    }
    cut
}

/// Whether slope and curvature stay inside the evaluation's 32 bits, and the slope inside the narrow kernel's
/// range, anywhere on the segment.
fn fits(series: &[f64; POINTS], units: &Units, half: f64) -> bool {
    let bounds = series.iter().enumerate().fold((0.0, 0.0), |(slope, bend), (order, value)| {
        let square = (order * order) as f64;
        (slope + value.abs() * square, bend + value.abs() * square * (square - 1.0).max(0.0) / 3.0)
    });
    // In the evaluation's argument, half as long: slope doubles, half the curvature doubles. Orders 1 and 0
    // are held at twice and four times the resolution.
    let scale = libm::ldexp(1.0, units.fraction - 2);
    bounds.0 < STEEPEST * half && bounds.0 * 2.0 * scale < 1.0e9 && bounds.1 * 2.0 * scale < 8.0e8
}
