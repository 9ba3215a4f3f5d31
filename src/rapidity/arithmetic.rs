//! Sums of rapidities: exact, saturating, and a saturated sum stays saturated.
#![allow(clippy::arithmetic_side_effects, reason = "the operators of a rapidity saturate")]

use super::{Rapidity, RapidityRate};
use core::iter::Sum;
use core::ops::{Add, AddAssign, Neg, Sub, SubAssign};

impl Rapidity {
    /// The largest value; a sum that left the format upwards stays here.
    pub const MAX: Self = Self::from_bits(i64::MAX);

    /// The smallest value; a sum that left the format downwards stays here.
    pub const MIN: Self = Self::from_bits(i64::MIN);

    /// Whether some sum on the way here left the format, so that the value is a mark and no longer a
    /// shift.
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// let large = Rapidity::from_bits(i64::MAX - 1);
    /// let sum = large + large - large;
    /// assert!(sum.is_saturated());
    /// ```
    pub const fn is_saturated(self) -> bool {
        // Both ends and -i64::MAX, so that a sign change never alters the answer.
        self.to_bits().unsigned_abs() >= i64::MAX.unsigned_abs()
    }

    /// Sum, exact. A sum that leaves (-8, 8) saturates, and a saturated operand stays what it is
    /// (of two, the first).
    ///
    /// ```
    /// use shiftkeel::rapidity::Rapidity;
    /// const SUM: Rapidity = Rapidity::from_bits(3).saturating_add(Rapidity::from_bits(-5));
    /// assert_eq!(SUM.to_bits(), -2);
    /// ```
    pub const fn saturating_add(self, other: Self) -> Self {
        if self.is_saturated() {
            self
        } else if other.is_saturated() {
            other
        } else {
            Self::from_bits(self.to_bits().saturating_add(other.to_bits()))
        }
    }

    /// Difference, exact; saturates like [`Rapidity::saturating_add`].
    pub const fn saturating_sub(self, other: Self) -> Self {
        self.saturating_add(other.saturating_neg())
    }

    /// The same shift the other way.
    pub const fn saturating_neg(self) -> Self {
        Self::from_bits(self.to_bits().saturating_neg())
    }
}

impl Add for Rapidity {
    type Output = Self;

    fn add(self, other: Self) -> Self {
        self.saturating_add(other)
    }
}

impl Sub for Rapidity {
    type Output = Self;

    fn sub(self, other: Self) -> Self {
        self.saturating_sub(other)
    }
}

impl Neg for Rapidity {
    type Output = Self;

    fn neg(self) -> Self {
        self.saturating_neg()
    }
}

impl AddAssign for Rapidity {
    fn add_assign(&mut self, other: Self) {
        *self = *self + other;
    }
}

impl SubAssign for Rapidity {
    fn sub_assign(&mut self, other: Self) {
        *self = *self - other;
    }
}

impl Sum for Rapidity {
    fn sum<I: Iterator<Item = Self>>(terms: I) -> Self {
        terms.fold(Self::ZERO, Self::saturating_add)
    }
}

impl<'a> Sum<&'a Rapidity> for Rapidity {
    fn sum<I: Iterator<Item = &'a Rapidity>>(terms: I) -> Self {
        terms.copied().sum()
    }
}

impl Add for RapidityRate {
    type Output = Self;

    fn add(self, other: Self) -> Self {
        Self::from_bits(self.to_bits().saturating_add(other.to_bits()))
    }
}
