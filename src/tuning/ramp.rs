//! From a change of the step over an interval to a ramp at every clock.

use crate::frequency::divide_nearest;
use crate::rapidity::wide_product::{high_i64_u32, product_u32, shifted_right};

/// Largest difference between an interval's mean step and its end's that is ever followed, in 2^-32 cycle per clock:
/// 3/16, from a change by 3/8. A change by half a cycle could as well go the other way round; the rest of an eighth is
/// room for what is carried forward.
const FARTHEST: u32 = 3 << 28;

/// How a change of the step over an interval becomes a ramp per clock.
#[derive(Clone, Copy, Debug)]
pub(super) struct RampUnits {
    pub(super) clocks: u32,
    /// 2^(31 + shift) / clocks, rounded down: above 2^30.
    reciprocal: u32,
    /// floor(log2 clocks).
    shift: u8,
    /// Largest difference between an interval's mean step and its end's, in 2^-32 cycle per clock.
    steepest: u32,
}

impl RampUnits {
    /// `steepest`: log2 of what the steepest motion makes of the step in an interval, in 2^-64 cycle per clock.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: the reciprocal is at most 2^31, the clocks' logarithm below 32"
    )]
    pub(super) fn new(clocks: u32, steepest: i32) -> Self {
        let shift = clocks.ilog2();
        let (reciprocal, _) = divide_nearest(1 << (31 + shift), u64::from(clocks));
        Self {
            clocks,
            reciprocal: reciprocal as u32,
            shift: shift as u8,
            steepest: FARTHEST.min(1 << (steepest - 32).clamp(1, 30)),
        }
    }

    /// Whether a difference between an interval's mean step and its end's is one that a motion can make.
    #[inline]
    pub(super) fn follows(&self, difference: u64) -> bool {
        ((difference >> 32) as u32).wrapping_add(self.steepest) <= self.steepest << 1
    }

    /// An even ramp per clock that makes `change` over an interval, and the change that it really makes: less by
    /// up to two units a clock and 2^-30 of it.
    #[inline]
    #[allow(clippy::cast_possible_truncation, reason = "the lower word is cut out on purpose")]
    pub(super) fn ramp(&self, change: i64) -> (i64, i64) {
        let half = shifted_right(high_i64_u32(change, self.reciprocal), u32::from(self.shift));
        let ramp = half << 1;
        let made = product_u32(self.clocks, ramp as u32)
            .wrapping_add(u64::from(self.clocks.wrapping_mul((ramp >> 32) as u32)) << 32);
        (ramp, made as i64)
    }
}
