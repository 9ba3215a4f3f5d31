//! How fast the delay of a table changes: what the proof of a steering's error needs. Set-up only, in f64.
#![allow(clippy::arithmetic_side_effects, reason = "set-up: orders up to 9, and binary exponents")]
#![allow(clippy::cast_possible_truncation, reason = "set-up: at most 1024 segments")]

use super::evaluate::entry;
use super::{DEGREE, FIELDS, PassTable};

/// Bounds on the delay's derivatives over a whole table.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct MotionExtremes {
    /// Of the first derivative: the shift over the carrier.
    pub slope: f64,
    /// Of the second derivative, per second.
    pub rate: f64,
    /// Of the third derivative, per second squared.
    pub jerk: f64,
}

/// What a quartic through five points at distances of one misses of a jump of derivatives 1 to 4 by one: in its value, in
/// its slope. The largest over all places of the jump and of looking.
const AT_JOINTS: [(f64, f64); 4] = [(0.229, 1.084), (0.0612, 0.348), (0.0266, 0.154), (0.0215, 0.136)];

/// Places of a segment at which a derivative is looked at.
const LOOKS: i32 = 64;

impl PassTable<'_> {
    /// Bounds on slope, rate and jerk: the values on a grid of 64 a segment, plus what the next derivative's bound
    /// can add between its points.
    pub fn extremes(&self) -> MotionExtremes {
        let mut most = MotionExtremes::default();
        for segment in 0..self.segment_count() {
            let (series, half) = self.polynomial(segment);
            // Derivatives 1 to 4 in the local argument; the fourth is bounded by its coefficients.
            let spacing = 1.0 / f64::from(LOOKS);
            let mut above = sum_of(&derivative(&series, 4));
            let mut bounds = [0.0; 4];
            for order in (1..=3).rev() {
                let series = derivative(&series, order);
                let looked = (-LOOKS..=LOOKS).fold(0.0_f64, |worst, look| {
                    let place = f64::from(look) * spacing;
                    let value = series.iter().rev().fold(0.0, |sum, term| sum * place + term);
                    worst.max(value.abs())
                });
                above = looked + above * spacing / 2.0;
                if let Some(bound) = bounds.get_mut(order) {
                    *bound = above;
                }
            }
            let [_, slope, rate, jerk] = bounds;
            most.slope = most.slope.max(slope / half);
            most.rate = most.rate.max(rate / (half * half));
            most.jerk = most.jerk.max(jerk / (half * half * half));
        }
        most
    }

    /// What a quartic through five points `quarter` seconds apart misses at most: of the delay, in seconds, and of its
    /// slope.
    ///
    /// # Source
    /// Of a function with fifth derivative f it misses at most 0.0303 f H^5, and of its slope f H^4 / 5 (the nodes'
    /// polynomial over 5!, and its slope); of joints what `AT_JOINTS` says, jump by jump.
    pub(crate) fn off_quartic(&self, quarter: f64) -> (f64, f64) {
        let (mut fifth, mut shortest) = (0.0_f64, f64::INFINITY);
        let (mut at_joint_value, mut at_joint_slope) = (0.0_f64, 0.0_f64);
        let mut before: Option<[f64; 4]> = None;
        for segment in 0..self.segment_count() {
            let (series, half) = self.polynomial(segment);
            // In quarters of the stretch.
            let scale = quarter / half;
            shortest = shortest.min(2.0 * half);
            fifth = fifth.max(sum_of(&derivative(&series, 5)) * libm::pow(scale, 5.0));
            let derivatives = |place: f64| {
                let mut values = [0.0; 4];
                for (order, value) in (1..).zip(&mut values) {
                    let series = derivative(&series, order);
                    let unscaled = series.iter().rev().fold(0.0, |sum, term| sum * place + term);
                    *value = unscaled * libm::pow(scale, order as f64);
                }
                values
            };
            if let Some(before) = before {
                let jumps = before.iter().zip(derivatives(-1.0)).zip(AT_JOINTS);
                let (value, slope) = jumps.fold((0.0, 0.0), |(value, slope), ((before, after), at_joint)| {
                    let jump = (after - before).abs();
                    (value + at_joint.0 * jump, slope + at_joint.1 * jump)
                });
                at_joint_value = at_joint_value.max(value);
                at_joint_slope = at_joint_slope.max(slope);
            }
            before = Some(derivatives(1.0));
        }
        let joints = libm::ceil(4.0 * quarter / shortest);
        (0.0303 * fifth + joints * at_joint_value, (fifth / 5.0 + joints * at_joint_slope) / quarter)
    }

    /// A segment's coefficients in seconds over v from -1 to 1, and half of its length in seconds.
    fn polynomial(&self, segment: usize) -> ([f64; DEGREE + 1], f64) {
        let [start, second, third, fourth, fifth, sixth, end] = self.record(segment);
        let fields = [
            0,
            0,
            second as i32,
            third as i32,
            fourth as i32 >> 10,
            fifth as i32 >> 12,
            sixth as i32 >> 15,
            ((sixth << 17) as i32) >> 17,
            ((fifth << 20) as i32) >> 20,
            ((fourth << 22) as i32) >> 22,
        ];
        let unit = libm::ldexp(1.0, -(self.layout.fraction() as i32));
        let mut series = [0.0; DEGREE + 1];
        let mut sums = [0.0; 2];
        for (order, (term, (&field, &(coarser, _)))) in
            series.iter_mut().zip(fields.iter().zip(&FIELDS)).enumerate()
        {
            *term = f64::from(field) * libm::ldexp(unit, coarser);
            if let Some(sum) = sums.get_mut(order % 2) {
                *sum += *term;
            }
        }
        let [even, odd] = sums;
        let (start, end) = (f64::from(start as i32), f64::from(end as i32));
        series[0] = (start + end) * unit - even;
        series[1] = (end - start) * unit - odd;
        let entry = entry(self.directory, segment as u32);
        (series, self.layout.half_length(entry >> 16 & 0xF))
    }
}

fn derivative(series: &[f64; DEGREE + 1], order: usize) -> [f64; DEGREE + 1] {
    let mut result = *series;
    for _ in 0..order {
        for power in 1..=DEGREE {
            let next = result.get(power).copied().unwrap_or(0.0) * power as f64;
            if let Some(term) = result.get_mut(power - 1) {
                *term = next;
            }
        }
        result[DEGREE] = 0.0;
    }
    result
}

fn sum_of(series: &[f64; DEGREE + 1]) -> f64 {
    series.iter().fold(0.0, |sum, term| sum + term.abs())
}
